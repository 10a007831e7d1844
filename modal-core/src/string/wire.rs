//! Plain and wound strings from their gauges and materials.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::{Error, Result};

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

    /// Axial stiffness E·A in N.
    #[must_use]
    pub fn axial_stiffness_n(&self) -> f64 {
        self.youngs_modulus_pa * self.area_m2()
    }

    /// Bending stiffness E·I in N·m², with I = π d⁴/64 of a round section.
    #[must_use]
    pub fn bending_stiffness_n_m2(&self) -> f64 {
        let d2 = self.diameter_m * self.diameter_m;
        self.youngs_modulus_pa * PI * d2 * d2 / 64.0
    }
}

/// The core of a wound string.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Core {
    /// A round wire of this diameter in m.
    Round(f64),
    /// A hexagonal wire, this far across its flats in m.
    Hexagonal(f64),
}

impl Core {
    /// Diameter or distance across the flats, in m.
    fn size_m(self) -> f64 {
        let (Self::Round(size) | Self::Hexagonal(size)) = self;
        size
    }

    /// Cross-section in m²: π d²/4, or (√3/2) s².
    #[must_use]
    pub fn area_m2(self) -> f64 {
        match self {
            Self::Round(d) => 0.25 * PI * d * d,
            Self::Hexagonal(s) => 0.5 * libm::sqrt(3.0) * s * s,
        }
    }

    /// Second moment of area in m⁴: π d⁴/64, or (5 √3/144) s⁴.
    #[must_use]
    pub fn second_moment_m4(self) -> f64 {
        match self {
            Self::Round(d) => PI * d * d * d * d / 64.0,
            Self::Hexagonal(s) => 5.0 * libm::sqrt(3.0) / 144.0 * s * s * s * s,
        }
    }

    /// Diameter in m of the circle that the winding lies on: the edges, for a
    /// hexagon.
    #[must_use]
    pub fn winding_seat_m(self) -> f64 {
        match self {
            Self::Round(d) => d,
            Self::Hexagonal(s) => 2.0 * s / libm::sqrt(3.0),
        }
    }
}

/// A core with one tight layer of round wire around it.
///
/// The winding adds mass and, as good as, no stiffness: that is the core's
/// alone (Fletcher 1964; from memory). A winding on a hexagon is taken as lying
/// on the circle of its edges.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct WoundString {
    core: Core,
    core_density_kg_per_m3: f64,
    core_modulus_pa: f64,
    outer_diameter_m: f64,
    winding_density_kg_per_m3: f64,
}

impl WoundString {
    /// A string of a core (density, Young's modulus) wound to an outer diameter
    /// with wire of another density.
    ///
    /// # Errors
    /// A value outside [`bounds::DIAMETER_M`], [`bounds::DENSITY`] or
    /// [`bounds::YOUNGS_MODULUS`]; an outer diameter not above the core's.
    pub fn new(
        core: Core,
        core_density_kg_per_m3: f64,
        core_modulus_pa: f64,
        outer_diameter_m: f64,
        winding_density_kg_per_m3: f64,
    ) -> Result<Self> {
        bounds::DIAMETER_M.check(core.size_m())?;
        bounds::DIAMETER_M.check(outer_diameter_m)?;
        if outer_diameter_m <= core.winding_seat_m() {
            return Err(Error::OutOfRange {
                field: "outer diameter of the winding",
                unit: "m",
                value: outer_diameter_m,
                min: core.winding_seat_m(),
                max: bounds::DIAMETER_M.max,
            });
        }
        Ok(Self {
            core,
            core_density_kg_per_m3: bounds::DENSITY.check(core_density_kg_per_m3)?,
            core_modulus_pa: bounds::YOUNGS_MODULUS.check(core_modulus_pa)?,
            outer_diameter_m,
            winding_density_kg_per_m3: bounds::DENSITY.check(winding_density_kg_per_m3)?,
        })
    }

    /// The core.
    #[must_use]
    pub fn core(&self) -> Core {
        self.core
    }

    /// Mass per metre in kg/m: the core, and a helix of round wire of diameter
    /// w = (D − d)/2 with the pitch w, whose turn is √((π (d+w))² + w²) long.
    /// (Without the slope of the helix: ρ (π²/16)(D² − d²).)
    #[must_use]
    pub fn linear_density_kg_per_m(&self) -> f64 {
        let seat = self.core.winding_seat_m();
        let wire = 0.5 * (self.outer_diameter_m - seat);
        let turn = libm::hypot(PI * (seat + wire), wire);
        let winding = 0.25 * PI * wire * wire * turn / wire;
        self.core_density_kg_per_m3 * self.core.area_m2() + self.winding_density_kg_per_m3 * winding
    }

    /// Bending stiffness E·I of the core in N·m².
    #[must_use]
    pub fn bending_stiffness_n_m2(&self) -> f64 {
        self.core_modulus_pa * self.core.second_moment_m4()
    }

    /// Axial stiffness E·A of the core in N.
    #[must_use]
    pub fn axial_stiffness_n(&self) -> f64 {
        self.core_modulus_pa * self.core.area_m2()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_hexagon_is_between_its_circles() {
        let hexagon = Core::Hexagonal(1.0e-3);
        let (inner, outer) = (Core::Round(1.0e-3), Core::Round(hexagon.winding_seat_m()));
        assert!(hexagon.area_m2() > inner.area_m2() && hexagon.area_m2() < outer.area_m2());
        let moment = hexagon.second_moment_m4();
        assert!(moment > inner.second_moment_m4() && moment < outer.second_moment_m4());
        // Roark's tables of sections give 0.0601 s⁴ (from memory).
        assert!((moment / 1.0e-12 - 0.060_14).abs() < 1e-5);
    }

    #[test]
    fn the_helix_adds_little_to_the_plain_ring() {
        let core = Core::Round(0.5e-3);
        let string = WoundString::new(core, 7_850.0, 200.0e9, 1.2e-3, 8_900.0).unwrap();
        let ring = 8_900.0 * PI * PI / 16.0 * (1.2e-3_f64.powi(2) - 0.5e-3_f64.powi(2));
        let own = string.linear_density_kg_per_m() - 7_850.0 * core.area_m2();
        assert!((own / ring - 1.0086).abs() < 1e-4, "{}", own / ring);
    }

    #[test]
    fn a_winding_needs_room() {
        assert!(
            WoundString::new(Core::Hexagonal(0.5e-3), 7_850.0, 2e11, 0.55e-3, 8_900.0).is_err()
        );
    }
}
