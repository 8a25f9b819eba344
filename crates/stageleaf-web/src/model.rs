//! The sheet's state without a page: the block's text, its report, and the way back.

use stageleaf_math::{Detail, kind::Kind, limit::Verdict, model::Plans, report::Report};
use stageleaf_note::{Block, Place, Problem, Settings, Shelf, parse_query, paths, problem::quoted, read_block};

use crate::{data::Data, link::Found};

/// Steps that undo can take back.
const HISTORY: usize = 200;
/// A longer value than this is no value.
const LONGEST: usize = 400;

/// A stage as the sheet shows it now, and as the note has it.
#[derive(Debug)]
pub struct Model {
    shelf: Shelf,
    settings: Settings,
    place: Place,
    original: Block,
    block: Block,
    report: Report,
    /// How much of the report is worked out.
    detail: Detail,
    plans: Plans,
    undo: Vec<String>,
    redo: Vec<String>,
}

impl Model {
    /// Reads the page's data; an empty sheet starts with `start`.
    ///
    /// # Errors
    /// What is wrong with a block that cannot be read or analysed: the page's sheet then stays as it is.
    pub fn new(data: Data, start: &str) -> Result<Self, Vec<Problem>> {
        let Data { block, file, line, shelf, settings } = data;
        let place = Place::new(&file, line);
        let text = block.unwrap_or_else(|| start.to_owned());
        let plans = Plans::default();
        let block = read_block(&text, &place, &shelf, &settings)?;
        let report = analyse(&block, &place, Detail::Full, &plans)?;
        let detail = Detail::Full;
        Ok(Self { shelf, settings, place, original: block.clone(), block, report, detail, plans, undo: Vec::new(), redo: Vec::new() })
    }

    /// Whether the report lacks what was left for later (see [`Model::complete`]).
    pub fn is_behind(&self) -> bool {
        self.detail < Detail::Full
    }

    /// Works out at least `detail` of the present block.
    pub fn complete(&mut self, detail: Detail) {
        if self.detail < detail
            && let Ok(report) = analyse(&self.block, &self.place, detail, &self.plans)
        {
            self.report = report;
            self.detail = detail;
        }
    }

    /// The block now.
    pub const fn block(&self) -> &Block {
        &self.block
    }

    /// What the engine found about it.
    pub const fn report(&self) -> &Report {
        &self.report
    }

    /// The parts at hand.
    pub const fn shelf(&self) -> &Shelf {
        &self.shelf
    }

    /// The team's settings.
    pub const fn settings(&self) -> &Settings {
        &self.settings
    }

    /// Whether there is something to take back, something to do again, and a difference from the note.
    pub fn ways(&self) -> [bool; 3] {
        [!self.undo.is_empty(), !self.redo.is_empty(), self.block.text != self.original.text]
    }

    /// Puts `value` at `path`.
    ///
    /// # Errors
    /// What is wrong with it; nothing has changed then.
    pub fn edit(&mut self, path: &str, value: &str) -> Result<(), Vec<Problem>> {
        if value.len() > LONGEST {
            let words = format!("{} characters are too long for a value", value.chars().count());
            return Err(vec![self.problem(words).allowed(format!("at most {LONGEST} bytes"))]);
        }
        let text = self.block.rewrite(path, value);
        self.replace(&text)
    }

    /// Puts a whole block in place.
    ///
    /// # Errors
    /// What is wrong with it; nothing has changed then.
    pub fn replace(&mut self, text: &str) -> Result<(), Vec<Problem>> {
        if text == self.block.text {
            return Ok(());
        }
        let before = self.block.text.clone();
        self.take(text)?;
        self.undo.push(before);
        if self.undo.len() > HISTORY {
            self.undo.remove(0);
        }
        self.redo.clear();
        Ok(())
    }

    /// Takes the last change back.
    pub fn undo(&mut self) -> Result<(), Vec<Problem>> {
        let Some(text) = self.undo.pop() else { return Ok(()) };
        self.redo.push(self.block.text.clone());
        self.take(&text)
    }

    /// Makes a change again that was taken back.
    pub fn redo(&mut self) -> Result<(), Vec<Problem>> {
        let Some(text) = self.redo.pop() else { return Ok(()) };
        self.undo.push(self.block.text.clone());
        self.take(&text)
    }

    /// The note's own values; can be taken back.
    pub fn reset(&mut self) -> Result<(), Vec<Problem>> {
        let text = self.original.text.clone();
        self.replace(&text)
    }

    /// Values that differ from the note's.
    pub fn changes(&self) -> Vec<(String, String)> {
        let differs = |path: &str, text: &str| self.original.field(path).is_none_or(|field| field.text != text);
        self.block
            .fields
            .iter()
            .filter(|field| differs(&field.path, &field.text))
            .map(|field| (field.path.clone(), field.text.clone()))
            .collect()
    }

    /// Applies what an address says; returns words about what was left out.
    pub fn follow(&mut self, found: Found) -> Vec<Problem> {
        let changes = match found {
            Found::Nothing => return Vec::new(),
            Found::OtherVersion => {
                return vec![self.problem("the link is in a format of another version: its values were not used".to_owned())];
            }
            Found::Changes(changes) => changes,
        };
        let mut problems = Vec::new();
        for (path, value) in changes {
            if self.block.field(&path).is_some() || is_path(&path, self.block.stage.kind) {
                problems.extend(self.edit(&path, &value).err().unwrap_or_default());
            } else {
                problems.push(self.problem(format!("the link names {}, which this stage has not: it was left out", quoted(&path))));
            }
        }
        problems
    }

    /// The limits' names with their verdicts.
    pub fn verdicts(&self) -> Vec<(String, Verdict)> {
        self.report.limits.iter().map(|row| (heading(row.limit.query), row.verdict)).collect()
    }

    /// A problem that is at no place of the block's text.
    fn problem(&self, message: String) -> Problem {
        Problem::on_line(&self.place.file, self.place.first_line, 1, 1, "", message)
    }

    fn take(&mut self, text: &str) -> Result<(), Vec<Problem>> {
        let block = read_block(text, &self.place, &self.shelf, &self.settings)?;
        self.report = analyse(&block, &self.place, Detail::Limits, &self.plans)?;
        self.detail = Detail::Limits;
        self.block = block;
        Ok(())
    }
}

/// Whether a stage of this kind can have a value at `path` (see [`paths`] for the list).
fn is_path(path: &str, kind: Kind) -> bool {
    let word = match path.split_once('.') {
        None => ["name", "part", "isolation"].contains(&path),
        Some(("parts", a)) => (1..=kind.spec().amplifiers).any(|n| a == format!("A{n}")),
        Some(("source" | "signal", key)) => match key.rsplit_once('.') {
            None => ["kind", "waveform"].contains(&key),
            Some((input, key)) => ["kind", "waveform"].contains(&key) && paths::signal_inputs(kind).iter().any(|i| i.name == input),
        },
        Some(("limits", query)) => parse_query(query).is_ok(),
        _ => false,
    };
    word || paths::dimension(path, kind).is_some()
}

/// What changed between two lists of verdicts, in words; nothing where nothing did.
pub fn announcement(before: &[(String, Verdict)], after: &[(String, Verdict)]) -> Option<String> {
    let changed: Vec<String> = after
        .iter()
        .filter_map(|(name, now)| {
            let (_, then) = before.iter().find(|(other, _)| other == name)?;
            (then != now).then(|| format!("{name}: {} now, {} before.", now.word(), then.word()))
        })
        .collect();
    (!changed.is_empty()).then(|| changed.join(" "))
}

fn heading(query: stageleaf_math::figure::Query) -> String {
    let title = match stageleaf_note::argument_text(query, |v, d| stageleaf_note::format(v, d, 3)) {
        Some(argument) => format!("{} {argument}", query.figure.title()),
        None => query.figure.title().to_owned(),
    };
    query.of.map_or(title.clone(), |of| title + &stageleaf_note::of_text(of))
}

fn analyse(block: &Block, place: &Place, detail: Detail, plans: &Plans) -> Result<Report, Vec<Problem>> {
    stageleaf_math::analyse_with(&block.stage, detail, plans)
        .map_err(|error| vec![Problem::on_line(&place.file, place.first_line, 1, 1, "", error.to_string())])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_link_may_name_every_value_that_a_kind_has() {
        for path in [
            "part",
            "isolation",
            "components.Cf",
            "supply.negative",
            "signal.peak",
            "signal.waveform",
            "source.kind",
            "source.resistance",
            "load.capacitance",
            "board.inverting_node",
            "ambient.temperature",
            "band.to",
            "limits.gain_at 2 MHz",
        ] {
            assert!(is_path(path, Kind::NonInverting), "{path}");
        }
        assert!(is_path("signal.in2.waveform", Kind::Summing) && is_path("source.in1.kind", Kind::Difference));
        assert!(is_path("parts.A2", Kind::Instrumentation) && is_path("reference.resistance", Kind::ScaleAndShift));
        for path in ["", "nothing", "components.R99", "reference.voltage", "parts.A9", "limits.beauty", "signal.in2.peak", "../part"] {
            assert!(!is_path(path, Kind::NonInverting), "{path}");
        }
    }
}
