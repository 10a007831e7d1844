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
/// Shortest T60 of a mode, s, of which pitch and T60 are held to anything: what is
/// gone sooner has too few frames above the noise of rounding.
pub const SHORTEST_T60_S: f64 = 0.02;
/// Error of a note prepared in integers within the bounds, otherwise as
/// [`ANY_STRING_DBFS`], dBFS: the squared angle and σ T are rounded to 2^(−56) and
/// 2^(−36) before they are multiplied by n².
pub const INTEGER_NOTE_DBFS: f64 = -105.0;
/// The same on the bank for small cores, dBFS: the noise of the 12-bit converter
/// that such a core feeds.
pub const NARROW_DBFS: f64 = -72.2;
/// Shortest T60 of a mode, s, that is looked at on that bank: it decays in steps of
/// 32 frames, and a fit needs tens of them.
pub const NARROW_SHORTEST_T60_S: f64 = 0.05;
/// Pitch of a mode on that bank, cents: the steps smear a short tone; a twentieth
/// of a cent is still beyond hearing.
pub const NARROW_PITCH_CENTS: f64 = 0.05;
/// T60 of a mode there, as a share: the same steps.
pub const NARROW_T60: f64 = 0.02;
