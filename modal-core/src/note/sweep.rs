//! From mode to mode: angle, decay and coefficients.
//!
//! Everything that is computed for every mode fits in 32 bits, but for the
//! squared angle itself.

use heapless::Vec;

use crate::bank::{Coefficient, FOLDED_SHIFT, Group, MAX_GROUPS, SHIFTS};
use crate::note::NoteSpec;
use crate::note::polynomial::{bend, mul_high};

/// (0.45 · 2π)², the squared angle of the highest mode, in Q56.
pub(super) const HIGHEST_Q56: u64 = 576_055_757_271_401_546;
/// (π/2)²/8, above which modes are folded, in Q32.
const FOLD_Z: u32 = 1_324_675_878;
/// Decays below this (2^−10, Q36) take the short way.
pub(super) const GENTLE_Q36: u32 = 1 << 26;

/// Largest z for each shift: e ≤ x, e·2^S < 1/2 and, with a little room for
/// 1/r, ceiling·√x·2^S < 1.
pub(super) fn shift_limits(ceiling_q31: u32) -> [u32; SHIFTS.len()] {
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

/// One mode on its way to integers: what starts are made of.
#[derive(Clone, Copy)]
pub(super) struct ModeQ {
    pub(super) n: u32,
    /// z = (ω_d T)²/8, Q32.
    pub(super) z: u32,
    /// x = (ω₀ T)² / 2^`places`, some 26 bits or more.
    pub(super) squared: u32,
    /// How many places `squared` has.
    pub(super) places: u32,
    /// F = 4 sin²(θ/2) of the form the state is held in, Q(33+S).
    pub(super) pull: u32,
    /// s = σ T, Q36.
    pub(super) decay: u32,
    /// u = 1 − e^(−s), Q36.
    pub(super) loss: u32,
    pub(super) shift: i8,
    pub(super) folded: bool,
}

/// What the modes of a note need beside their coefficients.
pub(super) struct Rounding {
    pub(super) groups: Vec<Group, MAX_GROUPS>,
    /// Most that rounding of q can add to all amplitudes, Q31.
    pub(super) reserve: u64,
    /// 1 − r of the slowest mode, Q64, rounded down.
    pub(super) slowest_decay_q64: u64,
}

/// The modes of a note, one after the other.
pub(super) struct Sweep<'a> {
    spec: &'a NoteSpec,
    /// Index of the next mode.
    n: u32,
    last: u32,
    /// x = (ω₀ T)² = a n² + b n⁴ of the next mode, Q56, and its differences: the
    /// polynomial costs four additions.
    squared: u64,
    rises: [u64; 4],
    shift_index: usize,
    shift: i8,
    limit: u32,
    groups: Vec<Group, MAX_GROUPS>,
    /// The group being filled.
    group: Group,
    /// u of mode 1, the slowest: decays rise with frequency. Q36.
    slowest: u32,
}

/// z = x/8 in Q32, from x in Q56 below 8.
#[inline(always)]
const fn eighth(squared_q56: u64) -> u32 {
    let (high, low) = ((squared_q56 >> 32) as u32, squared_q56 as u32);
    (high << 5) | (low >> 27)
}

/// Q40 to Q(33+S), for values that are small where S is large.
#[inline(always)]
const fn to_form(value_q40: u32, shift: i8) -> u32 {
    if shift > 7 {
        value_q40 << (shift - 7)
    } else {
        value_q40 >> (7 - shift)
    }
}

impl<'a> Sweep<'a> {
    #[inline(always)]
    pub(super) fn new(spec: &'a NoteSpec, modes: u32) -> Self {
        let (a, b) = (spec.angle_q56, spec.stretch_q56);
        let mut sweep = Self {
            spec,
            n: 0,
            last: modes,
            squared: 0,
            rises: [a + b, 2 * a + 14 * b, 36 * b, 24 * b],
            shift_index: 0,
            shift: SHIFTS[0],
            limit: spec.shift_limits[0],
            groups: Vec::new(),
            group: Group {
                shift: SHIFTS[0],
                folded: false,
                modes: 0,
            },
            slowest: 0,
        };
        sweep.advance();
        sweep
    }

    /// How many modes were handed out.
    pub(super) fn count(&self) -> usize {
        self.n as usize - 1
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
    fn has_next(&self) -> bool {
        self.n <= self.last && self.squared < HIGHEST_Q56
    }

    #[inline(always)]
    pub(super) fn next(&mut self) -> Option<(ModeQ, Coefficient)> {
        if !self.has_next() {
            return None;
        }
        let (n, squared) = (self.n, self.squared);
        self.advance();
        let z = eighth(squared);
        // Two modes share a shift; the higher one decides.
        let deciding_z = if n % 2 == 1 && self.has_next() {
            eighth(self.squared)
        } else {
            z
        };
        let rise = (u64::from(z) * u64::from(self.spec.decay_rise_q31)) >> 24;
        let decay = u64::from(self.spec.decay_q36) + rise;
        // At most 1/16, see DECAY_PER_FRAME.
        let decay = u32::try_from(decay).unwrap_or(u32::MAX);
        let squared_q40 = mul_high(decay, decay);
        let loss = loss(decay, squared_q40);
        if n == 1 {
            self.slowest = loss;
        }

        let folded = z > FOLD_Z;
        if !folded {
            self.choose_shift(deciding_z, decay);
        }
        let shift = if folded { FOLDED_SHIFT } else { self.shift };
        // s² in the form, and as part of z.
        let own = to_form(squared_q40, shift);
        let damped_z = z - (squared_q40 >> 11);
        let (undamped, places, pull) = if folded {
            // 4 − F from Q29 to Q31; below 2 above the fold.
            let pull_q29 = (1 << 31) - (damped_z - mul_high(damped_z, bend(damped_z)));
            (z, 29, pull_q29.min((1 << 30) - 1) << 2)
        } else {
            // One place less where x reaches 2.4.
            let spare = u32::from(shift == FOLDED_SHIFT);
            let down = (23 - i32::from(shift)) as u32 + spare;
            let (high, low) = ((squared >> 32) as u32, squared as u32);
            let undamped = (high << (32 - down)) | (low >> down);
            let x = undamped - (own >> spare);
            (
                undamped,
                56 - down,
                (x - mul_high(x, bend(damped_z))) << spare,
            )
        };
        let form = Group {
            shift,
            folded,
            modes: 1,
        };
        if self.group.matches(&form) {
            self.group.modes += 1;
        } else {
            self.close_group(form);
        }
        let mode = ModeQ {
            n,
            z: damped_z,
            squared: undamped,
            places,
            pull,
            decay,
            loss,
            shift,
            folded,
        };
        Some((mode, coefficient(&mode, own)))
    }

    /// The shift for the larger z of a pair. It never rises again.
    #[inline(always)]
    fn choose_shift(&mut self, z: u32, decay: u32) {
        // The limits have room for 1/r² of decays up to 2^−8; stronger ones
        // get a factor of two.
        let z = if decay >> 28 == 0 {
            z
        } else {
            z.saturating_mul(2)
        };
        while z >= self.limit && self.shift_index + 1 < SHIFTS.len() {
            self.shift_index += 1;
            let at = self.shift_index;
            self.shift = SHIFTS.get(at).copied().unwrap_or(FOLDED_SHIFT);
            self.limit = self.spec.shift_limits.get(at).copied().unwrap_or(u32::MAX);
        }
    }

    #[inline(never)]
    fn close_group(&mut self, next: Group) {
        if self.group.modes > 0 {
            // No more groups than falling shifts and the folded one.
            let _ = self.groups.push(self.group);
        }
        self.group = next;
    }

    pub(super) fn finish(mut self) -> Rounding {
        self.close_group(self.group);
        // What the rounding of k can take from the slowest decay.
        let slowest = u64::from(self.slowest.saturating_sub(16).max(1));
        let steps: u64 = self
            .groups
            .iter()
            .map(|group| u64::from(group.modes) << (-group.shift).max(0))
            .sum();
        Rounding {
            groups: self.groups,
            // Half a step a frame, times √e/sin θ <= 1.42, summed over the past,
            // and 1/sin θ more (see quantise) down to an angle of 2^−11.
            reserve: ((3 * steps) << 34) / slowest + (steps << 11),
            slowest_decay_q64: slowest << 28,
        }
    }
}

/// u = 1 − e^(−s), Q36.
#[inline(always)]
fn loss(decay: u32, squared_q40: u32) -> u32 {
    if decay < GENTLE_Q36 {
        // s − s²/2 + s³/6; the next term is far below a unit.
        let sixth = mul_high(mul_high(squared_q40, decay), 0x2AAA_AAAB) >> 8;
        decay - squared_q40.div_ceil(32) + sixth
    } else {
        strong_loss(decay)
    }
}

/// s (1 − s/2 (1 − s/3 (1 − s/4 (1 − s/5)))), for s up to 1/16.
#[inline(never)]
fn strong_loss(decay: u32) -> u32 {
    let s_q32 = decay >> 4;
    let mut product = u32::MAX;
    for divisor in (2..=5).rev() {
        product = u32::MAX - mul_high(s_q32 / divisor, product);
    }
    mul_high(decay, product)
}

/// `own` is s² in Q(33+S).
#[inline(always)]
fn coefficient(mode: &ModeQ, own: u32) -> Coefficient {
    let loss_q32 = mode.loss >> 4;
    // k = 2u − u², Q35.
    let damping = mode.loss - (mul_high(mode.loss, mode.loss) >> 5);
    // e = u² + (1 − u) F, Q(33+S), with u² = s² (1 − s + …); below 2^32.
    let own = own - mul_high(own, mode.decay >> 4);
    let restoring = mode.pull - mul_high(mode.pull, loss_q32) + own;
    let restoring = (restoring >> 1) + (restoring & 1);
    Coefficient {
        damping: -((((damping >> 2) + 1) >> 1).max(1) as i32),
        restoring: restoring.wrapping_neg() as i32,
    }
}
