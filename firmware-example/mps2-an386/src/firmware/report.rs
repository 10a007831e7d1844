//! What a run has to show.

use core::fmt::{self, Write as _};
use core::sync::atomic::Ordering::Relaxed;

use firmware_example::demo::{BLOCK, FRAMES, MODES, STRINGS};
use semihosting::io::Result;

use super::SAMPLING_TICKS;
use super::clock::{SAMPLE_RATE_HZ, TICKS_PER_SECOND};
use super::controlling::Controlling;
use super::output::{Directory, Text};
use super::rendering::Rendering;
use super::sampling::Sampling;

/// A run that is over.
pub(crate) struct Run<'a> {
    pub(crate) sampling: &'a Sampling,
    pub(crate) rendering: &'a Rendering,
    pub(crate) controlling: &'a Controlling<'a>,
    pub(crate) bytes_lost: u32,
    pub(crate) instructions_per_tick: f32,
    pub(crate) prepare_ticks: u32,
}

impl Run<'_> {
    /// Writes the three files.
    pub(crate) fn write(&self, directory: &Directory) -> Result<()> {
        let words = self.sampling.captured();
        directory.write("words.bin", words.as_flattened())?;
        directory.print("events.txt", |text| {
            let mut events = self.controlling.log().iter();
            events.try_for_each(|applied| writeln!(text, "{applied}"))
        })?;
        directory.print("report.txt", |text| self.report(text))
    }

    /// Logs everything that should be zero and is not.
    pub(crate) fn warn(&self) {
        let player = self.rendering.counters();
        let control = self.controlling.counters();
        for (name, count) in [
            ("deadline misses", self.sampling.missed()),
            ("late blocks", self.sampling.drain().late_blocks()),
            ("failed SPI transfers", self.sampling.spi_errors()),
            ("plucks lost to a full queue", control.lost_plucks),
            ("MIDI bytes lost", self.bytes_lost),
            ("commands refused", player.refused),
            ("frames clipped", player.clipped),
            ("sounds limited", player.limited),
        ] {
            if count > 0 {
                defmt::warn!("{=str}: {=u32}", name, count);
            }
        }
        defmt::info!(
            "{=u32} blocks, {=u32} commands",
            player.blocks,
            player.applied
        );
    }

    fn report(&self, text: &mut Text) -> fmt::Result {
        let player = self.rendering.counters();
        let control = self.controlling.counters();
        let drain = self.sampling.drain();
        let (port, placed) = (self.controlling.port(), self.controlling.placed());
        let spent = self.rendering.spent();
        let instructions = self.instructions_per_tick;
        let frames_sent = SAMPLING_TICKS.load(Relaxed) as f32 / FRAMES as f32;
        let sampling = frames_sent * instructions;
        let rendering = |ticks_per_block: f32| ticks_per_block * instructions / BLOCK as f32;
        let budget = instructions * TICKS_PER_SECOND as f32 / SAMPLE_RATE_HZ as f32;
        writeln!(
            text,
            "\
kernel={kernel}
strings={STRINGS}
modes={MODES}
block={BLOCK}
sample_rate_hz={SAMPLE_RATE_HZ}
frames={frames}
blocks={blocks}
deadline_misses={missed}
latest_start_ticks={latest_start}
late_blocks={late_blocks}
held_frames={held_frames}
spi_errors={spi_errors}
commands_applied={applied}
commands_refused={refused}
queue_overflows={lost_plucks}
postponed_mutes={postponed_mutes}
unknown_strings={unknown_strings}
log_overflows={log_lost}
limited={limited}
clipped={clipped}
loudest_dbfs={loudest:.1}
midi_port_bytes={port_bytes}
midi_port_messages={port_messages}
midi_port_garbage={port_garbage}
midi_port_overflows={bytes_lost}
midi_placed_bytes={placed_bytes}
midi_placed_messages={placed_messages}
midi_placed_garbage={placed_garbage}
instructions_per_tick={instructions:.2}
instructions_to_prepare={to_prepare:.0}
instructions_per_frame_sampling={sampling:.1}
instructions_per_frame_mean={mean:.1}
instructions_per_frame_max={most:.1}
budget_instructions_per_frame={budget:.1}",
            kernel = modal_core::kernel::NAME,
            frames = self.sampling.captured().len(),
            blocks = player.blocks,
            missed = self.sampling.missed(),
            latest_start = self.sampling.latest_start_ticks(),
            late_blocks = drain.late_blocks(),
            held_frames = drain.held_frames(),
            spi_errors = self.sampling.spi_errors(),
            applied = player.applied,
            refused = player.refused,
            lost_plucks = control.lost_plucks,
            postponed_mutes = control.postponed_mutes,
            unknown_strings = control.unknown_strings,
            log_lost = self.rendering.log_lost() + self.controlling.log_lost(),
            limited = player.limited,
            clipped = player.clipped,
            loudest = self.controlling.loudest_dbfs(),
            port_bytes = port.bytes,
            port_messages = port.messages,
            port_garbage = port.garbage(),
            bytes_lost = self.bytes_lost,
            placed_bytes = placed.bytes,
            placed_messages = placed.messages,
            placed_garbage = placed.garbage(),
            to_prepare = self.prepare_ticks as f32 * instructions,
            mean = rendering(spent.mean()) + sampling,
            most = rendering(spent.most() as f32) + sampling,
        )
    }
}
