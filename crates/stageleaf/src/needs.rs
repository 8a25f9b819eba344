//! `needs`: the list that one takes to a distributor's filter, and how loose each component may be.

use std::{fmt::Write as _, path::PathBuf};

use clap::Args;
use rayon::prelude::*;
use stageleaf_math::{
    dimension::Dimension,
    limit::Limit,
    part::PartFigure,
    search::needs::{Edge, Needs, Room, lost_now, part_need, tolerance_need},
};
use stageleaf_note::{print::trimmed, query_text, words::rating_text};

use crate::{
    asked::{self, AskedStage},
    check::Ending,
    terminal::{Terminal, plain},
};

/// What `needs` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// The note
    #[arg(value_name = "NOTE")]
    pub note: PathBuf,
    /// The stage, by its name or as links write it; without one, every stage of the note
    #[arg(long, value_name = "NAME")]
    pub stage: Option<String>,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// Works the lists out.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let asked = asked::stages(std::slice::from_ref(&options.note), options.stage.as_deref(), options.shelf.as_deref());
    for fault in &asked.faults {
        terminal.complain(&format!("{fault}\n"));
    }
    for of in &asked.stages {
        let stage = &of.stage.block.stage;
        terminal.progress(&format!("{}: figures and components, one after the other", plain(&stage.name)));
        // Each figure and each component is a search of its own.
        let part = PartFigure::ALL.par_iter().filter_map(|figure| part_need(stage, *figure)).collect();
        let tolerances = (0..stage.components.len()).into_par_iter().map(|index| tolerance_need(stage, index)).collect();
        terminal.clear();
        terminal.out(&text(of, &Needs { part, tolerances, lost_now: lost_now(stage) }));
    }
    if asked.faults.is_empty() { Ending::Good } else { Ending::BadInput }
}

fn text(of: &AskedStage, found: &Needs) -> String {
    let stage = &of.stage.block.stage;
    let mut text =
        format!("{}:{}  {}  ({}, {})\n", of.file, of.stage.block.line, plain(&stage.name), stage.kind.id(), plain(&stage.part.id));
    if stage.limits.is_empty() {
        text.push_str("  no limits: nothing is needed\n\n");
        return text;
    }
    if !found.lost_now.is_empty() {
        line(&mut text, &format!("  not kept or not judged as it stands: {}", figures(&found.lost_now)));
    }
    let mut rows: Vec<[String; 4]> = Vec::new();
    for need in &found.part {
        let d = need.figure.dimension();
        let stated = plain(&rating_text(&need.stated, d));
        let id = need.figure.id().to_owned();
        match &need.room {
            Room::Any => {}
            Room::None(lost) => rows.push([id, "no value helps".to_owned(), stated, figures(lost)]),
            Room::Between { least, greatest } => {
                let mut words = Vec::new();
                for (word, edge) in [("at least", least), ("at most", greatest)] {
                    if let Some(edge) = edge {
                        words.push((format!("{word} {}", number(edge.value, d)), figures(&edge.lost)));
                    }
                }
                for (i, (needed, lost)) in words.into_iter().enumerate() {
                    let first = i == 0;
                    rows.push([
                        if first { id.clone() } else { String::new() },
                        needed,
                        if first { stated.clone() } else { String::new() },
                        lost,
                    ]);
                }
            }
        }
    }
    let head = ["amplifier figure", "needed", "stated by the part", "lost beyond"].map(str::to_owned);
    table(&mut text, head, &rows);
    let rows: Vec<[String; 4]> = found
        .tolerances
        .iter()
        .map(|need| {
            let (needed, lost) = match &need.loosest {
                None => ("no tolerance helps".to_owned(), String::new()),
                Some(Edge { value, lost }) if lost.is_empty() => {
                    (format!("{} and more", number(*value, Dimension::Fraction)), String::new())
                }
                Some(Edge { value, lost }) => (format!("up to {}", number(*value, Dimension::Fraction)), figures(lost)),
            };
            let stated = if need.stated > 0.0 { number(need.stated, Dimension::Fraction) } else { "exact".to_owned() };
            [need.name.to_owned(), needed, stated, lost]
        })
        .collect();
    table(&mut text, ["component", "tolerance allowed", "stated", "lost beyond"].map(str::to_owned), &rows);
    text.push_str("  Each alone, all else as it stands, judged at the worst case: two at their edges together may break a limit.\n\n");
    text
}

fn number(value: f64, dimension: Dimension) -> String {
    trimmed(value, dimension, 3)
}

fn figures(limits: &[Limit]) -> String {
    limits.iter().map(|l| query_text(l.query)).collect::<Vec<_>>().join(", ")
}

fn table(text: &mut String, head: [String; 4], rows: &[[String; 4]]) {
    if rows.is_empty() {
        return;
    }
    let all: Vec<&[String; 4]> = std::iter::once(&head).chain(rows).collect();
    let width = |column: usize| all.iter().map(|row| row[column].chars().count()).max().unwrap_or(0);
    for row in &all {
        let mut words = String::from(" ");
        for (column, cell) in row.iter().enumerate() {
            write!(words, " {cell}{} ", " ".repeat(width(column) - cell.chars().count())).expect("a string takes all");
        }
        line(text, words.trim_end());
    }
}

fn line(text: &mut String, words: &str) {
    writeln!(text, "{words}").expect("a string takes all");
}
