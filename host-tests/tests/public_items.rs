//! No public function, type or trait of `modal-core` without a test that names it.
//!
//! A name that a test mentions may still be tested badly; one that no test mentions
//! is not tested. Plain constants are left out: bounds are tested as a table.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

use std::collections::BTreeSet;
use std::fs;
use std::path::Path;

/// All Rust files below `directory`, as (path, text).
fn files(directory: &Path) -> Vec<(String, String)> {
    let mut found = Vec::new();
    for entry in fs::read_dir(directory).expect("a directory") {
        let path = entry.expect("an entry").path();
        if path.is_dir() {
            found.extend(files(&path));
        } else if path.extension().is_some_and(|end| end == "rs") {
            let text = fs::read_to_string(&path).expect("a text");
            found.push((path.display().to_string(), text));
        }
    }
    found
}

/// The name that `line` makes public, if it is that of a function, type or trait.
fn public_name(line: &str) -> Option<&str> {
    let mut words = line.trim_start().strip_prefix("pub ")?.split(' ');
    let name = loop {
        match words.next()? {
            "const" | "unsafe" => {}
            "fn" | "struct" | "enum" | "trait" => break words.next()?,
            _ => return None,
        }
    };
    name.split(|c: char| !c.is_alphanumeric() && c != '_')
        .next()
}

fn words(text: &str) -> impl Iterator<Item = &str> {
    text.split(|c: char| !c.is_alphanumeric() && c != '_')
}

#[test]
fn every_public_item_is_named_in_a_test() {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    let own = files(&here.join("../modal-core/src"));
    let mut tested: Vec<String> = Vec::new();
    let mut public = Vec::new();
    for (path, text) in &own {
        let (code, tests) = text
            .split_once("#[cfg(test)]\nmod tests {")
            .unwrap_or((text, ""));
        if path.ends_with("tests.rs") {
            tested.push(text.clone());
            continue;
        }
        tested.push(tests.to_owned());
        public.extend(
            code.lines()
                .filter_map(public_name)
                .map(|name| (path, name)),
        );
    }
    for (path, text) in files(&here.join("tests")) {
        if !path.ends_with("public_items.rs") {
            tested.push(text);
        }
    }
    let tested: BTreeSet<&str> = tested.iter().flat_map(|text| words(text)).collect();
    let missing: Vec<String> = public
        .iter()
        .filter(|(_, name)| !tested.contains(name))
        .map(|(path, name)| format!("{path}: {name}"))
        .collect();
    assert!(
        public.len() > 150,
        "{} found: is the search right?",
        public.len()
    );
    assert!(missing.is_empty(), "no test names {missing:#?}");
}

#[test]
fn names_are_found() {
    assert_eq!(
        public_name("    pub const fn ratio(part: u16)"),
        Some("ratio")
    );
    assert_eq!(
        public_name("pub struct Bank<const M: usize> {"),
        Some("Bank")
    );
    assert_eq!(public_name("pub const ALL: [&Bound; 27] = ["), None);
    assert_eq!(public_name("pub(crate) fn hidden()"), None);
    assert_eq!(public_name("    pub q: i32,"), None);
}
