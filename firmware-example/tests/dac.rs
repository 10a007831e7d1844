//! The converter's driver against a mocked bus and a bus that fails on plan.

use std::cell::RefCell;

use embedded_hal::spi::{ErrorKind, ErrorType, Operation, SpiDevice};
use embedded_hal_mock::eh1::spi::{Mock, Transaction};
use firmware_example::dac::Dac;

#[test]
fn one_transaction_a_word_with_the_command_bits() {
    let mut device = Mock::new(&[
        Transaction::transaction_start(),
        Transaction::write(0x3800),
        Transaction::transaction_end(),
        Transaction::transaction_start(),
        Transaction::write(0x3FFF),
        Transaction::transaction_end(),
    ]);
    let mut dac = Dac::new(&mut device, 0x3000);
    dac.send(0x0800);
    dac.send(0x0FFF);
    assert_eq!(dac.errors(), 0);
    device.done();
}

/// Fails the transfers whose bits are set; keeps what went through.
struct Planned {
    plan: u32,
    sent: RefCell<Vec<u16>>,
}

impl ErrorType for Planned {
    type Error = ErrorKind;
}

impl SpiDevice<u16> for Planned {
    fn transaction(&mut self, operations: &mut [Operation<'_, u16>]) -> Result<(), ErrorKind> {
        let fails = self.plan & 1 != 0;
        self.plan >>= 1;
        if fails {
            return Err(ErrorKind::Other);
        }
        for operation in operations {
            if let Operation::Write(words) = operation {
                self.sent.borrow_mut().extend_from_slice(words);
            }
        }
        Ok(())
    }
}

/// Every pattern of failures in 12 transfers: all are counted, and every other
/// word still goes out, in order.
#[test]
fn failures_are_counted_and_never_stop_the_words() {
    const WORDS: u16 = 12;
    for plan in 0..1_u32 << WORDS {
        let sent = RefCell::default();
        let mut dac = Dac::new(Planned { plan, sent }, 0);
        for word in 0..WORDS {
            dac.send(word);
        }
        assert_eq!(dac.errors(), plan.count_ones());
        let expected: Vec<u16> = (0..WORDS).filter(|&at| plan >> at & 1 == 0).collect();
        assert_eq!(*dac.device().sent.borrow(), expected);
    }
}
