//! Whatever bits come in: a clear error, or a value that works. Never a panic.
#![allow(clippy::expect_used, clippy::panic, reason = "a test may fail")]

mod support;

use modal_core::excitation::{ContactStrike, Profile, SlowPush, Strike};
use modal_core::loss::{AirLoss, BendingLoss, EndLoss, LossFactor, MeasuredT60};
use modal_core::note::{NoteSpec, PluckSpec};
use modal_core::string::{fret_distance_m, fretting_cents, pressing_strain};
use modal_core::{
    Coefficients, ConstantT60, Converter, Core, DisplacementPickup, Ends, Error, Loss, ModeSeries,
    Onset, PointPluck, RoundedPluck, StringSpec, TwoT60, TwosComplement16, Unipolar12,
    VelocityPickup, Voice, Wire, WoundString, bounds,
};
use proptest::prelude::*;
use support::any_number;

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
