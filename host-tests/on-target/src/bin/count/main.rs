//! Counts instructions, prints them as `name=value` lines, and compares bits.
//!
//! On a host this program is empty.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod counter;

#[cfg(target_os = "none")]
mod program {
    use core::hint::black_box;

    use modal_core::bank::{Coefficient, FOLDED_SHIFT, Group, Resonator, SHIFTS, State};
    use modal_core::{
        Bank, Converter, Instrument, ModeBank, NarrowBank, TwosComplement16, Voice, kernel,
    };
    use on_target::baselines::{
        Baseline, Coupled, DelayLine, Filter, LibmSine, MicromathSine, Phasor, Table, TwoPole,
        TwoPoleQ30, tones,
    };
    use on_target::scene::{BLOCK, MODES, STRINGS, string};
    use on_target::{baselines, golden};
    use semihosting::println;

    use crate::counter::Counter;

    /// Runs everything; what failed, if anything did.
    pub(crate) fn run() -> Result<(), &'static str> {
        let mut counter = Counter::new();
        println!("kernel={}", kernel::NAME);
        println!("instructions_of_4096={}", counter.check());
        same_bits()?;
        let found = golden::hash().map_err(|_| "golden stream")?;
        println!("golden={found:#018x}");
        measure(&mut counter).map_err(|_| "preparing the scene")?;
        baseline::<TwoPole>(&mut counter)?;
        baseline::<TwoPoleQ30>(&mut counter)?;
        baseline::<Coupled>(&mut counter)?;
        baseline::<Phasor>(&mut counter)?;
        baseline::<Table>(&mut counter)?;
        baseline::<MicromathSine>(&mut counter)?;
        baseline::<LibmSine>(&mut counter)?;
        baseline::<Filter>(&mut counter)?;
        baseline::<DelayLine>(&mut counter)?;
        Ok(())
    }

    fn baseline<K: Baseline>(counter: &mut Counter) -> Result<(), &'static str> {
        let tones: [baselines::Tone; MODES] = tones().map_err(|_| "tones")?;
        let mut sound = K::new(black_box(&tones));
        let mut block = [0.0; BLOCK];
        // The second block: the first may have a start of its own.
        sound.render(&mut block);
        let count = counter.of(|| sound.render(black_box(&mut block)));
        println!("baseline {}={count}", K::NAME);
        Ok(())
    }

    struct Random(u64);

    impl Random {
        /// Xorshift (Marsaglia 2003), with the edges often.
        fn next(&mut self) -> i32 {
            self.0 ^= self.0 << 13;
            self.0 ^= self.0 >> 7;
            self.0 ^= self.0 << 17;
            match self.0 % 11 {
                0 => i32::MIN,
                1 => i32::MAX,
                2 => 0,
                3 => -1,
                _ => (self.0 >> 29) as i32,
            }
        }

        fn below(&mut self, limit: usize) -> usize {
            self.next().unsigned_abs() as usize % limit
        }
    }

    /// The kernel of this target against the portable one.
    fn same_bits() -> Result<(), &'static str> {
        const CASES: u32 = 4_000;
        let mut random = Random(0x9E37_79B9_7F4A_7C15);
        for _ in 0..CASES {
            let group = |random: &mut Random| {
                let folded = random.below(4) == 0;
                let shift = SHIFTS[random.below(SHIFTS.len())];
                Group {
                    shift: if folded { FOLDED_SHIFT } else { shift },
                    folded,
                    modes: random.below(6) as u16,
                }
            };
            let groups = [group(&mut random), group(&mut random), group(&mut random)];
            let mut ours = [0; 9].map(|_: u8| Resonator {
                state: State {
                    q: random.next(),
                    velocity_low: random.next().cast_unsigned(),
                    velocity_high: random.next(),
                },
                coefficient: Coefficient {
                    damping: random.next(),
                    restoring: random.next(),
                },
            });
            let mut truth = ours;
            let count = random.below(10);
            let mut block = [0; BLOCK].map(|_: i32| random.next());
            let mut expected = block;
            kernel::render(&groups, &mut ours[..count], &mut block);
            let mut left = &mut truth[..count];
            for group in groups {
                let modes = usize::from(group.modes).min(left.len());
                let (now, later) = left.split_at_mut(modes);
                kernel::render_portable(group, now, &mut expected);
                left = later;
            }
            if ours != truth || block != expected {
                return Err("the kernel differs from the portable one");
            }
            // The control: a state that differs in one bit is seen.
            truth[0].state.velocity_low ^= 1;
            if ours == truth {
                return Err("the comparison sees nothing");
            }
        }
        println!("kernel_cases={CASES}");
        Ok(())
    }

    fn instrument<K: ModeBank<MODES>>() -> modal_core::Result<Instrument<STRINGS, MODES, BLOCK, K>>
    {
        let mut instrument = Instrument::new();
        for index in 0..STRINGS {
            let prepared = string(index)?;
            let coefficients = prepared.coefficients()?;
            let onset = prepared.onset(&coefficients)?;
            let mut voice = Voice::with_bank(&coefficients)?;
            let _ = voice.superpose(&onset);
            instrument.add_voice(voice)?;
        }
        Ok(instrument)
    }

    fn measure(counter: &mut Counter) -> modal_core::Result<()> {
        let mut mix = [0; BLOCK];
        let mut chord = instrument::<Bank<MODES>>()?;
        let first = counter.of(|| chord.render(black_box(&mut mix)));
        println!("chord_block={first}");

        // The portable kernel over the same groups, whatever the target.
        let mut copies = [[AT_REST; MODES]; STRINGS];
        for (copy, voice) in copies.iter_mut().zip(chord.voices()) {
            for (slot, resonator) in copy.iter_mut().zip(voice.bank().resonators()) {
                *slot = *resonator;
            }
        }
        let portable = counter.of(|| {
            for (copy, voice) in copies.iter_mut().zip(chord.voices()) {
                portable(voice.bank(), black_box(copy), black_box(&mut mix));
            }
        });
        println!("portable_block={portable}");

        let mut narrow = instrument::<NarrowBank<MODES>>()?;
        println!(
            "narrow_block={}",
            counter.of(|| narrow.render(black_box(&mut mix)))
        );

        let mut converter = Converter::<TwosComplement16>::new(1);
        let mut words = [0; BLOCK];
        let convert =
            counter.of(|| converter.convert(black_box(&mix), black_box(&mut words), false));
        println!("converter_block={convert}");

        // Four seconds of the chord.
        let (mut worst, mut sum) = (first, u64::from(first));
        const BLOCKS: u32 = 4 * 48_000 / BLOCK as u32;
        for _ in 1..BLOCKS {
            let count = counter.of(|| chord.render(black_box(&mut mix)));
            worst = worst.max(count);
            sum += u64::from(count);
        }
        println!("chord_mean={}", sum / u64::from(BLOCKS));
        println!("chord_worst={worst}");

        let prepared = string(0)?;
        let coefficients = prepared.coefficients()?;
        let mut silent = Voice::new(&coefficients);
        println!(
            "silent_voice={}",
            counter.of(|| silent.render(black_box(&mut mix)))
        );
        let onset = prepared.onset(&coefficients)?;
        let mut voice = Voice::new(&coefficients);
        let superpose = counter.of(|| {
            let _ = black_box(&mut voice).superpose(&onset);
        });
        println!("superpose={superpose}");
        voice.render(&mut mix);
        let exchange = counter.of(|| voice.set_coefficients(black_box(&coefficients)).is_ok());
        println!("exchange={exchange}");

        let note = prepared.note()?;
        let pluck = prepared.pluck_spec()?;
        let integer =
            counter.of(|| black_box(black_box(&note).note::<MODES>(MODES as u32, &pluck)).is_ok());
        println!("note_integer={integer}");
        let integer =
            counter.of(|| black_box(black_box(&note).coefficients::<MODES>(MODES as u32)).is_ok());
        println!("coefficients_integer={integer}");
        let float = counter.of(|| black_box(black_box(&prepared).coefficients()).is_ok());
        println!("coefficients_f64={float}");
        let float = counter.of(|| black_box(prepared.onset(black_box(&coefficients))).is_ok());
        println!("onset_f64={float}");
        Ok(())
    }

    const AT_REST: Resonator = Resonator {
        state: State::rest(0),
        coefficient: Coefficient {
            damping: 0,
            restoring: 0,
        },
    };

    fn portable(bank: &Bank<MODES>, resonators: &mut [Resonator], mix: &mut [i32; BLOCK]) {
        let mut left = resonators;
        for group in bank.groups() {
            let (now, later) = left.split_at_mut(usize::from(group.modes).min(left.len()));
            kernel::render_portable(*group, now, mix);
            left = later;
        }
    }
}

#[cfg(target_os = "none")]
fn end() -> ! {
    match program::run() {
        Ok(()) => semihosting::process::exit(0),
        Err(what) => {
            semihosting::println!("FAILED {what}");
            semihosting::process::exit(1)
        }
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
