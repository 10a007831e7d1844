//! Makes sure that what a command needs is there.

use std::process::{Command, Stdio};

use anyhow::{Context, Result, bail};

use crate::steps::root;

/// The emulated board's target.
pub(crate) const BOARD_TARGET: &str = "thumbv7em-none-eabihf";

/// Every target that the core must build for.
pub(crate) const TARGETS: [&str; 5] = [
    "thumbv6m-none-eabi",
    "thumbv7m-none-eabi",
    BOARD_TARGET,
    "thumbv8m.main-none-eabihf",
    "riscv32imac-unknown-none-elf",
];

/// Adds the `targets` that the toolchain lacks, through rustup.
pub(crate) fn targets(targets: &[&str]) -> Result<()> {
    let installed = Command::new("rustup")
        .args(["target", "list", "--installed"])
        .current_dir(root())
        .output();
    let Ok(installed) = installed else {
        // A toolchain without rustup has its targets or the build says so.
        return Ok(());
    };
    let installed = String::from_utf8_lossy(&installed.stdout).into_owned();
    let missing: Vec<&str> = targets
        .iter()
        .copied()
        .filter(|target| !installed.lines().any(|line| line.trim() == *target))
        .collect();
    if missing.is_empty() {
        return Ok(());
    }
    println!("Adding Rust targets: {}", missing.join(", "));
    let status = Command::new("rustup")
        .args(["target", "add"])
        .args(&missing)
        .current_dir(root())
        .status()?;
    if !status.success() {
        bail!("`rustup target add {}` failed", missing.join(" "));
    }
    Ok(())
}

/// Makes sure that `program` runs, from the Debian package `package` if it must
/// be installed and may be.
pub(crate) fn program(program: &str, package: &str) -> Result<()> {
    if runs(program) {
        return Ok(());
    }
    let by_hand = format!(
        "`{program}` is needed and was not found; install it (Debian and Ubuntu: `sudo apt-get \
         install --no-install-recommends {package}`) and run the command again"
    );
    if !(is_root() && runs("apt-get")) {
        bail!(by_hand);
    }
    println!("Installing {package}");
    for arguments in [
        vec!["update", "-qq"],
        // Without recommended packages: they are many, and not needed.
        vec!["install", "-y", "-qq", "--no-install-recommends", package],
    ] {
        let status = Command::new("apt-get")
            .args(&arguments)
            .env("DEBIAN_FRONTEND", "noninteractive")
            .stdin(Stdio::null())
            .stdout(Stdio::null())
            .status()
            .with_context(|| by_hand.clone())?;
        if !status.success() {
            bail!("`apt-get {}` failed; {by_hand}", arguments.join(" "));
        }
    }
    if runs(program) {
        Ok(())
    } else {
        bail!(by_hand)
    }
}

fn runs(program: &str) -> bool {
    Command::new(program)
        .arg("--version")
        .stdin(Stdio::null())
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .status()
        .is_ok_and(|status| status.success())
}

fn is_root() -> bool {
    Command::new("id")
        .arg("-u")
        .output()
        .is_ok_and(|output| output.stdout.trim_ascii() == b"0")
}
