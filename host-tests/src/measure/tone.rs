//! Pitch and decay of a tone that sounds alone.

use super::ToneError;
use crate::reference::Damped;

/// Compares `signal`, one decaying tone, with `expected`.
///
/// In an early and a late window the tone is fitted by least squares with
/// e^(−σ t) cos ω t and e^(−σ t) sin ω t; how the fit turns and shrinks from the
/// one to the other is the error of ω and σ.
#[must_use]
pub fn tone_error(signal: &[f64], sample_rate_hz: f64, expected: &Damped) -> ToneError {
    let window = (signal.len() / 4).max(1);
    let late = signal.len() - window;
    let (a0, c0) = fit(signal, 0..window, sample_rate_hz, expected);
    let (a1, c1) = fit(signal, late..signal.len(), sample_rate_hz, expected);
    let seconds = late as f64 / sample_rate_hz;
    // a cos ωt + c sin ωt = A cos(ωt − φ), φ = atan2(c, a): a rise of φ is a lag.
    let turn = (c1 * a0 - a1 * c0).atan2(a0 * a1 + c0 * c1);
    let shrink = 0.5 * ((a1 * a1 + c1 * c1) / (a0 * a0 + c0 * c0)).ln();
    let angular = expected.angular - turn / seconds;
    let decay = expected.decay - shrink / seconds;
    ToneError {
        cents: 1_200.0 * (angular / expected.angular).log2(),
        t60: expected.decay / decay - 1.0,
    }
}

fn fit(
    signal: &[f64],
    window: std::ops::Range<usize>,
    sample_rate_hz: f64,
    expected: &Damped,
) -> (f64, f64) {
    let (mut cc, mut cs, mut ss, mut yc, mut ys) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for index in window {
        let t = index as f64 / sample_rate_hz;
        let fall = (-expected.decay * t).exp();
        let (sine, cosine) = (expected.angular * t).sin_cos();
        let (c, s) = (fall * cosine, fall * sine);
        cc += c * c;
        cs += c * s;
        ss += s * s;
        yc += signal[index] * c;
        ys += signal[index] * s;
    }
    let determinant = cc * ss - cs * cs;
    (
        (yc * ss - ys * cs) / determinant,
        (ys * cc - yc * cs) / determinant,
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_known_error_is_found() {
        let expected = Damped::new(440.0, 2.0, 0.5, 0.0);
        let mut sharp = Damped::new(440.0, 2.004, 0.5, 0.0);
        sharp.angular *= 2.0_f64.powf(0.02 / 1_200.0);
        let mut signal = vec![0.0; 24_000];
        sharp.add_to(&mut signal, 48_000.0);
        let error = tone_error(&signal, 48_000.0, &expected);
        assert!((error.cents - 0.02).abs() < 1e-5, "{}", error.cents);
        assert!((error.t60 + 0.002 / 1.002).abs() < 1e-5, "{}", error.t60);
    }
}
