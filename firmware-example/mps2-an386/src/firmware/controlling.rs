//! The lowest context: the performance, MIDI, the log and the meter.

use core::sync::atomic::Ordering::Relaxed;

use firmware_example::command::Applied;
use firmware_example::control::{Control, Counters};
use firmware_example::demo::{self, MODES, STRINGS};
use firmware_example::fade::FADE_FRAMES;
use firmware_example::meter::{FLOOR_DBFS, Meter};
use firmware_example::midi::Parser;
use firmware_example::performance::Performer;
use heapless::Vec;
use heapless::spsc::Consumer;

use super::registers::placed;
use super::{FRAME, PEAK, clock, uart};

/// Entries of the log that are kept.
pub(crate) const LOG: usize = 1_024;

/// Frames between two readings of the meter, and how far it falls meanwhile:
/// 20 dB a second.
const METER_FRAMES: u32 = clock::SAMPLE_RATE_HZ / 10;
const METER_FALL_DB: f32 = 2.0;

/// What the main program works with.
pub(crate) struct Controlling<'a> {
    pub(crate) control: Control<'a, STRINGS, MODES>,
    /// None if placed MIDI bytes take its place.
    performer: Option<Performer<'static>>,
    port: MidiInput,
    bytes: Consumer<'a, u8>,
    placed: MidiInput,
    applied: Consumer<'a, Applied>,
    log: &'a mut Vec<Applied, LOG>,
    log_lost: u32,
    meter: Meter,
    metered_frame: u32,
    loudest_dbfs: f32,
}

/// A stream of MIDI bytes and what was counted on it.
#[derive(Default)]
pub(crate) struct MidiInput {
    parser: Parser,
    pub(crate) bytes: u32,
    pub(crate) messages: u32,
}

impl MidiInput {
    fn push(&mut self, byte: u8, control: &mut Control<'_, STRINGS, MODES>) {
        self.bytes += 1;
        if let Some(message) = self.parser.push(byte) {
            self.messages += 1;
            control.message(message);
        }
    }

    /// Bytes without sense.
    pub(crate) fn garbage(&self) -> u32 {
        self.parser.garbage()
    }
}

impl<'a> Controlling<'a> {
    /// Control with MIDI `bytes` from the port; what was `applied` is kept in `log`.
    pub(crate) fn new(
        control: Control<'a, STRINGS, MODES>,
        bytes: Consumer<'a, u8>,
        applied: Consumer<'a, Applied>,
        log: &'a mut Vec<Applied, LOG>,
    ) -> Self {
        Self {
            control,
            performer: (placed::len() == 0).then(demo::performer),
            port: MidiInput::default(),
            bytes,
            placed: MidiInput::default(),
            applied,
            log,
            log_lost: 0,
            meter: Meter::new(METER_FALL_DB),
            metered_frame: 0,
            loudest_dbfs: FLOOR_DBFS,
        }
    }

    /// One round of everything that may be due.
    pub(crate) fn turn(&mut self) {
        let frame = FRAME.load(Relaxed);
        if let Some(byte) = self.bytes.dequeue() {
            self.port.push(byte, &mut self.control);
        }
        if let Some(byte) = placed_byte(self.placed.bytes, frame) {
            self.placed.push(byte, &mut self.control);
        }
        let gesture = self.performer.as_mut().and_then(|one| one.due(frame));
        if let Some(gesture) = gesture {
            self.control.gesture(gesture);
        }
        self.control.poll();
        self.keep_log();
        if frame.wrapping_sub(self.metered_frame) >= METER_FRAMES {
            self.metered_frame = frame;
            let level_dbfs = self.meter.read(PEAK.swap(0, Relaxed));
            self.loudest_dbfs = self.loudest_dbfs.max(level_dbfs);
        }
    }

    /// Keeps what took effect since the last time.
    pub(crate) fn keep_log(&mut self) {
        while let Some(applied) = self.applied.dequeue() {
            self.log_lost += u32::from(self.log.push(applied).is_err());
        }
    }

    /// The input from the serial port.
    pub(crate) fn port(&self) -> &MidiInput {
        &self.port
    }

    /// The input from placed bytes.
    pub(crate) fn placed(&self) -> &MidiInput {
        &self.placed
    }

    /// What took effect.
    pub(crate) fn log(&self) -> &[Applied] {
        self.log
    }

    /// What took effect without being kept.
    pub(crate) fn log_lost(&self) -> u32 {
        self.log_lost
    }

    /// What control counted.
    pub(crate) fn counters(&self) -> Counters {
        self.control.counters()
    }

    /// The highest reading of the meter.
    pub(crate) fn loudest_dbfs(&self) -> f32 {
        self.loudest_dbfs
    }
}

/// The next placed byte, once the wire would have carried it: ten bits a byte,
/// from the end of the fade-in on.
fn placed_byte(taken: u32, frame: u32) -> Option<u8> {
    let playing = u64::from(frame.checked_sub(FADE_FRAMES)?);
    let carried = playing * u64::from(uart::BYTES_PER_SECOND) / u64::from(clock::SAMPLE_RATE_HZ);
    (u64::from(taken) < carried)
        .then(|| placed::byte(taken))
        .flatten()
}
