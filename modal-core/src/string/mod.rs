//! What the string is: length, tension, mass, stiffness and ends.

mod ends;
mod fret;
mod strength;
mod wire;

pub use ends::Ends;
pub use fret::{fret_distance_m, fretting_cents, pressing_strain};
pub use strength::{Load, LoadLevel, music_wire_strength_pa};
pub use wire::{Core, Wire, WoundString};

use core::f64::consts::PI;

use crate::bounds;
use crate::error::Result;

/// A uniform stiff string between two rigid ends, hinged unless said otherwise.
///
/// Equation of motion: μ y_tt = T y_xx − E·I y_xxxx, less the losses
/// (Fletcher & Rossing, *The Physics of Musical Instruments*, ch. 2; from memory).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct StringSpec {
    length_m: f64,
    tension_n: f64,
    linear_density_kg_per_m: f64,
    bending_stiffness_n_m2: f64,
    ends: Ends,
}

impl StringSpec {
    /// A string from its physical data: length in m, tension in N, mass per
    /// metre in kg/m, bending stiffness E·I in N·m² (zero: flexible).
    ///
    /// # Errors
    /// A value outside its range in [`bounds`].
    pub fn new(
        length_m: f64,
        tension_n: f64,
        linear_density_kg_per_m: f64,
        bending_stiffness_n_m2: f64,
    ) -> Result<Self> {
        Ok(Self {
            length_m: bounds::LENGTH_M.check(length_m)?,
            tension_n: bounds::TENSION_N.check(tension_n)?,
            linear_density_kg_per_m: bounds::LINEAR_DENSITY.check(linear_density_kg_per_m)?,
            bending_stiffness_n_m2: bounds::BENDING_STIFFNESS.check(bending_stiffness_n_m2)?,
            ends: Ends::Hinged,
        })
    }

    /// A plain wire under a known tension.
    ///
    /// # Errors
    /// A value outside its range in [`bounds`].
    pub fn plain_wire(length_m: f64, tension_n: f64, wire: &Wire) -> Result<Self> {
        Self::new(
            length_m,
            tension_n,
            wire.linear_density_kg_per_m(),
            wire.bending_stiffness_n_m2(),
        )
    }

    /// A string whose tension is solved so that mode 1 sounds at `pitch_hz`,
    /// stiffness included: T = 4 L² μ F² − π² E·I / L², exact for hinged ends
    /// (from f₁ = f₀ √(1+B), see [`StringSpec::inharmonicity`]).
    ///
    /// # Errors
    /// A value outside its range in [`bounds`]; a tension that comes out
    /// outside [`bounds::TENSION_N`] (a bar rather than a string).
    pub fn tuned(
        length_m: f64,
        pitch_hz: f64,
        linear_density_kg_per_m: f64,
        bending_stiffness_n_m2: f64,
    ) -> Result<Self> {
        let length = bounds::LENGTH_M.check(length_m)?;
        let pitch = bounds::FREQUENCY_HZ.check(pitch_hz)?;
        let density = bounds::LINEAR_DENSITY.check(linear_density_kg_per_m)?;
        let stiffness = bounds::BENDING_STIFFNESS.check(bending_stiffness_n_m2)?;
        let speed = 2.0 * length * pitch;
        let tension = density * speed * speed - PI * PI * stiffness / (length * length);
        Self::new(length, tension, density, stiffness)
    }

    /// A plain wire tuned to a pitch; see [`StringSpec::tuned`].
    ///
    /// # Errors
    /// As [`StringSpec::tuned`].
    pub fn tuned_wire(length_m: f64, pitch_hz: f64, wire: &Wire) -> Result<Self> {
        Self::tuned(
            length_m,
            pitch_hz,
            wire.linear_density_kg_per_m(),
            wire.bending_stiffness_n_m2(),
        )
    }

    /// As [`StringSpec::tuned`] for other ends: the tension is found by halving
    /// its interval, to the last bit or nearly.
    ///
    /// # Errors
    /// As [`StringSpec::tuned`].
    pub fn tuned_between(
        ends: Ends,
        length_m: f64,
        pitch_hz: f64,
        linear_density_kg_per_m: f64,
        bending_stiffness_n_m2: f64,
    ) -> Result<Self> {
        let flexible = Self::tuned(length_m, pitch_hz, linear_density_kg_per_m, 0.0)?;
        bounds::BENDING_STIFFNESS.check(bending_stiffness_n_m2)?;
        let with_tension = |tension_n: f64| Self {
            tension_n,
            bending_stiffness_n_m2,
            ends,
            ..flexible
        };
        // Stiffness only ever raises the pitch, so the flexible string pulls most.
        let (mut low, mut high) = (bounds::TENSION_N.min, flexible.tension_n);
        for _ in 0..80 {
            let middle = 0.5 * (low + high);
            if with_tension(middle).frequency_hz(1) < pitch_hz {
                low = middle;
            } else {
                high = middle;
            }
        }
        let found = with_tension(high);
        if found.frequency_hz(1) > pitch_hz * (1.0 + 1.0e-9) {
            // Even the smallest tension is too much: a bar rather than a string.
            bounds::TENSION_N.check(0.0)?;
        }
        Ok(found)
    }

    /// The same string between other ends; the tension stays.
    #[must_use]
    pub fn between(self, ends: Ends) -> Self {
        Self { ends, ..self }
    }

    /// The same string stopped at `fret` (0: open) of a scale of equal
    /// temperament: the length is divided by 2^(fret/12), the tension stays
    /// ([`fretting_cents`] tells what pressing the string adds).
    ///
    /// # Errors
    /// A length outside [`bounds::LENGTH_M`].
    pub fn fretted(self, fret: u8) -> Result<Self> {
        let length_m = self.length_m * libm::exp2(-f64::from(fret) / 12.0);
        Ok(Self {
            length_m: bounds::LENGTH_M.check(length_m)?,
            ..self
        })
    }

    /// Frequency in Hz of mode `n` without losses: u f₀ √(1 + B u²), where u is
    /// n for hinged ends and a little more for clamped ones (see [`Ends`];
    /// Fletcher, J. Acoust. Soc. Am. 36:203, 1964; from memory).
    #[must_use]
    pub fn frequency_hz(&self, n: u32) -> f64 {
        let inharmonicity = self.inharmonicity();
        let u = self.ends.effective_index(n, inharmonicity);
        u * self.ideal_fundamental_hz() * libm::sqrt(1.0 + inharmonicity * u * u)
    }

    /// The two ends.
    #[must_use]
    pub fn ends(&self) -> Ends {
        self.ends
    }

    /// Characteristic impedance √(T μ) in kg/s.
    #[must_use]
    pub fn impedance_kg_per_s(&self) -> f64 {
        libm::sqrt(self.tension_n * self.linear_density_kg_per_m)
    }

    /// Speaking length L in m.
    #[must_use]
    pub fn length_m(&self) -> f64 {
        self.length_m
    }

    /// Tension T in N.
    #[must_use]
    pub fn tension_n(&self) -> f64 {
        self.tension_n
    }

    /// Mass per metre μ in kg/m.
    #[must_use]
    pub fn linear_density_kg_per_m(&self) -> f64 {
        self.linear_density_kg_per_m
    }

    /// Bending stiffness E·I in N·m².
    #[must_use]
    pub fn bending_stiffness_n_m2(&self) -> f64 {
        self.bending_stiffness_n_m2
    }

    /// Speed of transverse waves without stiffness, c = √(T/μ), in m/s
    /// (OpenStax, University Physics 1, section 16.3).
    #[must_use]
    pub fn wave_speed_m_per_s(&self) -> f64 {
        libm::sqrt(self.tension_n / self.linear_density_kg_per_m)
    }

    /// f₀ = c/(2L) in Hz: where mode 1 would sound without stiffness
    /// (OpenStax, University Physics 1, section 16.6).
    #[must_use]
    pub fn ideal_fundamental_hz(&self) -> f64 {
        self.wave_speed_m_per_s() / (2.0 * self.length_m)
    }

    /// Inharmonicity B = π² E·I / (T L²) of f_n = n f₀ √(1 + B n²)
    /// (Fletcher, J. Acoust. Soc. Am. 36:203, 1964; from memory).
    #[must_use]
    pub fn inharmonicity(&self) -> f64 {
        PI * PI * self.bending_stiffness_n_m2 / (self.tension_n * self.length_m * self.length_m)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::error::Error;

    #[test]
    fn a_tuned_wire_sounds_at_its_pitch() {
        let wire = Wire::new(0.5e-3, 7_850.0, 200.0e9).unwrap();
        let string = StringSpec::tuned_wire(0.6, 110.0, &wire).unwrap();
        let first = string.ideal_fundamental_hz() * libm::sqrt(1.0 + string.inharmonicity());
        assert!((first / 110.0 - 1.0).abs() < 1e-14);
    }

    #[test]
    fn a_bar_is_not_a_string() {
        let bar = Wire::new(0.01, 7_850.0, 200.0e9).unwrap();
        let refused = StringSpec::tuned_wire(0.05, 20.0, &bar);
        assert!(matches!(
            refused,
            Err(Error::OutOfRange {
                field: "tension",
                ..
            })
        ));
    }
}
