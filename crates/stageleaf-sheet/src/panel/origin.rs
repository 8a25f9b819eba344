//! What the model leaves out, and where the numbers come from.

use maud::{Markup, html};
use stageleaf_math::{NOT_MODELLED, report::Caution};
use stageleaf_note::{fingerprint, words};

use crate::Sheet;

/// What is not modelled, and what was taken as ideal because the part does not state it.
pub fn model(sheet: &Sheet) -> Markup {
    let ideal: Vec<&Caution> =
        sheet.report.cautions.iter().filter(|c| matches!(c, Caution::TakenAsIdeal(_) | Caution::TakenAsExact(_))).collect();
    html! {
        summary { "Not modelled" @if ideal.iter().any(|c| matches!(c, Caution::TakenAsIdeal(_))) { ", taken as ideal" }
            @if ideal.iter().any(|c| matches!(c, Caution::TakenAsExact(_))) { ", taken as exact" } }
        p { @for (i, item) in NOT_MODELLED.iter().enumerate() { @if i > 0 { ", " } (item.what) } "." }
        @if !ideal.is_empty() { ul { @for c in ideal { li { (words::caution_text(c)) } } } }
    }
}

/// Version, fingerprints, and what the result is worth.
pub fn provenance(sheet: &Sheet) -> Markup {
    html! {
        p {
            "stageleaf " (env!("CARGO_PKG_VERSION")) "; " (sheet.block.file) " line " (sheet.block.line) ", block " samp { (fingerprint(&sheet.block.text)) }
            "; " (sheet.part.file) ", part " samp { (fingerprint(&sheet.part.text)) }
            @if let Some(source) = &sheet.part.part.source { "; data: " (source) }
        }
        p { "Model estimate; measure the built circuit; local codes and licensed practice govern where people, mains, vehicles or explosive atmospheres are concerned." }
    }
}
