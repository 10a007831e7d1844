//! The one door from floating point to fixed point.
//!
//! On this side of the door everything is `f64` through `libm`, which gives
//! the same bits on every target; what comes out is plain integers that a
//! low-priority context can hand to the audio interrupt.

use core::f64::consts::{FRAC_PI_2, LN_2, PI};

use heapless::Vec;

use crate::bank::{Coefficient, FOLDED_SHIFT, Group, Increment, MAX_GROUPS, SHIFTS, forms};
use crate::bounds::{self, Bound};
use crate::error::{Error, Result};
use crate::excitation::Excitation;
use crate::fixed::{FULL_SCALE_Q31, Gain};
use crate::loss::Loss;
use crate::pickup::Pickup;
use crate::plan::{HIGHEST_MODE_OF_SAMPLE_RATE, heard};
use crate::series::{Mode, ModeSeries};

const TWO_POW_31: f64 = 2_147_483_648.0;
const TWO_POW_32: f64 = 4_294_967_296.0;

/// Sum of the mode amplitudes of a start, as a share of digital full scale.
/// Its upper end is the ceiling of the string that the start is meant for.
pub const PLUCK_LEVEL: Bound = Bound {
    name: "pluck level (sum of mode amplitudes)",
    unit: "of full scale",
    min: 0.0,
    max: 1.0,
};

/// Most modes of one string: a group counts its modes in 16 bits.
const MOST_MODES: usize = u16::MAX as usize;

fn refused_level(value: f64, ceiling_q31: u32) -> Error {
    Error::OutOfRange {
        field: PLUCK_LEVEL.name,
        unit: PLUCK_LEVEL.unit,
        value,
        min: PLUCK_LEVEL.min,
        max: f64::from(ceiling_q31) / TWO_POW_31,
    }
}

/// Refuses no modes and more than `capacity`.
pub(crate) fn check_count(modes: u32, capacity: usize) -> Result<()> {
    let capacity = capacity.min(MOST_MODES);
    if modes == 0 || modes as usize > capacity {
        return Err(Error::Count {
            field: "modes",
            wanted: modes,
            capacity: capacity as u32,
        });
    }
    Ok(())
}

/// The exact sampled form of one mode, as its state is held (see [`Group`]:
/// a folded mode moves at π − θ).
struct Sampled {
    /// 1 − r, with r = e^(−σ T).
    decay: f64,
    /// k = 1 − r².
    damping: f64,
    /// e = (1 − r)² + 4 r sin²(θ/2).
    restoring: f64,
    /// θ = ω_d T, or π less that.
    angle: f64,
    folded: bool,
}

impl Sampled {
    fn new(mode: &Mode, sample_rate_hz: f64) -> Result<Self> {
        let loss = mode.decay_rate_per_s() / sample_rate_hz;
        // Rounded to what the integers hold; it must not vanish.
        let damping = libm::rint(-libm::expm1(-2.0 * loss) * TWO_POW_32).max(1.0) / TWO_POW_32;
        if damping > 0.5 {
            return Err(Error::OutOfRange {
                field: "decay rate at this sample rate",
                unit: "1/s",
                value: mode.decay_rate_per_s(),
                min: bounds::DECAY_RATE.min,
                max: 0.5 * LN_2 * sample_rate_hz,
            });
        }
        // The pitch is computed for the decay that the integers really have.
        let r = libm::sqrt(1.0 - damping);
        let decay = damping / (1.0 + r);
        let heard_angle = mode.damped_angular() / sample_rate_hz;
        let folded = heard_angle > FRAC_PI_2;
        let angle = if folded {
            PI - heard_angle
        } else {
            heard_angle
        };
        let half = libm::sin(0.5 * angle);
        Ok(Self {
            decay,
            damping,
            restoring: decay * decay + 4.0 * r * half * half,
            angle,
            folded,
        })
    }

    fn r(&self) -> f64 {
        1.0 - self.decay
    }

    /// `v[0] = q[0] − q[−1]` of a mode with displacement `a` and quadrature `c`
    /// (the amplitude of its sine part) at frame 0, without cancellation:
    /// (a (2 sin²(θ/2) − (1 − r)) + c sin θ) / r. Folding turns the sine over.
    fn velocity(&self, a: f64, c: f64) -> f64 {
        let half = libm::sin(0.5 * self.angle);
        let c = if self.folded { -c } else { c };
        (a * (2.0 * half * half - self.decay) + c * libm::sin(self.angle)) / self.r()
    }

    /// Largest scale shift with |v|·2^S < 1 for amplitudes up to `ceiling`
    /// (|v| ≤ A √e / r) and e·2^S < 1/2, so that both fit in 32 bits.
    fn shift(&self, ceiling: f64) -> i8 {
        let speed = ceiling * libm::sqrt(self.restoring) / self.r();
        let fits = |&shift: &i8| scale(shift) * speed < 1.0 && scale(shift) * self.restoring < 0.5;
        // e < 2 below a quarter of the sample rate, and ceiling <= 1: the last
        // shift always fits.
        SHIFTS.into_iter().find(fits).unwrap_or(FOLDED_SHIFT)
    }

    /// Most that rounding can add up to in this mode's amplitude, in units of q:
    /// half a step of q a frame, times √e/sin θ for its amplitude, summed over
    /// all the past, 1/(1 − r); and half a step of v for what damping takes of
    /// the rounded velocity, which sums to (1 + r)/sin θ.
    fn rounding_reserve(&self, shift: i8) -> f64 {
        let step = scale((-shift).max(0));
        let summed = libm::sqrt(self.restoring) / self.decay + 1.0 + self.r();
        0.5 * step * summed / libm::sin(self.angle)
    }
}

/// 2^`shift`.
fn scale(shift: i8) -> f64 {
    libm::ldexp(1.0, i32::from(shift))
}

/// Tells sets of coefficients apart: 64 bits mixed from all of them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct Fingerprint(u32, u32);

impl Fingerprint {
    fn of(coefficients: &[Coefficient]) -> Self {
        let mix = |sum: u32, part: i32| sum.rotate_left(7).wrapping_add(part.cast_unsigned());
        coefficients.iter().fold(Self(0, 0), |sum, one| {
            Self(mix(sum.0, one.restoring), mix(sum.1, one.damping))
        })
    }
}

/// What a string sounds like, in integers: coefficients of up to `M` modes.
///
/// A plain value of 8 bytes a mode: one context prepares it and hands it to
/// another.
#[derive(Clone, Debug, PartialEq)]
pub struct Coefficients<const M: usize> {
    pub(crate) coefficients: Vec<Coefficient, M>,
    pub(crate) groups: Vec<Group, MAX_GROUPS>,
    /// The stated share of digital full scale, Q31.
    pub(crate) share: u32,
    /// Most that the amplitudes of all modes may sum to, Q31: the share less the
    /// reserve for rounding.
    pub(crate) ceiling: u32,
    /// 1 − r of the mode that decays slowest, Q64, rounded down.
    pub(crate) slowest_decay_q64: u64,
    pub(crate) fingerprint: Fingerprint,
    sample_rate_hz: f64,
}

impl<const M: usize> Coefficients<M> {
    /// Quantises modes 1 to `modes` of `series` for `sample_rate_hz`.
    ///
    /// Modes at or above 0.45 of the sample rate are left out. `ceiling` is the
    /// share of digital full scale (0 to 1) that this string may fill; the
    /// ceilings of all strings of an instrument may sum to 1.
    ///
    /// Frequencies are off by less than 2^(−33−S)/(2e) of themselves and decay
    /// rates by less than 2^(−33)/k, with k, e and S of [`crate::bank`].
    ///
    /// # Errors
    /// [`Error::Count`] for no modes or more than `M`; a value outside
    /// [`bounds::SAMPLE_RATE_HZ`] or [`bounds::CEILING`]; a first mode at or
    /// above 0.45 of the sample rate; a mode that decays too fast for the
    /// sample rate, or modes that decay so slowly that the reserve for rounding
    /// would take half of the ceiling; errors of [`ModeSeries::mode`].
    pub fn prepare<L: Loss>(
        series: &ModeSeries<L>,
        modes: u32,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> Result<Self> {
        bounds::SAMPLE_RATE_HZ.check(sample_rate_hz)?;
        bounds::CEILING.check(ceiling)?;
        check_count(modes, M)?;
        let limit_hz = HIGHEST_MODE_OF_SAMPLE_RATE * sample_rate_hz;
        let below = series.modes_below(limit_hz);
        if below == 0 {
            return Err(Error::OutOfRange {
                field: "frequency of mode 1 at this sample rate",
                unit: "Hz",
                value: series.frequency_hz(1),
                min: bounds::FREQUENCY_HZ.min,
                max: limit_hz,
            });
        }

        let mut coefficients = Vec::new();
        let mut groups: Vec<Group, MAX_GROUPS> = Vec::new();
        let count = modes.min(below);
        let sample = |n: u32| Sampled::new(&series.mode(n)?, sample_rate_hz);
        let mut shift = SHIFTS[0];
        let (mut reserve, mut slowest_decay) = (0.0, 1.0_f64);
        let mut sampled = sample(1)?;
        for n in 1..=count {
            let next = if n < count {
                Some(sample(n + 1)?)
            } else {
                None
            };
            // Two modes run side by side and share the lower shift. Shifts never
            // rise again, which bounds the groups.
            let opens_a_pair = n % 2 == 1;
            let partner = next.as_ref().filter(|next| opens_a_pair && !next.folded);
            shift = if sampled.folded {
                FOLDED_SHIFT
            } else {
                shift
                    .min(sampled.shift(ceiling))
                    .min(partner.unwrap_or(&sampled).shift(ceiling))
            };
            let form = Group {
                shift,
                folded: sampled.folded,
                modes: 1,
            };
            match groups.last_mut() {
                Some(group) if group.matches(&form) => group.modes += 1,
                // No more groups than falling shifts and the folded one.
                _ => {
                    let _ = groups.push(form);
                }
            }
            let restoring = libm::rint(sampled.restoring * TWO_POW_32 * scale(shift));
            // Room for `modes` <= M was checked.
            let _ = coefficients.push(Coefficient {
                damping: -(sampled.damping * TWO_POW_32) as i32,
                restoring: -restoring as i32,
            });
            reserve += sampled.rounding_reserve(shift);
            slowest_decay = slowest_decay.min(sampled.decay);
            if let Some(next) = next {
                sampled = next;
            }
        }

        Self::from_integers(
            coefficients,
            groups,
            (ceiling * f64::from(FULL_SCALE_Q31)) as u64,
            // A cast saturates.
            libm::ceil(reserve) as u64,
            (slowest_decay * TWO_POW_32 * TWO_POW_32) as u64,
            sample_rate_hz,
        )
    }

    /// Takes the `reserve` for rounding (Q31) off the `ceiling`.
    pub(crate) fn from_integers(
        coefficients: Vec<Coefficient, M>,
        groups: Vec<Group, MAX_GROUPS>,
        ceiling: u64,
        reserve: u64,
        slowest_decay_q64: u64,
        sample_rate_hz: f64,
    ) -> Result<Self> {
        if reserve > ceiling / 2 {
            return Err(Error::OutOfRange {
                field: "reserve for the rounding of slow modes",
                unit: "of full scale",
                value: reserve as f64 / TWO_POW_31,
                min: 0.0,
                max: ceiling as f64 / (2.0 * TWO_POW_31),
            });
        }
        Ok(Self {
            fingerprint: Fingerprint::of(&coefficients),
            coefficients,
            groups,
            // At most full scale in Q31.
            share: ceiling as u32,
            ceiling: (ceiling - reserve) as u32,
            slowest_decay_q64,
            sample_rate_hz,
        })
    }

    /// Number of modes that are computed.
    #[must_use]
    pub fn modes(&self) -> usize {
        self.coefficients.len()
    }

    /// The integers of each mode, by rising frequency.
    #[must_use]
    pub fn as_slice(&self) -> &[Coefficient] {
        &self.coefficients
    }

    /// The runs of modes of equal scale shift, in the order of the modes.
    #[must_use]
    pub fn groups(&self) -> &[Group] {
        &self.groups
    }

    /// The share of digital full scale that was stated, Q31.
    #[must_use]
    pub fn share_q31(&self) -> u32 {
        self.share
    }

    /// Most that the amplitudes of all modes may sum to, Q31: the share less the
    /// reserve for rounding.
    #[must_use]
    pub fn ceiling_q31(&self) -> u32 {
        self.ceiling
    }

    /// The sample rate in Hz that the coefficients are made for.
    #[must_use]
    pub fn sample_rate_hz(&self) -> f64 {
        self.sample_rate_hz
    }
}

/// A prepared start: what a pluck or strike adds to the state of each mode.
///
/// A plain value of 12 bytes a mode. It may be added while the voice has other
/// coefficients than it was prepared with (a muted string, say).
#[derive(Clone, Debug, PartialEq)]
pub struct Onset<const M: usize> {
    increments: Vec<Increment, M>,
    groups: Vec<Group, MAX_GROUPS>,
    made_with: Fingerprint,
    level: u32,
}

impl<const M: usize> Onset<M> {
    /// Quantises `excitation` as heard by `pickup`.
    ///
    /// `full_scale` is the heard output (m for displacement, m/s for velocity)
    /// that is digital full scale; [`crate::plan::l1_bound`] of the hardest
    /// pluck, divided by the ceiling, is the smallest that always fits.
    ///
    /// # Errors
    /// `full_scale` outside [`bounds::FULL_SCALE`]; a sum of mode amplitudes
    /// above the ceiling of `coefficients`, taken from the integers and by up to
    /// 2^−12 too high; errors of [`ModeSeries::mode`].
    pub fn prepare<L: Loss>(
        coefficients: &Coefficients<M>,
        series: &ModeSeries<L>,
        excitation: &impl Excitation,
        pickup: &impl Pickup,
        full_scale: f64,
    ) -> Result<Self> {
        bounds::FULL_SCALE.check(full_scale)?;
        let mut increments = Vec::new();
        let mut level = 0_u64;
        let modes = coefficients.coefficients.iter();
        for (n, (&coefficient, form)) in (1..).zip(modes.zip(forms(&coefficients.groups))) {
            let (mode, state) = heard(series, excitation, pickup, n)?;
            let a = state.displacement / full_scale;
            let c = state.quadrature(&mode) / full_scale;
            if !(a.is_finite() && c.is_finite()) {
                return Err(refused_level(libm::hypot(a, c), coefficients.ceiling));
            }
            let sampled = Sampled::new(&mode, coefficients.sample_rate_hz)?;
            let velocity = sampled.velocity(a, c) * TWO_POW_31 * TWO_POW_32 * scale(form.shift);
            // Casts saturate; the level refuses whatever would not fit.
            let increment = Increment::new(
                libm::rint(a * TWO_POW_31) as i32,
                libm::rint(velocity) as i64,
            );
            let _ = increments.push(increment);
            // What the integers will do, and not what `series` says of them.
            let amplitude = increment.amplitude(form, coefficient, form);
            level = level.saturating_add(amplitude);
            // A displacement that was cut off must not hide its size.
            if libm::fabs(a) >= 1.0 {
                return Err(refused_level(libm::fabs(a), coefficients.ceiling));
            }
        }
        Self::from_integers(increments, level, coefficients)
    }

    /// Refuses a `level` (Q31) above the ceiling of `coefficients`.
    pub(crate) fn from_integers(
        increments: Vec<Increment, M>,
        level: u64,
        coefficients: &Coefficients<M>,
    ) -> Result<Self> {
        if level > u64::from(coefficients.ceiling) {
            let share = level as f64 / TWO_POW_31;
            return Err(refused_level(share, coefficients.ceiling));
        }
        Ok(Self {
            increments,
            groups: coefficients.groups.clone(),
            made_with: coefficients.fingerprint,
            level: level as u32,
        })
    }

    /// What is added to each mode, by rising frequency.
    #[must_use]
    pub fn increments(&self) -> &[Increment] {
        &self.increments
    }

    /// The groups that the increments are made for.
    #[must_use]
    pub fn groups(&self) -> &[Group] {
        &self.groups
    }

    /// The coefficients that the start is made with.
    pub(crate) fn made_with(&self) -> Fingerprint {
        self.made_with
    }

    /// Bound of the sum of the amplitudes that are added to a voice with the
    /// coefficients that the start is made with, Q31.
    #[must_use]
    pub fn level_q31(&self) -> u32 {
        self.level
    }

    /// The same start, `gain` times as strong.
    #[must_use]
    pub fn scaled(&self, gain: Gain) -> Self {
        Self {
            increments: self.increments.iter().map(|one| one.scaled(gain)).collect(),
            groups: self.groups.clone(),
            made_with: self.made_with,
            // Rounding can add one unit to each mode.
            level: gain
                .apply_level(self.level)
                .saturating_add(self.increments.len() as u32),
        }
    }
}
