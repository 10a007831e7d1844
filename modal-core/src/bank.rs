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

use crate::fixed::Gain;
use crate::kernel;

/// The smallest and largest scale shift S of a group of modes.
pub const SHIFTS: core::ops::RangeInclusive<i8> = -3..=10;

/// Most groups of equal shift in a bank.
pub const MAX_GROUPS: usize = 14;

/// The two numbers of one mode that do not change from sample to sample.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[repr(C)]
pub struct Coefficient {
    /// −k in Q32: −(1 − r²), the loss of velocity in one frame.
    pub damping: i32,
    /// −e in Q(32+S): −(1 + r² − 2 r cos θ), the pull back to rest.
    pub restoring: i32,
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
        rest.set_velocity(1 << (31 + shift));
        rest
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

/// What a start adds to the state of one mode.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
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

    /// The increment of a start `gain` times as strong.
    #[must_use]
    pub const fn scaled(&self, gain: Gain) -> Self {
        Self::new(gain.apply(self.q), gain.apply_wide(self.velocity()))
    }
}

/// A run of modes that share a scale shift.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Group {
    /// The scale shift S, within [`SHIFTS`].
    pub shift: i8,
    /// How many modes.
    pub modes: u16,
}

/// Up to `M` modes: coefficients in groups of equal shift, and their state.
#[derive(Clone, Debug)]
pub struct Bank<const M: usize> {
    coefficients: Vec<Coefficient, M>,
    groups: Vec<Group, MAX_GROUPS>,
    states: Vec<State, M>,
}

impl<const M: usize> Bank<M> {
    pub(crate) fn new(coefficients: Vec<Coefficient, M>, groups: Vec<Group, MAX_GROUPS>) -> Self {
        let mut bank = Self {
            coefficients,
            groups,
            states: Vec::new(),
        };
        bank.clear();
        bank
    }

    /// Number of modes.
    #[must_use]
    pub fn modes(&self) -> usize {
        self.coefficients.len()
    }

    /// The state of every mode, by rising frequency.
    #[must_use]
    pub fn states(&self) -> &[State] {
        &self.states
    }

    /// The coefficients of every mode, by rising frequency.
    #[must_use]
    pub fn coefficients(&self) -> &[Coefficient] {
        &self.coefficients
    }

    /// Puts every mode at rest.
    pub fn clear(&mut self) {
        self.states.clear();
        for shift in shifts(&self.groups) {
            // As many states as coefficients, which fit.
            let _ = self.states.push(State::rest(shift));
        }
    }

    /// Adds `increments`, made for the shifts of `made_for`, to the state, mode
    /// by mode: superposition.
    pub(crate) fn add(&mut self, increments: impl Iterator<Item = Increment>, made_for: &[Group]) {
        let both = shifts(made_for).zip(shifts(&self.groups));
        for ((state, increment), (from, to)) in self.states.iter_mut().zip(increments).zip(both) {
            let velocity = rescaled(increment.velocity(), from, to);
            state.q = state.q.wrapping_add(increment.q);
            state.set_velocity(state.velocity().wrapping_add(velocity));
        }
    }

    /// Makes every mode `gain` times as large.
    pub(crate) fn scale(&mut self, gain: Gain) {
        for (state, shift) in self.states.iter_mut().zip(shifts(&self.groups)) {
            let rest = State::rest(shift).velocity();
            state.q = gain.apply(state.q);
            state.set_velocity(
                gain.apply_wide(state.velocity().wrapping_sub(rest))
                    .wrapping_add(rest),
            );
        }
    }

    /// Exchanges the coefficients and keeps the sound: `q[n]` and `q[n] − q[n−1]`
    /// of every mode stay, whatever the new shifts. Modes that the new set
    /// lacks are dropped, modes that it adds start at rest.
    pub(crate) fn retune(
        &mut self,
        coefficients: &Vec<Coefficient, M>,
        groups: &Vec<Group, MAX_GROUPS>,
    ) {
        let both = shifts(&self.groups).zip(shifts(groups));
        for (state, (from, to)) in self.states.iter_mut().zip(both) {
            let velocity = state.velocity().wrapping_sub(State::rest(from).velocity());
            state.set_velocity(
                rescaled(velocity, from, to).wrapping_add(State::rest(to).velocity()),
            );
        }
        self.states.truncate(coefficients.len());
        for shift in shifts(groups).skip(self.states.len()) {
            // As many states as coefficients, which fit.
            let _ = self.states.push(State::rest(shift));
        }
        self.coefficients.clone_from(coefficients);
        self.groups.clone_from(groups);
    }

    /// Adds the next `B` frames of every mode to `block` and moves the state on.
    pub fn render<const B: usize>(&mut self, block: &mut [i32; B]) {
        let mut coefficients = self.coefficients.as_slice();
        let mut states = self.states.as_mut_slice();
        for group in &self.groups {
            let modes = usize::from(group.modes)
                .min(coefficients.len())
                .min(states.len());
            let (now, later) = coefficients.split_at(modes);
            let (now_states, later_states) = states.split_at_mut(modes);
            kernel::render(group.shift, now, now_states, block);
            (coefficients, states) = (later, later_states);
        }
    }
}

/// A velocity accumulator of scale shift `from`, for the shift `to`.
const fn rescaled(velocity: i64, from: i8, to: i8) -> i64 {
    if to >= from {
        velocity << (to - from)
    } else {
        velocity >> (from - to)
    }
}

/// The shift of every mode.
pub(crate) fn shifts(groups: &[Group]) -> impl Iterator<Item = i8> {
    groups
        .iter()
        .flat_map(|group| core::iter::repeat_n(group.shift, usize::from(group.modes)))
}
