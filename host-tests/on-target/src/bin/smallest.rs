//! The smallest sensible program: one string of 32 modes, plucked on the chip,
//! blocks of words. Its flash and memory are what `cargo xtask size` prints.
//!
//! On a host this program is empty.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
use semihosting as _;

#[cfg(target_os = "none")]
mod program {
    use core::hint::black_box;

    use modal_core::note::{NoteSpec, PluckSpec};
    use modal_core::{
        Converter, DisplacementPickup, ModeSeries, Result, RoundedPluck, StringSpec, TwoT60,
        TwosComplement16, Voice,
    };

    const MODES: usize = 32;

    /// Prepares the string, plucks it and renders until it is silent.
    pub(crate) fn play() -> Result<()> {
        let string = StringSpec::tuned(0.65, black_box(110.0), 3.6e-3, 4.0e-5)?;
        let series = ModeSeries::new(string, TwoT60::new(100.0, 6.0, 5_000.0, 0.6)?);
        let pluck = RoundedPluck::new(0.13, 3.0e-3, 0.0)?;
        let pickup = DisplacementPickup::new(0.21, 0.0)?;
        let note = NoteSpec::from_series(&series, 48_000.0, 1.0)?;
        let spec = PluckSpec::displacement(&string, &pluck, &pickup, 5.0e-3)?;
        let (coefficients, onset) = note.note::<MODES>(MODES as u32, &spec)?;
        let mut voice = Voice::new(&coefficients);
        let _ = voice.superpose(&onset);
        let mut dac = Converter::<TwosComplement16>::new(1);
        while !voice.is_silent() {
            let (mut mix, mut words) = ([0; 32], [0; 32]);
            voice.render(&mut mix);
            dac.convert(&mix, &mut words, voice.is_silent());
            black_box(words);
        }
        Ok(())
    }
}

#[cfg(target_os = "none")]
fn end() -> ! {
    let _ = program::play();
    loop {
        core::hint::spin_loop();
    }
}

#[cfg(all(target_os = "none", target_arch = "arm"))]
#[cortex_m_rt::entry]
fn start() -> ! {
    end()
}

#[cfg(all(target_os = "none", target_arch = "riscv32"))]
#[riscv_rt::entry]
fn start() -> ! {
    end()
}

#[cfg(not(target_os = "none"))]
fn main() {}
