//! The working: the handbook's formula, numbers in place, beside what the network gives.

use maud::{Markup, html};
use stageleaf_math::{
    dimension::Dimension,
    report::{Outcome, Working},
};
use stageleaf_note::{format, letters::is_letter_or_digit, print::trimmed};

use super::{outcome, title, value};
use crate::Sheet;

/// The section.
pub fn working(sheet: &Sheet) -> Markup {
    html! {
        summary { "Working" }
        @if sheet.report.working.is_empty() { p class="aside" { "No closed form applies to this stage as it stands." } }
        @for w in &sheet.report.working {
            @let d = w.dimension;
            div class="working" {
                p class="caption" role="heading" aria-level="3" { (title(sheet, w.query)) }
                p class="formula" { samp { (w.formula) } }
                @if !w.numbers.is_empty() {
                    p class="formula" { samp { (in_place(w)) " = " (value(w.handbook, d)) } }
                }
                dl {
                    div { dt { "handbook" } dd { (value(w.handbook, d)) } }
                    div { dt { "network" } dd { (outcome(&w.exact, d)) } }
                    @if let Some(text) = difference(w, d) { div { dt { "difference" } dd { (text) } } }
                }
                @if !w.difference.is_empty() { p { "Why they differ: " (w.difference) } }
                p class="aside" { "Source: " (w.source) }
            }
        }
    }
}

fn number(v: f64, d: Dimension) -> String {
    if v.is_nan() { "–".into() } else { trimmed(v, d, 4) }
}

/// What the formula says of the figure, its symbols replaced by their values.
fn in_place(w: &Working) -> String {
    // The left side names the figure; only what follows the last equals sign is computed.
    let (head, body) = w.formula.rsplit_once('=').unwrap_or(("", w.formula));
    let mut text = String::new();
    if let Some(name) = head.split('=').next().map(str::trim).filter(|n| !n.is_empty()) {
        text.push_str(name);
        text.push_str(" = ");
    }
    let mut rest = body.trim();
    while !rest.is_empty() {
        let end = rest.find(|c: char| !is_symbol(c)).unwrap_or(rest.len());
        if end == 0 {
            let next = rest.find(is_symbol).unwrap_or(rest.len());
            text.push_str(&rest[..next]);
            rest = &rest[next..];
            continue;
        }
        let (token, after) = rest.split_at(end);
        match w.numbers.iter().find(|(s, ..)| *s == token) {
            Some((_, v, d)) => text.push_str(&number(*v, *d)),
            None => text.push_str(token),
        }
        rest = after;
    }
    text
}

/// Letters, digits, underscore, and the subscripts that the field writes.
fn is_symbol(c: char) -> bool {
    is_letter_or_digit(c) || c == '_'
}

/// How far the network's value lies from the handbook's.
fn difference(w: &Working, d: Dimension) -> Option<String> {
    let Outcome::Value(exact) = w.exact else { return None };
    let off = exact - w.handbook;
    if !off.is_finite() {
        return None;
    }
    match d {
        Dimension::Angle => Some(format(off, d, 2)),
        Dimension::Level if w.handbook > 0.0 && exact > 0.0 => Some(format(exact / w.handbook, d, 2)),
        Dimension::Temperature => Some(format(off, Dimension::TemperatureDifference, 2)),
        _ if w.handbook.abs() > 0.0 => Some(format(off / w.handbook.abs(), Dimension::Fraction, 2)),
        _ => None,
    }
}
