//! Damped motion under a force, integrated by a general-purpose solver (Runge &
//! Kutta, order 4), against the closed forms of contact and push.
#![allow(clippy::expect_used, reason = "a test may fail")]

mod support;

use std::f64::consts::PI;

use host_tests::tolerance;
use modal_core::excitation::{ContactStrike, SlowPush};
use modal_core::{ConstantT60, Excitation, ModalState, Mode, ModeSeries, StringSpec};
use ode_solvers::{Rk4, System, Vector2};
use proptest::prelude::*;

/// y″ + 2 (σ/ω) y′ + y = force(x), with x = ω t and q = y · largest force/ω².
struct Driven<F> {
    damping: f64,
    force: F,
}

impl<F: Fn(f64) -> f64> System<f64, Vector2<f64>> for Driven<F> {
    fn system(&self, x: f64, y: &Vector2<f64>, dy: &mut Vector2<f64>) {
        dy[0] = y[1];
        dy[1] = (self.force)(x) - 2.0 * self.damping * y[1] - y[0];
    }
}

/// q and q̇ after `seconds` of a force of at most `largest` times `shape` (of the
/// time as a share of the whole), from rest.
fn integrate(
    (decay, angular): (f64, f64),
    seconds: f64,
    largest: f64,
    shape: impl Fn(f64) -> f64,
) -> ModalState {
    let end = angular * seconds;
    let system = Driven {
        damping: decay / angular,
        force: |x: f64| shape(x / end),
    };
    // 200 steps a radian: the method's error is far below the tolerance. (The
    // library's adaptive methods take a start from rest for a stiff system.)
    // A hair less than a whole number, which the library rounds up.
    let steps = (200.0 * end).max(2_000.0).ceil();
    let step = end / (steps - 1.0e-6);
    let mut solver = Rk4::new(system, 0.0, Vector2::zeros(), end, step);
    solver.integrate().expect("it converges");
    let last = solver.y_out().last().expect("a result");
    ModalState {
        displacement: last[0] * largest / (angular * angular),
        velocity: last[1] * largest / angular,
    }
}

fn string_and_mode(pitch: f64, t60: f64, n: u32) -> (StringSpec, Mode) {
    let string = StringSpec::tuned(0.65, pitch, 1.2e-3, 2.0e-5).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(t60).expect("a T60"));
    (string, series.mode(n).expect("a mode"))
}

/// Force on mode n per force on a point: 2 sin(n π p)/(μ L).
fn per_force(string: &StringSpec, n: u32, place: f64) -> f64 {
    2.0 * (f64::from(n) * PI * place).sin() / (string.linear_density_kg_per_m() * string.length_m())
}

fn agree(
    ours: ModalState,
    theirs: ModalState,
    mode: &Mode,
    scale: f64,
) -> Result<(), TestCaseError> {
    let error = (ours.displacement - theirs.displacement).abs() * mode.angular()
        + (ours.velocity - theirs.velocity).abs();
    prop_assert!(error < tolerance::SOLVER * scale, "{ours:?} {theirs:?}");
    Ok(())
}

proptest! {
    #![proptest_config(support::cases(60))]

    #[test]
    fn contact_leaves_the_string_as_the_solver_says(
        pitch in 40.0..900.0, t60 in 0.05..20.0, n in 1_u32..30,
        place in 0.03..0.97, contact in 2.0e-4..8.0e-3,
    ) {
        let (string, mode) = string_and_mode(pitch, t60, n);
        let impulse = 2.0e-3;
        let strike = ContactStrike::new(place, impulse, contact).expect("a strike");
        let peak = impulse * PI / (2.0 * contact);
        let gain = per_force(&string, n, place);
        let rates = (mode.decay_rate_per_s(), mode.angular());
        let theirs = integrate(rates, contact, gain * peak, |share| (PI * share).sin());
        agree(strike.mode(&mode, &string), theirs, &mode, impulse * gain.abs() + 1e-12)?;
    }

    #[test]
    fn a_push_leaves_the_string_as_the_solver_says(
        pitch in 40.0..900.0, n in 1_u32..20, place in 0.03..0.97, push in 1.0e-3..3.0e-2,
    ) {
        // The closed form is that without losses during the push.
        let (string, mode) = string_and_mode(pitch, 1_000.0, n);
        let start = SlowPush::new(place, 1.5, push).expect("a push");
        let gain = per_force(&string, n, place);
        let theirs = integrate((0.0, mode.angular()), push, 1.5 * gain, |share| share);
        agree(start.mode(&mode, &string), theirs, &mode, gain.abs() * push + 1e-9)?;
    }
}
