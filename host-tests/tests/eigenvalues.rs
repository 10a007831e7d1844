//! Frequencies of stiff strings from a discretised string: Hermite beam elements
//! under tension (standard element matrices, e.g. Cook, *Concepts and
//! Applications of Finite Element Analysis*; from memory) and the symmetric
//! eigensolver of a general linear-algebra library.
#![allow(clippy::expect_used, reason = "a test may fail")]

mod support;

use std::f64::consts::PI;

use host_tests::tolerance;
use modal_core::{Ends, StringSpec};
use nalgebra::{Cholesky, DMatrix, SymmetricEigen};
use proptest::prelude::*;

/// Lowest frequencies over f₀ of a string of inharmonicity `b` between `ends`.
///
/// Length, tension and mass per length are 1, so E·I = B/π² and f₀ = 1/2. Nodes
/// lie close together at the ends, where a clamped string bends sharply.
fn frequencies(b: f64, ends: Ends, elements: usize) -> Vec<f64> {
    let node = |i: usize| 0.5 - 0.5 * (PI * i as f64 / elements as f64).cos();
    let size = 2 * (elements + 1);
    let mut stiffness = DMatrix::<f64>::zeros(size, size);
    let mut mass = DMatrix::<f64>::zeros(size, size);
    for element in 0..elements {
        let h = node(element + 1) - node(element);
        let bend = b / (PI * PI) / (h * h * h);
        let pull = 1.0 / (30.0 * h);
        let weight = h / 420.0;
        let k_bend = [
            [12.0, 6.0 * h, -12.0, 6.0 * h],
            [6.0 * h, 4.0 * h * h, -6.0 * h, 2.0 * h * h],
            [-12.0, -6.0 * h, 12.0, -6.0 * h],
            [6.0 * h, 2.0 * h * h, -6.0 * h, 4.0 * h * h],
        ];
        let k_pull = [
            [36.0, 3.0 * h, -36.0, 3.0 * h],
            [3.0 * h, 4.0 * h * h, -3.0 * h, -h * h],
            [-36.0, -3.0 * h, 36.0, -3.0 * h],
            [3.0 * h, -h * h, -3.0 * h, 4.0 * h * h],
        ];
        let m = [
            [156.0, 22.0 * h, 54.0, -13.0 * h],
            [22.0 * h, 4.0 * h * h, 13.0 * h, -3.0 * h * h],
            [54.0, 13.0 * h, 156.0, -22.0 * h],
            [-13.0 * h, -3.0 * h * h, -22.0 * h, 4.0 * h * h],
        ];
        for row in 0..4 {
            for column in 0..4 {
                let at = (2 * element + row, 2 * element + column);
                stiffness[at] += bend * k_bend[row][column] + pull * k_pull[row][column];
                mass[at] += weight * m[row][column];
            }
        }
    }
    // Held at both ends; clamped ends do not turn either.
    let mut held = vec![0, size - 2];
    match ends {
        Ends::Hinged => {}
        Ends::OneClamped => held.push(1),
        Ends::Clamped => held.extend([1, size - 1]),
    }
    held.sort_unstable();
    for index in held.into_iter().rev() {
        stiffness = stiffness.remove_row(index).remove_column(index);
        mass = mass.remove_row(index).remove_column(index);
    }
    // K x = ω² M x with M = L Lᵀ: the eigenvalues of L⁻¹ K L⁻ᵀ.
    let root = Cholesky::new(mass).expect("a mass matrix is positive").l();
    let half = root
        .solve_lower_triangular(&stiffness)
        .expect("a regular root");
    let whole = root
        .solve_lower_triangular(&half.transpose())
        .expect("a regular root");
    let symmetric = 0.5 * (&whole + whole.transpose());
    let mut found: Vec<f64> = SymmetricEigen::new(symmetric)
        .eigenvalues
        .iter()
        .map(|squared| squared.max(0.0).sqrt() / PI)
        .collect();
    found.sort_unstable_by(f64::total_cmp);
    found
}

proptest! {
    #![proptest_config(support::cases(12))]

    #[test]
    fn the_iteration_solves_the_discretised_string(
        exponent in -5.0..-2.0,
        ends in prop::sample::select(vec![Ends::Hinged, Ends::OneClamped, Ends::Clamped]),
    ) {
        let b = f64::powf(10.0, exponent);
        let string = StringSpec::new(1.0, 100.0, 1.0e-2, 100.0 * b / (PI * PI)).expect("a string");
        let string = string.between(ends);
        prop_assert!((string.inharmonicity() / b - 1.0).abs() < tolerance::ROUNDING);
        let found = frequencies(b, ends, 150);
        for n in 1..=10_u32 {
            let ours = string.frequency_hz(n) / string.ideal_fundamental_hz();
            let error = ours / found[n as usize - 1] - 1.0;
            prop_assert!(error.abs() < tolerance::ELEMENTS, "B {b} {ends:?} mode {n}: {error:e}");
        }
    }

    #[test]
    fn a_tuned_string_sounds_at_its_pitch(
        pitch in 30.0..2_000.0, exponent in -6.0..-2.0,
        ends in prop::sample::select(vec![Ends::Hinged, Ends::OneClamped, Ends::Clamped]),
    ) {
        let density = 1.0e-3;
        let tension = density * f64::powi(1.3 * pitch, 2);
        let stiffness = f64::powf(10.0, exponent) * tension * 0.65 * 0.65 / (PI * PI);
        let Ok(string) = StringSpec::tuned_between(ends, 0.65, pitch, density, stiffness) else {
            return Err(TestCaseError::reject("tension out of range"));
        };
        prop_assert!((string.frequency_hz(1) / pitch - 1.0).abs() < tolerance::ROUNDING);
    }
}
