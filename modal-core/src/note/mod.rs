//! Notes prepared without floating point: for chips without a floating-point
//! unit, and for the same bits everywhere at the price of a few dozen
//! instructions a mode.
//!
//! [`NoteSpec`] is the integer twin of a [`crate::ModeSeries`] at one sample
//! rate, [`PluckSpec`] that of a pluck and a pickup. Together they give
//! [`Coefficients`] and an [`Onset`], as [`crate::quantise`] does in floating
//! point; the tests compare the two roads.
//!
//! ω² = n² (a + b n²) needs no square root, e and v need only entire functions
//! of ω² (see `polynomial`), and sin(n π p) is a recurrence (see [`Sines`]).
//!
//! Starts given as sampled or piecewise shapes have no integer form: they are
//! tables, prepared on the road through [`crate::quantise`].

mod pluck;
mod polynomial;
mod sine;
mod sweep;

pub use pluck::{PLUCK_STRENGTH, PluckSpec};
pub use sine::{Place, Sines};

use core::f64::consts::TAU;

use heapless::Vec;

use crate::bank::{Coefficient, Increment, SHIFTS};
use crate::bounds::{self, Bound};
use crate::error::{Error, Result};
use crate::fixed::FULL_SCALE_Q31;
use crate::loss::TwoT60;
use crate::plan::HIGHEST_MODE_OF_SAMPLE_RATE;
use crate::quantise::{Coefficients, Onset, check_count};
use crate::series::ModeSeries;
use sweep::{HIGHEST_Q56, Sweep};

/// Decay of an amplitude in one frame, σ T, of mode 1 on the integer road.
/// Modes that decay faster are taken to decay that fast: by 60 dB in 110 frames.
pub const DECAY_PER_FRAME: Bound = Bound {
    name: "decay per frame",
    unit: "",
    min: 1.0 / 4_294_967_296.0,
    max: 1.0 / 16.0,
};

/// Decay over angle per frame of mode 1, σ/ω: well below critical damping. All
/// higher modes are below it then, since none decays by more than 1/16 a frame.
pub const DECAY_PER_ANGLE: Bound = Bound {
    name: "decay over angle",
    unit: "",
    min: 0.0,
    max: 0.25,
};

/// Inharmonicity B of a string on the integer road.
pub const INHARMONICITY: Bound = Bound {
    name: "inharmonicity",
    unit: "",
    min: 0.0,
    max: 0.25,
};

/// The modes of a string at one sample rate, in integers.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct NoteSpec {
    /// a: squared angle per frame of the fundamental without stiffness, Q56.
    angle_q56: u64,
    /// a·B, Q56.
    stretch_q56: u64,
    /// Constant part of σ T, Q36.
    decay_q36: u32,
    /// What σ T gains per squared angle, Q31.
    decay_rise_q31: u32,
    ceiling: u32,
    /// Largest z = x/8 for each of [`SHIFTS`], Q32.
    shift_limits: [u32; SHIFTS.len()],
    sample_rate_hz: f64,
}

impl NoteSpec {
    /// The integer twin of `series`, between hinged ends, at `sample_rate_hz`
    /// for a share `ceiling` of digital full scale, as in
    /// [`Coefficients::prepare`]. Floating point, for set-up time.
    ///
    /// # Errors
    /// A value outside [`bounds::SAMPLE_RATE_HZ`] or [`bounds::CEILING`]; a
    /// fundamental at or above 0.45 of the sample rate; values outside
    /// [`DECAY_PER_FRAME`], [`DECAY_PER_ANGLE`] or [`INHARMONICITY`].
    pub fn from_series(
        series: &ModeSeries<TwoT60>,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> Result<Self> {
        bounds::SAMPLE_RATE_HZ.check(sample_rate_hz)?;
        bounds::CEILING.check(ceiling)?;
        let string = series.string();
        let angle = TAU * string.ideal_fundamental_hz() / sample_rate_hz;
        let constant = series.loss().constant_per_s() / sample_rate_hz;
        let rise = series.loss().quadratic_s() * sample_rate_hz;
        let first = constant + rise * angle * angle;
        DECAY_PER_FRAME.check(first)?;
        DECAY_PER_ANGLE.check(first / angle)?;
        INHARMONICITY.check(string.inharmonicity())?;
        let q56 = |value: f64| libm::ldexp(value, 56) as u64;
        let ceiling = (ceiling * f64::from(FULL_SCALE_Q31)) as u32;
        Self {
            angle_q56: q56(angle * angle),
            stretch_q56: q56(angle * angle * string.inharmonicity()),
            decay_q36: libm::rint(libm::ldexp(constant, 36)) as u32,
            decay_rise_q31: libm::rint(libm::ldexp(rise, 31)) as u32,
            ceiling,
            shift_limits: sweep::shift_limits(ceiling),
            sample_rate_hz,
        }
        .checked()
    }

    /// The same string with its length divided by `ratio_q30` (1 to just below
    /// 4, Q30): a fret. Tension and losses stay.
    ///
    /// A ratio below 1 is taken as 1.
    ///
    /// # Errors
    /// A fundamental at or above 0.45 of the sample rate; an inharmonicity
    /// outside [`INHARMONICITY`].
    pub fn shortened(&self, ratio_q30: u32) -> Result<Self> {
        let ratio = u64::from(ratio_q30.max(1 << 30));
        let squared_q28 = u128::from((ratio * ratio) >> 32);
        let times =
            |value: u64| u64::try_from((u128::from(value) * squared_q28) >> 28).unwrap_or(u64::MAX);
        Self {
            angle_q56: times(self.angle_q56),
            // B rises with the square of the ratio as well.
            stretch_q56: times(times(self.stretch_q56)),
            ..*self
        }
        .checked()
    }

    fn checked(self) -> Result<Self> {
        let first = self.angle_q56.saturating_add(self.stretch_q56);
        if self.angle_q56 == 0 || first >= HIGHEST_Q56 {
            // √x in turns.
            let turns = |q56: u64| q56.isqrt() as f64 / f64::from(1 << 28) / TAU;
            return Err(Error::OutOfRange {
                field: "frequency of mode 1",
                unit: "of the sample rate",
                value: turns(first),
                min: turns(1),
                max: HIGHEST_MODE_OF_SAMPLE_RATE,
            });
        }
        // Keeps the sum of squares from running over before it is noticed.
        if self.stretch_q56 > self.angle_q56 / 4 {
            INHARMONICITY.check(self.stretch_q56 as f64 / self.angle_q56 as f64)?;
        }
        Ok(self)
    }

    /// Coefficients of modes 1 to `modes`; those at or above 0.45 of the sample
    /// rate are left out.
    ///
    /// # Errors
    /// [`Error::Count`] for no modes or more than `M`; modes that decay so slowly
    /// that the reserve for rounding would take half of the ceiling.
    pub fn coefficients<const M: usize>(&self, modes: u32) -> Result<Coefficients<M>> {
        check_count(modes, M)?;
        let mut coefficients: Vec<Coefficient, M> = Vec::new();
        // Room was checked.
        let _ = coefficients.resize_default(modes as usize);
        let mut sweep = Sweep::new(self, modes);
        for slot in &mut coefficients {
            let Some((_, coefficient)) = sweep.next() else {
                break;
            };
            *slot = coefficient;
        }
        self.finished(coefficients, sweep)
    }

    /// A whole note: coefficients and the pluck that starts it, in one pass.
    ///
    /// # Errors
    /// As [`NoteSpec::coefficients`]; a sum of mode amplitudes above the ceiling.
    pub fn note<const M: usize>(
        &self,
        modes: u32,
        pluck: &PluckSpec,
    ) -> Result<(Coefficients<M>, Onset<M>)> {
        check_count(modes, M)?;
        let mut coefficients: Vec<Coefficient, M> = Vec::new();
        let mut increments: Vec<Increment, M> = Vec::new();
        // Room was checked.
        let _ = coefficients.resize_default(modes as usize);
        let _ = increments.resize_default(modes as usize);
        let mut sweep = Sweep::new(self, modes);
        let mut start = pluck.start(self.angle_q56);
        let mut level = 0_u64;
        for (slot, increment) in coefficients.iter_mut().zip(&mut increments) {
            let Some((mode, coefficient)) = sweep.next() else {
                break;
            };
            *slot = coefficient;
            let amplitude;
            (*increment, amplitude) = start.next(&mode, coefficient);
            level += u64::from(amplitude);
        }
        increments.truncate(sweep.count());
        let coefficients = self.finished(coefficients, sweep)?;
        let onset = Onset::from_integers(increments, level, &coefficients)?;
        Ok((coefficients, onset))
    }

    fn finished<const M: usize>(
        &self,
        mut coefficients: Vec<Coefficient, M>,
        sweep: Sweep<'_>,
    ) -> Result<Coefficients<M>> {
        coefficients.truncate(sweep.count());
        let rounding = sweep.finish();
        Coefficients::from_integers(
            coefficients,
            rounding.groups,
            u64::from(self.ceiling),
            rounding.reserve,
            rounding.slowest_decay_q64,
            self.sample_rate_hz,
        )
    }
}

#[cfg(test)]
mod tests;
