//! Minimum tensile strength of music wire: ASTM A228 as printed by a wire maker
//! (interwiregroup.com), inch and ksi.

use modal_core::string::{Load, LoadLevel, music_wire_strength_pa};
use modal_core::{StringSpec, Wire};

use crate::{Source, check};

pub(crate) fn source() -> Source {
    let mut checks: Vec<_> = [
        (0.010, 2_668.0),
        (0.016, 2_496.0),
        (0.024, 2_351.0),
        (0.040, 2_172.0),
    ]
    .into_iter()
    .map(|(inch, stated): (f64, f64)| {
        let strength = music_wire_strength_pa(inch * 0.0254).expect("within the table");
        check(
            format!("strength of {inch} in"),
            strength / 1.0e6,
            stated,
            1.0,
        )
    })
    .collect();
    // The stress of a plain string is 4 L² f² ρ whatever its gauge; at 0.254 mm
    // it is 53.7 % of the minimum.
    let wire = Wire::new(0.254e-3, 7_850.0, 200.0e9).expect("a wire");
    let string =
        StringSpec::tuned(0.648, 329.627_6, wire.linear_density_kg_per_m(), 0.0).expect("a string");
    let load = Load::of_music_wire(&string, &wire).expect("within the table");
    checks.push(check("stress", load.stress_pa / 1.0e6, 1_432.606, 1e-3));
    checks.push(check("share of the strength", load.share(), 0.537, 5e-4));
    let usual = f64::from(u8::from(load.level() == LoadLevel::Usual));
    checks.push(check("a usual load", usual, 1.0, 0.0));
    Source::new("ASTM A228 as printed by interwiregroup.com", checks)
}
