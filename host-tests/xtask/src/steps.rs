//! Running programs, with a line that shows that something happens.

use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Duration;

use anyhow::{Context, Result, bail};
use indicatif::{ProgressBar, ProgressStyle};

/// The workspace.
pub(crate) fn root() -> PathBuf {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    here.ancestors().nth(2).unwrap_or(here).to_path_buf()
}

/// A line with the time that passes; it vanishes when dropped. Where there is no
/// terminal, the line is printed once.
pub(crate) fn progress(what: &str) -> ProgressBar {
    if !console::user_attended_stderr() {
        eprintln!("{what} ...");
        return ProgressBar::hidden();
    }
    let bar = ProgressBar::new_spinner().with_message(what.to_owned());
    if let Ok(style) = ProgressStyle::with_template("{spinner} {msg}, {elapsed}") {
        bar.set_style(style);
    }
    bar.enable_steady_tick(Duration::from_millis(120));
    bar
}

/// `cargo` with arguments, in the workspace.
pub(crate) fn cargo(arguments: &[&str]) -> Command {
    let program = std::env::var_os("CARGO").unwrap_or_else(|| "cargo".into());
    let mut command = Command::new(program);
    command.args(arguments).current_dir(root());
    command
}

/// Runs a command for what it prints; the rest of its output is shown only if
/// it fails.
pub(crate) fn quietly(what: &str, command: &mut Command) -> Result<String> {
    let bar = progress(what);
    let output = command
        .output()
        .with_context(|| format!("cannot start {}", command.get_program().display()))?;
    bar.finish_and_clear();
    if !output.status.success() {
        eprint!("{}", String::from_utf8_lossy(&output.stderr));
        bail!("{what}: {}", output.status);
    }
    Ok(String::from_utf8_lossy(&output.stdout).into_owned())
}
