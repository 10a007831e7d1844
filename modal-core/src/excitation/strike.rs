//! Strikes: the string is set in motion where it lies.

use core::f64::consts::PI;

use crate::bounds;
use crate::error::Result;
use crate::excitation::{Excitation, ModalState};
use crate::maths::{half_cosine, raised_sinc, sin_pi, sinc};
use crate::series::{Mode, wave_number};
use crate::string::StringSpec;

/// How the velocity of a strike is spread over its width `w`, with
/// θ = n π w/(2L).
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Profile {
    /// The same over the width: the factor sin θ/θ, impulse μ w V.
    #[default]
    Flat,
    /// Half a cosine: cos θ/(1 − (2θ/π)²), impulse 2 μ w V/π.
    HalfCosine,
    /// A raised cosine: sin θ/(θ (1 − θ²/π²)), impulse μ w V/2.
    RaisedCosine,
}

impl Profile {
    /// Share of mode `n` that the width leaves of a strike on a point.
    #[must_use]
    pub fn factor(self, n: u32, width_m: f64, string: &StringSpec) -> f64 {
        let angle = 0.5 * wave_number(n, string) * width_m;
        match self {
            Self::Flat => sinc(angle),
            Self::HalfCosine => half_cosine(angle),
            Self::RaisedCosine => raised_sinc(angle),
        }
    }

    /// Mean of the velocity over the width, as a share of its peak.
    #[must_use]
    pub fn mean(self) -> f64 {
        match self {
            Self::Flat => 1.0,
            Self::HalfCosine => 2.0 / PI,
            Self::RaisedCosine => 0.5,
        }
    }
}

/// A strike so short that the string has not moved yet: velocity over a width.
///
/// v_n = (2 P/(μ L)) sin(n π p) times the factor of the [`Profile`]; P is the
/// impulse.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Strike {
    place: f64,
    width_m: f64,
    profile: Profile,
    push: Push,
}

#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
enum Push {
    /// Peak velocity in m/s.
    Speed(f64),
    /// Impulse in N·s.
    Impulse(f64),
}

impl Strike {
    /// A strike at `place` that gives the string `speed_m_per_s` (at its peak)
    /// over `width_m`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`], [`bounds::SPEED_M_PER_S`] or
    /// [`bounds::WIDTH_M`].
    pub fn with_speed(
        place: f64,
        speed_m_per_s: f64,
        width_m: f64,
        profile: Profile,
    ) -> Result<Self> {
        let speed = bounds::SPEED_M_PER_S.check(speed_m_per_s)?;
        Self::new(place, width_m, profile, Push::Speed(speed))
    }

    /// A strike at `place` that gives the string an impulse of `impulse_n_s`
    /// over `width_m` (which may be zero).
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`], [`bounds::IMPULSE_N_S`] or
    /// [`bounds::WIDTH_M`].
    pub fn with_impulse(
        place: f64,
        impulse_n_s: f64,
        width_m: f64,
        profile: Profile,
    ) -> Result<Self> {
        let impulse = bounds::IMPULSE_N_S.check(impulse_n_s)?;
        Self::new(place, width_m, profile, Push::Impulse(impulse))
    }

    fn new(place: f64, width_m: f64, profile: Profile, push: Push) -> Result<Self> {
        Ok(Self {
            place: bounds::PLACE.check(place)?,
            width_m: bounds::WIDTH_M.check(width_m)?,
            profile,
            push,
        })
    }

    /// Impulse in N·s that `string` gets.
    #[must_use]
    pub fn impulse_n_s(&self, string: &StringSpec) -> f64 {
        match self.push {
            Push::Impulse(impulse) => impulse,
            Push::Speed(speed) => {
                string.linear_density_kg_per_m() * self.width_m * self.profile.mean() * speed
            }
        }
    }
}

/// 2/(μ L) sin(n π p): velocity of mode n per impulse on a point.
fn per_impulse(n: u32, place: f64, string: &StringSpec) -> f64 {
    let mass = string.linear_density_kg_per_m() * string.length_m();
    2.0 / mass * sin_pi(f64::from(n) * place)
}

impl Excitation for Strike {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let n = mode.n();
        ModalState {
            displacement: 0.0,
            velocity: self.impulse_n_s(string)
                * per_impulse(n, self.place, string)
                * self.profile.factor(n, self.width_m, string),
        }
    }
}

/// A strike that lasts: a force of half a sine over the contact time, on a
/// point; the start is the moment of parting, with the exact state of every
/// damped mode.
///
/// With λ = −σ + i ω_d, Ω = π/τ and z = (2 F/(μ L)) sin(n π p) I/ω_d,
/// I = Ω (1 + e^(λτ))/(λ² + Ω²): q = Im z, q̇ = Im λ z. The form of the force is
/// given: a real hammer's depends on the string. Long contacts silence high
/// modes; without damping the factor is cos(ωτ/2)/(1 − (ωτ/π)²).
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct ContactStrike {
    place: f64,
    impulse_n_s: f64,
    contact_s: f64,
}

impl ContactStrike {
    /// A strike at `place` with an impulse and a contact time.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`], [`bounds::IMPULSE_N_S`] or
    /// [`bounds::DURATION_S`].
    pub fn new(place: f64, impulse_n_s: f64, contact_s: f64) -> Result<Self> {
        Ok(Self {
            place: bounds::PLACE.check(place)?,
            impulse_n_s: bounds::IMPULSE_N_S.check(impulse_n_s)?,
            contact_s: bounds::DURATION_S.check(contact_s)?,
        })
    }
}

impl Excitation for ContactStrike {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let (s, w, tau) = (
            mode.decay_rate_per_s(),
            mode.damped_angular(),
            self.contact_s,
        );
        let rate = PI / tau;
        // F = P π/(2 τ).
        let peak = 0.5 * rate * self.impulse_n_s;
        let strength = peak * per_impulse(mode.n(), self.place, string);
        // I = ∫₀^τ e^(λ (τ−t)) sin(Ω t) dt. Where λ² + Ω² nearly vanishes, the
        // series of the quotient about λ = iΩ takes over.
        let (re, im) = contact_integral(s, w, rate, tau);
        let (z_re, z_im) = (strength * re / w, strength * im / w);
        ModalState {
            displacement: z_im,
            velocity: w * z_re - s * z_im,
        }
    }
}

/// I of [`ContactStrike`] as (real, imaginary).
fn contact_integral(s: f64, w: f64, rate: f64, tau: f64) -> (f64, f64) {
    // λ² + Ω² = (λ − iΩ)(λ + iΩ), and 1 + e^(λτ) = 1 − e^((λ−iΩ)τ) since
    // e^(iΩτ) = −1: I = −Ω τ/(λ + iΩ) · (e^ε − 1)/ε with ε = (λ − iΩ) τ.
    let (e_re, e_im) = (-s * tau, (w - rate) * tau);
    let (f_re, f_im) = expm1_over(e_re, e_im);
    // −Ω τ/(λ + iΩ), and Ω τ = π.
    let (d_re, d_im) = (-s, w + rate);
    let scale = -PI / (d_re * d_re + d_im * d_im);
    let (g_re, g_im) = (scale * d_re, -scale * d_im);
    (f_re * g_re - f_im * g_im, f_re * g_im + f_im * g_re)
}

/// (e^z − 1)/z for complex z, without cancellation.
fn expm1_over(re: f64, im: f64) -> (f64, f64) {
    let size = libm::hypot(re, im);
    if size < 1.0e-3 {
        // 1 + z/2 + z²/6 + z³/24; the next term is below 1e-14.
        let (z2_re, z2_im) = (re * re - im * im, 2.0 * re * im);
        let (z3_re, z3_im) = (z2_re * re - z2_im * im, z2_re * im + z2_im * re);
        return (
            1.0 + re / 2.0 + z2_re / 6.0 + z3_re / 24.0,
            im / 2.0 + z2_im / 6.0 + z3_im / 24.0,
        );
    }
    // e^z − 1 = expm1(x) cos y − 2 sin²(y/2) + i e^x sin y.
    let half = libm::sin(0.5 * im);
    let num_re = libm::expm1(re) * libm::cos(im) - 2.0 * half * half;
    let num_im = libm::exp(re) * libm::sin(im);
    let square = size * size;
    (
        (num_re * re + num_im * im) / square,
        (num_im * re - num_re * im) / square,
    )
}

/// A slow push and release: a force on a point that rises in a straight line
/// and ends at once. Laid over a ringing string it neither jumps nor kinks.
///
/// Without losses during the push: with G = 2 sin(n π p)/(μ L),
/// q = (G F/ω²)(1 − sin(ω t)/(ω t)) and q̇ = (G F/(ω² t))(1 − cos ω t) at the
/// release after t; a very long push is the static pluck.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct SlowPush {
    place: f64,
    force_n: f64,
    duration_s: f64,
}

impl SlowPush {
    /// A push at `place` up to `force_n` within `duration_s`.
    ///
    /// # Errors
    /// A value outside [`bounds::PLACE`], [`bounds::FORCE_N`] or
    /// [`bounds::DURATION_S`].
    pub fn new(place: f64, force_n: f64, duration_s: f64) -> Result<Self> {
        Ok(Self {
            place: bounds::PLACE.check(place)?,
            force_n: bounds::FORCE_N.check(force_n)?,
            duration_s: bounds::DURATION_S.check(duration_s)?,
        })
    }
}

impl Excitation for SlowPush {
    fn mode(&self, mode: &Mode, string: &StringSpec) -> ModalState {
        let angular = mode.angular();
        let turn = angular * self.duration_s;
        let held = per_impulse(mode.n(), self.place, string) * self.force_n / (angular * angular);
        let half = libm::sin(0.5 * turn);
        // 1 − sin x/x without cancellation for small x.
        let risen = if turn < 1.0e-2 {
            turn * turn / 6.0 * (1.0 - turn * turn / 20.0)
        } else {
            1.0 - libm::sin(turn) / turn
        };
        ModalState {
            displacement: held * risen,
            velocity: held * 2.0 * half * half / self.duration_s,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::PointPluck;
    use crate::loss::ConstantT60;
    use crate::series::ModeSeries;

    fn series(t60_s: f64) -> ModeSeries<ConstantT60> {
        let string = StringSpec::new(0.7, 60.0, 1.0e-3, 2.0e-5).unwrap();
        ModeSeries::new(string, ConstantT60::new(t60_s).unwrap())
    }

    #[test]
    fn a_short_contact_is_a_strike() {
        let series = series(4.0);
        let long = ContactStrike::new(0.2, 1.0e-3, 1.0e-6).unwrap();
        let short = Strike::with_impulse(0.2, 1.0e-3, 0.0, Profile::Flat).unwrap();
        for n in 1..10 {
            let mode = series.mode(n).unwrap();
            let (a, b) = (
                long.mode(&mode, series.string()),
                short.mode(&mode, series.string()),
            );
            assert!((a.velocity - b.velocity).abs() < 1e-3 * b.velocity.abs() + 1e-12);
        }
    }

    #[test]
    fn contact_has_the_published_factor() {
        // Nearly undamped: amplitude (2P/(μLω)) sin · cos(x/2)/(1 − (x/π)²).
        let series = series(1_000.0);
        let string = series.string();
        let mode = series.mode(1).unwrap();
        let w = mode.damped_angular();
        for (x, factor) in [
            (PI, PI / 4.0),
            (2.0 * PI, 1.0 / 3.0),
            (3.0 * PI, 0.0),
            (4.0 * PI, -1.0 / 15.0),
            (0.999_999 * PI, 0.785_398_55),
        ] {
            let strike = ContactStrike::new(0.3, 1.0e-3, x / w).unwrap();
            let state = strike.mode(&mode, string);
            let point = 1.0e-3 * per_impulse(1, 0.3, string) / w;
            let amplitude = state.amplitude(&mode) / point.abs();
            assert!(
                (amplitude - f64::abs(factor)).abs() < 1e-4,
                "{x} {amplitude}"
            );
        }
    }

    #[test]
    fn a_long_push_is_a_pluck() {
        let series = series(4.0);
        let string = series.string();
        let (place, height) = (0.2, 2.0e-3);
        let force = string.tension_n() * height / (string.length_m() * place * (1.0 - place));
        let push = SlowPush::new(place, force, 10.0).unwrap();
        let pluck = PointPluck::new(place, height).unwrap();
        for n in 1..20 {
            let mode = series.mode(n).unwrap();
            let (a, b) = (push.mode(&mode, string), pluck.mode(&mode, string));
            let tolerance = 1e-3 * b.displacement.abs() + 1e-12;
            assert!((a.displacement - b.displacement).abs() < tolerance);
        }
    }

    #[test]
    fn profiles_give_the_impulse_they_say() {
        let series = series(4.0);
        let string = series.string();
        for profile in [Profile::Flat, Profile::HalfCosine, Profile::RaisedCosine] {
            let strike = Strike::with_speed(0.4, 2.0, 1.0e-2, profile).unwrap();
            // Numerical integral of v(x) sin(k x), mode 3.
            let mode = series.mode(3).unwrap();
            let (length, steps) = (string.length_m(), 20_000);
            let mut sum = 0.0;
            for step in 0..steps {
                let u = (f64::from(step) + 0.5) / f64::from(steps) - 0.5;
                let x = 0.4 * length + 1.0e-2 * u;
                let v = match profile {
                    Profile::Flat => 2.0,
                    Profile::HalfCosine => 2.0 * (PI * u).cos(),
                    Profile::RaisedCosine => 1.0 + (2.0 * PI * u).cos(),
                };
                sum += v * (3.0 * PI * x / length).sin() * 1.0e-2 / f64::from(steps);
            }
            let expected = 2.0 / length * sum;
            let velocity = strike.mode(&mode, string).velocity;
            assert!(
                (velocity - expected).abs() < 1e-7 * expected.abs(),
                "{profile:?}"
            );
        }
    }
}
