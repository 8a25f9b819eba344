//! What changed between two sides, stage by stage.

use std::collections::BTreeMap;

use stageleaf_math::{
    dimension::Dimension,
    figure::Query,
    limit::Verdict,
    report::{FigureRow, LimitRow, Outcome},
};
use stageleaf_note::slug;

use super::Side;
use crate::check::ExaminedStage;

/// What changed in a stage.
#[derive(Debug)]
pub struct StageChange<'a> {
    /// Its name.
    pub name: &'a str,
    /// Where it stands now, or stood.
    pub place: String,
    /// What happened.
    pub change: Change<'a>,
}

/// What happened to a stage.
#[derive(Debug)]
pub enum Change<'a> {
    /// It was not there.
    Added(&'a ExaminedStage),
    /// It is not there any more.
    Removed(&'a ExaminedStage),
    /// It is there on both sides, and something differs.
    Altered {
        /// Values of the block: path, before, after.
        values: Vec<(&'a str, Option<&'a str>, Option<&'a str>)>,
        /// Verdicts that differ, and limits that came or went.
        verdicts: Vec<VerdictChange<'a>>,
        /// Figures that differ.
        figures: Vec<FigureChange<'a>>,
        /// Whether values did not change and figures did: the part's data, the settings or the program did.
        data_moved: bool,
        /// The stage whose limits pick the figures that matter.
        limited: &'a ExaminedStage,
    },
}

/// A limit on both sides, or on one.
#[derive(Clone, Debug)]
pub struct VerdictChange<'a> {
    /// The figure.
    pub query: Query,
    /// Verdict and the limit's words before.
    pub old: Option<(&'a LimitRow, &'a str)>,
    /// And after.
    pub new: Option<(&'a LimitRow, &'a str)>,
}

/// A figure on both sides.
#[derive(Clone, Copy, Debug)]
pub struct FigureChange<'a> {
    /// Before.
    pub old: &'a FigureRow,
    /// After.
    pub new: &'a FigureRow,
}

impl FigureChange<'_> {
    /// Relative change of the nominal value, or of the worse-moved end of its range; infinite where a value came or went.
    #[must_use]
    pub fn size(&self) -> f64 {
        let relative = |a: f64, b: f64| if a.to_bits() == b.to_bits() { 0.0 } else { ((b - a) / a.abs().max(b.abs())).abs() };
        let nominal = match (&self.old.nominal, &self.new.nominal) {
            (Outcome::Value(a), Outcome::Value(b)) => relative(*a, *b),
            (a, b) if a == b => 0.0,
            _ => f64::INFINITY,
        };
        let range = match (self.old.range, self.new.range) {
            (Some((a, b)), Some((c, d))) => relative(a, c).max(relative(b, d)),
            (None, None) => 0.0,
            _ => f64::INFINITY,
        };
        let size = nominal.max(range);
        if size.is_nan() { f64::INFINITY } else { size }
    }

    /// What it measures.
    #[must_use]
    pub const fn dimension(&self) -> Dimension {
        self.new.dimension
    }
}

impl VerdictChange<'_> {
    /// Whether a reviewer has to look: the verdict got worse, or the limit went away or asks less.
    #[must_use]
    pub fn worse(&self) -> bool {
        match (self.old, self.new) {
            (Some((old, _)), Some((new, _))) => badness(new.verdict) > badness(old.verdict) || loosened(old, new),
            (Some(_), None) => true,
            (None, Some((new, _))) => badness(new.verdict) > badness(Verdict::Thin),
            (None, None) => false,
        }
    }
}

/// Whether the limit asks less than it did.
#[must_use]
pub fn loosened(old: &LimitRow, new: &LimitRow) -> bool {
    use stageleaf_math::limit::Bound;
    let edges = |bound: Bound| match bound {
        Bound::AtLeast(low) => Some((low, f64::INFINITY)),
        Bound::AtMost(high) => Some((f64::NEG_INFINITY, high)),
        Bound::Between { low, high } => Some((low, high)),
        Bound::Report => None,
    };
    match (edges(old.limit.bound), edges(new.limit.bound)) {
        (Some((a, b)), Some((c, d))) => c < a || d > b,
        (Some(_), None) => true,
        (None, _) => false,
    }
}

const fn badness(verdict: Verdict) -> u8 {
    match verdict {
        Verdict::Reported | Verdict::Holds => 0,
        Verdict::Thin => 1,
        Verdict::Undetermined => 2,
        Verdict::Breaks => 3,
    }
}

impl StageChange<'_> {
    /// Whether a reviewer has to look.
    #[must_use]
    pub fn worse(&self) -> bool {
        match &self.change {
            Change::Removed(stage) => stage.limits().iter().any(|l| l.verdict != Verdict::Reported),
            Change::Added(stage) => stage.limits().iter().any(|l| badness(l.verdict) > 1),
            Change::Altered { verdicts, .. } => verdicts.iter().any(VerdictChange::worse),
        }
    }
}

/// What changed, in the order of the new side, then what is gone.
#[must_use]
pub fn compare<'a>(old: &'a Side, new: &'a Side) -> Vec<StageChange<'a>> {
    let mut before: BTreeMap<String, (&'a str, &'a ExaminedStage)> = BTreeMap::new();
    for note in &old.notes {
        for stage in &note.stages {
            before.insert(slug(&stage.block.stage.name), (&note.file, stage));
        }
    }
    let mut changes = Vec::new();
    for note in &new.notes {
        for stage in &note.stages {
            let name = stage.block.stage.name.as_str();
            let change = match before.remove(&slug(name)) {
                None => Some(Change::Added(stage)),
                Some((_, earlier)) => altered(earlier, stage),
            };
            let place = format!("{}:{}", note.file, stage.block.line);
            changes.extend(change.map(|change| StageChange { name, place, change }));
        }
    }
    let gone = before.into_values().map(|(file, stage)| StageChange {
        name: &stage.block.stage.name,
        place: format!("{file}:{}", stage.block.line),
        change: Change::Removed(stage),
    });
    changes.extend(gone);
    changes
}

fn altered<'a>(old: &'a ExaminedStage, new: &'a ExaminedStage) -> Option<Change<'a>> {
    let text = |stage: &'a ExaminedStage, path: &str| stage.block.field(path).map(|f| f.text.as_str());
    let mut values: Vec<(&str, Option<&str>, Option<&str>)> = Vec::new();
    let fields = new.block.fields.iter().chain(old.block.fields.iter().filter(|f| new.block.field(&f.path).is_none()));
    for field in fields.filter(|f| !f.path.starts_with("limits.")) {
        let (was, is) = (text(old, &field.path), text(new, &field.path));
        if was != is {
            values.push((&field.path, was, is));
        }
    }
    let mut figures: Vec<FigureChange<'_>> = new
        .figures()
        .iter()
        .filter_map(|row| Some(FigureChange { old: old.figures().iter().find(|o| o.query == row.query)?, new: row }))
        .filter(|change| change.size() > 0.0)
        .collect();
    figures.sort_by(|a, b| b.size().total_cmp(&a.size()));
    let limits = |stage: &'a ExaminedStage| stage.limits_in_words().collect::<Vec<_>>();
    let (was, is) = (limits(old), limits(new));
    let of = |list: &[(&'a LimitRow, &'a str)], query: Query| list.iter().find(|(row, _)| row.limit.query == query).copied();
    let mut verdicts: Vec<VerdictChange<'a>> = Vec::new();
    for (row, _) in is.iter().chain(was.iter().filter(|(row, _)| of(&is, row.limit.query).is_none())) {
        let change = VerdictChange { query: row.limit.query, old: of(&was, row.limit.query), new: of(&is, row.limit.query) };
        let same = matches!((change.old, change.new), (Some((a, asked)), Some((b, asks))) if a.verdict == b.verdict && asked == asks);
        if !same {
            verdicts.push(change);
        }
    }
    let data_moved = values.is_empty() && !figures.is_empty();
    let moved = !values.is_empty() || !figures.is_empty() || !verdicts.is_empty();
    moved.then_some(Change::Altered { values, verdicts, figures, data_moved, limited: new })
}
