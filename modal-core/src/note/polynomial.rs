//! The two functions that turn a squared angle into coefficients.
//!
//! Both are entire in x = θ², so that no square root is needed:
//! f(x) = 2 − 2 cos √x and j(x) = f′(x) = sin √x / √x. Both are computed for
//! 0 ≤ x < 8, which holds (0.9 π)²; z = x/8 in Q32.
//!
//! The coefficients are near-minimax fits (Chebyshev interpolation) of
//! (1 − f(x)/x)/z and (1 − j(x))/z over 0..1, rounded to Q32; the tests compare
//! them with the functions over the whole range.

/// Upper half of the product: two Q32 factors give a Q32 product.
pub(super) const fn mul_high(a: u32, b: u32) -> u32 {
    ((a as u64 * b as u64) >> 32) as u32
}

/// 1 − f(x)/x in Q32; off by less than 5 units.
pub(super) const fn bend(z: u32) -> u32 {
    // 2/3, 8/45, … to within the fit.
    let p = 23_370;
    let p = 584_905 - mul_high(z, p);
    let p = 9_694_468 - mul_high(z, p);
    let p = 109_078_207 - mul_high(z, p);
    let p = 763_549_714 - mul_high(z, p);
    let p = 2_863_311_530 - mul_high(z, p);
    mul_high(z, p)
}

/// 1 − j(x) in Q31, which reaches 1.1; off by less than 2^−23.
pub(super) const fn slack(z: u32) -> u32 {
    // 4/3, 8/15, … to within the fit, in Q31.
    let p = 1_550_327;
    let p = 24_057_367 - mul_high(z, p);
    let p = 218_092_543 - mul_high(z, p);
    let p = 1_145_316_579 - mul_high(z, p);
    let p = 2_863_311_370 - mul_high(z, p);
    mul_high(z, p)
}

/// The same to three terms, off by less than 2^−11 of z: enough where it is
/// multiplied by a small decay.
pub(super) const fn rough_slack(z: u32) -> u32 {
    let p = 1_133_043_624 - mul_high(z, 184_622_657);
    let p = 2_862_632_088 - mul_high(z, p);
    mul_high(z, p)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn polynomials_follow_their_functions() {
        let (mut worst_bend, mut worst_slack) = (0.0_f64, 0.0_f64);
        for step in 1..200_000_u32 {
            let z = step * 21_474;
            let x = f64::from(z) / 2.0_f64.powi(29);
            let root = x.sqrt();
            let exact_bend = 1.0 - (2.0 * (0.5 * root).sin()).powi(2) / x;
            let exact_slack = 1.0 - root.sin() / root;
            worst_bend = worst_bend.max((f64::from(bend(z)) / 2.0_f64.powi(32) - exact_bend).abs());
            let rough = f64::from(rough_slack(z)) / 2.0_f64.powi(31) - exact_slack;
            assert!(rough.abs() <= x / 8.0 * 2.0_f64.powi(-11));
            worst_slack =
                worst_slack.max((f64::from(slack(z)) / 2.0_f64.powi(31) - exact_slack).abs());
        }
        assert!(worst_bend < 5.0 / 2.0_f64.powi(32), "{worst_bend:e}");
        assert!(worst_slack < 2.0_f64.powi(-23), "{worst_slack:e}");
    }
}
