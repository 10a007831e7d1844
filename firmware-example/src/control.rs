//! The lowest priority: from gestures and MIDI messages to prepared commands.

use heapless::spsc::Producer;
use micromath::F32Ext;
use modal_core::Gain;

use crate::command::{Command, Kind};
use crate::design::PreparedString;
use crate::midi::{Message, SYSTEM_RESET};

/// What a player does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Gesture {
    /// A string is plucked.
    Pluck {
        /// Index of the string.
        string: u8,
        /// MIDI velocity, 1 to 127.
        velocity: u8,
    },
    /// A hand is laid on a string.
    Mute {
        /// Index of the string.
        string: u8,
    },
    /// A hand is laid on all strings.
    MuteAll,
}

/// What control has counted since it started.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Counters {
    /// Plucks lost to a full queue.
    pub lost_plucks: u32,
    /// Mutes that had to wait for room in the queue.
    pub postponed_mutes: u32,
    /// Plucks and mutes for which there is no string.
    pub unknown_strings: u32,
}

/// What the hand does on one string, as far as the queue knows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Hand {
    Off,
    /// To be laid on as soon as the queue has room.
    Pending,
    On,
}

/// Turns gestures into commands for an instrument of up to `S` strings.
///
/// A pluck that finds the queue full is lost and counted. A mute is never lost:
/// it stays pending, goes before any later pluck of its string, and is tried
/// again by [`Control::poll`].
pub struct Control<'a, const S: usize, const M: usize> {
    strings: &'a [PreparedString<M>],
    commands: Producer<'a, Command<M>>,
    hands: [Hand; S],
    counters: Counters,
}

impl<'a, const S: usize, const M: usize> Control<'a, S, M> {
    /// Control of `strings` (the first `S` of them), all ringing freely.
    #[must_use]
    pub const fn new(strings: &'a [PreparedString<M>], commands: Producer<'a, Command<M>>) -> Self {
        Self {
            strings,
            commands,
            hands: [Hand::Off; S],
            counters: Counters {
                lost_plucks: 0,
                postponed_mutes: 0,
                unknown_strings: 0,
            },
        }
    }

    /// Follows a MIDI message on any channel: notes play their strings, a note
    /// that ends is muted; all channel mode messages that end notes (120, 123
    /// to 127) and a system reset mute every string.
    pub fn message(&mut self, message: Message) {
        let of_note = |note| self.strings.iter().position(|string| string.note == note);
        match message {
            Message::NoteOn { note, velocity, .. } => self.pluck(of_note(note), velocity),
            Message::NoteOff { note, .. } => self.mute(of_note(note)),
            Message::ControlChange {
                controller: 120 | 123..=127,
                ..
            }
            | Message::RealTime(SYSTEM_RESET) => self.gesture(Gesture::MuteAll),
            _ => {}
        }
    }

    /// Follows a gesture.
    pub fn gesture(&mut self, gesture: Gesture) {
        match gesture {
            Gesture::Pluck { string, velocity } => self.pluck(Some(string.into()), velocity),
            Gesture::Mute { string } => self.mute(Some(string.into())),
            Gesture::MuteAll => (0..self.strings.len().min(S)).for_each(|at| self.mute(Some(at))),
        }
    }

    /// Tries again what is pending. To be called often.
    pub fn poll(&mut self) {
        for at in 0..S {
            if self.hands.get(at) == Some(&Hand::Pending) && self.push(at, Kind::Mute, Gain::UNITY)
            {
                self.set_hand(at, Hand::On);
            }
        }
    }

    /// Whether a mute is still pending.
    #[must_use]
    pub fn is_pending(&self) -> bool {
        self.hands.contains(&Hand::Pending)
    }

    /// What was counted so far.
    #[must_use]
    pub fn counters(&self) -> Counters {
        self.counters
    }

    fn pluck(&mut self, string: Option<usize>, velocity: u8) {
        self.poll();
        let Some((at, hand)) = self.find(string) else {
            return;
        };
        let wanted = match hand {
            Hand::Off => 1,
            Hand::On => 2,
            Hand::Pending => usize::MAX,
        };
        if self.room() < wanted {
            self.counters.lost_plucks = self.counters.lost_plucks.saturating_add(1);
            return;
        }
        // Room was checked, so both go through.
        if hand == Hand::On && self.push(at, Kind::Release, Gain::UNITY) {
            self.set_hand(at, Hand::Off);
        }
        self.push(at, Kind::Pluck, pluck_gain(velocity));
    }

    fn mute(&mut self, string: Option<usize>) {
        let Some((at, hand)) = self.find(string) else {
            return;
        };
        if hand == Hand::Off {
            self.set_hand(at, Hand::Pending);
            self.poll();
            if self.hands.get(at) == Some(&Hand::Pending) {
                self.counters.postponed_mutes = self.counters.postponed_mutes.saturating_add(1);
            }
        }
    }

    fn find(&mut self, string: Option<usize>) -> Option<(usize, Hand)> {
        let found = string
            .filter(|&at| at < self.strings.len())
            .and_then(|at| Some((at, *self.hands.get(at)?)));
        if found.is_none() {
            self.counters.unknown_strings = self.counters.unknown_strings.saturating_add(1);
        }
        found
    }

    fn set_hand(&mut self, at: usize, hand: Hand) {
        if let Some(place) = self.hands.get_mut(at) {
            *place = hand;
        }
    }

    fn room(&self) -> usize {
        self.commands.capacity() - self.commands.len()
    }

    fn push(&mut self, at: usize, kind: Kind, gain: Gain) -> bool {
        let (Some(string), Ok(index)) = (self.strings.get(at), u8::try_from(at)) else {
            return false;
        };
        self.room() > 0
            && self
                .commands
                .enqueue(Command {
                    string: index,
                    action: string.action(kind, gain),
                })
                .is_ok()
    }
}

/// Span of pluck heights over all velocities. Our own choice, by feel.
const VELOCITY_SPAN_DB: f32 = 30.0;

/// ln 10 / 20: from decibels to the exponent of e.
const NEPERS_PER_DB: f32 = core::f32::consts::LN_10 / 20.0;

/// Share of the hardest pluck for a MIDI velocity: even steps in decibels, from
/// −30 dB to unity, each within 0.05 dB.
#[must_use]
pub fn pluck_gain(velocity: u8) -> Gain {
    const HARDEST: u8 = 127;
    let softer = f32::from(HARDEST.saturating_sub(velocity)) / f32::from(HARDEST);
    let share = F32Ext::exp(-softer * VELOCITY_SPAN_DB * NEPERS_PER_DB);
    // Casts saturate, and Gain takes more than unity as unity.
    Gain::from_q15((f32::from(Gain::UNITY.q15()) * share) as u16)
}
