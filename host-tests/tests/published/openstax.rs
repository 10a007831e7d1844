//! OpenStax, *University Physics*, volume 1: sections 15.5, 16.3, 16.6, 17.4 and
//! 17.6, worked examples and problems with answers. Tolerances are the rounding
//! of the printed values.

use modal_core::{ConstantT60, ModeSeries, StringSpec};

use crate::{Check, Source, check};

fn flexible(length_m: f64, density: f64, tension_n: f64) -> StringSpec {
    StringSpec::new(length_m, tension_n, density, 0.0).expect("a string of the book")
}

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();

    let string = flexible(2.0, 0.006, 2.0 * 9.8);
    checks.push(check(
        "16.6 example, wave speed",
        string.wave_speed_m_per_s(),
        57.15,
        0.01,
    ));
    for (n, stated) in [(1, 14.29), (2, 28.58), (3, 42.87)] {
        checks.push(check(
            "16.6 example, mode",
            string.frequency_hz(n),
            stated,
            0.01,
        ));
    }
    let string = flexible(3.0, 0.009 / 3.0, 200.0);
    for (n, stated) in [(1, 43.03), (2, 86.07), (3, 129.10), (4, 172.13)] {
        checks.push(check(
            "16.6 problem, mode",
            string.frequency_hz(n),
            stated,
            0.005,
        ));
    }
    let string = flexible(3.0, 0.0062, 20.0);
    checks.push(check(
        "16.6 problem, mode 100",
        string.frequency_hz(100),
        947.0,
        0.5,
    ));
    let string = flexible(3.5, 0.005, 90.0);
    checks.push(check(
        "16.6 problem, wave speed",
        string.wave_speed_m_per_s(),
        134.16,
        0.005,
    ));
    checks.push(check(
        "16.6 problem, mode 5",
        string.frequency_hz(5),
        95.83,
        0.005,
    ));
    let string = flexible(2.0, 7.2e-3, 160.0);
    checks.push(check(
        "17.4 nylon, wave speed",
        string.wave_speed_m_per_s(),
        149.07,
        0.005,
    ));
    checks.push(check(
        "17.4 nylon, mode 1",
        string.frequency_hz(1),
        37.3,
        0.05,
    ));
    let beat = flexible(2.0, 0.0065, 130.0).frequency_hz(10)
        - flexible(2.0, 0.0065, 120.0).frequency_hz(10);
    checks.push(check("17.6 beat of two strings", beat, 13.9, 0.05));
    let tuned = StringSpec::tuned(1.5, 2_000.0 / 6.0, 0.0065, 0.0).expect("a string of the book");
    checks.push(check(
        "17.4 tension for a pitch",
        tuned.tension_n(),
        6_500.0,
        1e-8,
    ));
    let string = flexible(0.65, 3.09e-4, 56.40);
    checks.push(check(
        "16.3 example, wave speed",
        string.wave_speed_m_per_s(),
        427.23,
        0.005,
    ));
    let tension = 5.78e-3 * string.wave_speed_m_per_s().powi(2);
    let same = flexible(0.65, 5.78e-3, tension);
    checks.push(check(
        "16.3 example, tension",
        same.tension_n(),
        1_055.00,
        0.01,
    ));
    // Amplitude down by 3 % a cycle: 6 % of the energy (printed rounded).
    let t60 = modal_core::loss::T60_DECAY / (-(0.97_f64.ln()) * 100.0);
    let loss = ConstantT60::new(t60).expect("a T60");
    let string = StringSpec::tuned(1.0, 100.0, 1.0e-3, 0.0).expect("a string");
    let mode = ModeSeries::new(string, loss).mode(1).expect("a mode");
    let kept = (-2.0 * mode.decay_rate_per_s() / 100.0).exp();
    checks.push(check("15.5 energy lost a cycle", 1.0 - kept, 0.06, 0.001));
    Source::new("OpenStax, University Physics 1", checks)
}
