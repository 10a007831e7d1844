//! Levels over frequency.

use std::f64::consts::TAU;

use realfft::RealFftPlanner;

/// Blackman and Harris, four terms (Harris, Proc. IEEE 66:51, 1978; from memory):
/// leaks less than −92 dB.
const WINDOW: [f64; 4] = [0.35875, -0.48829, 0.14128, -0.01168];

/// Mean squares per bin of a windowed signal, for which a stationary signal sums
/// to its own mean square.
#[derive(Clone, Debug)]
pub struct Spectrum {
    powers: Vec<f64>,
}

impl Spectrum {
    /// The mean spectrum of pieces of `length` frames, a power of two, that
    /// overlap by half (Welch, IEEE Trans. AU-15:70, 1967; from memory). What is
    /// left at the end is not looked at.
    #[must_use]
    pub fn of(signal: &[f64], length: usize) -> Self {
        let window: Vec<f64> = (0..length)
            .map(|n| {
                let turn = TAU * n as f64 / length as f64;
                let terms = (0..).zip(WINDOW);
                terms.map(|(k, a)| a * (f64::from(k) * turn).cos()).sum()
            })
            .collect();
        let power: f64 = window.iter().map(|w| w * w).sum();
        let transform = RealFftPlanner::new().plan_fft_forward(length);
        let mut bins = transform.make_output_vec();
        let mut powers = vec![0.0; bins.len()];
        let pieces: Vec<_> = signal.windows(length).step_by(length / 2).collect();
        for piece in &pieces {
            let mut input: Vec<f64> = piece.iter().zip(&window).map(|(s, w)| s * w).collect();
            // The only errors are of lengths, which were asked for above.
            let _ = transform.process(&mut input, &mut bins);
            for (power, bin) in powers.iter_mut().zip(&bins) {
                *power += bin.norm_sqr();
            }
        }
        // Both halves of the spectrum, but only one of the two ends.
        let scale = 2.0 / (power * length as f64 * pieces.len().max(1) as f64);
        let last = powers.len() - 1;
        for (bin, value) in powers.iter_mut().enumerate() {
            *value *= if bin == 0 || bin == last {
                0.5 * scale
            } else {
                scale
            };
        }
        Self { powers }
    }

    /// Mean square in each bin, from zero to half the sample rate.
    #[must_use]
    pub fn powers(&self) -> &[f64] {
        &self.powers
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bins_sum_to_the_power() {
        let sine: Vec<f64> = (0..40_000).map(|n| (0.3 * f64::from(n)).sin()).collect();
        let spectrum = Spectrum::of(&sine, 1_024);
        let sum: f64 = spectrum.powers().iter().sum();
        assert!((sum / 0.5 - 1.0).abs() < 1e-3, "{sum}");
        // And they do so where the tone is.
        let bin = (0.3 * 1_024.0 / TAU) as usize;
        let near: f64 = spectrum.powers()[bin - 4..=bin + 4].iter().sum();
        assert!((near / sum - 1.0).abs() < 1e-6);
    }
}
