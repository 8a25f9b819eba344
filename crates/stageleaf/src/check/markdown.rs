//! `check --format markdown`: a summary for a review, small enough to be read: what somebody has to look at, worst first, in a table.

use std::fmt::Write as _;

use super::{
    Counts,
    findings::{Finding, Weight},
    text,
};

/// Rows of the table.
const SHOWN: usize = 20;

/// The summary.
#[must_use]
pub fn text(found: &[Finding], counts: &Counts) -> String {
    let mut all = format!("**Stages:** {}\n", escaped(text::closing(counts, false).trim_end()));
    if found.is_empty() {
        return all;
    }
    all.push_str("\n| | where | what | why |\n|---|---|---|---|\n");
    for finding in found.iter().take(SHOWN) {
        let word = match finding.weight {
            Weight::Error => "fails",
            Weight::Warning => "thin",
        };
        let place = finding.place.map_or(String::new(), |(line, _)| format!(":{line}"));
        let (file, title, message) = (escaped(&finding.file), escaped(&finding.title), escaped(&finding.message));
        writeln!(all, "| {word} | {file}{place} | {title} | {message} |").expect("a string takes all");
    }
    if found.len() > SHOWN {
        writeln!(all, "\n{} more: \\`stageleaf check\\` lists all.", found.len() - SHOWN).expect("a string takes all");
    }
    all
}

/// Text that stays text: no markup, no cell's end, no mention of a person.
fn escaped(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 8);
    let mut rest = text.chars().peekable();
    while let Some(c) = rest.next() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '@' => out.push_str("&#64;"),
            '\n' | '\r' => out.push(' '),
            '\\' | '`' | '*' | '_' | '[' | ']' | '|' | '~' | '#' | '!' | '$' | '(' | ')' => {
                out.push('\\');
                out.push(c);
            }
            // An address would become a link.
            ':' if rest.peek().is_some_and(|next| !next.is_whitespace()) => out.push_str("&#58;"),
            _ => out.push(c),
        }
    }
    out
}
