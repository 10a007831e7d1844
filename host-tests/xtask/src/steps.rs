//! Running programs, with a line that shows that something happens.

use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Duration;

use anyhow::{Context, Result, bail};
use indicatif::ProgressBar;

/// The workspace.
pub(crate) fn root() -> PathBuf {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    here.ancestors().nth(2).unwrap_or(here).to_path_buf()
}

/// A line with the time that passes; it vanishes when dropped, and does not
/// appear at all where the output is not a terminal.
pub(crate) fn progress(what: &str) -> ProgressBar {
    let bar = ProgressBar::new_spinner().with_message(what.to_owned());
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

/// Runs a command and shows its output only if it fails.
pub(crate) fn quietly(what: &str, command: &mut Command) -> Result<()> {
    let bar = progress(what);
    let output = command
        .output()
        .with_context(|| format!("{what}: cannot start {:?}", command.get_program()))?;
    bar.finish_and_clear();
    if output.status.success() {
        return Ok(());
    }
    eprintln!("{}", String::from_utf8_lossy(&output.stdout));
    eprintln!("{}", String::from_utf8_lossy(&output.stderr));
    bail!("{what} failed")
}
