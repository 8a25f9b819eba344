//! The sections of the sheet beside the drawing.

mod conditions;
mod curves;
mod figures;
mod head;
mod limits;
mod measured;
mod origin;
mod tables;
mod working;

pub use conditions::{conditions, problems_markup};
pub use curves::{envelope, loop_gain, noise, response, transfer};
pub use figures::figures;
pub use head::head;
pub use limits::limits;
pub use measured::measured;
pub use origin::{model, provenance};
pub use tables::{dc, poles};
pub use working::working;

use maud::{Markup, html};
use stageleaf_math::{
    dimension::Dimension,
    figure::{Figure, Query},
    limit::Basis,
    report::{FigureRow, Outcome},
};
use stageleaf_note::{format, of_text, print::trimmed, words};

use crate::Sheet;

/// Digits of a figure.
const DIGITS: usize = 3;

/// A table that may be wider than a phone: it scrolls by itself, by keyboard too, and says so where it is narrow.
fn scroll(name: &str, table: &Markup) -> Markup {
    html! { div class="scroll" tabindex="0" role="group" aria-label=(name) { (table) } }
}

/// A figure's title with its argument, or with the frequency that it is at: "Gain at 2 MHz", "Input impedance at 20 kHz".
fn title(sheet: &Sheet, query: Query) -> String {
    let of = query.of.map_or_else(String::new, of_text);
    format!("{}{of}", plain_title(sheet, query))
}

/// " (A1)": whose a figure is that is the worst of several amplifiers'.
fn whose(amplifier: Option<u8>) -> String {
    amplifier.map_or_else(String::new, |number| format!(" (A{number})"))
}

fn plain_title(sheet: &Sheet, query: Query) -> String {
    let title = query.figure.title();
    let hertz = |f: f64| trimmed(f, Dimension::Frequency, 6);
    let signal = sheet.block.stage.signal().and_then(|s| s.frequency);
    match (query.at, query.figure) {
        (Some(_), _) => format!("{title} {}", stageleaf_note::argument_text(query, |v, d| trimmed(v, d, 6)).unwrap_or_default()),
        (None, Figure::InputImpedance | Figure::OutputImpedance) => {
            let what = title.trim_end_matches(" at the signal");
            signal.map_or_else(|| format!("{what} at DC"), |f| format!("{what} at {}", hertz(f)))
        }
        _ => title.to_owned(),
    }
}

/// A value in the figure's unit; never "NaN".
fn value(v: f64, dimension: Dimension) -> String {
    if v.is_nan() { "–".into() } else { format(v, dimension, DIGITS) }
}

/// A value with what adds nothing cut off: "12 V".
fn round(v: f64, dimension: Dimension) -> String {
    if v.is_nan() { "–".into() } else { trimmed(v, dimension, 6) }
}

/// Words with their `` `code` `` marked as such.
fn coded(text: &str) -> Markup {
    html! { @for (i, piece) in text.split('`').enumerate() { @if i % 2 == 1 { samp { (piece) } } @else { (piece) } } }
}

/// An outcome as a table's cell.
fn cell(o: &Outcome, dimension: Dimension) -> Markup {
    html! { td class=[o.value().is_none().then_some("words")] { (outcome(o, dimension)) } }
}

/// An outcome in a few words; what it needs stands in a list of its own.
fn outcome(o: &Outcome, dimension: Dimension) -> String {
    match o {
        Outcome::Value(v) => value(*v, dimension),
        Outcome::Undetermined(_) => "undetermined".into(),
        _ => words::outcome_text(o, dimension, DIGITS),
    }
}

/// What an undetermined figure needs.
fn needs(sheet: &Sheet, o: &Outcome) -> Markup {
    html! {
        @if let Outcome::Undetermined(needs) = o {
            ul class="needs" { @for need in needs { li { "needs " (coded(&words::need_text(*need, &sheet.part.file))) } } }
        }
    }
}

/// What a basis means, in its word.
fn basis_word(basis: Option<Basis>) -> &'static str {
    basis.map_or("–", Basis::word)
}

fn row_of<'a>(sheet: &Sheet<'a>, figure: Figure) -> Option<&'a FigureRow> {
    sheet.report.figures.iter().find(|r| r.query.figure == figure)
}

/// The figure's row in short: "512 kHz (480 kHz to 540 kHz)".
fn brief(sheet: &Sheet, figure: Figure) -> Option<Markup> {
    let row = row_of(sheet, figure)?;
    let d = row.dimension;
    Some(html! {
        span class="brief" {
            (title(sheet, row.query)) " " b { (outcome(&row.nominal, d)) }
            @if let Some((low, high)) = row.range { " (" (value(low, d)) " to " (value(high, d)) ")" }
        }
    })
}

/// Several figures in short, in one line.
fn briefs(sheet: &Sheet, figures: &[Figure]) -> Markup {
    html! {
        p class="briefs" { @for figure in figures { @if let Some(b) = brief(sheet, *figure) { (b) " " } } }
    }
}
