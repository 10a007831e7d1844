//! The demonstration's performance, played once by the integers and once by the
//! closed form.

use firmware_example::command::{Applied, Kind};
use firmware_example::demo;
use firmware_example::design::{Design, StringDesign};
use firmware_example::player::Counters;
use firmware_example::replay::replay;
use modal_core::{Loss, Result, TwosComplement16};

use crate::measure::from_q31;
use crate::reference::{Damped, Wire};
use crate::timeline::{Event, perform};

/// What the integers play from a log.
pub struct Played {
    /// The mix before its conversion.
    pub mix: Vec<f64>,
    /// The words for the converter.
    pub words: Vec<u16>,
    /// What the player counted.
    pub counters: Counters,
}

/// Plays `log` with the integers of the demonstration.
///
/// # Errors
/// As the demonstration's design.
pub fn play(log: &[Applied]) -> Result<Played> {
    let strings = demo::design()?.prepare()?;
    let (mut mix, mut words) = (Vec::new(), Vec::new());
    let counters = replay::<TwosComplement16, { demo::STRINGS }, { demo::MODES }, { demo::BLOCK }>(
        &strings,
        log,
        demo::DITHER_SEED,
        demo::BLOCKS,
        |block, converted| {
            mix.extend(block.iter().map(|&frame| from_q31(frame)));
            words.extend_from_slice(converted);
        },
    )?;
    Ok(Played {
        mix,
        words,
        counters,
    })
}

/// The same performance as a sum of damped modes in `f64`, in units of digital
/// full scale.
///
/// # Errors
/// As the demonstration's design.
pub fn closed_form(log: &[Applied], frames: usize) -> Result<Vec<f64>> {
    let design = demo::design()?;
    let full_scale_m = design.full_scale_m()?;
    let mut signal = vec![0.0; frames];
    for (index, string) in design.strings.iter().enumerate() {
        let own: Vec<&Applied> = log
            .iter()
            .filter(|event| usize::from(event.string) == index)
            .collect();
        for n in 1..=demo::MODES as u32 {
            mode_of_string(&design, string, n, full_scale_m, &own, &mut signal);
        }
    }
    Ok(signal)
}

/// A mode of a string of the demonstration at full pluck: ringing, and muted.
#[must_use]
pub fn modes_of(string: &StringDesign, n: u32) -> (Damped, Damped) {
    let spec = &string.spec;
    let wire = Wire {
        length_m: spec.length_m(),
        tension_n: spec.tension_n(),
        density_kg_per_m: spec.linear_density_kg_per_m(),
        stiffness_n_m2: spec.bending_stiffness_n_m2(),
    };
    let frequency_hz = wire.frequency_hz(n);
    let stroke = &string.stroke;
    let heard = wire.heard(n, string.pickup.place(), string.pickup.aperture_m())
        * wire.pluck(n, stroke.place, stroke.hardest_m, stroke.width_m);
    // The law of losses is data of the demonstration here; its formula has a
    // check of its own.
    let ringing = string.ringing.decay_rate_per_s(n, frequency_hz, spec);
    let muted = string.muted.decay_rate_per_s(n, frequency_hz, spec);
    (
        Damped::new(frequency_hz, ringing, heard, 0.0),
        Damped::new(frequency_hz, muted, heard, 0.0),
    )
}

fn mode_of_string<const S: usize, const M: usize>(
    design: &Design<S, M>,
    string: &StringDesign,
    n: u32,
    full_scale_m: f64,
    events: &[&Applied],
    signal: &mut [f64],
) {
    let rate_hz = design.sample_rate_hz;
    let (ringing, muted) = modes_of(string, n);
    if ringing.angular >= 0.9 * std::f64::consts::PI * rate_hz {
        return;
    }
    let events: Vec<(usize, Event)> = events
        .iter()
        .map(|event| {
            let what = match event.kind {
                Kind::Pluck => {
                    let gain = f64::from(event.gain.q15()) / 32_768.0 / full_scale_m;
                    Event::Start(ringing.scaled(gain))
                }
                Kind::Release => Event::Exchange(ringing),
                Kind::Mute => Event::Exchange(muted),
            };
            (event.frame as usize, what)
        })
        .collect();
    perform(&ringing, &events, signal, rate_hz);
}
