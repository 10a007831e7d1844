//! A bank of modes: fixed coefficients, changing state, integers only.
//!
//! One mode obeys, exactly at the sample instants, with `v[n] = q[n] − q[n−1]`:
//!
//! ```text
//! v[n+1] = v[n] − k v[n] − e q[n]
//! q[n+1] = q[n] + v[n+1]
//! ```
//!
//! `q` is Q31. The velocity is a 64-bit accumulator D = v·2^(32+S) in units of
//! the last place of `q`, so its fraction is never thrown away: the only
//! round-off enters at `q`, where the recurrence does not amplify it.

use heapless::Vec;

use crate::fixed::{FULL_SCALE_Q31, Gain};
use crate::fixed::{quotient_above, root_above, root_below};
use crate::kernel;
use crate::quantise::{Coefficients, Onset};

/// The scale shifts S that a group of modes can have, falling as the pitch
/// rises. Every one is a kernel of its own, so there are no more than pay.
pub const SHIFTS: [i8; 8] = [10, 8, 6, 4, 2, 0, -1, -2];

/// The scale shift of folded modes: the only one that holds e up to 2.
pub const FOLDED_SHIFT: i8 = -2;

/// A mode of no more than this amplitude (Q31) comes to rest: three quarters of
/// the last place of a 24-bit converter, −141 dBFS (twice and four times as much
/// for modes held with the shifts −1 and −2, whose steps are as much coarser).
/// Rounding alone keeps most modes moving by less.
pub const INAUDIBLE_Q31: u64 = 192;

/// Frames times k (Q32) after which a mode is below [`INAUDIBLE_Q31`] even from
/// full scale: 2 ln 2²⁴ = 33.3. Its own rounding can keep it moving a little
/// above that for ever.
const SPENT_Q32: u64 = 34 << 32;

/// Most groups in a bank: one a shift, and the folded one.
pub const MAX_GROUPS: usize = SHIFTS.len() + 1;

/// The two numbers of one mode that do not change from sample to sample.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[repr(C)]
pub struct Coefficient {
    /// −k in Q32: −(1 − r²), the loss of velocity in one frame.
    pub damping: i32,
    /// −e in Q(32+S): −(1 + r² − 2 r cos θ), the pull back to rest.
    pub restoring: i32,
}

impl Coefficient {
    /// Upper bound of the amplitude (Q31) of a mode with displacement `q` (Q31)
    /// and one-frame step `velocity` (Q31 with 16 more fractional bits).
    ///
    /// q[n] = A r^n cos(θ n − φ) has A² = q² + c², and from k and e alone
    /// c = ((1−k) v − q (e−k)/2) / s with s = r sin θ = √(e − ((e+k)/2)²).
    pub(crate) fn amplitude(self, shift: i8, q: i32, velocity: i64) -> u64 {
        let damping_q31 = i64::from(self.damping.unsigned_abs()) >> 1;
        // At most 2 in Q62.
        let restoring_q62 = u64::from(self.restoring.unsigned_abs()) << (30 - shift);
        let restoring_q31 = (restoring_q62 >> 31) as i64;
        let half_sum = ((restoring_q31 + damping_q31) >> 1) as u64;
        let kept = velocity - (((velocity >> 16) * damping_q31) >> 15);
        let pulled = (i64::from(q) * ((restoring_q31 - damping_q31) >> 1)) >> 15;
        let numerator = kept.saturating_sub(pulled).unsigned_abs().min(1 << 49);
        let quadrature = quotient_above(
            numerator << 14,
            root_below(restoring_q62.saturating_sub(half_sum * half_sum)) >> 1,
        );
        // The roundings above are below two units.
        let q = u64::from(q.unsigned_abs());
        if quadrature < 1 << 31 {
            root_above(q * q + quadrature * quadrature) + 2
        } else {
            q + quadrature + 2
        }
    }
}

/// What changes from sample to sample in one mode.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[repr(C)]
pub struct State {
    /// Displacement as heard, Q31.
    pub q: i32,
    /// Lower half of the velocity accumulator.
    pub velocity_low: u32,
    /// Upper half of the velocity accumulator: v·2^S in units of q.
    pub velocity_high: i32,
}

impl State {
    /// The state of a mode at rest, for the scale shift `shift`.
    ///
    /// The accumulator holds half a step of `q`: the recurrence cuts the step
    /// off below, and this offset turns the cut into rounding to nearest.
    #[must_use]
    pub const fn rest(shift: i8) -> Self {
        let mut rest = Self {
            q: 0,
            velocity_low: 0,
            velocity_high: 0,
        };
        rest.set_velocity(rest_velocity(shift));
        rest
    }

    /// `q[n] − q[n−1]` as an accumulator without the offset of rest.
    const fn moving(&self, shift: i8) -> i64 {
        self.velocity().wrapping_sub(rest_velocity(shift))
    }

    /// The 64-bit velocity accumulator.
    #[must_use]
    pub const fn velocity(&self) -> i64 {
        ((self.velocity_high as i64) << 32) | self.velocity_low as i64
    }

    /// Sets the 64-bit velocity accumulator.
    pub const fn set_velocity(&mut self, velocity: i64) {
        self.velocity_low = velocity as u32;
        self.velocity_high = (velocity >> 32) as i32;
    }
}

/// One mode in motion: what changes and what does not, side by side in memory
/// as the kernels load them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[repr(C)]
pub struct Resonator {
    /// What changes from sample to sample.
    pub state: State,
    /// What does not.
    pub coefficient: Coefficient,
}

/// What a start adds to the state of one mode.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Increment {
    /// Added to q, Q31.
    pub q: i32,
    /// Added to the velocity accumulator, lower half.
    pub velocity_low: u32,
    /// Added to the velocity accumulator, upper half.
    pub velocity_high: i32,
}

impl Increment {
    /// An increment of displacement (Q31) and velocity accumulator.
    #[must_use]
    pub const fn new(q: i32, velocity: i64) -> Self {
        Self {
            q,
            velocity_low: velocity as u32,
            velocity_high: (velocity >> 32) as i32,
        }
    }

    /// The increment of the velocity accumulator.
    #[must_use]
    pub const fn velocity(&self) -> i64 {
        ((self.velocity_high as i64) << 32) | self.velocity_low as i64
    }

    /// Upper bound of the amplitude (Q31) that this increment, made for the form
    /// `from`, gives a mode with `coefficient` in the form `to`.
    pub(crate) fn amplitude(&self, from: Group, coefficient: Coefficient, to: Group) -> u64 {
        let mut state = State::rest(from.shift);
        state.q = self.q;
        state.set_velocity(state.velocity().wrapping_add(self.velocity()));
        amplitude(&state, from, coefficient, to)
    }

    /// The increment of a start `gain` times as strong.
    #[must_use]
    pub const fn scaled(&self, gain: Gain) -> Self {
        Self::new(gain.apply(self.q), gain.apply_wide(self.velocity()))
    }
}

/// A run of modes that share a scale shift.
///
/// Above a quarter of the sample rate modes are *folded*: the state holds
/// q·(−1)^n, which moves at half the sample rate less the frequency, so that e
/// stays below 2; every second frame is heard with the opposite sign. A block
/// begins with an even frame.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[repr(C)]
pub struct Group {
    /// The scale shift S, within [`SHIFTS`].
    pub shift: i8,
    /// Whether the states are held with alternating sign.
    pub folded: bool,
    /// How many modes.
    pub modes: u16,
}

impl Group {
    /// Whether `other` is held in the same form.
    pub(crate) const fn matches(&self, other: &Self) -> bool {
        self.shift == other.shift && self.folded == other.folded
    }
}

/// What a voice needs of a bank of up to `M` modes: the exact [`Bank`], or one
/// made for a smaller core.
pub trait ModeBank<const M: usize>: Sized {
    /// Highest ceiling, Q31, that the bank can hold without wrapping.
    const HIGHEST_CEILING_Q31: u32;

    /// What rounding can add to the sum of the amplitudes beyond the reserve of
    /// `coefficients`, Q31.
    fn further_reserve(coefficients: &Coefficients<M>) -> u64 {
        let _ = coefficients;
        0
    }

    /// A bank at rest.
    fn at_rest(coefficients: &Coefficients<M>) -> Self;

    /// Number of modes.
    fn modes(&self) -> usize;

    /// Puts every mode exactly at rest.
    fn clear(&mut self);

    /// Whether every mode is exactly at rest, and rendering costs nothing.
    fn is_at_rest(&self) -> bool;

    /// Adds `gain` times a prepared start to the state: superposition.
    fn add(&mut self, onset: &Onset<M>, gain: Gain);

    /// Makes every mode `gain` times as large.
    fn scale(&mut self, gain: Gain);

    /// Exchanges the coefficients and keeps the sound: `q[n]` and
    /// `q[n] − q[n−1]` of every mode stay. Modes that the new set lacks are
    /// dropped, modes that it adds start at rest.
    fn retune(&mut self, coefficients: &Coefficients<M>);

    /// Upper bound of the sum of the amplitudes, Q31, that adding `onset` adds to
    /// the modes with the coefficients that they have now.
    fn level_of(&self, onset: &Onset<M>) -> u64;

    /// Upper bound of the sum of the amplitudes of all modes, Q31, from the
    /// state itself, as if they went on with `coefficients` (`None`: their own).
    fn level(&self, coefficients: Option<&Coefficients<M>>) -> u64;

    /// Adds the next `B` frames of every mode to `block` and moves the state on.
    fn render<const B: usize>(&mut self, block: &mut [i32; B]);
}

/// Up to `M` modes in groups of equal form.
#[derive(Clone, Debug)]
pub struct Bank<const M: usize> {
    resonators: Vec<Resonator, M>,
    groups: Vec<Group, MAX_GROUPS>,
    /// Modes from here on are exactly at rest and are not computed.
    sounding: usize,
    /// The group of the last sounding mode, and where it begins.
    last_group: usize,
    last_start: usize,
    /// Frames since something was last added or exchanged.
    elapsed: u32,
}

impl<const M: usize> Bank<M> {
    /// Every mode, by rising frequency.
    #[must_use]
    pub fn resonators(&self) -> &[Resonator] {
        &self.resonators
    }

    /// The runs of modes of equal form, in the order of the modes.
    #[must_use]
    pub fn groups(&self) -> &[Group] {
        &self.groups
    }

    /// How many modes are computed: all up to the highest that still sounds.
    #[must_use]
    pub fn sounding(&self) -> usize {
        self.sounding
    }

    /// Computes every mode from now on.
    fn wake(&mut self) {
        self.elapsed = 0;
        self.sounding = self.resonators.len();
        self.last_group = self.groups.len().saturating_sub(1);
        let last = self.groups.last().map_or(0, |group| group.modes);
        self.last_start = self.sounding.saturating_sub(usize::from(last));
    }

    /// Puts the last pair of sounding modes at rest if nobody could hear it.
    fn retire(&mut self) {
        let Some(&group) = self.groups.get(self.last_group) else {
            return;
        };
        // Kernels work in pairs, so modes come to rest in pairs.
        let last = if (self.sounding - self.last_start).is_multiple_of(2) {
            2
        } else {
            1
        };
        let from = self.sounding.saturating_sub(last);
        let pair = self.resonators.get_mut(from..self.sounding);
        let pair = pair.unwrap_or_default();
        let elapsed = u64::from(self.elapsed);
        let is_spent = |resonator: &Resonator| {
            elapsed * u64::from(resonator.coefficient.damping.unsigned_abs()) >= SPENT_Q32
        };
        if pair
            .iter()
            .all(|one| is_inaudible(one, group) || is_spent(one))
        {
            for resonator in pair {
                resonator.state = State::rest(group.shift);
            }
            self.sounding = from;
            if self.sounding <= self.last_start {
                self.last_group = self.last_group.saturating_sub(1);
                let modes = self
                    .groups
                    .get(self.last_group)
                    .map_or(0, |group| group.modes);
                self.last_start = self.last_start.saturating_sub(usize::from(modes));
            }
        }
    }
}

impl<const M: usize> ModeBank<M> for Bank<M> {
    const HIGHEST_CEILING_Q31: u32 = FULL_SCALE_Q31;

    fn at_rest(coefficients: &Coefficients<M>) -> Self {
        let mut bank = Self {
            resonators: Vec::new(),
            groups: Vec::new(),
            sounding: 0,
            last_group: 0,
            last_start: 0,
            elapsed: 0,
        };
        bank.retune(coefficients);
        bank
    }

    fn modes(&self) -> usize {
        self.resonators.len()
    }

    fn clear(&mut self) {
        for (resonator, form) in self.resonators.iter_mut().zip(forms(&self.groups)) {
            resonator.state = State::rest(form.shift);
        }
        (self.sounding, self.last_group, self.last_start) = (0, 0, 0);
    }

    fn is_at_rest(&self) -> bool {
        self.sounding == 0
    }

    fn add(&mut self, onset: &Onset<M>, gain: Gain) {
        let both = forms(onset.groups()).zip(forms(&self.groups));
        let increments = onset.increments().iter().map(|one| one.scaled(gain));
        for ((resonator, increment), (from, to)) in
            self.resonators.iter_mut().zip(increments).zip(both)
        {
            let state = &mut resonator.state;
            let velocity = converted(increment.q, increment.velocity(), from, to);
            state.q = state.q.wrapping_add(increment.q);
            state.set_velocity(state.velocity().wrapping_add(velocity));
        }
        self.wake();
    }

    fn scale(&mut self, gain: Gain) {
        for (resonator, form) in self.resonators.iter_mut().zip(forms(&self.groups)) {
            let state = &mut resonator.state;
            let moving = gain.apply_wide(state.moving(form.shift));
            state.q = gain.apply(state.q);
            state.set_velocity(moving.wrapping_add(rest_velocity(form.shift)));
        }
    }

    fn retune(&mut self, coefficients: &Coefficients<M>) {
        let new = coefficients.as_slice();
        let groups = coefficients.groups();
        let both = forms(&self.groups).zip(forms(groups));
        for ((resonator, &coefficient), (from, to)) in self.resonators.iter_mut().zip(new).zip(both)
        {
            let state = &mut resonator.state;
            let velocity = converted(state.q, state.moving(from.shift), from, to);
            state.set_velocity(velocity.wrapping_add(rest_velocity(to.shift)));
            resonator.coefficient = coefficient;
        }
        self.resonators.truncate(new.len());
        let added = new.iter().zip(forms(groups));
        for (&coefficient, form) in added.skip(self.resonators.len()) {
            // Coefficients are at most M, as prepared.
            let _ = self.resonators.push(Resonator {
                state: State::rest(form.shift),
                coefficient,
            });
        }
        self.groups.clone_from(&coefficients.groups);
        if self.sounding > 0 {
            self.wake();
        }
    }

    fn level_of(&self, onset: &Onset<M>) -> u64 {
        let both = forms(onset.groups()).zip(forms(&self.groups));
        let increments = onset.increments().iter().zip(both);
        self.resonators
            .iter()
            .zip(increments)
            .map(|(resonator, (increment, (from, to)))| {
                increment.amplitude(from, resonator.coefficient, to)
            })
            .fold(0, u64::saturating_add)
    }

    fn level(&self, coefficients: Option<&Coefficients<M>>) -> u64 {
        let groups = coefficients.map_or(self.groups.as_slice(), Coefficients::groups);
        let mut others = coefficients.map(|other| other.as_slice().iter());
        let both = forms(&self.groups).zip(forms(groups));
        self.resonators
            .iter()
            .take(self.sounding)
            .zip(both)
            .map_while(|(resonator, (from, to))| {
                let coefficient = match &mut others {
                    Some(others) => *others.next()?,
                    None => resonator.coefficient,
                };
                Some(amplitude(&resonator.state, from, coefficient, to))
            })
            .fold(0, u64::saturating_add)
    }

    fn render<const B: usize>(&mut self, block: &mut [i32; B]) {
        let (sounding, _) = self.resonators.split_at_mut(self.sounding);
        kernel::render(&self.groups, sounding, block);
        self.elapsed = self.elapsed.saturating_add(B as u32);
        self.retire();
    }
}

/// Whether the amplitude is at most [`INAUDIBLE_Q31`], in steps of q where these
/// are coarser than its last place.
fn is_inaudible(resonator: &Resonator, group: Group) -> bool {
    let state = &resonator.state;
    let limit = INAUDIBLE_Q31 << (-group.shift).max(0);
    // A quick look first: |v|·2^S is at most the amplitude.
    let speed = (state.moving(group.shift) >> 32).unsigned_abs();
    u64::from(state.q.unsigned_abs()) <= limit
        && speed <= limit
        && amplitude(state, group, resonator.coefficient, group) <= limit
}

/// Upper bound of the amplitude (Q31) of a mode held in the form `from` that
/// goes on with `coefficient` in the form `to`.
fn amplitude(state: &State, from: Group, coefficient: Coefficient, to: Group) -> u64 {
    // 16 fractional bits: a velocity of 2·2^31 still fits twice.
    let slow = Group { shift: -16, ..to };
    let velocity = converted(state.q, state.moving(from.shift), from, slow);
    coefficient.amplitude(to.shift, state.q, velocity)
}

/// The accumulator of a mode at rest: half a step of q.
const fn rest_velocity(shift: i8) -> i64 {
    1 << (31 + if shift > 0 { shift } else { 0 })
}

/// A velocity accumulator (without the offset of rest) of a mode with
/// displacement `q`, held in the form `from`, in the form `to`.
const fn converted(q: i32, velocity: i64, from: Group, to: Group) -> i64 {
    let velocity = if to.shift >= from.shift {
        velocity << (to.shift - from.shift)
    } else {
        velocity >> (from.shift - to.shift)
    };
    if from.folded == to.folded {
        velocity
    } else {
        // The previous frame changes its sign: q − (−(q − v)) = 2 q − v.
        ((q as i64) << (33 + to.shift)).wrapping_sub(velocity)
    }
}

/// The form of every mode.
pub(crate) fn forms(groups: &[Group]) -> impl Iterator<Item = Group> {
    groups
        .iter()
        .flat_map(|group| core::iter::repeat_n(*group, usize::from(group.modes)))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The amplitude from k, e, q and v is that of A r^n cos(θ n − φ).
    #[test]
    fn amplitude_is_that_of_the_closed_form() {
        for (shift, angle, loss) in [
            (10_i8, 0.004_f64, 1.0e-6_f64),
            (8, 0.004, 1.0e-3),
            (4, 0.01, 1.0e-5),
            (2, 0.1, 1.0e-2),
            (0, 0.6, 1.0e-4),
            (-1, 0.9, 0.3),
            (-2, 1.5, 1.0e-5),
        ] {
            let r = (-loss).exp();
            let damping = 1.0 - r * r;
            let restoring = (1.0 - r).powi(2) + 4.0 * r * (0.5 * angle).sin().powi(2);
            let coefficient = Coefficient {
                damping: -(damping * 2.0_f64.powi(32)).round() as i32,
                restoring: -(restoring * 2.0_f64.powi(32 + i32::from(shift))).round() as i32,
            };
            let amplitude = 0.3 * 2.0_f64.powi(31);
            for step in 0..100 {
                let phase = f64::from(step) * 0.0631;
                let q = amplitude * phase.cos();
                let velocity = q - amplitude / r * (phase - angle).cos();
                let stated = coefficient.amplitude(
                    shift,
                    q.round() as i32,
                    (velocity * 65_536.0).round() as i64,
                );
                let excess = stated as f64 - amplitude;
                // The coefficients of the test are rounded, too.
                let tolerance = amplitude * 1.0e-6;
                let short = amplitude * 1.3e-4;
                assert!((-tolerance..short).contains(&excess), "{excess}");
            }
        }
    }

    /// Folding turns the sign of every second frame, nothing else.
    #[test]
    fn folding_there_and_back_is_exact() {
        let plain = Group {
            shift: -2,
            folded: false,
            modes: 1,
        };
        let folded = Group {
            folded: true,
            ..plain
        };
        for (q, velocity) in [(1 << 30, -(7_i64 << 56)), (-123_456, 1 << 59), (0, 99)] {
            let there = converted(q, velocity, plain, folded);
            assert_eq!(converted(q, there, folded, plain), velocity);
        }
    }
}
