//! MIDI bytes from the serial port.

use super::clock::TICKS_PER_SECOND;
use super::registers::uart_0;

/// Bits per second of MIDI.
const BAUD: u32 = 31_250;
/// Bytes per second of MIDI: a byte takes ten bits.
pub(crate) const BYTES_PER_SECOND: u32 = BAUD / 10;

/// Sets the port up to interrupt for every byte.
pub(crate) fn start() {
    uart_0::CLOCK_DIVIDER.write(TICKS_PER_SECOND / BAUD);
    uart_0::CONTROL.write(uart_0::CONTROL_RECEIVE | uart_0::CONTROL_RECEIVE_INTERRUPT);
}

/// The next byte that has arrived. Acknowledged before it is read, so that a
/// byte that comes meanwhile interrupts again.
pub(crate) fn received() -> Option<u8> {
    uart_0::INTERRUPT_CLEAR.write(uart_0::INTERRUPT_RECEIVED);
    let waiting = uart_0::STATE.read() & uart_0::STATE_RECEIVED != 0;
    waiting.then(|| uart_0::DATA.read() as u8)
}

/// Whether a byte was lost in the port; forgets it.
pub(crate) fn overrun() -> bool {
    let lost = uart_0::STATE.read() & uart_0::STATE_OVERRUN != 0;
    if lost {
        uart_0::STATE.write(uart_0::STATE_OVERRUN);
    }
    lost
}
