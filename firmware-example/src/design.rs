//! An instrument as its maker states it, and prepared for the audio context.

use heapless::Vec;
use modal_core::{
    Coefficients, DisplacementPickup, Gain, ModeSeries, Onset, Result, RoundedPluck, StringSpec,
    TwoT60, plan,
};

use crate::command::{Action, Kind};

/// One string: what it is, how it is played and where it is heard.
#[derive(Clone, Copy, Debug)]
pub struct StringDesign {
    /// The MIDI note that plays it.
    pub note: u8,
    /// The string itself.
    pub spec: StringSpec,
    /// Its losses while it rings.
    pub ringing: TwoT60,
    /// Its losses while a hand rests on it.
    pub muted: TwoT60,
    /// Where and how wide it is plucked.
    pub stroke: Stroke,
    /// Where it is heard.
    pub pickup: DisplacementPickup,
}

/// A pluck at a place by a tip of a width, at its hardest.
#[derive(Clone, Copy, Debug)]
pub struct Stroke {
    /// Place as a fraction of the length.
    pub place: f64,
    /// Width of the tip in m.
    pub width_m: f64,
    /// Height of the hardest pluck in m.
    pub hardest_m: f64,
}

impl Stroke {
    /// The pluck with a share of the hardest height.
    ///
    /// # Errors
    /// As [`RoundedPluck::new`].
    pub fn pluck(&self, share: f64) -> Result<RoundedPluck> {
        RoundedPluck::new(self.place, share * self.hardest_m, self.width_m)
    }
}

impl StringDesign {
    /// The modes of the string while it rings.
    #[must_use]
    pub fn ringing_series(&self) -> ModeSeries<TwoT60> {
        ModeSeries::new(self.spec, self.ringing)
    }

    /// The modes of the string while it is muted.
    #[must_use]
    pub fn muted_series(&self) -> ModeSeries<TwoT60> {
        ModeSeries::new(self.spec, self.muted)
    }
}

/// An instrument of `S` strings with up to `M` modes each.
#[derive(Clone, Debug)]
pub struct Design<const S: usize, const M: usize> {
    /// Its strings.
    pub strings: [StringDesign; S],
    /// Frames per second.
    pub sample_rate_hz: f64,
    /// How many of the hardest plucks may ring at once on one string before
    /// the next one is made weaker.
    pub hardest_plucks_at_once: f64,
}

impl<const S: usize, const M: usize> Design<S, M> {
    /// Share of digital full scale that one string may fill.
    #[must_use]
    pub fn ceiling(&self) -> f64 {
        1.0 / S as f64
    }

    /// Displacement at the pickup (m) that is digital full scale, the same for
    /// all strings.
    ///
    /// # Errors
    /// A string or stroke outside its bounds.
    pub fn full_scale_m(&self) -> Result<f64> {
        let mut loudest = 0.0_f64;
        for string in &self.strings {
            let pluck = string.stroke.pluck(1.0)?;
            let bound = plan::l1_bound(&string.ringing_series(), &pluck, &string.pickup, M as u32)?;
            loudest = loudest.max(bound);
        }
        Ok(loudest * self.hardest_plucks_at_once / self.ceiling())
    }

    /// The instrument in integers: what the audio context needs, string by
    /// string.
    ///
    /// # Errors
    /// A string, loss, stroke or pickup outside its bounds.
    pub fn prepare(&self) -> Result<Vec<PreparedString<M>, S>> {
        let full_scale = self.full_scale_m()?;
        let mut prepared = Vec::new();
        for string in &self.strings {
            let ringing = self.coefficients(&string.ringing_series())?;
            let muted = self.coefficients(&string.muted_series())?;
            let hardest = Onset::prepare(
                &ringing,
                &string.ringing_series(),
                &string.stroke.pluck(1.0)?,
                &string.pickup,
                full_scale,
            )?;
            // There is room for S.
            let _ = prepared.push(PreparedString {
                note: string.note,
                ringing,
                muted,
                hardest,
            });
        }
        Ok(prepared)
    }

    fn coefficients(&self, series: &ModeSeries<TwoT60>) -> Result<Coefficients<M>> {
        Coefficients::prepare(series, M as u32, self.sample_rate_hz, self.ceiling())
    }
}

/// One string in integers.
#[derive(Clone, Debug)]
pub struct PreparedString<const M: usize> {
    /// The MIDI note that plays it.
    pub note: u8,
    /// Its coefficients while it rings.
    pub ringing: Coefficients<M>,
    /// Its coefficients while it is muted.
    pub muted: Coefficients<M>,
    /// The hardest pluck.
    pub hardest: Onset<M>,
}

impl<const M: usize> PreparedString<M> {
    /// The change that a gesture on this string makes; `gain` is the share of
    /// the hardest pluck.
    #[must_use]
    pub fn action(&self, kind: Kind, gain: Gain) -> Action<M> {
        match kind {
            Kind::Pluck => Action::Pluck {
                gain,
                onset: self.hardest.scaled(gain),
            },
            Kind::Release => Action::Release(self.ringing.clone()),
            Kind::Mute => Action::Mute(self.muted.clone()),
        }
    }
}
