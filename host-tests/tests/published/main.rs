//! Values from outside the project: books, standards, handbooks, tables and
//! reference programs, one file a source. Prints how many were compared.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod astm_a228;
mod auditory_list;
mod computed_reference;
mod diffy_qs;
mod inharmonicity_papers;
mod iso_226;
mod openstax;
mod problem_collections;
mod scipy;
mod technicians_list;

use std::process::ExitCode;

/// One value that somebody else states.
pub(crate) struct Check {
    what: String,
    computed: f64,
    stated: f64,
    tolerance: f64,
}

/// `computed` has to lie within `tolerance` (absolute) of `stated`.
pub(crate) fn check(what: impl Into<String>, computed: f64, stated: f64, tolerance: f64) -> Check {
    Check {
        what: what.into(),
        computed,
        stated,
        tolerance,
    }
}

/// The same with a relative tolerance.
pub(crate) fn check_share(
    what: impl Into<String>,
    computed: f64,
    stated: f64,
    share: f64,
) -> Check {
    check(what, computed, stated, share * stated.abs())
}

/// A source, how far it is to be trusted, and its values.
pub(crate) struct Source {
    name: &'static str,
    /// A forum post or a list: only as a second opinion.
    weak: bool,
    checks: Vec<Check>,
}

impl Source {
    pub(crate) fn new(name: &'static str, checks: Vec<Check>) -> Self {
        Self {
            name,
            weak: false,
            checks,
        }
    }

    pub(crate) fn weak(name: &'static str, checks: Vec<Check>) -> Self {
        Self {
            name,
            weak: true,
            checks,
        }
    }
}

fn main() -> ExitCode {
    let sources = [
        openstax::source(),
        diffy_qs::source(),
        scipy::source(),
        computed_reference::source(),
        inharmonicity_papers::source(),
        iso_226::source(),
        auditory_list::source(),
        astm_a228::source(),
        problem_collections::source(),
        technicians_list::source(),
    ];
    let (mut compared, mut failed) = (0, 0);
    for source in &sources {
        let weak = if source.weak { " (weak)" } else { "" };
        println!("{:3} values  {}{weak}", source.checks.len(), source.name);
        for check in &source.checks {
            compared += 1;
            let off = (check.computed - check.stated).abs();
            // Written so that NaN fails.
            if off <= check.tolerance {
                continue;
            }
            failed += 1;
            println!(
                "    FAILED {}: computed {}, stated {}, allowed {:e} off",
                check.what, check.computed, check.stated, check.tolerance
            );
        }
    }
    println!(
        "{compared} outside values from {} sources compared",
        sources.len()
    );
    println!("\nvalues: {} passed, {failed} failed", compared - failed);
    if failed == 0 && compared >= 45 && sources.len() >= 8 {
        ExitCode::SUCCESS
    } else {
        ExitCode::FAILURE
    }
}
