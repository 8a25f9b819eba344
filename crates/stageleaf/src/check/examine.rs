//! One note, examined: a pure function of its bytes and the team's shelf and settings, so that notes may be taken in any order.

use std::{
    borrow::Cow,
    cell::RefCell,
    collections::BTreeMap,
    panic::{self, AssertUnwindSafe},
    sync::Once,
};

use stageleaf_math::{
    Error,
    dimension::Dimension,
    figure::Query,
    limit::{Bound, Limit, Thin},
    part::Part,
    report::{FigureRow, LimitRow, Outcome, Report},
    stage::Stage,
};
use stageleaf_note::{Block, Field, Problem, Quote, Shelf, ShelfPart, quote_agrees, quote_for, read_note, slug};

use crate::{fault::Fault, team::Team};

/// A note's stages and quotes, judged, and what could not be.
#[derive(Debug)]
pub struct Examined {
    /// The note, as messages name it.
    pub file: String,
    /// Its stages, in the note's order.
    pub stages: Vec<ExaminedStage>,
    /// Its quotes, in the note's order.
    pub quotes: Vec<QuoteState>,
    /// What could not be read or judged.
    pub faults: Vec<Fault>,
}

impl Examined {
    /// The quotes that do not agree with their figure.
    pub fn stale(&self) -> impl Iterator<Item = &QuoteState> {
        self.quotes.iter().filter(|q| !matches!(q.current, Current::Agrees))
    }
}

/// A stage with its report.
#[derive(Debug)]
pub struct ExaminedStage {
    /// The block.
    pub block: Block,
    /// The part's file, as messages name it.
    pub part_file: String,
    /// What the engine found. Its limits may end with figures that only the prose names.
    pub report: Report,
}

impl ExaminedStage {
    /// The note's own limits, judged.
    #[must_use]
    pub fn limits(&self) -> &[LimitRow] {
        let own = self.block.stage.limits.len().min(self.report.limits.len());
        &self.report.limits[..own]
    }

    /// Where the note states its limits, in their order.
    pub fn limits_fields(&self) -> impl Iterator<Item = &Field> {
        self.block.fields.iter().filter(|f| f.path.starts_with("limits."))
    }

    /// The note's own limits, judged, with the words in which the note states them.
    pub fn limits_in_words(&self) -> impl Iterator<Item = (&LimitRow, &str)> {
        self.limits().iter().zip(self.limits_fields().map(|f| f.text.as_str()))
    }

    /// The figures.
    #[must_use]
    pub fn figures(&self) -> &[FigureRow] {
        &self.report.figures
    }

    /// Whether a caution says that the stage, as stated, cannot work or would be damaged, whatever its limits ask.
    #[must_use]
    pub fn cannot_work(&self) -> bool {
        self.report.cautions.iter().any(stageleaf_math::search::alternates::forbids)
    }

    fn outcome(&self, query: Query) -> Option<&Outcome> {
        let row = self.report.figures.iter().find(|row| row.query == query).map(|row| &row.nominal);
        row.or_else(|| self.report.limits.iter().find(|row| row.limit.query == query).map(|row| &row.nominal))
    }
}

/// A quote and what its figure is now.
#[derive(Clone, Debug)]
pub struct QuoteState {
    /// The quote.
    pub quote: Quote,
    /// The stage's name.
    pub stage: String,
    /// The file of its part.
    pub part_file: String,
    /// The figure now.
    pub current: Current,
}

/// What a quoted figure is now.
#[derive(Clone, Debug, PartialEq)]
pub enum Current {
    /// The shown digits are the figure's.
    Agrees,
    /// They are not.
    Is {
        /// The figure, with as many digits as the note shows.
        text: String,
    },
    /// The figure has no value to quote.
    NoValue {
        /// What it is instead.
        outcome: Outcome,
        /// What the figure measures.
        dimension: Dimension,
    },
}

/// Reads and judges a note. One bad block hides nothing, and a panic in one stage is told as a bug of that stage.
#[must_use]
pub fn examine(bytes: &[u8], file: &str, team: &Team) -> Examined {
    examine_with(bytes, file, team, &stageleaf_math::analyse)
}

/// [`examine`] with another analysis.
#[must_use]
pub fn examine_with(bytes: &[u8], file: &str, team: &Team, analyse: &dyn Fn(&Stage) -> Result<Report, Error>) -> Examined {
    let note = match guarded(|| read_note(bytes, file, &with_lost_parts(team), &team.settings)) {
        Ok(note) => note,
        Err(message) => {
            let bug = Fault::Bug { file: file.to_owned(), line: 1, stage: "(reading the note)".to_owned(), message };
            return Examined { file: file.to_owned(), stages: Vec::new(), quotes: Vec::new(), faults: vec![bug] };
        }
    };
    let mut faults: Vec<Fault> = note.problems.into_iter().map(|p| Fault::Text(Box::new(p))).collect();
    let mut stages = Vec::new();
    for block in note.blocks {
        let further = block.stage.parts.iter().map(|(amplifier, part)| (format!("parts.A{amplifier}"), part));
        let named: Vec<(String, &Part)> = [("part".to_owned(), &block.stage.part)].into_iter().chain(further).collect();
        let lost = named.iter().find_map(|(path, part)| Some((path, &team.lost_parts.iter().find(|(id, _)| *id == part.id)?.1)));
        if let Some((path, part_file)) = lost {
            faults.push(Fault::Text(Box::new(part_lost(bytes, &block, path, part_file))));
            continue;
        }
        let name = slug(&block.stage.name);
        let stage = with_quoted_figures(&block.stage, note.quotes.iter().filter(|q| q.slug == name));
        match guarded(|| analyse(&stage)) {
            Ok(Ok(report)) => {
                let id = &block.stage.part.id;
                let part_file = team.shelf.find(id).map_or_else(|| format!("{id}.toml"), |part| part.file.clone());
                stages.push(ExaminedStage { block, part_file, report });
            }
            Ok(Err(error)) => faults.push(Fault::Text(Box::new(place(bytes, &block, error)))),
            Err(message) => faults.push(Fault::Bug { file: file.to_owned(), line: block.line, stage: block.stage.name.clone(), message }),
        }
    }
    let by_slug: BTreeMap<String, &ExaminedStage> = stages.iter().map(|s| (slug(&s.block.stage.name), s)).collect();
    // A quote of a stage that could not be read or judged is no second fault.
    let of = |quote: &Quote| by_slug.get(&quote.slug).copied();
    let quotes = note.quotes.into_iter().filter_map(|quote| {
        let stage = of(&quote)?;
        Some(QuoteState {
            current: current(&quote, stage),
            stage: stage.block.stage.name.clone(),
            part_file: stage.part_file.clone(),
            quote,
        })
    });
    let quotes = quotes.collect();
    Examined { file: file.to_owned(), stages, quotes, faults }
}

/// The stage's name is another note's already.
pub(super) fn name_taken(note: &[u8], block: &Block, file: &str, line: usize) -> Fault {
    let message = format!("a stage called “{}” stands in {file}:{line} already", block.stage.name);
    Fault::Text(Box::new(at_field(note, block, "name", message).allowed("each name once in all notes of a run")))
}

/// The shelf with an empty part for each file that could not be read: a block that names one has the rest of its mistakes told,
/// instead of hearing that there is no such part.
fn with_lost_parts(team: &Team) -> Cow<'_, Shelf> {
    if team.lost_parts.is_empty() {
        return Cow::Borrowed(&team.shelf);
    }
    let mut shelf = team.shelf.clone();
    for (id, file) in &team.lost_parts {
        let part = Part { id: id.clone(), name: id.clone(), ..Part::default() };
        shelf.parts.push(ShelfPart { part, file: file.clone(), text: String::new() });
    }
    Cow::Owned(shelf)
}

fn part_lost(note: &[u8], block: &Block, path: &str, part_file: &str) -> Problem {
    at_field(note, block, path, format!("the stage “{}” is not judged: its part could not be read", block.stage.name))
        .allowed(format!("a part file without mistakes; those of {part_file} are told once"))
}

/// The figures that the prose quotes and no limit names are asked for too, as limits that judge nothing.
fn with_quoted_figures<'a>(stage: &Stage, quotes: impl Iterator<Item = &'a Quote>) -> Stage {
    let mut stage = stage.clone();
    for quote in quotes {
        if (quote.query.at.is_some() || quote.query.of.is_some()) && stage.limits.iter().all(|l| l.query != quote.query) {
            stage.limits.push(Limit { query: quote.query, bound: Bound::Report, thin: Thin::Fraction(0.0) });
        }
    }
    stage
}

fn current(quote: &Quote, stage: &ExaminedStage) -> Current {
    let dimension = quote.query.figure.dimension_in(stage.block.stage.kind);
    match stage.outcome(quote.query) {
        Some(&Outcome::Value(value)) if quote_agrees(&quote.shown, value, dimension) => Current::Agrees,
        Some(&Outcome::Value(value)) => Current::Is { text: quote_for(&quote.shown, value, dimension) },
        Some(outcome) => Current::NoValue { outcome: outcome.clone(), dimension },
        None => Current::NoValue { outcome: Outcome::DoesNotApply("the stage has no such figure"), dimension },
    }
}

/// Puts an error of the engine where the value stands in the note.
fn place(note: &[u8], block: &Block, error: Error) -> Problem {
    let what = match error {
        Error::NotPositive { what, .. }
        | Error::BeyondReason { what, .. }
        | Error::Negative { what, .. }
        | Error::MissingComponent { what }
        | Error::RangeReversed { what, .. } => what,
        Error::Unpaired { given, .. } => given,
        Error::SupplyReversed { .. } => "supply.positive",
    };
    let component = format!("components.{what}");
    let path = if block.field(&component).is_some() { component.as_str() } else { what };
    at_field(note, block, path, format!("the stage “{}” cannot be analysed: {error}", block.stage.name))
}

/// A problem at the value of `path`, or at the block where it has none.
fn at_field(note: &[u8], block: &Block, path: &str, message: String) -> Problem {
    let (line, column, length) = block.field(path).map_or((block.line, 1, 1), |f| (f.line, f.column, f.text.chars().count().max(1)));
    // The file's own line: in a list or quotation more stands on it than in the block's text.
    let text = String::from_utf8_lossy(note);
    let line_text = text.trim_start_matches('\u{feff}').lines().nth(line - 1).unwrap_or_default();
    Problem::on_line(&block.file, line, column, length, line_text, message)
}

thread_local! {
    /// Where the last guarded panic happened, and its words.
    static CAUGHT: RefCell<Option<String>> = const { RefCell::new(None) };
    static GUARDED: RefCell<bool> = const { RefCell::new(false) };
}

/// Runs `work`; a panic becomes its message with the place in the source, and nothing is printed.
fn guarded<T>(work: impl FnOnce() -> T) -> Result<T, String> {
    static HOOK: Once = Once::new();
    HOOK.call_once(|| {
        let before = panic::take_hook();
        panic::set_hook(Box::new(move |info| {
            if GUARDED.with(|g| *g.borrow()) {
                let words = info.payload().downcast_ref::<&str>().map(|s| (*s).to_owned());
                let words = words.or_else(|| info.payload().downcast_ref::<String>().cloned()).unwrap_or_else(|| "a panic".to_owned());
                let place = info.location().map(|l| format!(" ({}:{})", l.file(), l.line())).unwrap_or_default();
                CAUGHT.with(|c| *c.borrow_mut() = Some(format!("{words}{place}")));
            } else {
                before(info);
            }
        }));
    });
    GUARDED.with(|g| *g.borrow_mut() = true);
    let result = panic::catch_unwind(AssertUnwindSafe(work));
    GUARDED.with(|g| *g.borrow_mut() = false);
    result.map_err(|_| CAUGHT.with(|c| c.borrow_mut().take()).unwrap_or_else(|| "a panic".to_owned()))
}
