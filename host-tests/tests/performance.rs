//! Whole performances against the closed form: starts over what sounds, mutes,
//! releases and changes of pitch.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use firmware_example::command::{Applied, Kind};
use firmware_example::control::Control;
use firmware_example::demo::{self, BLOCK, BLOCKS, MODES as DEMO_MODES, STRINGS};
use firmware_example::fade::FADE_FRAMES;
use firmware_example::player::Player;
use heapless::spsc::Queue;
use host_tests::measure::{error_dbfs, from_q31, power_db};
use host_tests::performance::{Played, closed_form, play};
use host_tests::timeline::{Event, perform};
use host_tests::tolerance;
use modal_core::{Gain, Headroom, ModeSeries, StringSpec, TwoT60, TwosComplement16, Voice};
use proptest::prelude::*;
use support::{MODES, Scene, closed, scene};

/// The same string with other losses, or at another pitch.
fn changed(scene: &Scene, pitch: f64, t60_s: f64) -> Option<Scene> {
    let string = scene.series.string();
    let other = StringSpec::new(
        string.length_m() / pitch,
        string.tension_n(),
        string.linear_density_kg_per_m(),
        string.bending_stiffness_n_m2(),
    );
    let loss = TwoT60::new(50.0, t60_s, 5_000.0, 0.3 * t60_s);
    Some(Scene {
        series: ModeSeries::new(other.ok()?, loss.ok()?),
        ..scene.clone()
    })
}

proptest! {
    #![proptest_config(support::cases(60))]

    #[test]
    fn a_voice_follows_the_closed_form(
        scene in scene(),
        others in prop::collection::vec((0.8..1.25, 0.05..8.0), 1..3),
        gestures in prop::collection::vec((0_u8..2, 0_usize..8, 1_u16..=32_768, 1_usize..200), 2..12),
    ) {
        let mut scenes = vec![scene.clone()];
        scenes.extend(others.iter().filter_map(|&(pitch, t60_s)| changed(&scene, pitch, t60_s)));
        // All with the same number of modes: those that the highest one has.
        let mut modes = MODES as u32;
        for one in &scenes {
            modes = modes.min(one.series.modes_below(0.45 * one.sample_rate_hz));
        }
        prop_assume!(modes > 0);
        let mut prepared = Vec::new();
        for one in &scenes {
            prepared.extend(one.first(modes));
        }
        prop_assume!(prepared.len() == scenes.len());
        let full_scale = scene.full_scale(&prepared[0], 0.2);
        let onset = scene.onset(&prepared[0], full_scale);
        let tones: Vec<_> = scenes
            .iter()
            .map(|one| closed(one, modes as usize, full_scale))
            .collect();

        let mut voice = Voice::new(&prepared[0]);
        let (mut signal, mut events) = (Vec::new(), vec![Vec::new(); modes as usize]);
        for (gesture, which, gain, blocks) in gestures {
            let frame = signal.len();
            if gesture == 0 {
                let gain = Gain::from_q15(gain);
                // The closed form knows no limit.
                prop_assume!(voice.superpose(&onset.scaled(gain)) == Headroom::Full);
                let share = f64::from(gain.q15()) / 32_768.0;
                for (events, start) in events.iter_mut().zip(&tones[0]) {
                    events.push((frame, Event::Start(start.scaled(share))));
                }
            } else {
                let which = which % prepared.len();
                let done = voice.set_coefficients(&prepared[which]).expect("the same share");
                prop_assume!(done == Headroom::Full);
                for (events, tone) in events.iter_mut().zip(&tones[which]) {
                    events.push((frame, Event::Exchange(*tone)));
                }
            }
            for _ in 0..blocks {
                let mut block = [0; BLOCK];
                voice.render(&mut block);
                signal.extend(block.map(from_q31));
            }
        }
        let mut reference = vec![0.0; signal.len()];
        for (tone, events) in tones[0].iter().zip(&events) {
            perform(tone, events, &mut reference, scene.sample_rate_hz);
        }
        let error = error_dbfs(&signal, &reference);
        prop_assert!(error <= tolerance::ANY_STRING_DBFS, "{error:.1} dBFS");
    }
}

/// What the demonstration's control and player do when nothing is in their way.
fn invented_performance() -> Vec<Applied> {
    let strings = demo::design()
        .expect("a design")
        .prepare()
        .expect("strings");
    let mut queue = Queue::<_, 16>::new();
    let (commands, consumer) = queue.split();
    let mut control = Control::<STRINGS, DEMO_MODES>::new(&strings, commands);
    let mut performer = demo::performer();
    let mut player = Player::<TwosComplement16, STRINGS, DEMO_MODES, BLOCK>::new(
        &strings,
        consumer,
        demo::DITHER_SEED,
    )
    .expect("a player");
    let (mut block, mut log) = ([0; BLOCK], Vec::new());
    for _ in 0..BLOCKS {
        while let Some(gesture) = performer.due(player.frame()) {
            control.gesture(gesture);
        }
        control.poll();
        player.render(&mut block, |applied| log.push(applied));
    }
    log
}

fn assert_follows(log: &[Applied]) -> Played {
    let played = play(log).expect("the demonstration");
    assert_eq!(played.counters.applied as usize, log.len());
    let reference = closed_form(log, played.mix.len()).expect("the demonstration");
    let error = error_dbfs(&played.mix, &reference);
    assert!(error <= tolerance::ENGINE_DBFS, "{error:.1} dBFS");

    // The words, while something sounds, against the quarter of the square of
    // the last place that an ideal dithered converter leaves.
    let frames = played.mix.chunks(BLOCK).zip(reference.chunks(BLOCK));
    let (mut sum, mut count) = (0.0, 0_u32);
    for ((mix, exact), words) in frames.zip(played.words.chunks(BLOCK)) {
        if mix.iter().all(|&frame| frame == 0.0) {
            assert!(words.iter().all(|&word| word == 0));
            continue;
        }
        for (exact, &word) in exact.iter().zip(words) {
            sum += (32_768.0 * exact - f64::from(word.cast_signed())).powi(2);
            count += 1;
        }
    }
    let excess = power_db(sum / f64::from(count)) - power_db(0.25);
    assert!(excess.abs() <= tolerance::CONVERTER_DB, "{excess:.2} dB");
    println!("{error:.2} dBFS, words {excess:.3} dB");
    played
}

#[test]
fn the_invented_performance_follows_the_closed_form() {
    let played = assert_follows(&invented_performance());
    assert_eq!((played.counters.limited, played.counters.clipped), (0, 0));
    let last = played.words.last_chunk::<{ 32 * BLOCK }>();
    assert_eq!(last, Some(&[0; 32 * BLOCK]), "it ends at rest");
}

proptest! {
    #![proptest_config(support::cases(3))]

    /// Any performance on the same instrument, soft enough to need no limit.
    #[test]
    fn any_performance_follows_the_closed_form(
        gestures in prop::collection::vec((1_u32..700, 0..STRINGS, 0_usize..6, 1_000_u16..16_000), 1..60),
    ) {
        let mut block = FADE_FRAMES.div_ceil(BLOCK as u32);
        let mut log = Vec::new();
        for (pause, string, kind, gain) in gestures {
            block += pause;
            if block >= BLOCKS {
                break;
            }
            // Four plucks for a mute and a release.
            let kind = *[Kind::Mute, Kind::Release].get(kind).unwrap_or(&Kind::Pluck);
            let gain = match kind {
                Kind::Pluck => Gain::from_q15(gain),
                Kind::Mute | Kind::Release => Gain::UNITY,
            };
            log.push(Applied {
                frame: block * BLOCK as u32,
                string: string as u8,
                kind,
                gain,
                headroom: Gain::UNITY,
            });
        }
        let played = play(&log).expect("the demonstration");
        prop_assume!(played.counters.limited == 0);
        assert_follows(&log);
    }
}
