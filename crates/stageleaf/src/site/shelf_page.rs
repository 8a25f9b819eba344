//! The chapter about the shelf: every part with its figures as stated, their basis and source.

use std::{fmt::Write as _, path::Path};

use stageleaf_math::part::{PartFigure, Rating};
use stageleaf_note::{Shelf, ShelfPart, format};

use crate::embed::escape;

/// The chapter's Markdown; tables are HTML, so that no text of a part file is read as Markdown.
pub fn chapter(shelf: &Shelf, root: &Path) -> String {
    let mut text = String::from(
        "# Part shelf\n\nThe amplifiers that the notes may use, as their part files state them. A figure that is not stated is not guessed: what needs it stays undetermined.\n",
    );
    for entry in &shelf.parts {
        part(&mut text, entry, root);
    }
    text
}

// Writing into a string cannot fail: the results of `write!` are dropped.
fn part(text: &mut String, entry: &ShelfPart, root: &Path) {
    let part = &entry.part;
    let id = escape(&part.id);
    let _ = write!(text, "\n<h2 id=\"part-{id}\">{}</h2>\n\n", escape(&part.name));
    let words: Vec<String> = [part.description.as_deref(), part.source.as_deref()].into_iter().flatten().map(escape).collect();
    let file = Path::new(&entry.file).strip_prefix(root).map_or_else(|_| entry.file.clone(), |p| p.display().to_string());
    let _ = write!(
        text,
        "<p>{} Part file: <code>{}</code>.</p>\n\n",
        words.join(". ").replace("..", ".") + if words.is_empty() { "" } else { "." },
        escape(&file)
    );
    text.push_str("<table class=\"shelf\"><thead><tr><th scope=\"col\">Figure</th><th scope=\"col\">Least</th><th scope=\"col\">Typical</th><th scope=\"col\">Greatest</th><th scope=\"col\">Source</th></tr></thead><tbody>");
    for figure in PartFigure::ALL {
        let rating = part.rating(*figure);
        if rating.is_empty() {
            continue;
        }
        row(text, *figure, rating);
    }
    text.push_str("</tbody></table>\n");
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
