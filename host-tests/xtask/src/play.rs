//! `cargo xtask play`: the main job, from the string to the words on the wire.

use std::fs;
use std::path::Path;

use anyhow::{Context, Result};
use firmware_example::command::Kind;
use firmware_example::demo;
use host_tests::measure::{ToneError, error_dbfs, from_q31, peak_dbfs, power_db, tone_error};
use host_tests::performance::{closed_form, modes_of, play};
use host_tests::reference::Damped;
use modal_core::{
    Coefficients, Excitation, ModalState, Mode, Onset, Pickup, PickupWeights, StringSpec, Voice,
};

use crate::bars::{Figures, missed};
use crate::emulator::{self, Run};
use crate::picture::{self, Scene};
use crate::steps::progress;

/// Runs the command; whether every bar was met.
pub(crate) fn run(out: &Path, json: Option<&Path>) -> Result<bool> {
    let run = emulator::run(out)?;
    let bar = progress("Comparing with the closed form");
    let played = play(&run.log)?;
    let reference = closed_form(&run.log, run.words.len())?;
    let (tones, modes_measured) = tones()?;
    let heard: Vec<f64> = run.words.iter().map(|&word| level(word)).collect();
    let figures = figures(&run, &played.mix, &played.words, &reference, &heard, tones)?;
    let figures = Figures {
        modes_measured,
        ..figures
    };
    bar.finish_and_clear();

    let sound = out.join("performance.wav");
    write_wav(&sound, &run.words)?;
    let picture = out.join("performance.svg");
    picture::draw(
        &picture,
        &Scene {
            signal: &heard,
            sample_rate_hz: figures.sample_rate_hz,
            log: &run.log,
        },
    )?;
    if let Some(path) = json {
        fs::write(path, serde_json::to_string_pretty(&figures)? + "\n")
            .with_context(|| format!("cannot write {}", path.display()))?;
    }
    summary(&run, &figures);
    println!();
    println!("Sound    {}", sound.display());
    println!("Picture  {}", picture.display());
    let missed = missed(&figures);
    for bar in &missed {
        println!("MISSED   {bar}");
    }
    if missed.is_empty() {
        println!("Every bar is met.");
    }
    Ok(missed.is_empty())
}

fn figures(
    run: &Run,
    mix: &[f64],
    words: &[u16],
    reference: &[f64],
    heard: &[f64],
    tones: ToneError,
) -> Result<Figures> {
    // Dither rests with the instrument: compare where something sounds.
    let sounding = |signal: &[f64]| -> Vec<f64> {
        mix.chunks(demo::BLOCK)
            .zip(signal.chunks(demo::BLOCK))
            .filter(|(mix, _)| mix.iter().any(|&frame| frame != 0.0))
            .flat_map(|(_, signal)| signal.to_vec())
            .collect()
    };
    let last_place = 1.0 / 32_768.0;
    Ok(Figures {
        kernel: run.text("kernel")?.to_owned(),
        strings: run.figure("strings")? as u32,
        modes_per_string: run.figure("modes")? as u32,
        sample_rate_hz: run.figure("sample_rate_hz")?,
        frames: run.words.len(),
        commands: run.log.len(),
        deadline_misses: run.figure("deadline_misses")?,
        late_blocks: run.figure("late_blocks")?,
        spi_errors: run.figure("spi_errors")?,
        queue_overflows: run.figure("queue_overflows")?,
        clipped: run.figure("clipped")?,
        limited: run.figure("limited")?,
        words_that_differ: run
            .words
            .iter()
            .zip(words)
            .filter(|(wire, computed)| wire != computed)
            .count()
            + run.words.len().abs_diff(words.len()),
        frames_at_rest_at_the_end: run
            .words
            .iter()
            .rev()
            .take_while(|&&word| word == 0)
            .count(),
        peak_dbfs: peak_dbfs(heard),
        engine_error_dbfs: error_dbfs(mix, reference),
        dac_error_dbfs: error_dbfs(&sounding(heard), &sounding(reference)),
        // A quarter of the square of the last place: Lipshitz, Wannamaker &
        // Vanderkooy, J. Audio Eng. Soc. 40:355, 1992 (from memory).
        ideal_dac_error_dbfs: power_db(0.25 * last_place * last_place),
        max_pitch_error_cents: tones.cents,
        max_t60_error_percent: 100.0 * tones.t60,
        modes_measured: 0,
        instructions_per_frame_mean: run.figure("instructions_per_frame_mean")?,
        instructions_per_frame_max: run.figure("instructions_per_frame_max")?,
        budget_instructions_per_frame: run.figure("budget_instructions_per_frame")?,
    })
}

fn level(word: u16) -> f64 {
    f64::from(word.cast_signed()) / 32_768.0
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

/// Plays every mode of every string alone, with the integers of the
/// performance: the worst errors of pitch and T60, and how many modes that were.
fn tones() -> Result<(ToneError, usize)> {
    let design = demo::design()?;
    let mut worst = ToneError {
        cents: 0.0,
        t60: 0.0,
    };
    let mut count = 0;
    for string in &design.strings {
        let series = string.ringing_series();
        let coefficients = Coefficients::<{ demo::MODES }>::prepare(
            &series,
            demo::MODES as u32,
            design.sample_rate_hz,
            design.ceiling(),
        )?;
        for n in 1..=coefficients.modes() as u32 {
            let full_scale = 1.1 / design.ceiling();
            let onset = Onset::prepare(&coefficients, &series, &Alone(n), &Everywhere, full_scale)?;
            let mut voice = Voice::new(&coefficients);
            let _ = voice.superpose(&onset);
            let expected: Damped = modes_of(string, n).0;
            // As long as it falls by 50 dB, half a second at most.
            let seconds = (5.8 / expected.decay).min(0.5);
            let mut signal = Vec::new();
            while (signal.len() as f64) < seconds * design.sample_rate_hz {
                let mut block = [0; demo::BLOCK];
                voice.render(&mut block);
                signal.extend(block.iter().map(|&frame| from_q31(frame)));
            }
            let error = tone_error(&signal, design.sample_rate_hz, &expected);
            worst.cents = worst.cents.max(error.cents.abs());
            worst.t60 = worst.t60.max(error.t60.abs());
            count += 1;
        }
    }
    Ok((worst, count))
}

fn write_wav(path: &Path, words: &[u16]) -> Result<()> {
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: demo::SAMPLE_RATE_HZ,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(path, spec)?;
    for word in words {
        writer.write_sample(word.cast_signed())?;
    }
    Ok(writer.finalize()?)
}

fn summary(run: &Run, figures: &Figures) {
    let count = |kind| run.log.iter().filter(|event| event.kind == kind).count();
    println!(
        "{} strings of {} modes, {:.2} s at {} Hz: {} plucks, {} mutes (invented demonstration)",
        figures.strings,
        figures.modes_per_string,
        figures.frames as f64 / figures.sample_rate_hz,
        figures.sample_rate_hz,
        count(Kind::Pluck),
        count(Kind::Mute),
    );
    println!();
    println!(
        "On the wire     {} words, {} differ from this machine's; {} at rest at the end",
        figures.frames, figures.words_that_differ, figures.frames_at_rest_at_the_end
    );
    println!(
        "On time         {} deadlines missed, {} blocks late, {} failed transfers",
        figures.deadline_misses, figures.late_blocks, figures.spi_errors
    );
    println!(
        "In range        peak {:.1} dBFS, {} frames clipped, {} sounds limited",
        figures.peak_dbfs, figures.clipped, figures.limited
    );
    println!(
        "Right           engine error {:.1} dBFS against the closed form",
        figures.engine_error_dbfs
    );
    println!(
        "                words {:.2} dBFS; an ideal dithered converter {:.2} dBFS",
        figures.dac_error_dbfs, figures.ideal_dac_error_dbfs
    );
    println!(
        "In tune         {} modes, at most {:.5} cent and {:.4} % of T60 off",
        figures.modes_measured, figures.max_pitch_error_cents, figures.max_t60_error_percent
    );
    println!(
        "Load            {:.0} instructions a frame, {:.0} in the busiest block, of {:.0} ({} kernel)",
        figures.instructions_per_frame_mean,
        figures.instructions_per_frame_max,
        figures.budget_instructions_per_frame,
        figures.kernel
    );
    println!("                counted in the emulator; not the cycles of a board");
}
