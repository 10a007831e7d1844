//! Makes sure that what a command needs is there.

use std::path::Path;
use std::process::{Command, Stdio};

use anyhow::{Context, Result, bail};

use crate::steps::{progress, root};

/// The emulated board's target.
pub(crate) const BOARD_TARGET: &str = "thumbv7em-none-eabihf";

/// Every target that the core and the player must build for.
pub(crate) const TARGETS: [&str; 5] = [
    "thumbv6m-none-eabi",
    "thumbv7m-none-eabi",
    BOARD_TARGET,
    "thumbv8m.main-none-eabihf",
    "riscv32imac-unknown-none-elf",
];

/// A program, and the Debian package that it comes in.
pub(crate) struct Program {
    pub(crate) name: &'static str,
    pub(crate) package: &'static str,
}

/// The emulator of the board.
pub(crate) const EMULATOR: Program = Program {
    name: "qemu-system-arm",
    package: "qemu-system-arm",
};

/// Adds the `targets` that the toolchain lacks, through rustup.
pub(crate) fn targets(targets: &[&str]) -> Result<()> {
    let sysroot = Command::new("rustc")
        .args(["--print", "sysroot"])
        .current_dir(root())
        .output()
        .context("cannot start rustc")?;
    let sysroot = String::from_utf8(sysroot.stdout)?;
    let libraries = Path::new(sysroot.trim()).join("lib/rustlib");
    let missing: Vec<&str> = targets
        .iter()
        .copied()
        .filter(|target| !libraries.join(target).is_dir())
        .collect();
    if missing.is_empty() {
        return Ok(());
    }
    let names = missing.join(" ");
    let bar = progress(&format!("Adding to the Rust toolchain: {names}"));
    let output = Command::new("rustup")
        .args(["target", "add"])
        .args(&missing)
        .current_dir(root())
        .stdin(Stdio::null())
        .output();
    bar.finish_and_clear();
    match output {
        Ok(output) if output.status.success() => Ok(()),
        Ok(output) => bail!(
            "`rustup target add {names}` failed: {}",
            String::from_utf8_lossy(&output.stderr).trim()
        ),
        Err(_) => bail!(
            "the Rust toolchain lacks {names}, and there is no rustup to add it: \
             install the standard library of these targets"
        ),
    }
}

/// Makes sure that `program` is there: installs its package where this user may
/// (root on Debian and its relatives), else says what to install.
pub(crate) fn program(program: &Program) -> Result<()> {
    let Program { name, package } = program;
    if runs(name) {
        return Ok(());
    }
    let by_hand = format!(
        "{name} is needed and was not found. Install it, then try again.\n  \
         Debian, Ubuntu: sudo apt-get install --no-install-recommends {package}\n  \
         elsewhere: the package of your system that holds {name}"
    );
    if !(is_root() && runs("apt-get")) {
        bail!(by_hand);
    }
    let bar = progress(&format!("Installing {package}"));
    for arguments in [
        vec!["update", "-qq"],
        // Recommended packages are many, not needed, and not always there.
        vec!["install", "-y", "-qq", "--no-install-recommends", package],
    ] {
        let output = Command::new("apt-get")
            .args(&arguments)
            .env("DEBIAN_FRONTEND", "noninteractive")
            .stdin(Stdio::null())
            .output()
            .with_context(|| by_hand.clone())?;
        if !output.status.success() {
            eprint!("{}", String::from_utf8_lossy(&output.stderr));
            bail!("`apt-get {}` failed.\n{by_hand}", arguments.join(" "));
        }
    }
    bar.finish_and_clear();
    if runs(name) { Ok(()) } else { bail!(by_hand) }
}

fn runs(program: &str) -> bool {
    Command::new(program)
        .arg("--version")
        .stdin(Stdio::null())
        .output()
        .is_ok_and(|output| output.status.success())
}

fn is_root() -> bool {
    Command::new("id")
        .arg("-u")
        .output()
        .is_ok_and(|output| output.stdout.trim_ascii() == b"0")
}
