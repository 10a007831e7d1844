//! The level meter.

use firmware_example::meter::{FLOOR_DBFS, Meter, dbfs};

#[test]
fn the_level_is_within_its_stated_error() {
    let mut worst = 0.0_f64;
    for step in 0..100_000_u32 {
        let peak = (f64::from(step) * 2.2e-4).exp() as u32;
        let exact = 20.0 * (f64::from(peak) / 2_147_483_648.0).log10();
        worst = worst.max((f64::from(dbfs(peak)) - exact).abs());
    }
    assert!(worst < 0.1, "{worst}");
    assert_eq!(dbfs(0), FLOOR_DBFS);
}

#[test]
fn it_rises_at_once_and_falls_slowly() {
    let mut meter = Meter::new(2.0);
    let full = meter.read(i32::MAX as u32);
    assert!(full.abs() < 0.1);
    assert_eq!(meter.read(0), full - 2.0);
    assert_eq!(meter.read(0), full - 2.0 - 2.0);
    for _ in 0..200 {
        meter.read(0);
    }
    assert_eq!(meter.read(0), FLOOR_DBFS);
}
