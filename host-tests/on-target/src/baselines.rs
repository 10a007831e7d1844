//! What a maker would write first: other ways to sound the same modes. Each
//! adds the next block of all modes to `f32` frames.

use biquad::{Biquad, Coefficients, DirectForm2Transposed};
use micromath::F32;

use crate::scene::{BLOCK, MODES, RATE_HZ};

/// A mode as all of them need it: per frame.
#[derive(Clone, Copy, Debug, Default)]
pub struct Tone {
    /// Angle per frame in rad.
    pub angle: f64,
    /// Factor of the amplitude per frame, r.
    pub keep: f64,
    /// q at frame 0, of full scale.
    pub a: f64,
    /// Amplitude of the sine part.
    pub c: f64,
}

impl Tone {
    /// q at frame `n`.
    fn at(&self, n: f64) -> f64 {
        let angle = self.angle * n;
        libm::pow(self.keep, n) * (self.a * libm::cos(angle) + self.c * libm::sin(angle))
    }

    fn amplitude(&self) -> f64 {
        libm::hypot(self.a, self.c)
    }
}

/// A way to sound modes.
pub trait Baseline: Sized {
    /// Its name in the table.
    const NAME: &'static str;

    /// Ready for the first block.
    fn new(tones: &[Tone; MODES]) -> Self;

    /// Adds the next frames of all modes.
    fn render(&mut self, block: &mut [f32; BLOCK]);
}

fn each<T>(tones: &[Tone; MODES], make: impl Fn(&Tone) -> T) -> [T; MODES] {
    core::array::from_fn(|index| make(&tones[index]))
}

/// y[n] = 2 r cos θ y[n−1] − r² y[n−2] in `f32`.
pub struct TwoPole([[f32; 4]; MODES]);

impl Baseline for TwoPole {
    const NAME: &'static str = "f32 two-pole";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self(each(tones, |tone| {
            let (c1, c2) = (
                2.0 * tone.keep * libm::cos(tone.angle),
                -tone.keep * tone.keep,
            );
            [
                c1 as f32,
                c2 as f32,
                tone.at(-1.0) as f32,
                tone.at(-2.0) as f32,
            ]
        }))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for [c1, c2, y1, y2] in &mut self.0 {
            for frame in block.iter_mut() {
                let y = *c1 * *y1 + *c2 * *y2;
                (*y2, *y1) = (*y1, y);
                *frame += y;
            }
        }
    }
}

/// The same in Q30 with 64-bit products.
pub struct TwoPoleQ30([[i32; 4]; MODES]);

impl Baseline for TwoPoleQ30 {
    const NAME: &'static str = "Q30 two-pole";

    fn new(tones: &[Tone; MODES]) -> Self {
        let q30 = |value: f64| (value * f64::from(1 << 30)) as i32;
        Self(each(tones, |tone| {
            let (c1, c2) = (
                2.0 * tone.keep * libm::cos(tone.angle),
                -tone.keep * tone.keep,
            );
            // Q29 for the coefficient that reaches 2.
            [
                q30(0.5 * c1),
                q30(c2),
                q30(tone.at(-1.0)),
                q30(tone.at(-2.0)),
            ]
        }))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        let mut sums = [0_i32; BLOCK];
        for [c1, c2, y1, y2] in &mut self.0 {
            for sum in &mut sums {
                let first = i64::from(*c1) * i64::from(*y1) * 2;
                let y = (first + i64::from(*c2) * i64::from(*y2) + (1 << 29)) >> 30;
                (*y2, *y1) = (*y1, y as i32);
                *sum = sum.wrapping_add(y as i32);
            }
        }
        for (frame, sum) in block.iter_mut().zip(sums) {
            *frame += sum as f32 * (1.0 / (1 << 30) as f32);
        }
    }
}

/// Two states that turn each other by ε = 2 sin(θ/2), one after the other, and
/// decay by r (the modified coupled form of Smith & Mathews, SMAC 2003; from
/// memory), in `f32`.
pub struct Coupled([[f32; 4]; MODES]);

impl Baseline for Coupled {
    const NAME: &'static str = "f32 coupled form";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self(each(tones, |tone| {
            let epsilon = 2.0 * libm::sin(0.5 * tone.angle);
            // x[n] = A cos(θ n − φ), y[n] = A sin(θ (n − 1/2) − φ).
            let half = 0.5 * tone.angle;
            let y = -tone.a * libm::sin(half) - tone.c * libm::cos(half);
            [epsilon as f32, tone.keep as f32, tone.a as f32, y as f32]
        }))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for [epsilon, keep, x, y] in &mut self.0 {
            for frame in block.iter_mut() {
                *frame += *x;
                *y = *keep * (*y + *epsilon * *x);
                *x = *keep * *x - *epsilon * *y;
            }
        }
    }
}

/// A complex number turned by r e^(iθ), in `f32`.
pub struct Phasor([[f32; 4]; MODES]);

impl Baseline for Phasor {
    const NAME: &'static str = "f32 phasor";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self(each(tones, |tone| {
            let (re, im) = (
                tone.keep * libm::cos(tone.angle),
                tone.keep * libm::sin(tone.angle),
            );
            [re as f32, im as f32, tone.a as f32, -tone.c as f32]
        }))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for [re, im, x, y] in &mut self.0 {
            for frame in block.iter_mut() {
                *frame += *x;
                (*x, *y) = (*re * *x - *im * *y, *re * *y + *im * *x);
            }
        }
    }
}

/// A running phase, an envelope and some way to take the sine.
#[derive(Clone, Copy)]
struct Running {
    /// Of a turn, Q32.
    phase: u32,
    step: u32,
    amplitude: f32,
    keep: f32,
}

impl Running {
    fn new(tone: &Tone) -> Self {
        let turns = |angle: f64| {
            let turn = angle / core::f64::consts::TAU;
            ((turn - libm::floor(turn)) * 4_294_967_296.0) as u32
        };
        Self {
            // a cos + c sin = A sin(θ n + atan2(a, c)).
            phase: turns(libm::atan2(tone.a, tone.c)),
            step: turns(tone.angle),
            amplitude: tone.amplitude() as f32,
            keep: tone.keep as f32,
        }
    }

    #[inline(always)]
    fn next(&mut self, sine: impl Fn(u32) -> f32) -> f32 {
        let value = self.amplitude * sine(self.phase);
        self.phase = self.phase.wrapping_add(self.step);
        self.amplitude *= self.keep;
        value
    }
}

const RADIANS: f32 = core::f32::consts::TAU / 4_294_967_296.0;

/// A sine table of 1,024 points with straight lines between, and an envelope.
pub struct Table {
    modes: [Running; MODES],
    sine: [f32; 1_025],
}

impl Baseline for Table {
    const NAME: &'static str = "wavetable and envelope";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self {
            modes: each(tones, Running::new),
            sine: core::array::from_fn(|index| {
                libm::sin(core::f64::consts::TAU * index as f64 / 1_024.0) as f32
            }),
        }
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        let table = &self.sine;
        for mode in &mut self.modes {
            for frame in block.iter_mut() {
                *frame += mode.next(|phase| {
                    let index = (phase >> 22) as usize;
                    let part = (phase << 10) as f32 * (1.0 / 4_294_967_296.0);
                    table[index] + part * (table[index + 1] - table[index])
                });
            }
        }
    }
}

/// `micromath`'s sine of every frame, and an envelope.
pub struct MicromathSine([Running; MODES]);

impl Baseline for MicromathSine {
    const NAME: &'static str = "micromath sine";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self(each(tones, Running::new))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for mode in &mut self.0 {
            for frame in block.iter_mut() {
                *frame += mode.next(|phase| F32(phase.cast_signed() as f32 * RADIANS).sin().0);
            }
        }
    }
}

/// `libm`'s sine of every frame, and an envelope.
pub struct LibmSine([Running; MODES]);

impl Baseline for LibmSine {
    const NAME: &'static str = "libm sine";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self(each(tones, Running::new))
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for mode in &mut self.0 {
            for frame in block.iter_mut() {
                *frame += mode.next(|phase| libm::sinf(phase.cast_signed() as f32 * RADIANS));
            }
        }
    }
}

/// A general-purpose biquad filter (crate `biquad`), struck once.
pub struct Filter {
    filters: [DirectForm2Transposed<f32>; MODES],
    strike: [f32; MODES],
    /// What the second frame needs for the phase.
    second: [f32; MODES],
    started: bool,
}

impl Baseline for Filter {
    const NAME: &'static str = "biquad crate, f32";

    fn new(tones: &[Tone; MODES]) -> Self {
        Self {
            filters: each(tones, |tone| {
                DirectForm2Transposed::new(Coefficients {
                    a1: (-2.0 * tone.keep * libm::cos(tone.angle)) as f32,
                    a2: (tone.keep * tone.keep) as f32,
                    b0: 1.0,
                    b1: 0.0,
                    b2: 0.0,
                })
            }),
            // y[0] = x[0], y[1] = x[1] + 2 r cos θ x[0].
            strike: each(tones, |tone| tone.at(0.0) as f32),
            second: each(tones, |tone| {
                (tone.at(1.0) - 2.0 * tone.keep * libm::cos(tone.angle) * tone.at(0.0)) as f32
            }),
            started: false,
        }
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for (index, filter) in self.filters.iter_mut().enumerate() {
            let mut input = if self.started {
                [0.0, 0.0]
            } else {
                [self.strike[index], self.second[index]]
            };
            for (n, frame) in block.iter_mut().enumerate() {
                *frame += filter.run(if n < 2 { input[n] } else { 0.0 });
            }
            input = [0.0, 0.0];
            let _ = input;
        }
        self.started = true;
    }
}

/// A delay line whose end is fed back as the mean of two frames (Karplus &
/// Strong, Computer Music Journal 7:43, 1983; from memory): a whole string at
/// once, but harmonic, out of tune by its whole length, and with no say over its
/// losses. Its cost is that of one string.
pub struct DelayLine {
    line: [f32; 640],
    length: usize,
    at: usize,
}

impl Baseline for DelayLine {
    const NAME: &'static str = "delay line, a whole string";

    fn new(tones: &[Tone; MODES]) -> Self {
        let period = core::f64::consts::TAU / tones[0].angle - 0.5;
        let length = (libm::rint(period) as usize).clamp(2, 640);
        let mut line = [0.0; 640];
        for (n, slot) in line.iter_mut().enumerate().take(length) {
            *slot = tones.iter().map(|tone| tone.at(n as f64)).sum::<f64>() as f32;
        }
        Self {
            line,
            length,
            at: 0,
        }
    }

    fn render(&mut self, block: &mut [f32; BLOCK]) {
        for frame in block {
            let next = if self.at + 1 == self.length {
                0
            } else {
                self.at + 1
            };
            let out = self.line[self.at];
            *frame += out;
            self.line[self.at] = 0.5 * (out + self.line[next]);
            self.at = next;
        }
    }
}

/// The modes of the lowest string of the scene, at its pluck.
///
/// # Errors
/// None: the tests prepare it.
pub fn tones() -> modal_core::Result<[Tone; MODES]> {
    let prepared = crate::scene::string(0)?;
    let mut tones = [Tone::default(); MODES];
    for (slot, n) in tones.iter_mut().zip(1..) {
        let (mode, state) =
            modal_core::plan::heard(&prepared.series, &prepared.pluck, &prepared.pickup, n)?;
        *slot = Tone {
            angle: mode.damped_angular() / RATE_HZ,
            keep: libm::exp(-mode.decay_rate_per_s() / RATE_HZ),
            a: state.displacement / prepared.full_scale_m,
            c: state.quadrature(&mode) / prepared.full_scale_m,
        };
    }
    Ok(tones)
}
