//! The picture of a performance.

mod played;
mod shape;
mod spectrum;
mod waveform;

use std::fmt::Display;
use std::ops::Range;
use std::path::Path;

use anyhow::{Result, anyhow};
use firmware_example::command::{Applied, Kind};
use firmware_example::demo;
use plotters::coord::Shift;
use plotters::coord::types::RangedCoordf64;
use plotters::prelude::*;

use crate::figures::Performance;

const WIDTH: u32 = 1_200;
/// From top to bottom: the sound, what was played, a spectrum, a string.
const HEIGHTS: [u32; 4] = [280, 230, 370, 340];

const INK: RGBColor = RGBColor(38, 50, 56);
const SOUND: RGBColor = RGBColor(46, 104, 140);
const FORMULA: RGBColor = RGBColor(190, 84, 20);
const FAINT: RGBColor = RGBColor(130, 130, 130);

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Chart<'a, 'b> = ChartContext<'b, SVGBackend<'a>, Cartesian2d<RangedCoordf64, RangedCoordf64>>;

/// Draws `performance` with its `log` as an SVG file.
pub(crate) fn draw(path: &Path, log: &[Applied], performance: &Performance) -> Result<()> {
    let root = SVGBackend::new(path, (WIDTH, HEIGHTS.iter().sum())).into_drawing_area();
    root.fill(&WHITE).map_err(failed)?;
    let [first, second, third, _] = HEIGHTS;
    let (sound, rest) = root.split_vertically(first);
    let (played, rest) = rest.split_vertically(second);
    let (spectrum, shape) = rest.split_vertically(third);
    waveform::draw(&sound, &performance.heard)?;
    played::draw(&played, log, performance.heard.len())?;
    if let Some(note) = Note::first(log, performance.heard.len()) {
        spectrum::draw(&spectrum, &note, performance)?;
        shape::draw(&shape, &note)?;
    }
    root.present().map_err(failed)
}

/// The first pluck, until anything else happens.
struct Note {
    string: usize,
    /// Share of the hardest pluck.
    gain: f64,
    frames: Range<usize>,
}

impl Note {
    fn first(log: &[Applied], frames: usize) -> Option<Self> {
        let at = log.iter().position(|event| event.kind == Kind::Pluck)?;
        let pluck = log.get(at)?;
        let start = pluck.frame as usize;
        let end = log.get(at + 1).map_or(frames, |next| next.frame as usize);
        (start < end && end <= frames).then(|| Self {
            string: usize::from(pluck.string),
            gain: f64::from(pluck.gain.q15()) / 32_768.0,
            frames: start..end,
        })
    }
}

/// An error of the drawing library as one of ours.
fn failed(error: impl Display) -> anyhow::Error {
    anyhow!("the picture cannot be drawn: {error}")
}

/// An axis: its range and what it says.
struct Axis {
    range: Range<f64>,
    name: &'static str,
    labels: usize,
    places: usize,
}

impl Axis {
    fn label(&self, value: f64) -> String {
        let text = format!("{value:.0$}", self.places);
        // A zero that was a hair below zero.
        match text.strip_prefix('-') {
            Some(zero) if zero.chars().all(|c| "0.".contains(c)) => zero.to_owned(),
            _ => text,
        }
    }
}

/// Empty axes below a title.
fn axes<'a, 'b>(area: &'b Area<'a>, title: &str, x: &Axis, y: &Axis) -> Result<Chart<'a, 'b>> {
    let mut chart = ChartBuilder::on(area)
        .caption(title, ("sans-serif", 19).into_font().color(&INK))
        .margin(12)
        .margin_right(28)
        .x_label_area_size(42)
        .y_label_area_size(72)
        .build_cartesian_2d(x.range.clone(), y.range.clone())
        .map_err(failed)?;
    chart
        .configure_mesh()
        .light_line_style(TRANSPARENT)
        .bold_line_style(INK.mix(0.12))
        .axis_style(INK.mix(0.6))
        .x_desc(x.name)
        .y_desc(y.name)
        .x_labels(x.labels)
        .y_labels(y.labels)
        .x_label_formatter(&|value| x.label(*value))
        .y_label_formatter(&|value| y.label(*value))
        .axis_desc_style(("sans-serif", 15).into_font().color(&INK))
        .label_style(("sans-serif", 14).into_font().color(&INK))
        .draw()
        .map_err(failed)?;
    Ok(chart)
}

/// The axis of time, as long as `frames`.
fn time(frames: usize) -> Axis {
    Axis {
        range: 0.0..seconds(frames),
        name: "time in s",
        labels: 12,
        places: 0,
    }
}

fn seconds(frames: usize) -> f64 {
    frames as f64 / f64::from(demo::SAMPLE_RATE_HZ)
}

/// The names of what was drawn with names.
fn legend<'a: 'b, 'b>(chart: &mut Chart<'a, 'b>) -> Result<()> {
    chart
        .configure_series_labels()
        .position(SeriesLabelPosition::UpperRight)
        .background_style(WHITE.mix(0.9))
        .border_style(INK.mix(0.2))
        .label_font(("sans-serif", 14).into_font().color(&INK))
        .margin(8)
        .draw()
        .map_err(failed)
}
