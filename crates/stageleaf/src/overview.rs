//! `overview`: a chapter with every stage of the notes, what is nearest to breaking first.

use std::{
    fmt::Write as _,
    path::{Path, PathBuf},
};

use clap::Args;
use stageleaf_math::{
    limit::{Basis, Verdict},
    report::LimitRow,
    search::{alternates::forbids, closeness},
};
use stageleaf_note::{query_anchor, query_text, slug};

use crate::{
    asked::{self, AskedStage},
    check::{Ending, ExaminedStage, margin_text, outcome_words},
    embed::escape,
    terminal::Terminal,
    walk::show,
};

/// What `overview` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Notes, and folders in which every `.md` file is a note
    #[arg(required = true, value_name = "PATH")]
    pub paths: Vec<PathBuf>,
    /// The folder that the chapter will stand in: links to the notes start there
    #[arg(long, value_name = "DIR")]
    pub from: Option<PathBuf>,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// Prints the chapter.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let asked = asked::stages(&options.paths, None, options.shelf.as_deref());
    for fault in &asked.faults {
        terminal.complain(&format!("{fault}\n"));
    }
    terminal.out(&chapter(&asked.stages, options.from.as_deref()));
    if asked.faults.is_empty() { Ending::Good } else { Ending::BadInput }
}

/// A stage's worst: how close, and which limit.
struct Standing<'a> {
    of: &'a AskedStage,
    /// What is lost or cannot be judged comes first: below every margin.
    rank: (u8, f64),
    row: Option<&'a LimitRow>,
}

fn standing(of: &AskedStage) -> Standing<'_> {
    let judged = of.stage.limits().iter().filter(|r| r.verdict != Verdict::Reported);
    let order = |r: &LimitRow| match r.verdict {
        Verdict::Breaks => 1,
        Verdict::Undetermined => 2,
        Verdict::Thin => 3,
        Verdict::Holds | Verdict::Reported => 4,
    };
    let row = judged.min_by(|a, b| order(a).cmp(&order(b)).then(closeness(a).total_cmp(&closeness(b))));
    let rank = match row {
        _ if of.stage.report.cautions.iter().any(forbids) => (0, 0.0),
        Some(row) => (order(row), closeness(row)),
        None => (5, 0.0),
    };
    Standing { of, rank, row }
}

/// The chapter's Markdown; the table is HTML, so that no text of a note is read as Markdown.
#[must_use]
pub fn chapter(stages: &[AskedStage], from: Option<&Path>) -> String {
    let mut all: Vec<Standing<'_>> = stages.iter().map(standing).collect();
    all.sort_by(|a, b| a.rank.0.cmp(&b.rank.0).then(a.rank.1.total_cmp(&b.rank.1)));
    let mut text = String::from(
        "# Overview\n\nEvery stage of the notes, what is nearest to breaking first. A margin is told in the figure's unit and, in brackets, \
         as a multiple of what counts as thin for that limit. Typical: the verdict rests on figures that no data sheet guarantees.\n\n",
    );
    text.push_str(
        "<table class=\"overview\"><thead><tr><th scope=\"col\">Stage</th><th scope=\"col\">Part</th><th scope=\"col\">Verdicts</th>\
         <th scope=\"col\">Nearest to breaking</th><th scope=\"col\">Basis</th></tr></thead><tbody>",
    );
    for standing in &all {
        row(&mut text, standing, from);
    }
    text.push_str("</tbody></table>\n");
    text
}

fn row(text: &mut String, standing: &Standing<'_>, from: Option<&Path>) {
    let stage = &standing.of.stage;
    let name = &stage.block.stage.name;
    let link = |anchor: &str| {
        let file = relative(&standing.of.file, from);
        escape(&format!("{file}#{anchor}"))
    };
    let nearest = match standing.row {
        _ if standing.rank.0 == 0 => "cannot work as stated".to_owned(),
        None => "no limits".to_owned(),
        Some(row) => {
            let id = format!("{}.{}", slug(name), query_anchor(row.limit.query));
            let figure = format!("<a href=\"{}\"><code>{}</code></a>", link(&id), escape(&query_text(row.limit.query)));
            match (row.verdict, margin_text(row)) {
                (Verdict::Undetermined, _) => {
                    format!("{figure} undetermined: {}", escape(&outcome_words(&row.worst, row.dimension, &stage.part_file)))
                }
                (_, Some(margin)) => {
                    let times = format!("{:.1}", closeness(row)).replace('-', "−");
                    format!("{figure} {} ({times} × thin)", escape(&margin))
                }
                (_, None) => format!("{figure} {}", escape(&outcome_words(&row.worst, row.dimension, &stage.part_file))),
            }
        }
    };
    let place = link(&slug(name));
    write!(
        text,
        "<tr><th scope=\"row\"><a href=\"{place}\">{}</a></th><td>{}</td><td>{}</td><td>{nearest}</td><td>{}</td></tr>",
        escape(name),
        escape(&stage.block.stage.part.id),
        verdicts(stage),
        bases(stage)
    )
    .expect("a string takes all");
}

fn verdicts(stage: &ExaminedStage) -> String {
    let of = |verdict: Verdict| stage.limits().iter().filter(|l| l.verdict == verdict).count();
    let words: Vec<String> =
        [(Verdict::Breaks, "break"), (Verdict::Undetermined, "undetermined"), (Verdict::Thin, "thin"), (Verdict::Holds, "hold")]
            .into_iter()
            .filter(|(v, _)| of(*v) > 0)
            .map(|(v, word)| if v == Verdict::Holds { format!("{} {word}", of(v)) } else { format!("<strong>{} {word}</strong>", of(v)) })
            .collect();
    words.join(", ")
}

/// How many limits rest on figures that are only typical.
fn bases(stage: &ExaminedStage) -> String {
    let of = |basis: Basis| stage.limits().iter().filter(|l| l.basis == Some(basis)).count();
    let words: Vec<String> = [Basis::Guaranteed, Basis::Mixed, Basis::Typical]
        .into_iter()
        .filter(|b| of(*b) > 0)
        .map(|b| format!("{} {}", of(b), b.word()))
        .collect();
    words.join(", ")
}

/// A note's path as a link from the folder of the chapter.
fn relative(file: &str, from: Option<&Path>) -> String {
    let Some(from) = from else { return file.to_owned() };
    let from = show(from);
    let ours: Vec<&str> = from.split('/').filter(|p| !p.is_empty() && *p != ".").collect();
    let theirs: Vec<&str> = file.split('/').filter(|p| !p.is_empty() && *p != ".").collect();
    let same = ours.iter().zip(&theirs).take_while(|(a, b)| a == b).count();
    let up = std::iter::repeat_n("..", ours.len() - same);
    up.chain(theirs[same..].iter().copied()).collect::<Vec<_>>().join("/")
}
