//! Small mathematics shared by the set-up modules.

use core::f64::consts::{FRAC_PI_2, PI};

/// sin(π x), exactly zero at whole numbers.
pub(crate) fn sin_pi(x: f64) -> f64 {
    // x - 2 round(x/2) is exact in binary floating point: |turn| <= 1.
    let turn = x - 2.0 * libm::rint(0.5 * x);
    if turn == 1.0 || turn == -1.0 {
        0.0
    } else if turn > 0.5 {
        libm::sin(PI * (1.0 - turn))
    } else if turn < -0.5 {
        -libm::sin(PI * (1.0 + turn))
    } else {
        libm::sin(PI * turn)
    }
}

/// sin(x)/x, 1 at zero.
pub(crate) fn sinc(x: f64) -> f64 {
    if x.abs() < 1.0e-4 {
        // The next term of the series is below 1e-18.
        1.0 - x * x / 6.0
    } else if x.abs() > FRAC_PI_2 {
        // Keep the zeros at multiples of π exact to the last bit of x/π.
        sin_pi(x / PI) / x
    } else {
        libm::sin(x) / x
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn whole_numbers_are_nodes() {
        for n in -9_i32..=9 {
            assert_eq!(sin_pi(f64::from(n)), 0.0);
        }
        assert!((sin_pi(0.5) - 1.0).abs() < 1e-15);
        assert!((sin_pi(1.5) + 1.0).abs() < 1e-15);
        assert!((sin_pi(0.75) - libm::sin(0.75 * PI)).abs() < 1e-15);
    }

    #[test]
    fn sinc_is_continuous() {
        assert_eq!(sinc(0.0), 1.0);
        for edge in [1.0e-4_f64, FRAC_PI_2] {
            let jump = sinc(edge * (1.0 + 1e-12)) - sinc(edge * (1.0 - 1e-12));
            assert!(jump.abs() < 1e-11);
        }
    }
}
