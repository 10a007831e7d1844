//! The audio context.
#![allow(clippy::unwrap_used, reason = "a test may stop")]

use firmware_example::command::{Action, Applied, Command, Kind, NotApplied};
use firmware_example::demo::{BLOCK, MODES, STRINGS, design};
use firmware_example::design::PreparedString;
use firmware_example::fade::FADE_FRAMES;
use firmware_example::player::Player;
use heapless::spsc::Queue;
use modal_core::{DacFormat, Gain, TwosComplement16, Unipolar12};
use proptest::prelude::*;

type Strings = heapless::Vec<PreparedString<MODES>, STRINGS>;
type Commands = Queue<Command<MODES>, 16>;
type Demo<'a, F = TwosComplement16> = Player<'a, F, STRINGS, MODES, BLOCK>;

const FADE_BLOCKS: u32 = FADE_FRAMES / BLOCK as u32;

fn strings() -> Strings {
    design().unwrap().prepare().unwrap()
}

fn command(strings: &Strings, string: u8, kind: Kind, gain: Gain) -> Command<MODES> {
    let action = strings[usize::from(string)].action(kind, gain);
    Command { string, action }
}

#[test]
fn commands_take_effect_one_a_block_and_are_logged() {
    let strings = strings();
    let mut queue = Commands::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Demo::<TwosComplement16>::new(&strings, consumer, 1).unwrap();
    let half = Gain::from_q15(1 << 14);
    let mut words = [0; BLOCK];
    player.render(&mut words, |_| {});
    assert!(player.is_silent());
    for (string, kind, gain) in [
        (3, Kind::Pluck, half),
        (3, Kind::Mute, Gain::UNITY),
        (3, Kind::Release, Gain::UNITY),
    ] {
        let _ = commands.enqueue(command(&strings, string, kind, gain));
    }
    // There is no such string.
    let action = Action::Mute(strings[0].muted.clone());
    let _ = commands.enqueue(Command { string: 9, action });
    let mut log = Vec::new();
    for _ in 0..6 {
        player.render(&mut words, |applied| log.push(applied));
    }
    let entry = |block: u32, kind, gain| Applied {
        frame: block * BLOCK as u32,
        string: 3,
        kind,
        gain,
        headroom: Gain::UNITY,
    };
    assert_eq!(
        log,
        [
            entry(1, Kind::Pluck, half),
            entry(2, Kind::Mute, Gain::UNITY),
            entry(3, Kind::Release, Gain::UNITY),
        ]
    );
    let counters = player.counters();
    assert_eq!((counters.blocks, counters.applied), (7, 3));
    assert_eq!(
        (counters.refused, counters.limited, counters.clipped),
        (1, 0, 0)
    );
}

#[test]
fn a_pluck_that_does_not_fit_is_limited_and_counted() {
    let strings = strings();
    let mut queue = Commands::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Demo::<TwosComplement16>::new(&strings, consumer, 1).unwrap();
    for _ in 0..4 {
        let _ = commands.enqueue(command(&strings, 0, Kind::Pluck, Gain::UNITY));
    }
    let mut log = Vec::new();
    let mut words = [0; BLOCK];
    for _ in 0..4 {
        player.render(&mut words, |applied| log.push(applied));
    }
    let limited = log.iter().filter(|applied| applied.headroom < Gain::UNITY);
    assert_eq!(player.counters().limited, limited.count() as u32);
    assert!(log[0].headroom == Gain::UNITY && log[3].headroom < Gain::UNITY);
    assert_eq!(player.counters().clipped, 0);
}

/// The mix of a pluck in block `at`, for some blocks from there on.
fn pluck_at(at: u32, blocks: usize) -> Vec<i32> {
    let strings = strings();
    let mut queue = Commands::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Demo::<TwosComplement16>::new(&strings, consumer, 1).unwrap();
    let mut words = [0; BLOCK];
    for _ in 0..at {
        player.render(&mut words, |_| {});
    }
    let _ = commands.enqueue(command(&strings, 1, Kind::Pluck, Gain::UNITY));
    let mut mix = Vec::new();
    for _ in 0..blocks {
        player.render(&mut words, |_| {});
        mix.extend(player.mix());
    }
    mix
}

#[test]
fn it_fades_in_from_a_safe_level_and_then_changes_nothing() {
    let blocks = FADE_BLOCKS as usize + 2;
    let (fading, plain) = (pluck_at(0, blocks), pluck_at(FADE_BLOCKS, blocks));
    let mut instrument = modal_core::Instrument::<STRINGS, MODES, BLOCK>::new();
    let strings = strings();
    instrument
        .add_voice(modal_core::Voice::new(&strings[1].ringing))
        .unwrap();
    let _ = instrument
        .voice_mut(0)
        .unwrap()
        .superpose(&strings[1].hardest);
    let mut bare = [0; BLOCK];
    instrument.render(&mut bare);
    assert_eq!(plain[..BLOCK], bare);

    let fade = FADE_FRAMES as usize;
    assert_eq!(fading[fade..], plain[fade..]);
    for (at, (&faded, &full)) in fading.iter().zip(&plain).enumerate().take(fade) {
        // A straight line from 1/256.
        let gain = 1.0 / 256.0 + 255.0 / 256.0 * at as f64 / fade as f64;
        let expected = gain * f64::from(full);
        assert!(
            (f64::from(faded) - expected).abs() <= 1.0 + 1e-5 * f64::from(full).abs(),
            "{at}"
        );
    }
}

fn rest_after_mute<F: DacFormat>() {
    let strings = strings();
    let mut queue = Commands::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Demo::<F>::new(&strings, consumer, 1).unwrap();
    let mut words = [0; BLOCK];
    player.render(&mut words, |_| {});
    assert_eq!(words, [F::REST; BLOCK]);
    let _ = commands.enqueue(command(&strings, 0, Kind::Pluck, Gain::UNITY));
    let _ = commands.enqueue(command(&strings, 0, Kind::Mute, Gain::UNITY));
    let mut blocks = 0;
    while blocks < 2 || !player.is_silent() {
        player.render(&mut words, |_| {});
        blocks += 1;
        assert!(
            blocks < 2_000,
            "a muted string falls silent within a second or so"
        );
    }
    for _ in 0..10 {
        player.render(&mut words, |_| {});
        assert_eq!(words, [F::REST; BLOCK]);
    }
}

#[test]
fn silence_is_the_rest_code() {
    rest_after_mute::<TwosComplement16>();
    rest_after_mute::<Unipolar12>();
}

#[test]
fn the_peak_is_that_of_the_mix() {
    let strings = strings();
    let mut queue = Commands::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Demo::<TwosComplement16>::new(&strings, consumer, 1).unwrap();
    let mut words = [0; BLOCK];
    player.render(&mut words, |_| {});
    assert_eq!(player.peak_q31(), 0);
    let _ = commands.enqueue(command(&strings, 0, Kind::Pluck, Gain::UNITY));
    player.render(&mut words, |_| {});
    let peak = player.mix().iter().map(|frame| frame.unsigned_abs()).max();
    assert_eq!(Some(player.peak_q31()), peak);
    assert!(player.peak_q31() > 0);
}

proptest! {
    /// An entry of the log survives its text; other text is refused.
    #[test]
    fn the_log_reads_back(
        frame: u32,
        string: u8,
        kind in prop_oneof![Just(Kind::Pluck), Just(Kind::Release), Just(Kind::Mute)],
        gains in [0..=1_u16 << 15, 0..=1_u16 << 15],
        noise in "[ -~]{0,40}",
    ) {
        let [gain, headroom] = gains.map(Gain::from_q15);
        let entry = Applied { frame, string, kind, gain, headroom };
        let line = entry.to_string();
        prop_assert_eq!(line.parse(), Ok(entry));
        prop_assert_eq!(format!("{line} 1").parse::<Applied>(), Err(NotApplied));
        // Anything that is read is written the same way, but for spaces.
        if let Ok(read) = noise.parse::<Applied>() {
            prop_assert_eq!(read.to_string().parse(), Ok(read));
        }
    }
}
