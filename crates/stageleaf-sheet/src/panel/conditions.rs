//! What surrounds the stage, as fields: the values that the drawing does not hold. And what was wrong with an entry.

use maud::{Markup, html};
use stageleaf_math::{
    kind::{Drives, Feed},
    stage::Stage,
};
use stageleaf_note::Problem;

use crate::{Sheet, drawing};

/// What a signal can state, in the order in which it stands: key, label, label behind an input's name.
const SIGNAL: [(&str, &str, &str); 7] = [
    ("peak", "Signal, peak", "peak"),
    ("peak_to_peak", "Signal, p-p", "p-p"),
    ("rms", "Signal, rms", "rms"),
    ("range", "Signal range", "range"),
    ("dc", "Signal, DC", "DC"),
    ("crest_factor", "Crest factor", "crest factor"),
    ("frequency", "Signal frequency", "frequency"),
];

/// What a source can state.
const SOURCE: [(&str, &str, &str); 4] = [
    ("resistance", "Source resistance", "source"),
    ("capacitance", "Source capacitance", "source"),
    ("shunt_resistance", "Shunt resistance", ""),
    ("dark_current", "Dark current", ""),
];

/// Fields that every kind has, with their labels.
const AROUND: [(&str, &str); 16] = [
    ("load.resistance", "Load resistance"),
    ("load.capacitance", "Load capacitance"),
    ("converter.full_scale", "Converter range"),
    ("converter.bits", "Converter bits"),
    ("converter.noise", "Converter noise, rms"),
    ("converter.sample_capacitance", "Sampling capacitor"),
    ("converter.switch_resistance", "Sampling switch"),
    ("converter.acquisition_time", "Acquisition time"),
    ("converter.series_resistance", "Converter series R"),
    ("converter.shunt_capacitance", "Converter shunt C"),
    ("ambient.range", "Ambient"),
    ("band.from", "Noise band from"),
    ("band.to", "Noise band to"),
    ("board.inverting_node", "Stray at − input"),
    ("board.non_inverting_node", "Stray at + input"),
    ("board.across_feedback", "Stray, feedback"),
];

/// Fields that a live sheet offers even where the note states nothing.
const OFFERED: &[&str] =
    &["supply.positive", "supply.negative", "load.resistance", "load.capacitance", "ambient.range", "band.from", "band.to"];

/// Paths of the values around the stage, with their labels, in the order in which they stand.
fn fields(stage: &Stage) -> Vec<(String, String)> {
    let spec = stage.kind.spec();
    let inputs: Vec<&str> = (spec.inputs)(stage).iter().filter(|i| i.feed == Feed::Signal).map(|i| i.name).collect();
    let several = inputs.len() > 1;
    let mut all = vec![("part".to_owned(), "Part".to_owned())];
    all.extend((1..=spec.amplifiers).map(|a| (format!("parts.A{a}"), format!("Part A{a}"))));
    all.extend(
        [
            ("supply.positive", "Supply +"),
            ("supply.negative", "Supply −"),
            ("supply.ripple", "Supply ripple"),
            ("supply.ripple_frequency", "Ripple frequency"),
        ]
        .map(|(p, l)| (p.into(), l.into())),
    );
    all.extend(SOURCE.map(|(key, label, _)| (format!("source.{key}"), label.into())));
    if several {
        for input in &inputs {
            all.extend(SOURCE[..2].iter().map(|(key, _, label)| (format!("source.{input}.{key}"), format!("{input}, {label}"))));
        }
    }
    if several && spec.drives == Drives::Each {
        for input in &inputs {
            all.extend(SIGNAL.map(|(key, _, label)| (format!("signal.{input}.{key}"), format!("{input}, {label}"))));
        }
    } else {
        all.extend(SIGNAL.map(|(key, label, _)| (format!("signal.{key}"), label.into())));
    }
    if spec.drives == Drives::Differential {
        all.push(("signal.common_mode".into(), "Common mode".into()));
    }
    all.extend([("reference.voltage", "Reference"), ("reference.resistance", "Reference resistance")].map(|(p, l)| (p.into(), l.into())));
    all.extend(AROUND.map(|(p, l)| (p.into(), l.into())));
    all
}

/// The section.
pub fn conditions(sheet: &Sheet) -> Markup {
    let canvas = drawing::canvas(sheet.block);
    let stated = |path: &str| sheet.block.field(path).is_some();
    let text = |path: &str| sheet.block.field(path).map_or("", |f| f.text.as_str());
    let fields = fields(&sheet.block.stage);
    let amplitude = |signal: &str| ["peak", "peak_to_peak", "rms", "range"].iter().any(|key| stated(&format!("{signal}.{key}")));
    // A signal begins with its amplitude; what goes with it is offered then.
    let of_signal = |path: &str| match path.rsplit_once('.') {
        Some((signal, "peak")) => !amplitude(signal),
        Some((signal, "frequency" | "common_mode")) => amplitude(signal),
        _ => false,
    };
    let offered = |path: &str| OFFERED.contains(&path) || of_signal(path);
    html! {
        div class="fields" {
            @for (path, label) in &fields {
                @let part = path == "part" || path.starts_with("parts.");
                @let shown = path == "part" || stated(path);
                @if !canvas.has_field(path) && (shown || offered(path)) {
                    @let long = text(path).chars().count() > 15;
                    div class=(if !shown { "field unstated" } else if long { "field long" } else { "field" }) {
                        label for=(format_args!("{}.{path}", sheet.id)) { (label) }
                        input id=(format_args!("{}.{path}", sheet.id)) type="text" inputmode=(if part { "text" } else { "decimal" })
                            autocomplete="off" spellcheck="false" data-path=(path)
                            value=(if path == "part" && text(path).is_empty() { &sheet.part.part.id } else { text(path) });
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
