//! How loud a start can get where it is heard: the numbers that set the scale.

use crate::error::Result;
use crate::excitation::{Excitation, ModalState};
use crate::loss::Loss;
use crate::pickup::Pickup;
use crate::series::{Mode, ModeSeries};

/// Modes at or above this share of the sample rate are left out: what is not
/// computed cannot alias.
pub const HIGHEST_MODE_OF_SAMPLE_RATE: f64 = 0.45;

/// Mode `n` and its heard signal right after the start.
///
/// # Errors
/// As [`ModeSeries::mode`].
pub fn heard<L: Loss>(
    series: &ModeSeries<L>,
    excitation: &impl Excitation,
    pickup: &impl Pickup,
    n: u32,
) -> Result<(Mode, ModalState)> {
    let mode = series.mode(n)?;
    let state = excitation.mode(&mode, series.string());
    let weights = pickup.weights(&mode, series.string());
    Ok((mode, weights.heard(&mode, state)))
}

/// Sum of the heard amplitudes of modes 1 to `modes`: no sample of the sum can
/// ever lie above it, whatever the phases (triangle inequality).
///
/// # Errors
/// As [`ModeSeries::mode`].
pub fn l1_bound<L: Loss>(
    series: &ModeSeries<L>,
    excitation: &impl Excitation,
    pickup: &impl Pickup,
    modes: u32,
) -> Result<f64> {
    let mut sum = 0.0;
    for n in 1..=modes {
        let (mode, state) = heard(series, excitation, pickup, n)?;
        sum += state.amplitude(&mode);
    }
    Ok(sum)
}
