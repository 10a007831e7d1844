//! The inner loop against its definition, one mode and one frame at a time, for any
//! bits in states and coefficients; and the integer sines against sines.
#![allow(clippy::expect_used, reason = "a test may fail")]

mod support;

use host_tests::tolerance;
use modal_core::bank::{Coefficient, FOLDED_SHIFT, Group, Resonator, SHIFTS, State};
use modal_core::kernel;
use modal_core::note::{Place, Sines};
use modal_core::{Bank, ModeBank};
use proptest::prelude::*;
use support::{MODES, scene};

/// D += −k hi(D) − e q; q += hi(D) >> S, all of it wrapping; the frame heard is q
/// before the step, with every second sign turned for folded modes.
fn one_mode(resonator: &mut Resonator, group: Group, block: &mut [i32]) {
    let Coefficient { damping, restoring } = resonator.coefficient;
    for (frame, heard) in block.iter_mut().enumerate() {
        let State { q, .. } = resonator.state;
        let turned = group.folded && frame % 2 == 1;
        *heard = heard.wrapping_add(if turned { q.wrapping_neg() } else { q });
        let d = resonator.state.velocity();
        let d = d
            .wrapping_add(i64::from(damping).wrapping_mul(d >> 32))
            .wrapping_add(i64::from(restoring).wrapping_mul(i64::from(q)));
        resonator.state.set_velocity(d);
        let high = (d >> 32) as i32;
        let step = if group.shift < 0 {
            high.wrapping_shl(u32::from(group.shift.unsigned_abs()))
        } else {
            high >> group.shift
        };
        resonator.state.q = q.wrapping_add(step);
    }
}

fn resonator() -> impl Strategy<Value = Resonator> {
    let bits = (any::<i32>(), any::<i64>(), any::<i32>(), any::<i32>());
    bits.prop_map(|(q, velocity, damping, restoring)| {
        let mut state = State::rest(0);
        state.q = q;
        state.set_velocity(velocity);
        Resonator {
            state,
            coefficient: Coefficient { damping, restoring },
        }
    })
}

/// Groups of up to nine modes: odd and even counts, and none at all.
fn groups() -> impl Strategy<Value = Vec<(Group, Vec<Resonator>)>> {
    let form = prop_oneof![
        3 => prop::sample::select(SHIFTS.to_vec()).prop_map(|shift| (shift, false)),
        1 => Just((FOLDED_SHIFT, true)),
    ];
    let group = (form, prop::collection::vec(resonator(), 0..10));
    let group = group.prop_map(|((shift, folded), modes)| {
        let group = Group {
            shift,
            folded,
            modes: modes.len() as u16,
        };
        (group, modes)
    });
    prop::collection::vec(group, 0..5)
}

proptest! {
    #![proptest_config(support::cases(500))]

    #[test]
    fn every_kernel_is_its_definition(groups in groups(), before in any::<[i32; 32]>()) {
        let forms: Vec<Group> = groups.iter().map(|(form, _)| *form).collect();
        let mut all: Vec<Resonator> = groups.iter().flat_map(|(_, modes)| modes.clone()).collect();
        let (mut naive, mut portable, mut chosen) = (before, before, before);
        let (mut expected, mut by_group) = (Vec::new(), Vec::new());
        for (form, modes) in groups {
            for mut mode in modes.clone() {
                one_mode(&mut mode, form, &mut naive);
                expected.push(mode);
            }
            let mut modes = modes;
            kernel::render_portable(form, &mut modes, &mut portable);
            by_group.extend(modes);
        }
        kernel::render(&forms, &mut all, &mut chosen);
        prop_assert_eq!(naive, portable);
        prop_assert_eq!(naive, chosen);
        prop_assert_eq!(&expected, &by_group);
        prop_assert_eq!(&expected, &all);
    }

    /// A bank is its resonators: what it plays, and what it is at rest.
    #[test]
    fn a_bank_is_its_resonators(scene in scene()) {
        let Ok(coefficients) = scene.coefficients() else {
            return Err(TestCaseError::reject("decays too slow for the ceiling"));
        };
        let mut bank = Bank::<MODES>::at_rest(&coefficients);
        prop_assert!(bank.is_at_rest());
        let onset = scene.onset(&coefficients, scene.full_scale(&coefficients, 0.9));
        bank.add(&onset, modal_core::Gain::UNITY);
        let (mut modes, mut heard) = (bank.resonators().to_vec(), [0; 32]);
        let forms = support::wide::forms(bank.groups());
        for (mode, form) in modes.iter_mut().zip(forms) {
            one_mode(mode, form, &mut heard);
        }
        let mut block = [0; 32];
        bank.render(&mut block);
        prop_assert_eq!(block, heard);
        bank.clear();
        let mut block = [7; 32];
        bank.render(&mut block);
        prop_assert!(bank.is_at_rest());
        prop_assert_eq!(block, [7; 32]);
        let fresh = Bank::<MODES>::at_rest(&coefficients);
        prop_assert_eq!(bank.resonators(), fresh.resonators());
    }

    #[test]
    fn integer_sines_are_sines(fraction_q32 in 1_u32.., part in 1_u16..400, whole in 2_u16..400) {
        let terms = |mut sines: Sines, place: f64| -> Result<(), TestCaseError> {
            for n in 1..=256 {
                let exact = (std::f64::consts::PI * (f64::from(n) * place).rem_euclid(2.0)).sin();
                let ours = f64::from(sines.step()) / f64::from(1 << 30);
                prop_assert!((ours - exact).abs() < tolerance::INTEGER_SINE, "{n}: {ours} {exact}");
            }
            Ok(())
        };
        let place = Place::from_q32(fraction_q32);
        prop_assert_eq!(place.fraction_q32(), fraction_q32);
        terms(place.sines(), f64::from(fraction_q32) / 4_294_967_296.0)?;
        let Some(place) = Place::ratio(part, whole) else {
            prop_assert!(part >= whole);
            return Ok(());
        };
        terms(place.sines(), f64::from(part) / f64::from(whole))?;
        let mut sines = place.sines();
        for n in 1..=800_u32 {
            let is_node = (n * u32::from(part)).is_multiple_of(u32::from(whole));
            prop_assert!((sines.step() == 0) == is_node, "{n} of {part}/{whole}");
        }
    }
}
