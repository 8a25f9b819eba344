//! The chapter about the shelf: every part with its figures as stated, their basis and source.

use std::fmt::Write as _;

use stageleaf_math::part::{PartFigure, Rating};
use stageleaf_note::{Shelf, ShelfPart, format, slug};

use crate::{asked::AskedStage, embed::escape};

/// The chapter's Markdown; tables are HTML, so that no text of a part file is read as Markdown.
pub fn chapter(shelf: &Shelf, stages: &[AskedStage]) -> String {
    let mut text = String::from(
        "# Part shelf\n\nThe amplifiers that the notes may use, as their part files state them. A figure that is not stated is not guessed: what needs it stays undetermined.\n",
    );
    for entry in &shelf.parts {
        part(&mut text, entry, stages);
    }
    text
}

// Writing into a string cannot fail: the results of `write!` are dropped.
fn part(text: &mut String, entry: &ShelfPart, stages: &[AskedStage]) {
    let part = &entry.part;
    let id = escape(&part.id);
    let _ = write!(text, "\n<h2 id=\"part-{id}\">{}</h2>\n\n", escape(&part.name));
    let words: Vec<String> = [part.description.as_deref(), part.source.as_deref()].into_iter().flatten().map(escape).collect();
    let _ = write!(
        text,
        "<p>{} Part file: <code>{}</code>.</p>\n\n",
        words.join(". ").replace("..", ".") + if words.is_empty() { "" } else { "." },
        escape(&entry.file)
    );
    let _ = write!(text, "<p>{}</p>\n\n", used(&part.id, stages));
    text.push_str("<table class=\"shelf\"><thead><tr><th scope=\"col\">Figure</th><th scope=\"col\">Least</th><th scope=\"col\">Typical</th><th scope=\"col\">Greatest</th><th scope=\"col\">Source</th></tr></thead><tbody>");
    for figure in PartFigure::ALL {
        let rating = part.rating(*figure);
        if rating.is_empty() {
            continue;
        }
        row(text, *figure, rating);
    }
    text.push_str("</tbody></table>\n");
    let missing: Vec<&str> = PartFigure::ALL.iter().filter(|f| part.rating(**f).is_empty()).map(|f| f.meaning()).collect();
    if !missing.is_empty() {
        let _ = write!(text, "\n<p>Not stated: {}.</p>\n", escape(&missing.join(", ")));
    }
}

/// Where a part stands in the notes.
fn used(id: &str, stages: &[AskedStage]) -> String {
    let links: Vec<String> = stages
        .iter()
        .filter(|s| s.stage.block.stage.part.id == id || s.stage.block.stage.parts.iter().any(|(_, p)| p.id == id))
        .map(|s| {
            let file = s.file.rsplit('/').next().unwrap_or(&s.file);
            let name = &s.stage.block.stage.name;
            format!("<a href=\"{}\">{}</a>", escape(&format!("{file}#{}", slug(name))), escape(name))
        })
        .collect();
    if links.is_empty() { "In no note.".to_owned() } else { format!("In {}.", links.join(", ")) }
}

fn row(text: &mut String, figure: PartFigure, rating: &Rating) {
    let cell = |value: Option<f64>| value.map_or_else(String::new, |v| escape(&format(v, figure.dimension(), 3)));
    let _ = write!(
        text,
        "<tr><th scope=\"row\">{}</th><td>{}</td><td>{}</td><td>{}</td><td>{}</td></tr>",
        escape(figure.meaning()),
        cell(rating.min),
        cell(rating.typ),
        cell(rating.max),
        escape(rating.source.as_deref().unwrap_or(""))
    );
}
