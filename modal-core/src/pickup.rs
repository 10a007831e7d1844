//! Where and how the string is heard.

use crate::bounds;
use crate::error::Result;
use crate::excitation::ModalState;
use crate::maths::{sin_pi, sinc};
use crate::series::{Mode, wave_number};
use crate::string::StringSpec;

/// How strongly one mode is heard: u = `displacement`·q + `velocity`·dq/dt.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct PickupWeights {
    /// Weight of the modal displacement.
    pub displacement: f64,
    /// Weight of the modal velocity.
    pub velocity: f64,
}

impl PickupWeights {
    /// The heard signal u of a mode in `state`, and its slope du/dt.
    ///
    /// u obeys the same damped equation as the mode, so listening costs nothing
    /// at run time: with q̈ = −ω₀² q − 2σ q̇,
    /// u = w_d q + w_v q̇ and u̇ = w_d q̇ + w_v q̈.
    #[must_use]
    pub fn heard(&self, mode: &Mode, state: ModalState) -> ModalState {
        let angular = mode.angular();
        let acceleration = -angular * angular * state.displacement
            - 2.0 * mode.decay_rate_per_s() * state.velocity;
        ModalState {
            displacement: self.displacement * state.displacement + self.velocity * state.velocity,
            velocity: self.displacement * state.velocity + self.velocity * acceleration,
        }
    }
}

/// A way to hear a string.
///
/// A maker adds a pickup by implementing this one method.
pub trait Pickup {
    /// The weights of `mode`.
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights;
}

impl<P: Pickup + ?Sized> Pickup for &P {
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
        (**self).weights(mode, string)
    }
}

/// A place on the string and the width over which the pickup averages.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
struct Aperture {
    place: f64,
    width_m: f64,
}

impl Aperture {
    fn new(place: f64, width_m: f64) -> Result<Self> {
        Ok(Self {
            place: bounds::PLACE.check(place)?,
            width_m: bounds::WIDTH_M.check(width_m)?,
        })
    }

    /// sin(n π x/L) averaged over the aperture: times sin θ/θ, θ = n π w/(2L).
    fn weight(&self, n: u32, string: &StringSpec) -> f64 {
        sin_pi(f64::from(n) * self.place) * sinc(0.5 * wave_number(n, string) * self.width_m)
    }
}

/// Hears the displacement of the string in m (optical, capacitive).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct DisplacementPickup(Aperture);

impl DisplacementPickup {
    /// A pickup at `place` (fraction of the length) averaging over `aperture_m`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`] or [`bounds::WIDTH_M`].
    pub fn new(place: f64, aperture_m: f64) -> Result<Self> {
        Aperture::new(place, aperture_m).map(Self)
    }

    /// Place as a fraction of the length.
    #[must_use]
    pub fn place(&self) -> f64 {
        self.0.place
    }

    /// Width in m over which it averages.
    #[must_use]
    pub fn aperture_m(&self) -> f64 {
        self.0.width_m
    }
}

impl Pickup for DisplacementPickup {
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
        PickupWeights {
            displacement: self.0.weight(mode.n(), string),
            velocity: 0.0,
        }
    }
}

/// Hears the velocity of the string in m/s (magnet and coil).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct VelocityPickup(Aperture);

impl VelocityPickup {
    /// A pickup at `place` (fraction of the length) averaging over `aperture_m`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`] or [`bounds::WIDTH_M`].
    pub fn new(place: f64, aperture_m: f64) -> Result<Self> {
        Aperture::new(place, aperture_m).map(Self)
    }

    /// Place as a fraction of the length.
    #[must_use]
    pub fn place(&self) -> f64 {
        self.0.place
    }

    /// Width in m over which it averages.
    #[must_use]
    pub fn aperture_m(&self) -> f64 {
        self.0.width_m
    }
}

impl Pickup for VelocityPickup {
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
        PickupWeights {
            displacement: 0.0,
            velocity: self.0.weight(mode.n(), string),
        }
    }
}

/// An end of the string.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum End {
    /// x = 0, from where places are counted.
    Near,
    /// x = L.
    Far,
}

/// Hears the force of the string on a hinged end, in N: a sensor under the
/// bridge.
///
/// T y′ − E·I y‴ at x = 0, +T k_n (1 + B n²) per mode; −T k_n (−1)^n (1 + B n²)
/// at x = L. An ideal pluck gives a rectangular wave.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct BridgeForce(pub End);

impl Pickup for BridgeForce {
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
        let n = f64::from(mode.n());
        let stiff = 1.0 + string.inharmonicity() * n * n;
        let size = string.tension_n() * wave_number(mode.n(), string) * stiff;
        let sign = match self.0 {
            End::Far if mode.n().is_multiple_of(2) => -1.0,
            End::Near | End::Far => 1.0,
        };
        PickupWeights {
            displacement: sign * size,
            velocity: 0.0,
        }
    }
}

/// A pickup with a gain; a negative one turns its sign (out of phase).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Amplified<P> {
    pickup: P,
    gain: f64,
}

impl<P: Pickup> Amplified<P> {
    /// `pickup` times `gain`.
    ///
    /// # Errors
    /// A gain outside [`bounds::GAIN`].
    pub fn new(pickup: P, gain: f64) -> Result<Self> {
        Ok(Self {
            pickup,
            gain: bounds::GAIN.check(gain)?,
        })
    }
}

impl<P: Pickup> Pickup for Amplified<P> {
    fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
        let weights = self.pickup.weights(mode, string);
        PickupWeights {
            displacement: self.gain * weights.displacement,
            velocity: self.gain * weights.velocity,
        }
    }
}

macro_rules! sum_of_pickups {
    ($($pickup:ident $index:tt),+) => {
        /// All together, each with its own gain and sign.
        impl<$($pickup: Pickup),+> Pickup for ($($pickup,)+) {
            fn weights(&self, mode: &Mode, string: &StringSpec) -> PickupWeights {
                let mut sum = PickupWeights::default();
                $(
                    let weights = self.$index.weights(mode, string);
                    sum.displacement += weights.displacement;
                    sum.velocity += weights.velocity;
                )+
                sum
            }
        }
    };
}

sum_of_pickups!(A 0, B 1);
sum_of_pickups!(A 0, B 1, C 2);
sum_of_pickups!(A 0, B 1, C 2, D 3);

#[cfg(test)]
mod tests {
    use super::*;
    use crate::loss::ConstantT60;
    use crate::series::ModeSeries;

    #[test]
    fn two_equal_pickups_out_of_phase_hear_nothing() {
        let string = StringSpec::new(0.7, 60.0, 1.0e-3, 2.0e-5).unwrap();
        let series = ModeSeries::new(string, ConstantT60::new(3.0).unwrap());
        let pickup = VelocityPickup::new(0.2, 0.01).unwrap();
        let pair = (pickup, Amplified::new(pickup, -1.0).unwrap());
        for n in 1..20 {
            let mode = series.mode(n).unwrap();
            assert_eq!(pair.weights(&mode, &string), PickupWeights::default());
        }
    }
}
