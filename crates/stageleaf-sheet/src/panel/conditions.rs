//! What surrounds the stage, as fields: the values that the drawing does not hold. And what was wrong with an entry.

use maud::{Markup, html};
use stageleaf_note::Problem;

use crate::{Sheet, drawing::Labels};

/// Fields with their labels, in the order in which they stand.
const FIELDS: &[(&str, &str)] = &[
    ("part", "Part"),
    ("supply.positive", "Supply +"),
    ("supply.negative", "Supply −"),
    ("source.resistance", "Source resistance"),
    ("signal.peak", "Signal, peak"),
    ("signal.peak_to_peak", "Signal, p-p"),
    ("signal.rms", "Signal, rms"),
    ("signal.range", "Signal range"),
    ("signal.dc", "Signal, DC"),
    ("signal.crest_factor", "Crest factor"),
    ("signal.frequency", "Signal frequency"),
    ("load.resistance", "Load resistance"),
    ("load.capacitance", "Load capacitance"),
    ("ambient.range", "Ambient"),
    ("band.from", "Noise band from"),
    ("band.to", "Noise band to"),
    ("board.inverting_node", "Stray at − input"),
    ("board.non_inverting_node", "Stray at + input"),
    ("board.across_feedback", "Stray, feedback"),
];

/// Fields that a live sheet offers even where the note states nothing.
const OFFERED: &[&str] = &[
    "supply.positive",
    "supply.negative",
    "signal.frequency",
    "load.resistance",
    "load.capacitance",
    "ambient.range",
    "band.from",
    "band.to",
];

/// The section.
pub fn conditions(sheet: &Sheet) -> Markup {
    let labels = Labels::of(sheet.block);
    let drawn = |path: &str| match path {
        "source.resistance" => labels.source_impedance().is_some(),
        "load.resistance" => labels.load_resistance().is_some(),
        "load.capacitance" => labels.load_capacitance().is_some(),
        _ => false,
    };
    let text = |path: &str| sheet.block.field(path).map_or("", |f| f.text.as_str());
    html! {
        div class="fields" {
            @for (path, label) in FIELDS {
                @let stated = sheet.block.field(path).is_some() || *path == "part";
                @if !drawn(path) && (stated || OFFERED.contains(path)) {
                    @let long = text(path).chars().count() > 15;
                    div class=(if !stated { "field unstated" } else if long { "field long" } else { "field" }) {
                        label for=(format_args!("{}.{path}", sheet.id)) { (label) }
                        input id=(format_args!("{}.{path}", sheet.id)) type="text" inputmode=(if *path == "part" { "text" } else { "decimal" })
                            autocomplete="off" spellcheck="false" data-path=(path)
                            value=(if *path == "part" && text(path).is_empty() { &sheet.part.part.id } else { text(path) });
                    }
                }
            }
        }
    }
}

/// Problems with what was entered, in the words that `check` uses; the content of the section `problems`.
#[must_use]
pub fn problems_markup(problems: &[Problem]) -> String {
    if problems.is_empty() {
        return String::new();
    }
    let markup = html! {
        ul class="problems" {
            @for p in problems {
                li {
                    b { (super::coded(&p.message)) }
                    @if let Some(allowed) = &p.allowed { br; "allowed: " (super::coded(allowed)) }
                    @if let Some(attempt) = &p.attempt { br; "try: " (attempt) }
                    br; span class="aside" { "The sheet shows the last values that could be used." }
                }
            }
        }
    };
    markup.into_string().replace('\r', "&#13;").replace('\n', "&#10;")
}
