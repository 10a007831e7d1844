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

pub use pluck::{PLUCK_STRENGTH, PluckSpec};
pub use sine::{Place, Sines};

use core::f64::consts::TAU;

use heapless::Vec;

use crate::bank::{Coefficient, FOLDED_SHIFT, Group, MAX_GROUPS, SHIFTS};
use crate::bounds::{self, Bound};
use crate::error::{Error, Result};
use crate::fixed::FULL_SCALE_Q31;
use crate::loss::TwoT60;
use crate::plan::HIGHEST_MODE_OF_SAMPLE_RATE;
use crate::quantise::{Coefficients, Onset, check_count};
use crate::series::ModeSeries;
use polynomial::{bend, mul_high};

/// One in Q60.
const ONE_Q60: u64 = 1 << 60;
/// (0.45 · 2π)², the squared angle of the highest mode, in Q60.
const HIGHEST_Q60: u64 = 9_216_892_116_342_424_751;
/// (π/2)², above which modes are folded, in Q60.
const FOLD_Q60: u64 = 2_844_719_788_994_575_540;

/// Decay of an amplitude in one frame, σ T, on the integer road.
pub const DECAY_PER_FRAME: Bound = Bound {
    name: "decay per frame",
    unit: "",
    min: 1.0 / 4_294_967_296.0,
    max: 1.0 / 16.0,
};

/// The modes of a string at one sample rate, in integers.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct NoteSpec {
    /// a: squared angle per frame of the fundamental without stiffness, Q60.
    angle_q60: u64,
    /// a·B, Q60.
    stretch_q60: u64,
    /// Constant part of σ T, Q60.
    decay_q60: u64,
    /// What σ T gains per squared angle, Q31.
    decay_rise_q31: u32,
    ceiling: u32,
    /// Largest squared angle for each of [`SHIFTS`], Q60.
    shift_limits: [u64; SHIFTS.len()],
    sample_rate_hz: f64,
}

impl NoteSpec {
    /// The integer twin of `series` at `sample_rate_hz` for a share `ceiling`
    /// of digital full scale, as in [`Coefficients::prepare`]. Floating point,
    /// for set-up time.
    ///
    /// # Errors
    /// A value outside [`bounds::SAMPLE_RATE_HZ`] or [`bounds::CEILING`]; a
    /// fundamental at or above 0.45 of the sample rate; a decay of mode 1
    /// outside [`DECAY_PER_FRAME`].
    pub fn from_series(
        series: &ModeSeries<TwoT60>,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> Result<Self> {
        bounds::SAMPLE_RATE_HZ.check(sample_rate_hz)?;
        bounds::CEILING.check(ceiling)?;
        let string = series.string();
        let angle = TAU * string.ideal_fundamental_hz() / sample_rate_hz;
        let q60 = |value: f64| (value * ONE_Q60 as f64) as u64;
        let decay = series.loss().constant_per_s() / sample_rate_hz;
        let rise = series.loss().quadratic_s() * sample_rate_hz;
        DECAY_PER_FRAME.check(decay + rise * angle * angle)?;
        let ceiling = (ceiling * f64::from(FULL_SCALE_Q31)) as u32;
        Self {
            angle_q60: q60(angle * angle),
            stretch_q60: q60(angle * angle * string.inharmonicity()),
            decay_q60: q60(decay),
            decay_rise_q31: (rise * 2_147_483_648.0) as u32,
            ceiling,
            shift_limits: shift_limits(ceiling),
            sample_rate_hz,
        }
        .check_fundamental()
    }

    /// The same string with its length divided by `ratio_q30` (1 to just below
    /// 4, Q30): a fret. Tension and losses stay.
    ///
    /// A ratio below 1 is taken as 1.
    ///
    /// # Errors
    /// A fundamental at or above 0.45 of the sample rate.
    pub fn shortened(&self, ratio_q30: u32) -> Result<Self> {
        let ratio = u64::from(ratio_q30.max(1 << 30));
        let squared_q28 = u128::from((ratio * ratio) >> 32);
        let times =
            |value: u64| u64::try_from((u128::from(value) * squared_q28) >> 28).unwrap_or(u64::MAX);
        Self {
            angle_q60: times(self.angle_q60),
            // B rises with the square of the ratio as well.
            stretch_q60: times(times(self.stretch_q60)),
            ..*self
        }
        .check_fundamental()
    }

    fn check_fundamental(self) -> Result<Self> {
        let first = self.angle_q60.saturating_add(self.stretch_q60);
        if self.angle_q60 > 0 && first < HIGHEST_Q60 {
            return Ok(self);
        }
        let turns = |q60: u64| angle(q60) / TAU;
        Err(Error::OutOfRange {
            field: "frequency of mode 1",
            unit: "of the sample rate",
            value: turns(first),
            min: turns(1),
            max: HIGHEST_MODE_OF_SAMPLE_RATE,
        })
    }

    /// Coefficients of modes 1 to `modes`; those at or above 0.45 of the sample
    /// rate are left out.
    ///
    /// # Errors
    /// [`Error::Count`] for no modes or more than `M`; a decay outside
    /// [`DECAY_PER_FRAME`] or above a quarter of the angle per frame.
    pub fn coefficients<const M: usize>(&self, modes: u32) -> Result<Coefficients<M>> {
        let mut building = Building::<M>::new(self, modes)?;
        for mode in self.modes(modes) {
            building.push(&mode?);
        }
        building.finish()
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
        let mut building = Building::<M>::new(self, modes)?;
        let mut start = pluck.start(self);
        let mut increments = Vec::new();
        let mut level = 0_u64;
        for mode in self.modes(modes) {
            let mode = mode?;
            let coefficient = building.push(&mode);
            let (increment, amplitude) = start.next(&mode, coefficient);
            // As many as coefficients, which fit.
            let _ = increments.push(increment);
            level = level.saturating_add(amplitude);
        }
        let coefficients = building.finish()?;
        let onset = Onset::from_integers(increments, level, &coefficients)?;
        Ok((coefficients, onset))
    }

    fn modes(&self, modes: u32) -> Modes<'_> {
        Modes {
            spec: self,
            n: 1,
            last: modes,
            shift_index: 0,
            upcoming: self.squared_angle(1),
        }
    }

    /// x = (ω₀ T)² = n² (a + b n²), Q60; `None` at or above the highest mode.
    #[inline]
    fn squared_angle(&self, n: u32) -> Option<u64> {
        let square = u64::from(n) * u64::from(n);
        self.stretch_q60
            .checked_mul(square)?
            .checked_add(self.angle_q60)?
            .checked_mul(square)
            .filter(|&squared| squared < HIGHEST_Q60)
    }
}

/// √x of a squared angle in Q60, for error texts.
fn angle(squared_q60: u64) -> f64 {
    squared_q60.isqrt() as f64 / f64::from(1 << 30)
}

/// Largest squared angle for each shift: e ≤ x, e·2^S < 1/2 and, with a little
/// room for 1/r, ceiling·√x·2^S < 1.
fn shift_limits(ceiling_q31: u32) -> [u64; SHIFTS.len()] {
    let ceiling = u128::from(ceiling_q31.max(1));
    let room = ((127 * 127) << (60 + 62 - 14)) / (ceiling * ceiling);
    SHIFTS.map(|shift| {
        let speed = if shift >= 0 {
            room >> (2 * shift)
        } else {
            room << (-2 * shift)
        };
        let pull = 1_u128 << (59 - shift);
        u64::try_from(speed.min(pull)).unwrap_or(u64::MAX)
    })
}

/// One mode on its way to integers: what coefficients and starts are made of.
struct ModeQ {
    n: u32,
    /// x = (ω₀ T)², Q60.
    squared_q60: u64,
    /// z = (ω_d T)²/8, Q32.
    z: u32,
    /// F = 4 sin²(θ/2) of the form the state is held in, Q(33+S).
    pull: u32,
    /// s = σ T, Q40.
    decay_q40: u64,
    /// u = 1 − e^(−s), Q40.
    loss_q40: u64,
    /// s < θ/64.
    gentle: bool,
    form: Group,
}

/// The modes of a note, one after the other.
struct Modes<'a> {
    spec: &'a NoteSpec,
    n: u32,
    last: u32,
    shift_index: usize,
    upcoming: Option<u64>,
}

impl Iterator for Modes<'_> {
    type Item = Result<ModeQ>;

    #[inline]
    fn next(&mut self) -> Option<Self::Item> {
        if self.n > self.last {
            return None;
        }
        let squared_q60 = self.upcoming?;
        let n = self.n;
        self.n += 1;
        self.upcoming = self.spec.squared_angle(self.n);
        // Two modes share a shift; the higher one decides.
        let deciding_q60 = match self.upcoming {
            Some(next) if n % 2 == 1 && n < self.last => next,
            _ => squared_q60,
        };
        Some(self.mode(n, squared_q60, deciding_q60))
    }
}

impl Modes<'_> {
    #[inline]
    fn mode(&mut self, n: u32, squared_q60: u64, deciding_q60: u64) -> Result<ModeQ> {
        let rise = (squared_q60 >> 31) * u64::from(self.spec.decay_rise_q31);
        let decay_q60 = self.spec.decay_q60.saturating_add(rise);
        let decay_q32 = decay_q60 >> 28;
        // Small enough for the series, and well below critical damping.
        if decay_q60 > ONE_Q60 / 16 || decay_q32 * decay_q32 > squared_q60 {
            return Err(Error::OutOfRange {
                field: DECAY_PER_FRAME.name,
                unit: DECAY_PER_FRAME.unit,
                value: decay_q60 as f64 / ONE_Q60 as f64,
                min: DECAY_PER_FRAME.min,
                max: DECAY_PER_FRAME.max.min(0.25 * angle(squared_q60)),
            });
        }
        let damped_q60 = squared_q60 - ((decay_q32 * decay_q32) >> 4);
        let z = (damped_q60 >> 31) as u32;
        let folded = damped_q60 > FOLD_Q60;
        let (shift, pull) = if folded {
            // 4 − F from Q29 to Q31; below 2 above the fold.
            let pull_q29 = (1 << 31) - (z - mul_high(z, bend(z)));
            (FOLDED_SHIFT, pull_q29.min((1 << 30) - 1) << 2)
        } else {
            let shift = self.shift(deciding_q60, decay_q60);
            // One place less where x reaches 2.4.
            let spare = u32::from(shift == FOLDED_SHIFT);
            let x = (damped_q60 >> (27 - i32::from(shift) + spare as i32)) as u32;
            (shift, (x - mul_high(x, bend(z))) << spare)
        };
        let decay_q40 = (decay_q60 + (1 << 19)) >> 20;
        Ok(ModeQ {
            n,
            squared_q60,
            z,
            pull,
            decay_q40,
            loss_q40: one_minus_exp(decay_q40),
            gentle: decay_q32 * decay_q32 < squared_q60 >> 8,
            form: Group {
                shift,
                folded,
                modes: 1,
            },
        })
    }

    /// The shift for the larger squared angle of a pair. It never rises again.
    #[inline]
    fn shift(&mut self, squared_q60: u64, decay_q60: u64) -> i8 {
        // 1/r² < 1.14 of the largest decay; the limits have room for 2^−7.
        let deciding = if decay_q60 > ONE_Q60 >> 8 {
            squared_q60.saturating_add(squared_q60 / 4)
        } else {
            squared_q60
        };
        while self.shift_index + 1 < SHIFTS.len()
            && self
                .spec
                .shift_limits
                .get(self.shift_index)
                .is_some_and(|&limit| deciding >= limit)
        {
            self.shift_index += 1;
        }
        SHIFTS
            .get(self.shift_index)
            .copied()
            .unwrap_or(FOLDED_SHIFT)
    }
}

/// 1 − e^(−s), Q40, for s up to 1/16.
#[inline]
fn one_minus_exp(s: u64) -> u64 {
    if s < 1 << 30 {
        // s − s²/2 + s³/6; the next term is below a twentieth of a unit.
        let squared = (s * s) >> 40;
        let sixth = (((squared * s) >> 40) * 0x2AAA_AAAB) >> 32;
        s - squared.div_ceil(2) + sixth
    } else {
        // s (1 − s/2 (1 − s/3 (1 − s/4 (1 − s/5)))), Q32.
        let s = (s >> 8) as u32;
        let p = u32::MAX - s / 5;
        let p = u32::MAX - mul_high(s / 4, p);
        let p = u32::MAX - mul_high(s / 3, p);
        let p = u32::MAX - mul_high(s / 2, p);
        u64::from(mul_high(s, p)) << 8
    }
}

/// Coefficients while they are collected.
struct Building<'a, const M: usize> {
    spec: &'a NoteSpec,
    coefficients: Vec<Coefficient, M>,
    groups: Vec<Group, MAX_GROUPS>,
    /// Sum of the rounding steps of q, in its units.
    steps: u64,
    slowest_q40: u64,
}

impl<'a, const M: usize> Building<'a, M> {
    fn new(spec: &'a NoteSpec, modes: u32) -> Result<Self> {
        check_count(modes, M)?;
        Ok(Self {
            spec,
            coefficients: Vec::new(),
            groups: Vec::new(),
            steps: 0,
            slowest_q40: u64::MAX,
        })
    }

    #[inline]
    fn push(&mut self, mode: &ModeQ) -> Coefficient {
        let loss_q32 = (mode.loss_q40 >> 8) as u32;
        let loss_squared = u64::from(loss_q32) * u64::from(loss_q32);
        // k = 2u − u².
        let damping_q40 = 2 * mode.loss_q40 - (loss_squared >> 24);
        // e = u² + (1 − u) F, Q(33+S).
        let pull = mode.pull - mul_high(mode.pull, loss_q32);
        let restoring = u64::from(pull) + (loss_squared >> (31 - mode.form.shift));
        let coefficient = Coefficient {
            damping: -(((damping_q40 + 128) >> 8).max(1) as i32),
            restoring: (-(((restoring + 1) >> 1) as i64)).max(i64::from(i32::MIN)) as i32,
        };
        // Room for `modes` <= M was checked.
        let _ = self.coefficients.push(coefficient);
        match self.groups.last_mut() {
            Some(group) if group.matches(&mode.form) => group.modes += 1,
            // No more groups than falling shifts and the folded one.
            _ => {
                let _ = self.groups.push(mode.form);
            }
        }
        self.steps += match mode.form.shift {
            -1 => 2,
            ..-1 => 4,
            0.. => 1,
        };
        self.slowest_q40 = self.slowest_q40.min(mode.loss_q40);
        coefficient
    }

    fn finish(self) -> Result<Coefficients<M>> {
        // What the rounding of k can take from the slowest decay.
        let slowest = self.slowest_q40.saturating_sub(128).max(1);
        // Half a step a frame, times √e/sin θ <= 1.42, summed over the past.
        let reserve = ((3 * self.steps) << 38) / slowest;
        let ceiling = u64::from(self.spec.ceiling);
        Coefficients::from_integers(
            self.coefficients,
            self.groups,
            ceiling,
            reserve,
            slowest << 24,
            self.spec.sample_rate_hz,
        )
    }
}

#[cfg(test)]
mod tests;
