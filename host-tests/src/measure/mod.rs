//! Measures of signals.

mod level;
mod spectrum;
mod together;
mod tone;

pub use level::{error_dbfs, from_q31, mean_square_error, peak_dbfs, power_db};
pub use spectrum::Spectrum;
pub use together::tone_errors;
pub use tone::tone_error;

/// How a decaying tone differs from what it should be.
#[derive(Clone, Copy, Debug)]
pub struct ToneError {
    /// Pitch in cents.
    pub cents: f64,
    /// T60 as a ratio, less one.
    pub t60: f64,
}
