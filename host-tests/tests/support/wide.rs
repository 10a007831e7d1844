//! The bank again, in integers that are too wide to wrap.

use modal_core::Voice;
use modal_core::bank::Group;
use proptest::prelude::*;

/// Displacement and velocity accumulator of every sounding mode.
struct Wide(Vec<(i128, i128)>);

impl Wide {
    fn of<const M: usize>(voice: &Voice<M>) -> Self {
        let sounding = voice
            .bank()
            .resonators()
            .iter()
            .take(voice.bank().sounding());
        let state = sounding.map(|one| (one.state.q.into(), one.state.velocity().into()));
        Self(state.collect())
    }

    /// One frame of every mode; the sum that is heard.
    fn step<const M: usize>(&mut self, voice: &Voice<M>, odd: bool) -> i128 {
        let modes = voice
            .bank()
            .resonators()
            .iter()
            .zip(forms(voice.bank().groups()));
        let mut heard = 0;
        for ((q, velocity), (one, form)) in self.0.iter_mut().zip(modes) {
            heard += if form.folded && odd { -*q } else { *q };
            *velocity += i128::from(one.coefficient.damping) * (*velocity >> 32)
                + i128::from(one.coefficient.restoring) * *q;
            let high = *velocity >> 32;
            *q += if form.shift >= 0 {
                high >> form.shift
            } else {
                high << -form.shift
            };
        }
        heard
    }
}

/// The form of every mode.
pub fn forms(groups: &[Group]) -> impl Iterator<Item = Group> {
    groups
        .iter()
        .flat_map(|group| std::iter::repeat_n(*group, usize::from(group.modes)))
}

/// Renders a block and holds it against 128 bits: the same frames, none above
/// the share of the voice, no state that 32 and 64 bits do not hold, and a bound
/// that is one.
pub fn render<const M: usize>(voice: &mut Voice<M>) -> Result<(), TestCaseError> {
    let mut block = [0; 32];
    let (before, mut wide) = (voice.clone(), Wide::of(voice));
    voice.render(&mut block);
    let share = i128::from(voice.share_q31());
    for (frame, got) in block.into_iter().enumerate() {
        let heard = wide.step(&before, frame % 2 == 1);
        prop_assert_eq!(i128::from(got), heard, "frame {}", frame);
        prop_assert!(heard.abs() <= share, "{} above {}", heard, share);
        for &(q, velocity) in &wide.0 {
            prop_assert!(i32::try_from(q).is_ok(), "q = {}", q);
            prop_assert!(i64::try_from(velocity).is_ok(), "D = {}", velocity);
        }
    }
    prop_assert!(voice.bound_q31() <= u64::from(voice.ceiling_q31()) + 1);
    Ok(())
}
