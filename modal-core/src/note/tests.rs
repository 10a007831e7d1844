//! The integer road against the road through floating point.

use super::*;
use crate::bank::Group;
use crate::excitation::RoundedPluck;
use crate::pickup::{DisplacementPickup, VelocityPickup};
use crate::plan;
use crate::string::StringSpec;

const RATE_HZ: f64 = 48_000.0;

struct Case {
    series: ModeSeries<TwoT60>,
    ceiling: f64,
}

fn cases() -> impl Iterator<Item = Case> {
    [31.0, 82.4, 220.0, 700.0, 2_500.0, 9_000.0]
        .into_iter()
        .flat_map(|pitch_hz: f64| {
            [(0.0, 1.0), (2.0e-4, 0.125)]
                .into_iter()
                .flat_map(move |(stiffness, ceiling)| {
                    [(20.0, 2.0), (3.0, 0.3), (0.2, 0.05)]
                        .into_iter()
                        .map(move |(long, short)| {
                            let length_m = 0.7 * (31.0 / pitch_hz).powf(0.3);
                            let string =
                                StringSpec::tuned(length_m, pitch_hz, 3.0e-3, stiffness).unwrap();
                            let loss = TwoT60::new(100.0, long, 8_000.0, short).unwrap();
                            Case {
                                series: ModeSeries::new(string, loss),
                                ceiling,
                            }
                        })
                })
        })
}

/// Pitch in turns per frame and r from the integers alone.
fn heard(coefficient: &Coefficient, form: Group) -> (f64, f64) {
    let damping = -f64::from(coefficient.damping) / 2.0_f64.powi(32);
    let restoring = -f64::from(coefficient.restoring) / 2.0_f64.powi(32 + i32::from(form.shift));
    let r = (1.0 - damping).sqrt();
    let half_sine = ((restoring - (damping / (1.0 + r)).powi(2)) / (4.0 * r)).sqrt();
    let angle = 2.0 * half_sine.asin();
    let angle = if form.folded {
        core::f64::consts::PI - angle
    } else {
        angle
    };
    (angle / TAU, r)
}

#[test]
fn pitch_and_decay_are_those_of_the_series() {
    let (mut worst_cents, mut worst_decay) = (0.0_f64, 0.0_f64);
    for case in cases() {
        let spec = NoteSpec::from_series(&case.series, RATE_HZ, case.ceiling).unwrap();
        let coefficients = spec.coefficients::<128>(128).unwrap();
        let reference = Coefficients::<128>::prepare(&case.series, 128, RATE_HZ, case.ceiling);
        assert_eq!(coefficients.modes(), reference.unwrap().modes());
        let forms = crate::bank::forms(coefficients.groups());
        for (n, (coefficient, form)) in (1..).zip(coefficients.as_slice().iter().zip(forms)) {
            let mode = case.series.mode(n).unwrap();
            let (turns, r) = heard(coefficient, form);
            let exact = mode.damped_angular() / TAU / RATE_HZ;
            worst_cents = worst_cents.max((1_200.0 * (turns / exact).log2()).abs());
            let decay = -r.ln() * RATE_HZ;
            worst_decay = worst_decay.max((decay / mode.decay_rate_per_s() - 1.0).abs());
        }
    }
    assert!(worst_cents < 0.002, "{worst_cents}");
    assert!(worst_decay < 1.0e-3, "{worst_decay}");
}

fn compare(onset: &Onset<128>, reference: &Onset<128>, ceiling: f64) {
    // Amplitude and phase of every mode: as one number, the error of q and of
    // the velocity over the angle.
    let tolerance = ceiling * 2.0_f64.powi(31) * 3.0e-7 + 8.0;
    let forms = crate::bank::forms(onset.groups()).zip(crate::bank::forms(reference.groups()));
    let both = onset.increments().iter().zip(reference.increments());
    for ((ours, theirs), (form, reference_form)) in both.zip(forms) {
        let error = f64::from(ours.q) - f64::from(theirs.q);
        assert!(error.abs() < tolerance, "{error}");
        let scaled = |one: &Increment, form: Group| {
            one.velocity() as f64 / 2.0_f64.powi(32 + i32::from(form.shift))
        };
        let error = scaled(ours, form) - scaled(theirs, reference_form);
        assert!(error.abs() < tolerance, "velocity {error}");
    }
    let slack = f64::from(onset.level_q31()) / f64::from(reference.level_q31());
    assert!((1.0 - 1.0e-5..1.04).contains(&slack), "{slack}");
}

#[test]
fn plucks_are_those_of_the_closed_form() {
    for case in cases() {
        let string = *case.series.string();
        let spec = NoteSpec::from_series(&case.series, RATE_HZ, case.ceiling).unwrap();
        let coefficients =
            Coefficients::<128>::prepare(&case.series, 128, RATE_HZ, case.ceiling).unwrap();
        let modes = coefficients.modes() as u32;
        for (place, heard_at, tip_m, aperture_m) in [
            (0.13, 0.21, 0.0, 0.0),
            (0.5, 0.91, 0.004, 0.0),
            (0.77, 0.04, 0.01, 0.02),
        ] {
            let pluck = RoundedPluck::new(place, 2.0e-3, tip_m).unwrap();
            let pickup = DisplacementPickup::new(heard_at, aperture_m).unwrap();
            let full = plan::l1_bound(&case.series, &pluck, &pickup, modes).unwrap()
                / (0.8 * f64::from(coefficients.ceiling_q31()) / 2.0_f64.powi(31));
            let reference =
                Onset::prepare(&coefficients, &case.series, &pluck, &pickup, full).unwrap();
            let spec_of_pluck = PluckSpec::displacement(&string, &pluck, &pickup, full).unwrap();
            let (_, onset) = spec.note::<128>(128, &spec_of_pluck).unwrap();
            compare(&onset, &reference, case.ceiling);

            let pickup = VelocityPickup::new(heard_at, aperture_m).unwrap();
            let full = plan::l1_bound(&case.series, &pluck, &pickup, modes).unwrap()
                / (0.8 * f64::from(coefficients.ceiling_q31()) / 2.0_f64.powi(31));
            let reference =
                Onset::prepare(&coefficients, &case.series, &pluck, &pickup, full).unwrap();
            let spec_of_pluck =
                PluckSpec::velocity(&string, &pluck, &pickup, RATE_HZ, full).unwrap();
            let (_, onset) = spec.note::<128>(128, &spec_of_pluck).unwrap();
            compare(&onset, &reference, case.ceiling);
        }
    }
}
