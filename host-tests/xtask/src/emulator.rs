//! The firmware in the emulator, and the files that it leaves.

use std::collections::BTreeMap;
use std::fs::{self, File};
use std::io::ErrorKind;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};
use std::str::FromStr;
use std::time::{Duration, Instant};

use anyhow::{Context, Result, anyhow, bail, ensure};
use firmware_example::command::Applied;
use serde_json::Value;

use crate::setup::{self, BOARD_TARGET, EMULATOR};
use crate::steps::{cargo, progress, quietly};

/// The crate of the emulated board, and QEMU's name of it.
const BOARD: &str = "mps2-an386";

/// The longest that a run may take; it needs about a quarter of a minute.
const TIME_LIMIT: Duration = Duration::from_secs(300);

const WORDS: &str = "words.bin";
const EVENTS: &str = "events.txt";
const REPORT: &str = "report.txt";
/// What the firmware logs, in defmt's coding.
const LOG: &str = "log.defmt";

/// What a run of the firmware left.
pub(crate) struct Run {
    /// Every frame that was on the wire.
    pub(crate) words: Vec<u16>,
    /// The commands that took effect.
    pub(crate) log: Vec<Applied>,
    /// What was counted and measured on the board.
    pub(crate) report: Report,
}

/// `name=value` lines.
pub(crate) struct Report(BTreeMap<String, String>);

impl Report {
    /// The value of a name.
    pub(crate) fn text(&self, name: &str) -> Result<&str> {
        self.0
            .get(name)
            .map(String::as_str)
            .with_context(|| format!("{REPORT}: {name} is missing"))
    }

    /// The value of a name, as a number.
    pub(crate) fn number<T: FromStr>(&self, name: &str) -> Result<T> {
        let text = self.text(name)?;
        text.parse()
            .map_err(|_| anyhow!("{REPORT}: {name}={text} is not a number of its kind"))
    }

    /// All names with their values, in alphabetical order.
    pub(crate) fn lines(&self) -> impl Iterator<Item = (&str, &str)> {
        self.0.iter().map(|(name, value)| (&**name, &**value))
    }
}

impl FromStr for Report {
    type Err = anyhow::Error;

    fn from_str(text: &str) -> Result<Self> {
        text.lines()
            .map(|line| {
                line.split_once('=')
                    .map(|(name, value)| (name.to_owned(), value.to_owned()))
                    .with_context(|| format!("{REPORT}: {line:?} is not name=value"))
            })
            .collect::<Result<_>>()
            .map(Self)
    }
}

/// Builds the firmware, runs it and reads what it left in `directory`.
pub(crate) fn run(directory: &Path) -> Result<Run> {
    setup::targets(&[BOARD_TARGET])?;
    setup::program(&EMULATOR)?;
    let firmware = build()?;
    fs::create_dir_all(directory)
        .with_context(|| format!("cannot make the directory {}", directory.display()))?;
    let directory = directory.canonicalize()?;
    // Nothing that an earlier run left can pass for the result of this one.
    for name in [WORDS, EVENTS, REPORT, LOG] {
        match fs::remove_file(directory.join(name)) {
            Err(error) if error.kind() != ErrorKind::NotFound => return Err(error.into()),
            _ => {}
        }
    }
    let log = directory.join(LOG);
    let emulator = emulator(&firmware, &directory);
    finish(emulator, File::create(&log)?, TIME_LIMIT).with_context(|| {
        format!(
            "the emulated board failed; its log is {} (`defmt-print -e {}` reads it)",
            log.display(),
            firmware.display()
        )
    })?;
    read(&directory)
}

/// Builds the firmware; its file.
fn build() -> Result<PathBuf> {
    let mut build = cargo(&["build", "--release", "-p", BOARD, "--target", BOARD_TARGET]);
    build.arg("--message-format=json-render-diagnostics");
    let messages = quietly("Building the firmware", &mut build)?;
    messages
        .lines()
        .filter_map(|line| serde_json::from_str::<Value>(line).ok())
        .filter(|message| message["target"]["name"] == BOARD)
        .find_map(|message| message["executable"].as_str().map(PathBuf::from))
        .context("cargo did not say where the firmware is")
}

/// The emulator with `firmware`, whose files go into `directory`.
fn emulator(firmware: &Path, directory: &Path) -> Command {
    let mut command = Command::new(EMULATOR.name);
    command
        .args(["-M", BOARD, "-display", "none", "-monitor", "none"])
        .args(["-serial", "null"])
        // An instruction is 2^3 ns: 125 million a second, whatever the host.
        .args(["-icount", "shift=3,sleep=off"])
        // Without an argument, the firmware writes into the current directory.
        .args(["-semihosting-config", "enable=on,target=native"])
        .arg("-kernel")
        .arg(firmware)
        .current_dir(directory);
    command
}

/// Runs `command` to its end, at most for `limit`.
fn finish(mut command: Command, log: File, limit: Duration) -> Result<()> {
    let bar = progress("Playing on the emulated board");
    let start = Instant::now();
    let mut child = command
        .stdin(Stdio::null())
        .stdout(log)
        .spawn()
        .with_context(|| format!("cannot start {}", command.get_program().display()))?;
    let status = loop {
        if let Some(status) = child.try_wait()? {
            break status;
        }
        if start.elapsed() > limit {
            child.kill()?;
            child.wait()?;
            bail!("it did not end within {} s", limit.as_secs());
        }
        std::thread::sleep(Duration::from_millis(50));
    };
    bar.finish_and_clear();
    ensure!(status.success(), "it ended with {status}");
    Ok(())
}

fn read(directory: &Path) -> Result<Run> {
    let open = |name: &str| {
        let path = directory.join(name);
        fs::read(&path).with_context(|| format!("cannot read {}", path.display()))
    };
    let (pairs, rest) = {
        let bytes = open(WORDS)?;
        let (pairs, rest) = bytes.as_chunks::<2>();
        (pairs.to_vec(), rest.len())
    };
    ensure!(rest == 0, "{WORDS}: half a word at the end");
    Ok(Run {
        words: pairs.into_iter().map(u16::from_le_bytes).collect(),
        log: String::from_utf8(open(EVENTS)?)?
            .lines()
            .map(|line| line.parse().with_context(|| format!("{EVENTS}: {line:?}")))
            .collect::<Result<_>>()?,
        report: String::from_utf8(open(REPORT)?)?.parse()?,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_program_that_hangs_is_ended() {
        let mut sleep = Command::new("sleep");
        sleep.arg("60");
        let log = File::options().write(true).open("/dev/null").unwrap();
        let start = Instant::now();
        let error = finish(sleep, log, Duration::from_millis(200)).unwrap_err();
        assert!(error.to_string().contains("did not end"), "{error}");
        assert!(start.elapsed() < Duration::from_secs(30));
    }

    #[test]
    fn a_program_that_fails_is_an_error() {
        let log = File::options().write(true).open("/dev/null").unwrap();
        assert!(finish(Command::new("false"), log, TIME_LIMIT).is_err());
    }

    #[test]
    fn reports_are_read_and_garbage_is_refused() {
        let report: Report = "kernel=portable\nframes=12".parse().unwrap();
        assert_eq!(report.text("kernel").unwrap(), "portable");
        assert_eq!(report.number::<u64>("frames").unwrap(), 12);
        assert!(report.number::<u64>("kernel").is_err());
        assert!(report.text("absent").is_err());
        assert!("no sign".parse::<Report>().is_err());
    }
}
