//! A converter on a serial port: one 16-bit frame is one word.

use embedded_hal::spi::SpiDevice;

/// Sends words and counts the transfers that failed.
pub struct Dac<D> {
    device: D,
    command: u16,
    errors: u32,
}

impl<D: SpiDevice<u16>> Dac<D> {
    /// A converter behind `device`. The bits of `command` are set in every
    /// frame (converters of 12 bits take a command in the upper four).
    pub const fn new(device: D, command: u16) -> Self {
        Self {
            device,
            command,
            errors: 0,
        }
    }

    /// Sends one word. A failed transfer is counted: the converter holds its
    /// level, and the next word comes one frame later anyway.
    #[inline]
    pub fn send(&mut self, word: u16) {
        if self.device.write(&[word | self.command]).is_err() {
            self.errors = self.errors.saturating_add(1);
        }
    }

    /// How many transfers failed.
    #[must_use]
    pub fn errors(&self) -> u32 {
        self.errors
    }

    /// The device behind.
    #[must_use]
    pub fn device(&self) -> &D {
        &self.device
    }
}
