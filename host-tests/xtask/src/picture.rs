//! The picture of a performance: what was played, its spectrum, and how the
//! lowest string moves.

use std::f64::consts::PI;
use std::ops::Range;
use std::path::Path;

use anyhow::{Result, anyhow};
use firmware_example::command::{Applied, Kind};
use firmware_example::demo;
use host_tests::reference::{Damped, Wire};
use modal_core::Loss;
use plotters::coord::Shift;
use plotters::coord::types::RangedCoordf64;
use plotters::prelude::*;
use realfft::RealFftPlanner;

/// What is drawn.
pub(crate) struct Scene<'a> {
    /// The words on the wire as numbers.
    pub(crate) signal: &'a [f64],
    pub(crate) sample_rate_hz: f64,
    pub(crate) log: &'a [Applied],
}

const SIZE: (u32, u32) = (1_200, 1_260);
const INK: RGBColor = RGBColor(38, 50, 56);
const WAVE: RGBColor = RGBColor(46, 104, 140);
const PLUCK: RGBColor = RGBColor(178, 84, 20);
const MUTE: RGBColor = RGBColor(120, 120, 120);
const SHAPES: [RGBColor; 5] = [
    RGBColor(178, 84, 20),
    RGBColor(150, 130, 30),
    RGBColor(60, 125, 80),
    RGBColor(46, 104, 140),
    RGBColor(100, 70, 130),
];

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Chart<'a, 'b> = ChartContext<'b, SVGBackend<'a>, Cartesian2d<RangedCoordf64, RangedCoordf64>>;

/// Draws `scene` as an SVG file.
pub(crate) fn draw(path: &Path, scene: &Scene<'_>) -> Result<()> {
    let root = SVGBackend::new(path, SIZE).into_drawing_area();
    drawn(root.fill(&WHITE))?;
    let parts = root.split_evenly((4, 1));
    if let [wave, played, spectrum, shapes] = parts.as_slice() {
        waveform(wave, scene)?;
        time_line(played, scene)?;
        spectrum_of_chord(spectrum, scene)?;
        string_shapes(shapes)?;
    }
    drawn(root.present())
}

/// An error of the drawing library as one of ours.
fn drawn<T, E: std::fmt::Display>(result: std::result::Result<T, E>) -> Result<T> {
    result.map_err(|error| anyhow!("picture: {error}"))
}

fn chart<'a, 'b>(
    area: &'b Area<'a>,
    title: &str,
    (x, x_name): (Range<f64>, &str),
    (y, y_name): (Range<f64>, &str),
    y_places: usize,
) -> Result<Chart<'a, 'b>> {
    let mut chart = drawn(
        ChartBuilder::on(area)
            .caption(title, ("sans-serif", 20).into_font().color(&INK))
            .margin(12)
            .x_label_area_size(40)
            .y_label_area_size(64)
            .build_cartesian_2d(x, y),
    )?;
    drawn(
        chart
            .configure_mesh()
            .light_line_style(TRANSPARENT)
            .x_desc(x_name)
            .y_desc(y_name)
            .y_labels(if y_places == 0 { 6 } else { 9 })
            .y_label_formatter(&|value| format!("{value:.y_places$}"))
            .axis_desc_style(("sans-serif", 15))
            .label_style(("sans-serif", 14))
            .draw(),
    )?;
    Ok(chart)
}

fn waveform(area: &Area<'_>, scene: &Scene<'_>) -> Result<()> {
    let seconds = scene.signal.len() as f64 / scene.sample_rate_hz;
    let peak = scene
        .signal
        .iter()
        .fold(0.01_f64, |peak, s| peak.max(s.abs()));
    let mut chart = chart(
        area,
        "DAC words as captured on the wire",
        (0.0..seconds, "time in s"),
        (-1.1 * peak..1.1 * peak, "of full scale"),
        2,
    )?;
    // The extremes of each column of the picture.
    let column = scene.signal.len().div_ceil(1_100);
    let columns = scene
        .signal
        .chunks(column)
        .enumerate()
        .map(|(index, part)| {
            let at = (index * column) as f64 / scene.sample_rate_hz;
            let low = part.iter().copied().fold(f64::INFINITY, f64::min);
            let high = part.iter().copied().fold(f64::NEG_INFINITY, f64::max);
            PathElement::new(vec![(at, low), (at, high)], WAVE)
        });
    drawn(chart.draw_series(columns))?;
    Ok(())
}

fn time_line(area: &Area<'_>, scene: &Scene<'_>) -> Result<()> {
    let seconds = scene.signal.len() as f64 / scene.sample_rate_hz;
    let mut chart = chart(
        area,
        "Played: plucks (bars, as high as they are strong) and mutes (crosses)",
        (0.0..seconds, "time in s"),
        (0.0..demo::STRINGS as f64 + 1.0, "string"),
        0,
    )?;
    let at = |event: &Applied| f64::from(event.frame) / scene.sample_rate_hz;
    let line = |event: &Applied| f64::from(event.string) + 1.0;
    let plucks = scene.log.iter().filter(|event| event.kind == Kind::Pluck);
    drawn(chart.draw_series(plucks.map(|event| {
        let height = 0.8 * f64::from(event.gain.q15()) / 32_768.0;
        PathElement::new(
            vec![(at(event), line(event)), (at(event), line(event) + height)],
            PLUCK.stroke_width(3),
        )
    })))?;
    let mutes = scene.log.iter().filter(|event| event.kind == Kind::Mute);
    drawn(chart.draw_series(
        mutes.map(|event| Cross::new((at(event), line(event)), 4, MUTE.stroke_width(2))),
    ))?;
    Ok(())
}

fn spectrum_of_chord(area: &Area<'_>, scene: &Scene<'_>) -> Result<()> {
    const LENGTH: usize = 1 << 15;
    // Half a second into the loudest stretch.
    let from = loudest(scene.signal, LENGTH);
    let mut input: Vec<f64> = scene.signal[from..]
        .iter()
        .take(LENGTH)
        .enumerate()
        .map(|(n, s)| {
            // Blackman-Harris, four terms (Harris, Proc. IEEE 66:51, 1978; from memory).
            let turn = 2.0 * PI * n as f64 / LENGTH as f64;
            let window = 0.35875 - 0.48829 * turn.cos() + 0.14128 * (2.0 * turn).cos()
                - 0.01168 * (3.0 * turn).cos();
            s * window
        })
        .collect();
    input.resize(LENGTH, 0.0);
    let transform = RealFftPlanner::<f64>::new().plan_fft_forward(LENGTH);
    let mut output = transform.make_output_vec();
    drawn(transform.process(&mut input, &mut output))?;
    // A full-scale sine stands at 0 dB: half the length times the window's mean.
    let scale = 0.5 * LENGTH as f64 * 0.35875;
    let bin_hz = scene.sample_rate_hz / LENGTH as f64;
    let points: Vec<(f64, f64)> = output
        .iter()
        .enumerate()
        .map(|(bin, value)| {
            let level = 20.0 * (value.norm() / scale).max(1.0e-9).log10();
            (bin as f64 * bin_hz / 1_000.0, level)
        })
        .collect();
    let title = format!(
        "Spectrum of the {:.1} s from {:.1} s on: partials of the strings over the dither of 16 bits",
        LENGTH as f64 / scene.sample_rate_hz,
        from as f64 / scene.sample_rate_hz
    );
    let mut chart = chart(
        area,
        &title,
        (0.0..12.0, "frequency in kHz"),
        (-150.0..0.0, "dB of full scale"),
        0,
    )?;
    drawn(chart.draw_series(LineSeries::new(points, WAVE)))?;
    Ok(())
}

/// Where the stretch of `length` frames with the most power begins.
fn loudest(signal: &[f64], length: usize) -> usize {
    let power = |from: usize| -> f64 { signal[from..].iter().take(length).map(|s| s * s).sum() };
    (0..signal.len().saturating_sub(length))
        .step_by(length / 8)
        .max_by(|&a, &b| power(a).total_cmp(&power(b)))
        .unwrap_or(0)
}

fn string_shapes(area: &Area<'_>) -> Result<()> {
    const MODES: u32 = 200;
    let design = demo::design().map_err(|error| anyhow!("{error}"))?;
    let string = &design.strings[0];
    let spec = &string.spec;
    let wire = Wire {
        length_m: spec.length_m(),
        tension_n: spec.tension_n(),
        density_kg_per_m: spec.linear_density_kg_per_m(),
        stiffness_n_m2: spec.bending_stiffness_n_m2(),
    };
    let stroke = &string.stroke;
    let modes: Vec<Damped> = (1..=MODES)
        .map(|n| {
            let frequency_hz = wire.frequency_hz(n);
            let decay = string.ringing.decay_rate_per_s(n, frequency_hz, spec);
            let shape = wire.pluck(n, stroke.place, stroke.hardest_m, stroke.width_m);
            Damped::new(frequency_hz, decay, shape, 0.0)
        })
        .collect();
    let period = 1.0 / wire.frequency_hz(1);
    let top = 1.1e3 * stroke.hardest_m;
    let mut chart = chart(
        area,
        "The lowest string after its hardest pluck, from the same modes",
        (0.0..100.0 * spec.length_m(), "place in cm"),
        (-top..top, "displacement in mm"),
        1,
    )?;
    for (index, color) in SHAPES.into_iter().enumerate() {
        let at = period * index as f64 / 8.0;
        let displaced: Vec<f64> = modes.iter().map(|mode| mode.at(at)).collect();
        let shape = (0..=400).map(|step| {
            let x = f64::from(step) / 400.0;
            let sum: f64 = displaced
                .iter()
                .zip(1..)
                .map(|(q, n)| q * (f64::from(n) * PI * x).sin())
                .sum();
            (100.0 * spec.length_m() * x, 1.0e3 * sum)
        });
        let name = format!("{:.2} ms", 1.0e3 * at);
        drawn(chart.draw_series(LineSeries::new(shape, color.stroke_width(2))))?
            .label(name)
            .legend(move |(x, y)| {
                PathElement::new(vec![(x, y), (x + 20, y)], color.stroke_width(2))
            });
    }
    drawn(
        chart
            .configure_series_labels()
            .position(SeriesLabelPosition::LowerLeft)
            .background_style(WHITE.mix(0.85))
            .label_font(("sans-serif", 14))
            .draw(),
    )
}
