//! The expected run of the emulated board: what it reports, and a hash of its
//! words, committed.

use std::fs;
use std::path::PathBuf;

use anyhow::{Context, Result, bail};

use crate::emulator::Run;
use crate::steps::root;

const FILE: &str = "host-tests/xtask/expected/mps2-an386.txt";

const ABOUT: &str =
    "# The expected run of the emulated board (`cargo xtask play --accept` writes it).";

/// Lines of the report that change with the compiler, not with the sound.
const LOAD: [&str; 3] = ["instructions_", "budget_", "latest_start_"];

/// Takes `run` as the expected one; the file that now says so.
pub(crate) fn accept(run: &Run) -> Result<PathBuf> {
    let path = root().join(FILE);
    fs::write(&path, print(run)).with_context(|| format!("cannot write {FILE}"))?;
    Ok(path)
}

/// Whether `run` is the expected one.
pub(crate) fn compare(run: &Run) -> Result<()> {
    let expected =
        fs::read_to_string(root().join(FILE)).with_context(|| format!("cannot read {FILE}"))?;
    let differences = differences(&expected, &print(run));
    if differences.is_empty() {
        return Ok(());
    }
    bail!(
        "the run is not the one that {FILE} expects (-: expected, +: now):\n{}\n\
         If this is meant: cargo xtask play --accept",
        differences.join("\n")
    )
}

fn print(run: &Run) -> String {
    let mut text = format!("{ABOUT}\n");
    for (name, value) in run.report.lines() {
        if !LOAD.iter().any(|load| name.starts_with(load)) {
            text += &format!("{name}={value}\n");
        }
    }
    text + &format!("words_fnv1a64={:016x}\n", hash(&run.words))
}

/// FNV-1a, 64 bits (Fowler, Noll and Vo; constants from memory), of the little-endian bytes.
fn hash(words: &[u16]) -> u64 {
    let bytes = words.iter().flat_map(|word| word.to_le_bytes());
    bytes.fold(0xCBF2_9CE4_8422_2325, |hash, byte| {
        (hash ^ u64::from(byte)).wrapping_mul(0x100_0000_01B3)
    })
}

fn differences(expected: &str, now: &str) -> Vec<String> {
    let only = |text: &str, other: &str, sign: char| -> Vec<String> {
        text.lines()
            .filter(|line| !other.lines().any(|its| its == *line))
            .map(|line| format!("{sign} {line}"))
            .collect()
    };
    let mut all = only(expected, now, '-');
    all.extend(only(now, expected, '+'));
    all
}

#[cfg(test)]
mod tests {
    use super::*;

    fn run(words: &[u16], report: &str) -> Run {
        Run {
            words: words.to_vec(),
            log: Vec::new(),
            report: report.parse().unwrap(),
        }
    }

    #[test]
    fn one_bit_or_one_count_is_a_difference() {
        let expected = print(&run(&[1, 2, 3], "clipped=0\ninstructions_per_frame_mean=7"));
        let same = print(&run(&[1, 2, 3], "clipped=0\ninstructions_per_frame_mean=8"));
        let word = print(&run(&[1, 2, 2], "clipped=0"));
        let count = print(&run(&[1, 2, 3], "clipped=1"));
        assert!(differences(&expected, &same).is_empty());
        assert_eq!(differences(&expected, &word).len(), 2);
        assert_eq!(
            differences(&expected, &count),
            ["- clipped=0", "+ clipped=1"]
        );
    }

    #[test]
    fn the_hash_is_the_published_one() {
        // FNV-1a of nothing, and of "foobar" (published test vectors; from memory).
        assert_eq!(hash(&[]), 0xCBF2_9CE4_8422_2325);
        let foobar = [*b"fo", *b"ob", *b"ar"].map(u16::from_le_bytes);
        assert_eq!(hash(&foobar), 0x8594_4171_F739_67E8);
    }
}
