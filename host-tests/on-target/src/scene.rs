//! Six strings of 64 modes: what is counted. Invented, like the demonstration.

use modal_core::note::{NoteSpec, PluckSpec};
use modal_core::{
    Coefficients, DisplacementPickup, ModeSeries, Onset, Result, RoundedPluck, StringSpec, TwoT60,
    plan,
};

/// Strings.
pub const STRINGS: usize = 6;
/// Modes of each.
pub const MODES: usize = 64;
/// Frames per block.
pub const BLOCK: usize = 32;
/// Frames per second.
pub const RATE_HZ: f64 = 48_000.0;

/// Pitch in Hz and mass per metre in kg/m of each string, on 0.65 m.
const STRINGS_AT: [(f64, f64); STRINGS] = [
    (82.4, 6.2e-3),
    (110.0, 3.6e-3),
    (146.8, 2.0e-3),
    (196.0, 1.1e-3),
    (246.9, 0.7e-3),
    (311.1, 0.4e-3),
];

/// One string, ready to be prepared on either road.
#[derive(Clone, Copy, Debug)]
pub struct Prepared {
    /// Its modes.
    pub series: ModeSeries<TwoT60>,
    /// Its pluck.
    pub pluck: RoundedPluck,
    /// Its pickup.
    pub pickup: DisplacementPickup,
    /// Heard displacement in m that is full scale.
    pub full_scale_m: f64,
}

/// The string with this index (the last, for larger ones).
///
/// # Errors
/// None: the tests prepare all.
pub fn string(index: usize) -> Result<Prepared> {
    let (pitch_hz, density) = STRINGS_AT[index.min(STRINGS - 1)];
    let spec = StringSpec::tuned(0.65, pitch_hz, density, 4.0e-5)?;
    let series = ModeSeries::new(spec, TwoT60::new(100.0, 7.0, 5_000.0, 0.7)?);
    let pluck = RoundedPluck::new(0.13, 3.0e-3, 0.0)?;
    let pickup = DisplacementPickup::new(0.21, 0.0)?;
    let level = plan::l1_bound(&series, &pluck, &pickup, MODES as u32)?;
    Ok(Prepared {
        series,
        pluck,
        pickup,
        full_scale_m: 1.2 * level * STRINGS as f64,
    })
}

impl Prepared {
    /// Share of full scale of one string.
    pub const CEILING: f64 = 1.0 / STRINGS as f64;

    /// Coefficients by floating point.
    ///
    /// # Errors
    /// None: the tests prepare all.
    pub fn coefficients(&self) -> Result<Coefficients<MODES>> {
        Coefficients::prepare(&self.series, MODES as u32, RATE_HZ, Self::CEILING)
    }

    /// The pluck by floating point.
    ///
    /// # Errors
    /// None: the tests prepare all.
    pub fn onset(&self, coefficients: &Coefficients<MODES>) -> Result<Onset<MODES>> {
        Onset::prepare(
            coefficients,
            &self.series,
            &self.pluck,
            &self.pickup,
            self.full_scale_m,
        )
    }

    /// The string for the integer road.
    ///
    /// # Errors
    /// None: the tests prepare all.
    pub fn note(&self) -> Result<NoteSpec> {
        NoteSpec::from_series(&self.series, RATE_HZ, Self::CEILING)
    }

    /// The pluck for the integer road.
    ///
    /// # Errors
    /// None: the tests prepare all.
    pub fn pluck_spec(&self) -> Result<PluckSpec> {
        PluckSpec::displacement(
            self.series.string(),
            &self.pluck,
            &self.pickup,
            self.full_scale_m,
        )
    }
}
