//! Levels and errors. 0 dBFS is an rms of 1.0, digital full scale.

/// 10 lg of a mean square.
#[must_use]
pub fn power_db(mean_square: f64) -> f64 {
    10.0 * mean_square.log10()
}

/// Q31 as a number.
#[must_use]
pub fn from_q31(value: i32) -> f64 {
    f64::from(value) / 2_147_483_648.0
}

/// Mean square of the difference.
#[must_use]
pub fn mean_square_error(signal: &[f64], reference: &[f64]) -> f64 {
    let sum: f64 = signal
        .iter()
        .zip(reference)
        .map(|(s, r)| (s - r).powi(2))
        .sum();
    sum / signal.len().min(reference.len()).max(1) as f64
}

/// rms of the difference in dBFS.
#[must_use]
pub fn error_dbfs(signal: &[f64], reference: &[f64]) -> f64 {
    power_db(mean_square_error(signal, reference))
}

/// Largest magnitude in dBFS.
#[must_use]
pub fn peak_dbfs(signal: &[f64]) -> f64 {
    let peak = signal.iter().fold(0.0_f64, |peak, s| peak.max(s.abs()));
    20.0 * peak.log10()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_tenth_is_20_db_down() {
        let (ones, less) = ([1.0; 7], [0.9; 7]);
        assert!((error_dbfs(&ones, &less) + 20.0).abs() < 1e-9);
        assert!((peak_dbfs(&[0.05, -0.1]) + 20.0).abs() < 1e-9);
        assert_eq!(from_q31(i32::MIN), -1.0);
    }
}
