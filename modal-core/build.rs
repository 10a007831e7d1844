//! Chooses the kernel by the name of the target.
//!
//! `cfg(target_feature = "dsp")` is unset on stable Rust even for cores that
//! have the extension, so a kernel behind it would silently vanish.

fn main() {
    println!("cargo::rustc-check-cfg=cfg(kernel, values(\"armv7m\"))");
    println!("cargo::rerun-if-changed=build.rs");
    let target = std::env::var("TARGET").unwrap_or_default();
    let long_multiply = ["thumbv7m-", "thumbv7em-", "thumbv8m.main-"];
    if long_multiply.iter().any(|name| target.starts_with(name)) {
        println!("cargo::rustc-cfg=kernel=\"armv7m\"");
    }
}
