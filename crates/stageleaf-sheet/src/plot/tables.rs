//! A chart as a table for reading, and as CSV for other tools.

use std::fmt::Write as _;

use maud::{Markup, html};
use stageleaf_math::dimension::Dimension;

use super::charts::Chart;

/// Charts over the same frequencies as one table, about three rows per decade (over a signal, all), closed until opened.
#[must_use]
pub fn table(charts: &[Chart]) -> Markup {
    let Some(first) = charts.first() else { return html! {} };
    let rows = if first.over == Dimension::Frequency { rows(&first.x) } else { (0..first.x.len()).collect() };
    html! {
        details class="numbers" {
            summary { "Numbers" }
            div class="scroll" tabindex="0" role="group" aria-label=(format_args!("{}, numbers", first.title)) {
                table {
                    thead { tr {
                        th scope="col" { (first.over_name()) }
                        @for chart in charts { @for curve in &chart.curves { th scope="col" { (curve.name) } } }
                    } }
                    tbody { @for i in rows { tr {
                        th scope="row" { (first.place_text(first.x[i])) }
                        @for chart in charts { @for curve in &chart.curves {
                            td { (curve.y.get(i).map_or_else(|| "–".into(), |y| chart.unit.text(*y, 3))) }
                        } }
                    } } }
                }
            }
        }
    }
}

/// Indices about a third of a decade apart.
fn rows(x: &[f64]) -> Vec<usize> {
    let mut rows = Vec::new();
    let Some(mut next) = x.first().copied() else { return rows };
    // The cube root of ten.
    let third = 2.154_434_69;
    for (i, f) in x.iter().enumerate() {
        // Half a per cent early counts: samples stand a whole number of steps apart only nearly.
        if *f >= next * 0.995 {
            rows.push(i);
            next = f * third;
        }
    }
    rows
}

/// A chart as CSV (RFC 4180): a line of names with units, then full-precision numbers; an empty field where there is none.
#[must_use]
pub fn csv(chart: &Chart) -> String {
    let mut text = format!("{} ({})", chart.over_name(), chart.over.si_unit());
    for curve in &chart.curves {
        let _ = write!(text, ",\"{} ({})\"", curve.name.replace('"', "\"\""), chart.unit.symbol());
    }
    text.push_str("\r\n");
    for (i, x) in chart.x.iter().enumerate() {
        let _ = write!(text, "{x}");
        for curve in &chart.curves {
            match curve.y.get(i) {
                Some(y) if y.is_finite() => {
                    let _ = write!(text, ",{y}");
                }
                _ => text.push(','),
            }
        }
        text.push_str("\r\n");
    }
    text
}
