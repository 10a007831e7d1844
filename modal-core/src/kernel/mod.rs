//! The inner loop, behind one function.

#[cfg(kernel = "armv7m")]
mod armv7m;
mod portable;

use crate::bank::{FOLDED_SHIFT, Group, Resonator};

/// Which kernel this build uses; firmware prints it.
pub const NAME: &str = if cfg!(kernel = "armv7m") {
    "armv7m"
} else {
    "portable"
};

/// Adds the next `B` frames (an even number) of all `resonators` to `block`.
///
/// `groups` tell their forms, one group after the other; resonators beyond the
/// groups are not rendered. A shift that is not in [`crate::bank::SHIFTS`] is
/// taken as the next lower one. Every target computes the same bits.
pub fn render<const B: usize>(
    groups: &[Group],
    resonators: &mut [Resonator],
    block: &mut [i32; B],
) {
    #[cfg(kernel = "armv7m")]
    if armv7m::render(groups, resonators, block) {
        return;
    }
    let mut left = resonators;
    for group in groups {
        let modes = usize::from(group.modes).min(left.len());
        let (now, later) = left.split_at_mut(modes);
        render_portable(*group, now, block);
        left = later;
    }
}

/// One group by the portable kernel, whatever the target: the truth that the
/// others are measured against.
pub fn render_portable<const B: usize>(
    group: Group,
    resonators: &mut [Resonator],
    block: &mut [i32; B],
) {
    const {
        assert!(B.is_multiple_of(2), "folded modes need an even block");
    }
    let run = if group.folded {
        portable::render::<{ FOLDED_SHIFT as i32 }, true, B>
    } else {
        match group.shift {
            10..=i8::MAX => portable::render::<10, false, B>,
            8..=9 => portable::render::<8, false, B>,
            6..=7 => portable::render::<6, false, B>,
            4..=5 => portable::render::<4, false, B>,
            2..=3 => portable::render::<2, false, B>,
            0..=1 => portable::render::<0, false, B>,
            -1 => portable::render::<-1, false, B>,
            i8::MIN..=-2 => portable::render::<-2, false, B>,
        }
    };
    run(resonators, block);
}
