//! The integer engine against the closed form, over random strings.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use host_tests::measure::{error_dbfs, from_q31, tone_error};
use host_tests::reference::Damped;
use host_tests::tolerance;
use modal_core::{
    Coefficients, DisplacementPickup, Loss, ModeSeries, Onset, RoundedPluck, StringSpec, TwoT60,
    VelocityPickup, Voice, kernel, plan,
};
use proptest::prelude::*;
use support::{Alone, BLOCK, Everywhere, MODES, Scene, all_modes, closed, render, scene, wire};

/// Error of the first half second of `coefficients` against the closed form.
fn error(scene: &Scene, coefficients: &Coefficients<MODES>) -> f64 {
    let full_scale = scene.full_scale(coefficients, 0.25);
    let mut voice = Voice::new(coefficients);
    let _ = voice.superpose(&scene.onset(coefficients, full_scale));
    let signal = render(&mut voice, (0.5 * scene.sample_rate_hz) as usize);
    let mut reference = vec![0.0; signal.len()];
    for mode in closed(scene, coefficients.modes(), full_scale) {
        mode.add_to(&mut reference, scene.sample_rate_hz);
    }
    error_dbfs(&signal, &reference)
}

proptest! {
    #![proptest_config(support::cases(200))]

    #[test]
    fn the_engine_follows_the_closed_form(scene in scene()) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let error = error(&scene, &coefficients);
        prop_assert!(error <= tolerance::ANY_STRING_DBFS, "{error:.1} dBFS");
    }

    #[test]
    fn every_mode_is_in_tune_and_dies_in_time(scene in scene(), pick in 0.0..1.0) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let n = 1 + (pick * coefficients.modes() as f64) as u32;
        let full_scale = 1.2 / scene.ceiling;
        let onset = Onset::prepare(&coefficients, &scene.series, &Alone(n), &Everywhere, full_scale)
            .expect("it fits");
        let mut voice = Voice::new(&coefficients);
        let _ = voice.superpose(&onset);
        let hz = wire(&scene).frequency_hz(n);
        let decay = scene.series.loss().decay_rate_per_s(n, hz, scene.series.string());
        let expected = Damped::new(hz, decay, 1.0 / full_scale, 0.0);
        // As long as the mode falls by 50 dB, half a second at most, but at
        // least eight periods.
        let seconds = (5.8 / decay).min(0.5);
        prop_assume!(seconds * hz > 8.0);
        let signal = render(&mut voice, (seconds * scene.sample_rate_hz) as usize);
        let error = tone_error(&signal, scene.sample_rate_hz, &expected);
        prop_assert!(error.cents.abs() <= tolerance::PITCH_CENTS, "{} cents", error.cents);
        prop_assert!(error.t60.abs() <= tolerance::T60, "{} of T60", error.t60);
    }

    #[test]
    fn a_velocity_pickup_hears_the_slope(scene in scene()) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let pickup = VelocityPickup::new(scene.pickup.place(), scene.pickup.aperture_m())
            .expect("a pickup");
        let modes = coefficients.modes();
        let level = plan::l1_bound(&scene.series, &scene.pluck, &pickup, modes as u32)
            .expect("modes");
        let full_scale = 4.0 * level / scene.ceiling;
        let onset = Onset::prepare(&coefficients, &scene.series, &scene.pluck, &pickup, full_scale)
            .expect("it fits");
        let mut voice = Voice::new(&coefficients);
        let _ = voice.superpose(&onset);
        let signal = render(&mut voice, 4_800);
        let mut reference = vec![0.0; signal.len()];
        for mode in closed(&scene, modes, full_scale) {
            // d/dt of e^(−σt)(a cos + c sin).
            let slope = Damped {
                a: mode.angular * mode.c - mode.decay * mode.a,
                c: -mode.angular * mode.a - mode.decay * mode.c,
                ..mode
            };
            slope.add_to(&mut reference, scene.sample_rate_hz);
        }
        let error = error_dbfs(&signal, &reference);
        prop_assert!(error <= tolerance::ANY_STRING_DBFS, "{error:.1} dBFS");
    }

    #[test]
    fn every_note_ends_in_exact_silence(scene in scene()) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let full_scale = scene.full_scale(&coefficients, 0.99);
        let mut voice = Voice::new(&coefficients);
        let _ = voice.superpose(&scene.onset(&coefficients, full_scale));
        // −144 dB at the rate of the slowest mode, and a little more.
        let slowest = scene.series.mode(1).expect("a mode").t60_s();
        let frames = 2.6 * slowest * scene.sample_rate_hz;
        let mut blocks = 0;
        while !voice.is_silent() {
            let mut block = [0; BLOCK];
            voice.render(&mut block);
            blocks += 1;
            prop_assert!((blocks * BLOCK) as f64 <= frames, "still sounding");
        }
        let mut block = [0; BLOCK];
        voice.render(&mut block);
        prop_assert_eq!(block, [0; BLOCK]);
    }
}

proptest! {
    // A fit of 256 unknowns: seconds a case without the optimiser.
    #![proptest_config(support::cases(12))]

    /// All modes in one signal, measured together: none disturbs another.
    #[test]
    fn all_modes_at_once_are_in_tune_and_die_in_time(scene in scene()) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        all_modes(&scene, &coefficients)?;
    }
}

/// A string of an instrument, for the controls.
fn usual() -> Scene {
    let string = StringSpec::tuned(0.62, 196.0, 1.5e-3, 5.0e-5).expect("a string");
    let loss = TwoT60::new(196.0, 6.0, 5_000.0, 0.8).expect("a loss");
    Scene {
        series: ModeSeries::new(string, loss),
        pluck: RoundedPluck::new(0.17, 2.0e-3, 0.0).expect("a pluck"),
        pickup: DisplacementPickup::new(0.1, 0.0).expect("a pickup"),
        sample_rate_hz: 48_000.0,
        ceiling: 0.25,
    }
}

/// The control: one integer of one mode off by a millionth must not pass the
/// same measure.
#[test]
fn a_coefficient_off_by_a_millionth_is_found() {
    let scene = usual();
    let coefficients = scene.coefficients().expect("coefficients");
    let full_scale = scene.full_scale(&coefficients, 0.25);
    let mut voice = Voice::new(&coefficients);
    let _ = voice.superpose(&scene.onset(&coefficients, full_scale));
    let mut reference = vec![0.0; 24_000];
    for mode in closed(&scene, coefficients.modes(), full_scale) {
        mode.add_to(&mut reference, scene.sample_rate_hz);
    }
    // The kernel alone, with a millionth of the pull of mode `n` added to it.
    let error = |n: Option<usize>| {
        let mut resonators = voice.bank().resonators().to_vec();
        if let Some(n) = n {
            let pull = &mut resonators[n - 1].coefficient.restoring;
            *pull += (f64::from(*pull) * 1.0e-6).round() as i32;
        }
        let mut signal = Vec::new();
        while signal.len() < reference.len() {
            let mut block = [0; BLOCK];
            kernel::render(voice.bank().groups(), &mut resonators, &mut block);
            signal.extend(block.map(from_q31));
        }
        error_dbfs(&signal, &reference)
    };
    assert!(error(None) <= tolerance::ENGINE_DBFS);
    // The loud modes.
    for n in [1, 2, 3] {
        let found = error(Some(n));
        assert!(
            found > tolerance::ENGINE_DBFS + tolerance::CONTROL_MARGIN_DB,
            "mode {n}: {found:.1} dBFS"
        );
    }
}

/// A string whose tension is off by a millionth is found as well.
#[test]
fn a_string_off_by_a_millionth_is_found() {
    let scene = usual();
    let right = scene.series.string();
    let off = StringSpec::new(
        right.length_m(),
        right.tension_n() * (1.0 + 1.0e-6),
        right.linear_density_kg_per_m(),
        right.bending_stiffness_n_m2(),
    )
    .expect("a string");
    let broken = Scene {
        series: ModeSeries::new(off, *scene.series.loss()),
        ..scene.clone()
    };
    let coefficients = broken.coefficients().expect("coefficients");
    let found = error(&scene, &coefficients);
    assert!(
        found > tolerance::ENGINE_DBFS + tolerance::CONTROL_MARGIN_DB,
        "{found:.1} dBFS"
    );
}
