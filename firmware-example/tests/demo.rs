//! The invented instrument and performance, played without hardware.
#![allow(clippy::unwrap_used, reason = "a test may stop")]

use firmware_example::command::{Applied, Kind};
use firmware_example::control::Control;
use firmware_example::demo::{
    self, BLOCK, BLOCKS, DITHER_SEED, FRAMES, MODES, PERFORMANCE, SAMPLE_RATE_HZ, STRINGS,
};
use firmware_example::fade::FADE_FRAMES;
use firmware_example::player::{Counters, Player};
use firmware_example::replay::replay;
use heapless::spsc::Queue;
use modal_core::{DacFormat, TwosComplement16};

struct Run {
    words: Vec<u16>,
    mix: Vec<i32>,
    log: Vec<Applied>,
    counters: Counters,
    lost: firmware_example::control::Counters,
}

/// The three contexts taken in turn, a block at a time.
fn run() -> Run {
    let strings = demo::design().unwrap().prepare().unwrap();
    let mut queue = Queue::<_, 16>::new();
    let (commands, consumer) = queue.split();
    let mut control = Control::<STRINGS, MODES>::new(&strings, commands);
    let mut performer = demo::performer();
    let mut player =
        Player::<TwosComplement16, STRINGS, MODES, BLOCK>::new(&strings, consumer, DITHER_SEED)
            .unwrap();
    let (mut words, mut mix, mut log) = (Vec::new(), Vec::new(), Vec::new());
    let mut block = [0; BLOCK];
    for _ in 0..BLOCKS {
        while let Some(gesture) = performer.due(player.frame()) {
            control.gesture(gesture);
        }
        control.poll();
        player.render(&mut block, |applied| log.push(applied));
        words.extend(block);
        mix.extend(player.mix());
    }
    assert!(performer.is_over());
    Run {
        words,
        mix,
        log,
        counters: player.counters(),
        lost: control.counters(),
    }
}

#[test]
fn the_performance_fits_the_instrument() {
    let run = run();
    assert_eq!(run.words.len(), FRAMES);
    assert!(FRAMES >= 8 * SAMPLE_RATE_HZ as usize);
    assert_eq!(run.lost, firmware_example::control::Counters::default());
    let Counters {
        blocks,
        applied,
        limited,
        refused,
        clipped,
    } = run.counters;
    assert_eq!((blocks, limited, refused, clipped), (BLOCKS, 0, 0, 0));
    assert_eq!(applied as usize, run.log.len());
    let plucks = run.log.iter().filter(|entry| entry.kind == Kind::Pluck);
    let wanted = PERFORMANCE.iter().filter(|cue| {
        matches!(
            cue.gesture,
            firmware_example::control::Gesture::Pluck { .. }
        )
    });
    assert_eq!(plucks.count(), wanted.count());
    assert!(run.log.iter().all(|entry| entry.frame >= FADE_FRAMES));
    // Loud enough to be worth listening to.
    let peak = run
        .mix
        .iter()
        .map(|frame| frame.unsigned_abs())
        .max()
        .unwrap();
    assert!(peak > 1 << 28, "{peak}");
}

#[test]
fn it_ends_in_exact_silence() {
    let run = run();
    let last = run
        .words
        .iter()
        .rposition(|&word| word != TwosComplement16::REST)
        .unwrap();
    let silent_frames = FRAMES - 1 - last;
    assert!(
        silent_frames >= SAMPLE_RATE_HZ as usize / 4,
        "{silent_frames}"
    );
}

#[test]
fn the_log_gives_the_same_words_again() {
    let run = run();
    let strings = demo::design().unwrap().prepare().unwrap();
    let (mut words, mut mix) = (Vec::<u16>::new(), Vec::<i32>::new());
    let counters = replay::<TwosComplement16, STRINGS, MODES, BLOCK>(
        &strings,
        &run.log,
        DITHER_SEED,
        BLOCKS,
        |block_mix, block_words| {
            mix.extend(block_mix);
            words.extend(block_words);
        },
    )
    .unwrap();
    assert!(words == run.words);
    assert!(mix == run.mix);
    assert_eq!(counters, run.counters);
    // The control: another log, other words.
    let mut other = Vec::<u16>::new();
    replay::<TwosComplement16, STRINGS, MODES, BLOCK>(
        &strings,
        &run.log[1..],
        DITHER_SEED,
        BLOCKS,
        |_, block_words| other.extend(block_words),
    )
    .unwrap();
    assert!(other != run.words);
}

/// Invented, but not absurd: tensions that a hand and a wire can bear.
#[test]
fn the_strings_could_be_built() {
    for string in demo::design().unwrap().strings {
        let tension_n = string.spec.tension_n();
        assert!((60.0..140.0).contains(&tension_n), "{tension_n} N");
        let highest_hz = string.ringing_series().frequency_hz(MODES as u32);
        assert!(
            highest_hz < 0.45 * f64::from(SAMPLE_RATE_HZ),
            "{highest_hz} Hz"
        );
    }
}
