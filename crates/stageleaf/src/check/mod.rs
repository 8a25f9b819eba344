//! `check`: every stage of every note against its limits, and every number that the prose quotes against its figure.

mod examine;
mod findings;
mod github;
mod json;
mod junit;
mod markdown;
mod rewrite;
mod text;

use std::{collections::BTreeMap, fs, path::PathBuf};

use clap::{Args, ValueEnum};

pub use self::examine::{Current, Examined, ExaminedStage, QuoteState, examine, examine_with};
pub use self::text::{margin_text, outcome_words};
use crate::{
    fault::Fault,
    team::Teams,
    terminal::Terminal,
    walk::{self, show, unreadable},
};
use stageleaf_math::{
    limit::Verdict,
    measured::{Agreement, MeasuredRow},
};

/// How results are written.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, ValueEnum)]
pub enum Format {
    /// For people.
    #[default]
    Text,
    /// For programs: version 1 of the JSON form, on standard output.
    Json,
    /// For test reports: a case for each limit and each quote.
    Junit,
    /// Annotations in a workflow's log, at the lines of the notes, the worst first.
    Github,
    /// A summary for a review, the worst first.
    Markdown,
}

/// What `check` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Notes, and folders in which every `.md` file is a note
    #[arg(required = true, value_name = "PATH")]
    pub paths: Vec<PathBuf>,
    /// How results are written
    #[arg(long, value_enum, default_value_t, value_name = "FORMAT")]
    pub format: Format,
    /// Bring the numbers that the prose quotes up to date, in place; limits and everything else stay
    #[arg(long)]
    pub rewrite: bool,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// How a run ended; the process's exit code.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Ending {
    /// Every limit holds (or is thin) and every quote agrees.
    Good = 0,
    /// A limit breaks or is undetermined, a stage cannot work as stated, the prose quotes a stale number, or a measurement
    /// contradicts its prediction.
    Broken = 1,
    /// Something could not be read.
    BadInput = 2,
}

/// What a run counted.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Counts {
    /// Notes read.
    pub notes: usize,
    /// Stages judged.
    pub stages: usize,
    /// Stages that cannot work as stated, whatever their limits ask.
    pub unworkable: usize,
    /// Limits that hold.
    pub holds: usize,
    /// Limits that hold, barely.
    pub thin: usize,
    /// Limits that break.
    pub breaks: usize,
    /// Limits that could not be judged.
    pub undetermined: usize,
    /// Figures shown without a limit.
    pub reported: usize,
    /// Measurements that lie outside their prediction.
    pub contradicted: usize,
    /// Quotes in the prose.
    pub quotes: usize,
    /// Quotes that do not agree with their figure.
    pub stale: usize,
    /// Quotes brought up to date.
    pub rewritten: usize,
    /// Notes that were not looked at, because their settings could not be read.
    pub passed_over: usize,
    /// What could not be read.
    pub faults: usize,
}

impl Counts {
    fn add(&mut self, note: &Examined) {
        self.notes += 1;
        self.stages += note.stages.len();
        self.unworkable += note.stages.iter().filter(|stage| stage.cannot_work()).count();
        for row in note.stages.iter().flat_map(ExaminedStage::limits) {
            *match row.verdict {
                Verdict::Holds => &mut self.holds,
                Verdict::Thin => &mut self.thin,
                Verdict::Breaks => &mut self.breaks,
                Verdict::Undetermined => &mut self.undetermined,
                Verdict::Reported => &mut self.reported,
            } += 1;
        }
        let contradicts = |row: &&MeasuredRow| row.agreement == Agreement::Contradicts;
        self.contradicted += note.stages.iter().flat_map(|stage| &stage.report.measured).filter(contradicts).count();
        self.quotes += note.quotes.len();
        self.stale += note.stale().count();
        self.faults += note.faults.len();
    }

    /// How the run ended.
    #[must_use]
    pub const fn ending(&self) -> Ending {
        if self.faults > 0 {
            Ending::BadInput
        } else if self.breaks + self.undetermined + self.stale + self.unworkable + self.contradicted > 0 {
            Ending::Broken
        } else {
            Ending::Good
        }
    }
}

/// Runs `check`.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let mut teams = Teams::new(options.shelf.clone());
    let mut counts = Counts::default();
    let mut report = Collected::of(options.format);
    let tell = |faults: &[Fault], counts: &mut Counts, terminal: &mut Terminal, report: &mut Collected| {
        counts.faults += faults.len();
        for fault in faults {
            report.fault(fault, terminal);
        }
    };

    let mut names: BTreeMap<String, (String, usize)> = BTreeMap::new();
    let found = walk::notes(&options.paths);
    tell(&found.faults, &mut counts, terminal, &mut report);
    for (index, path) in found.notes.iter().enumerate() {
        let file = show(path);
        terminal.progress(&format!("{} of {}: {file}", index + 1, found.notes.len()));
        let team = teams.of(path);
        tell(&teams.take_faults(), &mut counts, terminal, &mut report);
        if team.settings_lost {
            counts.passed_over += 1;
            continue;
        }
        let bytes = match fs::read(path) {
            Ok(bytes) => bytes,
            Err(error) => {
                tell(&[unreadable(path, &error)], &mut counts, terminal, &mut report);
                continue;
            }
        };
        let mut note = examine(&bytes, &file, &team);
        for stage in &note.stages {
            let (earlier, line) =
                names.entry(stageleaf_note::slug(&stage.block.stage.name)).or_insert_with(|| (file.clone(), stage.block.line));
            if *earlier != file {
                note.faults.push(examine::name_taken(&bytes, &stage.block, earlier, *line));
            }
        }
        if options.rewrite {
            match rewrite::rewrite(path, &bytes, &mut note) {
                Ok(count) => counts.rewritten += count,
                Err(fault) => note.faults.push(fault),
            }
        }
        counts.add(&note);
        report.note(&note, terminal);
    }
    terminal.clear();
    report.close(&counts, terminal);
    counts.ending()
}

/// What a run tells, in the form that was asked for: at once, or at its end.
enum Collected {
    Text,
    Json(json::Document),
    Junit(junit::Document),
    Findings(Vec<findings::Finding>, fn(&[findings::Finding], &Counts) -> String),
}

impl Collected {
    fn of(format: Format) -> Self {
        match format {
            Format::Text => Self::Text,
            Format::Json => Self::Json(json::Document::default()),
            Format::Junit => Self::Junit(junit::Document::default()),
            Format::Github => Self::Findings(Vec::new(), github::text),
            Format::Markdown => Self::Findings(Vec::new(), markdown::text),
        }
    }

    fn fault(&mut self, fault: &Fault, terminal: &mut Terminal) {
        match self {
            Self::Text => terminal.complain(&format!("{fault}\n")),
            Self::Json(document) => document.fault(fault),
            Self::Junit(document) => document.fault(fault),
            Self::Findings(found, _) => found.push(findings::of_fault(fault)),
        }
    }

    fn note(&mut self, note: &Examined, terminal: &mut Terminal) {
        match self {
            Self::Text => {
                terminal.out(&text::note(note, terminal.colour()));
                for fault in &note.faults {
                    terminal.complain(&format!("{fault}\n"));
                }
            }
            Self::Json(document) => document.note(note),
            Self::Junit(document) => document.note(note),
            Self::Findings(found, _) => found.extend(findings::of_note(note)),
        }
    }

    fn close(mut self, counts: &Counts, terminal: &mut Terminal) {
        match &mut self {
            Self::Text => terminal.out(&text::closing(counts, terminal.colour())),
            Self::Json(document) => terminal.out(&document.text()),
            Self::Junit(document) => match document.text() {
                Ok(text) => terminal.out(&text),
                Err(error) => terminal.complain(&format!("the report cannot be written as XML: {error}")),
            },
            Self::Findings(found, form) => {
                findings::sort(found);
                terminal.out(&form(found, counts));
            }
        }
    }
}
