//! `alternates`: every part of the shelf in the place of a stage's own, ranked, with what breaks and what its data lack.

use std::{
    fmt::Write as _,
    path::PathBuf,
    sync::atomic::{AtomicUsize, Ordering},
};

use clap::Args;
use rayon::prelude::*;
use stageleaf_math::search::{
    Judge,
    alternates::{Alternate, alternate, rank},
};
use stageleaf_note::{
    limit_text,
    problem::nearest,
    query_text,
    words::{caution_text, need_text},
};

use crate::{
    asked::{self, AskedStage},
    check::Ending,
    fault::Fault,
    terminal::{Ink, Terminal, paint, plain},
};

/// How many parts of a stage are shown.
const SHOWN: usize = 5;

/// What `alternates` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Notes, and folders in which every `.md` file is a note
    #[arg(required = true, value_name = "PATH")]
    pub paths: Vec<PathBuf>,
    /// The stage, by its name or as links write it; without one, every stage
    #[arg(long, value_name = "NAME")]
    pub stage: Option<String>,
    /// Only stages that use this part, in its place alone: which notes survive if it goes away
    #[arg(long, value_name = "PART")]
    pub without: Option<String>,
    /// Show every part of the shelf, not the best five
    #[arg(long)]
    pub all: bool,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// Judges every part in every stage.
///
/// Ends with 1 when a stage has no other part that keeps its limits.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let mut asked = asked::stages(&options.paths, options.stage.as_deref(), options.shelf.as_deref());
    if let Some(id) = &options.without {
        let uses = |s: &AskedStage| s.stage.block.stage.part.id == *id || s.stage.block.stage.parts.iter().any(|(_, p)| p.id == *id);
        let known: Vec<String> = asked.stages.iter().map(|s| s.stage.block.stage.part.id.clone()).collect();
        asked.stages.retain(uses);
        if asked.stages.is_empty() && !known.is_empty() {
            asked.faults.push(Fault::Path {
                path: "--without".to_owned(),
                message: format!("no stage here uses the part “{id}”"),
                allowed: Some("a part that a stage names".to_owned()),
                attempt: nearest(id, known.iter().map(String::as_str)).map(str::to_owned),
            });
        }
    }
    for fault in &asked.faults {
        terminal.complain(&format!("{fault}\n"));
    }
    let done = AtomicUsize::new(0);
    let ranked: Vec<Vec<Alternate>> = asked
        .stages
        .par_iter()
        .map(|of| {
            let list = alternates(of, options.without.as_deref());
            done.fetch_add(1, Ordering::Relaxed);
            list
        })
        .collect();
    for (of, list) in asked.stages.iter().zip(&ranked) {
        terminal.out(&text(of, list, options.all, terminal.colour()));
    }
    let alone = |(of, list): &(&AskedStage, &Vec<Alternate>)| !list.iter().any(|a| a.survives() && a.part != of.stage.block.stage.part.id);
    let stuck: Vec<&AskedStage> = asked.stages.iter().zip(&ranked).filter(alone).map(|(of, _)| of).collect();
    terminal.out(&closing(&asked.stages, &ranked, &stuck, terminal.colour()));
    match (asked.faults.is_empty(), stuck.is_empty()) {
        (false, _) => Ending::BadInput,
        (true, false) => Ending::Broken,
        (true, true) => Ending::Good,
    }
}

/// Every part of the stage's shelf in its place, ranked.
#[must_use]
pub fn alternates(of: &AskedStage, without: Option<&str>) -> Vec<Alternate> {
    let mut judge = Judge::default();
    let stage = &of.stage.block.stage;
    let mut list: Vec<Alternate> = of.team.shelf.parts.iter().filter_map(|p| alternate(&mut judge, stage, &p.part, without)).collect();
    rank(&mut list);
    list
}

fn text(of: &AskedStage, list: &[Alternate], all: bool, colour: bool) -> String {
    let stage = &of.stage.block.stage;
    let mut text =
        format!("{}:{}  {}  ({}, {})\n", of.file, of.stage.block.line, plain(&stage.name), stage.kind.id(), plain(&stage.part.id));
    let shown = |(i, a): &(usize, &Alternate)| all || *i < SHOWN || a.part == stage.part.id;
    let width = list.iter().map(|a| a.part.chars().count()).max().unwrap_or(0);
    for (_, a) in list.iter().enumerate().filter(shown) {
        let (word, ink) = if !a.cautions.is_empty() {
            ("cannot work", Ink::Bad)
        } else if !a.breaks.is_empty() {
            ("breaks", Ink::Bad)
        } else if !a.undetermined.is_empty() {
            ("undetermined", Ink::Watch)
        } else if a.thin > 0 {
            ("thin", Ink::Watch)
        } else if a.holds == 0 {
            ("not judged", Ink::Quiet)
        } else {
            ("holds", Ink::Good)
        };
        let own = if a.part == stage.part.id { " (now)" } else { "" };
        let mut pieces = Vec::new();
        if let Some((margin, limit)) = a.least.as_ref().filter(|_| a.survives()) {
            // Margins are told in terms of what counts as thin, as that alone compares.
            pieces.push(format!("least margin {margin:.1} × thin, {}", query_text(limit.query)));
        }
        pieces.extend(a.cautions.iter().map(|c| plain(&caution_text(c))));
        if !a.breaks.is_empty() {
            let lost: Vec<String> = a
                .breaks
                .iter()
                .map(|l| format!("{} {}", query_text(l.query), plain(&limit_text(l, l.query.figure.dimension_in(stage.kind)))))
                .collect();
            pieces.push(format!("breaks {}", lost.join(", ")));
        }
        if !a.undetermined.is_empty() {
            let file = of.team.shelf.find(&a.part).map_or("", |p| p.file.as_str());
            let missing: Vec<String> = a.missing.iter().map(|n| need_text(*n, file)).collect();
            let lost: Vec<String> = a.undetermined.iter().map(|l| query_text(l.query)).collect();
            pieces.push(format!("not judged {}: needs {}", lost.join(", "), plain(&missing.join("; "))));
        }
        let space = " ".repeat(width - a.part.chars().count());
        writeln!(
            text,
            "  {}{}  {}{space}{own}  {}",
            paint(word, ink, colour),
            " ".repeat(12 - word.len()),
            plain(&a.part),
            pieces.join("; ")
        )
        .expect("a string takes all");
    }
    let hidden = list.iter().enumerate().filter(|x| !shown(x)).count();
    if hidden > 0 {
        writeln!(text, "  {hidden} more (--all)").expect("a string takes all");
    }
    text.push('\n');
    text
}

fn closing(stages: &[AskedStage], ranked: &[Vec<Alternate>], stuck: &[&AskedStage], colour: bool) -> String {
    let mut text = String::new();
    if stages.len() > 1 {
        // Which parts serve everywhere.
        let mut served: Vec<(&str, usize)> = Vec::new();
        for a in ranked.iter().flatten() {
            match served.iter_mut().find(|(part, _)| *part == a.part) {
                Some((_, count)) => *count += usize::from(a.survives()),
                None => served.push((&a.part, usize::from(a.survives()))),
            }
        }
        served.sort_by(|a, b| b.1.cmp(&a.1).then(a.0.cmp(b.0)));
        for (part, count) in served.iter().filter(|(_, count)| *count > 0) {
            writeln!(text, "{}  keeps every limit in {count} of {} stages", plain(part), stages.len()).expect("a string takes all");
        }
    }
    if stuck.is_empty() {
        if !stages.is_empty() {
            let words =
                if stages.len() == 1 { "another part keeps every limit" } else { "every stage has another part that keeps its limits" };
            writeln!(text, "{}", paint(words, Ink::Good, colour)).expect("a string takes all");
        }
    } else {
        let names: Vec<String> = stuck.iter().map(|s| plain(&s.stage.block.stage.name)).collect();
        writeln!(text, "{}: {}", paint("no other part of the shelf keeps every limit", Ink::Bad, colour), names.join(", "))
            .expect("a string takes all");
    }
    text
}
