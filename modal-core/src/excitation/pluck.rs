//! Plucks: the string drawn aside at one place and let go from rest.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::Result;
use crate::excitation::{Excitation, ModalState};
use crate::maths::{raised_sinc, sin_pi, sinc};
use crate::series::{Mode, wave_number};
use crate::string::StringSpec;

/// A pluck by a point force.
///
/// a_n = 2 h sin(n π p) / (n² π² p (1−p)) / (1 + B n²): the triangle of height
/// `h` at `p` (Lebl, *Notes on Diffy Qs*, section 4.7), with the factor of the
/// static shape of a stiff string, which solves T y″ − E·I y⁗ = −F δ(x − pL).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct PointPluck {
    place: f64,
    height_m: f64,
}

impl PointPluck {
    /// A pluck at `place` (fraction of the length) of `height_m`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`] or [`bounds::PLUCK_HEIGHT_M`].
    pub fn new(place: f64, height_m: f64) -> Result<Self> {
        Ok(Self {
            place: bounds::PLACE.check(place)?,
            height_m: bounds::PLUCK_HEIGHT_M.check(height_m)?,
        })
    }
}

impl Excitation for PointPluck {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let n = f64::from(mode.n());
        let spread = n * n * PI * PI * self.place * (1.0 - self.place);
        let stiffness = 1.0 + string.inharmonicity() * n * n;
        ModalState {
            displacement: 2.0 * self.height_m * sin_pi(n * self.place) / (spread * stiffness),
            velocity: 0.0,
        }
    }
}

/// How the force of a tip is spread over its width `w`, with θ = n π w/(2L).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Tip {
    /// Evenly: sin θ/θ. The two straight sides are joined by a parabolic arc.
    #[default]
    Even,
    /// As a raised cosine, most in the middle: sin θ/(θ (1 − θ²/π²)).
    RaisedCosine,
}

impl Tip {
    /// Share of mode `n` that a tip of `width_m` leaves of a sharp one.
    #[must_use]
    pub fn factor(self, n: u32, width_m: f64, string: &StringSpec) -> f64 {
        let angle = 0.5 * wave_number(n, string) * width_m;
        match self {
            Self::Even => sinc(angle),
            Self::RaisedCosine => raised_sinc(angle),
        }
    }
}

/// A pluck by a plectrum or finger of finite width: the point pluck times the
/// factor of its [`Tip`].
///
/// `height_m` is the height of the sharp triangle; under an even tip the string
/// itself reaches h (1 − w/(8 L p (1−p))).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct RoundedPluck {
    point: PointPluck,
    width_m: f64,
    tip: Tip,
}

impl RoundedPluck {
    /// A pluck at `place` (fraction of the length) of `height_m` by a tip of
    /// `width_m`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`], [`bounds::PLUCK_HEIGHT_M`] or
    /// [`bounds::WIDTH_M`].
    pub fn new(place: f64, height_m: f64, width_m: f64) -> Result<Self> {
        Ok(Self {
            point: PointPluck::new(place, height_m)?,
            width_m: bounds::WIDTH_M.check(width_m)?,
            tip: Tip::Even,
        })
    }

    /// The same pluck by another kind of tip.
    #[must_use]
    pub fn by(self, tip: Tip) -> Self {
        Self { tip, ..self }
    }

    /// How the force is spread.
    #[must_use]
    pub fn tip(&self) -> Tip {
        self.tip
    }

    /// Place as a fraction of the length.
    #[must_use]
    pub fn place(&self) -> f64 {
        self.point.place
    }

    /// Height in m.
    #[must_use]
    pub fn height_m(&self) -> f64 {
        self.point.height_m
    }

    /// Width of the tip in m.
    #[must_use]
    pub fn width_m(&self) -> f64 {
        self.width_m
    }
}

impl Excitation for RoundedPluck {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let sharp = self.point.mode(mode, string);
        ModalState {
            displacement: sharp.displacement * self.tip.factor(mode.n(), self.width_m, string),
            velocity: 0.0,
        }
    }
}
