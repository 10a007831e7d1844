//! Starts from a whole shape: straight pieces, parabola, half sine, samples.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::{Error, Result};
use crate::excitation::{Excitation, ModalState};
use crate::maths::{sin_pi, sinc};
use crate::series::Mode;
use crate::string::StringSpec;

/// Whether a shape is of the displacement (m) or of the velocity (m/s).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Of {
    /// y(x, 0), in m.
    #[default]
    Displacement,
    /// y_t(x, 0), in m/s.
    Velocity,
}

impl Of {
    pub(crate) fn state(self, coefficient: f64) -> ModalState {
        match self {
            Self::Displacement => ModalState {
                displacement: coefficient,
                velocity: 0.0,
            },
            Self::Velocity => ModalState {
                displacement: 0.0,
                velocity: coefficient,
            },
        }
    }
}

/// A corner of a shape of straight pieces.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Corner {
    /// Place as a fraction of the length, 0 and 1 included.
    pub place: f64,
    /// Value on the left of the corner, in m or m/s.
    pub left: f64,
    /// Value on its right; equal to `left` unless the shape jumps.
    pub right: f64,
}

impl Corner {
    /// A corner without a jump.
    #[must_use]
    pub const fn new(place: f64, value: f64) -> Self {
        Self {
            place,
            left: value,
            right: value,
        }
    }
}

/// Any shape of straight pieces, jumps included; exact.
///
/// Before the first and after the last corner the shape goes straight to zero at
/// the end; a corner *at* an end can say otherwise. With slopes s and jumps J,
/// both by place: a_n = (2/(n π)) Σ J cos(n π p) + (2/(n² π²)) Σ (s_left −
/// s_right) sin(n π p) (partial integration of the sine coefficients), and with
/// J at the ends where the shape does not reach zero there.
///
/// The ideal shape itself: a stiff string held in it would bend infinitely
/// sharply at its corners. For a pluck see [`crate::PointPluck`].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Polyline<'a> {
    corners: &'a [Corner],
    of: Of,
}

/// Value of a corner, m or m/s.
const VALUE: bounds::Bound = bounds::Bound {
    name: "value of a shape",
    unit: "m or m/s",
    min: -100.0,
    max: 100.0,
};

/// Place of a corner, the ends included.
const CORNER_PLACE: bounds::Bound = bounds::Bound {
    name: "place of a corner",
    unit: "",
    min: 0.0,
    max: 1.0,
};

impl<'a> Polyline<'a> {
    /// The shape through `corners`, by rising place.
    ///
    /// # Errors
    /// No corners ([`Error::Count`]); a place outside 0 to 1 or not above the one
    /// before; a value outside ±100 m or m/s.
    pub fn new(corners: &'a [Corner], of: Of) -> Result<Self> {
        if corners.is_empty() {
            return Err(Error::Count {
                field: "corners",
                wanted: 0,
                capacity: u32::MAX,
            });
        }
        let mut before = -1.0;
        for corner in corners {
            CORNER_PLACE.check(corner.place)?;
            VALUE.check(corner.left)?;
            VALUE.check(corner.right)?;
            if corner.place <= before {
                return Err(Error::OutOfRange {
                    field: "place of the next corner",
                    unit: "",
                    value: corner.place,
                    min: before,
                    max: 1.0,
                });
            }
            before = corner.place;
        }
        Ok(Self { corners, of })
    }

    /// Sine coefficient of index `n`.
    fn coefficient(&self, n: u32) -> f64 {
        let n = f64::from(n);
        // The point before, as seen from its right, and the slope up to it.
        let (mut place, mut value) = (0.0, 0.0);
        let mut slope_before: Option<f64> = None;
        let (mut jumps, mut bends) = (0.0, 0.0);
        let end = Corner::new(1.0, 0.0);
        let ends_itself = self.corners.last().is_some_and(|last| last.place == 1.0);
        let closing = (!ends_itself).then_some(end);
        for corner in self.corners.iter().copied().chain(closing) {
            if corner.place == 0.0 {
                // y(0+) against the fixed end.
                jumps += corner.right;
                value = corner.right;
                continue;
            }
            let slope = (corner.left - value) / (corner.place - place);
            if let Some(before) = slope_before {
                bends += (before - slope) * sin_pi(n * place);
            }
            slope_before = Some(slope);
            // At x = L the shape falls from its left value to the fixed end.
            let right = if corner.place == 1.0 {
                0.0
            } else {
                corner.right
            };
            jumps += (right - corner.left) * cos_pi(n * corner.place);
            (place, value) = (corner.place, right);
        }
        2.0 / (n * PI) * jumps + 2.0 / (n * n * PI * PI) * bends
    }
}

/// cos(π x).
fn cos_pi(x: f64) -> f64 {
    sin_pi(x + 0.5)
}

impl Excitation for Polyline<'_> {
    fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
        self.of.state(self.coefficient(mode.n()))
    }
}

/// A parabola 4 h x (L−x)/L²: a_n = 32 h/(n³ π³) for odd n, nothing for even n.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Parabola {
    height: f64,
    of: Of,
}

impl Parabola {
    /// A parabola of `height` in the middle, m or m/s.
    ///
    /// # Errors
    /// A height outside ±100 m or m/s.
    pub fn new(height: f64, of: Of) -> Result<Self> {
        Ok(Self {
            height: VALUE.check(height)?,
            of,
        })
    }
}

impl Excitation for Parabola {
    fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
        let n = f64::from(mode.n()) * PI;
        let odd = f64::from(mode.n() % 2);
        self.of.state(odd * 32.0 * self.height / (n * n * n))
    }
}

/// Half a sine: mode 1 alone.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct HalfSine {
    height: f64,
    of: Of,
}

impl HalfSine {
    /// Half a sine of `height` in the middle, m or m/s.
    ///
    /// # Errors
    /// A height outside ±100 m or m/s.
    pub fn new(height: f64, of: Of) -> Result<Self> {
        Ok(Self {
            height: VALUE.check(height)?,
            of,
        })
    }
}

impl Excitation for HalfSine {
    fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
        self.of.state(if mode.n() == 1 { self.height } else { 0.0 })
    }
}

/// What is between the samples of a [`Sampled`] shape.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Between {
    /// Straight lines: exact for every mode.
    #[default]
    Straight,
    /// The only sum of fewer modes than there are intervals that meets every
    /// sample; higher modes are silent.
    BandLimited,
}

/// A shape given by samples at equal distances.
///
/// The samples y_1 … y_(N−1) stand at j L/N; the ends are zero. Their discrete
/// sine transform (type I) a_n = (2/N) Σ y_j sin(π n j/N) is computed mode by
/// mode, without memory: N steps a mode, which makes this a start for set-up
/// time. For straight lines in between, it is multiplied by (sin θ/θ)² with
/// θ = n π/(2N), and continued beyond n = N as the samples' period tells.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sampled<'a> {
    samples: &'a [f64],
    of: Of,
    between: Between,
}

impl<'a> Sampled<'a> {
    /// The shape through `samples`, ends not included.
    ///
    /// # Errors
    /// No samples or more than 65,535 ([`Error::Count`]); a sample outside ±100
    /// m or m/s.
    pub fn new(samples: &'a [f64], of: Of, between: Between) -> Result<Self> {
        let most = u32::from(u16::MAX);
        let count = u32::try_from(samples.len()).unwrap_or(u32::MAX);
        if count == 0 || count > most {
            return Err(Error::Count {
                field: "samples",
                wanted: count,
                capacity: most,
            });
        }
        for &sample in samples {
            VALUE.check(sample)?;
        }
        Ok(Self {
            samples,
            of,
            between,
        })
    }
}

impl Excitation for Sampled<'_> {
    fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
        // At most 2^16 intervals.
        let intervals = self.samples.len() as u64 + 1;
        let n = u64::from(mode.n());
        if self.between == Between::BandLimited && n >= intervals {
            return ModalState::default();
        }
        let size = intervals as f64;
        let mut sum = 0.0;
        for (&sample, j) in self.samples.iter().zip(1_u64..) {
            // n j modulo the period 2N, exactly.
            let turn = (n * j) % (2 * intervals);
            sum += sample * sin_pi(turn as f64 / size);
        }
        let straight = match self.between {
            Between::Straight => {
                let factor = sinc(0.5 * PI * n as f64 / size);
                factor * factor
            }
            Between::BandLimited => 1.0,
        };
        self.of.state(2.0 / size * sum * straight)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::PointPluck;
    use crate::loss::ConstantT60;
    use crate::series::ModeSeries;

    fn modes() -> impl Iterator<Item = (Mode, StringSpec)> {
        let string = StringSpec::new(0.7, 60.0, 1.0e-3, 0.0).unwrap();
        let series = ModeSeries::new(string, ConstantT60::new(3.0).unwrap());
        (1..200).map(move |n| (series.mode(n).unwrap(), string))
    }

    #[test]
    fn a_triangle_is_a_pluck_and_its_samples_are_it_too() {
        let place = 13.0 / 64.0;
        let corners = [Corner::new(place, 2.0e-3)];
        let line = Polyline::new(&corners, Of::Displacement).unwrap();
        let pluck = PointPluck::new(place, 2.0e-3).unwrap();
        let mut samples = [0.0; 63];
        for (sample, j) in samples.iter_mut().zip(1..) {
            let x = f64::from(j) / 64.0;
            *sample = 2.0e-3 * (x / place).min((1.0 - x) / (1.0 - place));
        }
        let sampled = Sampled::new(&samples, Of::Displacement, Between::Straight).unwrap();
        for (mode, string) in modes() {
            let exact = pluck.mode(&mode, &string).displacement;
            assert!((line.mode(&mode, &string).displacement - exact).abs() < 1e-17);
            assert!((sampled.mode(&mode, &string).displacement - exact).abs() < 1e-16);
        }
    }

    #[test]
    fn jumps_count() {
        // y = x up to the far end: a_n = 2 (−1)^(n+1)/(n π).
        let corners = [Corner::new(1.0, 1.0)];
        let ramp = Polyline::new(&corners, Of::Velocity).unwrap();
        // A box from 0.2 to 0.5: (2/(n π))(cos 0.2 n π − cos 0.5 n π).
        let edges = [
            Corner {
                place: 0.2,
                left: 0.0,
                right: 1.0,
            },
            Corner {
                place: 0.5,
                left: 1.0,
                right: 0.0,
            },
        ];
        let level = Polyline::new(&edges, Of::Velocity).unwrap();
        for (mode, string) in modes() {
            let n = f64::from(mode.n()) * PI;
            let sign = if mode.n() % 2 == 1 { 1.0 } else { -1.0 };
            assert!((ramp.mode(&mode, &string).velocity - 2.0 * sign / n).abs() < 1e-14);
            let exact = 2.0 / n * ((0.2 * n).cos() - (0.5 * n).cos());
            assert!((level.mode(&mode, &string).velocity - exact).abs() < 1e-13);
        }
    }

    #[test]
    fn disorder_is_refused() {
        assert!(Polyline::new(&[], Of::Displacement).is_err());
        let twice = [Corner::new(0.5, 0.1), Corner::new(0.5, 0.2)];
        assert!(Polyline::new(&twice, Of::Displacement).is_err());
        assert!(Polyline::new(&[Corner::new(1.5, 0.1)], Of::Displacement).is_err());
        assert!(Sampled::new(&[], Of::Displacement, Between::Straight).is_err());
        assert!(Sampled::new(&[f64::NAN], Of::Displacement, Between::Straight).is_err());
        assert!(Parabola::new(f64::INFINITY, Of::Displacement).is_err());
    }
}
