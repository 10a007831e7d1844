//! The sound over time.

use anyhow::Result;
use plotters::prelude::*;

use super::{Area, Axis, SOUND, WIDTH, axes, failed, seconds, time};

pub(super) fn draw(area: &Area<'_>, heard: &[f64]) -> Result<()> {
    let peak = heard.iter().fold(1.0e-3_f64, |peak, s| peak.max(s.abs()));
    let level = Axis {
        range: -1.1 * peak..1.1 * peak,
        name: "of full scale",
        labels: 7,
        places: 2,
    };
    let mut chart = axes(
        area,
        "The sound: words for the converter, as captured on the wire",
        &time(heard.len()),
        &level,
    )?;
    // The extremes of each column of the picture.
    let column = heard.len().div_ceil(WIDTH as usize).max(1);
    let columns = heard.chunks(column).enumerate().map(|(index, part)| {
        let at = seconds(index * column);
        let low = part.iter().copied().fold(f64::INFINITY, f64::min);
        let high = part.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        PathElement::new(vec![(at, low), (at, high)], SOUND)
    });
    chart.draw_series(columns).map_err(failed)?;
    Ok(())
}
