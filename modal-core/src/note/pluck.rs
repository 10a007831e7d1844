//! A pluck and the pickup that hears it, in integers.

use core::f64::consts::PI;

use crate::bank::{Coefficient, Increment};
use crate::bounds::{self, Bound};
use crate::error::{Error, Result};
use crate::excitation::{RoundedPluck, Tip};
use crate::fixed::Gain;
use crate::note::polynomial::{mul_high, rough_slack, slack};
use crate::note::sine::{Place, Sines};
use crate::note::sweep::{GENTLE_Q36, ModeQ};
use crate::pickup::{DisplacementPickup, VelocityPickup};
use crate::string::StringSpec;

/// Strength of a pluck on the integer road: 2 h/(π² p (1−p)), or the velocity
/// per frame that it gives, over full scale.
pub const PLUCK_STRENGTH: Bound = Bound {
    name: "pluck strength over full scale",
    unit: "",
    min: -8_000.0,
    max: 8_000.0,
};

/// A factor of 31 significant bits: `mantissa` / 2^`places`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
struct Strength {
    mantissa: i32,
    /// 16 to 60.
    places: u32,
}

impl Strength {
    fn new(value: f64) -> Result<Self> {
        let (fraction, exponent) = libm::frexp(PLUCK_STRENGTH.check(value)?);
        let places = (31 - exponent).clamp(16, 60);
        let scaled = libm::ldexp(fraction, exponent + places);
        Ok(Self {
            mantissa: libm::rint(scaled) as i32,
            places: places as u32,
        })
    }

    /// `value` times the factor, saturating; a level that large is refused.
    #[inline(always)]
    fn of(self, value: i32) -> i32 {
        let high = ((i64::from(value) * i64::from(self.mantissa)) >> 32) as i32;
        match self.places.checked_sub(32) {
            Some(down) => high >> down,
            None => {
                let up = 32 - self.places;
                let whole = high << up;
                if whole >> up == high { whole } else { i32::MAX }
            }
        }
    }
}

/// What a pickup hears of a pluck.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
enum Heard {
    /// a_n = strength · sin · sin / (n² (1 + B n²)).
    Displacement,
    /// v_n = strength · sin · sin per frame, the same for all n.
    Velocity,
}

/// A pluck of finite width and the pickup that hears it, in integers: the
/// twin of [`RoundedPluck`] with [`DisplacementPickup`] or [`VelocityPickup`].
/// A tip or an aperture wider than the string is taken as wide as the string.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct PluckSpec {
    place: Place,
    pickup_place: Place,
    /// Half of the width of the tip, as a fraction of the length, Q32.
    tip_q32: u32,
    /// The same of the pickup's aperture.
    aperture_q32: u32,
    heard: Heard,
    strength: Strength,
}

impl PluckSpec {
    /// `pluck` as heard by a displacement pickup; `full_scale` as in
    /// [`crate::Onset::prepare`]. Floating point, for set-up time.
    ///
    /// # Errors
    /// `full_scale` outside [`bounds::FULL_SCALE`]; a strength outside
    /// [`PLUCK_STRENGTH`]; [`Error::NoIntegerForm`] for another tip than
    /// [`Tip::Even`].
    pub fn displacement(
        string: &StringSpec,
        pluck: &RoundedPluck,
        pickup: &DisplacementPickup,
        full_scale: f64,
    ) -> Result<Self> {
        bounds::FULL_SCALE.check(full_scale)?;
        check_tip(pluck)?;
        let strength = Strength::new(strength_m(pluck) / full_scale)?;
        let listening = (pickup.place(), pickup.aperture_m());
        Ok(Self::new(
            string,
            pluck,
            listening,
            Heard::Displacement,
            strength,
        ))
    }

    /// `pluck` as heard by a velocity pickup at `sample_rate_hz`.
    ///
    /// # Errors
    /// As [`PluckSpec::displacement`], and a sample rate outside
    /// [`bounds::SAMPLE_RATE_HZ`].
    pub fn velocity(
        string: &StringSpec,
        pluck: &RoundedPluck,
        pickup: &VelocityPickup,
        sample_rate_hz: f64,
        full_scale: f64,
    ) -> Result<Self> {
        bounds::FULL_SCALE.check(full_scale)?;
        bounds::SAMPLE_RATE_HZ.check(sample_rate_hz)?;
        check_tip(pluck)?;
        // u̇ = −ω₀² a, and ω₀²/(n² (1 + B n²)) is that of mode 1 without stiffness.
        let angular = 2.0 * PI * string.ideal_fundamental_hz();
        let step = strength_m(pluck) * angular * angular / (full_scale * sample_rate_hz);
        let listening = (pickup.place(), pickup.aperture_m());
        let strength = Strength::new(-step)?;
        Ok(Self::new(
            string,
            pluck,
            listening,
            Heard::Velocity,
            strength,
        ))
    }

    fn new(
        string: &StringSpec,
        pluck: &RoundedPluck,
        (pickup_place, aperture_m): (f64, f64),
        heard: Heard,
        strength: Strength,
    ) -> Self {
        let q32 = |fraction: f64| libm::rint(fraction * 4_294_967_296.0) as u32;
        // At most the whole string: φ stays below π/2.
        let half = |width_m: f64| q32((0.5 * width_m / string.length_m()).min(0.5));
        Self {
            place: Place::from_q32(q32(pluck.place())),
            pickup_place: Place::from_q32(q32(pickup_place)),
            tip_q32: half(pluck.width_m()),
            aperture_q32: half(aperture_m),
            heard,
            strength,
        }
    }

    /// The same pluck at another place; its strength stays.
    #[must_use]
    pub const fn at(self, place: Place) -> Self {
        Self { place, ..self }
    }

    /// The same pluck, `gain` times as strong.
    #[must_use]
    pub const fn scaled(self, gain: Gain) -> Self {
        let strength = Strength {
            mantissa: gain.apply(self.strength.mantissa),
            ..self.strength
        };
        Self { strength, ..self }
    }

    pub(super) fn start(&self, angle_q56: u64) -> Start {
        Start {
            place: self.place.sines(),
            pickup: self.pickup_place.sines(),
            tip: Width::new(self.tip_q32),
            aperture: Width::new(self.aperture_q32),
            heard: self.heard,
            strength: self.strength,
            first: Normalised::new(angle_q56),
        }
    }
}

fn check_tip(pluck: &RoundedPluck) -> Result<()> {
    match pluck.tip() {
        Tip::Even => Ok(()),
        Tip::RaisedCosine => Err(Error::NoIntegerForm {
            start: "a pluck by a raised-cosine tip",
        }),
    }
}

/// 2 h / (π² p (1−p)) in m.
fn strength_m(pluck: &RoundedPluck) -> f64 {
    2.0 * pluck.height_m() / (PI * PI * pluck.place() * (1.0 - pluck.place()))
}

/// The increments of a pluck, mode by mode.
pub(super) struct Start {
    place: Sines,
    pickup: Sines,
    tip: Option<Width>,
    aperture: Option<Width>,
    heard: Heard,
    strength: Strength,
    first: Normalised,
}

impl Start {
    /// The increment of the next mode and a bound of its amplitude, Q31.
    #[inline(always)]
    pub(super) fn next(&mut self, mode: &ModeQ, coefficient: Coefficient) -> (Increment, u32) {
        // sin · sin in Q31, narrowed by the widths.
        let product = i64::from(self.place.step()) * i64::from(self.pickup.step());
        let mut both = (product >> 29).min(i64::from(i32::MAX)) as i32;
        for width in [&mut self.tip, &mut self.aperture].into_iter().flatten() {
            both = width.apply(both, mode.n);
        }
        match self.heard {
            Heard::Displacement => {
                let ratio = self.first.over(mode.squared, mode.places);
                let shape = ((i64::from(both) * i64::from(ratio)) >> 32) as i32;
                displaced(mode, self.strength.of(shape))
            }
            Heard::Velocity => {
                let Strength { mantissa, places } = self.strength;
                // Q47.
                let step = (i64::from(both) * i64::from(mantissa)) >> (places - 16);
                struck(mode, coefficient, step)
            }
        }
    }
}

/// The increment of a mode that starts from rest at `a` (Q31), and a bound of
/// its amplitude.
#[inline(always)]
fn displaced(mode: &ModeQ, a: i32) -> (Increment, u32) {
    // v = a (F/2 − u + s j)/(1 − u), with −u + s j written as
    // (s − u) − s (1 − j); folding turns the sine over. Q35.
    let slack = if mode.decay < GENTLE_Q36 {
        rough_slack(mode.z)
    } else {
        slack(mode.z)
    };
    let slip = i64::from(mul_high(mode.decay, slack));
    let (decay, loss) = (i64::from(mode.decay), i64::from(mode.loss));
    let rest = if mode.folded {
        slip - (decay + loss) / 2
    } else {
        (decay - loss) / 2 - slip
    };
    // To Q(33+S).
    let rest = if mode.shift > 2 {
        rest << (mode.shift - 2)
    } else {
        rest >> (2 - mode.shift)
    };
    // Just below the end of a shift this passes 2^31.
    let step = i64::from(mode.pull / 2) + rest;
    let step = step + ((step * i64::from(grown(mode.loss >> 4))) >> 32);
    let increment = Increment::new(a, (i64::from(a) * step) >> 1);
    // c = s a/θ, and s < θ/4: √(1 + 1/16) is below 33/32. Where s < θ/64,
    // √(1 + 2^−12) is below 1 + 2^−13; s² in Q40 against θ²/8 in Q32.
    let level = a.unsigned_abs();
    let gentle = mul_high(mode.decay, mode.decay) < mode.z >> 1;
    let quadrature = level >> if gentle { 13 } else { 5 };
    (increment, level.saturating_add(quadrature + 4))
}

/// The increment of a mode that starts from zero with `step` per frame (Q47),
/// and a bound of its amplitude.
#[inline(always)]
fn struck(mode: &ModeQ, coefficient: Coefficient, step: i64) -> (Increment, u32) {
    if step.unsigned_abs() >> 48 != 0 {
        // Beyond twice full scale: the level refuses it.
        return (Increment::default(), u32::MAX);
    }
    // v = step j/(1 − u).
    let v = step - (((step >> 16) * i64::from(slack(mode.z))) >> 15);
    let v = v + (((v >> 16) * i64::from(grown(mode.loss >> 4))) >> 16);
    let v = if mode.folded { -v } else { v };
    let amplitude = coefficient.amplitude(mode.shift, 0, v);
    let amplitude = u32::try_from(amplitude).unwrap_or(u32::MAX);
    (Increment::new(0, v << (16 + mode.shift)), amplitude)
}

/// 1/(1 − u) − 1 in Q32, for u up to 1/16.
#[inline(always)]
fn grown(loss_q32: u32) -> u32 {
    let squared = mul_high(loss_q32, loss_q32);
    if loss_q32 < 1 << 22 {
        loss_q32 + squared
    } else {
        let cubed = mul_high(squared, loss_q32);
        let fourth = mul_high(squared, squared);
        loss_q32 + squared + cubed + fourth + mul_high(cubed, squared)
    }
}

/// A number as 32 bits, the highest of them set.
#[derive(Clone, Copy)]
struct Normalised {
    bits: u32,
    /// Its value is `bits` / 2^`places`.
    places: u32,
}

impl Normalised {
    /// A value in Q56.
    fn new(value: u64) -> Self {
        let value = value.max(1);
        let zeros = value.leading_zeros();
        Self {
            bits: ((value << zeros) >> 32) as u32,
            places: 24 + zeros,
        }
    }

    /// This over the larger `bits` / 2^`places`, Q32, saturating just below 1.
    #[inline(always)]
    fn over(self, bits: u32, places: u32) -> u32 {
        let bits = bits.max(1);
        let zeros = bits.leading_zeros();
        let divisor = bits << zeros;
        // 2^48/x to 15 bits by division, then one step of Newton's method.
        let rough = u32::MAX / (divisor >> 16);
        // The product is 2^32 but for what the division cut off.
        let product = ((u64::from(divisor) * u64::from(rough)) >> 16) as u32;
        let missing = product.wrapping_neg().cast_signed();
        let correction = (i64::from(rough) * i64::from(missing)) >> 17;
        // 2^63/divisor.
        let inverse = (i64::from(rough) << 15) + correction;
        let inverse = u32::try_from(inverse).unwrap_or(u32::MAX);
        // self/divisor in Q32 is bits·inverse/2^63 · 2^(32 + places' − places).
        let quotient = mul_high(self.bits, inverse);
        match self.places.checked_sub(places + zeros + 1) {
            Some(down) => quotient.checked_shr(down).unwrap_or(0),
            None => quotient.saturating_mul(2),
        }
    }
}

/// sin θ/θ with θ = n φ: a tip or an aperture of finite width.
struct Width {
    /// φ²/8 in Q40.
    z_q40: u64,
    /// For θ² at or above 8: sin(n φ), and 1/φ in Q24.
    sines: Sines,
    inverse_q24: u64,
}

impl Width {
    fn new(half_q32: u32) -> Option<Self> {
        if half_q32 == 0 {
            return None;
        }
        // π² in Q28, and φ = π · half.
        let squared = u64::from(half_q32) * u64::from(half_q32);
        Some(Self {
            z_q40: ((u128::from(squared) * 2_649_351_758) >> (64 + 28 + 3 - 40)) as u64,
            sines: Place::from_q32(half_q32).sines(),
            inverse_q24: (1 << 54) / ((u64::from(half_q32) * 3_373_259_426) >> 32).max(1),
        })
    }

    #[inline]
    fn apply(&mut self, value: i32, n: u32) -> i32 {
        let sine = self.sines.step();
        let z_q40 = self.z_q40.saturating_mul(u64::from(n) * u64::from(n));
        let factor_q31 = if z_q40 < 1 << 40 {
            (1 << 31) - i64::from(slack((z_q40 >> 8) as u32))
        } else {
            // sine Q30 / n · 1/φ Q24: to Q31.
            (i64::from(sine / n.max(1) as i32) * self.inverse_q24 as i64) >> 23
        };
        ((i64::from(value) * factor_q31) >> 31) as i32
    }
}
