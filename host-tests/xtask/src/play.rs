//! `cargo xtask play`: the main job, from the strings to the words on the wire.

use std::fs;
use std::path::{Path, PathBuf};

use anyhow::{Context, Result};
use console::style;
use firmware_example::command::Kind;

use crate::emulator::{self, Run};
use crate::figures::{Figures, Performance};
use crate::steps::{progress, root};
use crate::{bars, picture, snapshot};

/// Where the files go if nothing else is asked for.
pub(crate) fn default_directory() -> PathBuf {
    root().join("target/play")
}

/// Runs the command; whether every bar was met.
pub(crate) fn run(out: &Path, json: Option<&Path>, accept: bool) -> Result<bool> {
    let (run, met) = play(out, json)?;
    if accept {
        println!(
            "Expected from now on: {}",
            snapshot::accept(&run)?.display()
        );
    }
    Ok(met)
}

/// Runs the command, and the same as the expected run, to the last word.
pub(crate) fn test() -> Result<bool> {
    let (run, met) = play(&default_directory(), None)?;
    snapshot::compare(&run)?;
    Ok(met)
}

fn play(out: &Path, json: Option<&Path>) -> Result<(Run, bool)> {
    let run = emulator::run(out)?;
    let bar = progress("Comparing with the closed form");
    let performance = Performance::of(&run)?;
    let figures = Figures::measure(&run, &performance)?;
    let sound = out.join("performance.wav");
    write_sound(&sound, &run.words, figures.sample_rate_hz as u32)
        .with_context(|| format!("cannot write {}", sound.display()))?;
    let picture = out.join("performance.svg");
    picture::draw(&picture, &run.log, &performance)?;
    bar.finish_and_clear();
    if let Some(path) = json {
        fs::write(path, serde_json::to_string_pretty(&figures)? + "\n")
            .with_context(|| format!("cannot write {}", path.display()))?;
    }

    introduce(&run, &figures);
    let missed = bars::print(&figures);
    println!();
    println!("Sound    {}", short(&sound));
    println!("Picture  {}", short(&picture));
    if let Some(path) = json {
        println!("Figures  {}", short(path));
    }
    println!();
    if missed == 0 {
        println!("{}", style("Every bar is met.").green());
    } else {
        println!("{}", style(format!("Bars missed: {missed}")).red().bold());
    }
    Ok((run, missed == 0))
}

fn introduce(run: &Run, figures: &Figures) {
    let count = |kind| run.log.iter().filter(|event| event.kind == kind).count();
    println!(
        "An invented instrument plays an invented performance: {} strings of {} modes,\n\
         {} plucks, {} mutes, peak {:.1} dBFS, through the {} kernel. A frame took {:.0}\n\
         instructions on average ({:.0} in the busiest block, of {:.0}), counted in the\n\
         emulator: not the cycles of a board.",
        figures.strings,
        figures.modes_per_string,
        count(Kind::Pluck),
        count(Kind::Mute),
        figures.peak_dbfs,
        figures.kernel,
        figures.instructions_per_frame_mean,
        figures.instructions_per_frame_max,
        figures.budget_instructions_per_frame,
    );
    println!();
}

/// A path as seen from the current directory, if it lies below it.
fn short(path: &Path) -> String {
    let here = std::env::current_dir().unwrap_or_default();
    path.strip_prefix(here)
        .unwrap_or(path)
        .display()
        .to_string()
}

fn write_sound(path: &Path, words: &[u16], sample_rate_hz: u32) -> Result<()> {
    let spec = hound::WavSpec {
        channels: 1,
        sample_rate: sample_rate_hz,
        bits_per_sample: 16,
        sample_format: hound::SampleFormat::Int,
    };
    let mut writer = hound::WavWriter::create(path, spec)?;
    for word in words {
        writer.write_sample(word.cast_signed())?;
    }
    Ok(writer.finalize()?)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_sound_holds_the_words() {
        let path = std::env::temp_dir().join(format!("words-{}.wav", std::process::id()));
        let words = [0, 1, 0xFFFF, 0x7FFF, 0x8000];
        write_sound(&path, &words, 48_000).unwrap();
        let mut reader = hound::WavReader::open(&path).unwrap();
        assert_eq!(reader.spec().sample_rate, 48_000);
        let read: Vec<i16> = reader.samples().map(Result::unwrap).collect();
        assert_eq!(read, [0, 1, -1, 32_767, -32_768]);
        fs::remove_file(path).unwrap();
    }
}
