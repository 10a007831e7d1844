//! The firmware in the emulator, and the files that it leaves.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use anyhow::{Context, Result, bail};
use firmware_example::command::Applied;

use crate::setup::{self, BOARD_TARGET};
use crate::steps::{cargo, progress, quietly, root};

/// The longest that a run may take; it needs about a quarter of a minute.
const TIME_LIMIT: Duration = Duration::from_secs(300);

/// What a run of the firmware left.
pub(crate) struct Run {
    /// Every frame that was on the wire.
    pub(crate) words: Vec<u16>,
    /// The commands that took effect.
    pub(crate) log: Vec<Applied>,
    /// `name=value` lines.
    pub(crate) report: BTreeMap<String, String>,
}

impl Run {
    /// A figure of the report.
    pub(crate) fn figure(&self, name: &str) -> Result<f64> {
        let text = self.text(name)?;
        text.parse()
            .with_context(|| format!("report: {name}={text} is not a number"))
    }

    /// A text of the report.
    pub(crate) fn text(&self, name: &str) -> Result<&str> {
        self.report
            .get(name)
            .map(String::as_str)
            .with_context(|| format!("report: {name} is missing"))
    }
}

/// Builds the firmware, runs it and reads what it left in `directory`.
pub(crate) fn run(directory: &Path) -> Result<Run> {
    setup::targets(&[BOARD_TARGET])?;
    setup::program("qemu-system-arm", "qemu-system-arm")?;
    quietly(
        "Building the firmware",
        &mut cargo(&[
            "build",
            "--release",
            "-p",
            "mps2-an386",
            "--target",
            BOARD_TARGET,
        ]),
    )?;
    let firmware = root()
        .join("target")
        .join(BOARD_TARGET)
        .join("release/mps2-an386");

    fs::create_dir_all(directory)?;
    let directory = directory.canonicalize()?;
    let argument = format!(
        "enable=on,target=native,arg=modal,arg={}/",
        directory.display()
    );
    let mut command = Command::new("qemu-system-arm");
    command
        .args(["-M", "mps2-an386", "-display", "none", "-serial", "null"])
        .args(["-monitor", "none"])
        // One instruction is 8 ns: 125 million a second, whatever the host.
        .args(["-icount", "shift=3,sleep=off"])
        .args(["-semihosting-config", &argument])
        .arg("-kernel")
        .arg(firmware);
    wait(command)?;

    let bytes = fs::read(directory.join("words.bin"))?;
    let words = bytes
        .chunks_exact(2)
        .map(|pair| u16::from_le_bytes([pair[0], pair[1]]))
        .collect();
    let log = fs::read_to_string(directory.join("events.txt"))?
        .lines()
        .map(|line| line.parse().with_context(|| format!("events: {line:?}")))
        .collect::<Result<_>>()?;
    let report = fs::read_to_string(directory.join("report.txt"))?
        .lines()
        .filter_map(|line| line.split_once('='))
        .map(|(name, value)| (name.to_owned(), value.to_owned()))
        .collect();
    Ok(Run { words, log, report })
}

fn wait(mut command: Command) -> Result<()> {
    let bar = progress("Playing in the emulator");
    let start = Instant::now();
    let mut child = command
        .stdin(Stdio::null())
        // The log of the firmware, in defmt's own coding.
        .stdout(Stdio::null())
        .spawn()
        .context("cannot start qemu-system-arm")?;
    loop {
        if let Some(status) = child.try_wait()? {
            bar.finish_and_clear();
            if !status.success() {
                bail!("the firmware ended with {status}");
            }
            return Ok(());
        }
        if start.elapsed() > TIME_LIMIT {
            child.kill()?;
            bail!("the firmware did not end within {} s", TIME_LIMIT.as_secs());
        }
        std::thread::sleep(Duration::from_millis(50));
    }
}
