//! MIDI 1.0 bytes to messages.
//!
//! Rules of the MIDI 1.0 specification (from memory): a real-time byte may
//! stand anywhere, even inside another message; a channel message leaves its
//! status running; a system common message or an exclusive one cancels it; any
//! status but real time ends an exclusive message. Every byte is accepted;
//! what makes no sense is counted.

/// A complete message. Data bytes are 0 to 127, channels 0 to 15.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Message {
    /// A note ends. A note-on with velocity 0 is one, too.
    NoteOff {
        /// Channel.
        channel: u8,
        /// Note number; 69 is A4.
        note: u8,
        /// Release velocity.
        velocity: u8,
    },
    /// A note starts, with velocity 1 to 127.
    NoteOn {
        /// Channel.
        channel: u8,
        /// Note number; 69 is A4.
        note: u8,
        /// Velocity.
        velocity: u8,
    },
    /// Pressure on one key.
    KeyPressure {
        /// Channel.
        channel: u8,
        /// Note number.
        note: u8,
        /// Pressure.
        pressure: u8,
    },
    /// A controller moved.
    ControlChange {
        /// Channel.
        channel: u8,
        /// Number of the controller.
        controller: u8,
        /// Its position.
        value: u8,
    },
    /// Another program is asked for.
    ProgramChange {
        /// Channel.
        channel: u8,
        /// Number of the program.
        program: u8,
    },
    /// Pressure on the whole channel.
    ChannelPressure {
        /// Channel.
        channel: u8,
        /// Pressure.
        pressure: u8,
    },
    /// The bender moved.
    PitchBend {
        /// Channel.
        channel: u8,
        /// Position, 0 to 16,383; 8,192 is the middle.
        value: u16,
    },
    /// A system real-time byte, 0xF8 to 0xFF.
    RealTime(u8),
}

/// System reset, a real-time byte.
pub const SYSTEM_RESET: u8 = 0xFF;

const EXCLUSIVE: u8 = 0xF0;
const END_OF_EXCLUSIVE: u8 = 0xF7;
const TUNE_REQUEST: u8 = 0xF6;
/// No status byte is zero.
const NONE: u8 = 0;

/// The state between two bytes.
#[derive(Clone, Debug, Default)]
pub struct Parser {
    /// The status whose data bytes are awaited, or [`NONE`].
    status: u8,
    first: Option<u8>,
    garbage: u32,
}

impl Parser {
    /// A parser that waits for a status byte.
    #[must_use]
    pub const fn new() -> Self {
        Self {
            status: NONE,
            first: None,
            garbage: 0,
        }
    }

    /// Takes the next byte; returns the message that it completes.
    /// System common and exclusive messages are read over.
    pub fn push(&mut self, byte: u8) -> Option<Message> {
        match byte {
            // Undefined; they disturb nothing.
            0xF9 | 0xFD => {
                self.discard(1);
                None
            }
            0xF8..=0xFF => Some(Message::RealTime(byte)),
            0x80..=0xF7 => {
                self.begin(byte);
                None
            }
            0x00..=0x7F => self.data(byte),
        }
    }

    /// How many bytes made no sense: data without a status, messages cut short,
    /// undefined status bytes.
    #[must_use]
    pub fn garbage(&self) -> u32 {
        self.garbage
    }

    fn discard(&mut self, bytes: u32) {
        self.garbage = self.garbage.saturating_add(bytes);
    }

    fn begin(&mut self, status: u8) {
        if self.first.take().is_some() {
            self.discard(1);
        }
        let stray_end = status == END_OF_EXCLUSIVE && self.status != EXCLUSIVE;
        if stray_end || matches!(status, 0xF4 | 0xF5) {
            self.discard(1);
        }
        self.status = match status {
            0xF4 | 0xF5 | TUNE_REQUEST | END_OF_EXCLUSIVE => NONE,
            _ => status,
        };
    }

    fn data(&mut self, byte: u8) -> Option<Message> {
        let channel = self.status & 0x0F;
        match (self.status & 0xF0, self.first) {
            (0xC0, _) => Some(Message::ProgramChange {
                channel,
                program: byte,
            }),
            (0xD0, _) => Some(Message::ChannelPressure {
                channel,
                pressure: byte,
            }),
            (0x80..=0xE0, None) => {
                self.first = Some(byte);
                None
            }
            (kind @ 0x80..=0xE0, Some(first)) => {
                self.first = None;
                Some(pair(kind, channel, first, byte))
            }
            _ => {
                self.system_data(byte);
                None
            }
        }
    }

    fn system_data(&mut self, byte: u8) {
        match (self.status, self.first) {
            (EXCLUSIVE, _) => {}
            (0xF2, None) => self.first = Some(byte),
            (0xF1..=0xF3, _) => {
                self.first = None;
                self.status = NONE;
            }
            _ => self.discard(1),
        }
    }
}

/// A channel message with two data bytes.
fn pair(kind: u8, channel: u8, first: u8, second: u8) -> Message {
    match kind {
        0x90 if second != 0 => Message::NoteOn {
            channel,
            note: first,
            velocity: second,
        },
        0x80 | 0x90 => Message::NoteOff {
            channel,
            note: first,
            velocity: second,
        },
        0xA0 => Message::KeyPressure {
            channel,
            note: first,
            pressure: second,
        },
        0xB0 => Message::ControlChange {
            channel,
            controller: first,
            value: second,
        },
        _ => Message::PitchBend {
            channel,
            value: u16::from(second) << 7 | u16::from(first),
        },
    }
}
