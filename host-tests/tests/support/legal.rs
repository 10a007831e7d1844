//! Whatever the bounds allow, however odd: wider than any instrument.

use modal_core::bounds::{self, Bound};
use modal_core::note::{NoteSpec, PluckSpec};
use modal_core::{
    Coefficients, DisplacementPickup, Ends, ModeSeries, Onset, Pickup, RoundedPluck, StringSpec,
    TwoT60, VelocityPickup, plan,
};
use proptest::prelude::*;

/// A value of `bound`, evenly over the logarithm where it has one, the ends
/// often.
pub fn within(bound: &'static Bound) -> BoxedStrategy<f64> {
    let Bound { min, max, .. } = *bound;
    let inside = if min < 0.0 {
        (min..max).boxed()
    } else {
        let low = min.max(1.0e-12 * max);
        (low.ln()..max.ln())
            .prop_map(move |log| log.exp().clamp(min, max))
            .boxed()
    };
    prop_oneof![8 => inside, 1 => Just(min), 1 => Just(max)].boxed()
}

/// A string with mode 1 between 1 Hz and 200 kHz: tension, mass and pitch at
/// will, the length follows; B up to 1.
pub fn string() -> impl Strategy<Value = StringSpec> {
    let ends = prop::sample::select(vec![Ends::Hinged, Ends::OneClamped, Ends::Clamped]);
    let stiffness = prop_oneof![Just(0.0), (1.0e-9_f64.ln()..0.0).prop_map(f64::exp)];
    (
        within(&bounds::TENSION_N),
        within(&bounds::LINEAR_DENSITY),
        0.0..1.0,
        stiffness,
        ends,
    )
        .prop_map(|(tension, density, part, b, ends)| {
            let speed = (tension / density).sqrt();
            let lowest = (0.5 * speed / bounds::LENGTH_M.max).max(bounds::FREQUENCY_HZ.min);
            let highest = (0.5 * speed / bounds::LENGTH_M.min).min(bounds::FREQUENCY_HZ.max);
            let pitch = lowest * (highest / lowest).powf(part);
            let length = (0.5 * speed / pitch).clamp(bounds::LENGTH_M.min, bounds::LENGTH_M.max);
            let stiffness = b * tension * length * length / std::f64::consts::PI.powi(2);
            StringSpec::new(
                length,
                tension,
                density,
                stiffness.min(bounds::BENDING_STIFFNESS.max),
            )
            .expect("within the bounds")
            .between(ends)
        })
}

/// Any two T60s: from no rise of the losses to one with the square of frequency.
pub fn losses() -> impl Strategy<Value = TwoT60> {
    (
        within(&bounds::T60_S),
        within(&bounds::FREQUENCY_HZ),
        0.01..1.0,
        0.0..1.0,
    )
        .prop_map(|(long, high, below, part): (f64, f64, f64, f64)| {
            let low = (below * high).max(bounds::FREQUENCY_HZ.min);
            let high = high.max(1.5 * low).min(bounds::FREQUENCY_HZ.max);
            let low = low.min(0.9 * high);
            let shortest = (long * (low / high).powi(2)).max(bounds::T60_S.min);
            let short = long * (shortest / long).powf(0.999 * part);
            TwoT60::new(low.max(1.0), long, high.max(1.2), short.min(long))
                .expect("within the bounds")
        })
}

/// Any pluck.
pub fn pluck() -> impl Strategy<Value = RoundedPluck> {
    (
        within(&bounds::PLACE),
        within(&bounds::PLUCK_HEIGHT_M),
        within(&bounds::WIDTH_M),
    )
        .prop_map(|(place, height, width)| {
            RoundedPluck::new(place, height, width).expect("within the bounds")
        })
}

/// Any pair of pickups, of displacement and of velocity, at one place.
pub fn pickups() -> impl Strategy<Value = (DisplacementPickup, VelocityPickup)> {
    (within(&bounds::PLACE), within(&bounds::WIDTH_M)).prop_map(|(place, aperture)| {
        (
            DisplacementPickup::new(place, aperture).expect("within the bounds"),
            VelocityPickup::new(place, aperture).expect("within the bounds"),
        )
    })
}

/// A string, how it is plucked and where it is heard.
#[derive(Clone, Debug)]
pub struct Played {
    pub series: ModeSeries<TwoT60>,
    pub pluck: RoundedPluck,
    pub pickups: (DisplacementPickup, VelocityPickup),
    /// Which of the two is used.
    pub by_velocity: bool,
    /// How many modes are asked for.
    pub modes: u32,
    /// Level of the pluck, as a share of the ceiling.
    pub level: f64,
}

pub fn played(most_modes: u32) -> impl Strategy<Value = Played> {
    (
        (string(), losses(), pluck(), pickups()),
        (any::<bool>(), 1..=most_modes, 0.01..1.0),
    )
        .prop_map(
            |((string, loss, pluck, pickups), (by_velocity, modes, level))| Played {
                series: ModeSeries::new(string, loss),
                pluck,
                pickups,
                by_velocity,
                modes,
                level,
            },
        )
}

impl Played {
    fn pickup(&self) -> &dyn Pickup {
        if self.by_velocity {
            &self.pickups.1
        } else {
            &self.pickups.0
        }
    }

    pub fn coefficients<const M: usize>(
        &self,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> modal_core::Result<Coefficients<M>> {
        Coefficients::prepare(&self.series, self.modes, sample_rate_hz, ceiling)
    }

    /// The pluck at its level of the ceiling of `coefficients`.
    pub fn onset<const M: usize>(
        &self,
        coefficients: &Coefficients<M>,
    ) -> modal_core::Result<Onset<M>> {
        let ceiling = f64::from(coefficients.ceiling_q31()) / 2.0_f64.powi(31);
        let full_scale = self.loudest(coefficients.modes() as u32)? / (self.level * ceiling);
        let pickup = self.pickup();
        Onset::prepare(coefficients, &self.series, &self.pluck, &pickup, full_scale)
    }

    /// The same through the integer road.
    pub fn note<const M: usize>(
        &self,
        sample_rate_hz: f64,
        ceiling: f64,
    ) -> modal_core::Result<(Coefficients<M>, Onset<M>)> {
        let spec = NoteSpec::from_series(&self.series, sample_rate_hz, ceiling)?;
        let below = self.series.modes_below(0.45 * sample_rate_hz);
        let full_scale = self.loudest(self.modes.min(below))? / (self.level * ceiling);
        let (string, (place, speed)) = (self.series.string(), &self.pickups);
        let pluck = if self.by_velocity {
            PluckSpec::velocity(string, &self.pluck, speed, sample_rate_hz, full_scale)?
        } else {
            PluckSpec::displacement(string, &self.pluck, place, full_scale)?
        };
        spec.note(self.modes, &pluck)
    }

    fn loudest(&self, modes: u32) -> modal_core::Result<f64> {
        plan::l1_bound(&self.series, &self.pluck, &self.pickup(), modes)
    }
}
