//! What the programs on the targets share with the host: the scene that is
//! counted, the golden stream, and the oscillators that a maker would write
//! first.
#![no_std]

pub mod baselines;
pub mod golden;
pub mod scene;
