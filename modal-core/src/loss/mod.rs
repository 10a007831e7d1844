//! How the vibration of each mode dies.
//!
//! Every law gives a decay rate σ; Q = ω/(2σ), so adding rates is adding 1/Q.
//! A tuple of laws is their sum: `(AirLoss::new(d)?, EndLoss::new(g)?)`.

mod air;
mod material;
mod measured;

pub use air::{Air, AirLoss};
pub use material::{BendingLoss, EndLoss, LossFactor, ThermoelasticLoss, WireThermal};
pub use measured::MeasuredT60;

use core::f64::consts::{LN_10, TAU};

use crate::bounds;
use crate::error::{Error, Result};
use crate::string::StringSpec;

/// T60 times decay rate: an amplitude e^(−σ t) has fallen by 60 dB at
/// t = 3 ln 10 / σ.
pub const T60_DECAY: f64 = 3.0 * LN_10;

/// A law of losses: the decay rate of every mode.
///
/// A maker adds a law by implementing this one method.
pub trait Loss {
    /// Decay rate σ in 1/s of the amplitude e^(−σ t) of mode `n`, whose
    /// undamped frequency is `frequency_hz`. It must be positive and less than
    /// 2π times the frequency; [`crate::ModeSeries::mode`] refuses anything else.
    fn decay_rate_per_s(&self, n: u32, frequency_hz: f64, string: &StringSpec) -> f64;
}

impl<L: Loss + ?Sized> Loss for &L {
    fn decay_rate_per_s(&self, n: u32, frequency_hz: f64, string: &StringSpec) -> f64 {
        (**self).decay_rate_per_s(n, frequency_hz, string)
    }
}

macro_rules! sum_of_losses {
    ($($law:ident $index:tt),+) => {
        impl<$($law: Loss),+> Loss for ($($law,)+) {
            fn decay_rate_per_s(&self, n: u32, frequency_hz: f64, string: &StringSpec) -> f64 {
                0.0 $(+ self.$index.decay_rate_per_s(n, frequency_hz, string))+
            }
        }
    };
}

sum_of_losses!(A 0, B 1);
sum_of_losses!(A 0, B 1, C 2);
sum_of_losses!(A 0, B 1, C 2, D 3);
sum_of_losses!(A 0, B 1, C 2, D 3, E 4);

/// The same T60 for every mode.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct ConstantT60 {
    decay_rate_per_s: f64,
}

impl ConstantT60 {
    /// Every mode falls by 60 dB in `t60_s` seconds.
    ///
    /// # Errors
    /// `t60_s` outside [`bounds::T60_S`].
    pub fn new(t60_s: f64) -> Result<Self> {
        Ok(Self {
            decay_rate_per_s: T60_DECAY / bounds::T60_S.check(t60_s)?,
        })
    }
}

impl Loss for ConstantT60 {
    fn decay_rate_per_s(&self, _: u32, _: f64, _: &StringSpec) -> f64 {
        self.decay_rate_per_s
    }
}

/// Two T60s at two frequencies: σ(f) = b₁ + b₃ (2π f)².
///
/// The law of Chaigne & Askenfelt (J. Acoust. Soc. Am. 95:1112, 1994; form
/// from memory): one term constant, one rising with the square of frequency.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct TwoT60 {
    constant_per_s: f64,
    quadratic_s: f64,
}

impl TwoT60 {
    /// The law through `t60_low_s` at `low_hz` and `t60_high_s` at `high_hz`.
    ///
    /// # Errors
    /// A value outside [`bounds::FREQUENCY_HZ`] or [`bounds::T60_S`];
    /// `high_hz` not above `low_hz`; `t60_high_s` outside
    /// `t60_low_s·(low_hz/high_hz)²` to `t60_low_s`, where one of the two terms
    /// would be negative.
    pub fn new(low_hz: f64, t60_low_s: f64, high_hz: f64, t60_high_s: f64) -> Result<Self> {
        let low = bounds::FREQUENCY_HZ.check(low_hz)?;
        let high = bounds::FREQUENCY_HZ.check(high_hz)?;
        let long = bounds::T60_S.check(t60_low_s)?;
        let short = bounds::T60_S.check(t60_high_s)?;
        if high <= low {
            return Err(Error::OutOfRange {
                field: "higher frequency of the two T60s",
                unit: "Hz",
                value: high,
                min: low,
                max: bounds::FREQUENCY_HZ.max,
            });
        }
        let (low_sq, high_sq) = (low * low, high * high);
        let shortest = long * low_sq / high_sq;
        if !(shortest..=long).contains(&short) {
            return Err(Error::OutOfRange {
                field: "T60 at the higher frequency",
                unit: "s",
                value: short,
                min: shortest,
                max: long,
            });
        }
        let (slow, fast) = (T60_DECAY / long, T60_DECAY / short);
        let per_hz2 = (fast - slow) / (high_sq - low_sq);
        Ok(Self {
            // Rounding may leave a hair below zero where the range allows zero.
            constant_per_s: (slow - per_hz2 * low_sq).max(0.0),
            quadratic_s: per_hz2 / (TAU * TAU),
        })
    }

    /// b₁ in 1/s.
    #[must_use]
    pub fn constant_per_s(&self) -> f64 {
        self.constant_per_s
    }

    /// b₃ in s.
    #[must_use]
    pub fn quadratic_s(&self) -> f64 {
        self.quadratic_s
    }
}

impl Loss for TwoT60 {
    fn decay_rate_per_s(&self, _: u32, frequency_hz: f64, _: &StringSpec) -> f64 {
        let angular = TAU * frequency_hz;
        self.constant_per_s + self.quadratic_s * angular * angular
    }
}
