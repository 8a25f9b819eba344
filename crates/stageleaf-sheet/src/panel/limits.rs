//! The limits, each as a strip with its words, the worst first.

use maud::{Markup, html};
use stageleaf_math::{
    dimension::Dimension,
    limit::{Bound, Limit, Verdict},
    report::{Caution, Coordinate, LimitRow, Outcome},
};
use stageleaf_note::{format, limit_text, print::trimmed, query_anchor, words};

use super::{basis_word, needs, outcome, round, title, value, whose};
use crate::{Sheet, sheet::capital, strip::strip};

/// The shape that stands beside a verdict's word.
pub const fn shape(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Holds => "●",
        Verdict::Thin => "◐",
        Verdict::Breaks => "✕",
        Verdict::Undetermined => "?",
        Verdict::Reported => "–",
    }
}

/// The class of a verdict's word.
pub const fn class(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Holds => "verdict holds",
        Verdict::Thin => "verdict thin",
        Verdict::Breaks => "verdict breaks",
        Verdict::Undetermined => "verdict undetermined",
        Verdict::Reported => "verdict reported",
    }
}

/// The section.
pub fn limits(sheet: &Sheet) -> Markup {
    let mut rows: Vec<&LimitRow> = sheet.report.limits.iter().collect();
    rows.sort_by(|a, b| a.verdict.cmp(&b.verdict).then(relative(a).total_cmp(&relative(b))));
    html! {
        p class="caption" role="heading" aria-level="3" { "Limits at the worst case" }
        @if rows.is_empty() { p class="aside" { "The note states no limits." } }
        @else {
            ol class="limits" { @for (i, row) in rows.iter().enumerate() {
                // The same figure may be limited twice, as `gain_at 1 kHz` and `gain_at 1000 Hz`: links go to the worse.
                (limit(sheet, row, rows[..i].iter().all(|r| r.limit.query != row.limit.query)))
            } }
            @for caution in sheet.report.cautions.iter().filter(|c| matches!(c, Caution::TakenAsExact(_))) {
                p class="aside" { (words::caution_text(caution)) }
            }
            p class="key aside" aria-hidden="true" { "◆ nominal, ├─┤ spread, hatched: not allowed, shaded: thin" }
        }
    }
}

/// The margin in parts of the limit's own scale, for sorting.
fn relative(row: &LimitRow) -> f64 {
    let scale = match row.limit.bound {
        Bound::AtLeast(v) | Bound::AtMost(v) => v.abs(),
        Bound::Between { low, high } => (high - low).abs() / 2.0,
        Bound::Report => 1.0,
    };
    let scale = if scale > 0.0 { scale } else { 1.0 };
    row.margin.filter(|m| !m.is_nan()).map_or(f64::INFINITY, |m| m / scale)
}

fn limit(sheet: &Sheet, row: &LimitRow, linked: bool) -> Markup {
    let query = row.limit.query;
    let d = row.dimension;
    html! {
        li class="row" id=[linked.then(|| format!("{}.{}", sheet.id, query_anchor(query)))] {
            div class="asked" {
                span class=(class(row.verdict)) { span class="shape" aria-hidden="true" { (shape(row.verdict)) } " " (row.verdict.word()) }
                @if let Some(basis) = row.basis { span class="basis" { " (" (basis.word()) ")" } }
                b class="figure" { (title(sheet, query)) (whose(row.amplifier)) }
                span class="asks" { (asks(&row.limit, d)) }
            }
            (strip(row, |v| round(v, d)))
            div class="found" {
                @if let (Outcome::Value(n), Outcome::Value(w)) = (&row.nominal, &row.worst) {
                    @let digits = digits(row);
                    span { "nominal " b { (exact(*n, d, digits)) } }
                    @if row.limit.bound == Bound::Report {
                        @if let Some((low, high)) = row.range { span { "spread " b { (value(low, d)) " to " (value(high, d)) } } }
                    } @else {
                        span { "worst " b { (exact(*w, d, digits)) } }
                        @if let Some(text) = left(row) { span class="left" { (text) } }
                    }
                } @else if row.nominal == row.worst {
                    span { (outcome(&row.nominal, d)) }
                } @else {
                    span { "nominal " b { (outcome(&row.nominal, d)) } }
                    span { "worst " b { (outcome(&row.worst, d)) } }
                }
            }
            (needs(sheet, if matches!(row.nominal, Outcome::Value(_)) { &row.worst } else { &row.nominal }))
            @if !row.corner.is_empty() || row.dominant.is_some() {
                div class="corner" {
                    @if !row.corner.is_empty() {
                        "Worst at "
                        // Names may hold commas: "slew rate, rising".
                        @for (i, c) in row.corner.iter().enumerate() { @if i > 0 { "; " } (coordinate(sheet, c)) }
                    }
                    @if let Some(p) = row.dominant {
                        @match row.corner.as_slice() {
                            [only] if only.parameter == p => ", which uses most of the margin.",
                            [] => { (capital(&words::parameter_text(p))) " uses most of the margin." }
                            _ => { ". " (capital(&words::parameter_text(p))) " uses most of the margin." }
                        }
                    }
                }
            }
        }
    }
}

/// Digits with which value and limit are told apart: three, more where little is left of much.
fn digits(row: &LimitRow) -> usize {
    let (Some(worst), Some(margin)) = (row.worst.value(), row.margin) else { return 3 };
    let ratio = (worst / margin).abs();
    if !ratio.is_finite() || matches!(row.dimension, Dimension::Level | Dimension::Temperature) {
        return 3;
    }
    match ratio {
        r if r < 100.0 => 3,
        r if r < 1000.0 => 4,
        r if r < 10_000.0 => 5,
        _ => 6,
    }
}

fn exact(v: f64, d: Dimension, digits: usize) -> String {
    if v.is_nan() { "–".into() } else { format(v, d, digits) }
}

fn asks(limit: &Limit, d: Dimension) -> String {
    match limit.bound {
        Bound::Report => "shown, not judged".into(),
        _ => format!("asks {}", limit_text(limit, d)),
    }
}

/// What is left to the limit, or by how much it is missed.
fn left(row: &LimitRow) -> Option<String> {
    let d = row.dimension;
    let margin = row.margin.filter(|m| !m.is_nan())?;
    let short = margin < 0.0;
    let amount = match (d, row.limit.bound, row.worst.value()) {
        // Levels are read in dB, so their distance is a ratio.
        (Dimension::Level, Bound::AtLeast(l) | Bound::AtMost(l), Some(w)) if l > 0.0 && w > 0.0 => {
            value(if w > l { w / l } else { l / w }, Dimension::Level)
        }
        (Dimension::Level, ..) => return None,
        (Dimension::Temperature, ..) => value(margin.abs(), Dimension::TemperatureDifference),
        _ => value(margin.abs(), d),
    };
    Some(match (short, row.limit.bound) {
        (false, _) => format!("{amount} left"),
        (true, Bound::AtLeast(_)) => format!("{amount} short"),
        (true, Bound::AtMost(_)) => format!("{amount} over"),
        (true, _) => format!("{amount} outside"),
    })
}

/// One coordinate of the corner: "Rf 90.1 kΩ".
fn coordinate(sheet: &Sheet, c: &Coordinate) -> String {
    let d = words::parameter_dimension(c.parameter, &sheet.block.stage);
    let name = words::parameter_text(c.parameter);
    if let Some(word) = words::coordinate_word(c) {
        return format!("{name} {word}");
    }
    // Enough digits to see that it differs from the nominal value.
    format!("{name} {}", if c.value.is_nan() { "–".into() } else { trimmed(c.value, d, 4) })
}

/// The basis as a cell of a table.
pub fn basis_cell(basis: Option<stageleaf_math::limit::Basis>) -> Markup {
    html! { td { (basis_word(basis)) } }
}
