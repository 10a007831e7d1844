//! The contexts and what passes between them.

mod clock;
mod controlling;
mod handover;
mod load;
mod output;
mod registers;
mod rendering;
mod report;
mod sampling;
mod spi;
mod uart;

use core::sync::atomic::{AtomicBool, AtomicU32, Ordering::Relaxed};

use cortex_m::peripheral::{NVIC, SCB};
use cortex_m_rt::{entry, exception, interrupt};
use defmt_semihosting as _;
use firmware_example::command::{Applied, Command};
use firmware_example::control::Control;
use firmware_example::demo::{self, BLOCK, FRAMES, MODES, STRINGS};
use firmware_example::design::PreparedString;
use firmware_example::pump::{BlockQueue, pump};
use heapless::Vec;
use heapless::spsc::{Producer, Queue};
use modal_core::{DacFormat, TwosComplement16};
use semihosting::process::exit;

use controlling::{Controlling, LOG};
use handover::Handover;
use output::Directory;
use registers::Interrupt as interrupt;
use rendering::Rendering;
use report::Run;
use sampling::Sampling;
use spi::Captured;

/// What the host is told if there is nothing to show.
const FAILURE: i32 = 1;

/// What the converter on the port understands.
type Format = TwosComplement16;

/// Commands on their way to the rendering context.
const COMMANDS: usize = 16;
/// Entries of the log on their way to the main program.
const LOG_QUEUE: usize = 64;
/// MIDI bytes on their way to the main program.
const BYTES: usize = 256;

static SAMPLING: Handover<Sampling> = Handover::new();
static RENDERING: Handover<Rendering> = Handover::new();
static MIDI_INPUT: Handover<Producer<'static, u8>> = Handover::new();

/// First frame of the block that is rendered next.
static FRAME: AtomicU32 = AtomicU32::new(0);
/// Largest magnitude since the meter was read, Q31.
static PEAK: AtomicU32 = AtomicU32::new(0);
/// Ticks spent in the sample interrupt; wraps.
static SAMPLING_TICKS: AtomicU32 = AtomicU32::new(0);
/// Bytes lost between the serial port and the main program.
static BYTES_LOST: AtomicU32 = AtomicU32::new(0);
/// Whether every frame was sent.
static OVER: AtomicBool = AtomicBool::new(false);

/// Sends one word. The most urgent of all. Pended once before the clock
/// starts, it takes over what it works with.
#[interrupt]
fn DUAL_TIMER() {
    static mut OWN: Option<Sampling> = None;
    let begin = clock::ticks();
    let Some(sampling) = OWN else {
        if !OVER.load(Relaxed) {
            *OWN = SAMPLING.take();
        }
        return;
    };
    if sampling.send_frame() {
        SCB::set_pendsv();
    }
    if sampling.is_over() {
        SAMPLING.give(OWN.take());
        OVER.store(true, Relaxed);
    }
    let spent = clock::ticks().wrapping_sub(begin);
    // Nothing else writes this.
    SAMPLING_TICKS.store(SAMPLING_TICKS.load(Relaxed).wrapping_add(spent), Relaxed);
}

/// Renders blocks while there is room for them.
#[exception]
fn PendSV() {
    static mut OWN: Option<Rendering> = None;
    if OWN.is_none() {
        *OWN = RENDERING.take();
    }
    if let Some(rendering) = OWN {
        rendering.fill();
    }
    if OVER.load(Relaxed) {
        RENDERING.give(OWN.take());
    }
}

/// Takes a MIDI byte.
#[interrupt]
fn UART0_RX() {
    static mut OWN: Option<Producer<'static, u8>> = None;
    if OWN.is_none() {
        *OWN = MIDI_INPUT.take();
    }
    let lost = u32::from(uart::overrun());
    let refused = match (uart::received(), OWN) {
        (Some(byte), Some(bytes)) => u32::from(bytes.enqueue(byte).is_err()),
        _ => 0,
    };
    BYTES_LOST.fetch_add(lost + refused, Relaxed);
}

#[entry]
fn main() -> ! {
    static mut COMMAND_QUEUE: Queue<Command<MODES>, COMMANDS> = Queue::new();
    static mut BLOCK_QUEUE: BlockQueue<BLOCK> = Queue::new();
    static mut APPLIED_QUEUE: Queue<Applied, LOG_QUEUE> = Queue::new();
    static mut BYTE_QUEUE: Queue<u8, BYTES> = Queue::new();
    static mut CAPTURE: [Captured; FRAMES] = [[0; 2]; FRAMES];
    static mut STRINGS_OF_DEMO: Vec<PreparedString<MODES>, STRINGS> = Vec::new();
    static mut EVENTS: Vec<Applied, LOG> = Vec::new();

    let Some(mut core) = cortex_m::Peripherals::take() else {
        defmt::error!("the core's peripherals are taken");
        exit(FAILURE)
    };
    clock::start_ticks();
    let instructions_per_tick = load::instructions_per_tick();
    defmt::info!(
        "{=str}: {=f32} instructions a tick of {=u32} Hz",
        modal_core::kernel::NAME,
        instructions_per_tick,
        clock::TICKS_PER_SECOND
    );

    let begin = clock::ticks();
    match demo::design().and_then(|design| design.prepare()) {
        Ok(prepared) => *STRINGS_OF_DEMO = prepared,
        Err(error) => {
            defmt::error!("the instrument cannot be prepared: {}", error);
            exit(FAILURE)
        }
    }
    let prepare_ticks = clock::ticks().wrapping_sub(begin);

    let (commands_in, commands_out) = COMMAND_QUEUE.split();
    let (feed, drain) = pump(BLOCK_QUEUE, Format::REST);
    let (applied_in, applied_out) = APPLIED_QUEUE.split();
    let (bytes_in, bytes_out) = BYTE_QUEUE.split();
    match Rendering::new(STRINGS_OF_DEMO, commands_out, feed, applied_in) {
        Ok(rendering) => RENDERING.give(Some(rendering)),
        Err(error) => {
            defmt::error!("the player refused the instrument: {}", error);
            exit(FAILURE)
        }
    }
    MIDI_INPUT.give(Some(bytes_in));
    SAMPLING.give(Some(Sampling::new(drain, CAPTURE, FRAMES as u32)));

    registers::enable_interrupts(&mut core);
    uart::start();
    // Both take over; the first block is made before its first frame is due.
    NVIC::pend(interrupt::DUAL_TIMER);
    SCB::set_pendsv();
    clock::start_samples();

    let control = Control::new(STRINGS_OF_DEMO, commands_in);
    let mut controlling = Controlling::new(control, bytes_out, applied_out, EVENTS);
    // Spins: waiting for an interrupt would follow the host's clock.
    while !OVER.load(Relaxed) {
        controlling.turn();
    }
    SCB::set_pendsv();
    let (Some(sampling), Some(rendering)) = (SAMPLING.take(), RENDERING.take()) else {
        defmt::error!("an interrupt kept what it worked with");
        exit(FAILURE)
    };
    controlling.keep_log();
    let run = Run {
        sampling: &sampling,
        rendering: &rendering,
        controlling: &controlling,
        bytes_lost: BYTES_LOST.load(Relaxed),
        instructions_per_tick,
        prepare_ticks,
    };
    run.warn();
    match run.write(&Directory::from_arguments()) {
        Ok(()) => exit(0),
        Err(_) => {
            defmt::error!("the files cannot be written");
            exit(FAILURE)
        }
    }
}
