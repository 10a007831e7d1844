//! Pitch and decay of many tones that sound together.

use super::ToneError;
use crate::reference::Damped;

/// Compares `signal`, a sum of decaying tones, with the tones `expected` in it.
///
/// One fit by least squares for all of them: with z = e^((−σ + iω) t), a tone of
/// complex amplitude A whose σ and ω are off by δσ and δω is
/// Re(A z) + Re((−δσ + iδω) A · t z) to first order, so the columns of the fit are
/// the real and imaginary parts of z and t z of every tone. The fit is repeated
/// around its own result until what the first order leaves is gone (Gauss and
/// Newton). The amplitudes of `expected` play no part.
///
/// Tones that die sooner than in `shortest_t60_s` have too few frames to tell their
/// pitch: they are taken as expected, and their error is `None`.
///
/// Nothing at all comes back if two tones are too close to tell them apart.
#[must_use]
pub fn tone_errors(
    signal: &[f64],
    sample_rate_hz: f64,
    expected: &[Damped],
    shortest_t60_s: f64,
) -> Option<Vec<Option<ToneError>>> {
    const ROUNDS: usize = 3;
    let is_sought = |tone: &Damped| tone.t60_s() >= shortest_t60_s;
    let mut found = expected.to_vec();
    for _ in 0..ROUNDS {
        let mut columns = Vec::new();
        for (tone, expected) in found.iter().zip(expected) {
            let [re, im] = parts(tone, signal.len(), sample_rate_hz);
            if is_sought(expected) {
                columns.extend([by_time(&re, sample_rate_hz), by_time(&im, sample_rate_hz)]);
            }
            columns.extend([re, im]);
        }
        let mut solution = least_squares(&columns, signal)?.into_iter();
        let mut next = || solution.next().unwrap_or_default();
        for (tone, expected) in found.iter_mut().zip(expected) {
            let change = is_sought(expected).then(|| (next(), -next()));
            // x cos + y sin is the real part of (x − iy) z.
            let (a, b) = (next(), -next());
            if let Some((re, im)) = change {
                // (re + i im) = (−δσ + iδω)(a + ib).
                let power = a * a + b * b;
                tone.decay -= (re * a + im * b) / power;
                tone.angular += (im * a - re * b) / power;
            }
        }
    }
    let errors = found.iter().zip(expected).map(|(found, expected)| {
        is_sought(expected).then(|| ToneError {
            cents: 1_200.0 * (found.angular / expected.angular).log2(),
            t60: expected.decay / found.decay - 1.0,
        })
    });
    Some(errors.collect())
}

/// The real and imaginary parts of z at every sample instant.
fn parts(tone: &Damped, frames: usize, sample_rate_hz: f64) -> [Vec<f64>; 2] {
    [(1.0, 0.0), (0.0, 1.0)].map(|(a, c)| {
        let mut column = vec![0.0; frames];
        Damped { a, c, ..*tone }.add_to(&mut column, sample_rate_hz);
        column
    })
}

/// `column` times t.
fn by_time(column: &[f64], sample_rate_hz: f64) -> Vec<f64> {
    let instants = column.iter().enumerate();
    instants
        .map(|(n, value)| value * n as f64 / sample_rate_hz)
        .collect()
}

/// The x that makes |Σ x_j column_j − y|² least, by the normal equations and
/// their Cholesky factor, with columns of length 1.
fn least_squares(columns: &[Vec<f64>], y: &[f64]) -> Option<Vec<f64>> {
    let lengths: Vec<f64> = columns.iter().map(|one| dot(one, one).sqrt()).collect();
    let size = columns.len();
    let mut factor = vec![vec![0.0; size]; size];
    let mut x: Vec<f64> = vec![0.0; size];
    for row in 0..size {
        for column in 0..=row {
            let product = dot(&columns[row], &columns[column]) / (lengths[row] * lengths[column]);
            let rest = product - dot(&factor[row][..column], &factor[column][..column]);
            factor[row][column] = if row == column {
                // Not a number, or nothing left: the columns depend on each other.
                if rest.is_nan() || rest <= 1.0e-12 {
                    return None;
                }
                rest.sqrt()
            } else {
                rest / factor[column][column]
            };
        }
        let sum = dot(&columns[row], y) / lengths[row];
        x[row] = (sum - dot(&factor[row][..row], &x[..row])) / factor[row][row];
    }
    for row in (0..size).rev() {
        let known: f64 = (row + 1..size)
            .map(|below| factor[below][row] * x[below])
            .sum();
        x[row] = (x[row] - known) / factor[row][row];
    }
    for (value, length) in x.iter_mut().zip(lengths) {
        *value /= length;
    }
    Some(x)
}

/// Eight sums side by side, which the compiler makes wide.
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let (mut sums, (a8, b8)) = ([0.0; 8], (a.chunks_exact(8), b.chunks_exact(8)));
    let rest: f64 = a8
        .remainder()
        .iter()
        .zip(b8.remainder())
        .map(|(a, b)| a * b)
        .sum();
    for (a, b) in a8.zip(b8) {
        for ((sum, a), b) in sums.iter_mut().zip(a).zip(b) {
            *sum += a * b;
        }
    }
    sums.iter().sum::<f64>() + rest
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 48_000.0;

    /// Ten tones, each off by its own known amount.
    #[test]
    fn known_errors_are_found() {
        let (mut expected, mut signal) = (Vec::new(), vec![0.0; 9_600]);
        let known = |n: f64| (0.003 * (n - 5.0), 1.0e-3 * (4.0 - n));
        for n in 1..=10 {
            let n = f64::from(n);
            let tone = Damped::new(110.0 * n, 2.0 + n, 0.5 / n, 20.0);
            let (cents, t60) = known(n);
            let off = Damped {
                angular: tone.angular * 2.0_f64.powf(cents / 1_200.0),
                decay: tone.decay / (1.0 + t60),
                ..tone
            };
            off.add_to(&mut signal, RATE_HZ);
            expected.push(tone);
        }
        let errors = tone_errors(&signal, RATE_HZ, &expected, 0.0).unwrap();
        for (n, error) in (1..).zip(errors) {
            let (error, (cents, t60)) = (error.unwrap(), known(f64::from(n)));
            assert!((error.cents - cents).abs() < 1e-9, "{n}: {error:?}");
            assert!((error.t60 - t60).abs() < 1e-8, "{n}: {error:?}");
        }
    }

    /// A click among the tones neither is measured nor disturbs them.
    #[test]
    fn what_dies_at_once_is_taken_as_expected() {
        let tone = Damped::new(440.0, 3.0, 0.1, 0.0);
        let click = Damped::new(9_000.0, 5_000.0, 0.1, 0.0);
        let mut signal = vec![0.0; 4_800];
        tone.add_to(&mut signal, RATE_HZ);
        click.add_to(&mut signal, RATE_HZ);
        let errors = tone_errors(&signal, RATE_HZ, &[tone, click], 0.02).unwrap();
        assert!(errors[0].unwrap().cents.abs() < 1e-9);
        assert!(errors[1].is_none());
    }

    #[test]
    fn one_tone_twice_is_refused() {
        let tone = Damped::new(440.0, 3.0, 0.1, 0.0);
        let mut signal = vec![0.0; 4_800];
        tone.add_to(&mut signal, RATE_HZ);
        assert!(tone_errors(&signal, RATE_HZ, &[tone, tone], 0.0).is_none());
    }
}
