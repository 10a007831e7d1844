//! How the string is held.

use core::f64::consts::PI;

/// How the two ends of a stiff string are held.
///
/// Mode n of a hinged string has n half waves exactly. A clamped end keeps the
/// string straight over a length of √(E·I/T), which shortens it a little: mode n
/// has u > n of the half waves that would fit, with
///
/// u = n + (m/π) atan(u √B / √(1 + B u²)), m = number of clamped ends,
///
/// exact but for terms of the order e^(−L √(T/E·I)), since the two ends are too
/// far apart to feel each other (it solves the characteristic determinant of the
/// clamped stiff string; the tests compare the two). The closed form of Fletcher
/// 1964, f ≈ f_hinged (1 + (2/π)√B + (4/π²) B) (from memory), is an expansion of
/// it for two clamped ends and small B n²: good to 0.1 cent up to B n² of about
/// 0.05, off by 17 cents at B n² = 2.
///
/// The *shapes* of clamped modes are sines but for the stiff piece at each end;
/// excitations and pickups take them as sines.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Ends {
    /// Both free to turn: a bridge and a nut with a sharp edge.
    #[default]
    Hinged,
    /// One held in its direction.
    OneClamped,
    /// Both held in their direction.
    Clamped,
}

impl Ends {
    /// Share of a half wave that the clamped ends take at most.
    fn clamps(self) -> f64 {
        match self {
            Self::Hinged => 0.0,
            Self::OneClamped => 1.0,
            Self::Clamped => 2.0,
        }
    }

    /// (m/π) atan(u √B / √(1 + B u²)).
    fn taken(self, u: f64, inharmonicity: f64) -> f64 {
        let slope = u * libm::sqrt(inharmonicity / (1.0 + inharmonicity * u * u));
        self.clamps() / PI * libm::atan(slope)
    }

    /// Half waves u of mode `n` on the length, for inharmonicity B.
    #[must_use]
    pub fn effective_index(self, n: u32, inharmonicity: f64) -> f64 {
        let n = f64::from(n);
        let mut u = n;
        if self == Self::Hinged {
            return u;
        }
        // For u >= 1 each step is at most a quarter of the one before.
        for _ in 0..30 {
            let next = n + self.taken(u, inharmonicity);
            let settled = (next - u).abs() <= 1.0e-16 * u;
            u = next;
            if settled {
                break;
            }
        }
        u
    }

    /// Modes with fewer than `u` half waves.
    pub(crate) fn modes_below(self, u: f64, inharmonicity: f64) -> f64 {
        u - self.taken(u, inharmonicity)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn small_stiffness_is_the_published_expansion() {
        let b = 1.0e-5_f64;
        let root = b.sqrt();
        for n in 1..=10 {
            let u = Ends::Clamped.effective_index(n, b);
            let ours = u * (1.0 + b * u * u).sqrt();
            let n = f64::from(n);
            let published =
                n * (1.0 + b * n * n).sqrt() * (1.0 + 2.0 / PI * root + 4.0 / (PI * PI) * b);
            assert!((1_200.0 * (ours / published).log2()).abs() < 1e-3);
        }
    }

    #[test]
    fn it_settles_for_bars_too() {
        for b in [1.0e-9, 1.0e-2, 0.25, 1.0, 1.0e3, 1.0e9] {
            for ends in [Ends::OneClamped, Ends::Clamped] {
                let u = ends.effective_index(1, b);
                assert!((u - 1.0 - ends.taken(u, b)).abs() < 1e-14);
            }
        }
    }
}
