//! The two roads beside the main one, against the same closed form: notes
//! prepared in integers, and the bank for small cores.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use host_tests::measure::{error_dbfs, from_q31, tone_error};
use host_tests::tolerance;
use modal_core::note::{DECAY_PER_FRAME, NoteSpec, PluckSpec};
use modal_core::{Coefficients, ModeBank, NarrowBank, Onset, Voice};
use proptest::prelude::*;
use support::{Alone, BLOCK, Everywhere, MODES, Scene, all_modes, closed, render, scene, tones};

/// The note of `scene` in integers, at a quarter of its ceiling, and the heard
/// level that is full scale.
fn note(scene: &Scene) -> modal_core::Result<(Coefficients<MODES>, Onset<MODES>, f64)> {
    let full_scale = scene.full_scale(&scene.coefficients()?, 0.25);
    let spec = NoteSpec::from_series(&scene.series, scene.sample_rate_hz, scene.ceiling)?;
    let string = scene.series.string();
    let pluck = PluckSpec::displacement(string, &scene.pluck, &scene.pickup, full_scale)?;
    let (coefficients, onset) = spec.note(MODES as u32, &pluck)?;
    Ok((coefficients, onset, full_scale))
}

/// Whether no mode dies sooner than the integer road can say: such a one is taken
/// to die as soon as it can.
fn is_on_the_road(scene: &Scene, coefficients: &Coefficients<MODES>) -> bool {
    let fastest = DECAY_PER_FRAME.max * scene.sample_rate_hz;
    let mut tones = tones(scene, coefficients.modes()).into_iter();
    tones.all(|tone| tone.decay < fastest)
}

/// Error of the first half second of `onset` against the closed form.
fn error<K: ModeBank<MODES>>(
    mut voice: Voice<MODES, K>,
    onset: &Onset<MODES>,
    scene: &Scene,
    full_scale: f64,
) -> f64 {
    let _ = voice.superpose(onset);
    let signal = render(&mut voice, (0.5 * scene.sample_rate_hz) as usize);
    let mut reference = vec![0.0; signal.len()];
    for mode in closed(scene, voice.bank().modes(), full_scale) {
        mode.add_to(&mut reference, scene.sample_rate_hz);
    }
    error_dbfs(&signal, &reference)
}

proptest! {
    #![proptest_config(support::cases(100))]

    #[test]
    fn a_note_in_integers_follows_the_closed_form(scene in scene()) {
        let Ok((coefficients, onset, full_scale)) = note(&scene) else {
            return Err(TestCaseError::reject("no integer note"));
        };
        prop_assume!(is_on_the_road(&scene, &coefficients));
        let error = error(Voice::new(&coefficients), &onset, &scene, full_scale);
        prop_assert!(error <= tolerance::INTEGER_NOTE_DBFS, "{error:.1} dBFS");
    }

    #[test]
    fn the_narrow_bank_follows_the_closed_form(scene in scene()) {
        let prepared = scene.coefficients().and_then(|coefficients| {
            Ok((Voice::<MODES, NarrowBank<MODES>>::with_bank(&coefficients)?, coefficients))
        });
        let Ok((voice, coefficients)) = prepared else {
            return Err(TestCaseError::reject("not for this bank"));
        };
        let full_scale = scene.full_scale(&coefficients, 0.25);
        let onset = scene.onset(&coefficients, full_scale);
        let error = error(voice, &onset, &scene, full_scale);
        prop_assert!(error <= tolerance::NARROW_DBFS, "{error:.1} dBFS");
    }

    #[test]
    fn modes_of_the_narrow_bank_are_in_tune_and_die_in_time(scene in scene(), pick in 0.0..1.0) {
        let prepared = scene.coefficients().and_then(|coefficients| {
            Ok((Voice::<MODES, NarrowBank<MODES>>::with_bank(&coefficients)?, coefficients))
        });
        let Ok((mut voice, coefficients)) = prepared else {
            return Err(TestCaseError::reject("not for this bank"));
        };
        let n = (pick * coefficients.modes() as f64) as usize;
        let full_scale = 1.6 / scene.ceiling;
        let start = Alone(n as u32 + 1);
        let onset = Onset::prepare(&coefficients, &scene.series, &start, &Everywhere, full_scale)
            .expect("it fits");
        let _ = voice.superpose(&onset);
        let expected = tones(&scene, coefficients.modes())[n];
        let seconds = (3.0 / expected.decay).min(0.5);
        prop_assume!(seconds * expected.angular > 50.0);
        prop_assume!(expected.t60_s() > tolerance::NARROW_SHORTEST_T60_S);
        let signal = render(&mut voice, (seconds * scene.sample_rate_hz) as usize);
        let error = tone_error(&signal, scene.sample_rate_hz, &expected);
        prop_assert!(error.cents.abs() <= tolerance::NARROW_PITCH_CENTS, "{error:?}");
        prop_assert!(error.t60.abs() <= tolerance::NARROW_T60, "{error:?}");
    }

    /// Whatever is plucked, the narrow bank stays within its share and comes to
    /// rest.
    #[test]
    fn the_narrow_bank_stays_within_its_share(
        scene in scene(),
        plucks in prop::collection::vec(0_usize..40, 1..6),
    ) {
        let prepared = scene.coefficients().and_then(|coefficients| {
            Ok((Voice::<MODES, NarrowBank<MODES>>::with_bank(&coefficients)?, coefficients))
        });
        let Ok((mut voice, coefficients)) = prepared else {
            return Err(TestCaseError::reject("not for this bank"));
        };
        let full_scale = scene.full_scale(&coefficients, 0.999);
        let onset = scene.onset(&coefficients, full_scale);
        let share = from_q31(voice.share_q31().cast_signed());
        for blocks in plucks {
            let _ = voice.superpose(&onset);
            for frame in render(&mut voice, blocks * BLOCK) {
                prop_assert!(frame.abs() <= share, "{frame} above {share}");
            }
        }
        let slowest = scene.series.mode(1).expect("a mode").t60_s();
        let rest = (2.6 * slowest * scene.sample_rate_hz) as usize;
        prop_assume!(rest < 400_000);
        for frame in render(&mut voice, rest) {
            prop_assert!(frame.abs() <= share, "{frame} above {share}");
        }
        prop_assert!(voice.is_silent());
    }
}

proptest! {
    #![proptest_config(support::cases(6))]

    #[test]
    fn modes_of_integer_notes_are_in_tune_and_die_in_time(scene in scene()) {
        let Ok((coefficients, ..)) = note(&scene) else {
            return Err(TestCaseError::reject("no integer note"));
        };
        prop_assume!(is_on_the_road(&scene, &coefficients));
        all_modes(&scene, &coefficients)?;
    }
}
