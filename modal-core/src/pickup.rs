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
