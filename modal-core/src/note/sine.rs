//! sin(n π p) for n = 1, 2, 3, … without a multiplication by n: the same
//! recurrence that sounds a mode, without its loss.

use crate::note::polynomial::{bend, mul_high, slack};

/// π² in Q28.
const PI_SQUARED_Q28: u64 = 2_649_351_758;
/// π in Q30.
const PI_Q30: u64 = 3_373_259_426;

/// A place on the string as a fraction of its length, in integers.
///
/// Where the fraction is a ratio of whole numbers, the modes that have a node
/// there come out exactly zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Place {
    fraction_q32: u32,
    /// Every mode whose index is a multiple of this has a node here.
    nodes_every: u32,
}

impl Place {
    /// The place `fraction_q32` / 2³². Zero is taken as the smallest fraction.
    #[must_use]
    pub const fn from_q32(fraction_q32: u32) -> Self {
        let fraction_q32 = if fraction_q32 == 0 { 1 } else { fraction_q32 };
        // p = odd/2^k: the first node is at n = 2^k.
        let halvings = 32 - fraction_q32.trailing_zeros();
        Self {
            fraction_q32,
            nodes_every: if halvings < 32 {
                1 << halvings
            } else {
                u32::MAX
            },
        }
    }

    /// The place `part` / `whole`: (1, 3) has a node of modes 3, 6, 9, …
    ///
    /// `None` unless 0 < `part` < `whole`.
    #[must_use]
    pub const fn ratio(part: u16, whole: u16) -> Option<Self> {
        if part == 0 || part >= whole {
            return None;
        }
        let (mut a, mut b) = (part, whole);
        while b != 0 {
            (a, b) = (b, a % b);
        }
        Some(Self {
            fraction_q32: (((part as u64) << 32) / whole as u64) as u32,
            nodes_every: (whole / a) as u32,
        })
    }

    /// The fraction in Q32.
    #[must_use]
    pub const fn fraction_q32(&self) -> u32 {
        self.fraction_q32
    }

    /// sin(π p), sin(2 π p), …
    #[must_use]
    pub const fn sines(&self) -> Sines {
        Sines::new(self.fraction_q32, self.nodes_every)
    }
}

/// The sequence of sines, in Q30.
///
/// Off by less than 2^−20 in the first 256 terms (asserted below).
#[derive(Clone, Copy, Debug)]
pub struct Sines {
    q: i32,
    /// v in steps of four units of q, with 32 + shift more places.
    velocity: i64,
    restoring: i32,
    shift: u32,
    /// p > 1/2 runs as 1 − p with every second sign turned: all ones then.
    turning: i32,
    /// All ones where the next term changes its sign.
    turned: i32,
    to_node: u32,
    nodes_every: u32,
}

impl Sines {
    const fn new(fraction_q32: u32, nodes_every: u32) -> Self {
        let folded = fraction_q32 > 1 << 31;
        let fraction = if folded {
            fraction_q32.wrapping_neg()
        } else {
            fraction_q32
        };
        // ψ < π 2^−zeros: room for e below 2, and for the velocity.
        let shift = match fraction.leading_zeros() {
            0 | 1 => 0,
            2 => 1,
            zeros @ 3..=20 => zeros,
            _ => 20,
        };
        // ψ² = π² p² in Q(30+shift), at most π²/4.
        let squared = (fraction as u64 * fraction as u64) >> (30 - shift);
        let squared = ((squared * PI_SQUARED_Q28) >> 32) as u32;
        let z = squared >> (1 + shift);
        // e = f(ψ²); the clamp takes the rounding at p = 1/2.
        let e = squared - mul_high(squared, bend(z));
        let e = if e > 1 << 31 { 1 << 31 } else { e };
        // v at n = 0 is sin ψ = ψ j(ψ²), in Q62 and then in Q28 with
        // 32+shift more places, plus half a place for rounding.
        let angle = fraction as u64 * PI_Q30;
        let sine = angle - (angle >> 31) * slack(z) as u64;
        let velocity = if shift < 2 {
            sine >> (2 - shift)
        } else {
            sine << (shift - 2)
        };
        Self {
            q: 0,
            velocity: velocity as i64 + (1 << (31 + shift)),
            restoring: -(e as i64) as i32,
            shift,
            turning: if folded { -1 } else { 0 },
            turned: 0,
            to_node: nodes_every,
            nodes_every,
        }
    }

    /// The sine of the next multiple, Q30.
    #[inline(always)]
    pub const fn step(&mut self) -> i32 {
        self.velocity = self
            .velocity
            .wrapping_add(self.restoring as i64 * self.q as i64);
        let moved = ((self.velocity >> 32) as i32) >> self.shift;
        self.q = self.q.wrapping_add(moved << 2);
        let sine = (self.q ^ self.turned).wrapping_sub(self.turned);
        self.turned ^= self.turning;
        self.to_node = self.to_node.wrapping_sub(1);
        if self.to_node == 0 {
            self.to_node = self.nodes_every;
            return 0;
        }
        sine
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::maths::sin_pi;

    #[test]
    fn sines_follow_the_function() {
        let mut worst = 0.0_f64;
        let mut fraction = 1_u32;
        for step in 0..3_000_u32 {
            // All magnitudes, both halves, and the exact dyadic places.
            fraction = fraction.wrapping_mul(2_891_336_453).wrapping_add(step);
            for place in [fraction, fraction >> (step % 24), 1 << (8 + step % 24)] {
                let place = Place::from_q32(place);
                let p = f64::from(place.fraction_q32()) / 2.0_f64.powi(32);
                let mut sines = place.sines();
                for n in 1..=256 {
                    let exact = sin_pi(f64::from(n) * p);
                    let error = f64::from(sines.step()) / 2.0_f64.powi(30) - exact;
                    worst = worst.max(error.abs());
                }
            }
        }
        assert!(worst < 2.0_f64.powi(-20), "{:e}", worst);
    }

    #[test]
    fn nodes_are_exactly_zero() {
        for (part, whole) in [(1, 2), (1, 3), (2, 6), (5, 7), (3, 8), (999, 1_000)] {
            let mut sines = Place::ratio(part, whole).unwrap().sines();
            let reduced = whole / if part == 2 { 2 } else { 1 };
            for n in 1..=2_000_u32 {
                assert_eq!(
                    sines.step() == 0,
                    n % u32::from(reduced) == 0,
                    "{part}/{whole} {n}"
                );
            }
        }
        assert_eq!(Place::ratio(0, 3), None);
        assert_eq!(Place::ratio(3, 3), None);
    }
}
