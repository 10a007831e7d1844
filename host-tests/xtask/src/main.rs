//! The project's commands: `cargo xtask play`, `cargo xtask cycles`,
//! `cargo xtask test`.
//!
//! A command is a file of its own. What commands share: [`setup`] (what the
//! machine needs), [`steps`] (running programs), [`emulator`] (the firmware and
//! what it leaves).

mod setup;
mod steps;

mod emulator;

mod bars;
mod cycles;
mod figures;
mod picture;
mod play;
mod size;
mod tones;

mod hygiene;
mod snapshot;
mod test;

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// Plays the demonstration and checks the project.
#[derive(Parser)]
#[command(name = "cargo xtask", bin_name = "cargo xtask")]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Play the demonstration on the emulated board and measure its DAC words.
    ///
    /// Builds the firmware, runs it in QEMU, compares every word that went over
    /// the wire with the closed form of the strings, and leaves a sound file and
    /// a picture. Ends with an error if a bar is missed. What is missing on this
    /// machine is installed, or named.
    Play {
        /// Write the figures to this file.
        #[arg(long, value_name = "FILE")]
        json: Option<PathBuf>,
        /// Put the sound, the picture and the captured words here [default:
        /// target/play in the workspace].
        #[arg(long, value_name = "DIR")]
        out: Option<PathBuf>,
        /// Take this run as the expected one of `cargo xtask test`.
        #[arg(long)]
        accept: bool,
    },
    /// Count instructions on every target in the emulator.
    ///
    /// Also compares the kernels bit for bit and the golden stream on every
    /// target. Ends with an error if a count rose by more than 2 %.
    Cycles {
        /// Write the counts to this file.
        #[arg(long, value_name = "FILE")]
        json: Option<PathBuf>,
        /// Take these counts as the expected ones.
        #[arg(long)]
        accept: bool,
    },
    /// Print flash and static memory of the smallest program and of the
    /// demonstration.
    Size,
    /// Check everything: format, lints, documentation, tests, cross-builds, the
    /// emulated board.
    Test {
        /// Only the steps whose names contain this.
        #[arg(value_name = "PART OF A NAME")]
        only: Option<String>,
    },
}

fn main() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Play { json, out, accept } => {
            let out = out.unwrap_or_else(play::default_directory);
            play::run(&out, json.as_deref(), accept)
        }
        Command::Cycles { json, accept } => cycles::run(json.as_deref(), accept),
        Command::Size => size::run(),
        Command::Test { only } => test::run(only.as_deref().unwrap_or_default()),
    };
    match done {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::FAILURE,
        Err(error) => {
            eprintln!("error: {error:#}");
            ExitCode::FAILURE
        }
    }
}
