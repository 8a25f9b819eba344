//! Sections, the whole sheet, and a page around it.

use maud::{DOCTYPE, Markup, PreEscaped, html};
use stageleaf_math::{kind::Kind, report::Report};
use stageleaf_note::{Block, ShelfPart};

use crate::{drawing, panel};

/// The sheet's style: one file, one layer, every selector under `.stageleaf` or `stageleaf-sheet`.
pub const STYLE: &str = include_str!("stageleaf.css");

/// What a sheet shows.
#[derive(Clone, Copy, Debug)]
pub struct Sheet<'a> {
    /// The stage block.
    pub block: &'a Block,
    /// What the engine found.
    pub report: &'a Report,
    /// The amplifier.
    pub part: &'a ShelfPart,
    /// Unique in the page; every id in the markup starts with it.
    pub id: &'a str,
}

/// One part of the sheet.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Section {
    /// The value of `data-section`.
    pub id: &'static str,
    /// What stands inside the element with that attribute.
    pub markup: String,
}

/// How a section stands in the page.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Frame {
    /// Always open.
    Open,
    /// A panel, opened as wanted.
    Panel,
}

type Part = (&'static str, Frame, fn(&Sheet) -> Markup);

/// Panels that a comparator does not have: its output rests, and what they show is of signals that pass through.
const OF_LINEAR_KINDS: [&str; 6] = ["response", "loop", "noise", "dc", "envelope", "poles"];

/// Whether a section belongs to the sheet of such a kind.
fn belongs(id: &str, kind: Kind) -> bool {
    if kind.switches() { !OF_LINEAR_KINDS.contains(&id) } else { id != "transfer" }
}

/// The sections in their order. A panel without data still stands, and says why it is empty; one of other kinds is empty and hidden.
const PARTS: &[Part] = &[
    ("head", Frame::Open, panel::head),
    ("drawing", Frame::Open, drawing::drawing),
    ("conditions", Frame::Open, panel::conditions),
    ("problems", Frame::Open, |_| html! {}),
    ("limits", Frame::Open, panel::limits),
    ("transfer", Frame::Panel, panel::transfer),
    ("response", Frame::Panel, panel::response),
    ("loop", Frame::Panel, panel::loop_gain),
    ("noise", Frame::Panel, panel::noise),
    ("dc", Frame::Panel, panel::dc),
    ("envelope", Frame::Panel, panel::envelope),
    ("poles", Frame::Panel, panel::poles),
    ("measured", Frame::Panel, panel::measured),
    ("figures", Frame::Panel, panel::figures),
    ("working", Frame::Panel, panel::working),
    ("model", Frame::Panel, panel::model),
    ("provenance", Frame::Open, panel::provenance),
];

/// The content of every section.
#[must_use]
pub fn sections(sheet: &Sheet) -> Vec<Section> {
    sections_where(sheet, |_, _| true)
}

/// The content of the sections that `wanted` admits by their id and whether they are panels.
#[must_use]
pub fn sections_where(sheet: &Sheet, wanted: impl Fn(&str, bool) -> bool) -> Vec<Section> {
    PARTS
        .iter()
        .filter(|(id, frame, _)| wanted(id, *frame == Frame::Panel))
        .map(|(id, _, content)| {
            let of_kind = belongs(id, sheet.block.stage.kind);
            Section { id, markup: if of_kind { one_line(content(sheet).into_string()) } else { String::new() } }
        })
        .collect()
}

/// The whole sheet as one line of HTML.
#[must_use]
pub fn render(sheet: &Sheet) -> String {
    let markup = html! {
        div class="stageleaf-body" {
            @for (section, (_, frame, _)) in sections(sheet).into_iter().zip(PARTS) {
                @match frame {
                    Frame::Open => section data-section=(section.id) hidden[section.markup.is_empty()] { (PreEscaped(section.markup)) },
                    Frame::Panel => details data-section=(section.id) hidden[section.markup.is_empty()] { (PreEscaped(section.markup)) },
                }
            }
        }
    };
    markup.into_string()
}

/// A self-contained page: the style inline, `script` inline if there is one.
#[must_use]
pub fn page(title: &str, body: &str, script: Option<&str>) -> String {
    let markup = html! {
        (DOCTYPE)
        html lang="en" {
            head {
                meta charset="utf-8";
                meta name="viewport" content="width=device-width, initial-scale=1";
                meta name="color-scheme" content="light dark";
                title { (title) }
                style { (PreEscaped(STYLE)) }
            }
            body class="stageleaf-page" {
                main { h1 class="unseen" { (title) } (PreEscaped(body)) }
                @if let Some(script) = script { script { (PreEscaped(script)) } }
            }
        }
    };
    markup.into_string()
}

/// Line breaks in the note's text become references, which mean the same inside an attribute and in text.
fn one_line(markup: String) -> String {
    if !markup.contains('\n') && !markup.contains('\r') {
        return markup;
    }
    markup.replace('\r', "&#13;").replace('\n', "&#10;")
}

/// A whole number of drawing units.
#[expect(clippy::cast_possible_truncation, reason = "clamped to a drawing's size")]
pub(crate) fn whole(value: f64) -> i32 {
    libm::round(value.clamp(-1e6, 1e6)) as i32
}

/// Words of ours with a capital at their start.
pub(crate) fn capital(text: &str) -> String {
    let mut text = text.to_owned();
    if let Some(first) = text.get_mut(..1) {
        first.make_ascii_uppercase();
    }
    text
}
