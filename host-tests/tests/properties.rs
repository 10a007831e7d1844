//! What holds for every string: superposition, nodes, limits, order.

mod support;

use host_tests::tolerance;
use modal_core::excitation::{Corner, Of, Polyline, Profile, Strike, Tip};
use modal_core::pickup::{Amplified, BridgeForce, End};
use modal_core::{
    DisplacementPickup, Excitation, Loss, ModalState, ModeSeries, Pickup, PointPluck, RoundedPluck,
    StringSpec, VelocityPickup, plan,
};
use proptest::prelude::*;
use support::{losses, pickup, pluck, string};

fn close(a: f64, b: f64) -> bool {
    (a - b).abs() <= tolerance::ROUNDING * (a.abs() + b.abs()) + f64::MIN_POSITIVE
}

proptest! {
    #![proptest_config(support::cases(200))]

    #[test]
    fn starts_add(string in string(), loss in losses(), a in pluck(), b in pluck(), n in 1_u32..200) {
        let series = ModeSeries::new(string, loss);
        let Ok(mode) = series.mode(n) else { return Ok(()) };
        let (x, y) = (a.mode(&mode, &string), b.mode(&mode, &string));
        let both = (a, b).mode(&mode, &string);
        prop_assert!(close(both.displacement, x.displacement + y.displacement));
        // And so does what is heard.
        let pickups = (
            DisplacementPickup::new(0.13, 0.0).unwrap(),
            Amplified::new(VelocityPickup::new(0.31, 0.01).unwrap(), -0.4).unwrap(),
        );
        let weights = pickups.weights(&mode, &string);
        let sum = weights.heard(&mode, both);
        let parts = (weights.heard(&mode, x), weights.heard(&mode, y));
        let scale = parts.0.displacement.abs() + parts.1.displacement.abs();
        prop_assert!((sum.displacement - parts.0.displacement - parts.1.displacement).abs() <= tolerance::ROUNDING * scale);
    }

    #[test]
    fn nodes_are_exactly_silent(string in string(), loss in losses(), k in 1_u32..8, half in 1_u32..16) {
        // p = k/2^m is a number exactly, so the node is exact.
        let place = f64::from(k) / 16.0;
        prop_assume!(k < 16);
        let n = 16 * half;
        let series = ModeSeries::new(string, loss);
        let Ok(mode) = series.mode(n) else { return Ok(()) };
        let pluck = PointPluck::new(place, 1.0e-3).unwrap();
        prop_assert_eq!(pluck.mode(&mode, &string).displacement, 0.0);
        let pickup = DisplacementPickup::new(place, 0.0).unwrap();
        prop_assert_eq!(pickup.weights(&mode, &string).displacement, 0.0);
        let strike = Strike::with_impulse(place, 1.0e-3, 0.0, Profile::Flat).unwrap();
        prop_assert_eq!(strike.mode(&mode, &string).velocity, 0.0);
    }

    #[test]
    fn narrow_tips_and_soft_strings_are_the_simple_case(loss in losses(), place in 0.05..0.95, n in 1_u32..60) {
        let soft = StringSpec::tuned(0.65, 110.0, 2.0e-3, 0.0).unwrap();
        let stiff = StringSpec::tuned(0.65, 110.0, 2.0e-3, 1.0e-12).unwrap();
        let mode = ModeSeries::new(soft, loss).mode(n).unwrap();
        let point = PointPluck::new(place, 1.0e-3).unwrap();
        let exact = point.mode(&mode, &soft).displacement;
        let nearly = point.mode(&mode, &stiff).displacement;
        prop_assert!((exact - nearly).abs() <= tolerance::LIMIT * exact.abs() + tolerance::ROUNDING * 1.0e-3);
        for tip in [Tip::Even, Tip::RaisedCosine] {
            let narrow = RoundedPluck::new(place, 1.0e-3, 1.0e-7).unwrap().by(tip);
            let nearly = narrow.mode(&mode, &soft).displacement;
            prop_assert!((exact - nearly).abs() <= tolerance::LIMIT * exact.abs() + tolerance::ROUNDING * 1.0e-3);
        }
        prop_assert!((stiff.frequency_hz(n) / soft.frequency_hz(n) - 1.0).abs() < tolerance::LIMIT);
    }

    #[test]
    fn frequencies_rise_and_high_modes_die_first(string in string(), loss in losses()) {
        let series = ModeSeries::new(string, loss);
        for n in 1..100 {
            prop_assert!(series.frequency_hz(n + 1) > series.frequency_hz(n));
            let (a, b) = (series.frequency_hz(n), series.frequency_hz(n + 1));
            prop_assert!(loss.decay_rate_per_s(n + 1, b, &string) >= loss.decay_rate_per_s(n, a, &string));
        }
        let limit = series.frequency_hz(40) * 1.000_001;
        prop_assert_eq!(series.modes_below(limit), 40);
    }

    #[test]
    fn no_sample_is_above_the_l1_bound(
        string in string(), loss in losses(), start in pluck(), heard in pickup(), t in 0.0..0.5,
    ) {
        let series = ModeSeries::new(string, loss);
        let Ok(bound) = plan::l1_bound(&series, &start, &heard, 40) else { return Ok(()) };
        let mut sum = 0.0;
        for n in 1..=40 {
            let (mode, state) = plan::heard(&series, &start, &heard, n).unwrap();
            let motion = host_tests::reference::Damped::new(
                mode.frequency_hz(), mode.decay_rate_per_s(), state.displacement, state.velocity,
            );
            sum += motion.at(t);
        }
        prop_assert!(sum.abs() <= bound * (1.0 + tolerance::ROUNDING));
    }

    #[test]
    fn the_force_on_the_end_of_an_ideal_pluck_is_a_rectangular_wave(
        place in 0.1..0.9, share in 0.0..1.0, far in any::<bool>(),
    ) {
        let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).unwrap();
        // Away from the two steps of the period.
        let own = if far { 1.0 - place } else { place };
        let edge: f64 = 0.5 * own;
        let phase: f64 = f64::rem_euclid(share + 0.5, 1.0) - 0.5;
        prop_assume!((phase.abs() - edge).abs() > 0.02);
        // At the near end the force is +T h/(p L) while |t| < p/2 of a period; at
        // the far end it is −(−T h/((1−p) L)) half a period later.
        let near: f64 = 70.0 * 3.0e-3 / (place * 0.65);
        let beyond: f64 = 70.0 * 3.0e-3 / ((1.0 - place) * 0.65);
        let (end, high, low) = if far {
            (End::Far, beyond, -near)
        } else {
            (End::Near, near, -beyond)
        };
        let expected = if phase.abs() < edge { high } else { low };
        let pluck = PointPluck::new(place, 3.0e-3).unwrap();
        let series = ModeSeries::new(string, modal_core::ConstantT60::new(1_000.0).unwrap());
        let modes = 3_000;
        let mut sum = 0.0;
        for n in 1..=modes {
            let mode = series.mode(n).unwrap();
            let a = pluck.mode(&mode, &string).displacement;
            let weight = BridgeForce(end).weights(&mode, &string).displacement;
            let x = std::f64::consts::PI * f64::from(n) / f64::from(modes);
            let turn = std::f64::consts::TAU * f64::from(n) * phase;
            sum += weight * a * turn.cos() * x.sin() / x;
        }
        prop_assert!((sum - expected).abs() < tolerance::SMOOTHED_SERIES * (near + beyond), "{sum} {expected}");
    }

    #[test]
    fn a_polyline_is_the_sum_of_its_plucks(
        first in 0.1..0.4, second in 0.5..0.9, a in -1.0e-2..1.0e-2, b in -1.0e-2..1.0e-2, n in 1_u32..80,
    ) {
        let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).unwrap();
        let series = ModeSeries::new(string, modal_core::ConstantT60::new(5.0).unwrap());
        let mode = series.mode(n).unwrap();
        let one = PointPluck::new(first, a).unwrap();
        let two = PointPluck::new(second, b).unwrap();
        // The values of both triangles at both corners.
        let at_first = a + b * first / second;
        let at_second = b + a * (1.0 - second) / (1.0 - first);
        let corners = [Corner::new(first, at_first), Corner::new(second, at_second)];
        let line = Polyline::new(&corners, Of::Displacement).unwrap();
        let sum = (one, two).mode(&mode, &string);
        let shape = line.mode(&mode, &string);
        prop_assert!((shape.displacement - sum.displacement).abs() < 0.01 * tolerance::ROUNDING);
        prop_assert_eq!(shape.velocity, 0.0);
        let start: ModalState = shape;
        prop_assert!(start.phase(&mode).is_finite());
    }
}
