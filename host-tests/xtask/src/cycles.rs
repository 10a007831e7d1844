//! `cargo xtask cycles`: counted instructions of every kernel, on every target.

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use anyhow::{Context, Result, bail, ensure};
use on_target::golden;

use crate::setup::{self, EMULATOR, Program};
use crate::steps::{cargo, quietly, root};

/// A target, and the machine that emulates it.
struct Machine {
    target: &'static str,
    name: &'static str,
    emulator: Program,
    arguments: &'static [&'static str],
}

const ARM: Program = EMULATOR;
const RISCV: Program = Program {
    name: "qemu-system-riscv32",
    package: "qemu-system-misc",
};

/// One instruction is 64 ns, so that a tick of the board's clock tells single
/// instructions apart; on RISC-V there is a counter of instructions.
const MACHINES: [Machine; 5] = [
    Machine {
        target: "thumbv6m-none-eabi",
        name: "thumbv6m",
        emulator: ARM,
        arguments: &["-M", "mps2-an385", "-icount", "shift=6,sleep=off"],
    },
    Machine {
        target: "thumbv7m-none-eabi",
        name: "thumbv7m",
        emulator: ARM,
        arguments: &["-M", "mps2-an385", "-icount", "shift=6,sleep=off"],
    },
    Machine {
        target: "thumbv7em-none-eabihf",
        name: "thumbv7em",
        emulator: ARM,
        arguments: &["-M", "mps2-an386", "-icount", "shift=6,sleep=off"],
    },
    Machine {
        target: "thumbv8m.main-none-eabihf",
        name: "thumbv8m.main",
        emulator: ARM,
        arguments: &["-M", "mps2-an505", "-icount", "shift=6,sleep=off"],
    },
    Machine {
        target: "riscv32imac-unknown-none-elf",
        name: "riscv32imac",
        emulator: RISCV,
        arguments: &[
            "-M",
            "virt",
            "-bios",
            "none",
            "-icount",
            "shift=0,sleep=off",
        ],
    },
];

/// Counts by name, one map a target.
type Counts = BTreeMap<String, BTreeMap<String, u64>>;

/// Counts that may rise by this before the check fails.
const SLACK: f64 = 0.02;

/// Mode-samples of one block of the scene: 6 strings, 64 modes, 32 frames.
const MODE_SAMPLES: f64 = 6.0 * 64.0 * 32.0;

/// Runs the command; whether no count rose.
pub(crate) fn run(json: Option<&Path>, accept: bool) -> Result<bool> {
    let targets: Vec<&str> = MACHINES.iter().map(|machine| machine.target).collect();
    setup::targets(&targets)?;
    let mut counts = Counts::new();
    for machine in &MACHINES {
        setup::program(&machine.emulator)?;
        counts.insert(machine.name.to_owned(), machine.count()?);
    }
    table(&counts);
    let text = serde_json::to_string_pretty(&counts)? + "\n";
    if let Some(path) = json {
        fs::write(path, &text).with_context(|| format!("cannot write {}", path.display()))?;
    }
    if accept {
        fs::write(expected_path(), text)?;
        println!("\nTaken as expected: {}", expected_path().display());
        return Ok(true);
    }
    let risen = risen(&expected()?, &counts);
    for line in &risen {
        println!("ROSE  {line}");
    }
    if risen.is_empty() {
        println!("\nNo count rose by more than {} %.", 100.0 * SLACK);
    } else {
        println!("\nIf that is meant: cargo xtask cycles --accept");
    }
    Ok(risen.is_empty())
}

fn expected_path() -> PathBuf {
    root().join("host-tests/xtask/expected/counts.json")
}

fn expected() -> Result<Counts> {
    let path = expected_path();
    let text = fs::read_to_string(&path)
        .with_context(|| format!("{}: write it with --accept", path.display()))?;
    Ok(serde_json::from_str(&text)?)
}

/// What is higher than expected, or not there.
fn risen(expected: &Counts, found: &Counts) -> Vec<String> {
    let mut lines = Vec::new();
    for (target, counts) in expected {
        for (name, &before) in counts {
            let now = found.get(target).and_then(|counts| counts.get(name));
            match now {
                None => lines.push(format!("{target}: {name} is missing")),
                Some(&now) if now as f64 > before as f64 * (1.0 + SLACK) + 2.0 => {
                    lines.push(format!("{target}: {name} from {before} to {now}"));
                }
                Some(_) => {}
            }
        }
    }
    lines
}

impl Machine {
    /// Builds and runs the counting program.
    fn count(&self) -> Result<BTreeMap<String, u64>> {
        quietly(
            &format!("Building for {}", self.target),
            &mut cargo(&[
                "build",
                "--release",
                "--package",
                "on-target",
                "--target",
                self.target,
            ]),
        )?;
        let program = root()
            .join("target")
            .join(self.target)
            .join("release/count");
        let mut command = Command::new(self.emulator.name);
        command
            .args(self.arguments)
            .args(["-display", "none", "-serial", "null", "-monitor", "none"])
            .args(["-semihosting-config", "enable=on,target=native"])
            .arg("-kernel")
            .arg(program)
            .stdin(Stdio::null());
        let output = quietly(&format!("Counting on {}", self.name), &mut command)?;
        self.read(&output)
    }

    fn read(&self, output: &str) -> Result<BTreeMap<String, u64>> {
        let mut counts = BTreeMap::new();
        let mut golden = None;
        for (name, value) in output.lines().filter_map(|line| line.split_once('=')) {
            match name {
                "golden" => golden = Some(value.to_owned()),
                "kernel" => {}
                _ => {
                    let value: u64 = value
                        .parse()
                        .with_context(|| format!("{}: {name}={value}", self.name))?;
                    counts.insert(name.to_owned(), value);
                }
            }
        }
        let expected = format!("{:#018x}", golden::EXPECTED);
        ensure!(
            golden.as_deref() == Some(expected.as_str()),
            "{}: the golden stream is {golden:?}, not {expected}",
            self.name
        );
        // The way there and back is a few instructions more.
        let check = counts.remove("instructions_of_4096").unwrap_or(0);
        if check.abs_diff(4_100) > 20 {
            bail!("{}: 4,096 instructions were counted as {check}", self.name);
        }
        Ok(counts)
    }
}

fn table(counts: &Counts) {
    let per_sample = |value: u64| format!("{:.2}", value as f64 / MODE_SAMPLES);
    let plain = |value: u64| value.to_string();
    let per_string = |value: u64| format!("{:.2}", value as f64 / (MODE_SAMPLES / 6.0));
    type Show<'a> = &'a dyn Fn(u64) -> String;
    let rows: [(&str, &str, Show<'_>); 14] = [
        ("exact kernel, a mode and frame", "chord_block", &per_sample),
        (
            "portable kernel, a mode and frame",
            "portable_block",
            &per_sample,
        ),
        (
            "narrow kernel, a mode and frame",
            "narrow_block",
            &per_sample,
        ),
        ("chord of six, worst block", "chord_worst", &plain),
        ("chord of six, mean over 4 s", "chord_mean", &plain),
        ("silent string, a block", "silent_voice", &plain),
        ("converter, a block", "converter_block", &plain),
        ("note, integers only", "note_integer", &plain),
        (
            "coefficients, integers only",
            "coefficients_integer",
            &plain,
        ),
        ("coefficients, f64", "coefficients_f64", &plain),
        ("pluck, f64", "onset_f64", &plain),
        ("pluck added to a string", "superpose", &plain),
        ("coefficients exchanged", "exchange", &plain),
        ("kernels compared, cases", "kernel_cases", &plain),
    ];
    println!("Counted instructions; 6 strings of 64 modes, blocks of 32 frames.");
    println!("Not the cycles of a board.\n");
    print!("{:<36}", "");
    for target in counts.keys() {
        print!("{target:>14}");
    }
    println!();
    let line = |label: &str, name: &str, show: &dyn Fn(u64) -> String| {
        print!("{label:<36}");
        for counts in counts.values() {
            let text = counts
                .get(name)
                .map_or("-".to_owned(), |&value| show(value));
            print!("{text:>14}");
        }
        println!();
    };
    for (label, name, show) in rows {
        line(label, name, show);
    }
    println!("\nWhat one would write first, a mode and frame of one string:");
    let names: Vec<String> = counts
        .values()
        .flat_map(|counts| counts.keys())
        .filter(|name| name.starts_with("baseline "))
        .cloned()
        .collect::<std::collections::BTreeSet<_>>()
        .into_iter()
        .collect();
    for name in names {
        let label = name.trim_start_matches("baseline ");
        line(label, &name, &per_string);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn counts(value: u64) -> Counts {
        let one = BTreeMap::from([("chord_block".to_owned(), value)]);
        Counts::from([("thumbv7em".to_owned(), one)])
    }

    /// The control: a count that rises, or vanishes, is found.
    #[test]
    fn a_count_that_rises_by_more_than_two_percent_is_found() {
        assert!(risen(&counts(10_000), &counts(10_000)).is_empty());
        assert!(risen(&counts(10_000), &counts(10_200)).is_empty());
        assert!(risen(&counts(10_000), &counts(9_000)).is_empty());
        assert_eq!(risen(&counts(10_000), &counts(10_210)).len(), 1);
        assert_eq!(risen(&counts(10_000), &Counts::new()).len(), 1);
    }

    /// The control: another stream, or a clock that is off, is refused.
    #[test]
    fn a_stream_or_a_clock_that_is_off_is_refused() {
        let machine = &MACHINES[0];
        let good = format!(
            "kernel=portable\ninstructions_of_4096=4101\ngolden={:#018x}\nchord_block=7\n",
            golden::EXPECTED
        );
        assert!(machine.read(&good).is_ok());
        let other = format!("{:#018x}", golden::EXPECTED ^ 1);
        let expected = format!("{:#018x}", golden::EXPECTED);
        assert!(machine.read(&good.replace(&expected, &other)).is_err());
        assert!(machine.read(&good.replace("4101", "4400")).is_err());
        assert!(machine.read("kernel=portable\n").is_err());
    }
}
