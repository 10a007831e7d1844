//! The numbers that a plan is made of: energy, impulse, what can be heard, wires
//! and their accessors, each against its definition.
#![allow(clippy::expect_used, reason = "a test may fail")]

mod support;

use std::f64::consts::PI;

use host_tests::tolerance;
use modal_core::energy::{PluckTail, mode_energy_j, strike_energy_j};
use modal_core::excitation::{Profile, Strike};
use modal_core::hearing::{Listening, bark, iso_226_threshold_db, terhardt_threshold_db};
use modal_core::{
    ConstantT60, Core, Excitation, Gain, Instrument, ModeSeries, StringSpec, Voice, Wire,
    WoundString, plan,
};
use proptest::prelude::*;
use support::{legal, losses, pickup, pluck, scene, string};

/// ∫ of `f` over ±1/2, by the midpoint rule, which is exact to rounding for what
/// vanishes smoothly at both ends and to 1/n² otherwise.
fn integral(f: impl Fn(f64) -> f64) -> f64 {
    let steps = 10_000;
    let middles = (0..steps).map(|step| (f64::from(step) + 0.5) / f64::from(steps) - 0.5);
    middles.map(f).sum::<f64>() / f64::from(steps)
}

fn is_close(ours: f64, exact: f64, share: f64) -> bool {
    (ours - exact).abs() <= share * exact.abs()
}

proptest! {
    #![proptest_config(support::cases(100))]

    /// Modes 1 to N of a flat strike hold its energy but for a tail: a mode has at
    /// most 4 μ L V²/(n² π²), and Σ 1/n² beyond N is below 1/N.
    #[test]
    fn the_modes_of_a_strike_hold_its_energy(
        place in 0.1..0.9, share in 0.02..0.15, speed in 0.1..20.0,
    ) {
        let string = StringSpec::new(0.65, 70.0, 1.0e-3, 0.0).expect("a string");
        let series = ModeSeries::new(string, ConstantT60::new(1_000.0).expect("a T60"));
        let width = share * string.length_m();
        let strike = Strike::with_speed(place, speed, width, Profile::Flat).expect("a strike");
        let sum: f64 = (1..=2_000)
            .map(|n| {
                let mode = series.mode(n).expect("a mode");
                mode_energy_j(&mode, &strike.mode(&mode, &string), &string)
            })
            .sum();
        let whole = strike_energy_j(&string, speed, width).expect("a strike");
        prop_assert!(is_close(whole, 0.5 * 1.0e-3 * width * speed * speed, tolerance::ROUNDING));
        let tail = 4.0 * 1.0e-3 * 0.65 * speed * speed / (PI * PI * 2_000.0);
        prop_assert!(sum <= whole * (1.0 + tolerance::ROUNDING), "{sum} of {whole}");
        prop_assert!(sum >= whole - tail, "{sum} of {whole}");
    }

    /// The impulse is μ times the velocity, summed over the width.
    #[test]
    fn the_impulse_of_a_strike_is_its_momentum(speed in -20.0..20.0, width in 1.0e-3..0.1) {
        let string = StringSpec::new(0.65, 70.0, 2.0e-3, 0.0).expect("a string");
        for profile in [Profile::Flat, Profile::HalfCosine, Profile::RaisedCosine] {
            let shape = |x: f64| match profile {
                Profile::Flat => 1.0,
                Profile::HalfCosine => (PI * x).cos(),
                Profile::RaisedCosine => 0.5 + 0.5 * (2.0 * PI * x).cos(),
            };
            let strike = Strike::with_speed(0.3, speed, width, profile).expect("a strike");
            let momentum = 2.0e-3 * speed * width * integral(shape);
            prop_assert!(is_close(strike.impulse_n_s(&string), momentum, tolerance::INTEGRAL));
            prop_assert!(is_close(profile.mean(), integral(shape), tolerance::INTEGRAL));
        }
    }

    /// The fewest modes for a share of the energy: enough, and one less is not.
    #[test]
    fn as_many_modes_as_the_energy_needs(place in legal::within(&modal_core::bounds::PLACE), share in 1.0e-3..0.9) {
        let modes = PluckTail::modes_for_energy(place, share).expect("a place");
        let left = |modes| PluckTail::after(modes, place).expect("a place").energy_share;
        prop_assert!(left(modes) <= share * (1.0 + tolerance::ROUNDING));
        prop_assert!(modes == 0 || left(modes - 1) >= share * (1.0 - tolerance::ROUNDING));
    }

    /// The rule in words: a mode may be dropped only if it is below both
    /// thresholds in quiet and far below a neighbour.
    #[test]
    fn modes_that_nobody_hears_are_dropped(
        string in string(), loss in losses(), start in pluck(), heard in pickup(),
        full_scale_db in -20.0..110.0, masking_db in 20.0..80.0,
    ) {
        const MODES: u32 = 24;
        let series = ModeSeries::new(string, loss);
        let Ok(full_scale) = plan::l1_bound(&series, &start, &heard, MODES) else { return Ok(()) };
        let listening = Listening { full_scale_db, masking_db };
        let levels: Vec<(f64, f64)> = (1..=MODES)
            .map(|n| {
                let (mode, state) = plan::heard(&series, &start, &heard, n).expect("a mode");
                let share = state.amplitude(&mode) / full_scale;
                (mode.frequency_hz(), full_scale_db + 20.0 * share.log10())
            })
            .collect();
        let is_audible = |(hz, db): (f64, f64)| {
            db > terhardt_threshold_db(hz) || iso_226_threshold_db(hz).is_some_and(|floor| db > floor)
        };
        let is_masked = |(hz, db): (f64, f64)| {
            let near = levels.iter().filter(|other| (bark(other.0) - bark(hz)).abs() <= 3.0);
            near.into_iter().any(|other| other.1 - db >= masking_db)
        };
        let worth = |one: &(f64, f64)| one.1 > f64::NEG_INFINITY && (is_audible(*one) || !is_masked(*one));
        let last = levels.iter().rposition(worth).map_or(0, |index| index as u32 + 1);
        let found = listening.modes_worth_computing(&series, &start, &heard, full_scale, MODES);
        prop_assert_eq!(found, Ok(last));
        for &(hz, db) in &levels {
            prop_assert_eq!(listening.is_above_threshold(hz, db), is_audible((hz, db)));
        }
    }

    /// A mix is the sum of its voices, each alone.
    #[test]
    fn a_mix_is_the_sum_of_its_voices(scenes in prop::collection::vec(scene(), 1..4)) {
        let mut instrument = Instrument::<4, { support::MODES }, 32>::new();
        let mut alone = Vec::new();
        for one in &scenes {
            let one = support::Scene { ceiling: 0.25, ..one.clone() };
            let Ok(coefficients) = one.coefficients() else { continue };
            let onset = one.onset(&coefficients, one.full_scale(&coefficients, 0.8));
            let mut voice = Voice::new(&coefficients);
            let _ = voice.superpose(&onset.scaled(Gain::from_q15(20_000)));
            alone.push(voice.clone());
            let index = instrument.add_voice(Voice::new(&coefficients)).expect("room");
            let added = instrument.voice_mut(index).expect("it is there");
            let _ = added.superpose(&onset.scaled(Gain::from_q15(20_000)));
        }
        prop_assert_eq!(instrument.voices().len(), alone.len());
        let mut mix = [0; 32];
        for _ in 0..20 {
            let mut sum = [0; 32];
            for voice in &mut alone {
                voice.render(&mut sum);
            }
            instrument.render(&mut mix);
            prop_assert_eq!(mix, sum);
        }
        prop_assert!(instrument.voice_mut(alone.len()).is_none());
    }

    /// Sections and stiffness by integrating over the section itself.
    #[test]
    fn wires_are_what_their_sections_are(
        d in 1.0e-4..5.0e-3, density in 1_000.0..9_000.0, modulus in 1.0e9..3.0e11,
    ) {
        let wire = Wire::new(d, density, modulus).expect("a wire");
        // Chords of the circle at height y = d sin t/2, which leaves no root at the
        // ends: area ∫ w dy, second moment ∫ w y² dy.
        let slice = |t: f64| (d * t.cos(), 0.5 * d * t.sin(), 0.5 * d * t.cos());
        let area = PI * integral(|x| { let (w, _, dy) = slice(PI * x); w * dy });
        let moment = PI * integral(|x| { let (w, y, dy) = slice(PI * x); w * y * y * dy });
        prop_assert!(is_close(wire.area_m2(), area, tolerance::INTEGRAL));
        prop_assert!(is_close(wire.bending_stiffness_n_m2(), modulus * moment, tolerance::INTEGRAL));
        prop_assert!(is_close(wire.axial_stiffness_n(), modulus * area, tolerance::INTEGRAL));
        prop_assert!(is_close(wire.linear_density_kg_per_m(), density * area, tolerance::INTEGRAL));
        prop_assert_eq!((wire.diameter_m(), wire.youngs_modulus_pa()), (d, modulus));
        let round = Core::Round(d);
        prop_assert!(is_close(round.area_m2(), area, tolerance::INTEGRAL));
        prop_assert!(is_close(round.second_moment_m4(), moment, tolerance::INTEGRAL));

        // A hexagon with flats `d` apart, cut parallel to them: its width falls from
        // 2d/√3 in the middle to d/√3 at the flats.
        let width = |y: f64| 2.0 / 3.0_f64.sqrt() * (d - y.abs());
        let area = d * integral(|x| width(d * x));
        let moment = d * integral(|x| width(d * x) * (d * x).powi(2));
        let hexagon = Core::Hexagonal(d);
        prop_assert!(is_close(hexagon.area_m2(), area, tolerance::INTEGRAL));
        prop_assert!(is_close(hexagon.second_moment_m4(), moment, tolerance::INTEGRAL));
        prop_assert!(is_close(hexagon.winding_seat_m(), width(0.0), tolerance::ROUNDING));
        let wound = WoundString::new(hexagon, density, modulus, 2.0 * d, density).expect("a string");
        prop_assert!(is_close(wound.axial_stiffness_n(), modulus * area, tolerance::INTEGRAL));
        prop_assert!(is_close(wound.bending_stiffness_n_m2(), modulus * moment, tolerance::INTEGRAL));
    }

    #[test]
    fn impedance_is_tension_over_speed(string in legal::string()) {
        let ratio = string.tension_n() / string.wave_speed_m_per_s();
        prop_assert!(is_close(string.impedance_kg_per_s(), ratio, tolerance::ROUNDING));
    }
}
