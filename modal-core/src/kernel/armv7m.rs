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
//! stored at a time. The second half of the block is told from the first by the
//! zero flag, which nothing in between touches.

#![allow(unsafe_code)]

use core::arch::naked_asm;

use crate::bank::{Group, Resonator};

/// Frames that the unrolled loops below are made for.
const FRAMES: usize = 32;

/// Renders what this kernel can (pairs of modes, blocks of 32) and hands back
/// what is left.
pub(super) fn render<'a, const B: usize>(
    group: Group,
    resonators: &'a mut [Resonator],
    block: &mut [i32; B],
) -> &'a mut [Resonator] {
    if B != FRAMES {
        return resonators;
    }
    let run = if group.folded {
        folded
    } else {
        match group.shift {
            10..=i8::MAX => shift_10,
            8..=9 => shift_8,
            6..=7 => shift_6,
            4..=5 => shift_4,
            2..=3 => shift_2,
            0..=1 => shift_0,
            -1 => shift_minus_1,
            i8::MIN..=-2 => shift_minus_2,
        }
    };
    let (pairs, left) = resonators.split_at_mut(resonators.len() & !1);
    let ends = pairs.as_mut_ptr_range();
    // SAFETY: `block` points to B = 32 words, and `start..end` is a whole number
    // of pairs of `Resonator` (repr(C), ten words a pair: q, velocity low and
    // high, damping, restoring, twice). Both are borrowed mutably for the call,
    // word-aligned, and do not overlap. The function reads and writes nothing
    // else but its own stack and keeps the procedure call standard.
    unsafe { run(block.as_mut_ptr(), ends.end, ends.start) };
    left
}

/// A kernel: the block, the end and the start of the pairs.
type Kernel = unsafe extern "C" fn(*mut i32, *mut Resonator, *mut Resonator);

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

/// A kernel whose half-blocks are `$half`, followed once by `$rest`.
macro_rules! kernel {
    ($name:ident, $half:expr, $rest:expr) => {
        /// # Safety
        /// See the call in [`render`].
        #[unsafe(naked)]
        unsafe extern "C" fn $name(_: *mut i32, _: *mut Resonator, _: *mut Resonator) {
            naked_asm!(
                "push {{r4-r11, lr}}",
                // [sp] block, [sp+4] end, [sp+8] the pair in work.
                "push {{r0, r1, r2}}",
                "cmp r2, r1",
                "beq 9f",
                // A pair; the zero flag is clear.
                "2:",
                "str r2, [sp, #8]",
                "ldm r2, {{r4-r12, lr}}",
                "3:",
                $half,
                "beq 4f",
                "cmp r0, r0",
                "b 3b",
                "4:",
                $rest,
                "ldr r2, [sp, #8]",
                "stm r2!, {{r4-r12, lr}}",
                "ldrd r0, r1, [sp]",
                "cmp r2, r1",
                "bne 2b",
                "9:",
                "add sp, #12",
                "pop {{r4-r11, pc}}",
            )
        }
        const _: Kernel = $name;
    };
}

/// 15 frames, 15 frames and two.
macro_rules! plain {
    ($name:ident, $shift:literal) => {
        kernel!(
            $name,
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
        );
    };
}

plain!(shift_10, ", asr #10");
plain!(shift_8, ", asr #8");
plain!(shift_6, ", asr #6");
plain!(shift_4, ", asr #4");
plain!(shift_2, ", asr #2");
plain!(shift_0, "");
plain!(shift_minus_1, ", lsl #1");
plain!(shift_minus_2, ", lsl #2");

// 16 frames and 16 frames, so that each half begins with an even one.
kernel!(
    folded,
    concat!(
        trio!("add", "sub", "add", ", lsl #2"),
        trio!("sub", "add", "sub", ", lsl #2"),
        trio!("add", "sub", "add", ", lsl #2"),
        trio!("sub", "add", "sub", ", lsl #2"),
        trio!("add", "sub", "add", ", lsl #2"),
        "ldr r1, [r0]\n",
        frame!("sub", "r1", ", lsl #2"),
        "str r1, [r0], #4\n",
    ),
    ""
);
