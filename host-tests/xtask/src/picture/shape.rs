//! The shape of the string of the first note, summed from its modes.

use std::f64::consts::PI;

use anyhow::{Context, Result};
use firmware_example::demo;
use host_tests::performance::modes_of;
use host_tests::reference::{Damped, Wire};
use plotters::prelude::*;
use plotters::style::text_anchor::{HPos, Pos, VPos};

use super::{Area, Axis, INK, Note, axes, failed, legend};

/// Eighths of the period after the pluck, each with its colour.
const INSTANTS: [RGBColor; 5] = [
    RGBColor(190, 84, 20),
    RGBColor(150, 130, 30),
    RGBColor(60, 125, 80),
    RGBColor(46, 104, 140),
    RGBColor(100, 70, 130),
];

/// Points along the string.
const POINTS: u32 = 400;

pub(super) fn draw(area: &Area<'_>, note: &Note) -> Result<()> {
    let design = demo::design()?;
    let string = design.strings.get(note.string).context("no such string")?;
    let (spec, stroke) = (&string.spec, &string.stroke);
    let wire = Wire {
        length_m: spec.length_m(),
        tension_n: spec.tension_n(),
        density_kg_per_m: spec.linear_density_kg_per_m(),
        stiffness_n_m2: spec.bending_stiffness_n_m2(),
    };
    let height_m = note.gain * stroke.hardest_m;
    let modes: Vec<Damped> = (1..=demo::MODES as u32)
        .map(|n| {
            let decay = modes_of(string, n).0.decay;
            let shape = wire.pluck(n, stroke.place, height_m, stroke.width_m);
            Damped::new(wire.frequency_hz(n), decay, shape, 0.0)
        })
        .collect();

    let (length_cm, top_mm) = (100.0 * spec.length_m(), 1.3e3 * height_m);
    let along = Axis {
        range: 0.0..length_cm,
        name: "along the string in cm",
        labels: 12,
        places: 0,
    };
    let across = Axis {
        range: -top_mm..top_mm,
        name: "mm",
        labels: 7,
        places: 1,
    };
    let title = format!(
        "The string of that note in the first half of its period, summed from the same {} modes",
        demo::MODES
    );
    let mut chart = axes(area, &title, &along, &across)?;

    for (place, name) in [
        (stroke.place, "plucked here"),
        (string.pickup.place(), "heard here"),
    ] {
        let x = place * length_cm;
        let mark = PathElement::new(vec![(x, -top_mm), (x, top_mm)], INK.mix(0.35));
        chart.draw_series([mark]).map_err(failed)?;
        // Names to the outside of the two marks, as they can be close.
        let right = place >= stroke.place.max(string.pickup.place());
        let (side, gap) = if right {
            (HPos::Left, 0.3)
        } else {
            (HPos::Right, -0.3)
        };
        let anchor = Pos::new(side, VPos::Bottom);
        let font = ("sans-serif", 14).into_font().color(&INK).pos(anchor);
        let text = Text::new(name, (x + gap, -0.97 * top_mm), font);
        chart.draw_series([text]).map_err(failed)?;
    }
    let period_s = 1.0 / wire.frequency_hz(1);
    for (eighth, color) in (0..).zip(INSTANTS) {
        let at_s = period_s * f64::from(eighth) / 8.0;
        let displaced: Vec<f64> = modes.iter().map(|mode| mode.at(at_s)).collect();
        let shape = (0..=POINTS).map(|point| {
            let x = f64::from(point) / f64::from(POINTS);
            let modes = (1..).zip(&displaced);
            let sum: f64 = modes.map(|(n, q)| q * (f64::from(n) * PI * x).sin()).sum();
            (length_cm * x, 1.0e3 * sum)
        });
        chart
            .draw_series(LineSeries::new(shape, color.stroke_width(2)))
            .map_err(failed)?
            .label(format!("{:.2} ms", 1.0e3 * at_s))
            .legend(move |(x, y)| {
                PathElement::new(vec![(x, y), (x + 18, y)], color.stroke_width(2))
            });
    }
    legend(&mut chart)
}
