//! What a run found that somebody has to look at, worst first: for outlets that show a few and count the rest.

use stageleaf_math::{
    limit::Verdict,
    measured::Agreement,
    report::{LimitRow, Outcome},
    search::alternates::forbids,
};
use stageleaf_note::{query_text, words};

use super::{
    examine::{Current, Examined, ExaminedStage},
    text::{margin_text, measured_words, outcome_words},
};
use crate::{fault::Fault, terminal::plain};

/// How bad a finding is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Weight {
    /// Fails the run.
    Error,
    /// Does not.
    Warning,
}

/// Something to look at, in words.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// Whether it fails the run.
    pub weight: Weight,
    /// Its place among its like: what could not be read, what cannot work, what breaks (by how much), what is undetermined, stale, thin.
    pub(super) rank: (u8, f64),
    /// The file.
    pub file: String,
    /// Line and column, where it has a place.
    pub place: Option<(usize, usize)>,
    /// In a few words.
    pub title: String,
    /// In a sentence.
    pub message: String,
}

/// Every finding of a note, in the note's order.
#[must_use]
pub fn of_note(note: &Examined) -> Vec<Finding> {
    let mut found: Vec<Finding> = note.faults.iter().map(of_fault).collect();
    for stage in &note.stages {
        found.extend(of_stage(&note.file, stage));
    }
    for state in note.stale() {
        let quote = &state.quote;
        let now = match &state.current {
            Current::Is { text } => format!("is {text} now"),
            Current::NoValue { outcome, dimension } => format!("has no value: {}", outcome_words(outcome, *dimension, &state.part_file)),
            Current::Agrees => continue,
        };
        let figure = query_text(quote.query);
        found.push(Finding {
            weight: Weight::Error,
            rank: (4, 0.0),
            file: note.file.clone(),
            place: Some((quote.line, quote.column)),
            title: format!("stale quote of {figure}"),
            message: plain(&format!("the prose says “{}”; `{figure}` of “{}” {now}", quote.shown, state.stage)),
        });
    }
    found
}

/// What could not be read, or a bug.
#[must_use]
pub fn of_fault(fault: &Fault) -> Finding {
    let (place, title) = match fault {
        Fault::Text(problem) => (Some((problem.line, problem.column)), "cannot be read"),
        Fault::Path { .. } => (None, "cannot be read"),
        Fault::Bug { line, .. } => (Some((*line, 1)), "bug in stageleaf"),
    };
    let message = match fault {
        Fault::Text(problem) => {
            let mut message = problem.message.clone();
            for (word, more) in [("allowed", &problem.allowed), ("try", &problem.attempt)] {
                if let Some(more) = more {
                    message.push_str(&format!("; {word}: {more}"));
                }
            }
            message
        }
        other => other.to_string(),
    };
    Finding {
        weight: Weight::Error,
        rank: (0, 0.0),
        file: fault.file().to_owned(),
        place,
        title: title.to_owned(),
        message: plain(&message),
    }
}

fn of_stage<'a>(file: &'a str, stage: &'a ExaminedStage) -> impl Iterator<Item = Finding> + 'a {
    let name = plain(&stage.block.stage.name);
    let cautions = stage.report.cautions.iter().filter(|c| forbids(c)).map({
        let name = name.clone();
        move |caution| Finding {
            weight: Weight::Error,
            rank: (1, 0.0),
            file: file.to_owned(),
            place: Some((stage.block.line, 1)),
            title: format!("{name} cannot work as stated"),
            message: plain(&words::caution_text(caution)),
        }
    });
    let limits = stage.limits_in_words().filter_map(move |(row, limit)| {
        let (weight, rank) = match row.verdict {
            Verdict::Breaks => (Weight::Error, (2, closeness(row))),
            Verdict::Undetermined => (Weight::Error, (3, 0.0)),
            Verdict::Thin => (Weight::Warning, (5, closeness(row))),
            Verdict::Holds | Verdict::Reported => return None,
        };
        let figure = query_text(row.limit.query);
        Some(Finding {
            weight,
            rank,
            file: file.to_owned(),
            place: Some(place_of(stage, row)),
            title: format!("{name}: {figure} {}", row.verdict.word()),
            message: sentence(row, limit, stage),
        })
    });
    let contradicting =
        stage.report.measured.iter().enumerate().filter(|(_, row)| row.agreement == Agreement::Contradicts).map(move |(i, row)| Finding {
            weight: Weight::Error,
            rank: (4, 0.0),
            file: file.to_owned(),
            place: Some(measured_place(stage, &query_text(row.measurement.query))),
            title: format!("{}: measured {}", plain(&stage.block.stage.name), query_text(row.measurement.query)),
            message: plain(&measured_words(row, i, stage)),
        });
    cautions.chain(limits).chain(contradicting)
}

/// Where the note states a measurement.
fn measured_place(stage: &ExaminedStage, id: &str) -> (usize, usize) {
    let path = format!("measured.{id}");
    let at = stage.block.fields.iter().find(|f| f.path == path || f.path.strip_prefix(&path).is_some_and(|rest| rest.starts_with('.')));
    at.map_or((stage.block.line, 1), |f| (f.line, f.column))
}

/// Where the note states a limit.
#[must_use]
pub fn place_of(stage: &ExaminedStage, row: &LimitRow) -> (usize, usize) {
    let at = stage.limits_fields().zip(stage.limits()).find(|(_, own)| own.limit == row.limit);
    at.map_or((stage.block.line, 1), |(field, _)| (field.line, field.column))
}

/// "`bandwidth` asked at least 300 kHz, worst 280.1 kHz, margin −19.9 kHz (typical)".
#[must_use]
pub fn sentence(row: &LimitRow, limit: &str, stage: &ExaminedStage) -> String {
    let worst = outcome_words(&row.worst, row.dimension, &stage.part_file);
    let relation = if matches!(row.worst, Outcome::Undetermined(_)) { "undetermined:" } else { "worst" };
    let mut text = format!("`{}` asked {}, {relation} {}", query_text(row.limit.query), plain(limit), plain(&worst));
    if row.worst.value().is_some() {
        if let Some(margin) = margin_text(row) {
            text.push_str(&format!(", margin {margin}"));
        }
        if let Some(basis) = row.basis {
            text.push_str(&format!(" ({})", basis.word()));
        }
        if let Some(most) = row.dominant {
            text.push_str(&format!("; most from {}", words::parameter_text(most).trim_end_matches(" (magnitude)")));
        }
    }
    text
}

/// Margin in terms of what counts as thin: what is furthest beyond its limit comes first, whatever it is measured in.
fn closeness(row: &LimitRow) -> f64 {
    let Some(margin) = row.margin else { return f64::NEG_INFINITY };
    let scale = stageleaf_math::analyse::thin_below(&row.limit);
    if scale > 0.0 { margin / scale } else { margin }
}

/// The worst first; of equals, in the notes' order.
pub fn sort(found: &mut [Finding]) {
    found.sort_by(|a, b| a.rank.0.cmp(&b.rank.0).then(a.rank.1.total_cmp(&b.rank.1)));
}
