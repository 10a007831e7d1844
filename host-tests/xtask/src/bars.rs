//! What a performance has to show, in one table.

use console::style;
use firmware_example::demo;
use host_tests::tolerance;

use crate::figures::Figures;

/// A figure and its bar.
struct Bar {
    name: &'static str,
    unit: &'static str,
    /// Decimal places that are printed.
    places: usize,
    limit: Limit,
    figure: fn(&Figures) -> f64,
}

enum Limit {
    AtMost(f64),
    AtLeast(f64),
}
use Limit::{AtLeast, AtMost};

/// Shorter performances show too little.
const SHORTEST_S: f64 = 8.0;
/// The fastest clock of the chips that the demonstration is meant for, where an
/// instruction takes a cycle.
const FASTEST_MHZ: f64 = 168.0;

/// Nothing of the kind may happen.
const fn none(name: &'static str, figure: fn(&Figures) -> f64) -> Bar {
    bar(name, "", 0, AtMost(0.0), figure)
}

const fn bar(
    name: &'static str,
    unit: &'static str,
    places: usize,
    limit: Limit,
    figure: fn(&Figures) -> f64,
) -> Bar {
    Bar {
        name,
        unit,
        places,
        limit,
        figure,
    }
}

const BARS: &[Bar] = &[
    bar("length", "s", 2, AtLeast(SHORTEST_S), |f| {
        f.frames as f64 / f.sample_rate_hz as f64
    }),
    none("deadlines missed", |f| f.deadline_misses as f64),
    none("blocks late", |f| f.late_blocks as f64),
    none("SPI transfers failed", |f| f.spi_errors as f64),
    none("plucks lost to a full queue", |f| f.queue_overflows as f64),
    none("commands lost", |f| f.commands_lost as f64),
    none("sounds limited", |f| f.limited as f64),
    none("frames clipped", |f| f.clipped as f64),
    none("words that differ from this machine's", |f| {
        f.words_that_differ as f64
    }),
    bar(
        "words at rest at the end",
        "",
        0,
        AtLeast(demo::BLOCK as f64),
        |f| f.rest_words_at_end as f64,
    ),
    bar(
        "integers against the closed form",
        "dBFS",
        1,
        AtMost(tolerance::ENGINE_DBFS),
        |f| f.engine_error_dbfs,
    ),
    bar(
        "words against an ideal converter",
        "dB",
        2,
        AtMost(tolerance::CONVERTER_DB),
        |f| (f.dac_error_dbfs - f.ideal_dac_error_dbfs).abs(),
    ),
    bar(
        "pitch error of the worst mode",
        "cent",
        6,
        AtMost(tolerance::PITCH_CENTS),
        |f| f.max_pitch_error_cents,
    ),
    bar(
        "T60 error of the worst mode",
        "%",
        4,
        AtMost(100.0 * tolerance::T60),
        |f| f.max_t60_error_percent,
    ),
    bar(
        "busiest block, of the time there is",
        "%",
        1,
        AtMost(100.0),
        |f| 100.0 * f.instructions_per_frame_max / f.budget_instructions_per_frame,
    ),
    bar(
        "instructions a second, in millions",
        "",
        1,
        AtMost(FASTEST_MHZ),
        |f| f.budget_instructions_per_frame * f.sample_rate_hz as f64 * 1.0e-6,
    ),
];

impl Bar {
    fn is_met(&self, figures: &Figures) -> bool {
        let figure = (self.figure)(figures);
        // NaN meets nothing.
        match self.limit {
            AtMost(limit) => figure <= limit,
            AtLeast(limit) => figure >= limit,
        }
    }

    fn line(&self, figures: &Figures) -> String {
        let Self {
            name, unit, places, ..
        } = *self;
        let figure = format!("{:.places$} {unit}", (self.figure)(figures));
        let limit = match self.limit {
            AtMost(0.0) => "none".to_owned(),
            AtMost(limit) => format!("at most {limit} {unit}"),
            AtLeast(limit) => format!("at least {limit} {unit}"),
        };
        format!("{name:<40} {figure:>14}   {:<20}", limit.trim_end())
    }
}

/// Prints every figure beside its bar; how many are missed.
pub(crate) fn print(figures: &Figures) -> usize {
    let mut missed = 0;
    for bar in BARS {
        let line = bar.line(figures);
        if bar.is_met(figures) {
            println!("  {line} {}", style("ok").green());
        } else {
            println!("  {line} {}", style("MISSED").red().bold());
            missed += 1;
        }
    }
    missed
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_bar_can_be_met_and_missed() {
        let breaks: [fn(&mut Figures); 16] = [
            |f| f.frames = 383_999,
            |f| f.deadline_misses = 1,
            |f| f.late_blocks = 1,
            |f| f.spi_errors = 1,
            |f| f.queue_overflows = 1,
            |f| f.commands_lost = 1,
            |f| f.limited = 1,
            |f| f.clipped = 1,
            |f| f.words_that_differ = 1,
            |f| f.rest_words_at_end = 31,
            |f| f.engine_error_dbfs = -124.9,
            |f| f.dac_error_dbfs = -95.2,
            |f| f.max_pitch_error_cents = f64::NAN,
            |f| f.max_t60_error_percent = 0.11,
            |f| f.instructions_per_frame_max = 2_605.0,
            |f| f.budget_instructions_per_frame = 3_501.0,
        ];
        assert_eq!(breaks.len(), BARS.len());
        for (bar, spoil) in BARS.iter().zip(breaks) {
            let mut figures = Figures::good();
            assert!(bar.is_met(&figures), "{}", bar.name);
            spoil(&mut figures);
            let missed: Vec<&str> = BARS
                .iter()
                .filter(|bar| !bar.is_met(&figures))
                .map(|bar| bar.name)
                .collect();
            assert_eq!(missed, [bar.name]);
        }
    }
}
