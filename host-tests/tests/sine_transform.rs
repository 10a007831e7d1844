//! The discrete sine transform (type I) of a general-purpose library against
//! the shapes.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use host_tests::tolerance;
use modal_core::excitation::{Between, Of, Sampled};
use modal_core::{ConstantT60, Excitation, ModeSeries, PointPluck, StringSpec};
use proptest::prelude::*;
use rustdct::DctPlanner;

fn series() -> ModeSeries<ConstantT60> {
    let string = StringSpec::new(1.0, 100.0, 1.0e-2, 0.0).expect("a string");
    ModeSeries::new(string, ConstantT60::new(10.0).expect("a T60"))
}

fn coefficient(start: &impl Excitation, n: u32) -> f64 {
    let series = series();
    let mode = series.mode(n).expect("a mode");
    start.mode(&mode, series.string()).displacement
}

/// (2/N) Σ y_j sin(π n j/N) by the library, which leaves the factor out.
fn transform(samples: &[f64]) -> Vec<f64> {
    let mut buffer = samples.to_vec();
    DctPlanner::new()
        .plan_dst1(samples.len())
        .process_dst1(&mut buffer);
    let size = (samples.len() + 1) as f64;
    buffer.iter().map(|sum| 2.0 / size * sum).collect()
}

proptest! {
    #![proptest_config(support::cases(48))]

    #[test]
    fn any_samples(samples in prop::collection::vec(-1.0..1.0, 1..200)) {
        let start = Sampled::new(&samples, Of::Displacement, Between::BandLimited).expect("samples");
        for (n, expected) in (1..).zip(transform(&samples)) {
            prop_assert!((coefficient(&start, n) - expected).abs() < tolerance::ROUNDING);
        }
        let beyond = samples.len() as u32 + 1;
        prop_assert_eq!(coefficient(&start, beyond), 0.0);
    }

    #[test]
    fn a_sampled_triangle_with_straight_lines_is_the_pluck(
        corner in 1_u32..64, n in 1_u32..300,
    ) {
        let place = f64::from(corner) / 64.0;
        let samples: Vec<f64> = (1..64)
            .map(|j| f64::from(j) / 64.0)
            .map(|x| 0.01 * (x / place).min((1.0 - x) / (1.0 - place)))
            .collect();
        let straight = Sampled::new(&samples, Of::Displacement, Between::Straight).expect("samples");
        let pluck = PointPluck::new(place, 0.01).expect("a pluck");
        prop_assert!((coefficient(&straight, n) - coefficient(&pluck, n)).abs() < 0.01 * tolerance::ROUNDING);
        if n < 64 {
            // The library's transform needs the same correction.
            let angle = f64::from(n) * std::f64::consts::PI / 128.0;
            let corrected = transform(&samples)[n as usize - 1] * (angle.sin() / angle).powi(2);
            prop_assert!((corrected - coefficient(&pluck, n)).abs() < 0.01 * tolerance::ROUNDING);
        }
    }
}
