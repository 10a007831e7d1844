//! Which modes can be heard at a listening level.

use crate::error::Result;
use crate::excitation::Excitation;
use crate::loss::Loss;
use crate::pickup::Pickup;
use crate::plan::heard;
use crate::series::ModeSeries;

/// ISO 226:2003, table 1: frequency in Hz, exponent α_f, transfer L_U in dB,
/// threshold T_f in dB.
const ISO_226: [(f64, f64, f64, f64); 29] = [
    (20.0, 0.532, -31.6, 78.5),
    (25.0, 0.506, -27.2, 68.7),
    (31.5, 0.480, -23.0, 59.5),
    (40.0, 0.455, -19.1, 51.1),
    (50.0, 0.432, -15.9, 44.0),
    (63.0, 0.409, -13.0, 37.5),
    (80.0, 0.387, -10.3, 31.5),
    (100.0, 0.367, -8.1, 26.5),
    (125.0, 0.349, -6.2, 22.1),
    (160.0, 0.330, -4.5, 17.9),
    (200.0, 0.315, -3.1, 14.4),
    (250.0, 0.301, -2.0, 11.4),
    (315.0, 0.288, -1.1, 8.6),
    (400.0, 0.276, -0.4, 6.2),
    (500.0, 0.267, 0.0, 4.4),
    (630.0, 0.259, 0.3, 3.0),
    (800.0, 0.253, 0.5, 2.2),
    (1_000.0, 0.250, 0.0, 2.4),
    (1_250.0, 0.246, -2.7, 3.5),
    (1_600.0, 0.244, -4.1, 1.7),
    (2_000.0, 0.243, -1.0, -1.3),
    (2_500.0, 0.243, 1.7, -4.2),
    (3_150.0, 0.243, 2.5, -6.0),
    (4_000.0, 0.242, 1.2, -5.4),
    (5_000.0, 0.242, -2.1, -1.5),
    (6_300.0, 0.245, -7.1, 6.0),
    (8_000.0, 0.254, -11.2, 12.6),
    (10_000.0, 0.271, -10.7, 13.9),
    (12_500.0, 0.301, -3.1, 12.3),
];

/// The line of [`ISO_226`] at `frequency_hz`, between lines in proportion to the
/// logarithm of frequency; `None` outside 20 Hz to 12.5 kHz.
fn iso_226(frequency_hz: f64) -> Option<(f64, f64, f64)> {
    let pairs = ISO_226.iter().zip(ISO_226.iter().skip(1));
    let (low, high) = pairs
        .into_iter()
        .find(|(low, high)| frequency_hz >= low.0 && frequency_hz <= high.0)?;
    let part = libm::log(frequency_hz / low.0) / libm::log(high.0 / low.0);
    let between = |a: f64, b: f64| a + part * (b - a);
    Some((
        between(low.1, high.1),
        between(low.2, high.2),
        between(low.3, high.3),
    ))
}

/// Threshold of hearing in dB of sound pressure level, free field, by
/// ISO 226:2003; `None` outside 20 Hz to 12.5 kHz.
#[must_use]
pub fn iso_226_threshold_db(frequency_hz: f64) -> Option<f64> {
    iso_226(frequency_hz).map(|(_, _, threshold)| threshold)
}

/// Sound pressure level in dB that is as loud as `phon`, by ISO 226:2003,
/// equation (1); the standard states it for 20 to 90 phon. `None` outside 20 Hz
/// to 12.5 kHz.
#[must_use]
pub fn iso_226_contour_db(frequency_hz: f64, phon: f64) -> Option<f64> {
    let (exponent, transfer, threshold) = iso_226(frequency_hz)?;
    let loudness = 4.47e-3 * (libm::exp10(0.025 * phon) - 1.15);
    let floor = libm::pow(
        0.4 * libm::exp10((threshold + transfer) / 10.0 - 9.0),
        exponent,
    );
    Some(10.0 / exponent * libm::log10(loudness + floor) - transfer + 94.0)
}

/// Threshold in quiet in dB by the formula of Terhardt 1979 (as quoted by
/// J. Beauchamp, auditory.org list, 2014), F in kHz:
/// 3.64 F^(−0.8) − 6.5 e^(−0.6 (F−3.3)²) + 0.001 F⁴.
#[must_use]
pub fn terhardt_threshold_db(frequency_hz: f64) -> f64 {
    let khz = frequency_hz / 1_000.0;
    let ear_canal = khz - 3.3;
    3.64 * libm::pow(khz, -0.8) - 6.5 * libm::exp(-0.6 * ear_canal * ear_canal)
        + 1.0e-3 * khz * khz * khz * khz
}

/// Critical-band rate in Bark (Zwicker & Terhardt, J. Acoust. Soc. Am. 68:1523,
/// 1980; from memory): 13 atan(0.76 F) + 3.5 atan((F/7.5)²), F in kHz.
#[must_use]
pub fn bark(frequency_hz: f64) -> f64 {
    let khz = frequency_hz / 1_000.0;
    let upper = khz / 7.5;
    13.0 * libm::atan(0.76 * khz) + 3.5 * libm::atan(upper * upper)
}

/// How a listener is served: what 0 dB of full scale is in the room, and how
/// far below a neighbour a mode may be dropped.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Listening {
    /// Sound pressure level in dB of a full-scale amplitude where the listener
    /// is. Sustained levels above 85 dB harm hearing; keep well below.
    pub full_scale_db: f64,
    /// A mode is masked if it is this far (dB) below a stronger mode within
    /// three Bark. Our own cautious rule, not a published one: 65 is ample.
    pub masking_db: f64,
}

impl Listening {
    /// A quiet room: 80 dB at full scale, masking 65 dB below.
    pub const HOME: Self = Self {
        full_scale_db: 80.0,
        masking_db: 65.0,
    };

    /// Whether a mode of `frequency_hz` at `level_db` of sound pressure is above
    /// the lower of both thresholds in quiet.
    #[must_use]
    pub fn is_above_threshold(&self, frequency_hz: f64, level_db: f64) -> bool {
        let threshold = terhardt_threshold_db(frequency_hz);
        let standard = iso_226_threshold_db(frequency_hz).unwrap_or(threshold);
        level_db > threshold.min(standard)
    }

    /// How many modes are worth computing: up to the highest of modes 1 to
    /// `modes` that is above the threshold in quiet at its start or not masked.
    ///
    /// A mode is dropped only if it is *both* below the threshold and masked.
    ///
    /// # Errors
    /// As [`ModeSeries::mode`].
    pub fn modes_worth_computing<L: Loss>(
        &self,
        series: &ModeSeries<L>,
        excitation: &impl Excitation,
        pickup: &impl Pickup,
        full_scale: f64,
        modes: u32,
    ) -> Result<u32> {
        let level = |n: u32| -> Result<(f64, f64)> {
            let (mode, state) = heard(series, excitation, pickup, n)?;
            let amplitude = state.amplitude(&mode) / full_scale;
            let level_db = self.full_scale_db + 20.0 * libm::log10(amplitude);
            Ok((mode.frequency_hz(), level_db))
        };
        for n in (1..=modes).rev() {
            let (frequency_hz, level_db) = level(n)?;
            if self.is_above_threshold(frequency_hz, level_db) {
                return Ok(n);
            }
            let own_bark = bark(frequency_hz);
            let mut masked = false;
            for other in 1..=modes {
                let (other_hz, other_db) = level(other)?;
                let near = libm::fabs(bark(other_hz) - own_bark) <= 3.0;
                masked |= near && level_db <= other_db - self.masking_db;
            }
            // What is silent is neither above a threshold nor worth a mask.
            if !masked && level_db > f64::NEG_INFINITY {
                return Ok(n);
            }
        }
        Ok(0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_contour_of_40_phon_is_40_db_at_1_khz() {
        assert!((iso_226_contour_db(1_000.0, 40.0).unwrap() - 40.010).abs() < 1e-3);
        assert_eq!(iso_226_contour_db(15_000.0, 40.0), None);
        assert_eq!(iso_226_threshold_db(f64::NAN), None);
    }

    #[test]
    fn both_thresholds_tell_the_same_story() {
        for hz in [100.0, 300.0, 1_000.0, 3_300.0, 6_000.0, 10_000.0] {
            let difference = terhardt_threshold_db(hz) - iso_226_threshold_db(hz).unwrap();
            assert!(difference.abs() < 7.9, "{hz} {difference}");
        }
    }

    #[test]
    fn bark_rises() {
        let mut before = -1.0;
        for step in 0..200 {
            let value = bark(100.0 * f64::from(step));
            assert!(value > before);
            before = value;
        }
    }
}
