//! What is wrong with a text: where, what was given, what is allowed, what to try.

use std::fmt;

use crate::{letters::lower, place::Lines};

/// Characters of a line that a problem carries; a longer line is cut around the place.
const SHOWN: usize = 160;

/// Something wrong with a note, a part file or the settings. Lines and columns count from 1, in characters.
///
/// `Display` gives
///
/// ```text
/// notes/cable.md:31:1: no figure is called `phase_margn`
///   31 | phase_margn = "at least 50 °"
///      | ^^^^^^^^^^^
/// allowed: a figure id, with its frequency where it takes one (`gain_at 20 kHz`)
/// try: phase_margin
/// ```
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Problem {
    /// The file, as it was named to the reader.
    pub file: String,
    /// Line in the file.
    pub line: usize,
    /// Column in the file.
    pub column: usize,
    /// How many characters are meant; at least 1.
    pub length: usize,
    /// The line as it stands in the file, cut where it is very long.
    pub line_text: String,
    /// Column of the first character of `line_text`: 1 unless a very long line was cut.
    pub line_text_column: usize,
    /// What was given and what is wrong with it.
    pub message: String,
    /// What is allowed there.
    pub allowed: Option<String>,
    /// What to try.
    pub attempt: Option<String>,
}

impl Problem {
    /// A problem at a byte offset of a file whose lines are known, `bytes` long (not beyond the line's end).
    #[must_use]
    pub fn at(file: &str, text: &str, lines: &Lines<'_>, offset: usize, bytes: usize, message: String) -> Self {
        let (line, column) = lines.position(offset);
        let whole = lines.range(line);
        let start = offset.clamp(whole.start, whole.end);
        let end = offset.saturating_add(bytes).clamp(start, whole.end);
        let length = text.get(start..end).map_or(1, |t| t.chars().count()).max(1);
        let (line_text, line_text_column) = cut(&text[whole.clone()], start - whole.start, column);
        Self { file: file.to_owned(), line, column, length, line_text, line_text_column, message, allowed: None, attempt: None }
    }

    /// A problem on a line whose text is known.
    #[must_use]
    pub fn on_line(file: &str, line: usize, column: usize, length: usize, line_text: &str, message: String) -> Self {
        let offset = line_text.char_indices().nth(column.saturating_sub(1)).map_or(line_text.len(), |(i, _)| i);
        let (line_text, line_text_column) = cut(line_text, offset, column);
        Self {
            file: file.to_owned(),
            line,
            column,
            length: length.max(1),
            line_text,
            line_text_column,
            message,
            allowed: None,
            attempt: None,
        }
    }

    /// The same, saying what is allowed.
    #[must_use]
    pub fn allowed(mut self, allowed: impl Into<String>) -> Self {
        self.allowed = Some(allowed.into()).filter(|a| !a.is_empty());
        self
    }

    /// The same, saying what to try.
    #[must_use]
    pub fn attempt(mut self, attempt: Option<String>) -> Self {
        self.attempt = attempt;
        self
    }
}

impl fmt::Display for Problem {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let line = self.line.to_string();
        let text = printable(&self.line_text);
        let width = text.chars().count();
        let before = self.column.saturating_sub(self.line_text_column).min(width);
        let carets = self.length.clamp(1, (width - before).max(1));
        writeln!(f, "{}:{}:{}: {}", printable(&self.file), self.line, self.column, printable(&self.message))?;
        writeln!(f, "  {line} | {text}")?;
        write!(f, "  {:pad$} | {:before$}{:^>carets$}", "", "", "", pad = line.len())?;
        if let Some(allowed) = &self.allowed {
            write!(f, "\nallowed: {}", printable(allowed))?;
        }
        if let Some(attempt) = &self.attempt {
            write!(f, "\ntry: {}", printable(attempt))?;
        }
        Ok(())
    }
}

/// A line as a problem carries it: whole, or the part around a place of it, with that part's first column. The cost does
/// not grow with the line.
pub(crate) fn cut(line: &str, offset: usize, column: usize) -> (String, usize) {
    if column <= SHOWN * 3 / 4 {
        return (line.chars().take(SHOWN).collect(), 1);
    }
    let offset = (0..=offset.min(line.len())).rev().find(|i| line.is_char_boundary(*i)).unwrap_or(0);
    let before: Vec<char> = line[..offset].chars().rev().take(SHOWN / 2).collect();
    let first = column - before.len();
    (before.iter().rev().copied().chain(line[offset..].chars()).take(SHOWN).collect(), first)
}

/// The user's text in quotes, on one line, at most 60 characters of it.
#[must_use]
pub fn quoted(text: &str) -> String {
    let mut shown: String = text.chars().take(60).collect();
    if shown.len() < text.len() {
        shown.push('…');
    }
    format!("\"{}\"", printable(&shown))
}

/// The name nearest to `given` by edit distance, where one is near enough to be meant.
#[must_use]
pub fn nearest<'a>(given: &str, names: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    if given.is_empty() || given.len() > 80 {
        return None;
    }
    let given: Vec<char> = given.chars().map(lower).collect();
    names
        .into_iter()
        .map(|name| (distance(&given, &name.chars().map(lower).collect::<Vec<_>>()), name))
        .filter(|(d, name)| *d <= 1.max(given.len().max(name.len()) / 3))
        .min_by_key(|(d, _)| *d)
        .map(|(_, name)| name)
}

/// Single-character insertions, deletions, replacements and swaps of neighbours between two words.
fn distance(a: &[char], b: &[char]) -> usize {
    let mut before_last: Vec<usize> = Vec::new();
    let mut last: Vec<usize> = (0..=b.len()).collect();
    for i in 1..=a.len() {
        let mut row = vec![i];
        for j in 1..=b.len() {
            let replace = last[j - 1] + usize::from(a[i - 1] != b[j - 1]);
            let mut best = replace.min(last[j] + 1).min(row[j - 1] + 1);
            if i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] {
                best = best.min(before_last[j - 2] + 1);
            }
            row.push(best);
        }
        before_last = std::mem::replace(&mut last, row);
    }
    last[b.len()]
}

/// Text that a terminal shows as it stands: tabs become spaces, other control and direction characters a mark, so that
/// a hostile file can neither move the cursor nor reverse a line.
fn printable(text: &str) -> String {
    text.chars()
        .map(|c| match c {
            '\t' => ' ',
            '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{2069}' | '\u{feff}' => '\u{fffd}',
            c if c.is_control() => '\u{fffd}',
            c => c,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_layout_is_file_place_message_line_carets_allowed_try() {
        let text = "\n\nx\nRf = \"91k V\"\n";
        let lines = Lines::of(text);
        let problem = Problem::at("notes/hydrophone.md", text, &lines, 9, 7, "`Rf` takes a resistance; \"91k V\" is a voltage".into())
            .allowed("ohms")
            .attempt(Some("Rf = \"91k\"".into()));
        let expected = r#"notes/hydrophone.md:4:6: `Rf` takes a resistance; "91k V" is a voltage
  4 | Rf = "91k V"
    |      ^^^^^^^
allowed: ohms
try: Rf = "91k""#;
        assert_eq!(problem.to_string(), expected);
    }

    #[test]
    fn a_very_long_line_is_cut_around_the_place() {
        let text = format!("{}!{}", "a".repeat(1000), "b".repeat(1000));
        let problem = Problem::at("f", &text, &Lines::of(&text), 1000, 1, "m".into());
        assert_eq!((problem.column, problem.line_text.chars().count()), (1001, 160));
        let shown = problem.to_string();
        let rows: Vec<&str> = shown.lines().collect();
        assert_eq!(rows[1].find('!'), rows[2].find('^'));
    }

    #[test]
    fn control_characters_do_not_reach_a_terminal() {
        let problem = Problem::on_line("f", 1, 1, 1, "a\u{1b}[31m\u{202e}b", "m\u{7}".into());
        assert!(problem.to_string().chars().all(|c| c == '\n' || (!c.is_control() && c != '\u{202e}')));
    }

    #[test]
    fn nearest_finds_slips_and_refuses_strangers() {
        assert_eq!(nearest("phase_margn", ["gain", "phase_margin"]), Some("phase_margin"));
        assert_eq!(nearest("rf", ["Rf", "Rg"]), Some("Rf"));
        assert_eq!(nearest("colour", ["gain", "phase_margin"]), None);
    }
}
