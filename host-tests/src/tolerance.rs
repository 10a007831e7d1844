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
/// Fewest radians of a mode within its T60, twenty periods, of which the same is
/// asked when it is one of 64 and at −60 dB: the bank rests up to k/(2e) units off
/// zero, which bends a tone of a few periods.
pub const FEWEST_RADIANS: f64 = 125.0;
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
/// Pitch of a mode on that bank, cents: the steps smear a short tone, and v is cut off
/// at the last place of q, which is coarse for low notes; a tenth
/// of a cent is still beyond hearing.
pub const NARROW_PITCH_CENTS: f64 = 0.1;
/// T60 of a mode there, as a share: the same steps.
pub const NARROW_T60: f64 = 0.02;
/// A closed form in f64 against another one of the same thing, as a share: some
/// thousand roundings.
pub const ROUNDING: f64 = 1.0e-12;
/// The same for sums of a hundred modes at arguments up to 10⁴ rad, which cost four
/// digits.
pub const SUM_OF_MODES: f64 = 1.0e-9;
/// A law whose extra is as good as nothing (a tip of 0.1 µm, a stiffness of
/// 1e-12 N m²) against the simpler one, as a share: (n π w/2L)²/6 and B n²/2 of the
/// highest mode looked at.
pub const LIMIT: f64 = 1.0e-8;
/// A motion integrated in steps of 1/200 rad by a method of fourth order, as a share
/// of the largest motion.
pub const SOLVER: f64 = 1.0e-8;
/// Frequencies of 150 beam elements, as a share: what their size and the rounding of
/// 1/h³ leave. Clamping an end moves the pitch by 1e-3 and more.
pub const ELEMENTS: f64 = 2.0e-5;
/// A rectangular wave of 3,000 smoothed modes, a fiftieth of a period and more from
/// its steps, as a share of the step.
pub const SMOOTHED_SERIES: f64 = 2.0e-3;
/// Power of the error of dithered words, dB: 400,000 frames tell a power to 0.02 dB
/// (three deviations).
pub const DITHER_DB: f64 = 0.05;
/// Mean of that error, in last places: 400,000 frames of deviation 1/2 tell it to
/// 0.0024 (three deviations).
pub const DITHER_MEAN: f64 = 5.0e-3;
/// How far above the mean of its neighbourhood a bin of the spectrum of that error
/// may stand, dB: 780 pieces tell it to 0.5 dB (three deviations), the highest of
/// 500 bins is a little above.
pub const DITHER_TONE_DB: f64 = 1.0;
/// A level that the bank takes from its integers, as a share too high (2^−12).
pub const LEVEL: f64 = 1.0 / 4_096.0;
/// An integral by 10,000 midpoints, as a share: the rule is off by h²/24 of the change
/// of slope, some 1e-9 with a corner in the middle.
pub const INTEGRAL: f64 = 1.0e-7;
/// The first 256 integer sines of a place, of 1: 2^(−20), as `modal_core::note` states.
pub const INTEGER_SINE: f64 = 1.0 / 1_048_576.0;
