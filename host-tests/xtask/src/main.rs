//! The project's commands: `cargo xtask play`, `cargo xtask test`, …

mod bars;
mod emulator;
mod picture;
mod play;
mod setup;
mod steps;
mod test;

use std::path::PathBuf;
use std::process::ExitCode;

use clap::{Parser, Subcommand};

/// Commands of the modal string project.
#[derive(Parser)]
#[command(name = "cargo xtask", bin_name = "cargo xtask")]
struct Arguments {
    #[command(subcommand)]
    command: Command,
}

#[derive(Subcommand)]
enum Command {
    /// Run the firmware in the emulator, listen to its DAC words, and compare
    /// them with the closed form of the strings.
    Play {
        /// Write the measured figures to this file.
        #[arg(long, value_name = "FILE")]
        json: Option<PathBuf>,
        /// Put the sound, the picture and the captured words here.
        #[arg(long, value_name = "DIR", default_value = "target/play")]
        out: PathBuf,
    },
    /// Check everything: style, docs, host tests, cross-builds, the emulator.
    Test,
}

fn main() -> ExitCode {
    let done = match Arguments::parse().command {
        Command::Play { json, out } => play::run(&out, json.as_deref()),
        Command::Test => test::run(),
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
