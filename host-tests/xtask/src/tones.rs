//! Pitch and decay of every mode, each played alone by the integers.

use anyhow::Result;
use firmware_example::demo;
use host_tests::measure::{from_q31, tone_error};
use host_tests::performance::modes_of;
use modal_core::{
    Coefficients, Excitation, ModalState, Mode, Onset, Pickup, PickupWeights, StringSpec, Voice,
};

/// The worst errors of all modes.
#[derive(Default)]
pub(crate) struct Tones {
    pub(crate) modes: usize,
    pub(crate) max_pitch_error_cents: f64,
    pub(crate) max_t60_error_percent: f64,
}

/// A mode is heard until it has fallen by 50 dB (e^-5.8), or for this time.
const LONGEST_S: f64 = 0.5;
const NEPERS: f64 = 5.8;
/// Room for the sum of one mode and its rounding below the ceiling.
const ROOM: f64 = 1.1;

/// Plays every mode of every string of the demonstration and measures it.
pub(crate) fn measure() -> Result<Tones> {
    let design = demo::design()?;
    let mut tones = Tones::default();
    for string in &design.strings {
        let series = string.ringing_series();
        let coefficients = Coefficients::<{ demo::MODES }>::prepare(
            &series,
            demo::MODES as u32,
            design.sample_rate_hz,
            design.ceiling(),
        )?;
        let full_scale = ROOM / design.ceiling();
        for n in 1..=coefficients.modes() as u32 {
            let onset = Onset::prepare(&coefficients, &series, &Alone(n), &Everywhere, full_scale)?;
            let mut voice = Voice::new(&coefficients);
            let _ = voice.superpose(&onset);
            let (expected, _) = modes_of(string, n);
            let frames = (NEPERS / expected.decay).min(LONGEST_S) * design.sample_rate_hz;
            let mut signal = Vec::new();
            while (signal.len() as f64) < frames {
                let mut block = [0; demo::BLOCK];
                voice.render(&mut block);
                signal.extend(block.map(from_q31));
            }
            let error = tone_error(&signal, design.sample_rate_hz, &expected);
            tones.modes += 1;
            tones.max_pitch_error_cents = worse(tones.max_pitch_error_cents, error.cents);
            tones.max_t60_error_percent = worse(tones.max_t60_error_percent, 100.0 * error.t60);
        }
    }
    Ok(tones)
}

/// The larger magnitude; NaN stays.
fn worse(a: f64, b: f64) -> f64 {
    if a >= b.abs() || a.is_nan() {
        a
    } else {
        b.abs()
    }
}

/// Starts one mode alone, at full level.
struct Alone(u32);

impl Excitation for Alone {
    fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
        ModalState {
            displacement: f64::from(u8::from(mode.n() == self.0)),
            velocity: 0.0,
        }
    }
}

/// Hears every mode alike.
struct Everywhere;

impl Pickup for Everywhere {
    fn weights(&self, _: &Mode, _: &StringSpec) -> PickupWeights {
        PickupWeights {
            displacement: 1.0,
            velocity: 0.0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::worse;

    #[test]
    fn what_is_not_a_number_is_the_worst() {
        assert_eq!(worse(1.0, -2.0), 2.0);
        assert_eq!(worse(3.0, -2.0), 3.0);
        assert!(worse(1.0, f64::NAN).is_nan());
        assert!(worse(f64::NAN, 1.0).is_nan());
    }
}
