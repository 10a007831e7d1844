//! The demonstration on an emulated Cortex-M4 board (QEMU `mps2-an386`).
//!
//! Three priorities, see [`firmware_example`]: a timer interrupt at 48 kHz sends
//! one word a frame over SPI; a pended interrupt below renders blocks; the main
//! program below both plays the built-in performance or follows MIDI.
//!
//! The SPI port is looped back, and every frame that comes back is kept. At the
//! end three files go to the host by semihosting, into the directory given as
//! the first argument (else the current one):
//!
//! - `words.bin`: the frames as they were on the wire, 16 bits, little-endian;
//! - `events.txt`: a line for each command that took effect, see
//!   [`firmware_example::command::Applied`];
//! - `report.txt`: `name=value` lines of what was counted and measured.
//!
//! On another target than the board's this program is empty.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod firmware;

#[cfg(not(target_os = "none"))]
fn main() {}
