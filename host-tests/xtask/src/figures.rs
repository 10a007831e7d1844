//! What is measured on a performance.

use anyhow::Result;
use firmware_example::demo;
use host_tests::measure::{error_dbfs, peak_dbfs};
use host_tests::performance::{Played, closed_form, play};
use modal_core::{DacFormat, TwosComplement16};
use serde::Serialize;

use crate::emulator::Run;
use crate::tones::{self, Tones};

/// A converter's last place: full scale is 1.
const LAST_PLACE: f64 = 1.0 / 32_768.0;

/// A performance: as captured, as played again by the integers on this machine,
/// and as the closed form gives it.
pub(crate) struct Performance {
    /// The captured words, full scale 1.
    pub(crate) heard: Vec<f64>,
    /// The integers before dither and conversion.
    pub(crate) mix: Vec<f64>,
    /// The sum of damped modes in `f64`.
    pub(crate) closed_form: Vec<f64>,
    words_again: Vec<u16>,
}

impl Performance {
    /// Plays the log of `run` again, twice.
    pub(crate) fn of(run: &Run) -> Result<Self> {
        let Played { mix, words, .. } = play(&run.log)?;
        Ok(Self {
            heard: run.words.iter().map(|&word| level(word)).collect(),
            mix,
            closed_form: closed_form(&run.log, run.words.len())?,
            words_again: words,
        })
    }

    /// The blocks of `signal` that have sound in them: in the others the
    /// converter rests.
    fn sounding(&self, signal: &[f64]) -> Vec<f64> {
        let mix = self.mix.chunks(demo::BLOCK);
        mix.zip(signal.chunks(demo::BLOCK))
            .filter(|(mix, _)| mix.iter().any(|&frame| frame != 0.0))
            .flat_map(|(_, signal)| signal.to_vec())
            .collect()
    }
}

/// Every figure, as `--json` writes it. Floating-point numbers have units in
/// their names, the others are counts.
#[derive(Clone, Debug, Serialize)]
pub(crate) struct Figures {
    pub(crate) kernel: String,
    pub(crate) strings: u64,
    pub(crate) modes_per_string: u64,
    pub(crate) sample_rate_hz: u64,
    pub(crate) frames: u64,
    pub(crate) commands: u64,
    pub(crate) deadline_misses: u64,
    pub(crate) late_blocks: u64,
    pub(crate) spi_errors: u64,
    pub(crate) queue_overflows: u64,
    /// Commands refused, not logged, or logged and without effect here.
    pub(crate) commands_lost: u64,
    pub(crate) limited: u64,
    pub(crate) clipped: u64,
    /// Words on the wire that this machine computes otherwise.
    pub(crate) words_that_differ: u64,
    /// Words equal to the rest code after the last one that is not.
    pub(crate) rest_words_at_end: u64,
    pub(crate) peak_dbfs: f64,
    /// The integers before dither against f64, over everything.
    pub(crate) engine_error_dbfs: f64,
    /// The words against f64, while something sounds.
    pub(crate) dac_error_dbfs: f64,
    /// The same, of an ideal dithered converter fed with f64.
    pub(crate) ideal_dac_error_dbfs: f64,
    pub(crate) modes_measured: usize,
    pub(crate) max_pitch_error_cents: f64,
    pub(crate) max_t60_error_percent: f64,
    pub(crate) instructions_per_frame_mean: f64,
    pub(crate) instructions_per_frame_max: f64,
    pub(crate) budget_instructions_per_frame: f64,
}

impl Figures {
    /// Measures `performance`, which is the one of `run`.
    pub(crate) fn measure(run: &Run, performance: &Performance) -> Result<Self> {
        let Run { words, log, report } = run;
        let Performance {
            heard,
            mix,
            closed_form,
            words_again,
        } = performance;
        let Tones {
            modes,
            max_pitch_error_cents,
            max_t60_error_percent,
        } = tones::measure()?;
        let count = |name| report.number::<u64>(name);
        let sounding = performance.sounding(closed_form);
        let differ = words
            .iter()
            .zip(words_again)
            .filter(|(a, b)| a != b)
            .count();
        let resting = words
            .iter()
            .rev()
            .take_while(|&&word| word == TwosComplement16::REST);
        let commands = log.len() as u64;
        Ok(Self {
            kernel: report.text("kernel")?.to_owned(),
            strings: count("strings")?,
            modes_per_string: count("modes")?,
            sample_rate_hz: count("sample_rate_hz")?,
            frames: words.len() as u64,
            commands,
            deadline_misses: count("deadline_misses")?,
            late_blocks: count("late_blocks")?,
            spi_errors: count("spi_errors")?,
            queue_overflows: count("queue_overflows")?,
            commands_lost: count("commands_refused")?
                + count("log_overflows")?
                + count("commands_applied")?.abs_diff(commands),
            limited: count("limited")?,
            clipped: count("clipped")?,
            words_that_differ: (differ + words.len().abs_diff(words_again.len())) as u64,
            rest_words_at_end: resting.count() as u64,
            peak_dbfs: peak_dbfs(heard),
            engine_error_dbfs: error_dbfs(mix, closed_form),
            dac_error_dbfs: error_dbfs(&performance.sounding(heard), &sounding),
            ideal_dac_error_dbfs: error_dbfs(&ideal_converter(&sounding), &sounding),
            modes_measured: modes,
            max_pitch_error_cents,
            max_t60_error_percent,
            instructions_per_frame_mean: report.number("instructions_per_frame_mean")?,
            instructions_per_frame_max: report.number("instructions_per_frame_max")?,
            budget_instructions_per_frame: report.number("budget_instructions_per_frame")?,
        })
    }
}

fn level(word: u16) -> f64 {
    f64::from(word.cast_signed()) * LAST_PLACE
}

/// What an ideal 16-bit converter makes of `signal`: triangular dither of ±1 of
/// the last place from two uniform numbers, then rounding.
fn ideal_converter(signal: &[f64]) -> Vec<f64> {
    // splitmix64 (Steele, Lea & Flood, OOPSLA 2014; constants from memory):
    // another generator than the converter under test has.
    let mut state = 1_u64;
    let mut uniform = || {
        state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = state;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        ((z ^ (z >> 31)) >> 11) as f64 / 9_007_199_254_740_992.0
    };
    signal
        .iter()
        .map(|level| (level / LAST_PLACE + uniform() - uniform()).round() * LAST_PLACE)
        .collect()
}

#[cfg(test)]
impl Figures {
    /// Figures that meet every bar.
    pub(crate) fn good() -> Self {
        Self {
            kernel: "any".to_owned(),
            strings: 1,
            modes_per_string: 1,
            sample_rate_hz: 48_000,
            frames: 480_000,
            commands: 1,
            deadline_misses: 0,
            late_blocks: 0,
            spi_errors: 0,
            queue_overflows: 0,
            commands_lost: 0,
            limited: 0,
            clipped: 0,
            words_that_differ: 0,
            rest_words_at_end: 100,
            peak_dbfs: -12.0,
            engine_error_dbfs: -130.0,
            dac_error_dbfs: -96.2,
            ideal_dac_error_dbfs: -96.3,
            modes_measured: 1,
            max_pitch_error_cents: 0.001,
            max_t60_error_percent: 0.01,
            instructions_per_frame_mean: 500.0,
            instructions_per_frame_max: 1_000.0,
            budget_instructions_per_frame: 2_604.0,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Others read these: none may vanish.
    #[test]
    fn the_file_has_the_names_that_were_promised() {
        let file = serde_json::to_value(Figures::good()).unwrap();
        for name in [
            "sample_rate_hz",
            "frames",
            "deadline_misses",
            "spi_errors",
            "clipped",
            "peak_dbfs",
            "engine_error_dbfs",
            "dac_error_dbfs",
            "max_pitch_error_cents",
            "instructions_per_frame_mean",
            "instructions_per_frame_max",
            "budget_instructions_per_frame",
        ] {
            assert!(file[name].is_number(), "{name}");
        }
        assert!(file["kernel"].is_string());
    }

    /// Lipshitz, Wannamaker & Vanderkooy, J. Audio Eng. Soc. 40:355, 1992 (from
    /// memory): the error's power is a quarter of the square of the last place.
    #[test]
    fn the_ideal_converter_has_the_published_error() {
        let signal: Vec<f64> = (0..200_000).map(|n| 0.3 * f64::from(n).sin()).collect();
        let error = error_dbfs(&ideal_converter(&signal), &signal);
        let published = 10.0 * (0.25 * LAST_PLACE * LAST_PLACE).log10();
        assert!((error - published).abs() < 0.05, "{error} and {published}");
    }
}
