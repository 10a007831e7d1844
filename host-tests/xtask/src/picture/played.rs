//! What was played, string by string.

use anyhow::Result;
use firmware_example::command::{Applied, Kind};
use firmware_example::demo;
use plotters::prelude::*;

use super::{Area, Axis, FAINT, FORMULA, axes, failed, seconds, time};

pub(super) fn draw(area: &Area<'_>, log: &[Applied], frames: usize) -> Result<()> {
    let strings = Axis {
        range: 0.6..demo::STRINGS as f64 + 0.9,
        name: "string",
        labels: demo::STRINGS,
        places: 0,
    };
    let mut chart = axes(
        area,
        "Played: plucks (bars, as high as they are strong) and mutes (crosses)",
        &time(frames),
        &strings,
    )?;
    let at = |event: &Applied| seconds(event.frame as usize);
    let line = |event: &Applied| f64::from(event.string) + 1.0;
    let of_kind = |kind| log.iter().filter(move |event| event.kind == kind);
    let plucks = of_kind(Kind::Pluck).map(|event| {
        let strength = f64::from(event.gain.q15()) / 32_768.0;
        let bar = vec![
            (at(event), line(event)),
            (at(event), line(event) + strength),
        ];
        PathElement::new(bar, FORMULA.stroke_width(4))
    });
    chart.draw_series(plucks).map_err(failed)?;
    let mutes = of_kind(Kind::Mute)
        .map(|event| Cross::new((at(event), line(event)), 4, FAINT.stroke_width(2)));
    chart.draw_series(mutes).map_err(failed)?;
    Ok(())
}
