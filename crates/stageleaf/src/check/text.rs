//! `check` for people: one aligned table for each stage, then what the prose quotes wrongly, then one line that counts.

use std::fmt::Write as _;

use stageleaf_math::{
    dimension::Dimension,
    figure::Query,
    limit::{Bound, Verdict},
    measured::{Agreement, MeasuredRow},
    report::{Coordinate, LimitRow, Outcome},
};
use stageleaf_note::{format as quantity_text, query_text, words};

use super::{
    Counts,
    examine::{Current, Examined, ExaminedStage, QuoteState},
};
use crate::terminal::{Ink, paint, plain};

/// Digits of a figure in a table: enough to see what is left of a limit.
const DIGITS: usize = 4;

/// Characters of a line below a row.
const WIDTH: usize = 96;

/// A note's stages and stale quotes.
#[must_use]
pub fn note(note: &Examined, colour: bool) -> String {
    let mut text = String::new();
    for stage in &note.stages {
        text.push_str(&self::stage(&note.file, stage, colour));
        text.push('\n');
    }
    for state in note.stale() {
        text.push_str(&stale(&note.file, state, colour));
    }
    if note.stale().next().is_some() {
        text.push('\n');
    }
    text
}

fn stage(file: &str, stage: &ExaminedStage, colour: bool) -> String {
    let of = &stage.block.stage;
    let mut text = format!("{file}:{}  {}  ({}, {})\n", stage.block.line, plain(&of.name), of.kind.id(), plain(&of.part.id));
    let rows: Vec<Row> = stage.limits_in_words().map(|(row, words)| Row::of(row, words, stage)).collect();
    if rows.is_empty() {
        text.push_str("  no limits: nothing is judged\n");
    }
    let width = |column: usize| rows.iter().map(|r| r.cells[column].chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..Row::COLUMNS).map(width).collect();
    for row in &rows {
        let mut line = String::new();
        for (column, (cell, width)) in row.cells.iter().zip(&widths).enumerate() {
            let space = " ".repeat(width - cell.chars().count() + 2);
            let cell = if column == 0 { paint(cell, row.ink, colour) } else { cell.clone() };
            write!(line, "{cell}{space}").expect("a string takes all");
        }
        writeln!(text, "  {}", line.trim_end()).expect("a string takes all");
        for more in &row.below {
            writeln!(text, "  {}  {}", " ".repeat(widths[0]), paint(more, Ink::Quiet, colour)).expect("a string takes all");
        }
    }
    for (index, row) in stage.report.measured.iter().enumerate() {
        let ink = if row.agreement == Agreement::Contradicts { Ink::Bad } else { Ink::Quiet };
        writeln!(text, "  {} {}", paint("measured:", ink, colour), plain(&measured_words(row, index, stage))).expect("a string takes all");
    }
    for caution in &stage.report.cautions {
        writeln!(text, "  {} {}", paint("caution:", Ink::Watch, colour), plain(&words::caution_text(caution))).expect("a string takes all");
    }
    text
}

/// "gain 20.31 (20.29 to 20.33), unit 3, at 23 °C; predicted 19.90 to 20.83: agrees".
#[must_use]
pub fn measured_words(row: &MeasuredRow, index: usize, stage: &ExaminedStage) -> String {
    let query = row.measurement.query;
    let d = query.figure.dimension_in(stage.block.stage.kind);
    let of = |value: f64| quantity_text(value, d, DIGITS);
    let mut text = format!("{} {}", query_text(query), of(row.measurement.value.nominal));
    if row.measurement.value.low < row.measurement.value.high {
        write!(text, " ({} to {})", of(row.measurement.value.low), of(row.measurement.value.high)).expect("a string takes all");
    }
    if let Some(unit) = stage.block.measured.get(index).and_then(|m| m.unit.as_deref()) {
        write!(text, ", {unit}").expect("a string takes all");
    }
    if let Some(kelvin) = row.measurement.temperature {
        write!(text, ", at {}", without_idle_zeros(&quantity_text(kelvin, Dimension::Temperature, DIGITS))).expect("a string takes all");
    }
    let predicted = match row.range {
        Some((low, high)) => format!("{} to {}", of(low), of(high)),
        None => outcome_words(&row.nominal, d, &stage.part_file),
    };
    write!(text, "; predicted {predicted}: {}", row.agreement.word()).expect("a string takes all");
    text
}

struct Row {
    ink: Ink,
    cells: [String; Self::COLUMNS],
    below: Vec<String>,
}

impl Row {
    const COLUMNS: usize = 6;

    fn of(row: &LimitRow, limit: &str, stage: &ExaminedStage) -> Self {
        let dimension = row.dimension;
        let ink = match row.verdict {
            Verdict::Holds => Ink::Good,
            Verdict::Thin | Verdict::Undetermined => Ink::Watch,
            Verdict::Breaks => Ink::Bad,
            Verdict::Reported => Ink::Quiet,
        };
        let mut below = Vec::new();
        let shown = if row.verdict == Verdict::Reported { &row.nominal } else { &row.worst };
        let worst = match shown {
            Outcome::Undetermined(_) | Outcome::DoesNotApply(_) | Outcome::OutOfReach(_) => {
                below.extend(outcome_words(shown, dimension, &stage.part_file).split("; ").map(plain));
                "–".to_owned()
            }
            outcome => outcome_words(outcome, dimension, &stage.part_file),
        };
        let whose = row.amplifier.map(|number| format!("of A{number}"));
        if row.verdict != Verdict::Reported && !row.corner.is_empty() {
            let last = row.corner.len() - 1;
            let mut corner: Vec<String> = row
                .corner
                .iter()
                .enumerate()
                .map(|(i, c)| {
                    format!("{}{}{}", if i == 0 { "at " } else { "" }, coordinate_text(c, stage), if i == last { "" } else { "," })
                })
                .collect();
            if let Some(most) = row.dominant {
                corner[last].push(';');
                corner.push(format!("most from {}", words::parameter_text(most).trim_end_matches(" (magnitude)")));
            }
            below.extend(wrapped(whose.map(|of| format!("{of},")).into_iter().chain(corner).collect::<Vec<_>>()));
        } else {
            below.extend(whose);
        }
        let basis = if row.verdict == Verdict::Undetermined { None } else { row.basis };
        let basis = basis.map_or("", stageleaf_math::limit::Basis::word);
        Self {
            ink,
            cells: [
                row.verdict.word().to_owned(),
                query_text(row.limit.query),
                plain(limit),
                if row.verdict == Verdict::Reported { now_text(&worst, row) } else { format!("worst {worst}") },
                margin_text(row).map(|m| format!("margin {m}")).unwrap_or_default(),
                basis.to_owned(),
            ],
            below,
        }
    }
}

/// "now 19.30, 17.90 to 20.70": a reported figure has no worst side.
fn now_text(now: &str, row: &LimitRow) -> String {
    match row.range {
        Some((low, high)) if low < high => {
            let text = |value| quantity_text(value, row.dimension, DIGITS);
            format!("now {now}, {} to {}", text(low), text(high))
        }
        _ => format!("now {now}"),
    }
}

/// What is left of a limit. Levels are told in dB, where a distance is a ratio.
#[must_use]
pub fn margin_text(row: &LimitRow) -> Option<String> {
    let margin = row.margin?;
    let dimension = row.dimension;
    if dimension == Dimension::Level && margin.is_finite() {
        let worst = row.worst.value()?;
        let ratio = match row.limit.bound {
            Bound::AtLeast(low) => worst / low,
            Bound::AtMost(high) => high / worst,
            Bound::Between { low, high } => (worst / low).min(high / worst),
            Bound::Report => return None,
        };
        return Some(quantity_text(ratio, dimension, 3));
    }
    let dimension = match dimension {
        Dimension::Temperature => Dimension::TemperatureDifference,
        other => other,
    };
    Some(quantity_text(margin, dimension, 3))
}

/// A figure's value in words, or why there is none.
#[must_use]
pub fn outcome_words(outcome: &Outcome, dimension: Dimension, part_file: &str) -> String {
    match outcome {
        Outcome::Undetermined(needs) => {
            let needs: Vec<String> = needs.iter().map(|need| words::need_text(*need, part_file)).collect();
            format!("needs {}", needs.join("; "))
        }
        other => words::outcome_text(other, dimension, DIGITS),
    }
}

fn coordinate_text(coordinate: &Coordinate, stage: &ExaminedStage) -> String {
    let name = words::parameter_text(coordinate.parameter);
    if let Some(word) = words::coordinate_word(coordinate) {
        return format!("{name} {word}");
    }
    let value = quantity_text(coordinate.value, words::parameter_dimension(coordinate.parameter, &stage.block.stage), DIGITS);
    format!("{} {}", name.trim_end_matches(" (magnitude)"), without_idle_zeros(&value))
}

/// "75.00 µV" as "75 µV": the coordinates of a corner are stated values, not results.
fn without_idle_zeros(text: &str) -> String {
    let (number, unit) = text.split_once(' ').unwrap_or((text, ""));
    let number = if number.contains('.') { number.trim_end_matches('0').trim_end_matches('.') } else { number };
    if unit.is_empty() { number.to_owned() } else { format!("{number} {unit}") }
}

/// Pieces put on lines of at most [`WIDTH`] characters.
fn wrapped(pieces: impl IntoIterator<Item = String>) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for piece in pieces {
        match lines.last_mut() {
            Some(line) if line.chars().count() + piece.chars().count() < WIDTH => {
                line.push(' ');
                line.push_str(&piece);
            }
            _ => lines.push(piece),
        }
    }
    lines
}

fn stale(file: &str, state: &QuoteState, colour: bool) -> String {
    let quote = &state.quote;
    let figure = figure_of(quote.query, &state.stage);
    let now = match &state.current {
        Current::Is { text } => format!("now {text}"),
        Current::NoValue { outcome, dimension } => format!("now without a value: {}", outcome_words(outcome, *dimension, &state.part_file)),
        Current::Agrees => return String::new(),
    };
    let word = paint("stale quote", Ink::Bad, colour);
    format!("{file}:{}:{}  {word}  {figure}: shown {}, {}\n", quote.line, quote.column, plain(&quote.shown), plain(&now))
}

fn figure_of(query: Query, stage: &str) -> String {
    format!("{} of “{}”", query_text(query), plain(stage))
}

/// The line at the end.
#[must_use]
pub fn closing(counts: &Counts, colour: bool) -> String {
    let limits = counts.holds + counts.thin + counts.breaks + counts.undetermined;
    let mut parts = vec![
        paint_some(counts.holds, if counts.holds == 1 { "holds" } else { "hold" }, Ink::Good, colour),
        paint_some(counts.thin, "thin", Ink::Watch, colour),
        paint_some(counts.breaks, if counts.breaks == 1 { "breaks" } else { "break" }, Ink::Bad, colour),
        paint_some(counts.undetermined, "undetermined", Ink::Watch, colour),
    ];
    parts.retain(|p| !p.is_empty());
    let mut text = format!("{}, {}, {}", many(counts.notes, "note"), many(counts.stages, "stage"), many(limits, "limit"));
    if !parts.is_empty() {
        write!(text, ": {}", parts.join(", ")).expect("a string takes all");
    }
    if counts.unworkable > 0 {
        let words = format!("{} cannot work as stated", many(counts.unworkable, "stage"));
        write!(text, "; {}", paint(&words, Ink::Bad, colour)).expect("a string takes all");
    }
    if counts.contradicted > 0 {
        let words = format!(
            "{} outside {} prediction",
            many(counts.contradicted, "measurement"),
            if counts.contradicted == 1 { "its" } else { "their" }
        );
        write!(text, "; {}", paint(&words, Ink::Bad, colour)).expect("a string takes all");
    }
    if counts.quotes > 0 {
        write!(text, "; {}", many(counts.quotes, "quote")).expect("a string takes all");
        if counts.rewritten > 0 {
            write!(text, ", {} rewritten", counts.rewritten).expect("a string takes all");
        }
        if counts.stale > 0 {
            write!(text, ", {}", paint(&format!("{} stale", counts.stale), Ink::Bad, colour)).expect("a string takes all");
        }
    }
    if counts.passed_over > 0 {
        write!(text, "; {} not judged: the settings could not be read", many(counts.passed_over, "note")).expect("a string takes all");
    }
    if counts.faults > 0 {
        write!(text, "; {}", paint(&many(counts.faults, "error"), Ink::Bad, colour)).expect("a string takes all");
    }
    text.push('\n');
    text
}

fn paint_some(count: usize, word: &str, ink: Ink, colour: bool) -> String {
    if count == 0 { String::new() } else { paint(&format!("{count} {word}"), ink, colour) }
}

fn many(count: usize, word: &str) -> String {
    format!("{count} {word}{}", if count == 1 { "" } else { "s" })
}
