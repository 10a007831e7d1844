//! A piano technicians' list (J. Delacour, moypiano.com, 2002): tension of a
//! plain steel string. A weak source, as a second opinion.

use modal_core::{StringSpec, Wire};

use crate::{Source, check};

pub(crate) fn source() -> Source {
    let wire = Wire::new(0.925e-3, 7_850.0, 200.0e9).expect("a wire");
    let pitch_hz = 440.0 * 2.0_f64.powf(15.0 / 12.0);
    // The list leaves stiffness out.
    let string =
        StringSpec::tuned(0.181, pitch_hz, wire.linear_density_kg_per_m(), 0.0).expect("a string");
    let pounds = string.tension_n() / 4.448_221_615_260_5;
    Source::weak(
        "a piano technicians' list",
        vec![check("tension in lbf", pounds, 170.2, 0.05)],
    )
}
