//! `diff` for people.

use std::fmt::Write as _;

use stageleaf_math::{
    dimension::Dimension,
    limit::Verdict,
    report::{LimitRow, Outcome},
};
use stageleaf_note::{format as quantity_text, query_text};

use super::compare::{Change, FigureChange, StageChange, VerdictChange, loosened};
use crate::{
    check::{ExaminedStage, outcome_words},
    terminal::{Ink, paint, plain},
};

/// Digits of a figure.
const DIGITS: usize = 4;

/// The whole comparison.
#[must_use]
pub fn report(changes: &[StageChange<'_>], all: bool, colour: bool) -> String {
    if changes.is_empty() {
        return "no figure and no verdict differs\n".to_owned();
    }
    let mut text = String::new();
    for change in changes {
        stage(&mut text, change, all, colour);
        text.push('\n');
    }
    let worse = changes.iter().filter(|c| c.worse()).count();
    let count = format!("{} {}", many(changes.len(), "stage"), if changes.len() == 1 { "differs" } else { "differ" });
    let look =
        if worse == 0 { "no verdict got worse, no limit was loosened".to_owned() } else { format!("{} to look at", many(worse, "stage")) };
    writeln!(text, "{count}; {}", paint(&look, if worse == 0 { Ink::Good } else { Ink::Bad }, colour)).expect("a string takes all");
    text
}

fn stage(text: &mut String, of: &StageChange<'_>, all: bool, colour: bool) {
    let head = format!("{}  {}", of.place, plain(of.name));
    match &of.change {
        Change::Added(stage) => line(text, &format!("{head}  added: {}", counted(stage))),
        Change::Removed(stage) => line(text, &format!("{head}  {}: {}", paint("removed", Ink::Bad, colour), counted(stage))),
        Change::Altered { values, verdicts, figures, data_moved, limited } => {
            line(text, &head);
            for (path, old, new) in values {
                let shown = |value: &Option<&str>| value.map_or("–".to_owned(), plain);
                line(text, &format!("  {}  {} → {}", plain(path), shown(old), shown(new)));
            }
            if *data_moved {
                line(text, "  the block is the same: the part's data, the settings or the program changed");
            }
            for verdict in verdicts {
                line(text, &format!("  {}", verdict_text(verdict, colour)));
            }
            let shown: Vec<(&FigureChange<'_>, String)> = figures
                .iter()
                .filter(|f| all || f.size().is_infinite() || judged(f, limited))
                .filter_map(|f| Some((f, figure_text(f, all)?)))
                .collect();
            let width = shown.iter().map(|(f, _)| query_text(f.new.query).chars().count()).max().unwrap_or(0);
            for (figure, words) in &shown {
                let id = query_text(figure.new.query);
                line(text, &format!("  {id}{}  {words}", " ".repeat(width - id.chars().count())));
            }
            let hidden = figures.len() - shown.len();
            if hidden > 0 {
                line(text, &format!("  {} more (--all)", many(hidden, "figure")));
            }
        }
    }
}

fn verdict_text(change: &VerdictChange<'_>, colour: bool) -> String {
    let id = query_text(change.query);
    let word = |row: &LimitRow| paint(row.verdict.word(), ink(row.verdict), colour);
    match (change.old, change.new) {
        (Some((old, asked)), Some((new, asks))) => {
            let verdict = if old.verdict == new.verdict { word(new) } else { format!("{} → {}", word(old), word(new)) };
            let limit = match (asked == asks, loosened(old, new)) {
                (true, _) => plain(asks),
                (false, true) => format!("{} → {} ({})", plain(asked), plain(asks), paint("loosened", Ink::Bad, colour)),
                (false, false) => format!("{} → {}", plain(asked), plain(asks)),
            };
            format!("{verdict}  {id}  {limit}")
        }
        (Some((_, asked)), None) => format!("{}  {id}  {}", paint("limit dropped", Ink::Bad, colour), plain(asked)),
        (None, Some((new, asks))) => format!("{}  {id}  {} (new limit)", word(new), plain(asks)),
        (None, None) => String::new(),
    }
}

/// Whether a limit judges it.
fn judged(change: &FigureChange<'_>, limited: &ExaminedStage) -> bool {
    limited.limits().iter().any(|l| l.limit.query == change.new.query)
}

const fn ink(verdict: Verdict) -> Ink {
    match verdict {
        Verdict::Holds => Ink::Good,
        Verdict::Thin | Verdict::Undetermined => Ink::Watch,
        Verdict::Breaks => Ink::Bad,
        Verdict::Reported => Ink::Quiet,
    }
}

/// "585.1 kHz → 512.4 kHz (−12 %), 480.0 kHz to 620.0 kHz → 420.1 kHz to 540.3 kHz"; none where the shown digits stay.
fn figure_text(change: &FigureChange<'_>, all: bool) -> Option<String> {
    let d = change.dimension();
    let words = |o: &Outcome| if o.value().is_some() { outcome_words(o, d, "") } else { short(o).to_owned() };
    let (old, new) = (words(&change.old.nominal), words(&change.new.nominal));
    let range = |range: Option<(f64, f64)>| {
        range.map_or("–".to_owned(), |(low, high)| format!("{} to {}", quantity_text(low, d, DIGITS), quantity_text(high, d, DIGITS)))
    };
    let (old_range, new_range) = (range(change.old.range), range(change.new.range));
    if old == new && old_range == new_range && !all {
        return None;
    }
    let mut text = if old == new { new } else { format!("{old} → {new}{}", percent(change, d)) };
    if old_range != new_range {
        write!(text, "; {old_range} → {new_range}").expect("a string takes all");
    }
    Some(text)
}

const fn short(outcome: &Outcome) -> &'static str {
    match outcome {
        Outcome::Value(_) => "",
        Outcome::AtLeast(_) => "a lower bound",
        Outcome::Undetermined(_) | Outcome::OutOfReach(_) => "undetermined",
        Outcome::DoesNotApply(_) => "does not apply",
        Outcome::Oscillates => "oscillates",
        Outcome::NoDcPath(_) => "no DC path",
        Outcome::NoSteadyTemperature => "no steady temperature",
    }
}

/// By how much, for figures of which a ratio says something.
fn percent(change: &FigureChange<'_>, d: Dimension) -> String {
    let (Outcome::Value(old), Outcome::Value(new)) = (&change.old.nominal, &change.new.nominal) else { return String::new() };
    match d {
        Dimension::Level | Dimension::Angle | Dimension::Temperature | Dimension::Fraction => String::new(),
        _ if old.is_finite() && new.is_finite() && old.abs() > 0.0 => {
            let ratio = (new - old) / old.abs();
            let sign = if ratio > 0.0 { "+" } else { "" };
            format!(" ({sign}{})", quantity_text(ratio, Dimension::Fraction, 2))
        }
        _ => String::new(),
    }
}

fn counted(stage: &ExaminedStage) -> String {
    let of = |verdict: Verdict| stage.limits().iter().filter(|l| l.verdict == verdict).count();
    let judged: Vec<String> = [Verdict::Breaks, Verdict::Undetermined, Verdict::Thin, Verdict::Holds]
        .into_iter()
        .filter(|v| of(*v) > 0)
        .map(|v| format!("{} {}", of(v), v.word()))
        .collect();
    if judged.is_empty() { "no limits".to_owned() } else { judged.join(", ") }
}

fn many(count: usize, word: &str) -> String {
    format!("{count} {word}{}", if count == 1 { "" } else { "s" })
}

fn line(text: &mut String, words: &str) {
    writeln!(text, "{words}").expect("a string takes all");
}
