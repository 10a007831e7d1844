//! The kernel that every other one must equal bit for bit.

use crate::bank::{Coefficient, State};

/// Modes outside, frames inside, two modes at a time: coefficients and state
/// stay in registers, and the block is loaded and stored once for two modes.
pub(super) fn render<const SHIFT: i32, const B: usize>(
    coefficients: &[Coefficient],
    states: &mut [State],
    block: &mut [i32; B],
) {
    let mut coefficients = coefficients.chunks_exact(2);
    let mut states = states.chunks_exact_mut(2);
    for (pair, state_pair) in coefficients.by_ref().zip(states.by_ref()) {
        if let ([c0, c1], [s0, s1]) = (pair, state_pair) {
            let mut first = Running::<SHIFT>::load(c0, s0);
            let mut second = Running::<SHIFT>::load(c1, s1);
            for frame in block.iter_mut() {
                *frame = frame.wrapping_add(first.step()).wrapping_add(second.step());
            }
            first.store(s0);
            second.store(s1);
        }
    }
    let last = coefficients.remainder().first();
    if let (Some(coefficient), Some(state)) = (last, states.into_remainder().first_mut()) {
        let mut mode = Running::<SHIFT>::load(coefficient, state);
        for frame in block.iter_mut() {
            *frame = frame.wrapping_add(mode.step());
        }
        mode.store(state);
    }
}

/// One mode while its block is computed.
struct Running<const SHIFT: i32> {
    damping: i64,
    restoring: i64,
    q: i32,
    velocity: i64,
}

impl<const SHIFT: i32> Running<SHIFT> {
    #[inline(always)]
    fn load(coefficient: &Coefficient, state: &State) -> Self {
        Self {
            damping: i64::from(coefficient.damping),
            restoring: i64::from(coefficient.restoring),
            q: state.q,
            velocity: state.velocity(),
        }
    }

    /// Hands out the present frame and moves on to the next.
    ///
    /// Sums wrap by definition; the headroom plan keeps them from doing so.
    #[inline(always)]
    fn step(&mut self) -> i32 {
        let now = self.q;
        self.velocity = self
            .velocity
            .wrapping_add(self.damping * (self.velocity >> 32))
            .wrapping_add(self.restoring * i64::from(now));
        self.q = now.wrapping_add((self.velocity >> (32 + SHIFT)) as i32);
        now
    }

    #[inline(always)]
    fn store(&self, state: &mut State) {
        state.q = self.q;
        state.set_velocity(self.velocity);
    }
}
