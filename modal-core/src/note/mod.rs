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

/// (0.45 · 2π)², the squared angle of the highest mode, in Q56.
const HIGHEST_Q56: u64 = 576_055_757_271_401_546;
/// (π/2)²/8, above which modes are folded, in Q32.
const FOLD_Z: u32 = 1_324_675_878;
/// Decays below this (2^−10, Q40) take the short way.
const GENTLE_Q40: u64 = 1 << 30;

/// Decay of an amplitude in one frame, σ T, on the integer road.
pub const DECAY_PER_FRAME: Bound = Bound {
    name: "decay per frame",
    unit: "",
    min: 1.0 / 4_294_967_296.0,
    max: 0.34,
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
    /// Constant part of σ T, Q40.
    decay_q40: u64,
    /// What σ T gains per squared angle, Q31.
    decay_rise_q31: u32,
    ceiling: u32,
    /// Largest z = x/8 for each of [`SHIFTS`], Q32.
    shift_limits: [u32; SHIFTS.len()],
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
    /// outside [`DECAY_PER_FRAME`]; an inharmonicity outside [`INHARMONICITY`].
    pub fn from_series(
        series: &ModeSeries<TwoT60>,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> Result<Self> {
        bounds::SAMPLE_RATE_HZ.check(sample_rate_hz)?;
        bounds::CEILING.check(ceiling)?;
        let string = series.string();
        let angle = TAU * string.ideal_fundamental_hz() / sample_rate_hz;
        let q56 = |value: f64| libm::ldexp(value, 56) as u64;
        let decay = series.loss().constant_per_s() / sample_rate_hz;
        let rise = series.loss().quadratic_s() * sample_rate_hz;
        DECAY_PER_FRAME.check(decay + rise * angle * angle)?;
        let ceiling = (ceiling * f64::from(FULL_SCALE_Q31)) as u32;
        Self {
            angle_q56: q56(angle * angle),
            stretch_q56: q56(angle * angle * string.inharmonicity()),
            decay_q40: libm::rint(libm::ldexp(decay, 40)) as u64,
            decay_rise_q31: libm::rint(libm::ldexp(rise, 31)) as u32,
            ceiling,
            shift_limits: shift_limits(ceiling),
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
            let turns = |q56: u64| angle(q56) / TAU;
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
    /// [`Error::Count`] for no modes or more than `M`; a decay outside
    /// [`DECAY_PER_FRAME`] or above a quarter of the angle per frame.
    pub fn coefficients<const M: usize>(&self, modes: u32) -> Result<Coefficients<M>> {
        let mut building = Building::<M>::new(self, modes)?;
        let mut sweep = Sweep::new(self, modes);
        while let Some(mode) = sweep.next()? {
            building.push(&mode);
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
        let mut start = pluck.start(self.angle_q56);
        let mut increments = Vec::new();
        let mut level = 0_u64;
        let mut sweep = Sweep::new(self, modes);
        while let Some(mode) = sweep.next()? {
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
}

/// √x of a squared angle in Q56, for error texts.
fn angle(squared_q56: u64) -> f64 {
    squared_q56.isqrt() as f64 / f64::from(1 << 28)
}

/// Largest z for each shift: e ≤ x, e·2^S < 1/2 and, with a little room for
/// 1/r, ceiling·√x·2^S < 1.
fn shift_limits(ceiling_q31: u32) -> [u32; SHIFTS.len()] {
    let ceiling = u128::from(ceiling_q31.max(1));
    // z = x/8 in Q32 is x in Q29.
    let room = ((127 * 127) << (29 + 62 - 14)) / (ceiling * ceiling);
    SHIFTS.map(|shift| {
        let speed = if shift >= 0 {
            room >> (2 * shift)
        } else {
            room << (-2 * shift)
        };
        let pull = 1_u128 << (28 - shift);
        u32::try_from(speed.min(pull)).unwrap_or(u32::MAX)
    })
}

/// What a mode loses in one frame.
#[derive(Clone, Copy)]
struct Decay {
    /// s = σ T, Q40.
    s_q40: u64,
    /// u = 1 − e^(−s), Q40.
    loss_q40: u64,
    /// s², Q56.
    squared_q56: u64,
}

impl Decay {
    #[inline(always)]
    fn new(s_q40: u64) -> Self {
        if s_q40 < GENTLE_Q40 {
            // s − s²/2 + s³/6; the next term is below a twentieth of a unit.
            let s = s_q40 as u32;
            let squared_q48 = mul_high(s, s);
            let sixth = mul_high(mul_high(squared_q48, s), 0x2AAA_AAAB) >> 16;
            Self {
                s_q40,
                loss_q40: u64::from(s - squared_q48.div_ceil(512) + sixth),
                squared_q56: u64::from(squared_q48) << 8,
            }
        } else {
            Self::strong(s_q40)
        }
    }

    /// For s up to 0.35: s (1 − s/2 (1 − s/3 (… (1 − s/9)))), Q32.
    #[inline(never)]
    fn strong(s_q40: u64) -> Self {
        let s = (s_q40 >> 8) as u32;
        let mut product = u32::MAX;
        for divisor in (2..=9).rev() {
            product = u32::MAX - mul_high(s / divisor, product);
        }
        Self {
            s_q40,
            loss_q40: u64::from(mul_high(s, product)) << 8,
            squared_q56: (u64::from(s) * u64::from(s)) >> 8,
        }
    }

    /// u in Q32.
    #[inline(always)]
    const fn loss_q32(&self) -> u32 {
        (self.loss_q40 >> 8) as u32
    }
}

/// One mode on its way to integers: what coefficients and starts are made of.
#[derive(Clone, Copy)]
struct ModeQ {
    n: u32,
    /// z = (ω_d T)²/8, Q32.
    z: u32,
    /// x = (ω₀ T)² / 2^`places`, some 26 bits or more.
    squared: u32,
    /// How many places `squared` has.
    places: u32,
    /// F = 4 sin²(θ/2) of the form the state is held in, Q(33+S).
    pull: u32,
    decay: Decay,
    form: Group,
}

/// The modes of a note, one after the other.
struct Sweep<'a> {
    spec: &'a NoteSpec,
    n: u32,
    last: u32,
    shift_index: usize,
    /// x = (ω₀ T)² = a n² + b n⁴ of mode n, Q56, and its differences: the
    /// polynomial costs four additions.
    squared: u64,
    rises: [u64; 4],
}

impl<'a> Sweep<'a> {
    fn new(spec: &'a NoteSpec, modes: u32) -> Self {
        let (a, b) = (spec.angle_q56, spec.stretch_q56);
        let mut sweep = Self {
            spec,
            n: 0,
            last: modes,
            shift_index: 0,
            squared: 0,
            rises: [a + b, 2 * a + 14 * b, 36 * b, 24 * b],
        };
        sweep.advance();
        sweep
    }

    /// On to the next mode. Sums wrap only beyond the highest mode's successor.
    #[inline(always)]
    fn advance(&mut self) {
        let [first, second, third, fourth] = self.rises;
        self.n += 1;
        self.squared = self.squared.wrapping_add(first);
        self.rises = [
            first.wrapping_add(second),
            second.wrapping_add(third),
            third.wrapping_add(fourth),
            fourth,
        ];
    }

    #[inline(always)]
    fn next(&mut self) -> Result<Option<ModeQ>> {
        if self.n > self.last || self.squared >= HIGHEST_Q56 {
            return Ok(None);
        }
        let (n, squared) = (self.n, self.squared);
        self.advance();
        // Two modes share a shift; the higher one decides.
        let pair = n % 2 == 1 && n < self.last && self.squared < HIGHEST_Q56;
        let deciding = if pair { self.squared } else { squared };
        self.mode(n, squared, (deciding >> 27) as u32).map(Some)
    }

    #[inline(always)]
    fn mode(&mut self, n: u32, squared: u64, deciding_z: u32) -> Result<ModeQ> {
        let rise = ((squared >> 27) as u32 as u64 * u64::from(self.spec.decay_rise_q31)) >> 20;
        let s_q40 = self.spec.decay_q40 + rise;
        let decay = Decay::new(s_q40);
        // Small enough for the series, and well below critical damping.
        if s_q40 > (DECAY_PER_FRAME.max * 1_099_511_627_776.0) as u64
            || decay.squared_q56 > squared >> 4
        {
            return Err(too_strong(s_q40, squared));
        }
        let damped = squared - decay.squared_q56;
        let z = (damped >> 27) as u32;
        if z > FOLD_Z {
            // 4 − F from Q29 to Q31; below 2 above the fold.
            let pull_q29 = (1 << 31) - (z - mul_high(z, bend(z)));
            return Ok(ModeQ {
                n,
                z,
                squared: (squared >> 27) as u32,
                places: 29,
                pull: pull_q29.min((1 << 30) - 1) << 2,
                decay,
                form: Group {
                    shift: FOLDED_SHIFT,
                    folded: true,
                    modes: 1,
                },
            });
        }
        let shift = self.shift(deciding_z, s_q40);
        // One place less where x reaches 2.4.
        let spare = u32::from(shift == FOLDED_SHIFT);
        let down = (23 - i32::from(shift)) as u32 + spare;
        let (high, low) = ((squared >> 32) as u32, squared as u32);
        let undamped = (high << (32 - down)) | (low >> down);
        let x = undamped - (decay.squared_q56 >> down) as u32;
        Ok(ModeQ {
            n,
            z,
            squared: undamped,
            places: 56 - down,
            pull: (x - mul_high(x, bend(z))) << spare,
            decay,
            form: Group {
                shift,
                folded: false,
                modes: 1,
            },
        })
    }

    /// The shift for the larger z of a pair. It never rises again.
    #[inline(always)]
    fn shift(&mut self, z: u32, s_q40: u64) -> i8 {
        // The limits have room for 1/r² of decays up to 2^−8; stronger ones
        // get a factor of two.
        let z = if s_q40 >> 32 == 0 {
            z
        } else {
            z.saturating_mul(2)
        };
        while let (Some(&limit), Some(_)) = (
            self.spec.shift_limits.get(self.shift_index),
            SHIFTS.get(self.shift_index + 1),
        ) {
            if z < limit {
                break;
            }
            self.shift_index += 1;
        }
        SHIFTS
            .get(self.shift_index)
            .copied()
            .unwrap_or(FOLDED_SHIFT)
    }
}

#[cold]
fn too_strong(s_q40: u64, squared_q56: u64) -> Error {
    Error::OutOfRange {
        field: DECAY_PER_FRAME.name,
        unit: DECAY_PER_FRAME.unit,
        value: s_q40 as f64 / 1_099_511_627_776.0,
        min: DECAY_PER_FRAME.min,
        max: DECAY_PER_FRAME.max.min(0.25 * angle(squared_q56)),
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

    #[inline(always)]
    fn push(&mut self, mode: &ModeQ) -> Coefficient {
        let loss_q32 = mode.decay.loss_q32();
        let loss_squared = u64::from(loss_q32) * u64::from(loss_q32);
        // k = 2u − u².
        let damping_q40 = 2 * mode.decay.loss_q40 - (loss_squared >> 24);
        // e = u² + (1 − u) F, Q(33+S).
        let pull = mode.pull - mul_high(mode.pull, loss_q32);
        let own = loss_squared >> (31 - mode.form.shift);
        // Half a unit more rounds; it stays below 2^32.
        let restoring = (u64::from(pull) + own + 1) >> 1;
        let coefficient = Coefficient {
            damping: -(((damping_q40 + 128) >> 8).max(1) as i32),
            restoring: (restoring as u32).wrapping_neg() as i32,
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
        self.slowest_q40 = self.slowest_q40.min(mode.decay.loss_q40);
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
