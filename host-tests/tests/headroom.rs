//! Nothing wraps, whatever is played: a search that tries to break the headroom.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use host_tests::tolerance;
use modal_core::{
    Coefficients, Headroom, Instrument, ModeBank, ModeSeries, Onset, TwoT60, Voice, bounds,
};
use proptest::prelude::*;
use support::{MODES, Scene, legal, scene, wide};

fn muted(scene: &Scene) -> Coefficients<MODES> {
    let loss = TwoT60::new(50.0, 0.15, 5_000.0, 0.05).expect("a loss");
    let series = ModeSeries::new(*scene.series.string(), loss);
    Coefficients::prepare(&series, MODES as u32, scene.sample_rate_hz, scene.ceiling)
        .expect("muted")
}

/// What is done to a voice, and for how many blocks it sounds then.
fn gestures(most: usize) -> impl Strategy<Value = Vec<(u8, usize, u8)>> {
    prop::collection::vec((0_u8..5, 0_usize..16, 0_u8..4), 1..most)
}

/// Starts (three of five gestures) and exchanges of coefficients at will.
fn play<const M: usize>(
    coefficients: &[Coefficients<M>],
    onsets: &[Onset<M>],
    gestures: &[(u8, usize, u8)],
) -> Result<(), TestCaseError> {
    let Some(first) = coefficients.first() else {
        return Ok(());
    };
    let mut voice = Voice::new(first);
    for &(gesture, which, blocks) in gestures {
        let onset = onsets.get(which % onsets.len().max(1));
        match (gesture, onset) {
            (0..=2, Some(onset)) => {
                let _ = voice.superpose(onset);
            }
            _ => {
                let other = &coefficients[which % coefficients.len()];
                let _ = voice.set_coefficients(other).expect("the same share");
            }
        }
        for _ in 0..=blocks {
            wide::render(&mut voice)?;
        }
    }
    Ok(())
}

proptest! {
    #![proptest_config(support::cases(300))]

    /// Plucks at the worst moments, mutes and releases.
    #[test]
    fn a_string_of_an_instrument_never_wraps(scene in scene(), gestures in gestures(12)) {
        let Ok(ringing) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let full_scale = scene.full_scale(&ringing, 0.999);
        let onset = scene.onset(&ringing, full_scale);
        play(&[ringing, muted(&scene)], &[onset], &gestures)?;
    }

    /// Any strings, any plucks, each prepared for and played under the coefficients
    /// of the others.
    #[test]
    fn no_legal_string_ever_wraps(
        strings in prop::collection::vec(legal::played(8), 1..4),
        sample_rate_hz in legal::within(&bounds::SAMPLE_RATE_HZ),
        ceiling in legal::within(&bounds::CEILING),
        gestures in gestures(20),
    ) {
        let (mut coefficients, mut onsets) = (Vec::new(), Vec::new());
        for string in &strings {
            coefficients.extend(string.coefficients::<8>(sample_rate_hz, ceiling));
        }
        for string in &strings {
            onsets.extend(coefficients.iter().filter_map(|any| string.onset(any).ok()));
        }
        play(&coefficients, &onsets, &gestures)?;
    }

    /// The same, prepared in integers.
    #[test]
    fn no_integer_note_ever_wraps(
        strings in prop::collection::vec(legal::played(8), 1..4),
        sample_rate_hz in legal::within(&bounds::SAMPLE_RATE_HZ),
        ceiling in legal::within(&bounds::CEILING),
        gestures in gestures(20),
    ) {
        let notes = strings.iter().filter_map(|string| string.note::<8>(sample_rate_hz, ceiling).ok());
        let (coefficients, onsets): (Vec<_>, Vec<_>) = notes.unzip();
        play(&coefficients, &onsets, &gestures)?;
    }

    /// The running bound is never below what really sounds.
    #[test]
    fn the_bound_is_a_bound(scene in scene(), blocks in 1_usize..400) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let full_scale = scene.full_scale(&coefficients, 0.9);
        let mut voice = Voice::new(&coefficients);
        let _ = voice.superpose(&scene.onset(&coefficients, full_scale));
        for _ in 0..blocks {
            let mut block = [0; 32];
            voice.render(&mut block);
        }
        prop_assume!(!voice.is_silent());
        // Rounding can add to the amplitudes what the ceiling keeps in reserve.
        let reserve = u64::from(coefficients.share_q31() - coefficients.ceiling_q31());
        let level = voice.bank().level(None);
        let most = (voice.bound_q31() + reserve) as f64 * (1.0 + tolerance::LEVEL) + 4.0 * MODES as f64;
        prop_assert!(level as f64 <= most, "{level} above {most}");
    }
}

/// A start that was prepared for one pitch and meets the voice at another is a
/// louder one there, and has to be counted as that.
#[test]
fn a_start_for_other_coefficients_is_counted_as_what_it_is() {
    use modal_core::{RoundedPluck, StringSpec, VelocityPickup};
    let series = |pitch_hz: f64, t60_s: f64| {
        let string = StringSpec::tuned(0.6, pitch_hz, 1.0e-3, 0.0).expect("a string");
        let loss = TwoT60::new(100.0, t60_s, 5_000.0, 0.5 * t60_s).expect("a loss");
        ModeSeries::new(string, loss)
    };
    let prepare = |series: &ModeSeries<TwoT60>| {
        Coefficients::<MODES>::prepare(series, 16, 48_000.0, 1.0).expect("coefficients")
    };
    let high = series(400.0, 4.0);
    let at_high = prepare(&high);
    let pluck = RoundedPluck::new(0.3, 2.0e-3, 0.0).expect("a pluck");
    let pickup = VelocityPickup::new(0.3, 0.0).expect("a pickup");
    let level = modal_core::plan::l1_bound(&high, &pluck, &pickup, 16).expect("modes");
    let onset = Onset::prepare(&at_high, &high, &pluck, &pickup, 1.02 * level).expect("it fits");
    for (pitch_hz, t60_s) in [(100.0, 4.0), (100.0, 0.02), (3_000.0, 4.0), (400.0, 0.02)] {
        let mut voice = Voice::new(&at_high);
        let _ = voice
            .set_coefficients(&prepare(&series(pitch_hz, t60_s)))
            .expect("the same share");
        for _ in 0..50 {
            let _ = voice.superpose(&onset);
            let sum = voice.bank().level(None);
            assert!(
                sum as f64 <= (voice.bound_q31() + 1_000) as f64 * (1.0 + tolerance::LEVEL),
                "{pitch_hz} {t60_s}"
            );
            wide::render(&mut voice).expect("nothing wraps");
        }
    }
}

/// A law of losses that damps every second mode far more must not cost the
/// other ones their pitch.
#[test]
fn a_lossy_neighbour_does_not_spoil_a_mode() {
    use modal_core::{Loss, StringSpec};
    struct Alternating;
    impl Loss for Alternating {
        fn decay_rate_per_s(&self, n: u32, _: f64, _: &StringSpec) -> f64 {
            if n.is_multiple_of(2) { 10_000.0 } else { 1.0 }
        }
    }
    for ceiling in [1.0 / 64.0, 0.25, 1.0] {
        let string = StringSpec::tuned(0.6, 3_100.0, 1.0e-3, 0.0).expect("a string");
        let series = ModeSeries::new(string, Alternating);
        let coefficients =
            Coefficients::<8>::prepare(&series, 6, 48_000.0, ceiling).expect("coefficients");
        let forms = wide::forms(coefficients.groups());
        for ((coefficient, form), n) in coefficients.as_slice().iter().zip(forms).zip(1..) {
            let mode = series.mode(n).expect("a mode");
            let k = -f64::from(coefficient.damping) / 2.0_f64.powi(32);
            let e = -f64::from(coefficient.restoring) / 2.0_f64.powi(32 + i32::from(form.shift));
            let r = (1.0 - k).sqrt();
            let angle = ((1.0 + r * r - e) / (2.0 * r)).acos();
            let angle = if form.folded {
                std::f64::consts::PI - angle
            } else {
                angle
            };
            let cents = 1_200.0 * (angle * 48_000.0 / mode.damped_angular()).log2();
            assert!(
                cents.abs() <= tolerance::PITCH_CENTS,
                "mode {n}: {cents} cents"
            );
        }
    }
}

#[test]
fn too_many_plucks_are_made_weaker_not_wrong() {
    use modal_core::{DisplacementPickup, RoundedPluck, StringSpec};
    let scene = Scene {
        series: ModeSeries::new(
            StringSpec::tuned(0.62, 98.0, 4.0e-3, 5.0e-5).expect("a string"),
            TwoT60::new(98.0, 8.0, 5_000.0, 1.0).expect("a loss"),
        ),
        pluck: RoundedPluck::new(0.17, 2.0e-3, 0.0).expect("a pluck"),
        pickup: DisplacementPickup::new(0.1, 0.0).expect("a pickup"),
        sample_rate_hz: 48_000.0,
        ceiling: 1.0,
    };
    let coefficients = scene.coefficients().expect("coefficients");
    let full_scale = scene.full_scale(&coefficients, 0.6);
    let onset = scene.onset(&coefficients, full_scale);
    let mut voice = Voice::new(&coefficients);
    assert_eq!(voice.superpose(&onset), Headroom::Full);
    // At the same moment all amplitudes add: the second must be limited.
    assert!(matches!(voice.superpose(&onset), Headroom::Limited(_)));
    let mut peak = 0;
    for _ in 0..2_000 {
        let _ = voice.superpose(&onset);
        let mut block = [0_i32; 32];
        voice.render(&mut block);
        peak = block
            .iter()
            .map(|frame| frame.unsigned_abs())
            .max()
            .unwrap_or(0)
            .max(peak);
    }
    assert!(peak < 1 << 31);
    assert!(peak > 1 << 29, "{peak}");
}

#[test]
fn ceilings_may_sum_to_full_scale_and_no_more() {
    let string = modal_core::StringSpec::tuned(0.62, 98.0, 4.0e-3, 0.0).expect("a string");
    let series = ModeSeries::new(
        string,
        TwoT60::new(98.0, 4.0, 5_000.0, 1.0).expect("a loss"),
    );
    let voice = |ceiling| {
        let coefficients =
            Coefficients::<8>::prepare(&series, 8, 48_000.0, ceiling).expect("modes");
        Voice::new(&coefficients)
    };
    let mut instrument = Instrument::<4, 8, 32>::new();
    for index in 0..3 {
        assert_eq!(instrument.add_voice(voice(1.0 / 3.0)), Ok(index));
    }
    assert!(instrument.add_voice(voice(0.01)).is_err());
    let mut small = Instrument::<1, 8, 32>::new();
    assert_eq!(small.add_voice(voice(0.1)), Ok(0));
    let refused = small.add_voice(voice(0.1)).expect_err("one string at most");
    assert_eq!(
        refused.to_string(),
        "strings = 2 is outside its range, 1 to 1"
    );
}
