//! What can be wrong with an input, said with the field, the value and the range.

use core::fmt;

/// Result of a fallible function of this crate.
pub type Result<T> = core::result::Result<T, Error>;

/// Why an input was refused. Nothing is changed by a refused call.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[non_exhaustive]
pub enum Error {
    /// A value lies outside its range (or is not a number).
    OutOfRange {
        /// What the value is.
        field: &'static str,
        /// Its SI unit; empty for a pure number.
        unit: &'static str,
        /// The value that was given or that followed from what was given.
        value: f64,
        /// Smallest allowed value.
        min: f64,
        /// Largest allowed value.
        max: f64,
    },
    /// None, or more items than the fixed capacity holds.
    Count {
        /// What is counted.
        field: &'static str,
        /// How many were asked for.
        wanted: u32,
        /// How many fit.
        capacity: u32,
    },
    /// A start that has no integer form: prepare it through
    /// [`crate::Onset::prepare`].
    NoIntegerForm {
        /// What start.
        start: &'static str,
    },
    /// A mode that does not oscillate: its loss is too large for its frequency.
    Overdamped {
        /// Index of the mode.
        mode: u32,
        /// Its decay rate in 1/s.
        decay_rate_per_s: f64,
        /// The rate it must stay below, in 1/s.
        limit_per_s: f64,
    },
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match *self {
            Self::OutOfRange {
                field,
                unit,
                value,
                min,
                max,
            } => {
                let space = if unit.is_empty() { "" } else { " " };
                write!(
                    f,
                    "{field} = {value}{space}{unit} is outside its range, {min} to {max}{space}{unit}"
                )
            }
            Self::Count {
                field,
                wanted,
                capacity,
            } => write!(
                f,
                "{field} = {wanted} is outside its range, 1 to {capacity}"
            ),
            Self::NoIntegerForm { start } => {
                write!(
                    f,
                    "{start} has no integer form: prepare it in floating point"
                )
            }
            Self::Overdamped {
                mode,
                decay_rate_per_s,
                limit_per_s,
            } => write!(
                f,
                "decay rate of mode {mode} = {decay_rate_per_s} 1/s is outside its range, 0 to {limit_per_s} 1/s: the mode would not oscillate"
            ),
        }
    }
}

impl core::error::Error for Error {}
