//! The serial port as an `embedded-hal` bus of 16-bit frames, looped back to
//! itself: what went out comes in again, and is kept.

use core::convert::Infallible;

use embedded_hal::digital::{ErrorType as PinErrorType, OutputPin};
use embedded_hal::spi::{Error, ErrorKind, ErrorType, SpiBus};

use super::registers::{lines, spi};

/// Looks at the status before a transfer counts as failed.
const PATIENCE: u32 = 64;

/// A frame that came back, little-endian as in the file it goes to.
pub(crate) type Captured = [u8; 2];

/// Why a frame was not transferred.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum SpiError {
    /// The transmit buffer stayed full.
    NoRoom,
    /// Nothing came back.
    NoAnswer,
}

impl Error for SpiError {
    fn kind(&self) -> ErrorKind {
        ErrorKind::Other
    }
}

/// The serial port, with a memory of every frame that came back.
pub(crate) struct LoopedBus {
    capture: &'static mut [Captured],
    captured: usize,
}

impl LoopedBus {
    /// Sets the port up. Frames that come back go to `capture` while it has room.
    pub(crate) fn new(capture: &'static mut [Captured]) -> Self {
        spi::CONTROL_0.write(spi::CONTROL_0_WORDS_OF_16_BITS);
        // The least divisor: 12.5 MHz, as the port runs from 25 MHz.
        spi::PRESCALE.write(2);
        spi::CONTROL_1.write(spi::CONTROL_1_LOOPBACK | spi::CONTROL_1_ENABLE);
        Self {
            capture,
            captured: 0,
        }
    }

    /// Every frame that came back, in order.
    pub(crate) fn captured(&self) -> &[Captured] {
        self.capture.get(..self.captured).unwrap_or_default()
    }

    fn exchange(&mut self, frame: u16) -> Result<u16, SpiError> {
        if !patient(|| spi::STATUS.read() & spi::STATUS_ROOM_TO_SEND != 0) {
            return Err(SpiError::NoRoom);
        }
        spi::DATA.write(u32::from(frame));
        if !patient(|| spi::STATUS.read() & spi::STATUS_RECEIVED != 0) {
            return Err(SpiError::NoAnswer);
        }
        let answer = spi::DATA.read() as u16;
        if let Some(place) = self.capture.get_mut(self.captured) {
            *place = answer.to_le_bytes();
            self.captured += 1;
        }
        Ok(answer)
    }
}

fn patient(done: impl Fn() -> bool) -> bool {
    (0..PATIENCE).any(|_| done())
}

impl ErrorType for LoopedBus {
    type Error = SpiError;
}

impl SpiBus<u16> for LoopedBus {
    fn read(&mut self, words: &mut [u16]) -> Result<(), SpiError> {
        for word in words {
            *word = self.exchange(0)?;
        }
        Ok(())
    }

    fn write(&mut self, words: &[u16]) -> Result<(), SpiError> {
        words
            .iter()
            .try_for_each(|&word| self.exchange(word).map(drop))
    }

    fn transfer(&mut self, read: &mut [u16], write: &[u16]) -> Result<(), SpiError> {
        for index in 0..read.len().max(write.len()) {
            let answer = self.exchange(write.get(index).copied().unwrap_or(0))?;
            if let Some(place) = read.get_mut(index) {
                *place = answer;
            }
        }
        Ok(())
    }

    fn transfer_in_place(&mut self, words: &mut [u16]) -> Result<(), SpiError> {
        for word in words {
            *word = self.exchange(*word)?;
        }
        Ok(())
    }

    fn flush(&mut self) -> Result<(), SpiError> {
        if patient(|| spi::STATUS.read() & spi::STATUS_BUSY == 0) {
            Ok(())
        } else {
            Err(SpiError::NoAnswer)
        }
    }
}

/// The chip select of the converter: low is selected.
pub(crate) struct ChipSelect;

impl PinErrorType for ChipSelect {
    type Error = Infallible;
}

impl OutputPin for ChipSelect {
    fn set_low(&mut self) -> Result<(), Infallible> {
        lines::MISC.write(lines::MISC.read() & !lines::SPI_SELECT);
        Ok(())
    }

    fn set_high(&mut self) -> Result<(), Infallible> {
        lines::MISC.write(lines::MISC.read() | lines::SPI_SELECT);
        Ok(())
    }
}
