//! The head: what stage it is, with which part, how its limits stand, and what to be careful about.

use maud::{Markup, html};
use stageleaf_math::{
    limit::Verdict,
    report::{Caution, Report},
};
use stageleaf_note::words;

use super::limits::shape;
use crate::Sheet;

/// The verdicts, worst first, with what is said of one and of several.
const ORDER: [(Verdict, &str, &str); 4] = [
    (Verdict::Breaks, "breaks", "break"),
    (Verdict::Undetermined, "undetermined", "undetermined"),
    (Verdict::Thin, "thin", "thin"),
    (Verdict::Holds, "holds", "hold"),
];

/// How many limits stand how: "2 break, 1 thin, 5 hold".
#[must_use]
pub fn summary(report: &Report) -> Vec<(Verdict, String)> {
    let count = |v: Verdict| report.limits.iter().filter(|l| l.verdict == v).count();
    ORDER
        .iter()
        .filter_map(|(v, one, several)| match count(*v) {
            0 => None,
            1 => Some((*v, format!("1 {one}"))),
            n => Some((*v, format!("{n} {several}"))),
        })
        .collect()
}

/// The section.
pub fn head(sheet: &Sheet) -> Markup {
    let stage = &sheet.block.stage;
    let part = &sheet.part.part;
    let verdicts = summary(sheet.report);
    let loud: Vec<&Caution> = sheet
        .report
        .cautions
        .iter()
        .filter(|c| {
            !matches!(
                c,
                Caution::TakenAsIdeal(_)
                    | Caution::TakenAsExact(_)
                    | Caution::Oscillates
                    | Caution::OscillatesWithin
                    | Caution::ThermalRunaway
            )
        })
        .collect();
    html! {
        p class="title" role="heading" aria-level="2" { (stage.name) }
        @for caution in sheet.report.cautions.iter().filter(|c| matches!(c, Caution::Oscillates | Caution::OscillatesWithin | Caution::ThermalRunaway)) {
            p class="alarm" { span aria-hidden="true" { "✕ " } (words::caution_text(caution)) }
        }
        p class="summary" {
            @if verdicts.is_empty() { "no limits to judge" }
            @for (i, (verdict, text)) in verdicts.iter().enumerate() {
                @if i > 0 { ", " }
                span class=(super::limits::class(*verdict)) { span class="shape" aria-hidden="true" { (shape(*verdict)) } " " (text) }
            }
        }
        p class="kind" {
            (stage.kind.spec().title) " with " b { (part.name) }
            @if part.name != part.id { " (" (part.id) ")" }
            @if let Some(what) = &part.description { ", " (what) }
        }
        @if !loud.is_empty() {
            ul class="cautions" aria-label="Cautions" { @for c in loud { li { b { "Caution: " } (words::caution_text(c)) } } }
        }
    }
}
