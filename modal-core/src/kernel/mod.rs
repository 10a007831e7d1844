//! The inner loop, behind one function.

mod portable;

use crate::bank::{Coefficient, State};

/// Which kernel this build uses; firmware prints it.
pub const NAME: &str = "portable";

/// Adds the next `B` frames of a group of modes of equal scale shift to `block`.
///
/// Slices of different length: the shorter counts. A shift outside
/// [`crate::bank::SHIFTS`] is taken as the nearest within.
pub fn render<const B: usize>(
    shift: i8,
    coefficients: &[Coefficient],
    states: &mut [State],
    block: &mut [i32; B],
) {
    let run = match shift {
        i8::MIN..=-3 => portable::render::<-3, B>,
        -2 => portable::render::<-2, B>,
        -1 => portable::render::<-1, B>,
        0 => portable::render::<0, B>,
        1 => portable::render::<1, B>,
        2 => portable::render::<2, B>,
        3 => portable::render::<3, B>,
        4 => portable::render::<4, B>,
        5 => portable::render::<5, B>,
        6 => portable::render::<6, B>,
        7 => portable::render::<7, B>,
        8 => portable::render::<8, B>,
        9 => portable::render::<9, B>,
        10..=i8::MAX => portable::render::<10, B>,
    };
    run(coefficients, states, block);
}
