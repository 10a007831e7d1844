//! What a performance has to show, in one table.

use host_tests::tolerance;
use serde::Serialize;

/// Everything that was measured, as `--json` writes it.
#[derive(Debug, Serialize)]
pub(crate) struct Figures {
    pub(crate) kernel: String,
    pub(crate) strings: u32,
    pub(crate) modes_per_string: u32,
    pub(crate) sample_rate_hz: f64,
    pub(crate) frames: usize,
    pub(crate) commands: usize,
    pub(crate) deadline_misses: f64,
    pub(crate) late_blocks: f64,
    pub(crate) spi_errors: f64,
    pub(crate) queue_overflows: f64,
    pub(crate) clipped: f64,
    pub(crate) limited: f64,
    /// Words on the wire that differ from those computed on this machine.
    pub(crate) words_that_differ: usize,
    pub(crate) frames_at_rest_at_the_end: usize,
    pub(crate) peak_dbfs: f64,
    /// The integers before dither, against f64, over the whole performance.
    pub(crate) engine_error_dbfs: f64,
    /// The words against f64, while something sounds.
    pub(crate) dac_error_dbfs: f64,
    /// What an ideal 16-bit converter with triangular dither adds.
    pub(crate) ideal_dac_error_dbfs: f64,
    pub(crate) max_pitch_error_cents: f64,
    pub(crate) max_t60_error_percent: f64,
    pub(crate) modes_measured: usize,
    pub(crate) instructions_per_frame_mean: f64,
    pub(crate) instructions_per_frame_max: f64,
    pub(crate) budget_instructions_per_frame: f64,
}

/// A bar that was missed, in words.
pub(crate) fn missed(figures: &Figures) -> Vec<String> {
    let none = [
        ("deadline misses", figures.deadline_misses),
        ("late blocks", figures.late_blocks),
        ("failed SPI transfers", figures.spi_errors),
        ("queue overflows", figures.queue_overflows),
        ("clipped frames", figures.clipped),
        ("limited sounds", figures.limited),
        ("words that differ", figures.words_that_differ as f64),
    ]
    .map(|(name, value)| (name, value, 0.0));
    let seconds = figures.frames as f64 / figures.sample_rate_hz;
    let clock_mhz = figures.budget_instructions_per_frame * figures.sample_rate_hz / 1.0e6;
    let at_most = [
        (
            "engine error in dBFS",
            figures.engine_error_dbfs,
            tolerance::ENGINE_DBFS,
        ),
        (
            "DAC error above the ideal converter in dB",
            (figures.dac_error_dbfs - figures.ideal_dac_error_dbfs).abs(),
            tolerance::CONVERTER_DB,
        ),
        (
            "pitch error in cents",
            figures.max_pitch_error_cents,
            tolerance::PITCH_CENTS,
        ),
        (
            "T60 error in percent",
            figures.max_t60_error_percent,
            100.0 * tolerance::T60,
        ),
        (
            "instructions of the busiest block per frame",
            figures.instructions_per_frame_max,
            figures.budget_instructions_per_frame,
        ),
        ("emulated clock in MHz", clock_mhz, 168.0),
        ("length short of 8 s", 8.0 - seconds, 0.0),
        (
            "frames at rest at the end, short of one block",
            32.0 - figures.frames_at_rest_at_the_end as f64,
            0.0,
        ),
    ];
    none.into_iter()
        .chain(at_most)
        // What is not a number misses.
        .filter(|(_, value, bar)| value.is_nan() || value > bar)
        .map(|(name, value, bar)| format!("{name}: {value}, allowed at most {bar}"))
        .collect()
}
