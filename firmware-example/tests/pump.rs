//! The double buffer between rendering and the sample interrupt.

use firmware_example::pump::{BlockQueue, pump};
use proptest::collection::vec;
use proptest::prelude::*;

const B: usize = 4;
const REST: u16 = 0x8000;

/// Blocks of rising words.
fn rising() -> impl FnMut(&mut [u16; B]) {
    let mut next = 0;
    move |block| {
        for word in block {
            *word = next;
            next += 1;
        }
    }
}

#[test]
fn words_in_time_come_without_a_gap() {
    let mut queue = BlockQueue::new();
    let (mut feed, mut drain) = pump::<B>(&mut queue, REST);
    let mut render = rising();
    feed.fill(&mut render);
    for expected in 0..40 {
        let frame = drain.next_frame();
        assert_eq!(frame.word, expected);
        assert_eq!(frame.room, expected % B as u16 == 0);
        if frame.room {
            feed.fill(&mut render);
        }
    }
    assert_eq!((drain.late_blocks(), drain.held_frames()), (0, 0));
}

#[test]
fn a_late_block_holds_the_last_word() {
    let mut queue = BlockQueue::new();
    let (mut feed, mut drain) = pump::<B>(&mut queue, REST);
    let mut render = rising();
    // Nothing was rendered yet: at rest.
    assert_eq!(drain.next_frame().word, REST);
    feed.fill(&mut render);
    let words: Vec<u16> = (0..7).map(|_| drain.next_frame().word).collect();
    assert_eq!(words, [0, 1, 2, 3, 3, 3, 3]);
    feed.fill(&mut render);
    assert_eq!(drain.next_frame().word, 4);
    assert_eq!((drain.late_blocks(), drain.held_frames()), (2, 4));
}

proptest! {
    /// Whenever rendering comes: no word is lost or doubled, and what is not a
    /// new word is the one before.
    #[test]
    fn no_word_is_lost(rendered_before in vec(any::<bool>(), 1..300)) {
        let mut queue = BlockQueue::new();
        let (mut feed, mut drain) = pump::<B>(&mut queue, REST);
        let mut render = rising();
        let (mut last, mut held, mut late) = (None, 0, 0);
        let mut starved = false;
        for in_time in rendered_before {
            if in_time {
                feed.fill(&mut render);
            }
            let word = drain.next_frame().word;
            let next = last.map_or(0, |last| last + 1);
            if word == next {
                last = Some(word);
                starved = false;
            } else {
                prop_assert_eq!(word, last.unwrap_or(REST));
                held += 1;
                late += u32::from(!starved);
                starved = true;
            }
        }
        prop_assert_eq!((drain.late_blocks(), drain.held_frames()), (late, held));
    }
}
