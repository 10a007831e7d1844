//! `cargo xtask size`: flash and static memory.

use std::fs;
use std::path::Path;

use anyhow::{Context, Result};
use modal_core::bank::{Increment, Resonator};
use modal_core::quantise::Coefficients;
use object::{Object as _, ObjectSection as _, SectionFlags, SectionKind};

use crate::setup::{self, BOARD_TARGET, TARGETS};
use crate::steps::{cargo, quietly, root};

/// Flag of a section that is loaded.
const ALLOCATED: u64 = 2;

/// What a program takes, in bytes.
struct Size {
    flash: u64,
    memory: u64,
}

impl Size {
    fn of(program: &Path) -> Result<Self> {
        let data =
            fs::read(program).with_context(|| format!("cannot read {}", program.display()))?;
        let file = object::File::parse(&*data)?;
        let mut size = Self {
            flash: 0,
            memory: 0,
        };
        for section in file.sections() {
            let SectionFlags::Elf { sh_flags } = section.flags() else {
                continue;
            };
            // Some runtimes describe what is left for the stack as a section.
            let left_over = matches!(section.name(), Ok(".stack" | ".heap"));
            if sh_flags & ALLOCATED == 0 || left_over {
                continue;
            }
            match section.kind() {
                SectionKind::UninitializedData => size.memory += section.size(),
                SectionKind::Data => {
                    // Kept in flash, copied to memory at the start.
                    size.flash += section.size();
                    size.memory += section.size();
                }
                _ => size.flash += section.size(),
            }
        }
        Ok(size)
    }
}

/// Runs the command.
pub(crate) fn run() -> Result<bool> {
    setup::targets(&TARGETS)?;
    println!("Bytes; the stack is not among them.\n");
    println!("{:<52}{:>10}{:>10}", "", "flash", "memory");
    for target in TARGETS {
        let name = format!("one string of 32 modes, {target}");
        row(&name, "on-target", "smallest", target)?;
    }
    row(
        "the demonstration, emulated board",
        "mps2-an386",
        "mps2-an386",
        BOARD_TARGET,
    )?;
    println!();
    println!("a sounding mode       {:>4}", size_of::<Resonator>());
    println!("a mode of a start     {:>4}", size_of::<Increment>());
    let per_mode = size_of::<Coefficients<65>>() - size_of::<Coefficients<64>>();
    println!("a mode to exchange    {per_mode:>4}");
    Ok(true)
}

fn row(name: &str, package: &str, program: &str, target: &str) -> Result<()> {
    quietly(
        &format!("Building {program} for {target}"),
        &mut cargo(&[
            "build",
            "--release",
            "--package",
            package,
            "--target",
            target,
        ]),
    )?;
    let path = root()
        .join("target")
        .join(target)
        .join("release")
        .join(program);
    let Size { flash, memory } = Size::of(&path)?;
    println!("{name:<52}{flash:>10}{memory:>10}");
    Ok(())
}
