//! Whatever bits come in: a clear error, or a value that works. Never a panic.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use modal_core::energy::{PluckTail, pluck_energy_j, strike_energy_j};
use modal_core::excitation::{
    Between, ContactStrike, Corner, HalfSine, Of, Parabola, Polyline, Profile, Sampled, SlowPush,
    Strike,
};
use modal_core::hearing::{
    Listening, bark, iso_226_contour_db, iso_226_threshold_db, terhardt_threshold_db,
};
use modal_core::loss::{Air, AirLoss, BendingLoss, EndLoss, LossFactor, MeasuredT60};
use modal_core::note::{NoteSpec, PluckSpec};
use modal_core::pickup::{Amplified, BridgeForce, End};
use modal_core::string::{
    fret_distance_m, fretting_cents, music_wire_strength_pa, pressing_strain,
};
use modal_core::{
    Coefficients, ConstantT60, Converter, Core, DisplacementPickup, Ends, Error, Excitation, Loss,
    ModalState, Mode, ModeSeries, Onset, Pickup, PickupWeights, PointPluck, RoundedPluck,
    StringSpec, TwoT60, TwosComplement16, Unipolar12, VelocityPickup, Voice, Wire, WoundString,
    bounds,
};
use proptest::prelude::*;
use support::{any_number, legal, wide};

/// An error has to name a field and to show a value and a range.
fn is_clear(error: Error) -> Result<(), TestCaseError> {
    let text = error.to_string();
    let numbers = text
        .split_whitespace()
        .filter(|word| word.trim_end_matches([',', ':']).parse::<f64>().is_ok());
    prop_assert!(numbers.count() >= 2, "{}", text);
    prop_assert!(text.contains(" is "), "{}", text);
    Ok(())
}

fn check<T>(result: Result<T, Error>) -> Result<Option<T>, TestCaseError> {
    match result {
        Ok(value) => Ok(Some(value)),
        Err(error) => is_clear(error).map(|()| None),
    }
}

proptest! {
    #![proptest_config(support::cases(4_000))]

    #[test]
    fn constructors_take_any_bits(a in any_number(), b in any_number(), c in any_number(), d in any_number()) {
        let wire = check(Wire::new(a, b, c))?;
        check(WoundString::new(Core::Round(a), b, c, d, b))?;
        check(WoundString::new(Core::Hexagonal(a), b, c, d, b))?;
        let string = check(StringSpec::new(a, b, c, d))?;
        check(StringSpec::tuned(a, b, c, d))?;
        check(StringSpec::tuned_between(Ends::Clamped, a, b, c, d))?;
        if let Some(wire) = wire {
            check(StringSpec::plain_wire(c, d, &wire))?;
            check(StringSpec::tuned_wire(c, d, &wire))?;
        }
        if let Some(string) = string {
            check(string.fretted(200))?;
            prop_assert!(string.frequency_hz(1).is_finite());
        }
        check(ConstantT60::new(a))?;
        check(TwoT60::new(a, b, c, d))?;
        check(AirLoss::new(a))?;
        check(BendingLoss::new(a))?;
        check(LossFactor::new(a))?;
        check(EndLoss::new(a))?;
        check(MeasuredT60::<2>::new(&[(a, b), (c, d)]))?;
        check(PointPluck::new(a, b))?;
        check(RoundedPluck::new(a, b, c))?;
        check(Strike::with_speed(a, b, c, Profile::HalfCosine))?;
        check(Strike::with_impulse(a, b, c, Profile::Flat))?;
        check(ContactStrike::new(a, b, c))?;
        check(SlowPush::new(a, b, c))?;
        check(DisplacementPickup::new(a, b))?;
        check(VelocityPickup::new(a, b))?;
        check(fret_distance_m(a, 7))?;
        check(pressing_strain(a, b, c))?;
        check(fretting_cents(a, b, c))?;
    }

    #[test]
    fn the_door_takes_any_bits(
        rate in any_number(), ceiling in any_number(), full_scale in any_number(),
        rough_rate in any_number(), modes in any::<u32>(), limit in any_number(),
    ) {
        /// A law of losses that gives anything.
        struct Any(f64);
        impl Loss for Any {
            fn decay_rate_per_s(&self, _: u32, _: f64, _: &StringSpec) -> f64 {
                self.0
            }
        }
        let string = StringSpec::tuned(0.6, 220.0, 1.0e-3, 1.0e-5).expect("a string");
        let series = ModeSeries::new(string, Any(rough_rate));
        let _ = series.modes_below(limit);
        check(series.mode(modes))?;
        for wanted in [modes, modes % 40] {
            for rate in [rate, 48_000.0] {
                for ceiling in [ceiling, 0.5] {
                    let prepared = Coefficients::<32>::prepare(&series, wanted, rate, ceiling);
                    if let Some(coefficients) = check(prepared)? {
                        prop_assert!(coefficients.modes() >= 1 && coefficients.modes() <= 32);
                        let pluck = PointPluck::new(0.2, 2.0e-3).expect("a pluck");
                        let pickup = DisplacementPickup::new(0.1, 0.0).expect("a pickup");
                        let onset = Onset::prepare(&coefficients, &series, &pluck, &pickup, full_scale);
                        if let Some(onset) = check(onset)? {
                            let mut voice = Voice::new(&coefficients);
                            let _ = voice.superpose(&onset);
                            let mut block = [0; 32];
                            voice.render(&mut block);
                        }
                    }
                }
            }
        }
    }

    /// A maker's own start, pickup and law of losses may say anything: it is
    /// refused, or it is played within the share.
    #[test]
    fn own_laws_may_say_anything(
        start in (any_number(), any_number()), weight in (any_number(), any_number()),
        rate in any_number(), pitch in 20.0..15_000.0, full_scale in any_number(),
    ) {
        struct Own {
            start: (f64, f64),
            weight: (f64, f64),
            rate: f64,
        }
        impl Loss for Own {
            fn decay_rate_per_s(&self, n: u32, _: f64, _: &StringSpec) -> f64 {
                if n == 1 { 2.0 } else { self.rate }
            }
        }
        impl Excitation for Own {
            fn mode(&self, mode: &Mode, _: &StringSpec) -> ModalState {
                let (displacement, velocity) = self.start;
                ModalState { displacement: displacement / f64::from(mode.n()), velocity }
            }
        }
        impl Pickup for Own {
            fn weights(&self, _: &Mode, _: &StringSpec) -> PickupWeights {
                PickupWeights { displacement: self.weight.0, velocity: self.weight.1 }
            }
        }
        let string = StringSpec::tuned(0.3, pitch, 1.0e-4, 0.0).expect("a string");
        let own = Own { start, weight, rate };
        let series = ModeSeries::new(string, &own);
        let Some(coefficients) = check(Coefficients::<4>::prepare(&series, 4, 48_000.0, 0.7))? else {
            return Ok(());
        };
        for full_scale in [full_scale, 1.0, 1.0e6] {
            let Some(onset) = check(Onset::prepare(&coefficients, &series, &own, &own, full_scale))? else {
                continue;
            };
            let mut voice = Voice::new(&coefficients);
            for _ in 0..3 {
                let _ = voice.superpose(&onset);
                wide::render(&mut voice)?;
            }
        }
    }

    #[test]
    fn shapes_take_any_bits(
        corners in prop::collection::vec((any_number(), any_number(), any_number()), 0..4),
        samples in prop::collection::vec(any_number(), 0..5),
        a in any_number(), b in any_number(), n in 1_u32..200,
    ) {
        let string = StringSpec::tuned(0.6, 220.0, 1.0e-3, 1.0e-5).expect("a string");
        let series = ModeSeries::new(string, ConstantT60::new(3.0).expect("a T60"));
        let mode = series.mode(n).expect("a mode");
        let is_finite = |state: ModalState| state.displacement.is_finite() && state.velocity.is_finite();
        let corners: Vec<Corner> = corners
            .into_iter()
            .map(|(place, left, right)| Corner { place, left, right })
            .collect();
        for of in [Of::Displacement, Of::Velocity] {
            if let Some(shape) = check(Polyline::new(&corners, of))? {
                prop_assert!(is_finite(shape.mode(&mode, &string)));
            }
            for between in [Between::Straight, Between::BandLimited] {
                if let Some(shape) = check(Sampled::new(&samples, of, between))? {
                    prop_assert!(is_finite(shape.mode(&mode, &string)));
                }
            }
            if let Some(shape) = check(Parabola::new(a, of))? {
                prop_assert!(is_finite(shape.mode(&mode, &string)));
            }
            if let Some(shape) = check(HalfSine::new(a, of))? {
                prop_assert!(is_finite(shape.mode(&mode, &string)));
            }
        }
        check(Air::new(a, b))?;
        check(Amplified::new(BridgeForce(End::Near), a))?;
        check(PluckTail::after(n, a))?;
        check(PluckTail::modes_for_energy(a, b))?;
        check(pluck_energy_j(&string, a, b))?;
        check(strike_energy_j(&string, a, b))?;
        // These take anything and have nothing to refuse.
        let _ = (iso_226_contour_db(a, b), iso_226_threshold_db(a), terhardt_threshold_db(a), bark(a));
        let _ = music_wire_strength_pa(a);
        let listening = Listening { full_scale_db: a, masking_db: b };
        let start = PointPluck::new(0.2, 1.0e-3).expect("a pluck");
        let worth = listening.modes_worth_computing(&series, &start, &BridgeForce(End::Far), b, 6);
        prop_assert!(worth.is_ok_and(|modes| modes <= 6));
    }

    /// What the bounds allow gives numbers, for the first mode and the last.
    #[test]
    fn legal_values_give_finite_numbers(
        played in legal::played(8), n in 1_u32..=100_000, width in legal::within(&bounds::WIDTH_M),
        strike in (legal::within(&bounds::IMPULSE_N_S), legal::within(&bounds::DURATION_S)),
        force in legal::within(&bounds::FORCE_N),
    ) {
        let string = played.series.string();
        prop_assert!(string.frequency_hz(n).is_finite() && string.frequency_hz(n) > 0.0);
        prop_assert!(string.inharmonicity().is_finite() && string.impedance_kg_per_s() > 0.0);
        let Ok(mode) = played.series.mode(n) else { return Ok(()) };
        prop_assert!(mode.damped_angular() > 0.0 && mode.t60_s() > 0.0 && mode.q_factor() > 0.5);
        let place = played.pluck.place();
        let starts: [&dyn Excitation; 4] = [
            &played.pluck,
            &Strike::with_impulse(place, strike.0, width, Profile::HalfCosine).expect("legal"),
            &ContactStrike::new(place, strike.0, strike.1).expect("legal"),
            &SlowPush::new(place, force, strike.1).expect("legal"),
        ];
        for start in starts {
            let state = start.mode(&mode, string);
            prop_assert!(state.amplitude(&mode).is_finite() && state.phase(&mode).is_finite());
            for pickup in [&played.pickups.0 as &dyn Pickup, &played.pickups.1, &BridgeForce(End::Far)] {
                let heard = pickup.weights(&mode, string).heard(&mode, state);
                prop_assert!(heard.displacement.is_finite() && heard.velocity.is_finite());
            }
        }
    }

    #[test]
    fn integer_notes_take_any_bits(
        rate in any_number(), ceiling in any_number(), full_scale in any_number(),
        ratio in any::<u32>(), modes in any::<u32>(), t60 in 0.001..900.0,
        pitch in 2.0..20_000.0, b in 0.0..0.5,
    ) {
        let Ok(string) = StringSpec::tuned(0.6, pitch, 1.0e-4, b * 1.0e-2) else {
            return Ok(());
        };
        let loss = TwoT60::new(100.0, t60, 9_000.0, 0.7 * t60).expect("a loss");
        let series = ModeSeries::new(string, loss);
        let pluck = RoundedPluck::new(0.2, 2.0e-3, 1.0e-3).expect("a pluck");
        let pickup = DisplacementPickup::new(0.1, 0.0).expect("a pickup");
        let velocity = VelocityPickup::new(0.1, 1.0e-3).expect("a pickup");
        for rate in [rate, 48_000.0] {
            for ceiling in [ceiling, 0.5] {
                let Some(spec) = check(NoteSpec::from_series(&series, rate, ceiling))? else {
                    continue;
                };
                let shorter = check(spec.shortened(ratio))?;
                for full_scale in [full_scale, 0.01, 1.0e-9] {
                    let by_place = check(PluckSpec::displacement(&string, &pluck, &pickup, full_scale))?;
                    let by_speed = check(PluckSpec::velocity(&string, &pluck, &velocity, 48_000.0, full_scale))?;
                    for spec in [Some(spec), shorter].into_iter().flatten() {
                        for pluck in [by_place, by_speed].into_iter().flatten() {
                            check(spec.note::<32>(modes % 40, &pluck))?;
                        }
                    }
                }
            }
        }
    }

    #[test]
    fn converters_take_any_mix(mix in prop::collection::vec(any::<i32>(), 0..64), seed in any::<u32>()) {
        let mut words = [0; 48];
        let mut wide = Converter::<TwosComplement16>::new(seed);
        wide.convert(&mix, &mut words, false);
        let mut narrow = Converter::<Unipolar12>::new(seed);
        narrow.convert(&mix, &mut words, false);
        prop_assert!(words.iter().all(|word| *word < 1 << 12));
        narrow.convert(&mix, &mut words, true);
        for word in words.iter().take(mix.len()) {
            prop_assert_eq!(*word, 1 << 11);
        }
    }
}

#[test]
fn every_bound_refuses_what_lies_outside() {
    for bound in bounds::ALL {
        for value in [
            f64::NAN,
            f64::INFINITY,
            f64::NEG_INFINITY,
            bound.max * 1.01 + 1.0,
            bound.min - 1.0,
        ] {
            let error = bound.check(value).expect_err("outside");
            let text = error.to_string();
            assert!(text.contains(bound.name), "{text}");
            assert!(text.contains(&bound.min.to_string()), "{text}");
            assert!(text.contains(&bound.max.to_string()), "{text}");
        }
        assert_eq!(bound.check(bound.min), Ok(bound.min));
        assert_eq!(bound.check(bound.max), Ok(bound.max));
    }
}
