//! Between rendering and the sample interrupt: one block sounds while the next
//! one is made.

use heapless::spsc::{Consumer, Producer, Queue};

/// One block waits while one sounds. (A queue of this kind holds one less than
/// its size.)
pub type BlockQueue<const B: usize> = Queue<[u16; B], 2>;

/// The side of the rendering context.
pub struct Feed<'a, const B: usize> {
    blocks: Producer<'a, [u16; B]>,
}

/// The side of the sample interrupt.
pub struct Drain<'a, const B: usize> {
    blocks: Consumer<'a, [u16; B]>,
    block: [u16; B],
    at: usize,
    last: u16,
    starving: bool,
    late_blocks: u32,
    held_frames: u32,
}

/// What the sample interrupt sends next.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Frame {
    /// The word.
    pub word: u16,
    /// Whether a block was begun, so that there is room for another one.
    pub room: bool,
}

/// Both sides. Until the first block comes, the `rest` word is sent.
pub fn pump<const B: usize>(queue: &mut BlockQueue<B>, rest: u16) -> (Feed<'_, B>, Drain<'_, B>) {
    let (producer, consumer) = queue.split();
    let feed = Feed { blocks: producer };
    let drain = Drain {
        blocks: consumer,
        block: [rest; B],
        at: B,
        last: rest,
        starving: false,
        late_blocks: 0,
        held_frames: 0,
    };
    (feed, drain)
}

impl<const B: usize> Feed<'_, B> {
    /// Renders blocks with `render` while there is room for them.
    pub fn fill(&mut self, mut render: impl FnMut(&mut [u16; B])) {
        while self.blocks.ready() {
            let mut block = [0; B];
            render(&mut block);
            // There is room, and this is the only producer.
            let _ = self.blocks.enqueue(block);
        }
    }
}

impl<const B: usize> Drain<'_, B> {
    /// The word of the next frame. If no block is ready in time, the last word
    /// is repeated until one is: the output stands still, without a jump.
    #[inline]
    pub fn next_frame(&mut self) -> Frame {
        let mut room = false;
        if self.at >= B {
            room = self.begin();
        }
        if let Some(&word) = self.block.get(self.at) {
            self.at += 1;
            self.last = word;
        }
        Frame {
            word: self.last,
            room,
        }
    }

    /// Blocks that were not ready in time.
    #[must_use]
    pub fn late_blocks(&self) -> u32 {
        self.late_blocks
    }

    /// Frames that repeated the word before them for want of a block.
    #[must_use]
    pub fn held_frames(&self) -> u32 {
        self.held_frames
    }

    fn begin(&mut self) -> bool {
        if let Some(block) = self.blocks.dequeue() {
            self.block = block;
            self.at = 0;
            self.starving = false;
            return true;
        }
        if !self.starving {
            self.starving = true;
            self.late_blocks = self.late_blocks.saturating_add(1);
        }
        self.held_frames = self.held_frames.saturating_add(1);
        false
    }
}
