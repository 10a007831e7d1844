//! A pluck and the pickup that hears it, in integers.

use core::f64::consts::PI;

use crate::bank::{Coefficient, FOLDED_SHIFT, Increment};
use crate::bounds::{self, Bound};
use crate::error::Result;
use crate::excitation::RoundedPluck;
use crate::fixed::Gain;
use crate::note::polynomial::{mul_high, slack};
use crate::note::sine::{Place, Sines};
use crate::note::{ModeQ, NoteSpec};
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
    /// [`PLUCK_STRENGTH`].
    pub fn displacement(
        string: &StringSpec,
        pluck: &RoundedPluck,
        pickup: &DisplacementPickup,
        full_scale: f64,
    ) -> Result<Self> {
        bounds::FULL_SCALE.check(full_scale)?;
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

    pub(super) fn start(&self, spec: &NoteSpec) -> Start {
        Start {
            place: self.place.sines(),
            pickup: self.pickup_place.sines(),
            tip: Width::new(self.tip_q32),
            aperture: Width::new(self.aperture_q32),
            heard: self.heard,
            strength: self.strength,
            first: Normalised::new(spec.angle_q60),
        }
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
    #[inline]
    pub(super) fn next(&mut self, mode: &ModeQ, coefficient: Coefficient) -> (Increment, u64) {
        // sin · sin in Q31, narrowed by the widths.
        let mut both =
            ((i64::from(self.place.step()) * i64::from(self.pickup.step())) >> 29) as i32;
        for width in [&mut self.tip, &mut self.aperture].into_iter().flatten() {
            both = width.apply(both, mode.n);
        }
        let shift = mode.form.shift;
        let loss_q32 = (mode.loss_q40 >> 8) as u32;
        let slack_q31 = slack(mode.z);
        let Strength { mantissa, places } = self.strength;
        match self.heard {
            Heard::Displacement => {
                let ratio = self.first.over(mode.squared_q60);
                let shape = (i64::from(both) * i64::from(ratio)) >> 32;
                let a = (shape * i64::from(mantissa)) >> places;
                // v = a (F/2 − u + s j)/(1 − u), with −u + s j written as
                // (s − u) − s (1 − j); folding turns the sine over.
                let slip = ((mode.decay_q40 >> 4) * u64::from(slack_q31)) >> 27;
                let second_order = (mode.decay_q40 - mode.loss_q40) as i64;
                let rest = if mode.form.folded {
                    slip as i64 - (mode.decay_q40 + mode.loss_q40) as i64
                } else {
                    second_order - slip as i64
                };
                let rest = if shift >= 7 {
                    rest << (shift - 7)
                } else {
                    rest >> (7 - shift)
                };
                let step = i64::from(mode.pull / 2) + rest;
                let step = step + ((step * i64::from(grown(loss_q32))) >> 32);
                let level = a.unsigned_abs();
                // Too strong a pluck is refused by its level, not by this clamp.
                let a = a.clamp(i64::from(i32::MIN), i64::from(i32::MAX));
                let increment = Increment::new(a as i32, (a * step) >> 1);
                // c = s a/θ, and s < θ/4 at least: √(1 + 1/16) is below 33/32.
                let quadrature = level >> if mode.gentle { 13 } else { 5 };
                (increment, level + quadrature + 2)
            }
            Heard::Velocity => {
                // v = s_n j/(1 − u), Q47.
                let step_q47 = (i64::from(both) * i64::from(mantissa)) >> (places - 16);
                let v = step_q47 - (((step_q47 >> 16) * i64::from(slack_q31)) >> 15);
                let v = v + (((v >> 16) * i64::from(grown(loss_q32))) >> 16);
                let v = if mode.form.folded { -v } else { v };
                let amplitude = coefficient.amplitude(shift, 0, v);
                (Increment::new(0, v << (16 + shift)), amplitude)
            }
        }
    }
}

/// 1/(1 − u) − 1 in Q32, for u up to 1/16.
#[inline]
fn grown(loss_q32: u32) -> u32 {
    let squared = mul_high(loss_q32, loss_q32);
    let mut sum = loss_q32 + squared;
    if loss_q32 > 1 << 22 {
        let cubed = mul_high(squared, loss_q32);
        let fourth = mul_high(squared, squared);
        sum += cubed + fourth + mul_high(cubed, squared) + mul_high(cubed, cubed);
    }
    sum
}

/// A number as 32 bits, the highest of them set, and where they stood.
#[derive(Clone, Copy)]
struct Normalised {
    bits: u32,
    zeros: u32,
}

impl Normalised {
    #[inline]
    fn new(value: u64) -> Self {
        let value = value.max(1);
        let zeros = value.leading_zeros();
        Self {
            bits: ((value << zeros) >> 32) as u32,
            zeros,
        }
    }

    /// This over `larger`, Q32, saturating just below 1; off by less than 2^−28.
    #[inline]
    fn over(self, larger: u64) -> u32 {
        let divisor = Self::new(larger);
        // 2^48/x to 15 bits by division, then one step of Newton's method.
        let rough = u32::MAX / (divisor.bits >> 16);
        let product = (u64::from(divisor.bits) * u64::from(rough)) >> 16;
        let inverse = (u64::from(rough) * ((1 << 33) - product)) >> 17;
        let quotient = u64::from(self.bits) * inverse.min(u64::from(u32::MAX));
        let places = 31 + self.zeros.saturating_sub(divisor.zeros);
        u32::try_from(quotient >> places.min(63)).unwrap_or(u32::MAX)
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

const _: () = assert!(FOLDED_SHIFT == -2, "the shifts above fit -2 to 10");
