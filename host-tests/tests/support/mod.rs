//! Random strings, plucks and pickups from the bounds of `modal-core`: here those
//! of instruments, in [`legal`] whatever the bounds allow.
#![allow(
    unreachable_pub,
    clippy::expect_used,
    reason = "shared by the test files"
)]
#![allow(dead_code, reason = "each test file uses a part")]

pub mod legal;
pub mod wide;

use host_tests::measure::{from_q31, tone_errors};
use host_tests::reference::{Damped, Wire};
use host_tests::tolerance;
use modal_core::bounds::{self, Bound};
use modal_core::{
    Coefficients, DisplacementPickup, Loss, ModeBank, ModeSeries, Onset, PickupWeights,
    RoundedPluck, StringSpec, TwoT60, Voice, plan,
};
use proptest::prelude::*;

/// This many cases, or what the usual variable PROPTEST_CASES says: a longer search.
pub fn cases(usual: u32) -> ProptestConfig {
    let asked = std::env::var_os("PROPTEST_CASES").is_some();
    let default = ProptestConfig::default();
    ProptestConfig {
        cases: if asked { default.cases } else { usual },
        // A failure prints its input; no files beside the tests.
        failure_persistence: None,
        // Rejected inputs grow with the search.
        max_global_rejects: default.max_global_rejects.max(8 * default.cases),
        ..default
    }
}

/// A value of `bound` between `from` and `to` of its range, evenly over the
/// logarithm.
pub fn log_between(bound: &'static Bound, from: f64, to: f64) -> impl Strategy<Value = f64> {
    let (low, high) = (from.max(bound.min), to.min(bound.max));
    (low.ln()..high.ln()).prop_map(f64::exp)
}

/// Any bit pattern, the special values often.
pub fn any_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        any::<u64>().prop_map(f64::from_bits),
        any::<u32>().prop_map(|bits| f64::from(f32::from_bits(bits))),
        prop::sample::select(vec![
            0.0,
            -0.0,
            1.0,
            -1.0,
            f64::NAN,
            f64::INFINITY,
            f64::NEG_INFINITY,
            f64::MIN_POSITIVE,
            f64::MAX,
            0.5,
            1.0e-3,
            440.0,
        ]),
    ]
}

/// A string that could be on an instrument: pitch 25 Hz to 5 kHz, B up to 0.01.
pub fn string() -> impl Strategy<Value = StringSpec> {
    (
        log_between(&bounds::LENGTH_M, 0.05, 3.0),
        log_between(&bounds::FREQUENCY_HZ, 25.0, 5_000.0),
        log_between(&bounds::LINEAR_DENSITY, 1.0e-4, 2.0e-2),
        prop_oneof![
            Just(0.0),
            (1.0e-7_f64.ln()..0.01_f64.ln()).prop_map(f64::exp)
        ],
    )
        .prop_filter_map("tension out of range", |(length, pitch, density, b)| {
            // B = π² EI/(T L²) with the tension of the flexible string.
            let tension = density * (2.0 * length * pitch).powi(2);
            let stiffness = b * tension * length * length / std::f64::consts::PI.powi(2);
            StringSpec::tuned(length, pitch, density, stiffness).ok()
        })
}

/// Losses from a fifth of a second to twenty seconds, shorter at 5 kHz.
pub fn losses() -> impl Strategy<Value = TwoT60> {
    (log_between(&bounds::T60_S, 0.2, 20.0), 0.03..0.95).prop_map(|(long, share)| {
        TwoT60::new(50.0, long, 5_000.0, share * long).expect("within the range")
    })
}

/// A pluck with a tip of up to a twentieth of a metre.
pub fn pluck() -> impl Strategy<Value = RoundedPluck> {
    (0.02..0.98, 1.0e-4..1.0e-2, 0.0..0.02).prop_map(|(place, height, width)| {
        RoundedPluck::new(place, height, width).expect("a pluck")
    })
}

/// A displacement pickup.
pub fn pickup() -> impl Strategy<Value = DisplacementPickup> {
    (0.02..0.98, 0.0..0.02)
        .prop_map(|(place, width)| DisplacementPickup::new(place, width).expect("a pickup"))
}

/// A string that is started and heard, scaled to a share of its ceiling.
#[derive(Clone, Debug)]
pub struct Scene {
    pub series: ModeSeries<TwoT60>,
    pub pluck: RoundedPluck,
    pub pickup: DisplacementPickup,
    pub sample_rate_hz: f64,
    pub ceiling: f64,
}

pub const MODES: usize = 64;
pub const BLOCK: usize = 32;

/// What `voice` plays next: at least `frames` frames, whole blocks.
pub fn render<K: ModeBank<MODES>>(voice: &mut Voice<MODES, K>, frames: usize) -> Vec<f64> {
    let mut signal = Vec::new();
    while signal.len() < frames {
        let mut block = [0; BLOCK];
        voice.render(&mut block);
        signal.extend(block.map(from_q31));
    }
    signal
}

pub fn scene() -> impl Strategy<Value = Scene> {
    (
        string(),
        losses(),
        pluck(),
        pickup(),
        prop::sample::select(vec![32_000.0, 44_100.0, 48_000.0, 96_000.0]),
        prop::sample::select(vec![0.125, 0.25, 1.0]),
    )
        .prop_map(
            |(string, loss, pluck, pickup, sample_rate_hz, ceiling)| Scene {
                series: ModeSeries::new(string, loss),
                pluck,
                pickup,
                sample_rate_hz,
                ceiling,
            },
        )
}

impl Scene {
    pub fn coefficients(&self) -> modal_core::Result<Coefficients<MODES>> {
        self.first(MODES as u32)
    }

    /// Coefficients of no more than the first `modes` modes.
    pub fn first(&self, modes: u32) -> modal_core::Result<Coefficients<MODES>> {
        Coefficients::prepare(&self.series, modes, self.sample_rate_hz, self.ceiling)
    }

    /// The heard level that is full scale if the pluck is `share` of the ceiling.
    pub fn full_scale(&self, coefficients: &Coefficients<MODES>, share: f64) -> f64 {
        let modes = coefficients.modes() as u32;
        let level = plan::l1_bound(&self.series, &self.pluck, &self.pickup, modes).expect("modes");
        level / (share * f64::from(coefficients.ceiling_q31()) / 2.0_f64.powi(31))
    }

    pub fn onset(&self, coefficients: &Coefficients<MODES>, full_scale: f64) -> Onset<MODES> {
        Onset::prepare(
            coefficients,
            &self.series,
            &self.pluck,
            &self.pickup,
            full_scale,
        )
        .expect("it was scaled to fit")
    }
}

/// The string of `scene` for the reference.
pub fn wire(scene: &Scene) -> Wire {
    let string = scene.series.string();
    Wire {
        length_m: string.length_m(),
        tension_n: string.tension_n(),
        density_kg_per_m: string.linear_density_kg_per_m(),
        stiffness_n_m2: string.bending_stiffness_n_m2(),
    }
}

/// Every mode of the pluck by the formulas of `host_tests::reference`.
pub fn closed(scene: &Scene, modes: usize, full_scale: f64) -> Vec<Damped> {
    let wire = wire(scene);
    (1..=modes as u32)
        .map(|n| {
            let hz = wire.frequency_hz(n);
            let decay = scene
                .series
                .loss()
                .decay_rate_per_s(n, hz, scene.series.string());
            let pluck = &scene.pluck;
            let shape = wire.pluck(n, pluck.place(), pluck.height_m(), pluck.width_m());
            let heard = wire.heard(n, scene.pickup.place(), scene.pickup.aperture_m());
            Damped::new(hz, decay, shape * heard / full_scale, 0.0)
        })
        .collect()
}

/// The tones of the modes of `scene`, started at 1.
pub fn tones(scene: &Scene, modes: usize) -> Vec<Damped> {
    let string = scene.series.string();
    (1..=modes as u32)
        .map(|n| {
            let hz = wire(scene).frequency_hz(n);
            let decay = scene.series.loss().decay_rate_per_s(n, hz, string);
            Damped::new(hz, decay, 1.0, 0.0)
        })
        .collect()
}

/// All modes in one signal, equally loud, measured together: each has to be in
/// tune and to die in time, whatever the others do.
pub fn all_modes(scene: &Scene, coefficients: &Coefficients<MODES>) -> Result<(), TestCaseError> {
    let expected = tones(scene, coefficients.modes());
    let level = plan::l1_bound(&scene.series, &Alike, &Everywhere, expected.len() as u32);
    let full_scale = 1.2 * level.expect("modes") / scene.ceiling;
    let onset = Onset::prepare(coefficients, &scene.series, &Alike, &Everywhere, full_scale)
        .expect("it fits");
    let mut voice = Voice::new(coefficients);
    let _ = voice.superpose(&onset);
    // Sixteen periods of mode 1: a lone mode among 64 is little above the noise.
    let periods = 16.0 * scene.sample_rate_hz / wire(scene).frequency_hz(1);
    let signal = render(&mut voice, periods.max(8_000.0) as usize);
    let shortest = tolerance::SHORTEST_T60_S;
    let errors =
        tone_errors(&signal, scene.sample_rate_hz, &expected, shortest).expect("modes lie apart");
    for (n, (error, tone)) in (1..).zip(errors.into_iter().zip(&expected)) {
        let Some(error) = error else { continue };
        if tone.t60_s() * tone.angular < tolerance::FEWEST_RADIANS {
            continue;
        }
        prop_assert!(
            error.cents.abs() <= tolerance::PITCH_CENTS,
            "mode {n}: {error:?}"
        );
        prop_assert!(error.t60.abs() <= tolerance::T60, "mode {n}: {error:?}");
    }
    Ok(())
}

/// Hears every mode alike.
#[derive(Clone, Copy, Debug)]
pub struct Everywhere;

impl modal_core::Pickup for Everywhere {
    fn weights(&self, _: &modal_core::Mode, _: &StringSpec) -> PickupWeights {
        PickupWeights {
            displacement: 1.0,
            velocity: 0.0,
        }
    }
}

/// Starts one mode alone, at 1.
#[derive(Clone, Copy, Debug)]
pub struct Alone(pub u32);

impl modal_core::Excitation for Alone {
    fn mode(&self, mode: &modal_core::Mode, _: &StringSpec) -> modal_core::ModalState {
        modal_core::ModalState {
            displacement: f64::from(u8::from(mode.n() == self.0)),
            velocity: 0.0,
        }
    }
}

/// Starts every mode alike, at 1.
#[derive(Clone, Copy, Debug)]
pub struct Alike;

impl modal_core::Excitation for Alike {
    fn mode(&self, _: &modal_core::Mode, _: &StringSpec) -> modal_core::ModalState {
        modal_core::ModalState {
            displacement: 1.0,
            velocity: 0.0,
        }
    }
}
