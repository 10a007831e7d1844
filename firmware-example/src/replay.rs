//! The same words again, from the log alone.

use heapless::spsc::Queue;
use modal_core::{DacFormat, Result};

use crate::command::{Applied, Command};
use crate::design::PreparedString;
use crate::player::{Counters, Player};

/// Plays `log` on `strings` for `blocks` blocks and hands each block's mix (Q31)
/// and words to `each`.
///
/// A pure function: it gives the words of the run that wrote the log, if the
/// strings and the seed are the same. An entry that is not at the start of a
/// block, or out of order, stops the replay of the log there; compare
/// [`Counters::applied`] with its length.
///
/// # Errors
/// As [`Player::new`].
pub fn replay<F: DacFormat, const S: usize, const M: usize, const B: usize>(
    strings: &[PreparedString<M>],
    log: &[Applied],
    seed: u32,
    blocks: u32,
    mut each: impl FnMut(&[i32; B], &[u16; B]),
) -> Result<Counters> {
    let mut queue: Queue<Command<M>, 2> = Queue::new();
    let (mut commands, consumer) = queue.split();
    let mut player = Player::<F, S, M, B>::new(strings, consumer, seed)?;
    let mut log = log.iter().peekable();
    let mut words = [0; B];
    for _ in 0..blocks {
        if let Some(entry) = log.next_if(|entry| entry.frame == player.frame())
            && let Some(string) = strings.get(usize::from(entry.string))
        {
            // The player takes one command a block, so there is room.
            let _ = commands.enqueue(Command {
                string: entry.string,
                action: string.action(entry.kind, entry.gain),
            });
        }
        player.render(&mut words, |_| {});
        each(player.mix(), &words);
    }
    Ok(player.counters())
}
