//! The closed forms, as naive as possible: to be trusted by reading them.

use std::f64::consts::{PI, TAU};

/// A uniform stiff string between hinged ends.
#[derive(Clone, Copy, Debug)]
pub struct Wire {
    /// Length in m.
    pub length_m: f64,
    /// Tension in N.
    pub tension_n: f64,
    /// Mass per metre in kg/m.
    pub density_kg_per_m: f64,
    /// Bending stiffness in N m².
    pub stiffness_n_m2: f64,
}

impl Wire {
    /// f_n = (n/2L) √(T/μ) √(1 + n² π² EI/(T L²)): the eigenfrequencies of
    /// μ y_tt = T y_xx − EI y_xxxx with sin(n π x/L), which fulfils it exactly.
    #[must_use]
    pub fn frequency_hz(&self, n: u32) -> f64 {
        let k = f64::from(n) * PI / self.length_m;
        let pull = self.tension_n * k.powi(2) + self.stiffness_n_m2 * k.powi(4);
        (pull / self.density_kg_per_m).sqrt() / TAU
    }

    /// Displacement of mode `n` in the static shape under a force at `place`
    /// that would lift a flexible string by `height_m`, spread over `width_m`.
    #[must_use]
    pub fn pluck(&self, n: u32, place: f64, height_m: f64, width_m: f64) -> f64 {
        let (n, l, t) = (f64::from(n), self.length_m, self.tension_n);
        let force = t * height_m / (l * place * (1.0 - place));
        let k = n * PI / l;
        let spread = if width_m == 0.0 {
            1.0
        } else {
            (0.5 * k * width_m).sin() / (0.5 * k * width_m)
        };
        let modal_force = 2.0 / l * force * (n * PI * place).sin() * spread;
        modal_force / (t * k.powi(2) + self.stiffness_n_m2 * k.powi(4))
    }

    /// sin(n π x/L) averaged over an aperture.
    #[must_use]
    pub fn heard(&self, n: u32, place: f64, aperture_m: f64) -> f64 {
        let k = f64::from(n) * PI / self.length_m;
        let mean = if aperture_m == 0.0 {
            1.0
        } else {
            (0.5 * k * aperture_m).sin() / (0.5 * k * aperture_m)
        };
        (k * place * self.length_m).sin() * mean
    }
}

/// σ = b₁ + b₃ ω² through two T60s.
#[must_use]
pub fn decay_rate(frequency_hz: f64, (f1, t1): (f64, f64), (f2, t2): (f64, f64)) -> f64 {
    let rate = |t60: f64| 1_000.0_f64.ln() / t60;
    let b3 = (rate(t2) - rate(t1)) / (f2 * f2 - f1 * f1);
    rate(t1) + b3 * (frequency_hz * frequency_hz - f1 * f1)
}

/// One mode: q(t) = e^(−σ t) (a cos ω_d t + c sin ω_d t) from t = 0 on.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Damped {
    /// ω_d in rad/s.
    pub angular: f64,
    /// σ in 1/s.
    pub decay: f64,
    /// Displacement at t = 0.
    pub a: f64,
    /// Amplitude of the sine part.
    pub c: f64,
}

impl Damped {
    /// The solution of q̈ + 2σ q̇ + ω₀² q = 0 from q(0) and q̇(0).
    #[must_use]
    pub fn new(frequency_hz: f64, decay: f64, displacement: f64, velocity: f64) -> Self {
        let angular = ((TAU * frequency_hz).powi(2) - decay.powi(2)).sqrt();
        Self {
            angular,
            decay,
            a: displacement,
            c: (velocity + decay * displacement) / angular,
        }
    }

    /// Time in which the amplitude falls by 60 dB, in s.
    #[must_use]
    pub fn t60_s(&self) -> f64 {
        1_000.0_f64.ln() / self.decay
    }

    /// The same motion, `gain` times as large.
    #[must_use]
    pub fn scaled(&self, gain: f64) -> Self {
        Self {
            a: gain * self.a,
            c: gain * self.c,
            ..*self
        }
    }

    /// q(t).
    #[must_use]
    pub fn at(&self, t: f64) -> f64 {
        let (sine, cosine) = (self.angular * t).sin_cos();
        (-self.decay * t).exp() * (self.a * cosine + self.c * sine)
    }

    /// The same motion with its t = 0 moved to `t`.
    #[must_use]
    pub fn moved_to(&self, t: f64) -> Self {
        let (sine, cosine) = (self.angular * t).sin_cos();
        let fall = (-self.decay * t).exp();
        Self {
            a: fall * (self.a * cosine + self.c * sine),
            c: fall * (self.c * cosine - self.a * sine),
            ..*self
        }
    }

    /// The motion with other losses that has the same q(0) and q(−`step`):
    /// what exchanging coefficients between two samples means.
    #[must_use]
    pub fn with_losses(&self, other: &Self, step: f64) -> Self {
        let (now, before) = (self.at(0.0), self.at(-step));
        let (sine, cosine) = (other.angular * step).sin_cos();
        // q(−step) = e^(σ step) (a cos − c sin).
        let c = (now * cosine - before * (-other.decay * step).exp()) / sine;
        Self {
            a: now,
            c,
            ..*other
        }
    }

    /// Adds q at `frames` sample instants from t = 0 on to `signal`.
    pub fn add_to(&self, signal: &mut [f64], sample_rate_hz: f64) {
        // Exact every 256 frames, a rotation in between.
        let step = 1.0 / sample_rate_hz;
        let fall = (-self.decay * step).exp();
        let (sine, cosine) = (self.angular * step).sin_cos();
        for (index, chunk) in signal.chunks_mut(256).enumerate() {
            let Self { mut a, mut c, .. } = self.moved_to(256.0 * step * index as f64);
            for frame in chunk {
                *frame += a;
                (a, c) = (
                    fall * (a * cosine + c * sine),
                    fall * (c * cosine - a * sine),
                );
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_rotation_is_the_formula() {
        let mode = Damped::new(1_234.5, 6.0, 0.3, -700.0);
        let mut signal = vec![0.0; 5_000];
        mode.add_to(&mut signal, 48_000.0);
        for (n, frame) in signal.iter().enumerate() {
            assert!((frame - mode.at(n as f64 / 48_000.0)).abs() < 1e-12);
        }
    }

    #[test]
    fn the_same_losses_change_nothing() {
        let mode = Damped::new(440.0, 3.0, 0.1, 50.0).moved_to(0.37);
        let same = mode.with_losses(&mode, 1.0 / 48_000.0);
        assert!((same.c - mode.c).abs() < 1e-11);
    }
}
