//! Frets: where they stand, and what pressing a string onto one does.

use core::f64::consts::LN_2;

use crate::bounds;
use crate::error::Result;

/// Distance in m of `fret` from the nut of a scale of equal temperament:
/// L (1 − 2^(−fret/12)).
///
/// # Errors
/// `scale_m` outside [`bounds::LENGTH_M`].
pub fn fret_distance_m(scale_m: f64, fret: u8) -> Result<f64> {
    let scale = bounds::LENGTH_M.check(scale_m)?;
    Ok(-scale * libm::expm1(-LN_2 * f64::from(fret) / 12.0))
}

/// Strain that a string gets when it is pressed by `depth_m` at `at_m` from one
/// of its ends: two straight pieces instead of one.
///
/// # Errors
/// `length_m` outside [`bounds::LENGTH_M`], `at_m` outside 0 to `length_m` by
/// [`bounds::PLACE`], or a depth outside [`bounds::WIDTH_M`].
pub fn pressing_strain(length_m: f64, at_m: f64, depth_m: f64) -> Result<f64> {
    let length = bounds::LENGTH_M.check(length_m)?;
    let at = length * bounds::PLACE.check(at_m / length)?;
    let depth = bounds::WIDTH_M.check(depth_m)?;
    // hypot(x, d) − x without cancellation.
    let longer = |x: f64| depth * depth / (libm::hypot(x, depth) + x);
    Ok((longer(at) + longer(length - at)) / length)
}

/// Cents by which `strain` raises the pitch of a string of axial stiffness E·A
/// under `tension_n`, at a speaking length that stays:
/// f ∝ √((1 + E·A e/T)(1 + e)), tension up and mass per metre down.
///
/// # Errors
/// `tension_n` outside [`bounds::TENSION_N`], or a strain outside
/// [`bounds::STRAIN`]; an axial stiffness outside [`bounds::AXIAL_STIFFNESS_N`].
pub fn fretting_cents(axial_stiffness_n: f64, tension_n: f64, strain: f64) -> Result<f64> {
    let stiffness = bounds::AXIAL_STIFFNESS_N.check(axial_stiffness_n)?;
    let tension = bounds::TENSION_N.check(tension_n)?;
    let strain = bounds::STRAIN.check(strain)?;
    Ok(600.0 / LN_2 * (libm::log1p(stiffness * strain / tension) + libm::log1p(strain)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_octave_is_at_the_middle() {
        assert!((fret_distance_m(0.648, 12).unwrap() - 0.324).abs() < 1e-15);
        assert_eq!(fret_distance_m(0.648, 0).unwrap(), 0.0);
    }

    #[test]
    fn a_small_strain_acts_in_proportion() {
        // (600/ln 2)(E·A/T + 1) e.
        let cents = fretting_cents(141.0 * 70.0, 70.0, 1.0e-8).unwrap();
        assert!((cents / (600.0 / LN_2 * 142.0 * 1.0e-8) - 1.0).abs() < 1e-6);
    }

    #[test]
    fn a_press_is_a_triangle() {
        let strain = pressing_strain(0.65, 0.1, 2.0e-3).unwrap();
        let length = 0.1_f64.hypot(2.0e-3) + 0.55_f64.hypot(2.0e-3);
        assert!((strain - (length / 0.65 - 1.0)).abs() < 1e-12);
    }
}
