//! From a string to DAC words by modal synthesis, in fixed point, without an
//! allocator, a floating-point audio path or a panic.
//!
//! The road has one direction, and the modules stand in its order:
//!
//! 1. [`string`]: what the string *is*; [`loss`]: how its vibration dies;
//! 2. [`series`]: frequency and decay of mode 1, 2, 3, …;
//! 3. [`excitation`] and [`pickup`]: how it is started and where it is heard; [`plan`],
//!    [`energy`], [`hearing`]: how loud that can get and how many modes it takes;
//! 4. [`quantise`]: the one door from floating point to fixed point;
//! 5. [`bank`] (integers only from here), [`voice`], [`instrument`], [`dac`].
//!
//! ```
//! use modal_core::{
//!     Coefficients, Converter, DisplacementPickup, Instrument, ModeSeries, Onset,
//!     PointPluck, StringSpec, TwoT60, TwosComplement16, Voice, Wire, plan,
//! };
//! # fn main() -> modal_core::Result<()> {
//! // A steel wire of 0.4 mm on a 620 mm scale, tuned to 147 Hz.
//! let wire = Wire::new(0.4e-3, 7_850.0, 200.0e9)?;
//! let string = StringSpec::tuned_wire(0.620, 147.0, &wire)?;
//! let series = ModeSeries::new(string, TwoT60::new(147.0, 6.0, 4_000.0, 0.8)?);
//! let pluck = PointPluck::new(0.17, 3.0e-3)?;
//! let pickup = DisplacementPickup::new(0.11, 0.0)?;
//!
//! // Full scale is the largest swing that this pluck can reach at the pickup.
//! let full_scale = plan::l1_bound(&series, &pluck, &pickup, 48)?;
//! let coefficients = Coefficients::<48>::prepare(&series, 48, 48_000.0, 1.0)?;
//! let onset = Onset::prepare(&coefficients, &series, &pluck, &pickup, 1.01 * full_scale)?;
//!
//! // From here on: integers.
//! let mut instrument = Instrument::<1, 48, 32>::new();
//! instrument.add_voice(Voice::new(&coefficients))?;
//! let mut dac = Converter::<TwosComplement16>::new(1);
//! let (mut mix, mut words) = ([0_i32; 32], [0_u16; 32]);
//! if let Some(voice) = instrument.voice_mut(0) {
//!     voice.superpose(&onset);
//! }
//! instrument.render(&mut mix);
//! dac.convert(&mix, &mut words, instrument.is_silent());
//! assert_eq!(dac.clipped(), 0);
//! assert!(words.iter().any(|&word| word != 0));
//! # Ok(())
//! # }
//! ```
#![no_std]

#[cfg(test)]
extern crate std;

pub mod bounds;
pub mod error;

pub mod energy;
pub mod excitation;
pub mod hearing;
pub mod loss;
pub mod pickup;
pub mod plan;
pub mod series;
pub mod string;

pub mod fixed;
pub mod note;
pub mod quantise;

pub mod bank;
pub mod dac;
pub mod instrument;
pub mod kernel;
pub mod narrow;
pub mod voice;

mod maths;

pub use bank::{Bank, ModeBank};
pub use dac::{Converter, DacFormat, TwosComplement16, Unipolar12};
pub use error::{Error, Result};
pub use excitation::{Excitation, ModalState, PointPluck, RoundedPluck};
pub use fixed::Gain;
pub use instrument::Instrument;
pub use loss::{ConstantT60, Loss, TwoT60};
pub use narrow::NarrowBank;
pub use pickup::{DisplacementPickup, Pickup, PickupWeights, VelocityPickup};
pub use quantise::{Coefficients, Onset};
pub use series::{Mode, ModeSeries};
pub use string::{Core, Ends, StringSpec, Wire, WoundString};
pub use voice::{Headroom, Voice};

/// The examples of the documents beside the code, compiled.
#[cfg(doctest)]
#[doc = include_str!("../../README.md")]
#[doc = include_str!("../../DEVELOPERS.md")]
struct Documents;
