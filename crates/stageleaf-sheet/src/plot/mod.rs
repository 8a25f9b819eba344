//! Curves against frequency or signal: charts as data, then as SVG, table, CSV and readings.

pub mod axis;
pub mod charts;
mod draw;
mod tables;

pub use charts::{Chart, Curve, Mark, Words, chart, charts};
pub use draw::svg;
pub use tables::{csv, table};

use crate::Sheet;

/// Left edge of a plot's area, in units of its view box.
pub const AREA_LEFT: f64 = 52.0;
/// Width of a plot's area.
pub const AREA_WIDTH: f64 = 340.0;

/// What the readout says at one point of a plot.
#[derive(Clone, Debug, PartialEq)]
pub struct Reading {
    /// The point's index, to step from.
    pub index: usize,
    /// Where the cursor line stands, in units of the plot's view box.
    pub x: f64,
    /// The words: "20 kHz: magnitude 26.2 dB".
    pub text: String,
}

/// The reading at a point of a plot; the last one where `index` is past the end.
#[must_use]
pub fn reading(sheet: &Sheet, plot: &str, index: usize) -> Option<Reading> {
    let chart = chart(sheet, plot)?;
    let index = index.min(chart.x.len().checked_sub(1)?);
    let x = AREA_LEFT + AREA_WIDTH * chart.x_axis.place(chart.x[index]);
    let mut text = format!("{}:", chart.place_text(chart.x[index]));
    for curve in &chart.curves {
        text.push_str(&format!(" {} {};", curve.name, chart.unit.text(curve.y[index], 3)));
    }
    text.pop();
    x.is_finite().then_some(Reading { index, x, text })
}

/// The reading nearest to a pointer at `x`, in units of the plot's view box.
#[must_use]
pub fn reading_near(sheet: &Sheet, plot: &str, x: f64) -> Option<Reading> {
    let chart = chart(sheet, plot)?;
    let wanted = chart.x_axis.value(((x - AREA_LEFT) / AREA_WIDTH).clamp(0.0, 1.0));
    let index = chart.x.partition_point(|f| *f < wanted);
    let ruler = chart.x_axis.ruler();
    let apart = |index: usize| (ruler.place(chart.x[index]) - ruler.place(wanted)).abs();
    let nearer_below = index > 0 && (index == chart.x.len() || apart(index - 1) < apart(index));
    reading(sheet, plot, if nearer_below { index - 1 } else { index })
}
