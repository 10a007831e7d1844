//! How the string is started: the displacement and velocity of each mode at
//! the moment it is let go.

mod pluck;
mod shape;
mod strike;

pub use pluck::{PointPluck, RoundedPluck, Tip};
pub use shape::{Between, Corner, HalfSine, Of, Parabola, Polyline, Sampled};
pub use strike::{ContactStrike, Profile, SlowPush, Strike};

use crate::series::Mode;
use crate::string::StringSpec;

/// Displacement and velocity of one mode, or of one mode as heard.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct ModalState {
    /// q_n(0): m for a string; the heard unit after a pickup.
    pub displacement: f64,
    /// dq_n/dt(0): m/s for a string; heard unit per second after a pickup.
    pub velocity: f64,
}

impl ModalState {
    /// Amplitude A of q(t) = A e^(−σ t) cos(ω_d t − φ):
    /// √(q² + ((q̇ + σ q)/ω_d)²).
    #[must_use]
    pub fn amplitude(&self, mode: &Mode) -> f64 {
        libm::hypot(self.displacement, self.quadrature(mode))
    }

    /// Phase φ of q(t) = A e^(−σ t) cos(ω_d t − φ), in rad: with losses it is not
    /// zero even for a string let go from rest.
    #[must_use]
    pub fn phase(&self, mode: &Mode) -> f64 {
        libm::atan2(self.quadrature(mode), self.displacement)
    }

    /// (q̇ + σ q)/ω_d: the amplitude of the sine part.
    #[must_use]
    pub fn quadrature(&self, mode: &Mode) -> f64 {
        (self.velocity + mode.decay_rate_per_s() * self.displacement) / mode.damped_angular()
    }
}

/// A way to start a string.
///
/// A maker adds a start by implementing this one method.
pub trait Excitation {
    /// Displacement (m) and velocity (m/s) of `mode` in
    /// y(x, 0) = Σ q_n sin(n π x / L) and y_t(x, 0) = Σ q̇_n sin(n π x / L).
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState;
}

impl<X: Excitation + ?Sized> Excitation for &X {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        (**self).mode(mode, string)
    }
}

/// Both at once: superposition, of a shape and its velocity, say.
impl<A: Excitation, B: Excitation> Excitation for (A, B) {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let (a, b) = (self.0.mode(mode, string), self.1.mode(mode, string));
        ModalState {
            displacement: a.displacement + b.displacement,
            velocity: a.velocity + b.velocity,
        }
    }
}
