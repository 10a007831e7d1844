//! The player of an electronic string instrument, without any hardware: what
//! goes in are MIDI bytes or gestures, what comes out are words for a converter.
//!
//! Three contexts share the work; what passes between them goes through
//! single-producer single-consumer queues, so none ever waits for another.
//!
//! 1. **Control** (main program, floating point allowed): [`midi`] bytes or a
//!    built-in [`performance`] become gestures; [`control`] turns them into
//!    [`command`]s for the strings of a [`design`]; [`meter`] shows the level.
//! 2. **Rendering** (low-priority interrupt, integers only): the [`player`]
//!    applies commands at block boundaries and makes blocks of words, behind a
//!    [`fade`]-in after power-on.
//! 3. **Sampling** (the most urgent interrupt): takes a word from the [`pump`]
//!    and sends it to the [`dac`] over SPI.
//!
//! Nothing on this way is fatal: late blocks, failed transfers, full queues and
//! bytes without sense are counted. The player logs what it applied and when;
//! [`mod@replay`] makes the same words again from that log. [`demo`] is our own
//! invented instrument with a performance.
#![no_std]

pub mod design;

pub mod midi;
pub mod performance;

pub mod command;
pub mod control;
pub mod meter;

pub mod fade;
pub mod player;

pub mod dac;
pub mod pump;

pub mod demo;
pub mod replay;
