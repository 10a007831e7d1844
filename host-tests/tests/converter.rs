//! DAC words against an ideal converter with triangular dither.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

use host_tests::measure::{Spectrum, from_q31, power_db};
use host_tests::tolerance;
use modal_core::{Converter, DacFormat, TwosComplement16, Unipolar12};

/// Error power of `words` against the mix, as a share of the last place squared.
fn error_in_places<F: DacFormat>(mix: &[i32], level: impl Fn(u16) -> f64) -> (f64, f64) {
    let mut words = vec![0; mix.len()];
    let mut converter = Converter::<F>::new(7);
    converter.convert(mix, &mut words, false);
    assert_eq!(converter.clipped(), 0);
    let places = 2.0_f64.powi(F::BITS as i32 - 1);
    let errors: Vec<f64> = mix
        .iter()
        .zip(&words)
        .map(|(&frame, &word)| level(word) - from_q31(frame) * places)
        .collect();
    let mean = errors.iter().sum::<f64>() / errors.len() as f64;
    let power = errors.iter().map(|error| error * error).sum::<f64>() / errors.len() as f64;
    (mean, power)
}

fn sine(amplitude: f64, frames: usize) -> Vec<i32> {
    (0..frames)
        .map(|n| (amplitude * (n as f64 * 0.0371).sin() * 2.0_f64.powi(31)) as i32)
        .collect()
}

/// The error has no mean and a quarter of the last place squared as its power
/// (Lipshitz, Wannamaker & Vanderkooy 1992; from memory), loud or soft.
#[test]
fn errors_are_those_of_triangular_dither() {
    for amplitude in [0.9, 1.0e-3, 1.0e-5, 0.0] {
        let mix = sine(amplitude, 400_000);
        let signed = |word: u16| f64::from(word.cast_signed());
        let (mean, power) = error_in_places::<TwosComplement16>(&mix, signed);
        assert!(mean.abs() < tolerance::DITHER_MEAN, "{mean}");
        assert!((power_db(power) - power_db(0.25)).abs() < tolerance::DITHER_DB);
        let unipolar = |word: u16| f64::from(word) - 2_048.0;
        let (mean, power) = error_in_places::<Unipolar12>(&mix, unipolar);
        assert!(mean.abs() < tolerance::DITHER_MEAN, "{mean}");
        assert!((power_db(power) - power_db(0.25)).abs() < tolerance::DITHER_DB);
    }
}

/// The error is noise: no bin of its spectrum stands out, and none is weaker below
/// than above, with a sine, a slow ramp and silence that is not called so.
#[test]
fn errors_are_white() {
    let ramp: Vec<i32> = (0..400_000).map(|n| n << 4).collect();
    for mix in [sine(0.5, 400_000), ramp, vec![0; 400_000]] {
        let mut words = vec![0; mix.len()];
        Converter::<TwosComplement16>::new(11).convert(&mix, &mut words, false);
        let errors: Vec<f64> = mix
            .iter()
            .zip(&words)
            .map(|(&frame, &word)| f64::from(word.cast_signed()) - 32_768.0 * from_q31(frame))
            .collect();
        let spectrum = Spectrum::of(&errors, 1_024);
        // Each bin but the two ends holds as much.
        let even = 0.25 / 512.0;
        for &power in &spectrum.powers()[1..512] {
            let level = power_db(power / even);
            assert!(level.abs() < tolerance::DITHER_TONE_DB, "{level:.2} dB");
        }
    }
}

#[test]
fn clipping_is_counted_and_bounded() {
    let mix = [i32::MAX, i32::MIN, i32::MAX, 0];
    let mut words = [0; 4];
    let mut converter = Converter::<TwosComplement16>::new(1);
    let mut clipped = 0;
    for _ in 0..1_000 {
        converter.convert(&mix, &mut words, false);
        assert!(words[0].cast_signed() >= i16::MAX - 1 && words[1].cast_signed() <= i16::MIN + 1);
        clipped = converter.clipped();
    }
    assert!(clipped > 0 && clipped <= 3_000);
}

#[test]
fn silence_is_the_rest_word_and_draws_no_dither() {
    let mut words = [9; 64];
    let mut converter = Converter::<TwosComplement16>::new(3);
    let mut other = converter.clone();
    converter.convert(&[0; 64], &mut words, true);
    assert_eq!(words, [TwosComplement16::REST; 64]);
    let (mut after, mut fresh) = ([0; 64], [0; 64]);
    converter.convert(&[0; 64], &mut after, false);
    other.convert(&[0; 64], &mut fresh, false);
    assert_eq!(after, fresh);
    assert!(after.iter().any(|&word| word != 0));
}

#[test]
fn the_seed_is_the_noise() {
    let mix = sine(0.1, 1_000);
    let words = |seed| {
        let mut words = vec![0; mix.len()];
        Converter::<TwosComplement16>::new(seed).convert(&mix, &mut words, false);
        words
    };
    assert_eq!(words(5), words(5));
    assert_ne!(words(5), words(6));
    assert_eq!(words(0), words(1));
}
