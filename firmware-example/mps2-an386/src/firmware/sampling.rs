//! The most urgent context: one word every frame.

use embedded_hal_bus::spi::{ExclusiveDevice, NoDelay};
use firmware_example::dac::Dac;
use firmware_example::demo::BLOCK;
use firmware_example::pump::Drain;

use super::clock::{LATEST_START_TICKS, SampleClock};
use super::spi::{Captured, ChipSelect, LoopedBus};

/// What the sample interrupt works with.
pub(crate) struct Sampling {
    clock: SampleClock,
    drain: Drain<'static, BLOCK>,
    dac: Dac<ExclusiveDevice<LoopedBus, ChipSelect, NoDelay>>,
    frames_left: u32,
    missed: u32,
    latest_start_ticks: u32,
}

impl Sampling {
    /// Sends what comes from `drain` for `frames` frames, and keeps in
    /// `capture` what was on the wire.
    pub(crate) fn new(
        drain: Drain<'static, BLOCK>,
        capture: &'static mut [Captured],
        frames: u32,
    ) -> Self {
        let Ok(device) = ExclusiveDevice::new_no_delay(LoopedBus::new(capture), ChipSelect);
        Self {
            clock: SampleClock::new(),
            drain,
            dac: Dac::new(device, 0),
            frames_left: frames,
            missed: 0,
            latest_start_ticks: 0,
        }
    }

    /// Sends the word of this frame; tells whether there is room for a block.
    #[inline]
    pub(crate) fn send_frame(&mut self) -> bool {
        let late_ticks = self.clock.tick();
        let frame = self.drain.next_frame();
        self.dac.send(frame.word);
        self.frames_left -= 1;
        if self.is_over() {
            self.clock.stop();
        }
        self.latest_start_ticks = self.latest_start_ticks.max(late_ticks);
        self.missed += u32::from(late_ticks > LATEST_START_TICKS || self.clock.is_due_again());
        frame.room
    }

    /// Whether every frame was sent.
    pub(crate) fn is_over(&self) -> bool {
        self.frames_left == 0
    }

    /// Frames that started late, or ended after the next one was due.
    pub(crate) fn missed(&self) -> u32 {
        self.missed
    }

    /// Most ticks from the clock to the start of a frame.
    pub(crate) fn latest_start_ticks(&self) -> u32 {
        self.latest_start_ticks
    }

    /// The side of the pump that words came from.
    pub(crate) fn drain(&self) -> &Drain<'static, BLOCK> {
        &self.drain
    }

    /// Transfers that failed.
    pub(crate) fn spi_errors(&self) -> u32 {
        self.dac.errors()
    }

    /// What was on the wire.
    pub(crate) fn captured(&self) -> &[Captured] {
        self.dac.device().bus().captured()
    }
}
