//! From the mix to the words of a converter.

use core::marker::PhantomData;

/// How a converter wants its words.
pub trait DacFormat {
    /// Width of the converter in bits, 1 to 16.
    const BITS: u32;
    /// The word of silence.
    const REST: u16;
    /// The word of a signed level of `BITS` bits.
    fn word(level: i16) -> u16;
}

/// 16 bits, two's complement: the common form of audio converters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct TwosComplement16;

impl DacFormat for TwosComplement16 {
    const BITS: u32 = 16;
    const REST: u16 = 0;
    fn word(level: i16) -> u16 {
        level.cast_unsigned()
    }
}

/// 12 bits, unipolar, right-aligned: silence is mid-scale. The upper four bits
/// are zero, for the command bits of the converter at hand.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Unipolar12;

impl DacFormat for Unipolar12 {
    const BITS: u32 = 12;
    const REST: u16 = 1 << 11;
    fn word(level: i16) -> u16 {
        level.wrapping_add(1 << 11).cast_unsigned() & 0x0FFF
    }
}

/// Quantises the mix with triangular dither and counts what it had to clip.
///
/// The dither has two uniform parts and spans ±1 of the last place, which makes
/// the error's mean and power independent of the signal: its power is a quarter
/// of the square of the last place (Lipshitz, Wannamaker & Vanderkooy, J. Audio
/// Eng. Soc. 40:355, 1992; from memory). It is seeded: the same words every run.
#[derive(Clone, Debug)]
pub struct Converter<F> {
    noise: u32,
    clipped: u32,
    format: PhantomData<F>,
}

impl<F: DacFormat> Converter<F> {
    /// Places by which the Q31 mix is above the last place of the converter.
    const SHIFT: u32 = {
        assert!(F::BITS >= 1 && F::BITS <= 16, "a word has 16 bits");
        32 - F::BITS
    };

    /// A converter whose dither starts from `seed` (zero is taken as one).
    #[must_use]
    pub const fn new(seed: u32) -> Self {
        Self {
            noise: if seed == 0 { 1 } else { seed },
            clipped: 0,
            format: PhantomData,
        }
    }

    /// Writes a word for each frame of the Q31 `mix`, as far as both reach.
    ///
    /// A `silent` mix gives the rest word exactly, without dither.
    pub fn convert(&mut self, mix: &[i32], words: &mut [u16], silent: bool) {
        for (&frame, word) in mix.iter().zip(words) {
            *word = if silent {
                F::REST
            } else {
                self.quantise(frame)
            };
        }
    }

    /// How many frames had to be clipped so far.
    #[must_use]
    pub fn clipped(&self) -> u32 {
        self.clipped
    }

    fn quantise(&mut self, frame: i32) -> u16 {
        let half = 1_i64 << (Self::SHIFT - 1);
        let level = (i64::from(frame) + self.dither() + half) >> Self::SHIFT;
        let top = (1_i64 << (F::BITS - 1)) - 1;
        let bounded = level.clamp(-top - 1, top);
        if bounded != level {
            self.clipped = self.clipped.saturating_add(1);
        }
        // |bounded| <= 2^15.
        F::word(bounded as i16)
    }

    /// Two uniform 16-bit numbers from one draw (xorshift, Marsaglia, J. Stat.
    /// Softw. 8:14, 2003; constants from memory), summed around zero.
    fn dither(&mut self) -> i64 {
        self.noise ^= self.noise << 13;
        self.noise ^= self.noise >> 17;
        self.noise ^= self.noise << 5;
        let sum = i64::from(self.noise >> 16) + i64::from(self.noise & 0xFFFF);
        (sum - 0xFFFF) << (16 - F::BITS)
    }
}
