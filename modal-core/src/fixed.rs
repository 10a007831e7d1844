//! Fixed-point formats. A table of all of them is in `docs/fixed-point.md`.

/// Digital full scale: one less than 1.0 in Q31.
pub const FULL_SCALE_Q31: u32 = i32::MAX as u32;

/// A gain from 0 to 1 in Q15 (32,768 is unity).
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Gain(u16);

impl Gain {
    /// No change.
    pub const UNITY: Self = Self(1 << 15);
    /// Silence.
    pub const ZERO: Self = Self(0);

    /// `q15` / 32,768; larger values mean unity.
    #[must_use]
    pub const fn from_q15(q15: u16) -> Self {
        if q15 > Self::UNITY.0 {
            Self::UNITY
        } else {
            Self(q15)
        }
    }

    /// The gain in Q15.
    #[must_use]
    pub const fn q15(self) -> u16 {
        self.0
    }

    /// `value` times the gain, rounded to nearest.
    #[must_use]
    pub const fn apply(self, value: i32) -> i32 {
        if self.0 == Self::UNITY.0 {
            return value;
        }
        // |value·gain| <= 2^46; the shifted result is no larger than `value`.
        ((value as i64 * self.0 as i64 + (1 << 14)) >> 15) as i32
    }

    /// A 64-bit `value` times the gain, rounded towards minus infinity.
    #[must_use]
    pub const fn apply_wide(self, value: i64) -> i64 {
        if self.0 == Self::UNITY.0 {
            return value;
        }
        // Split so that nothing overflows: value = high·2^15 + low.
        let (high, low) = (value >> 15, value & 0x7FFF);
        high * self.0 as i64 + ((low * self.0 as i64) >> 15)
    }

    /// A level times the gain, rounded up.
    #[must_use]
    pub const fn apply_level(self, level: u32) -> u32 {
        ((level as u64 * self.0 as u64 + 0x7FFF) >> 15) as u32
    }
}

/// Leading 32 bits of `value` (0 only for 0), rounded down, and the even number
/// of places they stand above their value in the lower half.
const fn leading(value: u64) -> (u32, u32) {
    let zeros = value.leading_zeros() & 62;
    ((value.wrapping_shl(zeros) >> 32) as u32, zeros)
}

/// Square root, from 0 to 2^−15 of itself too small: 32-bit steps only.
pub(crate) const fn root_below(value: u64) -> u64 {
    let (leading, zeros) = leading(value);
    ((leading.isqrt() as u64) << 16) >> (zeros / 2)
}

/// Square root, from 0 to 2^−14 of itself (and two units) too large.
pub(crate) const fn root_above(value: u64) -> u64 {
    let (leading, zeros) = leading(value);
    (((leading.isqrt() as u64 + 1) << 16) >> (zeros / 2)) + 1
}

/// `dividend / divisor`, from 0 to 2^−13 of itself (and one unit) too large;
/// a divisor of 0 is taken as 1.
pub(crate) const fn quotient_above(dividend: u64, divisor: u64) -> u64 {
    let divisor = if divisor == 0 { 1 } else { divisor };
    let above = 64 - dividend.leading_zeros();
    let dividend_shift = above.saturating_sub(31);
    let divisor_shift = (64 - divisor.leading_zeros()).saturating_sub(16);
    let quotient =
        ((dividend >> dividend_shift) as u32 + 1) / (divisor >> divisor_shift) as u32 + 1;
    if dividend_shift >= divisor_shift {
        (quotient as u64) << (dividend_shift - divisor_shift)
    } else {
        ((quotient as u64) >> (divisor_shift - dividend_shift)) + 1
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unity_changes_nothing() {
        for value in [i32::MIN, -1, 0, 1, i32::MAX] {
            assert_eq!(Gain::UNITY.apply(value), value);
        }
        for value in [i64::MIN, -1, 0, 1, i64::MAX] {
            assert_eq!(Gain::UNITY.apply_wide(value), value);
        }
        assert_eq!(Gain::UNITY.apply_level(u32::MAX), u32::MAX);
        assert_eq!(Gain::from_q15(u16::MAX), Gain::UNITY);
    }

    #[test]
    fn half_is_half() {
        let half = Gain::from_q15(1 << 14);
        assert_eq!(half.apply(-7), -3);
        assert_eq!(half.apply_wide(i64::MIN), i64::MIN / 2);
        assert_eq!(half.apply_level(3), 2);
    }
}
