//! The first moments after power-on start at a level that is safe for ears and
//! loudspeakers.

use modal_core::fixed::FULL_SCALE_Q31;

/// The gain of the first frame, Q31: 48 dB below unity.
const START_Q31: u32 = 1 << 23;

/// Length of the fade in frames: a quarter of a second at 48 kHz.
pub const FADE_FRAMES: u32 = 12_000;

const STEP_Q31: u32 = (FULL_SCALE_Q31 - START_Q31) / FADE_FRAMES;

/// A gain that rises from −48 dB to unity in a straight line.
#[derive(Clone, Debug)]
pub struct FadeIn {
    gain: u32,
    frames_left: u32,
}

impl Default for FadeIn {
    fn default() -> Self {
        Self::new()
    }
}

impl FadeIn {
    /// A fade at its start.
    #[must_use]
    pub const fn new() -> Self {
        Self {
            gain: START_Q31,
            frames_left: FADE_FRAMES,
        }
    }

    /// Scales the next frames; gives itself back unless it is complete, so that
    /// it costs nothing from then on.
    #[must_use]
    pub fn apply(mut self, mix: &mut [i32]) -> Option<Self> {
        for frame in mix {
            if self.frames_left == 0 {
                return None;
            }
            // |frame| <= 2^31 and gain < 2^31: the result is no larger than frame.
            *frame = ((i64::from(*frame) * i64::from(self.gain)) >> 31) as i32;
            self.gain += STEP_Q31;
            self.frames_left -= 1;
        }
        (self.frames_left > 0).then_some(self)
    }
}
