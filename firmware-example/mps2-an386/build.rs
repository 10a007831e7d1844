//! Hands the linker its scripts: the board's memory, and the tables of the
//! runtime and of the logger.

fn main() {
    println!("cargo::rerun-if-changed=build.rs");
    println!("cargo::rerun-if-changed=memory.x");
    println!("cargo::rerun-if-changed=device.x");
    let bare_metal = std::env::var("CARGO_CFG_TARGET_OS").is_ok_and(|os| os == "none");
    if let (true, Ok(here)) = (bare_metal, std::env::var("CARGO_MANIFEST_DIR")) {
        println!("cargo::rustc-link-search={here}");
        println!("cargo::rustc-link-arg-bins=-Tlink.x");
        println!("cargo::rustc-link-arg-bins=-Tdefmt.x");
    }
}
