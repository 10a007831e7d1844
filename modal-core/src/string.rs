//! What the string is: length, tension, mass and stiffness.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::Result;

/// A solid round wire: diameter and material.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Wire {
    diameter_m: f64,
    density_kg_per_m3: f64,
    youngs_modulus_pa: f64,
}

impl Wire {
    /// A wire of `diameter_m`, density and Young's modulus of its material.
    ///
    /// # Errors
    /// A value outside [`bounds::DIAMETER_M`], [`bounds::DENSITY`] or
    /// [`bounds::YOUNGS_MODULUS`].
    pub fn new(diameter_m: f64, density_kg_per_m3: f64, youngs_modulus_pa: f64) -> Result<Self> {
        Ok(Self {
            diameter_m: bounds::DIAMETER_M.check(diameter_m)?,
            density_kg_per_m3: bounds::DENSITY.check(density_kg_per_m3)?,
            youngs_modulus_pa: bounds::YOUNGS_MODULUS.check(youngs_modulus_pa)?,
        })
    }

    /// Diameter in m.
    #[must_use]
    pub fn diameter_m(&self) -> f64 {
        self.diameter_m
    }

    /// Young's modulus in Pa.
    #[must_use]
    pub fn youngs_modulus_pa(&self) -> f64 {
        self.youngs_modulus_pa
    }

    /// Cross-section π d²/4 in m².
    #[must_use]
    pub fn area_m2(&self) -> f64 {
        0.25 * PI * self.diameter_m * self.diameter_m
    }

    /// Mass per metre in kg/m: density times cross-section.
    #[must_use]
    pub fn linear_density_kg_per_m(&self) -> f64 {
        self.density_kg_per_m3 * self.area_m2()
    }

    /// Bending stiffness E·I in N·m², with I = π d⁴/64 of a round section.
    #[must_use]
    pub fn bending_stiffness_n_m2(&self) -> f64 {
        let d2 = self.diameter_m * self.diameter_m;
        self.youngs_modulus_pa * PI * d2 * d2 / 64.0
    }
}

/// A uniform stiff string between two hinged ends.
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
