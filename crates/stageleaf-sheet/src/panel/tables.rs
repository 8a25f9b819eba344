//! The DC error budget, and poles with zeros.

use std::f64::consts::TAU;

use maud::{Markup, html};
use stageleaf_math::{dimension::Dimension, figure::Figure, report::Root};
use stageleaf_note::words;

use super::{
    cell,
    curves::{bar, percent},
    needs, row_of, scroll, value,
};
use crate::Sheet;

/// What each cause adds to the offset at the output.
pub fn dc(sheet: &Sheet) -> Markup {
    let lines = &sheet.report.dc_budget;
    let total: f64 = lines.iter().filter_map(|l| l.worst.value()).filter(|v| v.is_finite()).map(f64::abs).sum();
    let squares: f64 = lines.iter().filter_map(|l| l.worst.value()).filter(|v| v.is_finite()).map(|v| v * v).sum();
    let whole = lines.iter().all(|l| l.worst.value().is_some_and(f64::is_finite));
    html! {
        summary { "DC error budget" }
        @if lines.is_empty() { p class="aside" { "No DC errors could be computed." } }
        @else {
            (scroll("DC error budget", &html! { table class="shares" {
                caption { "Magnitudes at the output" }
                thead { tr { th scope="col" { "cause" } th scope="col" { "nominal" } th scope="col" { "in the worst case of the sum" } th scope="col" { "share" } td {} } }
                tbody { @for line in lines { tr {
                    @let share = line.worst.value().map_or(f64::NAN, |v| v.abs() / total);
                    th scope="row" { (words::cause_text(line.cause)) (needs(sheet, if line.nominal.value().is_some() { &line.worst } else { &line.nominal })) }
                    (cell(&line.nominal, Dimension::Voltage))
                    (cell(&line.worst, Dimension::Voltage))
                    td { (percent(share)) }
                    td { (bar(share)) }
                } } }
                tfoot {
                    @if let Some(row) = row_of(sheet, Figure::OutputOffset) { tr {
                        th scope="row" { "output offset (sum)" }
                        (cell(&row.nominal, Dimension::Voltage))
                        td { (row.range.map_or_else(|| "–".into(), |r| value(if r.1.abs() >= r.0.abs() { r.1 } else { r.0 }, Dimension::Voltage))) }
                        td {} td {}
                    } }
                    @if whole { tr { th scope="row" { "root of the sum of squares" } td {} td { (value(libm::sqrt(squares), Dimension::Voltage)) } td {} td {} } }
                }
            } }))
        }
    }
}

/// Where the transfer's poles and zeros lie.
pub fn poles(sheet: &Sheet) -> Markup {
    let r = sheet.report;
    html! {
        summary { "Poles and zeros" }
        @if r.poles.is_empty() && r.zeros.is_empty() { p class="aside" { "No poles could be computed." } }
        @else {
            (scroll("Poles and zeros", &html! { table {
                thead { tr { th scope="col" { "root" } th scope="col" { "frequency" } th scope="col" { "Q" } th scope="col" { "damping ratio" } th scope="col" { "half plane" } } }
                tbody { (roots("pole", &r.poles, true)) (roots("zero", &r.zeros, false)) }
            } }))
        }
    }
}

fn roots(kind: &str, all: &[Root], is_pole: bool) -> Markup {
    // Of a conjugate pair, the upper one stands for both.
    let mut shown: Vec<(f64, &Root)> = all.iter().filter(|z| z.im >= 0.0).map(|z| (libm::hypot(z.re, z.im), z)).collect();
    shown.sort_by(|a, b| a.0.total_cmp(&b.0));
    html! {
        @for (size, z) in shown {
            @let pair = z.im > 0.0;
            tr {
                th scope="row" { (kind) @if pair { " pair" } }
                td { (value(size / TAU, Dimension::Frequency)) }
                td { @if pair && z.re.abs() > 0.0 { (value(size / (2.0 * z.re.abs()), Dimension::Number)) } @else if pair { "unlimited" } @else { "–" } }
                td { @if size > 0.0 && pair { (value(-z.re / size, Dimension::Number)) } @else { "–" } }
                td {
                    @if z.re > 0.0 { "right" @if is_pole { ": oscillates" } }
                    @else if z.re < 0.0 { "left" } @else { "on the axis" }
                }
            }
        }
    }
}
