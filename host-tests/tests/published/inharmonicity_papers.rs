//! Inharmonicity in the literature: R. W. Young 1952 (as quoted on a piano
//! technicians' list), Fletcher 1964 (form from memory; its error against the
//! determinant computed by us), Kemp, SN Applied Sciences 2:636, 2020 (abstract).

use std::f64::consts::PI;

use modal_core::{Ends, StringSpec, Wire};

use crate::{Check, Source, check_share};

fn cents(ratio: f64) -> f64 {
    1_200.0 * ratio.log2()
}

pub(crate) fn source() -> Source {
    let mut checks: Vec<Check> = Vec::new();
    // Young: cents of partial n are K d² n²/(f² L⁴), d and L in cm, K = 3.4e13
    // for steel: first order in B.
    let wire = Wire::new(1.0e-3, 7_850.0, 200.0e9).expect("a wire");
    let string = StringSpec::tuned_wire(1.0, 100.0, &wire).expect("a string");
    let first_order = 600.0 / 2.0_f64.ln() * string.inharmonicity();
    let young = first_order * 100.0_f64.powi(2) * 100.0_f64.powi(4) / 0.1_f64.powi(2);
    checks.push(check_share("constant of Young", young, 3.4e13, 0.01));

    // Error in cents of the closed form of 1964 for two clamped ends.
    for (b, n, stated) in [
        (1.0e-5_f64, 10, -5.85e-4),
        (1.0e-4, 10, -0.0173),
        (1.0e-4, 20, -0.0586),
        (1.0e-3, 10, -0.302),
        (5.0e-3, 20, 16.9),
    ] {
        let u = Ends::Clamped.effective_index(n, b);
        let ours = u * (1.0 + b * u * u).sqrt();
        let n = f64::from(n);
        let closed =
            n * (1.0 + b * n * n).sqrt() * (1.0 + 2.0 / PI * b.sqrt() + 4.0 / (PI * PI) * b);
        checks.push(check_share(
            format!("closed form at B = {b}"),
            cents(closed / ours),
            stated,
            0.05,
        ));
    }

    // Kemp: about 100 cents at partial 10 stopped at fret 12 and at partial 6
    // stopped at fret 21 of the same string: B rises as 1/L².
    let string = StringSpec::new(0.86, 150.0, 2.0e-2, 9.6e-3).expect("a string");
    let b = |fret| string.fretted(fret).expect("a fret").inharmonicity();
    let from_cents = |partial: f64| {
        // 100 cents = 600 log2((1 + B n²)/(1 + B)).
        let ratio = 2.0_f64.powf(100.0 / 600.0);
        (ratio - 1.0) / (partial * partial - ratio)
    };
    checks.push(check_share(
        "growth of B from fret 12 to 21",
        b(21) / b(12),
        from_cents(6.0) / from_cents(10.0),
        0.03,
    ));
    Source::new("papers on inharmonicity (Young, Fletcher, Kemp)", checks)
}
