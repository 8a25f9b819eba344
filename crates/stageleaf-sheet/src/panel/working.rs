//! The working: how each figure is computed, the handbook's formula with numbers in place beside what the network gives, and what
//! is left out.

use maud::{Markup, html};
use stageleaf_math::{
    definition::not_modelled_for,
    report::{Against, FigureRow, Working},
};
use stageleaf_note::worked::{SAME, difference, in_place};

use super::{figures::GROUPS, outcome, title, value};
use crate::Sheet;

/// The section.
pub fn working(sheet: &Sheet) -> Markup {
    // A figure that does not apply has no working.
    let shown: Vec<&FigureRow> = sheet.report.figures.iter().filter(|row| row.nominal.value().is_some()).collect();
    let mut sources: Vec<&str> = Vec::new();
    for row in &shown {
        let source = row.query.figure.definition().source;
        if !sources.contains(&source) {
            sources.push(source);
        }
    }
    let mark = |source: &str| sources.iter().position(|s| *s == source).map_or(0, |i| i + 1);
    html! {
        summary { "Working" }
        p class="aside" { "Each figure comes from the stage's network; handbook forms stand beside it and decide nothing." }
        @for (group, name) in GROUPS {
            @if shown.iter().any(|row| row.query.figure.group() == group) {
                p class="caption group" role="heading" aria-level="3" { (name) }
                p class="aside" { "Not modelled, and able to move these figures: " (not_modelled_for(group).collect::<Vec<_>>().join(", ")) "." }
                @for row in shown.iter().filter(|row| row.query.figure.group() == group) {
                    @let definition = row.query.figure.definition();
                    div class="working" {
                        p class="caption" role="heading" aria-level="4" { (title(sheet, row.query)) ": " (outcome(&row.nominal, row.dimension)) }
                        p class="formula" { samp { (definition.formula) } " (source " (mark(definition.source)) ")" }
                        @for w in sheet.report.working.iter().filter(|w| w.query == row.query) { (beside(w)) }
                    }
                }
            }
        }
        p class="caption" role="heading" aria-level="3" { "Sources" }
        ol class="aside" { @for source in &sources { li { (source) } } }
    }
}

/// A closed form beside the network's value.
fn beside(w: &Working) -> Markup {
    let d = w.dimension;
    html! {
        p class="formula" { samp { (w.formula) } }
        @if !w.numbers.is_empty() { p class="formula" { samp { (in_place(w)) " = " (value(w.handbook, d)) } } }
        dl {
            div { dt { "handbook" } dd { (value(w.handbook, d)) } }
            div { dt { (whose(w)) } dd { (outcome(&w.exact, d)) } }
            @if let Some(text) = difference(w) { div { dt { "difference" } dd { (text) } } }
        }
        @if !w.difference.is_empty() && difference(w).is_some_and(|d| d != SAME) { p { "Why they differ: " (w.difference) "." } }
        p class="aside" { "Handbook form: " (w.source) "." }
    }
}

const fn whose(w: &Working) -> &'static str {
    match w.against {
        Against::Nominal => "network",
        Against::Least => "network, least",
    }
}
