//! TOML with the place of every key and value, and the problems found on the way.

use std::{borrow::Cow, ops::Range};

use toml::{
    Spanned,
    de::{DeTable, DeValue},
};

use crate::{
    block::{Field, Place},
    place::Lines,
    problem::{Problem, cut, nearest, quoted},
    quantity::Trouble,
};

/// More problems than this in one text are counted, not listed.
const LISTED: usize = 200;

/// A key with its value.
#[derive(Clone, Copy)]
pub struct Entry<'t> {
    pub key: &'t str,
    pub key_start: usize,
    pub key_end: usize,
    pub value: &'t Spanned<DeValue<'t>>,
}

impl Entry<'_> {
    pub const fn key_range(&self) -> Range<usize> {
        self.key_start..self.key_end
    }
}

/// The text of a value, and where it stands.
pub struct Text<'t> {
    pub text: Cow<'t, str>,
    /// Without quotes.
    pub content: Range<usize>,
    /// With quotes.
    pub whole: Range<usize>,
}

/// A text being read: where it stands, its values, its problems.
pub struct Reader<'a> {
    text: &'a str,
    place: &'a Place,
    lines: Lines<'a>,
    pub fields: Vec<Field>,
    problems: Vec<Problem>,
    unlisted: usize,
    /// Lines (of the text, in order) that TOML could not read: what is missing may stand there.
    broken: Vec<usize>,
}

/// A table's keys in the order of the text.
pub fn entries<'t>(table: &'t DeTable<'_>) -> Vec<Entry<'t>> {
    let mut entries: Vec<Entry<'t>> =
        table.iter().map(|(k, v)| Entry { key: k.get_ref(), key_start: k.span().start, key_end: k.span().end, value: v }).collect();
    entries.sort_by_key(|e| e.key_start);
    entries
}

impl<'a> Reader<'a> {
    pub fn new(text: &'a str, place: &'a Place) -> Self {
        Self { text, place, lines: Lines::of(text), fields: Vec::new(), problems: Vec::new(), unlisted: 0, broken: Vec::new() }
    }

    /// The table of the whole text, as far as it can be read.
    pub fn document(&mut self) -> Spanned<DeTable<'a>> {
        let (table, errors) = DeTable::parse_recoverable(self.text);
        let mut last_line = 0;
        for error in errors {
            let span = error.span().unwrap_or(0..0);
            let line = self.lines.position(span.start).0;
            // What follows on the same line is mostly an echo of the first.
            if line != last_line {
                if let Err(at) = self.broken.binary_search(&line) {
                    self.broken.insert(at, line);
                }
                self.syntax(error.message(), span);
            }
            last_line = line;
        }
        table
    }

    /// Whether some line could not be read at all.
    pub fn is_broken(&self) -> bool {
        !self.broken.is_empty()
    }

    pub fn has_problems(&self) -> bool {
        !self.problems.is_empty()
    }

    /// All problems, in the order of the text.
    pub fn into_problems(mut self) -> Vec<Problem> {
        self.problems.sort_by_key(|p| (p.line, p.column));
        if let Some(last) = self.problems.last().filter(|_| self.unlisted > 0) {
            let message = format!("{} more problems are not listed", self.unlisted);
            let more = Problem { message, allowed: None, attempt: None, ..last.clone() };
            self.problems.push(more);
        }
        self.problems
    }

    /// Line and column in the file of a byte of the text.
    pub fn position(&self, offset: usize) -> (usize, usize) {
        let (line, column) = self.lines.position(offset);
        let prefix = self.place.prefixes.get(line - 1).map_or(0, |p| p.chars().count());
        (self.place.first_line + line - 1, column + prefix)
    }

    pub fn problem(&mut self, range: Range<usize>, message: impl Into<String>, allowed: impl Into<String>, attempt: Option<String>) {
        // A line that TOML could not read has its problem already.
        if self.broken.binary_search(&self.lines.position(range.start).0).is_err() {
            self.tell(range, message.into(), allowed.into(), attempt);
        }
    }

    fn tell(&mut self, range: Range<usize>, message: String, allowed: String, attempt: Option<String>) {
        if self.problems.len() >= LISTED {
            self.unlisted += 1;
            return;
        }
        let (line, column) = self.position(range.start);
        let (own_line, own_column) = self.lines.position(range.start);
        let on_line = self.lines.range(own_line);
        let start = range.start.clamp(on_line.start, on_line.end);
        let end = range.end.clamp(start, on_line.end);
        let length = self.text.get(start..end).map_or(1, |t| t.chars().count()).max(1);
        let (shown, first) = cut(&self.text[on_line.clone()], start - on_line.start, own_column);
        let prefix = self.place.prefixes.get(own_line - 1).map_or("", String::as_str);
        let (line_text, line_text_column) = if first == 1 { (format!("{prefix}{shown}"), 1) } else { (shown, first + column - own_column) };
        let file = self.place.file.clone();
        let problem = Problem { file, line, column, length, line_text, line_text_column, message, allowed: None, attempt };
        self.problems.push(problem.allowed(allowed));
    }

    /// A key that is not there. Silent while a broken line may hold it.
    pub fn missing(&mut self, range: Range<usize>, message: impl Into<String>, allowed: impl Into<String>) {
        if !self.is_broken() {
            self.problem(range, message, allowed, None);
        }
    }

    /// A key that has no meaning here.
    pub fn unknown(&mut self, entry: &Entry<'_>, message: String, names: &[&str]) {
        if self.problems.len() >= LISTED {
            self.unlisted += 1;
            return;
        }
        let list: Vec<String> = names.iter().map(|n| format!("`{n}`")).collect();
        let near = nearest(entry.key, names.iter().copied()).map(str::to_owned);
        self.problem(entry.key_range(), message, list.join(", "), near);
    }

    /// The value as text. A bare number is taken as it is written, so that `resistance = 600` reads as `"600"`.
    pub fn text<'t>(&mut self, entry: &Entry<'t>, path: &str) -> Option<Text<'t>>
    where
        'a: 't,
    {
        let whole = entry.value.span();
        let source = self.text.get(whole.clone()).unwrap_or("");
        let text = match entry.value.get_ref() {
            DeValue::String(s) => {
                let quotes = if source.starts_with("\"\"\"") || source.starts_with("'''") {
                    3
                } else {
                    usize::from(source.starts_with(['"', '\'']))
                };
                let content = whole.start + quotes..whole.end.saturating_sub(quotes).max(whole.start + quotes);
                Text { text: Cow::Borrowed(&**s), content, whole }
            }
            DeValue::Integer(_) | DeValue::Float(_) => Text { text: Cow::Borrowed(source), content: whole.clone(), whole },
            _ => {
                let message = format!("`{}` takes text in quotes; {} was given", shown(entry.key), kind(entry.value.get_ref()));
                self.problem(whole, message, "", None);
                return None;
            }
        };
        let (line, column) = self.position(text.content.start);
        self.fields.push(Field {
            path: path.to_owned(),
            text: text.text.clone().into_owned(),
            span: text.content.clone(),
            whole: text.whole.clone(),
            line,
            column,
        });
        Some(text)
    }

    /// The value read by `parse`; its trouble becomes a problem "`key` takes …; …".
    pub fn read<T>(&mut self, entry: &Entry<'a>, path: &str, takes: &str, parse: impl FnOnce(&str) -> Result<T, Trouble>) -> Option<T> {
        let text = self.text(entry, path)?;
        match parse(&text.text) {
            Ok(value) => Some(value),
            Err(trouble) => {
                self.trouble(entry.key, &text, &format!("`{}` {takes}", shown(entry.key)), trouble);
                None
            }
        }
    }

    /// A trouble with a value as a problem, in the place that is meant.
    pub fn trouble(&mut self, key: &str, text: &Text<'_>, subject: &str, trouble: Trouble) {
        let verbatim = self.text.get(text.content.clone()) == Some(&*text.text);
        let all = trouble.range == (0..text.text.len()) || trouble.range.is_empty();
        let range = if verbatim && !all {
            text.content.start + trouble.range.start..text.content.start + trouble.range.end
        } else {
            text.whole.clone()
        };
        let attempt = trouble.attempt.map(|a| format!("{} = {}", toml_key(key), toml_string(&a)));
        self.problem(range, format!("{subject}; {}", trouble.message), trouble.allowed, attempt);
    }

    /// The value as a table.
    pub fn table<'t>(&mut self, entry: &Entry<'t>) -> Option<&'t DeTable<'t>> {
        self.table_called(entry.key, entry)
    }

    /// The value as a table whose header is `[name]`.
    pub fn table_called<'t>(&mut self, name: &str, entry: &Entry<'t>) -> Option<&'t DeTable<'t>> {
        if let DeValue::Table(table) = entry.value.get_ref() {
            return Some(table);
        }
        let message = format!("`{}` is a table; {} was given", shown(entry.key), kind(entry.value.get_ref()));
        self.problem(entry.value.span(), message, format!("`[{}]` on a line of its own, its keys below", shown(name)), None);
        None
    }

    /// One of a few words.
    pub fn word<'t>(&mut self, entry: &Entry<'t>, path: &str, words: &[&'static str]) -> Option<&'static str>
    where
        'a: 't,
    {
        let text = self.text(entry, path)?;
        if let Some(word) = words.iter().find(|w| **w == text.text) {
            return Some(word);
        }
        let list: Vec<String> = words.iter().map(|w| format!("`{w}`")).collect();
        let attempt = nearest(&text.text, words.iter().copied()).map(|w| format!("{} = {}", toml_key(entry.key), toml_string(w)));
        self.problem(text.whole, format!("`{}` cannot be {}", shown(entry.key), quoted(&text.text)), list.join(", "), attempt);
        None
    }

    fn syntax(&mut self, said: &str, mut span: Range<usize>) {
        if self.problems.len() >= LISTED {
            self.unlisted += 1;
            return;
        }
        let (own_line, _) = self.lines.position(span.start);
        let on_line = self.lines.range(own_line);
        let given = self.text.get(span.clone()).unwrap_or("").lines().next().unwrap_or("");
        let before = self.text.get(on_line.start..span.start.max(on_line.start)).unwrap_or("");
        let key = before.trim_end().strip_suffix('=').map(str::trim);
        let (message, allowed, attempt) = if said.starts_with("string values must be quoted") {
            let bare = given.trim_matches(['“', '”', '„', '"', '\'', '‘', '’', ' ']);
            match bare {
                "" => ("there is no value".to_owned(), "text in double quotes", None),
                _ => {
                    let attempt = format!("{} = {}", key.unwrap_or("…"), toml_string(bare));
                    (format!("{} stands without straight quotes", quoted(given)), "text in double quotes", Some(attempt))
                }
            }
        } else if said == "duplicate key" {
            (format!("`{}` is given twice", shown(given.trim_matches('"'))), "each key and each table once", None)
        } else if said.starts_with("key with no value") || said.starts_with("invalid unquoted key") {
            let line = &self.text[on_line.clone()];
            match line.split_once('=') {
                Some((name, value)) => {
                    let name = name.trim();
                    let attempt = format!("{} = {}", toml_string(name), value.trim());
                    self.tell(
                        on_line.start..on_line.start + name.len(),
                        format!("{} needs quotes as a key", quoted(name)),
                        "letters, digits, `-`, `_`; a key with anything else stands in double quotes".into(),
                        Some(attempt),
                    );
                    return;
                }
                None => ("there is no `=` behind the key".to_owned(), "`key = \"value\"`, `[table]`, or `# remark`", None),
            }
        } else if said.starts_with("unclosed table") {
            ("the table's name has no closing bracket".to_owned(), "`[table]` on a line of its own", None)
        } else if said.contains("string, expected `\"`") || said.contains("string, expected `'`") {
            ("the text has no closing quote".to_owned(), "text in double quotes, on one line", None)
        } else if said.starts_with("unexpected key or value") {
            let rest = self.text.get(span.start..on_line.end).unwrap_or("").trim_end();
            span.end = span.start + rest.len();
            (format!("{} stands behind the value", quoted(rest)), "one value, then the end of the line or `# remark`", None)
        } else {
            let plain = said.replace("invalid ", "unreadable ");
            (format!("this is not TOML: {plain}"), "`key = \"value\"`, `[table]`, or `# remark`", None)
        };
        self.tell(span, message, allowed.into(), attempt);
    }
}

/// A key as a message shows it, cut and with control characters marked.
pub fn shown(key: &str) -> Cow<'_, str> {
    if key.len() <= 60 && !key.chars().any(char::is_control) {
        Cow::Borrowed(key)
    } else {
        Cow::Owned(quoted(key).trim_matches('"').to_owned())
    }
}

/// A key as TOML writes it.
pub fn toml_key(key: &str) -> String {
    let bare = !key.is_empty() && key.bytes().all(|b| b.is_ascii_alphanumeric() || b == b'-' || b == b'_');
    if bare { key.to_owned() } else { toml_string(key) }
}

/// A text as a TOML string, on one line.
pub fn toml_string(text: &str) -> String {
    let mut out = String::with_capacity(text.len() + 2);
    out.push('"');
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            '\t' => out.push_str("\\t"),
            c if c.is_control() => out.push_str(&format!("\\u{:04X}", u32::from(c))),
            c => out.push(c),
        }
    }
    out.push('"');
    out
}

fn kind(value: &DeValue<'_>) -> &'static str {
    match value {
        DeValue::String(_) => "text",
        DeValue::Integer(_) | DeValue::Float(_) => "a number",
        DeValue::Boolean(_) => "true or false",
        DeValue::Datetime(_) => "a date or time",
        DeValue::Array(_) => "a list",
        DeValue::Table(_) => "a table",
    }
}
