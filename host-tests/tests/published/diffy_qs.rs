//! J. Lebl, *Notes on Diffy Qs*, sections 4.7 and 4.8: examples and exercises
//! with answers.

use std::f64::consts::{PI, SQRT_2};

use host_tests::reference::Damped;
use modal_core::excitation::{Between, Corner, HalfSine, Of, Parabola, Polyline, Sampled};
use modal_core::{ConstantT60, Excitation, ModalState, ModeSeries, PointPluck, StringSpec};

use crate::{Check, Source, check};

/// A string with wave speed `c`; its losses play no part in what follows.
fn series(length_m: f64, c: f64) -> ModeSeries<ConstantT60> {
    let string = StringSpec::new(length_m, c * c * 1.0e-2, 1.0e-2, 0.0).expect("a string");
    ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"))
}

fn state(series: &ModeSeries<ConstantT60>, start: &impl Excitation, n: u32) -> ModalState {
    start.mode(&series.mode(n).expect("a mode"), series.string())
}

/// y(x, t) of an undamped string from the coefficients of the start.
fn shape(
    series: &ModeSeries<ConstantT60>,
    start: &impl Excitation,
    modes: u32,
    x_m: f64,
    t_s: f64,
) -> f64 {
    (1..=modes)
        .map(|n| {
            let state = state(series, start, n);
            let mode = Damped::new(
                series.frequency_hz(n),
                0.0,
                state.displacement,
                state.velocity,
            );
            mode.at(t_s) * (f64::from(n) * PI * x_m / series.string().length_m()).sin()
        })
        .sum()
}

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();

    // Example 4.7.1: plucked in the middle, L = 2, h = 0.1: 0.8/(n²π²) sin(nπ/2).
    let middle = series(2.0, 1.0);
    let pluck = PointPluck::new(0.5, 0.1).expect("a pluck");
    for n in 1..=6 {
        let stated = 0.8 / (f64::from(n) * PI).powi(2) * (f64::from(n) * PI / 2.0).sin();
        let computed = state(&middle, &pluck, n).displacement;
        checks.push(check(
            format!("4.7.1 coefficient {n}"),
            computed,
            stated,
            1e-15,
        ));
    }
    // Exercise 4.7.101: y = y_t = sin x on (0, π), c = 1: A₁ = √2, phase 45°.
    let half = (
        HalfSine::new(1.0, Of::Displacement).expect("a shape"),
        HalfSine::new(1.0, Of::Velocity).expect("a shape"),
    );
    let unit = series(PI, 1.0);
    let first = unit.mode(1).expect("a mode");
    let both = half.mode(&first, unit.string());
    let undamped = Damped::new(unit.frequency_hz(1), 0.0, both.displacement, both.velocity);
    checks.push(check(
        "4.7.101 amplitude",
        undamped.a.hypot(undamped.c),
        SQRT_2,
        1e-14,
    ));
    checks.push(check(
        "4.7.101 phase",
        undamped.c.atan2(undamped.a),
        PI / 4.0,
        1e-14,
    ));
    // Exercise 4.7.103: y = x on (0, π): 2 (−1)^(n+1)/n, a jump at the end.
    let corners = [Corner::new(1.0, PI)];
    let saw = Polyline::new(&corners, Of::Displacement).expect("a shape");
    for n in 1..=4 {
        let sign = if n % 2 == 1 { 2.0 } else { -2.0 };
        let computed = state(&unit, &saw, n).displacement;
        checks.push(check(
            format!("4.7.103 coefficient {n}"),
            computed,
            sign / f64::from(n),
            1e-14,
        ));
    }
    // Exercise 4.8.102: y = x − x², L = 1, c = 2.
    let quick = series(1.0, 2.0);
    let parabola = Parabola::new(0.25, Of::Displacement).expect("a shape");
    for (x, t, stated) in [
        (0.5, 0.1, 0.21),
        (0.1, 0.1, 0.06),
        (0.9, 0.1, 0.06),
        (0.3, 0.5, -0.21),
        (0.3, 1.0, 0.21),
    ] {
        let computed = shape(&quick, &parabola, 2_000, x, t);
        checks.push(check(
            format!("4.8.102 at {x}, {t}"),
            computed,
            stated,
            1e-6,
        ));
    }
    // Example 4.8.1: a triangular impulse 1 high over 0.45..0.55; y(0.1, 0.6) is
    // −1/2, at a kink, where 2,000 modes are within 2·(2/w L)/(π² N).
    let slow = series(1.0, 1.0);
    let corners = [
        Corner::new(0.45, 0.0),
        Corner::new(0.5, 1.0),
        Corner::new(0.55, 0.0),
    ];
    let bump = Polyline::new(&corners, Of::Displacement).expect("a shape");
    let tail = 2.0 * 80.0 / (PI * PI * 2_000.5);
    checks.push(check(
        "4.8.1 at 0.1, 0.6",
        shape(&slow, &bump, 2_000, 0.1, 0.6),
        -0.5,
        tail,
    ));
    // Exercise 4.8.103: three samples 2, 3, 1 on L = 4, c = 10.
    let samples = [2.0, 3.0, 1.0];
    let three = Sampled::new(&samples, Of::Displacement, Between::BandLimited).expect("samples");
    let fast = series(4.0, 10.0);
    for (x, t, stated) in [(1.0, 1.0, -0.5), (4.0, 3.0, 0.0), (3.0, 9.0, 0.5)] {
        let computed = shape(&fast, &three, 3, x, t);
        checks.push(check(
            format!("4.8.103 at {x}, {t}"),
            computed,
            stated,
            1e-11,
        ));
    }
    Source::new("Lebl, Notes on Diffy Qs", checks)
}
