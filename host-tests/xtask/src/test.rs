//! `cargo xtask test`: everything that must hold before a change goes in.

use std::process::Command;
use std::time::{Duration, Instant};

use anyhow::{Context, Result, bail, ensure};
use console::style;

use crate::setup::{self, BOARD_TARGET, TARGETS};
use crate::steps::cargo;
use crate::{cycles, hygiene, play};

/// A step and its name.
struct Step {
    name: String,
    work: Box<dyn Fn() -> Result<()>>,
}

/// A step that was done.
struct Done {
    name: String,
    time: Duration,
    passed: bool,
}

/// Does the steps whose names contain `only`; whether all of them passed.
pub(crate) fn run(only: &str) -> Result<bool> {
    let mut steps = steps();
    steps.retain(|step| step.name.contains(only));
    ensure!(!steps.is_empty(), "no step has {only:?} in its name");
    setup::targets(&TARGETS)?;
    let count = steps.len();
    let done: Vec<Done> = (1..)
        .zip(steps)
        .map(|(number, step)| {
            println!("\n[{number}/{count}] {}", style(&step.name).bold());
            step.run()
        })
        .collect();
    Ok(summary(&done))
}

fn steps() -> Vec<Step> {
    let mut steps = vec![
        Step::cargo("format", &["fmt", "--all", "--check"]),
        Step::new("files", hygiene::check),
        Step::cargo(
            "lints, host",
            &["clippy", "--quiet", "--all-targets", "--", "-Dwarnings"],
        ),
        Step::cargo(
            "lints, board",
            &[
                "clippy",
                "--quiet",
                "--release",
                "--package",
                "mps2-an386",
                "--target",
                BOARD_TARGET,
                "--",
                "-Dwarnings",
            ],
        ),
        Step::new("documentation", || {
            let mut doc = cargo(&["doc", "--quiet", "--no-deps"]);
            succeed(doc.env("RUSTDOCFLAGS", "-Dwarnings"))
        }),
        Step::new("tests, host", || {
            let mut test = cargo(&[
                "test",
                "--profile",
                "release-checked",
                "--package",
                "modal-core",
                "--package",
                "firmware-example",
                "--package",
                "host-tests",
                "--package",
                "on-target",
            ]);
            // The same random inputs every time: a search for new ones is
            // `cargo test` with PROPTEST_CASES.
            succeed(test.env("PROPTEST_RNG_SEED", "20261201"))
        }),
        Step::cargo("tests, commands", &["test", "--package", "xtask"]),
    ];
    steps.extend(TARGETS.map(|target| {
        Step::cargo(
            &format!("build, {target}"),
            &[
                "build",
                "--quiet",
                "--release",
                "--package",
                "modal-core",
                "--package",
                "firmware-example",
                "--target",
                target,
            ],
        )
    }));
    steps.push(Step::new(
        "instructions and golden stream, every target",
        || {
            ensure!(cycles::run(None, false)?, "a count rose");
            Ok(())
        },
    ));
    steps.push(Step::new("emulated board", || {
        ensure!(play::test()?, "a bar is missed");
        Ok(())
    }));
    steps
}

impl Step {
    fn new(name: &str, work: impl Fn() -> Result<()> + 'static) -> Self {
        Self {
            name: name.to_owned(),
            work: Box::new(work),
        }
    }

    fn cargo(name: &str, arguments: &[&'static str]) -> Self {
        let arguments = arguments.to_vec();
        Self::new(name, move || succeed(&mut cargo(&arguments)))
    }

    fn run(self) -> Done {
        let start = Instant::now();
        let result = (self.work)();
        if let Err(error) = &result {
            println!("{} {}: {error:#}", style("failed").red().bold(), self.name);
        }
        Done {
            name: self.name,
            time: start.elapsed(),
            passed: result.is_ok(),
        }
    }
}

/// Runs a command that shows its own output.
fn succeed(command: &mut Command) -> Result<()> {
    let status = command.status().context("cannot start it")?;
    if !status.success() {
        let arguments: Vec<_> = command
            .get_args()
            .map(|one| one.to_string_lossy())
            .collect();
        bail!("`cargo {}` ended with {status}", arguments.join(" "));
    }
    Ok(())
}

/// Prints how every step ended; whether all of them passed.
fn summary(done: &[Done]) -> bool {
    println!();
    for Done { name, time, passed } in done {
        let word = if *passed {
            style("passed").green()
        } else {
            style("failed").red().bold()
        };
        println!("{word}  {:7.1} s  {name}", time.as_secs_f64());
    }
    let total: Duration = done.iter().map(|step| step.time).sum();
    println!("        {:7.1} s  together", total.as_secs_f64());
    let failed = done.iter().filter(|step| !step.passed).count();
    println!("\n{} passed, {failed} failed", done.len() - failed);
    failed == 0
}
