//! The legal range of every physical input, by name and unit.
//!
//! One table serves the validation, the text of the errors and the random
//! inputs of the property tests. The ranges are wide: they keep the
//! arithmetic sound, they do not judge the instrument.

use crate::error::{Error, Result};

/// A named closed interval in SI units.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bound {
    /// What the value is, in the words of the trade.
    pub name: &'static str,
    /// SI unit; empty for a pure number.
    pub unit: &'static str,
    /// Smallest legal value.
    pub min: f64,
    /// Largest legal value.
    pub max: f64,
}

impl Bound {
    const fn new(name: &'static str, unit: &'static str, min: f64, max: f64) -> Self {
        Self {
            name,
            unit,
            min,
            max,
        }
    }

    /// Hands `value` back if it lies within the bound.
    ///
    /// # Errors
    /// [`Error::OutOfRange`] for anything else, NaN and infinities included.
    pub fn check(&self, value: f64) -> Result<f64> {
        if value >= self.min && value <= self.max {
            Ok(value)
        } else {
            Err(Error::OutOfRange {
                field: self.name,
                unit: self.unit,
                value,
                min: self.min,
                max: self.max,
            })
        }
    }
}

/// Speaking length of a string.
pub const LENGTH_M: Bound = Bound::new("length", "m", 0.01, 20.0);
/// Tension of a string.
pub const TENSION_N: Bound = Bound::new("tension", "N", 0.01, 50_000.0);
/// Mass of a string per metre.
pub const LINEAR_DENSITY: Bound = Bound::new("linear density", "kg/m", 1.0e-6, 1.0);
/// Bending stiffness E·I; zero is a perfectly flexible string.
pub const BENDING_STIFFNESS: Bound = Bound::new("bending stiffness", "N·m²", 0.0, 100.0);
/// Diameter of a wire.
pub const DIAMETER_M: Bound = Bound::new("diameter", "m", 1.0e-5, 0.02);
/// Density of the material.
pub const DENSITY: Bound = Bound::new("density", "kg/m³", 100.0, 25_000.0);
/// Young's modulus of the material.
pub const YOUNGS_MODULUS: Bound = Bound::new("Young's modulus", "Pa", 1.0e6, 1.0e12);
/// A frequency: a pitch, or where a loss is given.
pub const FREQUENCY_HZ: Bound = Bound::new("frequency", "Hz", 1.0, 200_000.0);
/// Time in which an amplitude falls by 60 dB.
pub const T60_S: Bound = Bound::new("T60", "s", 0.001, 1_000.0);
/// Decay rate of an amplitude (T60 = 3 ln 10 / rate).
pub const DECAY_RATE: Bound = Bound::new("decay rate", "1/s", 0.005, 50_000.0);
/// A place on the string as a fraction of its length.
pub const PLACE: Bound = Bound::new("place", "", 1.0e-6, 1.0 - 1.0e-6);
/// Height of a pluck; negative is the other way.
pub const PLUCK_HEIGHT_M: Bound = Bound::new("pluck height", "m", -0.1, 0.1);
/// Width of a plectrum, a finger or the aperture of a pickup.
pub const WIDTH_M: Bound = Bound::new("width", "m", 0.0, 0.5);
/// Axial stiffness E·A of a string.
pub const AXIAL_STIFFNESS_N: Bound = Bound::new("axial stiffness", "N", 0.0, 1.0e9);
/// Relative lengthening of a string.
pub const STRAIN: Bound = Bound::new("strain", "", 0.0, 0.1);
/// Share of energy lost per radian, 1/Q.
pub const LOSS_FACTOR: Bound = Bound::new("loss factor", "", 0.0, 1.0);
/// Admittance of an end: velocity over force.
pub const ADMITTANCE: Bound = Bound::new("end admittance", "s/kg", 0.0, 1.0e3);
/// Velocity of a string or a striker.
pub const SPEED_M_PER_S: Bound = Bound::new("speed", "m/s", -100.0, 100.0);
/// Impulse of a striker.
pub const IMPULSE_N_S: Bound = Bound::new("impulse", "N·s", -10.0, 10.0);
/// Force on a string.
pub const FORCE_N: Bound = Bound::new("force", "N", -1_000.0, 1_000.0);
/// Duration of a contact or a push.
pub const DURATION_S: Bound = Bound::new("duration", "s", 1.0e-6, 10.0);
/// Gain of a pickup; negative turns its sign.
pub const GAIN: Bound = Bound::new("gain", "", -1.0e3, 1.0e3);
/// Index of a mode; mode 1 is the fundamental.
pub const MODE_INDEX: Bound = Bound::new("mode index", "", 1.0, 100_000.0);
/// Frames per second.
pub const SAMPLE_RATE_HZ: Bound = Bound::new("sample rate", "Hz", 1_000.0, 400_000.0);
/// Share of digital full scale given to one string.
pub const CEILING: Bound = Bound::new("ceiling", "of full scale", 1.0 / 1_024.0, 1.0);
/// Heard level (m or m/s) that is digital full scale.
pub const FULL_SCALE: Bound = Bound::new("full scale", "m or m/s", 1.0e-12, 1.0e6);

/// Every bound, for tests and tables.
pub const ALL: [&Bound; 27] = [
    &LENGTH_M,
    &TENSION_N,
    &LINEAR_DENSITY,
    &BENDING_STIFFNESS,
    &DIAMETER_M,
    &DENSITY,
    &YOUNGS_MODULUS,
    &FREQUENCY_HZ,
    &T60_S,
    &DECAY_RATE,
    &PLACE,
    &PLUCK_HEIGHT_M,
    &WIDTH_M,
    &AXIAL_STIFFNESS_N,
    &STRAIN,
    &LOSS_FACTOR,
    &ADMITTANCE,
    &SPEED_M_PER_S,
    &IMPULSE_N_S,
    &FORCE_N,
    &DURATION_S,
    &GAIN,
    &MODE_INDEX,
    &SAMPLE_RATE_HZ,
    &CEILING,
    &FULL_SCALE,
    &crate::quantise::PLUCK_LEVEL,
];
