//! What was measured at the bench, beside what is predicted for those conditions.

use maud::{Markup, html};
use stageleaf_math::{dimension::Dimension, measured::MeasuredRow};
use stageleaf_note::print::trimmed;

use super::{outcome, scroll, title, value};
use crate::Sheet;

/// The section.
pub fn measured(sheet: &Sheet) -> Markup {
    let rows = &sheet.report.measured;
    html! {
        summary { "Measured" @if !rows.is_empty() { " (" (rows.len()) ")" } }
        @if rows.is_empty() { p class="aside" { "The block states no measurement." } }
        @else {
            (scroll("Measured and predicted", &html! { table {
                thead { tr {
                    th scope="col" { "figure" } th scope="col" { "unit" } th scope="col" { "measured" } th scope="col" { "predicted" }
                    th scope="col" { "predicted range" } th scope="col" { "measurement" }
                } }
                tbody { @for (i, row) in rows.iter().enumerate() { (line(sheet, i, row)) } }
            } }))
            p class="aside" { "The range is that of all built circuits at the stated temperature: tolerances, supplies, part figures from guaranteed to as far on the better side of typical, errors of either sign." }
        }
    }
}

fn line(sheet: &Sheet, index: usize, row: &MeasuredRow) -> Markup {
    let query = row.measurement.query;
    let d = query.figure.dimension_in(sheet.block.stage.kind);
    let unit = sheet.block.measured.get(index).and_then(|m| m.unit.as_deref()).unwrap_or("");
    let (low, high) = (row.measurement.value.low, row.measurement.value.high);
    html! { tr {
        th scope="row" { (title(sheet, query)) @if let Some(t) = row.measurement.temperature { " at " (trimmed(t, Dimension::Temperature, 4)) } }
        td { (unit) }
        td { (value(row.measurement.value.nominal, d)) @if low < high { " (" (value(low, d)) " to " (value(high, d)) ")" } }
        td { (outcome(&row.nominal, d)) }
        td { @match row.range { Some((low, high)) => { (value(low, d)) " to " (value(high, d)) } None => { "–" } } }
        td { (row.agreement.word()) }
    } }
}
