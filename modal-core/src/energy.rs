//! Energy of modes and of whole starts, and what is left out by stopping at
//! mode N: the numbers that a plan of the number of modes needs.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::Result;
use crate::excitation::ModalState;
use crate::series::Mode;
use crate::string::StringSpec;

/// Energy of a mode in J: (μ L/4)(q̇² + ω₀² q²), since the mass of a mode is half
/// of the string's.
#[must_use]
pub fn mode_energy_j(mode: &Mode, state: &ModalState, string: &StringSpec) -> f64 {
    let mass = string.linear_density_kg_per_m() * string.length_m();
    let swing = mode.angular() * state.displacement;
    0.25 * mass * (state.velocity * state.velocity + swing * swing)
}

/// Energy in J of the ideal triangular pluck of a flexible string:
/// T h²/(2 L p (1−p)).
///
/// # Errors
/// A value outside [`bounds::PLACE`] or [`bounds::PLUCK_HEIGHT_M`].
pub fn pluck_energy_j(string: &StringSpec, place: f64, height_m: f64) -> Result<f64> {
    let p = bounds::PLACE.check(place)?;
    let h = bounds::PLUCK_HEIGHT_M.check(height_m)?;
    Ok(string.tension_n() * h * h / (2.0 * string.length_m() * p * (1.0 - p)))
}

/// Energy in J of a flat strike of `speed_m_per_s` over `width_m`: ½ μ w V².
///
/// # Errors
/// A value outside [`bounds::SPEED_M_PER_S`] or [`bounds::WIDTH_M`].
pub fn strike_energy_j(string: &StringSpec, speed_m_per_s: f64, width_m: f64) -> Result<f64> {
    let v = bounds::SPEED_M_PER_S.check(speed_m_per_s)?;
    let w = bounds::WIDTH_M.check(width_m)?;
    Ok(0.5 * string.linear_density_kg_per_m() * w * v * v)
}

/// What an ideal pluck at a place leaves beyond its first modes. All three are
/// bounds that are never passed, from Σ_{n>N} n^(−s) < ∫_{N+½} x^(−s) dx.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct PluckTail {
    /// Share of the energy: ≤ 2/(π² p (1−p)(N+½)). It is about half of that.
    pub energy_share: f64,
    /// Largest error of the shape at any place and time, as a share of the
    /// height: ≤ 2/(π² p (1−p)(N+½)).
    pub largest: f64,
    /// Mean square of that error along the string, as a share of the square of
    /// the height: ≤ (2/(π² p (1−p)))²/(6 (N+½)³).
    pub mean_square: f64,
}

impl PluckTail {
    /// The bounds for a pluck at `place` after mode `modes`.
    ///
    /// # Errors
    /// A place outside [`bounds::PLACE`].
    pub fn after(modes: u32, place: f64) -> Result<Self> {
        let p = bounds::PLACE.check(place)?;
        let rest = f64::from(modes) + 0.5;
        let scale = 2.0 / (PI * PI * p * (1.0 - p));
        Ok(Self {
            energy_share: (scale / rest).min(1.0),
            largest: scale / rest,
            mean_square: scale * scale / (6.0 * rest * rest * rest),
        })
    }

    /// The fewest modes for which the share of the energy left out is bounded by
    /// `share` (0 to 1; anything else asks for no modes).
    ///
    /// # Errors
    /// A place outside [`bounds::PLACE`].
    pub fn modes_for_energy(place: f64, share: f64) -> Result<u32> {
        let p = bounds::PLACE.check(place)?;
        let modes = 2.0 / (PI * PI * p * (1.0 - p) * share) - 0.5;
        // A cast saturates: NaN and negative numbers become 0.
        Ok(libm::ceil(modes) as u32)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::PointPluck;
    use crate::excitation::Excitation;
    use crate::loss::ConstantT60;
    use crate::series::ModeSeries;

    #[test]
    fn modes_add_up_and_tails_are_bounded() {
        let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).unwrap();
        let series = ModeSeries::new(string, ConstantT60::new(3.0).unwrap());
        for place in [0.5, 0.2, 0.031] {
            let pluck = PointPluck::new(place, 3.0e-3).unwrap();
            let total = pluck_energy_j(&string, place, 3.0e-3).unwrap();
            let mut sum = 0.0;
            for n in 1..=4_000 {
                let mode = series.mode(n).unwrap();
                sum += mode_energy_j(&mode, &pluck.mode(&mode, &string), &string);
                let tail = PluckTail::after(n, place).unwrap();
                let left = 1.0 - sum / total;
                assert!(left > 0.0 && left <= tail.energy_share, "{n} {left}");
            }
        }
        assert!(
            (pluck_energy_j(&string, 0.2, 3.0e-3).unwrap() - 3.028_846_153_846e-3).abs() < 1e-14
        );
    }

    #[test]
    fn the_number_of_modes_is_enough_and_no_more() {
        let modes = PluckTail::modes_for_energy(0.2, 0.01).unwrap();
        assert!(PluckTail::after(modes, 0.2).unwrap().energy_share <= 0.01);
        assert!(PluckTail::after(modes - 1, 0.2).unwrap().energy_share > 0.01);
        assert_eq!(PluckTail::modes_for_energy(0.2, f64::NAN).unwrap(), 0);
    }
}
