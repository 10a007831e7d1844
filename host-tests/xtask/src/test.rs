//! `cargo xtask test`: everything that must hold before a change goes in.

use std::collections::BTreeMap;
use std::fs;
use std::process::Command;
use std::time::{Duration, Instant};

use anyhow::{Context, Result, bail};

use crate::play;
use crate::setup::{self, BOARD_TARGET, TARGETS};
use crate::steps::{cargo, root};

/// Files that may hold unsafe code, each with its argument.
const UNSAFE_FILES: [&str; 2] = [
    // The inner loop by hand.
    "modal-core/src/kernel/armv7m.rs",
    // Addresses of the emulated board's registers.
    "firmware-example/mps2-an386/src/firmware/registers.rs",
];

/// Runs the command; whether every step passed.
pub(crate) fn run() -> Result<bool> {
    setup::targets(&TARGETS)?;
    let mut steps = Steps::default();
    steps.command("format", &mut cargo(&["fmt", "--all", "--check"]));
    steps.command(
        "lints on the host",
        &mut cargo(&["clippy", "--all-targets", "--", "-D", "warnings"]),
    );
    steps.command(
        "lints on the board",
        &mut cargo(&[
            "clippy",
            "--release",
            "-p",
            "mps2-an386",
            "--target",
            BOARD_TARGET,
            "--",
            "-D",
            "warnings",
        ]),
    );
    steps.command(
        "documentation",
        cargo(&["doc", "--no-deps", "--workspace", "--exclude", "mps2-an386"])
            .env("RUSTDOCFLAGS", "-D warnings"),
    );
    steps.command(
        "tests",
        &mut cargo(&["test", "--profile", "release-checked"]),
    );
    for target in TARGETS {
        steps.command(
            &format!("build for {target}"),
            &mut cargo(&[
                "build",
                "--release",
                "--target",
                target,
                "-p",
                "modal-core",
                "-p",
                "firmware-example",
            ]),
        );
    }
    steps.check("unsafe only where it is argued", unsafe_files);
    steps.check("no machine's paths", machine_paths);
    steps.check("the performance in the emulator", || {
        if play::run(&root().join("target/play"), None)? {
            Ok(())
        } else {
            bail!("a bar was missed")
        }
    });
    Ok(steps.summary())
}

/// Steps that were done, and how they ended.
#[derive(Default)]
struct Steps {
    done: Vec<(String, Duration, bool)>,
}

impl Steps {
    fn command(&mut self, name: &str, command: &mut Command) {
        self.check(name, || {
            let status = command.status().context("cannot start it")?;
            if status.success() {
                Ok(())
            } else {
                bail!("{status}")
            }
        });
    }

    fn check(&mut self, name: &str, check: impl FnOnce() -> Result<()>) {
        println!("\n== {name}");
        let start = Instant::now();
        let result = check();
        if let Err(error) = &result {
            println!("FAILED {name}: {error:#}");
        }
        self.done
            .push((name.to_owned(), start.elapsed(), result.is_ok()));
    }

    fn summary(&self) -> bool {
        println!();
        for (name, time, passed) in &self.done {
            let word = if *passed { "passed" } else { "FAILED" };
            println!("{word}  {:6.1} s  {name}", time.as_secs_f64());
        }
        let failed = self.done.iter().filter(|(_, _, passed)| !passed).count();
        println!(
            "\nsteps: {} passed, {failed} failed",
            self.done.len() - failed
        );
        failed == 0
    }
}

/// The text of every file that git tracks and that is text.
fn tracked() -> Result<BTreeMap<String, String>> {
    let output = Command::new("git")
        .args(["ls-files", "-z"])
        .current_dir(root())
        .output()
        .context("cannot start git")?;
    let names = String::from_utf8(output.stdout)?;
    Ok(names
        .split_terminator('\0')
        .filter_map(|name| Some((name.to_owned(), fs::read_to_string(root().join(name)).ok()?)))
        .collect())
}

fn unsafe_files() -> Result<()> {
    let word = ["un", "safe"].concat();
    let used = |line: &str| {
        let code = line.split("//").next().unwrap_or_default();
        [" {", " fn", " impl", " extern", "("]
            .iter()
            .any(|after| code.contains(&format!("{word}{after}")))
            || code.contains(&format!("allow({word}_code)"))
    };
    let offenders: Vec<String> = tracked()?
        .into_iter()
        .filter(|(name, _)| name.ends_with(".rs") && !UNSAFE_FILES.contains(&name.as_str()))
        .filter(|(_, text)| text.lines().any(used))
        .map(|(name, _)| name)
        .collect();
    if offenders.is_empty() {
        Ok(())
    } else {
        bail!("{}", offenders.join(", "))
    }
}

fn machine_paths() -> Result<()> {
    let roots: Vec<String> = ["home", "root", "work", "tmp", "Users"]
        .iter()
        .map(|folder| format!("/{folder}/"))
        .collect();
    let offenders: Vec<String> = tracked()?
        .into_iter()
        .filter(|(_, text)| {
            text.lines()
                .any(|line| roots.iter().any(|root| starts_a_path(line, root)))
        })
        .map(|(name, _)| name)
        .collect();
    if offenders.is_empty() {
        Ok(())
    } else {
        bail!("{}", offenders.join(", "))
    }
}

/// Whether `root` stands in `line` as the beginning of a path.
fn starts_a_path(line: &str, root: &str) -> bool {
    line.match_indices(root).any(|(at, _)| {
        let before = line[..at].chars().next_back();
        before.is_none_or(|before| !before.is_alphanumeric() && !".-_/".contains(before))
    })
}
