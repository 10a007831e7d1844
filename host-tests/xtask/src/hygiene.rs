//! What no file of the project may hold.

use std::fs;
use std::process::Command;

use anyhow::{Context, Result, ensure};

use crate::steps::root;

/// Files that may hold unsafe code: each is about nothing else, and argues it.
const UNSAFE_FILES: [&str; 2] = [
    // The inner loop by hand.
    "modal-core/src/kernel/armv7m.rs",
    // Addresses of the emulated board's registers.
    "firmware-example/mps2-an386/src/firmware/registers.rs",
];

/// Hosts that a link may lead to: published sources and licences.
const HOSTS: [&str; 9] = [
    "crates.io",
    "docs.rs",
    "doi.org",
    "github.com",
    "openstax.org",
    "opensource.org",
    "rustup.rs",
    "www.apache.org",
    "www.w3.org",
];

/// Where the lock file says that packages come from: the public index, by its
/// usual name.
const INDEX: &str = "\"registry+https://github.com/rust-lang/crates.io-index\"";

/// Directories that paths of a machine start with.
const DIRECTORIES: [&str; 7] = ["home", "mnt", "opt", "root", "tmp", "Users", "work"];

/// Checks every text file that git tracks or would track.
pub(crate) fn check() -> Result<()> {
    let mut found = Vec::new();
    for (name, text) in files()? {
        for (number, line) in (1..).zip(text.lines()) {
            if let Some(what) = fault(&name, line) {
                found.push(format!("{name}:{number}: {what}: {}", line.trim()));
            }
        }
    }
    ensure!(found.is_empty(), "\n{}", found.join("\n"));
    Ok(())
}

fn files() -> Result<Vec<(String, String)>> {
    let output = Command::new("git")
        .args([
            "ls-files",
            "-z",
            "--cached",
            "--others",
            "--exclude-standard",
        ])
        .current_dir(root())
        .output()
        .context("cannot start git")?;
    ensure!(
        output.status.success(),
        "`git ls-files` failed: {}",
        String::from_utf8_lossy(&output.stderr).trim()
    );
    let names = String::from_utf8(output.stdout)?;
    let files: Vec<_> = names
        .split_terminator('\0')
        .filter_map(|name| Some((name.to_owned(), fs::read_to_string(root().join(name)).ok()?)))
        .collect();
    ensure!(!files.is_empty(), "git lists no files");
    Ok(files)
}

/// What is wrong with a line of a file.
fn fault(name: &str, line: &str) -> Option<&'static str> {
    if name.ends_with("Cargo.lock") {
        let source = line.strip_prefix("source = ");
        return source
            .is_some_and(|source| source != INDEX)
            .then_some("package from elsewhere");
    }
    if hosts(line).any(|host| !HOSTS.contains(&host)) {
        return Some("link to a host that is not on the list");
    }
    if DIRECTORIES
        .iter()
        .any(|directory| has_path(line, directory))
    {
        return Some("path of a machine");
    }
    if name.ends_with(".toml")
        && ["[source", "[registr", "replace-with"]
            .iter()
            .any(|key| line.trim_start().starts_with(key))
    {
        return Some("registry of a machine");
    }
    (name.ends_with(".rs") && !UNSAFE_FILES.contains(&name) && is_unsafe(line))
        .then_some("unsafe code outside its files")
}

fn hosts(line: &str) -> impl Iterator<Item = &str> {
    let links = line.match_indices("://");
    links.filter_map(|(at, mark)| {
        line[at + mark.len()..]
            .split(|c: char| !(c.is_ascii_alphanumeric() || ".-:@".contains(c)))
            .next()
            .filter(|host| !host.is_empty())
    })
}

/// Whether an absolute path that starts with `directory` stands in `line`.
fn has_path(line: &str, directory: &str) -> bool {
    let start = format!("/{directory}/");
    line.match_indices(&start).any(|(at, _)| {
        let before = line[..at].chars().next_back();
        before.is_none_or(|before| !before.is_alphanumeric() && !".-_/})".contains(before))
    })
}

/// Whether the keyword stands in the code of `line`, or is allowed there.
fn is_unsafe(line: &str) -> bool {
    let code = line.split("//").next().unwrap_or_default();
    let words = code.split(|c: char| !(c.is_alphanumeric() || c == '_' || c == '"'));
    let allowed = code.contains("allow(") || code.contains("expect(");
    words
        .into_iter()
        .any(|word| word == "unsafe" || (allowed && word == "unsafe_code"))
}

#[cfg(test)]
mod tests {
    use super::*;

    const ELSEWHERE: &str = "modal-core/src/bank.rs";

    #[test]
    fn faults_are_found() {
        for (name, line) in [
            (ELSEWHERE, ["    un", "safe { run() }"].concat()),
            (ELSEWHERE, ["#[un", "safe(no_mangle)]"].concat()),
            (ELSEWHERE, ["#![allow(un", "safe_code)]"].concat()),
            ("README.md", ["see /ho", "me/me/notes"].concat()),
            ("README.md", ["`/tm", "p/out`"].concat()),
            ("docs/model.md", ["https:/", "/mirror.example/x"].concat()),
            ("docs/model.md", ["https:/", "/crates.io:8443/x"].concat()),
            (".cargo/config.toml", "[source.crates-io]".to_owned()),
            ("Cargo.lock", "source = \"git+ssh\"".to_owned()),
        ] {
            assert!(fault(name, &line).is_some(), "{name}: {line}");
        }
    }

    #[test]
    fn the_rest_is_let_through() {
        for (name, line) in [
            (ELSEWHERE, "// nothing unsafe here"),
            (ELSEWHERE, "let word = \"unsafe\";"),
            (UNSAFE_FILES[0], "unsafe { run() }"),
            ("Cargo.toml", "unsafe_code = \"deny\""),
            ("README.md", "see target/tmp/out and a/work/b"),
            ("README.md", "https://doi.org/10.1121/1.429343"),
            ("Cargo.lock", "name = \"libm\""),
        ] {
            assert!(fault(name, line).is_none(), "{name}: {line}");
        }
    }
}
