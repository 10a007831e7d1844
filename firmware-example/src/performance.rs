//! A performance that is built in: gestures with their times.

use crate::control::Gesture;

/// A gesture and when it is made.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Cue {
    /// Time since the start of the performance in milliseconds.
    pub at_ms: u32,
    /// The gesture.
    pub gesture: Gesture,
}

/// Hands out the gestures of a performance when they are due.
#[derive(Clone, Debug)]
pub struct Performer<'a> {
    cues: &'a [Cue],
    first_frame: u32,
    sample_rate_hz: u32,
}

impl<'a> Performer<'a> {
    /// Plays `cues`, which are in the order of their times, from `first_frame` on.
    #[must_use]
    pub const fn new(cues: &'a [Cue], first_frame: u32, sample_rate_hz: u32) -> Self {
        Self {
            cues,
            first_frame,
            sample_rate_hz,
        }
    }

    /// The next gesture that is due at `frame`, if there is one.
    pub fn due(&mut self, frame: u32) -> Option<Gesture> {
        let (cue, later) = self.cues.split_first()?;
        let after_start = u64::from(cue.at_ms) * u64::from(self.sample_rate_hz) / 1_000;
        if u64::from(frame) < u64::from(self.first_frame) + after_start {
            return None;
        }
        self.cues = later;
        Some(cue.gesture)
    }

    /// Whether every gesture was handed out.
    #[must_use]
    pub fn is_over(&self) -> bool {
        self.cues.is_empty()
    }
}
