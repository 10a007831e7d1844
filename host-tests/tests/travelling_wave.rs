//! d'Alembert's travelling waves: the ideal pluck as two shapes that run apart
//! and come back upside down.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use host_tests::tolerance;
use modal_core::energy::PluckTail;
use modal_core::{ConstantT60, Excitation, ModeSeries, PointPluck, StringSpec};
use proptest::prelude::*;

/// The pluck's triangle, continued as an odd function of period 2 (x in lengths).
fn triangle(x: f64, place: f64) -> f64 {
    let x = x.rem_euclid(2.0);
    let (x, sign) = if x > 1.0 { (2.0 - x, -1.0) } else { (x, 1.0) };
    sign * (x / place).min((1.0 - x) / (1.0 - place))
}

/// y/h at x (in lengths) and time (in transit times L/c), by travelling waves.
fn waves(x: f64, time: f64, place: f64) -> f64 {
    0.5 * (triangle(x + time, place) + triangle(x - time, place))
}

/// The same by `modes` modes of the project's own coefficients.
fn modes(x: f64, time: f64, place: f64, modes: u32) -> f64 {
    let string = StringSpec::new(1.0, 100.0, 1.0e-2, 0.0).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"));
    let pluck = PointPluck::new(place, 0.01).expect("a pluck");
    (1..=modes)
        .map(|n| {
            let mode = series.mode(n).expect("a mode");
            let a = pluck.mode(&mode, &string).displacement / 0.01;
            let k = f64::from(n) * std::f64::consts::PI;
            a * (k * time).cos() * (k * x).sin()
        })
        .sum()
}

/// Exact fractions, from the travelling waves by hand.
#[test]
fn exact_points() {
    let quarter = [
        (0.5, 0.0, 2.0 / 3.0),
        (0.25, 0.25, 1.0 / 3.0),
        (0.5, 0.3, 8.0 / 15.0),
        (0.75, 1.0, -1.0),
        (0.125, 1.4, -1.0 / 6.0),
        (0.4, 2.0, 0.8),
    ];
    let fifth = [
        (0.5, 0.0, 0.625),
        (0.25, 0.25, 0.3125),
        (0.5, 0.3, 0.625),
        (0.75, 1.0, -0.9375),
        (0.125, 1.4, -0.15625),
        (0.4, 2.0, 0.75),
    ];
    let sevenths = [
        (0.5, 0.0, 0.7),
        (0.25, 0.25, 0.35),
        (0.5, 0.3, 0.49),
        (0.75, 1.0, -0.875),
        (0.125, 1.4, -0.175),
        (0.4, 2.0, 0.84),
    ];
    for (place, points) in [(0.25, quarter), (0.2, fifth), (2.0 / 7.0, sevenths)] {
        let tail = PluckTail::after(2_000, place).expect("a place").largest;
        for (x, time, exact) in points {
            assert!((waves(x, time, place) - exact).abs() < tolerance::ROUNDING);
            assert!((modes(x, time, place, 2_000) - exact).abs() <= tail);
        }
    }
}

proptest! {
    #![proptest_config(support::cases(64))]

    #[test]
    fn modes_are_waves_within_the_bound_of_the_tail(
        x in 0.0..1.0, time in 0.0..6.0, place in 0.03..0.97,
    ) {
        let tail = PluckTail::after(400, place).expect("a place").largest;
        let error = modes(x, time, place, 400) - waves(x, time, place);
        prop_assert!(error.abs() <= tail, "{error} {tail}");
    }

    #[test]
    fn half_a_period_turns_the_string_over(
        x in 0.0..1.0, time in 0.0..3.0, place in 0.05..0.95,
    ) {
        let now = modes(x, time, place, 100);
        let later = modes(1.0 - x, time + 1.0, place, 100);
        prop_assert!((now + later).abs() < tolerance::SUM_OF_MODES);
    }

    #[test]
    fn the_mirror_image_sounds_the_same(place in 0.02..0.98, n in 1_u32..200) {
        let string = StringSpec::new(1.0, 100.0, 1.0e-2, 1.0e-3).expect("a string");
        let series = ModeSeries::new(string, ConstantT60::new(10.0).expect("a T60"));
        let mode = series.mode(n).expect("a mode");
        let here = PointPluck::new(place, 0.01).expect("a pluck").mode(&mode, &string);
        let there = PointPluck::new(1.0 - place, 0.01).expect("a pluck").mode(&mode, &string);
        let sign = if n % 2 == 1 { 1.0 } else { -1.0 };
        let largest = 2.0 * 0.01 / (std::f64::consts::PI.powi(2) * place * (1.0 - place));
        let error = here.displacement - sign * there.displacement;
        prop_assert!(error.abs() < tolerance::ROUNDING * largest);
    }
}
