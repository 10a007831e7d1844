//! From gestures and MIDI messages to commands.
#![allow(clippy::unwrap_used, reason = "a test may stop")]

use firmware_example::command::{Action, Command, Kind};
use firmware_example::control::{Control, Gesture, pluck_gain};
use firmware_example::demo::{MODES, STRINGS, design};
use firmware_example::design::PreparedString;
use firmware_example::midi::Message;
use heapless::spsc::{Consumer, Queue};
use modal_core::Gain;
use proptest::collection::vec;
use proptest::prelude::*;

type Strings = heapless::Vec<PreparedString<MODES>, STRINGS>;

fn strings() -> Strings {
    design().unwrap().prepare().unwrap()
}

fn kind(command: &Command<MODES>) -> Kind {
    match command.action {
        Action::Pluck { .. } => Kind::Pluck,
        Action::Release(_) => Kind::Release,
        Action::Mute(_) => Kind::Mute,
    }
}

fn drained(commands: &mut Consumer<'_, Command<MODES>>) -> Vec<(u8, Kind)> {
    std::iter::from_fn(|| commands.dequeue())
        .map(|command| (command.string, kind(&command)))
        .collect()
}

#[test]
fn a_harder_touch_is_a_higher_pluck() {
    assert_eq!(pluck_gain(127), Gain::UNITY);
    assert_eq!(pluck_gain(255), Gain::UNITY);
    for velocity in 0..127 {
        assert!(
            pluck_gain(velocity) < pluck_gain(velocity + 1),
            "{velocity}"
        );
        let exact_db = 30.0 * (f64::from(velocity) / 127.0 - 1.0);
        let gain_db = 20.0 * (f64::from(pluck_gain(velocity).q15()) / 32_768.0).log10();
        assert!(
            (gain_db - exact_db).abs() < 0.05,
            "{velocity}: {gain_db} {exact_db}"
        );
    }
}

#[test]
fn notes_play_their_strings() {
    let strings = strings();
    let mut queue = Queue::<_, 16>::new();
    let (producer, mut commands) = queue.split();
    let mut control = Control::<STRINGS, MODES>::new(&strings, producer);
    let note = strings[2].note;
    let (channel, velocity) = (9, 100);
    let on = Message::NoteOn {
        channel,
        note,
        velocity,
    };
    let off = Message::NoteOff {
        channel,
        note,
        velocity,
    };
    for message in [on, off, off, on, on] {
        control.message(message);
    }
    let expected = [
        Kind::Pluck,
        Kind::Mute,
        Kind::Release,
        Kind::Pluck,
        Kind::Pluck,
    ];
    assert_eq!(drained(&mut commands), expected.map(|kind| (2, kind)));

    let (note, controller, value) = (note + 1, 123, 0);
    control.message(Message::NoteOn {
        channel,
        note,
        velocity,
    });
    assert_eq!(control.counters().unknown_strings, 1);
    control.message(Message::ControlChange {
        channel,
        controller,
        value,
    });
    let all: Vec<_> = (0..STRINGS as u8)
        .map(|string| (string, Kind::Mute))
        .collect();
    assert_eq!(drained(&mut commands), all);
    // They are muted already.
    control.message(Message::RealTime(0xFF));
    assert_eq!(drained(&mut commands), []);
}

#[test]
fn the_pluck_is_as_high_as_its_velocity() {
    let strings = strings();
    let mut queue = Queue::<_, 4>::new();
    let (producer, mut commands) = queue.split();
    let mut control = Control::<STRINGS, MODES>::new(&strings, producer);
    control.gesture(Gesture::Pluck {
        string: 1,
        velocity: 64,
    });
    match commands.dequeue().unwrap().action {
        Action::Pluck { gain, onset } => {
            assert_eq!(gain, pluck_gain(64));
            assert_eq!(onset, strings[1].hardest.scaled(gain));
        }
        other => assert!(matches!(other, Action::Pluck { .. })),
    }
}

#[test]
fn a_full_queue_loses_plucks_but_no_mute() {
    let strings = strings();
    // Room for two commands.
    let mut queue = Queue::<_, 3>::new();
    let (producer, mut commands) = queue.split();
    let mut control = Control::<STRINGS, MODES>::new(&strings, producer);
    for string in 0..3 {
        control.gesture(Gesture::Pluck {
            string,
            velocity: 90,
        });
    }
    control.gesture(Gesture::Mute { string: 0 });
    // A later pluck must not overtake the mute.
    control.gesture(Gesture::Pluck {
        string: 0,
        velocity: 90,
    });
    assert_eq!(control.counters().lost_plucks, 2);
    assert_eq!(control.counters().postponed_mutes, 1);
    assert!(control.is_pending());
    assert_eq!(drained(&mut commands), [(0, Kind::Pluck), (1, Kind::Pluck)]);
    control.poll();
    assert!(!control.is_pending());
    assert_eq!(drained(&mut commands), [(0, Kind::Mute)]);
}

fn gesture() -> impl Strategy<Value = Gesture> {
    // One string more than there are.
    let string = 0..=STRINGS as u8;
    prop_oneof![
        3 => (string.clone(), 1..=127_u8).prop_map(|(string, velocity)| Gesture::Pluck { string, velocity }),
        3 => string.prop_map(|string| Gesture::Mute { string }),
        1 => Just(Gesture::MuteAll),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 300, ..ProptestConfig::default() })]

    /// Whatever is played, however slowly the queue is emptied: in the end every
    /// string whose last gesture was a mute is muted, no pluck falls on a muted
    /// string, and every pluck arrived or was counted.
    #[test]
    fn no_mute_is_ever_lost(steps in vec((gesture(), 0..3_usize), 0..80)) {
        let strings = strings();
        let mut queue = Queue::<_, 5>::new();
        let (producer, mut commands) = queue.split();
        let mut control = Control::<STRINGS, MODES>::new(&strings, producer);
        let mut done = Vec::new();
        let mut wanted_muted = [false; STRINGS];
        let (mut plucks, mut lost) = (0, 0);
        for (gesture, taken) in steps {
            control.gesture(gesture);
            let lost_before = std::mem::replace(&mut lost, control.counters().lost_plucks);
            match gesture {
                Gesture::Mute { string } => {
                    if let Some(muted) = wanted_muted.get_mut(usize::from(string)) {
                        *muted = true;
                    }
                }
                Gesture::MuteAll => wanted_muted.fill(true),
                Gesture::Pluck { string, .. } => {
                    if let Some(muted) = wanted_muted.get_mut(usize::from(string)) {
                        plucks += 1;
                        *muted &= lost != lost_before;
                    }
                }
            }
            for _ in 0..taken {
                done.extend(commands.dequeue().map(|command| (command.string, kind(&command))));
            }
        }
        while control.is_pending() {
            done.extend(drained(&mut commands));
            control.poll();
        }
        done.extend(drained(&mut commands));
        let mut muted = [false; STRINGS];
        let mut arrived = 0;
        for (string, kind) in done {
            let muted = &mut muted[usize::from(string)];
            match kind {
                Kind::Mute => *muted = true,
                Kind::Release => *muted = false,
                Kind::Pluck => {
                    prop_assert!(!*muted);
                    arrived += 1;
                }
            }
        }
        prop_assert_eq!(muted, wanted_muted);
        prop_assert_eq!(arrived + lost, plucks);
    }
}
