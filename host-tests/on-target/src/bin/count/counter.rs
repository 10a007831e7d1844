//! Counted instructions. Under the emulator's fixed instruction rate the clock
//! of the board is a counter of instructions.

/// Ticks per 1,000 instructions: the counter of instructions itself; 25 MHz and
/// 20 MHz at 64 ns an instruction.
const RATES: [u32; 3] = [1_000, 1_600, 1_280];

/// Counts the instructions of a piece of code.
pub(crate) struct Counter {
    clock: Clock,
    /// Ticks per 1,000 instructions.
    rate: u32,
    /// What an empty piece takes, in ticks.
    empty: u32,
}

impl Counter {
    pub(crate) fn new() -> Self {
        let mut clock = Clock::new();
        let empty = ticks(&mut clock, || {});
        let measured = (ticks(&mut clock, four_thousand) - empty) * 1_000 / 4_096;
        // The clocks of the boards are known; the measured rate tells which.
        let rate = RATES
            .into_iter()
            .min_by_key(|rate| rate.abs_diff(measured))
            .unwrap_or(measured);
        Self { clock, rate, empty }
    }

    /// Instructions of `work`.
    pub(crate) fn of<R>(&mut self, work: impl FnOnce() -> R) -> u32 {
        let ticks = ticks(&mut self.clock, work).saturating_sub(self.empty);
        (u64::from(ticks) * 1_000 / u64::from(self.rate.max(1))) as u32
    }

    /// What 4,096 instructions are counted as, for a self-check.
    pub(crate) fn check(&mut self) -> u32 {
        self.of(four_thousand)
    }
}

fn ticks<R>(clock: &mut Clock, work: impl FnOnce() -> R) -> u32 {
    let before = clock.now();
    let result = core::hint::black_box(work());
    let after = clock.now();
    drop(result);
    Clock::between(before, after)
}

/// Eight instructions that do nothing, one after the other.
#[inline(always)]
fn eight() {
    nop();
    nop();
    nop();
    nop();
    nop();
    nop();
    nop();
    nop();
}

#[inline(always)]
fn sixty_four() {
    eight();
    eight();
    eight();
    eight();
    eight();
    eight();
    eight();
    eight();
}

/// 4,096 instructions that do nothing, and the way there and back.
#[inline(never)]
fn four_thousand() {
    five_hundred();
    five_hundred();
    five_hundred();
    five_hundred();
    five_hundred();
    five_hundred();
    five_hundred();
    five_hundred();
}

#[inline(always)]
fn five_hundred() {
    sixty_four();
    sixty_four();
    sixty_four();
    sixty_four();
    sixty_four();
    sixty_four();
    sixty_four();
    sixty_four();
}

#[cfg(target_arch = "arm")]
use cortex_m::asm::nop;
#[cfg(target_arch = "riscv32")]
use riscv::asm::nop;

#[cfg(target_arch = "arm")]
struct Clock;

#[cfg(target_arch = "arm")]
impl Clock {
    fn new() -> Self {
        use cortex_m::peripheral::syst::SystClkSource;
        if let Some(mut board) = cortex_m::Peripherals::take() {
            board.SYST.set_clock_source(SystClkSource::Core);
            board.SYST.set_reload(0x00FF_FFFF);
            board.SYST.clear_current();
            board.SYST.enable_counter();
        }
        Self
    }

    fn now(&mut self) -> u32 {
        cortex_m::peripheral::SYST::get_current()
    }

    /// The clock counts down, in 24 bits.
    fn between(before: u32, after: u32) -> u32 {
        before.wrapping_sub(after) & 0x00FF_FFFF
    }
}

#[cfg(target_arch = "riscv32")]
struct Clock;

#[cfg(target_arch = "riscv32")]
impl Clock {
    fn new() -> Self {
        Self
    }

    fn now(&mut self) -> u32 {
        riscv::register::minstret::read() as u32
    }

    fn between(before: u32, after: u32) -> u32 {
        after.wrapping_sub(before)
    }
}
