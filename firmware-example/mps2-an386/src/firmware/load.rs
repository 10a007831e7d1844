//! How many instructions the work takes, from ticks: the emulator's clock
//! advances by a fixed time an instruction.

use super::clock::ticks;

/// Instructions per tick, measured on a loop of known length.
pub(crate) fn instructions_per_tick() -> f32 {
    const ROUNDS: u32 = 100_000;
    const INSTRUCTIONS_A_ROUND: u32 = 2;
    let start = ticks();
    cortex_m::asm::delay(ROUNDS);
    let taken = ticks().wrapping_sub(start).max(1);
    (INSTRUCTIONS_A_ROUND * ROUNDS) as f32 / taken as f32
}

/// Ticks spent on something that is done again and again.
#[derive(Clone, Copy, Default)]
pub(crate) struct Spent {
    times: u32,
    ticks: u64,
    most: u32,
}

impl Spent {
    pub(crate) fn add(&mut self, ticks: u32) {
        self.times += 1;
        self.ticks += u64::from(ticks);
        self.most = self.most.max(ticks);
    }

    /// Mean ticks each time.
    pub(crate) fn mean(&self) -> f32 {
        self.ticks as f32 / self.times.max(1) as f32
    }

    /// Most ticks at one time.
    pub(crate) fn most(&self) -> u32 {
        self.most
    }
}
