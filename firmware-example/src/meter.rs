//! A level meter for people: decibels below digital full scale.

use micromath::F32Ext;

/// Shown for silence: below the last place of Q31.
pub const FLOOR_DBFS: f32 = -192.0;

/// Decibels of a doubling of amplitude: 20 log10 2.
const DB_PER_OCTAVE: f32 = 6.020_6;

/// The level of a peak in Q31, within 0.1 dB.
///
/// The whole octaves are counted exactly; only what is left of the last one
/// goes through the approximate logarithm.
#[must_use]
pub fn dbfs(peak_q31: u32) -> f32 {
    if peak_q31 == 0 {
        return FLOOR_DBFS;
    }
    let zeros = peak_q31.leading_zeros();
    // From 1 up to 2.
    let mantissa = (peak_q31 << zeros) as f32 / 2_147_483_648.0;
    DB_PER_OCTAVE * (F32Ext::log2(mantissa) - zeros as f32)
}

/// A meter that rises at once and falls slowly.
#[derive(Clone, Debug)]
pub struct Meter {
    level_dbfs: f32,
    fall_db: f32,
}

impl Meter {
    /// A meter that falls by at most `fall_db` a reading.
    #[must_use]
    pub const fn new(fall_db: f32) -> Self {
        Self {
            level_dbfs: FLOOR_DBFS,
            fall_db,
        }
    }

    /// Takes the peak (Q31) since the last reading and returns what to show.
    pub fn read(&mut self, peak_q31: u32) -> f32 {
        let fallen = (self.level_dbfs - self.fall_db).max(FLOOR_DBFS);
        self.level_dbfs = dbfs(peak_q31).max(fallen);
        self.level_dbfs
    }
}
