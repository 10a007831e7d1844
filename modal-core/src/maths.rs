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

/// sin x/(x (1 − x²/π²)): 1 at zero, 1/2 at π.
pub(crate) fn raised_sinc(x: f64) -> f64 {
    // sin x/(x (1 − x/π)(1 + x/π)) = sinc(π − x)·π/(x (1 + x/π)) near π.
    let y = x.abs() / PI;
    if y > 0.5 && y < 1.5 {
        sinc(PI * (1.0 - y)) / (y * (1.0 + y))
    } else {
        sinc(x) / (1.0 - y * y)
    }
}

/// cos x/(1 − (2x/π)²): 1 at zero, π/4 at π/2.
pub(crate) fn half_cosine(x: f64) -> f64 {
    let y = 2.0 * x.abs() / PI;
    if y > 0.5 && y < 1.5 {
        // cos x = sin(π/2 − x), and 1 − y² = (1 − y)(1 + y).
        FRAC_PI_2 * sinc(FRAC_PI_2 * (1.0 - y)) / (1.0 + y)
    } else {
        libm::cos(x) / (1.0 - y * y)
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
    fn removable_poles_are_removed() {
        assert_eq!(raised_sinc(0.0), 1.0);
        assert!((raised_sinc(PI) - 0.5).abs() < 1e-15);
        assert_eq!(half_cosine(0.0), 1.0);
        assert!((half_cosine(FRAC_PI_2) - FRAC_PI_2 / 2.0).abs() < 1e-15);
        for x in [0.3_f64, 1.5, 1.6, 3.0, 3.3, 4.8, 7.0] {
            let raised = x.sin() / (x * (1.0 - (x / PI).powi(2)));
            assert!((raised_sinc(x) - raised).abs() < 1e-13, "{x}");
            let cosine = x.cos() / (1.0 - (2.0 * x / PI).powi(2));
            assert!((half_cosine(x) - cosine).abs() < 1e-13, "{x}");
        }
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
