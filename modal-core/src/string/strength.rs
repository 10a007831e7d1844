//! How close a string is to breaking. Wire under tension can injure: treat the
//! figures as a warning, not as a permission, and wear eye protection.

use crate::string::{StringSpec, Wire};

/// Minimum tensile strength of music wire by diameter, in inch and ksi: ASTM
/// A228 as printed by a wire maker (interwiregroup.com).
const MUSIC_WIRE: [(f64, f64); 22] = [
    (0.008, 399.0),
    (0.009, 393.0),
    (0.010, 387.0),
    (0.011, 382.0),
    (0.012, 377.0),
    (0.013, 373.0),
    (0.014, 369.0),
    (0.015, 365.0),
    (0.016, 362.0),
    (0.018, 356.0),
    (0.020, 350.0),
    (0.022, 345.0),
    (0.024, 341.0),
    (0.026, 337.0),
    (0.028, 333.0),
    (0.030, 330.0),
    (0.032, 327.0),
    (0.036, 321.0),
    (0.040, 315.0),
    (0.045, 309.0),
    (0.051, 303.0),
    (0.059, 296.0),
];

const METRES_PER_INCH: f64 = 0.0254;
const PASCAL_PER_KSI: f64 = 6.894_757_293_168e6;

/// Minimum tensile strength in Pa of music wire of `diameter_m`, between the
/// lines of the table along a power law; `None` outside the table (0.203 mm to
/// 1.499 mm).
#[must_use]
pub fn music_wire_strength_pa(diameter_m: f64) -> Option<f64> {
    let inch = diameter_m / METRES_PER_INCH;
    // The ends of the table, with room for the rounding of the conversion.
    let within = |&(low, high): &(&(f64, f64), &(f64, f64))| {
        inch >= low.0 * (1.0 - 1e-12) && inch <= high.0 * (1.0 + 1e-12)
    };
    let (low, high) = MUSIC_WIRE
        .iter()
        .zip(MUSIC_WIRE.iter().skip(1))
        .find(within)?;
    let part = libm::log(inch / low.0) / libm::log(high.0 / low.0);
    Some(low.1 * libm::pow(high.1 / low.1, part) * PASCAL_PER_KSI)
}

/// How a load compares with the strength.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum LoadLevel {
    /// Up to 60 % of the minimum strength.
    Usual,
    /// 60 % to 70 %: the limit of piano practice (a remark on a technicians'
    /// list, moypiano.com; a weak source).
    High,
    /// Above 70 %: expect it to break.
    Excessive,
}

/// The working stress of a string and its strength.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Load {
    /// Tension over the cross-section that carries it, in Pa.
    pub stress_pa: f64,
    /// Minimum tensile strength in Pa.
    pub strength_pa: f64,
}

impl Load {
    /// The load on a plain steel string of music wire; `None` if its diameter
    /// is not in the table of [`music_wire_strength_pa`].
    ///
    /// For a plain string the stress is 4 L² f² ρ, whatever its diameter.
    #[must_use]
    pub fn of_music_wire(string: &StringSpec, wire: &Wire) -> Option<Self> {
        Some(Self {
            stress_pa: string.tension_n() / wire.area_m2(),
            strength_pa: music_wire_strength_pa(wire.diameter_m())?,
        })
    }

    /// Stress over strength.
    #[must_use]
    pub fn share(&self) -> f64 {
        self.stress_pa / self.strength_pa
    }

    /// What to think of it. A share that is not a number is excessive.
    #[must_use]
    pub fn level(&self) -> LoadLevel {
        match self.share() {
            share if share <= 0.6 => LoadLevel::Usual,
            share if share <= 0.7 => LoadLevel::High,
            _ => LoadLevel::Excessive,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_line_of_the_table_is_met() {
        for (inch, ksi) in MUSIC_WIRE {
            let strength = music_wire_strength_pa(inch * METRES_PER_INCH).unwrap();
            assert!((strength / (ksi * PASCAL_PER_KSI) - 1.0).abs() < 1e-9);
        }
        assert_eq!(music_wire_strength_pa(0.1e-3), None);
        assert_eq!(music_wire_strength_pa(2.0e-3), None);
        assert_eq!(music_wire_strength_pa(f64::NAN), None);
    }

    #[test]
    fn thicker_wire_is_weaker_per_area() {
        let mut before = f64::INFINITY;
        for step in 0..100 {
            let strength = music_wire_strength_pa(0.21e-3 + 0.0125e-3 * f64::from(step)).unwrap();
            assert!(strength < before);
            before = strength;
        }
    }
}
