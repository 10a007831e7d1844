//! Our own demonstration: an instrument and a performance that are both
//! **invented**. No existing instrument, tuning or tune is meant. Gauges,
//! losses and places are plausible guesses, not measurements.

use modal_core::{DisplacementPickup, Result, StringSpec, TwoT60, Wire};

use crate::control::Gesture::{Mute, MuteAll, Pluck};
use crate::design::{Design, StringDesign, Stroke};
use crate::fade::FADE_FRAMES;
use crate::performance::{Cue, Performer};

/// Number of strings.
pub const STRINGS: usize = 5;
/// Modes of each string.
pub const MODES: usize = 48;
/// Frames per block.
pub const BLOCK: usize = 32;
/// Frames per second.
pub const SAMPLE_RATE_HZ: u32 = 48_000;
/// Where the dither starts.
pub const DITHER_SEED: u32 = 0x2545_F491;

/// Blocks from power-on to the end: 10.75 s.
pub const BLOCKS: u32 = 43 * SAMPLE_RATE_HZ / (4 * BLOCK as u32);
/// Frames from power-on to the end.
pub const FRAMES: usize = BLOCKS as usize * BLOCK;

const LENGTH_M: f64 = 0.65;
const STEEL: (f64, f64) = (7_850.0, 200.0e9);
const BRONZE: (f64, f64) = (8_800.0, 105.0e9);

/// The instrument.
///
/// # Errors
/// None: the tests prepare it.
pub fn design() -> Result<Design<STRINGS, MODES>> {
    let plain = |pitch_hz, diameter_m, (density, modulus)| {
        StringSpec::tuned_wire(
            LENGTH_M,
            pitch_hz,
            &Wire::new(diameter_m, density, modulus)?,
        )
    };
    // A wound string is as heavy as its winding and as stiff as its core.
    let wound = |pitch_hz, linear_density_kg_per_m, core_diameter_m| {
        let core = Wire::new(core_diameter_m, STEEL.0, STEEL.1)?;
        let stiffness = core.bending_stiffness_n_m2();
        StringSpec::tuned(LENGTH_M, pitch_hz, linear_density_kg_per_m, stiffness)
    };
    Ok(Design {
        strings: [
            string(41, wound(87.3, 6.0e-3, 0.45e-3)?, [5.5, 0.9], 0.23, 4.0e-3)?,
            string(48, wound(130.8, 2.9e-3, 0.36e-3)?, [5.0, 0.9], 0.19, 3.5e-3)?,
            string(55, plain(196.0, 0.50e-3, BRONZE)?, [3.6, 0.7], 0.27, 3.0e-3)?,
            string(58, plain(233.1, 0.42e-3, STEEL)?, [4.2, 0.8], 0.14, 3.0e-3)?,
            string(65, plain(349.2, 0.30e-3, STEEL)?, [3.2, 0.8], 0.31, 2.5e-3)?,
        ],
        sample_rate_hz: f64::from(SAMPLE_RATE_HZ),
        hardest_plucks_at_once: 1.5,
    })
}

/// A string that is heard at a fifth of its length. `t60_s`: at its pitch, and
/// at 4 kHz.
fn string(
    note: u8,
    spec: StringSpec,
    t60_s: [f64; 2],
    place: f64,
    hardest_m: f64,
) -> Result<StringDesign> {
    const HIGH_HZ: f64 = 4_000.0;
    let pitch_hz = spec.ideal_fundamental_hz();
    Ok(StringDesign {
        note,
        spec,
        ringing: TwoT60::new(pitch_hz, t60_s[0], HIGH_HZ, t60_s[1])?,
        muted: TwoT60::new(pitch_hz, 0.16, HIGH_HZ, 0.05)?,
        stroke: Stroke {
            place,
            width_m: 6.0e-3,
            hardest_m,
        },
        pickup: DisplacementPickup::new(0.2, 10.0e-3)?,
    })
}

/// The performance: single notes, a chord let ring, plucks of strings that
/// still sound, mutes, and a last mute that ends in exact silence.
pub const PERFORMANCE: &[Cue] = &[
    cue(
        0,
        Pluck {
            string: 0,
            velocity: 96,
        },
    ),
    cue(
        620,
        Pluck {
            string: 2,
            velocity: 84,
        },
    ),
    cue(
        930,
        Pluck {
            string: 4,
            velocity: 70,
        },
    ),
    cue(
        1_240,
        Pluck {
            string: 1,
            velocity: 101,
        },
    ),
    cue(1_550, Mute { string: 4 }),
    cue(
        1_860,
        Pluck {
            string: 3,
            velocity: 58,
        },
    ),
    cue(
        2_015,
        Pluck {
            string: 3,
            velocity: 74,
        },
    ),
    cue(
        2_170,
        Pluck {
            string: 3,
            velocity: 90,
        },
    ),
    cue(2_480, Mute { string: 0 }),
    cue(2_790, MuteAll),
    // The chord.
    cue(
        3_100,
        Pluck {
            string: 0,
            velocity: 104,
        },
    ),
    cue(
        3_130,
        Pluck {
            string: 1,
            velocity: 92,
        },
    ),
    cue(
        3_160,
        Pluck {
            string: 2,
            velocity: 92,
        },
    ),
    cue(
        3_190,
        Pluck {
            string: 3,
            velocity: 88,
        },
    ),
    cue(
        3_220,
        Pluck {
            string: 4,
            velocity: 110,
        },
    ),
    // Plucked again while it rings.
    cue(
        4_340,
        Pluck {
            string: 2,
            velocity: 76,
        },
    ),
    cue(
        4_650,
        Pluck {
            string: 4,
            velocity: 62,
        },
    ),
    cue(
        4_960,
        Pluck {
            string: 0,
            velocity: 80,
        },
    ),
    cue(5_270, Mute { string: 1 }),
    cue(
        5_580,
        Pluck {
            string: 3,
            velocity: 96,
        },
    ),
    // A string plucked while a hand just left it.
    cue(
        5_890,
        Pluck {
            string: 1,
            velocity: 66,
        },
    ),
    cue(6_045, Mute { string: 1 }),
    cue(
        6_200,
        Pluck {
            string: 1,
            velocity: 99,
        },
    ),
    cue(
        6_820,
        Pluck {
            string: 0,
            velocity: 40,
        },
    ),
    // All at once.
    cue(
        7_440,
        Pluck {
            string: 4,
            velocity: 82,
        },
    ),
    cue(
        7_440,
        Pluck {
            string: 2,
            velocity: 82,
        },
    ),
    cue(
        7_440,
        Pluck {
            string: 0,
            velocity: 82,
        },
    ),
    cue(8_060, Mute { string: 2 }),
    cue(8_370, Mute { string: 4 }),
    cue(
        8_680,
        Pluck {
            string: 3,
            velocity: 31,
        },
    ),
    cue(9_610, MuteAll),
];

const fn cue(at_ms: u32, gesture: crate::control::Gesture) -> Cue {
    Cue { at_ms, gesture }
}

/// The performance, from the end of the fade-in on.
#[must_use]
pub const fn performer() -> Performer<'static> {
    Performer::new(PERFORMANCE, FADE_FRAMES, SAMPLE_RATE_HZ)
}
