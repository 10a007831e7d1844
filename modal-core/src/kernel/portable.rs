//! The kernel that every other one must equal bit for bit.

use crate::bank::{Coefficient, State};

/// Modes outside, frames inside, two modes at a time: coefficients and state
/// stay in registers, and the block is loaded and stored once for two modes.
pub(super) fn render<const SHIFT: i32, const FOLDED: bool, const B: usize>(
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
            hear::<FOLDED, B>(block, || first.step().wrapping_add(second.step()));
            first.store(s0);
            second.store(s1);
        }
    }
    let last = coefficients.remainder().first();
    if let (Some(coefficient), Some(state)) = (last, states.into_remainder().first_mut()) {
        let mut mode = Running::<SHIFT>::load(coefficient, state);
        hear::<FOLDED, B>(block, || mode.step());
        mode.store(state);
    }
}

/// Adds a frame of `next` to every frame of the block, with alternating sign
/// for folded modes.
#[inline(always)]
fn hear<const FOLDED: bool, const B: usize>(block: &mut [i32; B], mut next: impl FnMut() -> i32) {
    for pair in block.chunks_exact_mut(2) {
        if let [even, odd] = pair {
            *even = even.wrapping_add(next());
            *odd = if FOLDED {
                odd.wrapping_sub(next())
            } else {
                odd.wrapping_add(next())
            };
        }
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
        let high = (self.velocity >> 32) as i32;
        let moved = if SHIFT >= 0 {
            high >> SHIFT
        } else {
            high << -SHIFT
        };
        self.q = now.wrapping_add(moved);
        now
    }

    #[inline(always)]
    fn store(&self, state: &mut State) {
        state.q = self.q;
        state.set_velocity(self.velocity);
    }
}
