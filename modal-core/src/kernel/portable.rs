//! The kernel that every other one must equal bit for bit.

use crate::bank::Resonator;

/// Modes outside, frames inside, two modes at a time: coefficients and state
/// stay in registers, and the block is loaded and stored once for two modes.
pub(super) fn render<const SHIFT: i32, const FOLDED: bool, const B: usize>(
    resonators: &mut [Resonator],
    block: &mut [i32; B],
) {
    let mut pairs = resonators.chunks_exact_mut(2);
    for pair in pairs.by_ref() {
        if let [r0, r1] = pair {
            let mut first = Running::<SHIFT>::load(r0);
            let mut second = Running::<SHIFT>::load(r1);
            hear::<FOLDED, B>(block, || first.step().wrapping_add(second.step()));
            first.store(r0);
            second.store(r1);
        }
    }
    if let [last] = pairs.into_remainder() {
        let mut mode = Running::<SHIFT>::load(last);
        hear::<FOLDED, B>(block, || mode.step());
        mode.store(last);
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
    fn load(resonator: &Resonator) -> Self {
        Self {
            damping: i64::from(resonator.coefficient.damping),
            restoring: i64::from(resonator.coefficient.restoring),
            q: resonator.state.q,
            velocity: resonator.state.velocity(),
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
    fn store(&self, resonator: &mut Resonator) {
        resonator.state.q = self.q;
        resonator.state.set_velocity(self.velocity);
    }
}
