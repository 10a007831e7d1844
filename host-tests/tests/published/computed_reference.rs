//! Values computed by us once with SciPy 1.17.1 and mpmath: determinants of the
//! clamped stiff string (checked against 400 graded Hermite beam elements to
//! 1e-8), damped motion (checked against DOP853), Bessel zeros, exact roots.

use std::f64::consts::PI;

use modal_core::energy::{PluckTail, mode_energy_j, pluck_energy_j};
use modal_core::excitation::{ContactStrike, Of, Parabola};
use modal_core::loss::{Air, EndLoss, ThermoelasticLoss, WireThermal};
use modal_core::string::fret_distance_m;
use modal_core::{
    ConstantT60, Ends, Excitation, Loss, ModalState, ModeSeries, StringSpec, TwoT60, Wire,
};

use crate::{Check, Source, check, check_share};

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();
    strings(&mut checks);
    motion(&mut checks);
    losses(&mut checks);
    energies(&mut checks);
    for (fret, stated) in [(1, 0.036_369_445_382), (12, 0.324)] {
        let computed = fret_distance_m(0.648, fret).expect("a fret");
        checks.push(check("place of a fret", computed, stated, 1e-11));
    }
    Source::new("determinants, roots and motion by SciPy and mpmath", checks)
}

fn strings(checks: &mut Vec<Check>) {
    // Length, diameter, density, modulus, tension.
    let wire = |length: f64, d: f64, density: f64, modulus: f64, tension: f64| {
        let wire = Wire::new(d, density, modulus).expect("a wire");
        StringSpec::plain_wire(length, tension, &wire).expect("a string")
    };
    let thin = wire(0.648, 0.254e-3, 7_850.0, 200.0e9, 72.0);
    let thick = wire(0.62, 1.0e-3, 7_850.0, 200.0e9, 670.0);
    let nylon = wire(0.65, 1.02e-3, 1_100.0, 5.8e9, 58.3);
    for (string, stated) in [
        (thin, 1.333_988_231_0e-5),
        (thick, 3.762_196_352_8e-4),
        (nylon, 1.234_818_298_8e-4),
    ] {
        checks.push(check_share(
            "inharmonicity",
            string.inharmonicity(),
            stated,
            1e-9,
        ));
    }
    type Modes = &'static [(u32, f64)];
    let table: [(StringSpec, Ends, Modes); 8] = [
        (
            thin,
            Ends::Hinged,
            &[
                (1, 328.284_711_5),
                (2, 656.582_560_5),
                (5, 1_641.686_290),
                (10, 3_285.014_114),
            ],
        ),
        (
            thin,
            Ends::Clamped,
            &[
                (1, 329.049_812_4),
                (2, 658.112_803_0),
                (5, 1_645.512_607),
                (10, 3_292.671_825),
            ],
        ),
        (
            thin,
            Ends::OneClamped,
            &[(1, 328.666_816_7), (10, 3_288.838_519)],
        ),
        (
            thick,
            Ends::Hinged,
            &[
                (1, 265.899_565_0),
                (2, 532.099_042_5),
                (5, 1_335.484_288),
                (10, 2_708.042_807),
            ],
        ),
        (
            thick,
            Ends::Clamped,
            &[
                (1, 269.224_167_1),
                (2, 538.753_141_1),
                (5, 1_352.204_254),
                (10, 2_742.062_385),
            ],
        ),
        (
            nylon,
            Ends::Hinged,
            &[
                (1, 195.918_876_7),
                (2, 391.910_315_0),
                (5, 981.044_676),
                (10, 1_971.126_170),
            ],
        ),
        (nylon, Ends::OneClamped, &[(1, 196.614_342_2)]),
        (nylon, Ends::OneClamped, &[(10, 1_978.136_359)]),
    ];
    for (string, ends, modes) in table {
        for &(n, stated) in modes {
            let computed = string.between(ends).frequency_hz(n);
            checks.push(check_share(
                format!("{ends:?} mode {n}"),
                computed,
                stated,
                1e-9,
            ));
        }
    }
}

fn motion(checks: &mut Vec<Check>) {
    // ω₀ = 600π, σ = 9, q(0) = 3 mm, q̇(0) = 1.7 m/s.
    let string = StringSpec::tuned(0.6, 300.0, 1.0e-3, 0.0).expect("a string");
    let t60 = modal_core::loss::T60_DECAY / 9.0;
    let series = ModeSeries::new(string, ConstantT60::new(t60).expect("a T60"));
    let mode = series.mode(1).expect("a mode");
    let start = ModalState {
        displacement: 0.003,
        velocity: 1.7,
    };
    checks.push(check("phase", start.phase(&mode), 0.296_407_310_990, 1e-11));
    let (t, w, s) = (0.02, mode.damped_angular(), mode.decay_rate_per_s());
    let q = start.amplitude(&mode) * (-s * t).exp() * (w * t - start.phase(&mode)).cos();
    checks.push(check("damped motion", q, 2.505_481_544_036_0e-3, 1e-13));

    // Contact: the factor of the amplitude for ωτ = π, 2π, 3π, 4π, hardly damped.
    let series = ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"));
    let mode = series.mode(1).expect("a mode");
    let point = 2.0 * 1.0e-3 * (0.3 * PI).sin() / (1.0e-3 * 0.6 * mode.angular());
    for (x, stated) in [
        (PI, PI / 4.0),
        (2.0 * PI, 1.0 / 3.0),
        (3.0 * PI, 0.0),
        (4.0 * PI, 1.0 / 15.0),
    ] {
        let strike = ContactStrike::new(0.3, 1.0e-3, x / mode.angular()).expect("a strike");
        let amplitude = strike.mode(&mode, &string).amplitude(&mode) / point;
        // T60 = 1,000 s leaves a few parts in 1e5.
        checks.push(check("contact", amplitude, stated, 5e-5));
    }
}

fn losses(checks: &mut Vec<Check>) {
    let law = TwoT60::new(100.0, 10.0, 2_000.0, 1.5).expect("a loss");
    checks.push(check("b1", law.constant_per_s(), 0.680_965_014_971, 1e-11));
    checks.push(check("b3", law.quadratic_s(), 2.485_031_954_893e-8, 1e-19));
    let string = StringSpec::new(0.65, 60.0, 0.9e-3, 0.0).expect("a string");
    let t60 = modal_core::loss::T60_DECAY / law.decay_rate_per_s(1, 1_000.0, &string);
    checks.push(check("T60 at 1 kHz", t60, 4.156_25, 1e-9));

    let drag = Air::ROOM.drag_kg_per_m_s(0.254e-3, 330.0);
    checks.push(check("drag of air", drag, 3.536_079e-4, 1e-9));
    // The exact Bessel solution is 3.3 % lower: the range of validity.
    checks.push(check_share("drag of air, exact", drag, 3.425_202e-4, 0.035));
    let end = EndLoss::new(0.002)
        .expect("an end")
        .decay_rate_per_s(3, 1.0, &string);
    checks.push(check(
        "loss through an end, exact root",
        end,
        0.184_615_398,
        1e-6,
    ));
    let heat =
        ThermoelasticLoss::new(0.254e-3, 7_800.0, 190.0e9, &WireThermal::STEEL).expect("a wire");
    let diffusivity = 49.0 / (7_800.0 * 470.0);
    let peak = heat.peak_hz() * 0.254e-3_f64.powi(2) / diffusivity;
    checks.push(check("peak of heat loss", peak, 2.158_114_110, 1e-8));
    // Q of a tone that halves in 4 s at 440 Hz: π f τ with τ = 4/ln 2.
    let t60 = modal_core::loss::T60_DECAY * 4.0 / 2.0_f64.ln();
    let string = StringSpec::tuned(0.6, 440.0, 1.0e-3, 0.0).expect("a string");
    let series = ModeSeries::new(string, ConstantT60::new(t60).expect("a T60"));
    let q = series.mode(1).expect("a mode").q_factor();
    checks.push(check("Q of a ring-down", q, 7_976.953_8, 1e-3));
}

fn energies(checks: &mut Vec<Check>) {
    let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).expect("a string");
    let total = pluck_energy_j(&string, 0.2, 0.003).expect("a pluck");
    checks.push(check(
        "energy of a pluck",
        total,
        3.028_846_153_846_154e-3,
        1e-14,
    ));
    // A parabola: 8 T h²/(3 L), all modes together.
    let series = ModeSeries::new(string, ConstantT60::new(10.0).expect("a T60"));
    let parabola = Parabola::new(0.003, Of::Displacement).expect("a shape");
    let sum: f64 = (1..4_000)
        .map(|n| {
            let mode = series.mode(n).expect("a mode");
            mode_energy_j(&mode, &parabola.mode(&mode, &string), &string)
        })
        .sum();
    checks.push(check_share(
        "energy of a parabola",
        sum,
        8.0 * 70.0 * 9.0e-6 / (3.0 * 0.65),
        1e-9,
    ));
    let tail = PluckTail::after(40, 0.2).expect("a place");
    let stated = 2.0 / (PI * PI * 0.16 * 40.5);
    checks.push(check("tail of a pluck", tail.largest, stated, 1e-15));
}
