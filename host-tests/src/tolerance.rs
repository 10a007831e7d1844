//! Every tolerance of the tests, each with its reason.

/// Error of the integer engine against f64, dBFS: 30 dB below the last place of
/// a 16-bit converter, so that no listener can tell.
pub const ENGINE_DBFS: f64 = -125.0;
/// The same for any one string within the bounds, at −12 dB of its ceiling over
/// half a second, dBFS. With all of full scale for one string, 2^S is above
/// 1/(8 θ), so e is off by up to 2^(−33−S) and the angle by 2^(−31) a frame: at
/// 96 kHz a quarter of full scale drifts by 5.6e-6, −112 dB in the mean.
pub const ANY_STRING_DBFS: f64 = -112.0;
/// Pitch of a mode, cents: a hundredth of what trained ears tell apart.
pub const PITCH_CENTS: f64 = 0.01;
/// T60 of a mode, as a share.
pub const T60: f64 = 1.0e-3;
/// Excess of the converted words' error over an ideal dithered converter, dB.
pub const CONVERTER_DB: f64 = 1.0;
/// By how much a control has to pass [`ENGINE_DBFS`], dB: twice the error that is
/// allowed, so that no luck lets it through.
pub const CONTROL_MARGIN_DB: f64 = 6.0;
