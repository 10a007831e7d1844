//! The spectrum of the first note beside the closed form.

use std::f64::consts::TAU;

use anyhow::{Context, Result};
use firmware_example::demo;
use host_tests::performance::modes_of;
use host_tests::reference::Damped;
use plotters::prelude::*;
use realfft::RealFftPlanner;

use super::{Area, Axis, FAINT, FORMULA, Note, SOUND, axes, failed, legend, seconds};
use crate::figures::Performance;

/// The range of the picture in dB.
const FLOOR_DB: f64 = -200.0;
const TOP_DB: f64 = 0.0;

/// Share of the loudest mode below which a mode is rounding.
const NOT_THERE: f64 = 1.0e-9;

pub(super) fn draw(area: &Area<'_>, note: &Note, performance: &Performance) -> Result<()> {
    let design = demo::design()?;
    let string = design.strings.get(note.string).context("no such string")?;
    let modes: Vec<Damped> = (1..=demo::MODES as u32)
        .map(|n| modes_of(string, n).0)
        .collect();
    let most = |of: fn(&Damped) -> f64| modes.iter().map(of).fold(0.0, f64::max);
    let highest_hz = most(|mode| mode.angular / TAU);
    let loudest = most(|mode| mode.a.abs());
    let part = |signal: &[f64]| signal.get(note.frames.clone()).unwrap_or_default().to_vec();
    let (mix, closed_form) = (part(&performance.mix), part(&performance.closed_form));
    let error: Vec<f64> = mix.iter().zip(&closed_form).map(|(m, c)| m - c).collect();

    let title = format!(
        "Spectrum of the first note: string {} alone, {:.2} s",
        note.string + 1,
        seconds(note.frames.len())
    );
    let frequency = Axis {
        range: 0.0..1.05 * highest_hz,
        name: "frequency in Hz",
        labels: 12,
        places: 0,
    };
    let level = Axis {
        range: FLOOR_DB..TOP_DB,
        name: "dB of full scale",
        labels: 10,
        places: 0,
    };
    let mut chart = axes(area, &title, &frequency, &level)?;
    for (signal, color, name) in [
        (error, FAINT, "integers before dither, less the formula"),
        (part(&performance.heard), SOUND, "words on the wire"),
    ] {
        let spectrum = Spectrum::of(&signal)?;
        chart
            .draw_series(LineSeries::new(spectrum.points(1.05 * highest_hz), color))
            .map_err(failed)?
            .label(name)
            .legend(move |(x, y)| {
                PathElement::new(vec![(x, y), (x + 18, y)], color.stroke_width(2))
            });
    }
    let formula = Spectrum::of(&closed_form)?;
    // A mode with a node where the string is heard or plucked is not there.
    let circles = modes
        .iter()
        .filter(|mode| mode.a.abs() > NOT_THERE * loudest)
        .map(|mode| mode.angular / TAU)
        .map(|hz| Circle::new((hz, formula.level_db(hz)), 4, FORMULA.stroke_width(2)));
    chart
        .draw_series(circles)
        .map_err(failed)?
        .label("the string's modes by the formula")
        .legend(|(x, y)| Circle::new((x + 9, y), 4, FORMULA.stroke_width(2)));
    legend(&mut chart)
}

/// Levels of a signal: a sine of full scale stands at 0 dB.
struct Spectrum {
    levels_db: Vec<f64>,
    bin_hz: f64,
}

impl Spectrum {
    fn of(signal: &[f64]) -> Result<Self> {
        // Zeros behind the signal draw the tops of the peaks finer.
        let length = (4 * signal.len()).next_power_of_two().max(2);
        let mut input: Vec<f64> = signal
            .iter()
            .enumerate()
            .map(|(n, s)| s * window(n as f64 / signal.len() as f64))
            .collect();
        input.resize(length, 0.0);
        let transform = RealFftPlanner::new().plan_fft_forward(length);
        let mut output = transform.make_output_vec();
        transform.process(&mut input, &mut output)?;
        let scale = 0.5 * signal.len() as f64 * WINDOW[0];
        let levels_db = output
            .iter()
            .map(|value| 20.0 * (value.norm() / scale).log10().max(FLOOR_DB / 20.0))
            .collect();
        Ok(Self {
            levels_db,
            bin_hz: f64::from(demo::SAMPLE_RATE_HZ) / length as f64,
        })
    }

    fn level_db(&self, frequency_hz: f64) -> f64 {
        let bin = (frequency_hz / self.bin_hz).round() as usize;
        self.levels_db.get(bin).copied().unwrap_or(FLOOR_DB)
    }

    /// Frequencies and levels up to a frequency.
    fn points(&self, limit_hz: f64) -> impl Iterator<Item = (f64, f64)> {
        self.levels_db
            .iter()
            .enumerate()
            .map(|(bin, &level_db)| (bin as f64 * self.bin_hz, level_db))
            .take_while(move |&(frequency_hz, _)| frequency_hz <= limit_hz)
    }
}

/// Blackman-Harris, four terms (Harris, Proc. IEEE 66:51, 1978; from memory):
/// leaks less than -92 dB.
const WINDOW: [f64; 4] = [0.35875, -0.48829, 0.14128, -0.01168];

fn window(at: f64) -> f64 {
    (0..)
        .zip(WINDOW)
        .map(|(k, a)| a * (f64::from(k) * TAU * at).cos())
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_sine_of_full_scale_stands_at_zero() {
        let rate_hz = f64::from(demo::SAMPLE_RATE_HZ);
        let sine: Vec<f64> = (0..9_000)
            .map(|n| (TAU * 1_000.0 * f64::from(n) / rate_hz).sin())
            .collect();
        let spectrum = Spectrum::of(&sine).unwrap();
        assert!(spectrum.level_db(1_000.0).abs() < 0.1);
        assert!(spectrum.level_db(3_000.0) < -90.0);
    }
}
