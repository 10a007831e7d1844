//! The context below: blocks of words, made in time.

use core::sync::atomic::Ordering::Relaxed;

use firmware_example::command::{Applied, Command};
use firmware_example::demo::{BLOCK, DITHER_SEED, MODES, STRINGS};
use firmware_example::design::PreparedString;
use firmware_example::player::{Counters, Player};
use firmware_example::pump::Feed;
use heapless::spsc::{Consumer, Producer};

use super::load::Spent;
use super::{FRAME, Format, PEAK, SAMPLING_TICKS, clock};

/// What the render interrupt works with.
pub(crate) struct Rendering {
    player: Player<'static, Format, STRINGS, MODES, BLOCK>,
    feed: Feed<'static, BLOCK>,
    log: Producer<'static, Applied>,
    log_lost: u32,
    spent: Spent,
}

impl Rendering {
    /// Plays `commands` on `strings` into `feed`, and tells `log`.
    pub(crate) fn new(
        strings: &[PreparedString<MODES>],
        commands: Consumer<'static, Command<MODES>>,
        feed: Feed<'static, BLOCK>,
        log: Producer<'static, Applied>,
    ) -> modal_core::Result<Self> {
        Ok(Self {
            player: Player::new(strings, commands, DITHER_SEED)?,
            feed,
            log,
            log_lost: 0,
            spent: Spent::default(),
        })
    }

    /// Renders while there is room. The time taken by the sample interrupt
    /// meanwhile is not counted as rendering.
    pub(crate) fn fill(&mut self) {
        let Self {
            player,
            feed,
            log,
            log_lost,
            spent,
        } = self;
        feed.fill(|words| {
            let (begin, sampling) = (clock::ticks(), SAMPLING_TICKS.load(Relaxed));
            player.render(words, |applied| {
                *log_lost += u32::from(log.enqueue(applied).is_err());
            });
            PEAK.fetch_max(player.peak_q31(), Relaxed);
            FRAME.store(player.frame(), Relaxed);
            let sampling = SAMPLING_TICKS.load(Relaxed).wrapping_sub(sampling);
            spent.add(clock::ticks().wrapping_sub(begin).saturating_sub(sampling));
        });
    }

    /// What the player counted.
    pub(crate) fn counters(&self) -> Counters {
        self.player.counters()
    }

    /// Entries of the log that found the queue full.
    pub(crate) fn log_lost(&self) -> u32 {
        self.log_lost
    }

    /// Ticks spent on each block.
    pub(crate) fn spent(&self) -> Spent {
        self.spent
    }
}
