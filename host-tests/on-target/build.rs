//! Memory of the emulated boards, and the linker scripts of their runtimes.

use std::path::PathBuf;
use std::{env, fs};

const MPS2: &str = "\
MEMORY
{
    FLASH : ORIGIN = 0x00000000, LENGTH = 4M
    RAM : ORIGIN = 0x20000000, LENGTH = 4M
}
";

const MPS2_SECURE: &str = "\
MEMORY
{
    FLASH : ORIGIN = 0x10000000, LENGTH = 4M
    RAM : ORIGIN = 0x38000000, LENGTH = 2M
}
";

const RISCV_VIRT: &str = "\
MEMORY
{
    FLASH : ORIGIN = 0x80000000, LENGTH = 4M
    RAM : ORIGIN = 0x80400000, LENGTH = 4M
}
REGION_ALIAS(\"REGION_TEXT\", FLASH);
REGION_ALIAS(\"REGION_RODATA\", FLASH);
REGION_ALIAS(\"REGION_DATA\", RAM);
REGION_ALIAS(\"REGION_BSS\", RAM);
REGION_ALIAS(\"REGION_HEAP\", RAM);
REGION_ALIAS(\"REGION_STACK\", RAM);
";

fn main() {
    println!("cargo::rerun-if-changed=build.rs");
    let target = env::var("TARGET").unwrap_or_default();
    let memory = if target.starts_with("thumbv8m.main") {
        MPS2_SECURE
    } else if target.starts_with("thumb") {
        MPS2
    } else if target.starts_with("riscv32") {
        RISCV_VIRT
    } else {
        return;
    };
    let Some(out) = env::var_os("OUT_DIR").map(PathBuf::from) else {
        return;
    };
    if let Err(error) = fs::write(out.join("memory.x"), memory) {
        println!("cargo::error=memory.x: {error}");
    }
    println!("cargo::rustc-link-search={}", out.display());
    if target.starts_with("riscv32") {
        println!("cargo::rustc-link-arg-bins=-Tmemory.x");
    } else {
        println!("cargo::rustc-link-arg-bins=--nmagic");
    }
    println!("cargo::rustc-link-arg-bins=-Tlink.x");
}
