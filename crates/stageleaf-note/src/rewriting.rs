//! One value of a block changed, everything else kept as the author wrote it.

use std::ops::Range;

use toml::de::{DeTable, DeValue};

use crate::table::{toml_key, toml_string};

/// The text with one value replaced.
pub fn replaced(text: &str, whole: &Range<usize>, value: &str) -> String {
    format!("{}{}{}", &text[..whole.start], toml_string(value), &text[whole.end..])
}

/// The text with a value added at `path`, in the first of the places below where the result reads back as wanted.
pub fn added(text: &str, path: &str, value: &str) -> String {
    let (table, key) = path.split_once('.').map_or((None, path), |(t, k)| (Some(t), k));
    let line = format!("{} = {}", toml_key(key), toml_string(value));
    let candidates: [Option<String>; 4] = match table {
        None => [Some(before_tables(text, &line)), None, None, None],
        Some(table) => [
            in_table(text, table, &line),
            in_inline_table(text, table, &line),
            Some(before_tables(text, &format!("{}.{line}", toml_key(table)))).filter(|_| is_dotted(text, table)),
            Some(format!("{}{}[{}]\n{line}\n", text, if text.is_empty() || text.ends_with('\n') { "\n" } else { "\n\n" }, toml_key(table))),
        ],
    };
    let reads = |candidate: &String| {
        let (document, errors) = DeTable::parse_recoverable(candidate);
        let holder = match table {
            None => Some(document.get_ref()),
            Some(table) => document.get_ref().get(table).and_then(|t| t.get_ref().as_table()),
        };
        errors.is_empty() && holder.and_then(|t| t.get(key)).and_then(|v| v.get_ref().as_str()) == Some(value)
    };
    candidates.into_iter().flatten().find(reads).unwrap_or_else(|| text.to_owned())
}

/// At the end of the keys that stand before the first table.
fn before_tables(text: &str, line: &str) -> String {
    let first = table_headers(text).next().map_or(text.len(), |(range, _)| range.start);
    inserted(text, 0..first, line)
}

/// At the end of the table's keys.
fn in_table(text: &str, table: &str, line: &str) -> Option<String> {
    let mut headers = table_headers(text).skip_while(|(_, name)| *name != table);
    let (header, _) = headers.next()?;
    let next = headers.next().map_or(text.len(), |(range, _)| range.start);
    Some(inserted(text, header.end..next, line))
}

fn in_inline_table(text: &str, table: &str, line: &str) -> Option<String> {
    let (document, _) = DeTable::parse_recoverable(text);
    let value = document.get_ref().get(table)?;
    let span = value.span();
    let inner = text.get(span.clone())?.strip_suffix('}')?;
    let empty = matches!(value.get_ref(), DeValue::Table(t) if t.is_empty());
    let comma = if empty { "" } else { "," };
    Some(format!("{}{}{comma} {line} }}{}", &text[..span.start], inner.trim_end(), &text[span.end..]))
}

fn is_dotted(text: &str, table: &str) -> bool {
    text.lines()
        .take_while(|l| !l.starts_with('['))
        .any(|l| l.trim_start().strip_prefix(table).is_some_and(|r| r.trim_start().starts_with('.')))
}

/// Behind the last line of the section that is neither empty nor a remark about what follows.
fn inserted(text: &str, section: Range<usize>, line: &str) -> String {
    let kept = text[section.clone()].trim_end();
    let mut at = section.start + kept.len();
    let mut lead = "\n";
    if kept.is_empty() {
        lead = if section.start == 0 { "" } else { "\n" };
        at = section.start;
    }
    let rest = &text[at..];
    let tail = if rest.is_empty() || !rest.starts_with(['\n', '\r']) { "\n" } else { "" };
    format!("{}{lead}{line}{tail}{rest}", &text[..at])
}

/// Header lines `[name]` with their bytes (to the end of the line, without its end) and names.
fn table_headers(text: &str) -> impl Iterator<Item = (Range<usize>, &str)> {
    let mut start = 0;
    text.split_inclusive('\n').filter_map(move |whole| {
        let at = start;
        start += whole.len();
        let line = whole.trim_end_matches(['\n', '\r']);
        let name = line.trim_start().strip_prefix('[')?.split_once(']')?.0;
        Some((at..at + line.len(), name.trim().trim_matches(['"', '\''])))
    })
}
