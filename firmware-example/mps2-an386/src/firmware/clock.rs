//! Time: the sample clock and the tick counter, both from 25 MHz.

use super::registers::{dual_timer, timer_1};

/// Ticks per second of every timer of the board.
pub(crate) const TICKS_PER_SECOND: u32 = 25_000_000;

/// Frames per second.
pub(crate) const SAMPLE_RATE_HZ: u32 = 48_000;

/// Ticks of a period that is one tick shorter than the others, and how often
/// it comes: 25,000,000 / 48,000 = 520 5/6.
const SHORT_PERIOD: u32 = TICKS_PER_SECOND / SAMPLE_RATE_HZ;
const PERIODS: u32 = 6;
const FIRST_PERIOD: u32 = SHORT_PERIOD + 1;

/// A frame that starts later than this missed its deadline: a tenth of a period.
pub(crate) const LATEST_START_TICKS: u32 = SHORT_PERIOD / 10;
const _: () =
    assert!((SHORT_PERIOD * PERIODS + PERIODS - 1) * SAMPLE_RATE_HZ == TICKS_PER_SECOND * PERIODS);

/// The interrupt of every frame: five periods of 521 ticks, then one of 520.
pub(crate) struct SampleClock {
    /// Periods since a short one.
    phase: u32,
    /// Ticks of the period that runs, and of the one after it.
    now: u32,
    next: u32,
}

impl SampleClock {
    pub(crate) const fn new() -> Self {
        Self {
            phase: 0,
            now: FIRST_PERIOD,
            next: FIRST_PERIOD,
        }
    }

    /// To be called once at the start of the interrupt: acknowledges it, tells
    /// how many ticks late it is, and sets the length of the period after the
    /// one that has begun. (A timer counts from one less than its period.)
    #[inline(always)]
    pub(crate) fn tick(&mut self) -> u32 {
        let value = dual_timer::VALUE.read();
        dual_timer::INTERRUPT_CLEAR.write(1);
        self.now = self.next;
        self.phase = if self.phase + 1 == PERIODS {
            0
        } else {
            self.phase + 1
        };
        self.next = SHORT_PERIOD + u32::from(self.phase != 0);
        dual_timer::NEXT_LOAD.write(self.next - 1);
        (self.now - 1).wrapping_sub(value)
    }

    /// Whether the next frame is due already.
    #[inline(always)]
    pub(crate) fn is_due_again(&self) -> bool {
        dual_timer::INTERRUPT_PENDING.read() & 1 != 0
    }

    pub(crate) fn stop(&mut self) {
        dual_timer::CONTROL.write(0);
        dual_timer::INTERRUPT_CLEAR.write(1);
    }
}

/// Starts the sample clock; its first frame comes after one period.
pub(crate) fn start_samples() {
    dual_timer::CONTROL.write(0);
    dual_timer::LOAD.write(FIRST_PERIOD - 1);
    dual_timer::CONTROL.write(
        dual_timer::CONTROL_ENABLE
            | dual_timer::CONTROL_PERIODIC
            | dual_timer::CONTROL_INTERRUPT
            | dual_timer::CONTROL_32_BITS,
    );
}

/// Starts the free-running counter behind [`ticks`].
pub(crate) fn start_ticks() {
    timer_1::CONTROL.write(0);
    timer_1::RELOAD.write(u32::MAX);
    timer_1::VALUE.write(u32::MAX);
    timer_1::CONTROL.write(timer_1::CONTROL_ENABLE);
}

/// Ticks since the start; wraps every 171 s.
#[inline(always)]
pub(crate) fn ticks() -> u32 {
    u32::MAX - timer_1::VALUE.read()
}
