//! The audio context: commands in, blocks of words out. Integers only.

use heapless::spsc::Consumer;
use modal_core::fixed::FULL_SCALE_Q31;
use modal_core::{Coefficients, Converter, DacFormat, Gain, Headroom, Instrument, Result, Voice};

use crate::command::{Action, Applied, Command, Kind};
use crate::design::PreparedString;
use crate::fade::FadeIn;

/// Commands that take effect in one block: a bound of the block's load. The
/// others wait for the next block.
const COMMANDS_PER_BLOCK: usize = 1;

/// What the player has counted since it started.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Counters {
    /// Blocks rendered.
    pub blocks: u32,
    /// Commands that took effect.
    pub applied: u32,
    /// Of these, how many were made weaker to fit the headroom.
    pub limited: u32,
    /// Commands for a string that is not there, or with too high a ceiling.
    pub refused: u32,
    /// Frames that the converter had to clip.
    pub clipped: u32,
}

/// An instrument of `S` strings of `M` modes that renders `B` frames at a time
/// for a converter of the format `F`.
pub struct Player<'a, F, const S: usize, const M: usize, const B: usize> {
    commands: Consumer<'a, Command<M>>,
    instrument: Instrument<S, M, B>,
    fade: Option<FadeIn>,
    converter: Converter<F>,
    mix: [i32; B],
    counters: Counters,
}

impl<'a, F: DacFormat, const S: usize, const M: usize, const B: usize> Player<'a, F, S, M, B> {
    /// A player of `strings` at rest, which fades in and dithers from `seed`.
    ///
    /// # Errors
    /// As [`Instrument::add_voice`].
    pub fn new(
        strings: &[PreparedString<M>],
        commands: Consumer<'a, Command<M>>,
        seed: u32,
    ) -> Result<Self> {
        let mut instrument = Instrument::new();
        for string in strings {
            instrument.add_voice(Voice::new(&string.ringing))?;
        }
        Ok(Self {
            commands,
            instrument,
            fade: Some(FadeIn::new()),
            converter: Converter::new(seed),
            mix: [0; B],
            counters: Counters::default(),
        })
    }

    /// Writes the next block. Commands take effect at its first frame; each one
    /// that does is told to `log`.
    pub fn render(&mut self, words: &mut [u16; B], mut log: impl FnMut(Applied)) {
        for _ in 0..COMMANDS_PER_BLOCK {
            let Some(command) = self.commands.dequeue() else {
                break;
            };
            if let Some(applied) = self.apply(command) {
                log(applied);
            }
        }
        self.instrument.render(&mut self.mix);
        let fade = self.fade.take();
        self.fade = fade.and_then(|fade| fade.apply(&mut self.mix));
        let silent = self.instrument.is_silent();
        self.converter.convert(&self.mix, words, silent);
        self.counters.blocks = self.counters.blocks.wrapping_add(1);
    }

    /// The block just rendered before its conversion, Q31.
    #[must_use]
    pub fn mix(&self) -> &[i32; B] {
        &self.mix
    }

    /// Largest magnitude in the block just rendered, Q31.
    #[must_use]
    pub fn peak_q31(&self) -> u32 {
        let peak = self.mix.iter().map(|frame| frame.unsigned_abs()).max();
        peak.unwrap_or(0).min(FULL_SCALE_Q31)
    }

    /// Whether every string is at rest.
    #[must_use]
    pub fn is_silent(&self) -> bool {
        self.instrument.is_silent()
    }

    /// Number of the first frame of the next block.
    #[must_use]
    pub fn frame(&self) -> u32 {
        self.counters.blocks.wrapping_mul(B as u32)
    }

    /// What was counted so far.
    #[must_use]
    pub fn counters(&self) -> Counters {
        Counters {
            clipped: self.converter.clipped(),
            ..self.counters
        }
    }

    fn apply(&mut self, command: Command<M>) -> Option<Applied> {
        let frame = self.frame();
        let string = command.string;
        let done = self
            .instrument
            .voice_mut(usize::from(string))
            .and_then(|voice| act(voice, &command.action));
        let Some((kind, gain, headroom)) = done else {
            self.counters.refused = self.counters.refused.saturating_add(1);
            return None;
        };
        self.counters.applied = self.counters.applied.saturating_add(1);
        let headroom = match headroom {
            Headroom::Full => Gain::UNITY,
            Headroom::Limited(gain) => {
                self.counters.limited = self.counters.limited.saturating_add(1);
                gain
            }
        };
        Some(Applied {
            frame,
            string,
            kind,
            gain,
            headroom,
        })
    }
}

fn act<const M: usize>(voice: &mut Voice<M>, action: &Action<M>) -> Option<(Kind, Gain, Headroom)> {
    let mut exchange = |coefficients: &Coefficients<M>| voice.set_coefficients(coefficients).ok();
    match action {
        Action::Pluck { gain, onset } => Some((Kind::Pluck, *gain, voice.superpose(onset))),
        Action::Release(ringing) => Some((Kind::Release, Gain::UNITY, exchange(ringing)?)),
        Action::Mute(muted) => Some((Kind::Mute, Gain::UNITY, exchange(muted)?)),
    }
}
