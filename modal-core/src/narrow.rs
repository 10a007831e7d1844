//! A bank for cores without a long multiply (Cortex-M0, M0+), where the exact
//! one costs about a hundred instructions for every mode and frame.
//!
//! ```text
//! v ← v − e q        with e as 16 bits and a shift, q split in two halves
//! q ← q + v
//! ```
//!
//! and once in 32 frames both lose what the mode loses in that time. All in 32
//! bits: e has 16 bits and takes turns between two neighbours, 32 frames each,
//! so that its mean is right; decays move in steps; v is cut off at the last
//! place of q. The tests measure the errors: below the noise of a 12-bit
//! converter.

use heapless::Vec;

use crate::bank::{Coefficient, Group, Increment, ModeBank, forms};
use crate::fixed::{FULL_SCALE_Q31, Gain};
use crate::quantise::{Coefficients, Onset};

/// Frames between two steps of the decay.
const STEP: usize = 32;

/// A factor below 2 as 16 significant bits: `mantissa` / 2^`places`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
struct Factor {
    mantissa: u16,
    /// 16 more bits of the mantissa.
    fraction: u16,
    /// 15 to 47.
    places: u8,
}

impl Factor {
    /// `bits` / 2^`places`.
    const fn new(bits: u32, places: u32) -> Self {
        let zeros = bits.leading_zeros() & 31;
        let normalised = bits << zeros;
        Self {
            mantissa: (normalised >> 16) as u16,
            fraction: normalised as u16,
            places: (places + zeros - 16) as u8,
        }
    }

    /// The mantissa alone, one up if `up`.
    #[inline(always)]
    const fn times(self, up: u32, value: i32) -> i32 {
        // At most 2^16.
        let mantissa = self.mantissa as u32 + up;
        let low = (((value as u32) & 0xFFFF) * mantissa) >> 16;
        let high = (value >> 16).wrapping_mul(mantissa as i32);
        let product = high.wrapping_add(low as i32);
        if self.places >= 16 {
            product >> (self.places - 16)
        } else {
            product << 1
        }
    }
}

/// One mode.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
struct NarrowMode {
    /// Displacement as heard, Q31.
    q: i32,
    /// `q[n] − q[n−1]`, Q31.
    v: i32,
    restoring: Factor,
    /// What the mean of the mantissas used so far lacks, Q16.
    owed: u16,
    /// 1 − r³².
    loss: Factor,
    folded: bool,
}

impl NarrowMode {
    const fn at_rest() -> Self {
        Self {
            q: 0,
            v: 0,
            restoring: Factor::new(0, 32),
            owed: 0,
            loss: Factor::new(0, 32),
            folded: false,
        }
    }

    fn tune(&mut self, coefficient: Coefficient, form: Group) {
        if self.folded != form.folded {
            self.v = self.q.wrapping_mul(2).wrapping_sub(self.v);
        }
        self.folded = form.folded;
        self.restoring = undamped(coefficient, form.shift);
        // r² = 1 − k, four times squared: r³².
        let mut kept = u64::from(coefficient.damping.unsigned_abs().wrapping_neg());
        for _ in 0..4 {
            kept = (kept * kept) >> 32;
        }
        self.loss = Factor::new((kept as u32).wrapping_neg(), 32);
    }

    /// Adds `q` and `v` of a damped start.
    ///
    /// Within a step this mode does not decay: v is turned to what an undamped
    /// mode of the same phase has, v + (1−r)(q − v), and both are taken half a
    /// step down, so that the stairs lie around the true decay.
    fn add(&mut self, q: i32, v: i32) {
        let v = v.wrapping_add(self.loss.times(0, q.wrapping_sub(v)) / STEP as i32);
        let (q, v) = (q - self.loss.times(0, q) / 2, v - self.loss.times(0, v) / 2);
        self.q = self.q.wrapping_add(q);
        self.v = self.v.wrapping_add(v);
    }

    /// Upper bound of the amplitude, Q31, if e becomes `restoring`.
    fn amplitude(&self, restoring: Factor, folded: bool) -> u64 {
        let v = if folded == self.folded {
            i64::from(self.v)
        } else {
            2 * i64::from(self.q) - i64::from(self.v)
        };
        // e in Q(32+S), with the largest S up to 10 that it fits.
        let shift = (i32::from(restoring.places) - 17).min(10);
        let bits = (u32::from(restoring.mantissa) << 16) | u32::from(restoring.fraction);
        let e = bits >> (i32::from(restoring.places) - 16 - shift);
        let coefficient = Coefficient {
            damping: 0,
            restoring: e.wrapping_neg() as i32,
        };
        let shift = shift as i8;
        coefficient.amplitude(shift, self.q, v << 16)
    }

    fn render(&mut self, frames: &mut [i32]) {
        let (mut q, mut v) = (self.q, self.v);
        let restoring = self.restoring;
        let owed = u32::from(self.owed) + u32::from(restoring.fraction);
        self.owed = owed as u16;
        let up = owed >> 16;
        for pair in frames.chunks_exact_mut(2) {
            if let [even, odd] = pair {
                *even = even.wrapping_add(q);
                v = v.wrapping_sub(restoring.times(up, q));
                q = q.wrapping_add(v);
                *odd = if self.folded {
                    odd.wrapping_sub(q)
                } else {
                    odd.wrapping_add(q)
                };
                v = v.wrapping_sub(restoring.times(up, q));
                q = q.wrapping_add(v);
            }
        }
        self.q = q - self.loss.times(0, q);
        self.v = v - self.loss.times(0, v);
    }
}

/// The step `q[n] − q[n−1]` of an increment made for `form`, Q31.
fn step_of(increment: &Increment, form: Group, folded: bool) -> i32 {
    let v = (increment.velocity() >> (32 + form.shift)) as i32;
    if folded == form.folded {
        v
    } else {
        increment.q.wrapping_mul(2).wrapping_sub(v)
    }
}

/// e of the same pitch without loss: (e − u²)/(1 − u) with u = 1 − r.
fn undamped(coefficient: Coefficient, shift: i8) -> Factor {
    let k = u64::from(coefficient.damping.unsigned_abs());
    let u = (k >> 1) + ((k * k) >> 35);
    let squared = u * u;
    let e = u64::from(coefficient.restoring.unsigned_abs());
    let e = e.saturating_sub(squared >> (32 - shift));
    let grown = e + ((e * (u + (squared >> 32))) >> 32);
    Factor::new(
        grown.min(u64::from(u32::MAX)) as u32,
        (32 + i32::from(shift)) as u32,
    )
}

/// Up to `M` modes for a core without a long multiply; see the module.
///
/// Blocks are whole numbers of 32 frames; what is left over is not rendered.
#[derive(Clone, Debug)]
pub struct NarrowBank<const M: usize> {
    modes: Vec<NarrowMode, M>,
    at_rest: bool,
}

impl<const M: usize> ModeBank<M> for NarrowBank<M> {
    /// |v| reaches 1.42 times the amplitude and has 32 bits: 0.7 of full scale.
    const HIGHEST_CEILING_Q31: u32 = FULL_SCALE_Q31 / 10 * 7;

    /// Cutting e q off below pushes q by half a unit a frame: it swings by up to
    /// 1/e units around its rest.
    fn further_reserve(coefficients: &Coefficients<M>) -> u64 {
        let modes = coefficients.as_slice().iter();
        modes
            .zip(forms(coefficients.groups()))
            .map(|(coefficient, form)| {
                let e = u64::from(coefficient.restoring.unsigned_abs().max(1));
                (1_u64 << (32 + form.shift)) / e + 1
            })
            .sum()
    }

    fn at_rest(coefficients: &Coefficients<M>) -> Self {
        let mut bank = Self {
            modes: Vec::new(),
            at_rest: true,
        };
        bank.retune(coefficients);
        bank
    }

    fn modes(&self) -> usize {
        self.modes.len()
    }

    fn clear(&mut self) {
        for mode in &mut self.modes {
            (mode.q, mode.v) = (0, 0);
        }
        self.at_rest = true;
    }

    fn is_at_rest(&self) -> bool {
        self.at_rest
    }

    fn add(&mut self, onset: &Onset<M>, gain: Gain) {
        let increments = onset.increments().iter().zip(forms(onset.groups()));
        for (mode, (increment, form)) in self.modes.iter_mut().zip(increments) {
            let increment = increment.scaled(gain);
            let v = step_of(&increment, form, mode.folded);
            mode.add(increment.q, v);
        }
        self.at_rest = false;
    }

    fn level_of(&self, onset: &Onset<M>) -> u64 {
        let increments = onset.increments().iter().zip(forms(onset.groups()));
        self.modes
            .iter()
            .zip(increments)
            .map(|(mode, (increment, form))| {
                let mut added = NarrowMode {
                    q: 0,
                    v: 0,
                    ..*mode
                };
                added.add(increment.q, step_of(increment, form, mode.folded));
                added.amplitude(mode.restoring, mode.folded)
            })
            .fold(0, u64::saturating_add)
    }

    fn scale(&mut self, gain: Gain) {
        for mode in &mut self.modes {
            mode.q = gain.apply(mode.q);
            mode.v = gain.apply(mode.v);
        }
    }

    fn retune(&mut self, coefficients: &Coefficients<M>) {
        let new = coefficients.as_slice();
        self.modes.truncate(new.len());
        while self.modes.len() < new.len() {
            // Coefficients are at most M, as prepared.
            let _ = self.modes.push(NarrowMode::at_rest());
        }
        let tuned = new.iter().zip(forms(coefficients.groups()));
        for (mode, (&coefficient, form)) in self.modes.iter_mut().zip(tuned) {
            mode.tune(coefficient, form);
        }
    }

    fn level(&self, coefficients: Option<&Coefficients<M>>) -> u64 {
        let sum = |sum: u64, amplitude: u64| sum.saturating_add(amplitude);
        match coefficients {
            None => {
                let own = |mode: &NarrowMode| mode.amplitude(mode.restoring, mode.folded);
                self.modes.iter().map(own).fold(0, sum)
            }
            Some(other) => {
                let tuned = other.as_slice().iter().zip(forms(other.groups()));
                let all = self.modes.iter().zip(tuned);
                all.map(|(mode, (&coefficient, form))| {
                    mode.amplitude(undamped(coefficient, form.shift), form.folded)
                })
                .fold(0, sum)
            }
        }
    }

    fn render<const B: usize>(&mut self, block: &mut [i32; B]) {
        for frames in block.chunks_exact_mut(STEP) {
            for mode in &mut self.modes {
                mode.render(frames);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{DisplacementPickup, ModeSeries, PointPluck, StringSpec, TwoT60, Voice, plan};

    /// Error in dB of full scale over the first second, and the worst pitch
    /// error in cent, against the closed form.
    fn measure(pitch_hz: f64, length_m: f64) -> (f64, f64) {
        const RATE_HZ: f64 = 48_000.0;
        let string = StringSpec::tuned(length_m, pitch_hz, 4.0e-3, 1.0e-4).unwrap();
        let loss = TwoT60::new(100.0, 6.0, 5_000.0, 0.8).unwrap();
        let series = ModeSeries::new(string, loss);
        let pluck = PointPluck::new(0.13, 2.0e-3).unwrap();
        let pickup = DisplacementPickup::new(0.21, 0.0).unwrap();
        let coefficients = Coefficients::<64>::prepare(&series, 64, RATE_HZ, 0.25).unwrap();
        let modes = coefficients.modes() as u32;
        let full_scale = plan::l1_bound(&series, &pluck, &pickup, modes).unwrap() / 0.24;
        let onset = Onset::prepare(&coefficients, &series, &pluck, &pickup, full_scale).unwrap();
        let mut voice = Voice::<64, NarrowBank<64>>::with_bank(&coefficients).unwrap();
        let _ = voice.superpose(&onset);

        let mut closed = [(0.0, 0.0, 0.0, 0.0); 64];
        for (slot, n) in closed.iter_mut().zip(1..=modes) {
            let (mode, state) = plan::heard(&series, &pluck, &pickup, n).unwrap();
            let (a, c) = (
                state.displacement / full_scale,
                state.quadrature(&mode) / full_scale,
            );
            *slot = (a, c, mode.damped_angular(), mode.decay_rate_per_s());
        }
        let mut power = 0.0;
        for block in 0..1_500 {
            let mut frames = [0; 32];
            voice.render(&mut frames);
            for (index, &frame) in frames.iter().enumerate() {
                let t = f64::from(block * 32 + index as i32) / RATE_HZ;
                let exact: f64 = closed
                    .iter()
                    .map(|&(a, c, w, s)| (-s * t).exp() * (a * (w * t).cos() + c * (w * t).sin()))
                    .sum();
                power += (f64::from(frame) / 2.0_f64.powi(31) - exact).powi(2);
            }
        }
        let mut worst_cents = 0.0_f64;
        for (mode, &(_, _, w, _)) in voice.bank().modes.iter().zip(&closed) {
            let mantissa =
                f64::from(mode.restoring.mantissa) + f64::from(mode.restoring.fraction) / 65_536.0;
            let e = mantissa / 2.0_f64.powi(i32::from(mode.restoring.places));
            let angle = 2.0 * (0.5 * e.sqrt()).asin();
            let angle = if mode.folded {
                core::f64::consts::PI - angle
            } else {
                angle
            };
            worst_cents = worst_cents.max((1_200.0 * (angle * RATE_HZ / w).log2()).abs());
        }
        (10.0 * (power / 48_000.0).log10(), worst_cents)
    }

    #[test]
    fn errors_are_as_stated() {
        for (pitch_hz, length_m) in [(31.0, 0.86), (82.4, 0.65), (330.0, 0.65), (1_319.0, 0.3)] {
            let (error_dbfs, cents) = measure(pitch_hz, length_m);
            std::println!("{pitch_hz} Hz: {error_dbfs:.1} dBFS, {cents:.4} cent");
            assert!(error_dbfs < -88.0, "{pitch_hz}: {error_dbfs}");
            assert!(cents < 0.001, "{pitch_hz}: {cents}");
        }
    }
}
