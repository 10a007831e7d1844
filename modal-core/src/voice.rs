//! One string being played: a bank of modes and the account of its headroom.
//!
//! The voice keeps an upper bound of the sum of the amplitudes of all modes.
//! Every start adds its own sum; every block takes away what the slowest mode
//! loses; where that is too coarse, the bound is taken from the state. While the bound is at or below the ceiling, no accumulator can wrap
//! (`docs/fixed-point.md` gives the proof). A start that would break it is made
//! weaker, and says so.

use crate::bank::{Bank, ModeBank};
use crate::error::{Error, Result};
use crate::fixed::{FULL_SCALE_Q31, Gain};
use crate::quantise::{Coefficients, Fingerprint, Onset};

/// A voice whose bound falls below this (Q31) is put at rest: half of the last
/// place of a 24-bit converter.
pub const SILENCE_Q31: u64 = 1 << 7;

/// Whether a start fitted into the headroom that was left.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
#[must_use]
pub enum Headroom {
    /// It was added as it is.
    Full,
    /// It was added with this gain.
    Limited(Gain),
}

/// One string being played, on a bank `K` of up to `M` modes.
#[derive(Clone, Debug)]
pub struct Voice<const M: usize, K = Bank<M>> {
    bank: K,
    /// Highest ceiling that later coefficients may have.
    share: u32,
    ceiling: u32,
    /// Bound of the sum of the amplitudes, Q31 with 32 more fractional bits.
    bound: u64,
    slowest_decay_q64: u64,
    fingerprint: Fingerprint,
}

impl<const M: usize> Voice<M> {
    /// A string at rest, on the exact bank.
    #[must_use]
    pub fn new(coefficients: &Coefficients<M>) -> Self {
        Self::on(Bank::at_rest(coefficients), coefficients)
    }
}

impl<const M: usize, K: ModeBank<M>> Voice<M, K> {
    /// A string at rest, on the bank `K`.
    ///
    /// # Errors
    /// A ceiling above what the bank can hold; modes so low that the rounding of
    /// the bank would take half of the ceiling.
    pub fn with_bank(coefficients: &Coefficients<M>) -> Result<Self> {
        if coefficients.share > K::HIGHEST_CEILING_Q31 {
            return Err(ceiling_error(coefficients.share, K::HIGHEST_CEILING_Q31));
        }
        let mut voice = Self::on(K::at_rest(coefficients), coefficients);
        voice.ceiling = Self::ceiling_with(coefficients)?;
        Ok(voice)
    }

    /// The ceiling of `coefficients`, less what this bank's rounding takes.
    fn ceiling_with(coefficients: &Coefficients<M>) -> Result<u32> {
        let reserve = K::further_reserve(coefficients);
        let half = coefficients.ceiling / 2;
        match u32::try_from(reserve) {
            Ok(reserve) if reserve <= half => Ok(coefficients.ceiling - reserve),
            _ => Err(Error::OutOfRange {
                field: "reserve for the rounding of the bank",
                unit: "of full scale",
                value: reserve as f64 / f64::from(FULL_SCALE_Q31),
                min: 0.0,
                max: f64::from(half) / f64::from(FULL_SCALE_Q31),
            }),
        }
    }

    fn on(bank: K, coefficients: &Coefficients<M>) -> Self {
        Self {
            bank,
            share: coefficients.share,
            ceiling: coefficients.ceiling,
            bound: 0,
            slowest_decay_q64: coefficients.slowest_decay_q64,
            fingerprint: coefficients.fingerprint,
        }
    }

    /// Adds a prepared start to whatever sounds: plain superposition.
    ///
    /// It sounds from the first frame of the next block. If the headroom that
    /// is left is too small, the start is made weaker: nothing ever wraps.
    pub fn superpose(&mut self, onset: &Onset<M>) -> Headroom {
        // The same increments are another amplitude under other coefficients.
        let level = if onset.made_with() == self.fingerprint {
            u64::from(onset.level_q31())
        } else {
            self.bank.level_of(onset)
        };
        let ceiling = u64::from(self.ceiling);
        if level + self.bound_q31() > ceiling {
            // The running bound takes every mode for the slowest: look closer.
            self.bound = self.bound.min(self.bank.level(None).min(ceiling) << 32);
        }
        let left = ceiling.saturating_sub(self.bound_q31());
        if level <= left {
            self.bank.add(onset, Gain::UNITY);
            self.bound += level << 32;
            return Headroom::Full;
        }
        let gain = self.gain_into(left, level);
        if gain > Gain::ZERO {
            self.bank.add(onset, gain);
            self.bound += left << 32;
        }
        Headroom::Limited(gain)
    }

    /// Exchanges the coefficients while the string sounds, without a click:
    /// `q[n]` and `q[n] − q[n−1]` of every mode stay. This is how a voice is
    /// muted and released (the same string with other losses).
    ///
    /// An exchange can add to an amplitude; should the sum pass the ceiling by
    /// that, the sound is made weaker, and the gain is returned.
    ///
    /// # Errors
    /// A ceiling above the one the voice was made with, or modes too low for the
    /// bank; nothing is changed then.
    pub fn set_coefficients(&mut self, coefficients: &Coefficients<M>) -> Result<Headroom> {
        if coefficients.share > self.share {
            return Err(ceiling_error(coefficients.share, self.share));
        }
        self.ceiling = Self::ceiling_with(coefficients)?;
        self.slowest_decay_q64 = coefficients.slowest_decay_q64;
        self.fingerprint = coefficients.fingerprint;
        let ceiling = u64::from(self.ceiling);
        let mut headroom = Headroom::Full;
        if !self.is_silent() {
            let level = self.bank.level(Some(coefficients));
            if level > ceiling {
                let gain = self.gain_into(ceiling, level);
                self.bank.scale(gain);
                headroom = Headroom::Limited(gain);
            }
            self.bound = level.min(ceiling) << 32;
        }
        self.bank.retune(coefficients);
        Ok(headroom)
    }

    /// The largest gain that brings `level` down to `left`, less one unit a
    /// mode, which is what rounding can add.
    fn gain_into(&self, left: u64, level: u64) -> Gain {
        let usable = left.saturating_sub(self.bank.modes() as u64);
        // usable < level, so the ratio is below 2^15.
        Gain::from_q15(((usable << 15) / level.max(1)) as u16)
    }

    /// Adds the next `B` frames to `block`; costs only a check when silent.
    pub fn render<const B: usize>(&mut self, block: &mut [i32; B]) {
        if self.is_silent() {
            return;
        }
        self.bank.render(block);
        self.bound -= (self.bound >> 32) * loss_of_block(self.slowest_decay_q64, B);
        if self.bank.is_at_rest() || self.bound_q31() <= SILENCE_Q31 {
            self.silence();
        }
    }

    /// Whether every mode is exactly at rest.
    #[must_use]
    pub fn is_silent(&self) -> bool {
        self.bound == 0
    }

    /// Puts every mode exactly at rest at once. This can click: mute first.
    pub fn silence(&mut self) {
        self.bank.clear();
        self.bound = 0;
    }

    /// Upper bound of the sum of the amplitudes of all modes, Q31.
    #[must_use]
    pub fn bound_q31(&self) -> u64 {
        self.bound.saturating_add(u64::from(u32::MAX)) >> 32
    }

    /// Most that the bound can be, Q31.
    #[must_use]
    pub fn ceiling_q31(&self) -> u32 {
        self.ceiling
    }

    /// Highest ceiling that coefficients of this voice may have, Q31.
    #[must_use]
    pub fn share_q31(&self) -> u32 {
        self.share
    }

    /// The modes.
    #[must_use]
    pub fn bank(&self) -> &K {
        &self.bank
    }
}

fn ceiling_error(value_q31: u32, max_q31: u32) -> Error {
    let share = |q31: u32| f64::from(q31) / f64::from(FULL_SCALE_Q31);
    Error::OutOfRange {
        field: "ceiling",
        unit: "of full scale",
        value: share(value_q31),
        min: 0.0,
        max: share(max_q31),
    }
}

/// Share that `frames` take from an amplitude, Q32, rounded down: with
/// y = B (1−r), 1 − r^B ≥ 1 − e^(−y) ≥ y − y²/2.
const fn loss_of_block(decay_q64: u64, frames: usize) -> u64 {
    // y above 1 would leave the range of the series: take one.
    let y = decay_q64.saturating_mul(frames as u64) >> 32;
    y.saturating_sub((y * y) >> 33).saturating_sub(1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_loss_of_a_block_is_never_overstated() {
        for decay in [1.0e-7_f64, 1.0e-5, 1.0e-3, 0.02, 0.5, 0.9] {
            let loss = loss_of_block((decay * 2.0_f64.powi(64)) as u64, 32);
            let exact = 1.0 - (1.0 - decay).powi(32);
            let stated = loss as f64 / 2.0_f64.powi(32);
            assert!(stated <= exact * (1.0 + 1e-12), "{decay}");
            assert!(stated > 0.0);
        }
    }
}
