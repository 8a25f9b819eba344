//! `explain`: what a figure means, how it is computed, with a stage's numbers in place where a note is named, and what is not modelled.

use std::{
    collections::BTreeSet,
    fmt::Write as _,
    path::{Path, PathBuf},
};

use clap::Args;
use stageleaf_math::{
    NOT_MODELLED,
    analysis::NO_SUCH_SCOPE,
    definition::not_modelled_for,
    dimension::Dimension,
    figure::{Argument, Figure, Group, Query, Scope},
    kind::Kind,
    limit::{Bound, Limit, Thin},
    report::{Against, FigureRow, Outcome, Report, Working},
};
use stageleaf_note::{
    Block, format as quantity_text, parse_query,
    problem::nearest,
    query_text,
    worked::{SAME, difference, in_place},
};

use crate::{
    asked,
    check::{Ending, outcome_words},
    fault::Fault,
    team::Team,
    terminal::{Terminal, plain},
};

/// Digits of a figure.
const DIGITS: usize = 4;

/// What `explain` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Figure, as `phase_margin` or "gain_at 2 MHz"; without one, all are listed
    #[arg(value_name = "FIGURE")]
    pub figure: Option<String>,
    /// The note whose numbers are put in place
    #[arg(value_name = "NOTE")]
    pub note: Option<PathBuf>,
    /// The stage, by its name or as links write it; without one, every stage of the note
    #[arg(long, value_name = "NAME", requires = "note")]
    pub stage: Option<String>,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR", requires = "note")]
    pub shelf: Option<PathBuf>,
}

/// Explains.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let (text, faults) = text(options);
    terminal.out(&text);
    for fault in &faults {
        terminal.complain(&fault.to_string());
    }
    if faults.is_empty() { Ending::Good } else { Ending::BadInput }
}

/// The explanation, and what could not be explained.
#[must_use]
pub fn text(options: &Options) -> (String, Vec<Fault>) {
    let Some(given) = &options.figure else { return (list(), Vec::new()) };
    let given = given.trim();
    // Without a note a figure may be named without the frequency that it takes.
    let id = given.split_whitespace().next().unwrap_or_default();
    let Some(figure) = Figure::ALL.iter().copied().find(|f| f.id() == id) else { return (String::new(), vec![unknown(id)]) };
    let query = if given == id {
        None
    } else {
        match parse_query(given) {
            Ok(query) => Some(query),
            Err(trouble) => return (String::new(), vec![refused(&trouble)]),
        }
    };
    let mut text = general(figure);
    let mut faults = Vec::new();
    match &options.note {
        Some(note) => stages(options, note, figure, query, &mut text, &mut faults),
        None => omissions(figure, &mut text),
    }
    (text, faults)
}

fn refused(trouble: &stageleaf_note::Trouble) -> Fault {
    Fault::Path {
        path: "explain".to_owned(),
        message: trouble.message.clone(),
        allowed: Some(trouble.allowed.clone()),
        attempt: trouble.attempt.as_ref().map(|a| format!("stageleaf explain \"{a}\"")),
    }
}

/// What holds for every stage.
fn general(figure: Figure) -> String {
    let mut text = format!("{}: {}\n\n{}\n\n", figure.id(), figure.title(), figure.meaning());
    let definition = figure.definition();
    labelled(&mut text, "formula", definition.formula);
    labelled(&mut text, "source", definition.source);
    labelled(&mut text, "unit", unit_words(figure.dimension()));
    for (kinds, dimension) in other_dimensions(figure) {
        labelled(&mut text, "", &format!("{} in a stage of kind {kinds}", unit_words(dimension)));
    }
    labelled(&mut text, "group", group_words(figure.group()));
    match figure.argument() {
        Argument::None => labelled(&mut text, "limit", &format!("{} = \"…\"", figure.id())),
        Argument::Settling => {
            labelled(&mut text, "limit", &format!("\"{} to 0.1 % after 1 V\" = \"…\": it takes an error and a step", figure.id()));
        }
        Argument::Frequency => labelled(&mut text, "limit", &format!("\"{} 20 kHz\" = \"…\": it takes a frequency", figure.id())),
    }
    match figure.scope() {
        Scope::Stage => {}
        Scope::Amplifier => labelled(&mut text, "of", "the worst of several amplifiers, or `of A2`"),
        Scope::Input => labelled(&mut text, "from", "the first of several inputs, or `from in2`, `from reference`"),
    }
    text
}

fn omissions(figure: Figure, text: &mut String) {
    let moving: BTreeSet<&str> = not_modelled_for(figure.group()).collect();
    text.push_str("\nNot modelled, and able to move this figure:\n");
    for what in NOT_MODELLED.iter().map(|o| o.what).filter(|w| moving.contains(w)) {
        line(text, format_args!("  {what}"));
    }
    let others: Vec<&str> = NOT_MODELLED.iter().map(|o| o.what).filter(|w| !moving.contains(w)).collect();
    line(text, format_args!("Not modelled, for other figures: {}", others.join(", ")));
}

fn stages(options: &Options, note: &Path, figure: Figure, query: Option<Query>, text: &mut String, faults: &mut Vec<Fault>) {
    let asked = asked::stages(&[note.to_owned()], options.stage.as_deref(), options.shelf.as_deref());
    faults.extend(asked.faults);
    for of in &asked.stages {
        if let Err(fault) = stage(&of.stage.block, &of.team, figure, query, text) {
            faults.push(fault);
        }
    }
    omissions(figure, text);
}

/// The figure of one stage: every one that the note asks for, where it takes a frequency and none was named.
fn stage(block: &Block, team: &Team, figure: Figure, query: Option<Query>, text: &mut String) -> Result<(), Fault> {
    let mut stage = block.stage.clone();
    let at = format!("{}:{}", block.file, block.line);
    let queries: Vec<Query> = match (query, figure.argument()) {
        (Some(query), _) => vec![query],
        (None, Argument::None) => vec![Query::of(figure)],
        (None, Argument::Frequency | Argument::Settling) => stage.limits.iter().map(|l| l.query).filter(|q| q.figure == figure).collect(),
    };
    if queries.is_empty() {
        let message = format!("`{}` needs a frequency, and no limit of the stage “{}” states one", figure.id(), plain(&stage.name));
        return Err(Fault::Path {
            path: at,
            message,
            allowed: Some("a figure with its frequency".to_owned()),
            attempt: Some(format!("stageleaf explain \"{} 20 kHz\" {}", figure.id(), block.file)),
        });
    }
    for &query in &queries {
        if !stage.limits.iter().any(|l| l.query == query) {
            stage.limits.push(Limit { query, bound: Bound::Report, thin: Thin::Fraction(0.0) });
        }
    }
    let report = stageleaf_math::analyse(&stage).map_err(|error| Fault::path(at.clone(), error.to_string()))?;
    let part_file = team.shelf.find(&block.stage.part.id).map_or("", |p| p.file.as_str());
    let absent = Outcome::DoesNotApply(NO_SUCH_SCOPE);
    if let Some(row) = report.figures.iter().find(|r| queries.contains(&r.query) && r.nominal == absent) {
        let message = format!("`{}`: {NO_SUCH_SCOPE} “{}”", query_text(row.query), plain(&stage.name));
        return Err(Fault::path(at, message));
    }
    line(text, format_args!("\n{at}  {}  ({}, {})", plain(&stage.name), stage.kind.id(), plain(&stage.part.id)));
    for query in queries {
        if let Some(row) = report.figures.iter().find(|r| r.query == query) {
            worked(row, &report, part_file, text);
        }
    }
    Ok(())
}

fn worked(row: &FigureRow, report: &Report, part_file: &str, text: &mut String) {
    let d = row.dimension;
    labelled(text, "figure", &query_text(row.query));
    labelled(text, "network", &outcome_words(&row.nominal, d, part_file));
    if let Some((low, high)) = row.range {
        let basis = row.basis.map_or(String::new(), |b| format!(" ({})", b.word()));
        labelled(text, "worst case", &format!("{} to {}{basis}", quantity_text(low, d, DIGITS), quantity_text(high, d, DIGITS)));
    }
    let forms: Vec<&Working> = report.working.iter().filter(|w| w.query == row.query).collect();
    if forms.is_empty() && row.nominal.value().is_some() {
        labelled(text, "handbook", "no closed form for this stage: the network decides alone");
    }
    for w in forms {
        labelled(text, "handbook", w.formula);
        if !w.numbers.is_empty() {
            labelled(text, "", &format!("{} = {}", in_place(w), quantity_text(w.handbook, d, DIGITS)));
        }
        let of = match w.against {
            Against::Nominal => "the network's value",
            Against::Least => "the network's least value",
        };
        match difference(w).as_deref() {
            None => {}
            Some(SAME) => labelled(text, "", &format!("{of} is the same")),
            Some(off) => labelled(text, "", &format!("{of} differs by {off}{}", why(w))),
        }
        labelled(text, "", &format!("from: {}", w.source));
    }
}

fn why(w: &Working) -> String {
    if w.difference.is_empty() { String::new() } else { format!(": {}", w.difference) }
}

fn labelled(text: &mut String, label: &str, value: &str) {
    line(text, format_args!("  {label:<12}{value}"));
}

fn line(text: &mut String, words: std::fmt::Arguments<'_>) {
    writeln!(text, "{words}").expect("a string takes all");
}

/// Kinds on which the figure measures something else, and what: a gain in Ω.
fn other_dimensions(figure: Figure) -> Vec<(&'static str, Dimension)> {
    Kind::ALL.iter().map(|k| (k.id(), figure.dimension_in(*k))).filter(|(_, d)| *d != figure.dimension()).collect()
}

fn list() -> String {
    let width = Figure::ALL.iter().map(|f| f.id().len()).max().unwrap_or(0);
    let mut text = String::new();
    let mut group = None;
    for figure in Figure::ALL {
        if group != Some(figure.group()) {
            let gap = if group.is_some() { "\n" } else { "" };
            writeln!(text, "{gap}{}", group_words(figure.group())).expect("a string takes all");
            group = Some(figure.group());
        }
        writeln!(text, "  {:<width$}  {}", figure.id(), figure.title()).expect("a string takes all");
    }
    text
}

const fn group_words(group: Group) -> &'static str {
    match group {
        Group::SmallSignal => "small signal",
        Group::Dc => "DC",
        Group::Noise => "noise",
        Group::LargeSignal => "large signal",
        Group::Power => "power",
        Group::Starting => "starting",
        Group::Switching => "switching",
    }
}

/// In which unit text tells it, and in which JSON does.
const fn unit_words(dimension: Dimension) -> &'static str {
    match dimension {
        Dimension::Number => "a pure number",
        Dimension::Gain => "V/V, a plain signed number; limits may be in dB too",
        Dimension::Level => "dB; V/V in JSON",
        Dimension::Fraction => "% or ppm; a fraction in JSON",
        Dimension::Angle => "degrees; radians in JSON",
        Dimension::Frequency => "Hz",
        Dimension::Time => "s",
        Dimension::Resistance => "Ω",
        Dimension::Capacitance => "F",
        Dimension::Voltage => "V",
        Dimension::Current => "A",
        Dimension::Power => "W",
        Dimension::Charge => "C",
        Dimension::VoltsPerCoulomb => "V/C",
        Dimension::Temperature => "°C; K in JSON",
        Dimension::TemperatureDifference => "K",
        Dimension::ThermalResistance => "K/W",
        Dimension::SlewRate => "V/µs; V/s in JSON",
        Dimension::VoltageDensity => "V/√Hz",
        Dimension::CurrentDensity => "A/√Hz",
        Dimension::VoltageDrift => "V/K",
        Dimension::FractionDrift => "ppm/K; 1/K in JSON",
        Dimension::Bits => "bits",
    }
}

fn unknown(given: &str) -> Fault {
    Fault::Path {
        path: "explain".to_owned(),
        message: format!("no figure is called `{given}`"),
        allowed: Some("a figure id; `stageleaf explain` lists them".to_owned()),
        attempt: nearest(given, Figure::ALL.iter().map(|f| f.id())).map(|id| format!("stageleaf explain {id}")),
    }
}
