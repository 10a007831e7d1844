//! The board's registers and interrupts: every address, and the only `unsafe`
//! of this program.
//!
//! Addresses and bits from memory, after Arm Application Note 386, the
//! Cortex-M System Design Kit manual and the PL022 manual; they are checked by
//! running: the timer against a second timer, the SPI by its loopback.
#![allow(unsafe_code)]

use cortex_m::Peripherals;
use cortex_m::peripheral::NVIC;
use cortex_m::peripheral::scb::SystemHandler;

/// One 32-bit device register.
pub(crate) struct Register(usize);

impl Register {
    /// Reads the register.
    #[inline(always)]
    pub(crate) fn read(&self) -> u32 {
        // SAFETY: only this file makes registers, and every address below is an
        // aligned device register of this board, whose reads and writes touch
        // no memory that Rust knows of.
        unsafe { core::ptr::with_exposed_provenance::<u32>(self.0).read_volatile() }
    }

    /// Writes the register.
    #[inline(always)]
    pub(crate) fn write(&self, value: u32) {
        // SAFETY: as in `read`.
        unsafe { core::ptr::with_exposed_provenance_mut::<u32>(self.0).write_volatile(value) }
    }
}

/// PL022 synchronous serial port 0.
pub(crate) mod spi {
    use super::Register;

    pub(crate) const CONTROL_0: Register = Register(0x4002_0000);
    pub(crate) const CONTROL_1: Register = Register(0x4002_0004);
    pub(crate) const DATA: Register = Register(0x4002_0008);
    pub(crate) const STATUS: Register = Register(0x4002_000C);
    pub(crate) const PRESCALE: Register = Register(0x4002_0010);

    pub(crate) const CONTROL_0_WORDS_OF_16_BITS: u32 = 0x0F;
    pub(crate) const CONTROL_1_LOOPBACK: u32 = 1 << 0;
    pub(crate) const CONTROL_1_ENABLE: u32 = 1 << 1;
    pub(crate) const STATUS_ROOM_TO_SEND: u32 = 1 << 1;
    pub(crate) const STATUS_RECEIVED: u32 = 1 << 2;
    pub(crate) const STATUS_BUSY: u32 = 1 << 4;
}

/// The chip select of the serial port, among the board's other lines.
pub(crate) mod lines {
    use super::Register;

    pub(crate) const MISC: Register = Register(0x4002_804C);
    pub(crate) const SPI_SELECT: u32 = 1 << 1;
}

/// First half of the dual timer: unlike the plain timers, it takes the length
/// of the next period without disturbing the present one.
pub(crate) mod dual_timer {
    use super::Register;

    pub(crate) const LOAD: Register = Register(0x4000_2000);
    pub(crate) const VALUE: Register = Register(0x4000_2004);
    pub(crate) const CONTROL: Register = Register(0x4000_2008);
    pub(crate) const INTERRUPT_CLEAR: Register = Register(0x4000_200C);
    pub(crate) const INTERRUPT_PENDING: Register = Register(0x4000_2014);
    pub(crate) const NEXT_LOAD: Register = Register(0x4000_2018);

    pub(crate) const CONTROL_32_BITS: u32 = 1 << 1;
    pub(crate) const CONTROL_INTERRUPT: u32 = 1 << 5;
    pub(crate) const CONTROL_PERIODIC: u32 = 1 << 6;
    pub(crate) const CONTROL_ENABLE: u32 = 1 << 7;
}

/// Plain timer 1, free-running.
pub(crate) mod timer_1 {
    use super::Register;

    pub(crate) const CONTROL: Register = Register(0x4000_1000);
    pub(crate) const VALUE: Register = Register(0x4000_1004);
    pub(crate) const RELOAD: Register = Register(0x4000_1008);

    pub(crate) const CONTROL_ENABLE: u32 = 1 << 0;
}

/// Serial port 0, which carries MIDI.
pub(crate) mod uart_0 {
    use super::Register;

    pub(crate) const DATA: Register = Register(0x4000_4000);
    pub(crate) const STATE: Register = Register(0x4000_4004);
    pub(crate) const CONTROL: Register = Register(0x4000_4008);
    pub(crate) const INTERRUPT_CLEAR: Register = Register(0x4000_400C);
    pub(crate) const CLOCK_DIVIDER: Register = Register(0x4000_4010);

    pub(crate) const STATE_RECEIVED: u32 = 1 << 1;
    pub(crate) const STATE_OVERRUN: u32 = 1 << 3;
    pub(crate) const CONTROL_RECEIVE: u32 = 1 << 1;
    pub(crate) const CONTROL_RECEIVE_INTERRUPT: u32 = 1 << 3;
    pub(crate) const INTERRUPT_RECEIVED: u32 = 1 << 1;
}

/// Bytes that the emulator placed in the second memory before the start: their
/// number (little-endian), then the bytes. All zero if nothing was placed.
pub(crate) mod placed {
    use super::Register;

    const START: usize = 0x2100_0000;
    const MOST: u32 = 1 << 20;

    /// How many bytes were placed; none if the number makes no sense.
    pub(crate) fn len() -> u32 {
        let len = Register(START).read();
        if len <= MOST { len } else { 0 }
    }

    /// Byte number `index`, if there are that many.
    pub(crate) fn byte(index: u32) -> Option<u8> {
        (index < len()).then(|| {
            let word = Register(START + 4 + (index as usize & !3)).read();
            word.to_le_bytes()[index as usize & 3]
        })
    }
}

/// The interrupts that this program uses.
#[derive(Clone, Copy)]
#[allow(non_camel_case_types, reason = "the names of the handlers")]
pub(crate) enum Interrupt {
    UART0_RX = 0,
    DUAL_TIMER = 10,
}

// SAFETY: each number is that of the interrupt's place in the table below.
unsafe impl cortex_m::interrupt::InterruptNumber for Interrupt {
    fn number(self) -> u16 {
        self as u16
    }
}

unsafe extern "C" {
    fn UART0_RX();
    fn DUAL_TIMER();
    fn DefaultHandler();
}

const INTERRUPTS: usize = 32;

/// What the core jumps to. The runtime's linker script places it.
// SAFETY: the runtime asks for a table of handlers of this name and section,
// and the handlers are functions without arguments.
#[unsafe(link_section = ".vector_table.interrupts")]
#[unsafe(no_mangle)]
static __INTERRUPTS: [unsafe extern "C" fn(); INTERRUPTS] = {
    let mut table = [DefaultHandler as unsafe extern "C" fn(); INTERRUPTS];
    table[Interrupt::UART0_RX as usize] = UART0_RX;
    table[Interrupt::DUAL_TIMER as usize] = DUAL_TIMER;
    table
};

/// Priorities; less is more urgent.
const SAMPLE_PRIORITY: u8 = 0x00;
const MIDI_PRIORITY: u8 = 0x40;
const RENDER_PRIORITY: u8 = 0x80;

/// Lets the interrupts come: the sample clock above MIDI bytes above rendering
/// above the main program.
pub(crate) fn enable_interrupts(core: &mut Peripherals) {
    // SAFETY: called once, before any critical section is open; critical
    // sections here mask all interrupts, whatever their priority.
    unsafe {
        core.NVIC
            .set_priority(Interrupt::DUAL_TIMER, SAMPLE_PRIORITY);
        core.NVIC.set_priority(Interrupt::UART0_RX, MIDI_PRIORITY);
        core.SCB
            .set_priority(SystemHandler::PendSV, RENDER_PRIORITY);
        NVIC::unmask(Interrupt::DUAL_TIMER);
        NVIC::unmask(Interrupt::UART0_RX);
    }
}
