//! Several strings, mixed into one block.

use heapless::Vec;

use crate::bank::{Bank, ModeBank};
use crate::bounds;
use crate::error::{Error, Result};
use crate::fixed::FULL_SCALE_Q31;
use crate::voice::Voice;

/// Up to `S` strings of up to `M` modes on banks `K`, rendered `B` frames at a
/// time.
#[derive(Clone, Debug)]
pub struct Instrument<const S: usize, const M: usize, const B: usize, K = Bank<M>> {
    voices: Vec<Voice<M, K>, S>,
}

impl<const S: usize, const M: usize, const B: usize, K: ModeBank<M>> Default
    for Instrument<S, M, B, K>
{
    fn default() -> Self {
        Self::new()
    }
}

impl<const S: usize, const M: usize, const B: usize, K: ModeBank<M>> Instrument<S, M, B, K> {
    /// An instrument without strings.
    #[must_use]
    pub const fn new() -> Self {
        Self { voices: Vec::new() }
    }

    /// Adds a string; its index is the number of strings before it.
    ///
    /// # Errors
    /// [`Error::Count`] if `S` strings are there already; a sum of all ceilings
    /// above digital full scale.
    pub fn add_voice(&mut self, voice: Voice<M, K>) -> Result<usize> {
        let index = self.voices.len();
        let sum: u64 = self
            .voices
            .iter()
            .chain([&voice])
            .map(|voice| u64::from(voice.share_q31()))
            .sum();
        if sum > u64::from(FULL_SCALE_Q31) {
            return Err(Error::OutOfRange {
                field: "sum of the ceilings of all strings",
                unit: bounds::CEILING.unit,
                value: sum as f64 / f64::from(FULL_SCALE_Q31),
                min: 0.0,
                max: 1.0,
            });
        }
        match self.voices.push(voice) {
            Ok(()) => Ok(index),
            Err(_) => Err(Error::Count {
                field: "strings",
                wanted: index as u32 + 1,
                capacity: S as u32,
            }),
        }
    }

    /// The strings.
    #[must_use]
    pub fn voices(&self) -> &[Voice<M, K>] {
        &self.voices
    }

    /// The string with this index.
    pub fn voice_mut(&mut self, index: usize) -> Option<&mut Voice<M, K>> {
        self.voices.get_mut(index)
    }

    /// Writes the next `B` frames of all strings to `mix`, Q31.
    pub fn render(&mut self, mix: &mut [i32; B]) {
        mix.fill(0);
        for voice in &mut self.voices {
            voice.render(mix);
        }
    }

    /// Whether every string is exactly at rest.
    #[must_use]
    pub fn is_silent(&self) -> bool {
        self.voices.iter().all(Voice::is_silent)
    }
}
