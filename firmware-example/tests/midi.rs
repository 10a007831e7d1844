//! The MIDI parser against the rules of MIDI 1.0, and against another parser.

use firmware_example::midi::{Message, Parser};
use midi_stream_parser::{MidiStreamParser, ParserOutput};
use proptest::collection::vec;
use proptest::prelude::*;

fn parse(bytes: &[u8]) -> (Vec<Message>, u32) {
    let mut parser = Parser::new();
    let messages = bytes.iter().filter_map(|&byte| parser.push(byte)).collect();
    (messages, parser.garbage())
}

fn on(note: u8, velocity: u8) -> Message {
    Message::NoteOn {
        channel: 2,
        note,
        velocity,
    }
}

fn off(note: u8, velocity: u8) -> Message {
    Message::NoteOff {
        channel: 2,
        note,
        velocity,
    }
}

#[test]
fn every_rule_by_example() {
    let cases: [(&[u8], &[Message], u32); 15] = [
        // Running status; velocity 0 ends a note.
        (&[0x92, 60, 1, 61, 0], &[on(60, 1), off(61, 0)], 0),
        (&[0x82, 60, 9], &[off(60, 9)], 0),
        // Real time between the bytes of a message.
        (
            &[0x92, 0xF8, 60, 0xFE, 1],
            &[Message::RealTime(0xF8), Message::RealTime(0xFE), on(60, 1)],
            0,
        ),
        // Undefined real time: counted, disturbs nothing.
        (&[0x92, 60, 0xFD, 1], &[on(60, 1)], 1),
        // Data without a status.
        (&[1, 2, 0x92, 60, 1], &[on(60, 1)], 2),
        // System common cancels the running status, exclusive does, too.
        (&[0x92, 60, 1, 0xF3, 5, 60, 1], &[on(60, 1)], 2),
        (&[0x92, 60, 1, 0xF2, 5, 6, 60, 1], &[on(60, 1)], 2),
        (&[0x92, 60, 1, 0xF6, 60, 1], &[on(60, 1)], 2),
        (&[0x92, 60, 1, 0xF5, 60, 1], &[on(60, 1)], 3),
        (&[0x92, 60, 1, 0xF0, 1, 2, 0xF7, 60, 1], &[on(60, 1)], 2),
        // A status ends an exclusive message; an end without a start is stray.
        (&[0xF0, 1, 2, 0x92, 60, 1], &[on(60, 1)], 0),
        (&[0xF7, 0x92, 60, 1], &[on(60, 1)], 1),
        // A message cut short.
        (&[0x92, 60, 0x92, 61, 1], &[on(61, 1)], 1),
        // One data byte.
        (
            &[0xC2, 7, 8, 0xD2, 9],
            &[
                Message::ProgramChange {
                    channel: 2,
                    program: 7,
                },
                Message::ProgramChange {
                    channel: 2,
                    program: 8,
                },
                Message::ChannelPressure {
                    channel: 2,
                    pressure: 9,
                },
            ],
            0,
        ),
        // The rest.
        (
            &[0xA2, 1, 2, 0xB2, 123, 0, 0xE2, 1, 64],
            &[
                Message::KeyPressure {
                    channel: 2,
                    note: 1,
                    pressure: 2,
                },
                Message::ControlChange {
                    channel: 2,
                    controller: 123,
                    value: 0,
                },
                Message::PitchBend {
                    channel: 2,
                    value: 8_193,
                },
            ],
            0,
        ),
    ];
    for (bytes, messages, garbage) in cases {
        assert_eq!(parse(bytes), (messages.to_vec(), garbage), "{bytes:02X?}");
    }
}

/// The bytes of a message with an explicit status.
fn encode(message: Message) -> Vec<u8> {
    match message {
        Message::NoteOff {
            channel,
            note,
            velocity,
        } => vec![0x80 | channel, note, velocity],
        Message::NoteOn {
            channel,
            note,
            velocity,
        } => vec![0x90 | channel, note, velocity],
        Message::KeyPressure {
            channel,
            note,
            pressure,
        } => vec![0xA0 | channel, note, pressure],
        Message::ControlChange {
            channel,
            controller,
            value,
        } => vec![0xB0 | channel, controller, value],
        Message::ProgramChange { channel, program } => vec![0xC0 | channel, program],
        Message::ChannelPressure { channel, pressure } => vec![0xD0 | channel, pressure],
        Message::PitchBend { channel, value } => {
            vec![0xE0 | channel, (value & 0x7F) as u8, (value >> 7) as u8]
        }
        Message::RealTime(byte) => vec![byte],
    }
}

/// What the other parser makes of a stream, without what ours reads over.
fn second_opinion(bytes: &[u8]) -> Vec<Vec<u8>> {
    let mut parser = MidiStreamParser::new();
    let mut messages = Vec::new();
    for &byte in bytes {
        if let Some(ParserOutput::Message(message)) = parser.feed(byte)
            && !(0xF0..0xF8).contains(&message[0])
        {
            messages.push(message.to_vec());
        }
    }
    messages
}

/// One part of a well-formed stream.
#[derive(Clone, Debug)]
enum Part {
    Channel {
        status: u8,
        data: [u8; 2],
        running: bool,
    },
    Common(Vec<u8>),
}

fn part() -> impl Strategy<Value = Part> {
    prop_oneof![
        4 => (0x80..0xF0_u8, [0..0x80_u8, 0..0x80_u8], any::<bool>())
            .prop_map(|(status, data, running)| Part::Channel { status, data, running }),
        1 => prop_oneof![
            vec(0..0x80_u8, 0..6).prop_map(|data| [&[0xF0], data.as_slice(), &[0xF7]].concat()),
            (0..0x80_u8).prop_map(|data| vec![0xF1, data]),
            [0..0x80_u8, 0..0x80_u8].prop_map(|data| vec![0xF2, data[0], data[1]]),
            (0..0x80_u8).prop_map(|data| vec![0xF3, data]),
            Just(vec![0xF6]),
        ].prop_map(Part::Common),
    ]
}

/// A well-formed stream: a status is left out only where it is running.
fn stream(parts: Vec<Part>) -> Vec<u8> {
    let mut bytes = Vec::new();
    let mut last = None;
    for part in parts {
        match part {
            Part::Common(message) => {
                bytes.extend(message);
                last = None;
            }
            Part::Channel {
                status,
                data,
                running,
            } => {
                let status = last.filter(|_| running).unwrap_or(status);
                if last != Some(status) || !running {
                    bytes.push(status);
                }
                let len = if (0xC0..0xE0).contains(&status) { 1 } else { 2 };
                bytes.extend(&data[..len]);
                last = Some(status);
            }
        }
    }
    bytes
}

/// `stream` with real-time bytes put in anywhere.
fn interleaved(stream: &[u8], real_time: &[(u16, u8)]) -> Vec<u8> {
    let mut bytes = stream.to_vec();
    for &(at, kind) in real_time {
        let byte = [0xF8, 0xFA, 0xFB, 0xFC, 0xFE, 0xFF][usize::from(kind) % 6];
        bytes.insert(usize::from(at) % (bytes.len() + 1), byte);
    }
    bytes
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 2_000, ..ProptestConfig::default() })]

    /// Both parsers agree on well-formed streams, and ours finds no garbage.
    #[test]
    fn agrees_with_a_second_opinion(
        parts in vec(part(), 0..30),
        real_time in vec(any::<(u16, u8)>(), 0..10),
    ) {
        let bytes = interleaved(&stream(parts), &real_time);
        let (messages, garbage) = parse(&bytes);
        prop_assert_eq!(garbage, 0);
        let encoded: Vec<_> = messages.into_iter().map(encode).collect();
        // Velocity 0 ends a note: only our parser says so.
        let expected: Vec<_> = second_opinion(&bytes)
            .into_iter()
            .map(|mut message| {
                if message.len() == 3 && message[0] & 0xF0 == 0x90 && message[2] == 0 {
                    message[0] -= 0x10;
                }
                message
            })
            .collect();
        prop_assert_eq!(encoded, expected);
    }

    /// Any bytes at all: values stay in their ranges; real time changes nothing
    /// else; after a status, a message is heard whatever came before.
    #[test]
    fn any_bytes_are_survived(bytes in vec(any::<u8>(), 0..200), at in any::<u16>()) {
        let (messages, _) = parse(&bytes);
        for &message in &messages {
            let encoded = encode(message);
            prop_assert!(encoded[0] >= 0x80);
            prop_assert!(encoded[1..].iter().all(|&data| data < 0x80));
        }
        let (with_clock, _) = parse(&interleaved(&bytes, &[(at, 0)]));
        let clock = |messages: &[Message]| -> Vec<Message> {
            messages.iter().copied().filter(|&one| one != Message::RealTime(0xF8)).collect()
        };
        prop_assert_eq!(clock(&with_clock), clock(&messages));
        let (later, _) = parse(&[&bytes, [0x92, 60, 1].as_slice()].concat());
        prop_assert_eq!(later.last(), Some(&on(60, 1)));
    }
}

/// Every state that any stream can reach, with every byte: the state depends on
/// the status and the first data byte only, so these few bytes reach all.
#[test]
fn every_state_takes_every_byte() {
    for status in 0..=u8::MAX {
        for first in [None, Some(0), Some(0x7F)] {
            for byte in 0..=u8::MAX {
                let mut stream = vec![status];
                stream.extend(first);
                let (before, _) = parse(&stream);
                stream.push(byte);
                let (after, _) = parse(&stream);
                assert!(after.len() <= before.len() + 1);
                let data_completes = byte < 0x80 && (0x80..0xF0).contains(&status);
                let real_time = byte >= 0xF8 && !matches!(byte, 0xF9 | 0xFD);
                assert!(after.len() == before.len() || data_completes || real_time);
            }
        }
    }
}
