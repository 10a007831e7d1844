//! One stream of words that must be the same on every machine: every feature of
//! the engine in one short performance, as a hash.

use modal_core::{
    Bank, Coefficients, Converter, Gain, Headroom, Instrument, ModeBank, ModeSeries, NarrowBank,
    Onset, Result, TwoT60, TwosComplement16, Unipolar12, Voice,
};

use crate::scene::{BLOCK, MODES, Prepared, RATE_HZ, STRINGS, string};

/// The hash that every machine has to find.
pub const EXPECTED: u64 = 0x15ea_0d7f_a99a_9128;

/// FNV-1a, 64 bits (Fowler, Noll & Vo; RFC 9923).
#[derive(Clone, Copy, Debug)]
struct Hash(u64);

impl Hash {
    const fn new() -> Self {
        Self(0xCBF2_9CE4_8422_2325)
    }

    fn add(&mut self, bytes: &[u8]) {
        for &byte in bytes {
            self.0 = (self.0 ^ u64::from(byte)).wrapping_mul(0x0100_0000_01B3);
        }
    }
}

/// Plays the performance and hashes every word and every block.
///
/// # Errors
/// None: the tests play it.
pub fn hash() -> Result<u64> {
    let mut hash = Hash::new();
    play::<Bank<MODES>>(&mut hash)?;
    play::<NarrowBank<MODES>>(&mut hash)?;
    Ok(hash.0)
}

/// A string on both roads, and muted.
struct Roads {
    exact: (Coefficients<MODES>, Onset<MODES>),
    integer: (Coefficients<MODES>, Onset<MODES>),
    fretted: (Coefficients<MODES>, Onset<MODES>),
    muted: Coefficients<MODES>,
}

impl Roads {
    fn new(prepared: &Prepared) -> Result<Self> {
        let coefficients = prepared.coefficients()?;
        let onset = prepared.onset(&coefficients)?;
        let muted = ModeSeries::new(
            *prepared.series.string(),
            TwoT60::new(100.0, 0.15, 5_000.0, 0.05)?,
        );
        let note = prepared.note()?;
        let pluck = prepared.pluck_spec()?;
        // 2^(5/12) in Q30: the fifth fret.
        let fretted = note.shortened(1_433_332_366)?;
        Ok(Self {
            exact: (coefficients, onset),
            integer: note.note(MODES as u32, &pluck)?,
            fretted: fretted.note(MODES as u32, &pluck.scaled(Gain::from_q15(20_000)))?,
            muted: Coefficients::prepare(&muted, MODES as u32, RATE_HZ, Prepared::CEILING)?,
        })
    }
}

fn play<K: ModeBank<MODES>>(hash: &mut Hash) -> Result<()> {
    let mut instrument = Instrument::<STRINGS, MODES, BLOCK, K>::new();
    for index in 0..STRINGS {
        let coefficients = string(index)?.coefficients()?;
        instrument.add_voice(Voice::with_bank(&coefficients)?)?;
    }
    let mut wide = Converter::<TwosComplement16>::new(1);
    let mut narrow = Converter::<Unipolar12>::new(2);
    let (mut mix, mut words) = ([0; BLOCK], [0; BLOCK]);
    for step in 0..24_usize {
        let index = step % STRINGS;
        let roads = Roads::new(&string(index)?)?;
        if let Some(voice) = instrument.voice_mut(index) {
            let headroom = match step {
                0..6 => voice.superpose(&roads.exact.1),
                // Plucked again and again: the last ones are limited.
                6..12 => {
                    let _ = voice.superpose(&roads.integer.1);
                    voice.superpose(&roads.integer.1)
                }
                12..15 => voice.set_coefficients(&roads.muted)?,
                15..18 => voice.set_coefficients(&roads.fretted.0)?,
                18..21 => voice.superpose(&roads.fretted.1.scaled(Gain::from_q15(9_999))),
                _ => {
                    voice.silence();
                    Headroom::Full
                }
            };
            if let Headroom::Limited(gain) = headroom {
                hash.add(&gain.q15().to_le_bytes());
            }
        }
        for _ in 0..8 {
            instrument.render(&mut mix);
            for frame in mix {
                hash.add(&frame.to_le_bytes());
            }
            wide.convert(&mix, &mut words, instrument.is_silent());
            for word in words {
                hash.add(&word.to_le_bytes());
            }
            narrow.convert(&mix, &mut words, instrument.is_silent());
            for word in words {
                hash.add(&word.to_le_bytes());
            }
        }
    }
    hash.add(&wide.clipped().to_le_bytes());
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_golden_stream_is_the_same_on_the_host() {
        assert_eq!(hash().unwrap(), EXPECTED, "{:#018x}", hash().unwrap());
    }
}
