//! The mode series: frequency and decay of mode 1, 2, 3, …

use core::f64::consts::{PI, TAU};

use crate::bounds;
use crate::error::{Error, Result};
use crate::loss::{Loss, T60_DECAY};
use crate::string::StringSpec;

/// One mode of a string.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Mode {
    n: u32,
    frequency_hz: f64,
    decay_rate_per_s: f64,
}

impl Mode {
    /// Index of the mode; 1 is the fundamental.
    #[must_use]
    pub fn n(&self) -> u32 {
        self.n
    }

    /// Frequency without losses, ω₀/2π, in Hz.
    #[must_use]
    pub fn frequency_hz(&self) -> f64 {
        self.frequency_hz
    }

    /// Decay rate σ of the amplitude e^(−σ t), in 1/s.
    #[must_use]
    pub fn decay_rate_per_s(&self) -> f64 {
        self.decay_rate_per_s
    }

    /// ω₀ = 2π f in rad/s.
    #[must_use]
    pub fn angular(&self) -> f64 {
        TAU * self.frequency_hz
    }

    /// ω_d = √(ω₀² − σ²) in rad/s: where the damped mode really sounds.
    #[must_use]
    pub fn damped_angular(&self) -> f64 {
        let (w, s) = (self.angular(), self.decay_rate_per_s);
        libm::sqrt((w - s) * (w + s))
    }

    /// Time in s in which the amplitude falls by 60 dB.
    #[must_use]
    pub fn t60_s(&self) -> f64 {
        T60_DECAY / self.decay_rate_per_s
    }

    /// Quality factor Q = ω₀/(2σ).
    #[must_use]
    pub fn q_factor(&self) -> f64 {
        self.angular() / (2.0 * self.decay_rate_per_s)
    }
}

/// All modes of a string with a law of losses.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct ModeSeries<L> {
    string: StringSpec,
    loss: L,
}

impl<L: Loss> ModeSeries<L> {
    /// The series of `string` with the losses `loss`.
    pub fn new(string: StringSpec, loss: L) -> Self {
        Self { string, loss }
    }

    /// The string.
    pub fn string(&self) -> &StringSpec {
        &self.string
    }

    /// The law of losses.
    pub fn loss(&self) -> &L {
        &self.loss
    }

    /// Frequency in Hz of mode `n` without losses: [`StringSpec::frequency_hz`].
    pub fn frequency_hz(&self, n: u32) -> f64 {
        self.string.frequency_hz(n)
    }

    /// Mode `n`.
    ///
    /// # Errors
    /// `n` outside [`bounds::MODE_INDEX`]; a decay rate outside
    /// [`bounds::DECAY_RATE`]; [`Error::Overdamped`] where the loss keeps the
    /// mode from oscillating.
    pub fn mode(&self, n: u32) -> Result<Mode> {
        bounds::MODE_INDEX.check(f64::from(n))?;
        let frequency_hz = self.frequency_hz(n);
        let rate = self.loss.decay_rate_per_s(n, frequency_hz, &self.string);
        let decay_rate_per_s = bounds::DECAY_RATE.check(rate)?;
        // At 99.9 % of critical damping the mode still oscillates and its
        // arithmetic is still well conditioned.
        let limit_per_s = 0.999 * TAU * frequency_hz;
        if decay_rate_per_s >= limit_per_s {
            return Err(Error::Overdamped {
                mode: n,
                decay_rate_per_s,
                limit_per_s,
            });
        }
        Ok(Mode {
            n,
            frequency_hz,
            decay_rate_per_s,
        })
    }

    /// How many modes lie below `limit_hz` (zero if none, or if the limit is
    /// not a number; at most the maximum of [`bounds::MODE_INDEX`]).
    ///
    /// With X = limit/f₀, X √(2 / (1 + √(1 + 4 B X²))) half waves fit: the
    /// positive root of f = limit written without cancellation for B → 0. From
    /// these [`crate::string::Ends`] take their share.
    pub fn modes_below(&self, limit_hz: f64) -> u32 {
        if limit_hz.is_nan() {
            return 0;
        }
        // Far above any legal mode, and far below an overflow of its square.
        let x = (limit_hz / self.string.ideal_fundamental_hz()).min(1.0e12);
        let root = libm::sqrt(1.0 + 4.0 * self.string.inharmonicity() * x * x);
        let half_waves = x * libm::sqrt(2.0 / (1.0 + root));
        let estimate = self
            .string
            .ends()
            .modes_below(half_waves, self.string.inharmonicity());
        // The cast turns negative numbers into 0.
        let mut n = estimate.min(bounds::MODE_INDEX.max) as u32;
        // Rounding can be one off at an exact hit.
        if n > 0 && self.frequency_hz(n) >= limit_hz {
            n -= 1;
        } else if f64::from(n) < bounds::MODE_INDEX.max && self.frequency_hz(n + 1) < limit_hz {
            n += 1;
        }
        n
    }
}

/// Wave number k_n = n π / L in rad/m.
pub(crate) fn wave_number(n: u32, string: &StringSpec) -> f64 {
    f64::from(n) * PI / string.length_m()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::loss::ConstantT60;

    fn series(stiffness: f64) -> ModeSeries<ConstantT60> {
        let string = StringSpec::new(0.5, 60.0, 6.0e-4, stiffness).unwrap();
        ModeSeries::new(string, ConstantT60::new(3.0).unwrap())
    }

    #[test]
    fn modes_below_agrees_with_counting() {
        for stiffness in [0.0, 1.0e-5, 1.0e-3] {
            let series = series(stiffness);
            for limit in [10.0, 316.0, 5_000.0, 21_600.0] {
                let counted = (1..)
                    .take_while(|&n| series.frequency_hz(n) < limit)
                    .count();
                assert_eq!(series.modes_below(limit) as usize, counted);
            }
            assert_eq!(series.modes_below(f64::NAN), 0);
            assert_eq!(series.modes_below(-1.0), 0);
            assert_eq!(series.modes_below(f64::INFINITY), 100_000);
        }
    }

    #[test]
    fn an_exact_hit_is_not_below() {
        let series = series(0.0);
        assert_eq!(series.modes_below(series.frequency_hz(7)), 6);
    }

    #[test]
    fn mode_zero_is_refused() {
        assert!(series(0.0).mode(0).is_err());
    }
}
