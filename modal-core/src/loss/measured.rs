//! Measured T60s, interpolated over frequency.

use heapless::Vec;

use crate::bounds;
use crate::error::{Error, Result};
use crate::loss::{Loss, T60_DECAY};
use crate::string::StringSpec;

/// T60s measured at up to `N` frequencies: a power law between neighbours, the
/// nearest value outside.
#[derive(Clone, Debug, PartialEq)]
pub struct MeasuredT60<const N: usize> {
    /// Frequency and decay rate, both as logarithms.
    points: Vec<(f64, f64), N>,
}

impl<const N: usize> MeasuredT60<N> {
    /// The law through (frequency in Hz, T60 in s), by rising frequency.
    ///
    /// # Errors
    /// [`Error::Count`] for no points or more than `N`; a value outside
    /// [`bounds::FREQUENCY_HZ`] or [`bounds::T60_S`]; a frequency that is not
    /// above the one before.
    pub fn new(t60s: &[(f64, f64)]) -> Result<Self> {
        if t60s.is_empty() || t60s.len() > N {
            return Err(Error::Count {
                field: "measured T60s",
                wanted: u32::try_from(t60s.len()).unwrap_or(u32::MAX),
                capacity: u32::try_from(N).unwrap_or(u32::MAX),
            });
        }
        let mut points = Vec::new();
        let mut before = 0.0;
        for &(frequency_hz, t60_s) in t60s {
            bounds::FREQUENCY_HZ.check(frequency_hz)?;
            bounds::T60_S.check(t60_s)?;
            if frequency_hz <= before {
                return Err(Error::OutOfRange {
                    field: "next frequency of the measured T60s",
                    unit: "Hz",
                    value: frequency_hz,
                    min: before,
                    max: bounds::FREQUENCY_HZ.max,
                });
            }
            before = frequency_hz;
            // Room was checked.
            let _ = points.push((libm::log(frequency_hz), libm::log(T60_DECAY / t60_s)));
        }
        Ok(Self { points })
    }
}

impl<const N: usize> Loss for MeasuredT60<N> {
    fn decay_rate_per_s(&self, _: u32, frequency_hz: f64, _: &StringSpec) -> f64 {
        let x = libm::log(frequency_hz);
        let mut below = None;
        for &(at, rate) in &self.points {
            if x <= at {
                let Some((from, start)) = below else {
                    return libm::exp(rate);
                };
                let part = (x - from) / (at - from);
                return libm::exp(start + part * (rate - start));
            }
            below = Some((at, rate));
        }
        // There is at least one point.
        libm::exp(below.map_or(f64::NAN, |(_, rate)| rate))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_meets_its_points_and_stays_flat_outside() {
        let points = [(100.0, 8.0), (1_000.0, 2.0), (4_000.0, 0.5)];
        let law = MeasuredT60::<4>::new(&points).unwrap();
        let string = StringSpec::new(0.6, 60.0, 1.0e-3, 0.0).unwrap();
        let t60 = |hz| T60_DECAY / law.decay_rate_per_s(1, hz, &string);
        for (hz, expected) in points {
            assert!((t60(hz) / expected - 1.0).abs() < 1e-12);
        }
        assert!((t60(10.0) / 8.0 - 1.0).abs() < 1e-12);
        assert!((t60(20_000.0) / 0.5 - 1.0).abs() < 1e-12);
        // The middle of a decade that loses a factor of four.
        assert!((t60(1_000.0 / 10.0_f64.sqrt()) / 4.0 - 1.0).abs() < 1e-12);
    }

    #[test]
    fn disorder_is_refused() {
        assert!(MeasuredT60::<4>::new(&[]).is_err());
        assert!(MeasuredT60::<1>::new(&[(100.0, 8.0), (200.0, 7.0)]).is_err());
        assert!(MeasuredT60::<4>::new(&[(200.0, 8.0), (100.0, 7.0)]).is_err());
        assert!(MeasuredT60::<4>::new(&[(100.0, 8.0), (100.0, 7.0)]).is_err());
        assert!(MeasuredT60::<4>::new(&[(100.0, f64::NAN)]).is_err());
    }
}
