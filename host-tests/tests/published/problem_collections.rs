//! Collections of problems: database-physics-solutions.com #3471 (a pluck at a
//! third of the length) and gnit.me GSO002-17 (energy of mode 1; its answer
//! computed by us). The force of an ideal pluck on the end is a rectangular
//! wave: its two levels.

use std::f64::consts::PI;

use host_tests::reference::Damped;
use modal_core::energy::{mode_energy_j, pluck_energy_j};
use modal_core::pickup::{BridgeForce, End};
use modal_core::{ConstantT60, Excitation, ModeSeries, Pickup, PointPluck, StringSpec};

use crate::{Check, Source, check};

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();
    let string = StringSpec::new(0.9, 160.0, 1.0e-3, 0.0).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"));
    let third = PointPluck::new(1.0 / 3.0, 0.03).expect("a pluck");
    let a = |n| {
        let mode = series.mode(n).expect("a mode");
        third.mode(&mode, &string).displacement / 0.03
    };
    checks.push(check("a1", a(1), 0.789_720_470_782, 1e-12));
    checks.push(check("a2/a1", a(2) / a(1), 0.25, 1e-14));
    checks.push(check("a4/a1", a(4) / a(1), -0.0625, 1e-14));
    for n in [3, 6, 9] {
        checks.push(check("a node", a(n), 0.0, 0.0));
    }
    let mode = series.mode(1).expect("a mode");
    let energy = mode_energy_j(&mode, &third.mode(&mode, &string), &string);
    checks.push(check("energy of mode 1", energy, 0.246_210_476_25, 1e-10));
    let total = pluck_energy_j(&string, 1.0 / 3.0, 0.03).expect("a pluck");
    checks.push(check("energy in all", total, 0.36, 1e-14));

    // T = 70 N, h = 3 mm, p = 0.2, L = 0.65 m: +T h/(p L), then −T h/((1−p) L).
    let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"));
    let pluck = PointPluck::new(0.2, 0.003).expect("a pluck");
    let period = 1.0 / series.frequency_hz(1);
    for (share, stated) in [
        (0.0, 1.615_384_615),
        (0.3, -0.403_846_154),
        (0.7, -0.403_846_154),
    ] {
        let modes = 4_000;
        let force: f64 = (1..=modes)
            .map(|n| {
                let mode = series.mode(n).expect("a mode");
                let weight = BridgeForce(End::Near).weights(&mode, &string).displacement;
                let state = pluck.mode(&mode, &string);
                let motion = Damped::new(mode.frequency_hz(), 0.0, state.displacement, 0.0);
                // Lanczos' factor smooths the ripple of the cut series.
                let x = PI * f64::from(n) / f64::from(modes);
                weight * motion.at(share * period) * x.sin() / x
            })
            .sum();
        checks.push(check(
            format!("force on the end at {share} of a period"),
            force,
            stated,
            1e-4,
        ));
    }
    Source::weak("collections of problems", checks)
}
