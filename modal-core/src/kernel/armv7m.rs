//! The kernel for ARMv7-M, ARMv7E-M and ARMv8-M with the main extension,
//! by hand: the only unsafe code of the crate.
//!
//! One mode and frame is two `smlal` and two `add`: four issue slots where the
//! long multiply takes one cycle. Compilers copy the accumulator before each
//! `smlal`, because they never let its upper half be a factor as well; the
//! architecture allows that (only equal halves are unpredictable: ARMv7-M
//! Architecture Reference Manual, SMLAL).
//!
//! Two modes fill ten registers; three frames of the block are loaded and
//! stored at a time. All groups of a bank are rendered in one call.

#![allow(unsafe_code)]

use core::arch::naked_asm;

use crate::bank::{Group, Resonator};

/// Frames that the unrolled loops below are made for.
const FRAMES: usize = 32;

/// Renders `groups` as [`super::render`] does, if the block has 32 frames;
/// otherwise nothing is done, and the answer is no.
pub(super) fn render<const B: usize>(
    groups: &[Group],
    resonators: &mut [Resonator],
    block: &mut [i32; B],
) -> bool {
    let Some(frames) = block.as_mut_array::<FRAMES>() else {
        return false;
    };
    let (mut groups, mut left) = (groups, resonators);
    while let Some((&first, after_first)) = groups.split_first() {
        // A run of groups that are whole and have an even number of modes.
        let (mut run, mut modes) = (0, 0);
        for group in groups {
            let together = modes + usize::from(group.modes);
            if !group.modes.is_multiple_of(2) || together > left.len() {
                break;
            }
            (run, modes) = (run + 1, together);
        }
        if run > 0 {
            let (now, later) = left.split_at_mut(modes);
            let (these, others) = groups.split_at(run);
            pairs(these, now, frames);
            (groups, left) = (others, later);
        } else {
            // A lone mode at the end of a group is left to the portable kernel.
            let (now, later) = left.split_at_mut(left.len().min(usize::from(first.modes)));
            let (even, lone) = now.split_at_mut(now.len() & !1);
            let modes = even.len() as u16;
            pairs(&[Group { modes, ..first }], even, frames);
            super::render_portable(first, lone, frames);
            (groups, left) = (after_first, later);
        }
    }
    true
}

/// Renders groups of even numbers of modes.
fn pairs(groups: &[Group], resonators: &mut [Resonator], frames: &mut [i32; FRAMES]) {
    if resonators.is_empty() {
        return;
    }
    // SAFETY: `frames` are 32 words. The resonators (repr(C), five words each:
    // q, velocity low and high, damping, restoring) are as many as the groups
    // (repr(C), four bytes: shift, folded, modes) have modes together, and each
    // group has a whole number of pairs: `render` counts both. All three are
    // borrowed for the call and do not overlap. The function reads and writes
    // nothing else but its own stack and keeps the procedure call standard; a
    // shift outside of the table's range is brought into it.
    unsafe {
        run(
            frames.as_mut_ptr(),
            resonators.as_mut_ptr(),
            groups.as_ptr(),
            resonators.len(),
        );
    }
}

/// Both modes of a pair, one frame: `$sum` takes what is heard by `$op`, and the
/// state moves on. q in r4 and r9, velocity in r5:r6 and r10:r11, damping in r7
/// and r12, restoring in r8 and lr.
macro_rules! frame {
    ($op:literal, $sum:literal, $shift:literal) => {
        concat!(
            $op,
            " ",
            $sum,
            ", ",
            $sum,
            ", r4\n",
            $op,
            " ",
            $sum,
            ", ",
            $sum,
            ", r9\n",
            "smlal r5, r6, r7, r6\n",
            "smlal r10, r11, r12, r11\n",
            "smlal r5, r6, r8, r4\n",
            "smlal r10, r11, lr, r9\n",
            "add r4, r4, r6",
            $shift,
            "\n",
            "add r9, r9, r11",
            $shift,
            "\n",
        )
    };
}

/// Three frames, with the operations of the first, second and third.
macro_rules! trio {
    ($a:literal, $b:literal, $c:literal, $shift:literal) => {
        concat!(
            "ldm r0, {{r1, r2, r3}}\n",
            frame!($a, "r1", $shift),
            frame!($b, "r2", $shift),
            frame!($c, "r3", $shift),
            "stm r0!, {{r1, r2, r3}}\n",
        )
    };
}

/// All pairs of a group, from r2 to [sp+4]: for each, the frames of `$half`
/// twice and those of `$rest` once. The zero flag, which nothing in between
/// touches, tells the second half from the first.
macro_rules! pairs {
    ($half:expr, $rest:expr) => {
        concat!(
            "2:\n",
            "str r2, [sp, #8]\n",
            "ldm r2, {{r4-r12, lr}}\n",
            "3:\n",
            $half,
            "beq 4f\n",
            "cmp r0, r0\n",
            "b 3b\n",
            "4:\n",
            $rest,
            "ldr r2, [sp, #8]\n",
            "stm r2!, {{r4-r12, lr}}\n",
            "ldrd r0, r1, [sp]\n",
            "cmp r2, r1\n",
            "bne 2b\n",
            "b 10b\n",
        )
    };
}

/// 15 frames, 15 frames and two.
macro_rules! plain {
    ($shift:literal) => {
        pairs!(
            concat!(
                trio!("add", "add", "add", $shift),
                trio!("add", "add", "add", $shift),
                trio!("add", "add", "add", $shift),
                trio!("add", "add", "add", $shift),
                trio!("add", "add", "add", $shift),
            ),
            concat!(
                "ldm r0, {{r1, r2}}\n",
                frame!("add", "r1", $shift),
                frame!("add", "r2", $shift),
                "stm r0, {{r1, r2}}\n",
            )
        )
    };
}

/// 16 frames and 16 frames, so that each half begins with an even one.
macro_rules! folded {
    ($shift:literal) => {
        pairs!(
            concat!(
                trio!("add", "sub", "add", $shift),
                trio!("sub", "add", "sub", $shift),
                trio!("add", "sub", "add", $shift),
                trio!("sub", "add", "sub", $shift),
                trio!("add", "sub", "add", $shift),
                "ldr r1, [r0]\n",
                frame!("sub", "r1", $shift),
                "str r1, [r0], #4\n",
            ),
            ""
        )
    };
}

/// Block, resonators, groups, and the number of modes (even, not zero).
///
/// # Safety
/// See the call in [`render`].
#[unsafe(naked)]
unsafe extern "C" fn run(_: *mut i32, _: *mut Resonator, _: *const Group, _: usize) {
    naked_asm!(
        "push {{r4-r11, lr}}",
        "sub sp, #20",
        // [sp] block, [sp+4] end of the group, [sp+8] the pair in work,
        // [sp+12] the next group, [sp+16] modes left; r2 the next pair.
        "str r0, [sp]",
        "strd r2, r3, [sp, #12]",
        "mov r2, r1",
        // The next group.
        "10:",
        "ldrd r3, r4, [sp, #12]",
        "cbz r4, 11f",
        "ldr r5, [r3], #4",
        "lsrs r6, r5, #16",
        "cmp r6, r4",
        "it hi",
        "movhi r6, r4",
        "subs r4, r4, r6",
        "strd r3, r4, [sp, #12]",
        "add r6, r6, r6, lsl #2",
        "add r1, r2, r6, lsl #2",
        "str r1, [sp, #4]",
        "ldr r0, [sp]",
        // Entry 0 for folded modes, 3 + shift for the others.
        "sxtb r7, r5",
        "tst r5, #0x100",
        "it ne",
        "movne r7, #-3",
        "adds r7, #3",
        "ssat r7, #5, r7",
        "usat r7, #4, r7",
        // An empty group: none is made, but none does harm.
        "cmp r2, r1",
        "beq 10b",
        "tbh [pc, r7, lsl #1]",
        "12:",
        ".hword (20f - 12b) / 2",
        ".hword (21f - 12b) / 2",
        ".hword (22f - 12b) / 2",
        ".hword (23f - 12b) / 2",
        ".hword (23f - 12b) / 2",
        ".hword (24f - 12b) / 2",
        ".hword (24f - 12b) / 2",
        ".hword (25f - 12b) / 2",
        ".hword (25f - 12b) / 2",
        ".hword (26f - 12b) / 2",
        ".hword (26f - 12b) / 2",
        ".hword (27f - 12b) / 2",
        ".hword (27f - 12b) / 2",
        ".hword (28f - 12b) / 2",
        ".hword (28f - 12b) / 2",
        ".hword (28f - 12b) / 2",
        "11:",
        "add sp, #20",
        "pop {{r4-r11, pc}}",
        "20:",
        folded!(", lsl #2"),
        "21:",
        plain!(", lsl #2"),
        "22:",
        plain!(", lsl #1"),
        "23:",
        plain!(""),
        "24:",
        plain!(", asr #2"),
        "25:",
        plain!(", asr #4"),
        "26:",
        plain!(", asr #6"),
        "27:",
        plain!(", asr #8"),
        "28:",
        plain!(", asr #10"),
    )
}
