//! One string being played: a bank of modes and the account of its headroom.
//!
//! The voice keeps an upper bound of the sum of the amplitudes of all modes.
//! Every start adds its own sum; every block takes away what the slowest mode
//! loses. While the bound is at or below the ceiling, no accumulator can wrap
//! (`docs/fixed-point.md` gives the proof). A start that would break it is made
//! weaker, and says so.

use crate::bank::Bank;
use crate::error::{Error, Result};
use crate::fixed::{FULL_SCALE_Q31, Gain};
use crate::quantise::{Coefficients, Onset};

/// A voice whose bound falls below this (Q31) is put at rest: half of the last
/// place of a 24-bit converter.
pub const SILENCE_Q31: u32 = 1 << 7;

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

/// One string being played.
#[derive(Clone, Debug)]
pub struct Voice<const M: usize> {
    bank: Bank<M>,
    /// Highest ceiling that later coefficients may have.
    share: u32,
    ceiling: u32,
    /// Bound of the sum of the amplitudes, Q31 with 32 more fractional bits.
    bound: u64,
    slowest_decay_q64: u64,
    growth_q16: u32,
}

impl<const M: usize> Voice<M> {
    /// A string at rest.
    #[must_use]
    pub fn new(coefficients: Coefficients<M>) -> Self {
        Self {
            bank: Bank::new(coefficients.coefficients, coefficients.groups),
            share: coefficients.ceiling,
            ceiling: coefficients.ceiling,
            bound: 0,
            slowest_decay_q64: coefficients.slowest_decay_q64,
            growth_q16: coefficients.growth_q16,
        }
    }

    /// Adds a prepared start to whatever sounds: plain superposition.
    ///
    /// It sounds from the first frame of the next block. If the headroom that
    /// is left is too small, the start is made weaker: nothing ever wraps.
    pub fn superpose(&mut self, onset: &Onset<M>) -> Headroom {
        let left = self.ceiling.saturating_sub(self.bound_q31());
        let increments = onset.increments().iter();
        if onset.level_q31() <= left {
            self.bank.add(increments.copied(), &onset.groups);
            self.bound += u64::from(onset.level_q31()) << 32;
            return Headroom::Full;
        }
        // Less one unit a mode, which is what rounding can add to the increments.
        let usable = left.saturating_sub(self.bank.modes() as u32);
        let ratio = (u64::from(usable) << 15) / u64::from(onset.level_q31());
        // usable < level, so the ratio is below 2^15.
        let gain = Gain::from_q15(ratio as u16);
        if gain == Gain::ZERO {
            return Headroom::Limited(gain);
        }
        self.bank
            .add(increments.map(|one| one.scaled(gain)), &onset.groups);
        self.bound += u64::from(left) << 32;
        Headroom::Limited(gain)
    }

    /// Exchanges the coefficients while the string sounds, without a click:
    /// q and its last step stay. This is how a voice is muted and released
    /// (the same string with other losses).
    ///
    /// An exchange can add to an amplitude (a moving string that is suddenly
    /// damped has a sine part to lose); should the bound pass the ceiling by
    /// that, the sound is made weaker. The gain that was applied is returned.
    ///
    /// # Errors
    /// A ceiling above the one the voice was made with; nothing is changed then.
    pub fn set_coefficients(&mut self, coefficients: &Coefficients<M>) -> Result<Headroom> {
        if coefficients.ceiling > self.share {
            return Err(Error::OutOfRange {
                field: "ceiling",
                unit: "of full scale",
                value: f64::from(coefficients.ceiling) / f64::from(FULL_SCALE_Q31),
                min: 0.0,
                max: f64::from(self.share) / f64::from(FULL_SCALE_Q31),
            });
        }
        self.bank
            .retune(&coefficients.coefficients, &coefficients.groups);
        // A' <= A (1 + |k - k'|/(2 r sin θ)), mode by mode.
        let growth = self.growth_q16.max(coefficients.growth_q16);
        let added = (self.bound >> 16).saturating_mul(u64::from(growth));
        self.bound = self.bound.saturating_add(added);
        self.ceiling = coefficients.ceiling;
        self.slowest_decay_q64 = coefficients.slowest_decay_q64;
        self.growth_q16 = coefficients.growth_q16;
        if self.bound_q31() <= self.ceiling {
            return Ok(Headroom::Full);
        }
        let usable = self.ceiling.saturating_sub(self.bank.modes() as u32);
        let ratio = (u64::from(usable) << 15) / u64::from(self.bound_q31());
        let gain = Gain::from_q15(ratio as u16);
        self.bank.scale(gain);
        self.bound = u64::from(self.ceiling) << 32;
        Ok(Headroom::Limited(gain))
    }

    /// Adds the next `B` frames to `block`; costs only a check when silent.
    pub fn render<const B: usize>(&mut self, block: &mut [i32; B]) {
        if self.is_silent() {
            return;
        }
        self.bank.render(block);
        self.bound -= mul_q64(self.bound, loss_of_block(self.slowest_decay_q64, B));
        if self.bound_q31() <= SILENCE_Q31 {
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
    pub fn bound_q31(&self) -> u32 {
        let rounded_up = self.bound.saturating_add(u64::from(u32::MAX)) >> 32;
        rounded_up as u32
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
    pub fn bank(&self) -> &Bank<M> {
        &self.bank
    }
}

/// Share that `B` frames take from an amplitude, rounded down: with y = B (1−r),
/// 1 − r^B ≥ 1 − e^(−y) ≥ y − y²/2; Q64.
fn loss_of_block(decay_q64: u64, frames: usize) -> u64 {
    // y above 1 would leave the range of the series: take one.
    let y = decay_q64.saturating_mul(frames as u64);
    y.saturating_sub((mul_q64(y, y) >> 1) + 1)
}

/// `value` times a fraction in Q64, rounded down.
fn mul_q64(value: u64, fraction: u64) -> u64 {
    ((u128::from(value) * u128::from(fraction)) >> 64) as u64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_loss_of_a_block_is_never_overstated() {
        for decay in [1.0e-8_f64, 1.0e-5, 1.0e-3, 0.02, 0.5, 0.9] {
            let bound = loss_of_block((decay * 2.0_f64.powi(64)) as u64, 32);
            let exact = 1.0 - (1.0 - decay).powi(32);
            let stated = bound as f64 / 2.0_f64.powi(64);
            assert!(stated <= exact * (1.0 + 1e-12), "{decay}");
            assert!(stated > 0.0);
        }
    }
}
