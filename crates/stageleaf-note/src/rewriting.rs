//! One value of a block changed, everything else kept as the author wrote it.

use std::ops::Range;

use toml::de::{DeTable, DeValue};

use crate::table::{toml_key, toml_string};

/// The tables of a block in the order in which a new one stands among them.
const ORDER: &[&str] = &[
    "parts",
    "supply",
    "components",
    "source",
    "signal",
    "reference",
    "load",
    "converter",
    "board",
    "ambient",
    "band",
    "limits",
    "measured",
];

/// Tables that may hold one table for each input.
const BY_INPUT: &[&str] = &["source", "signal"];

/// The text with one value replaced.
pub fn replaced(text: &str, whole: &Range<usize>, value: &str) -> String {
    format!("{}{}{}", &text[..whole.start], toml_string(value), &text[whole.end..])
}

/// The text with a value added at `path`, in the first of the places below where the result reads back as wanted.
pub fn added(text: &str, path: &str, value: &str) -> String {
    let (tables, key) = split(path);
    let line = format!("{} = {}", toml_key(key), toml_string(value));
    let name = tables.iter().map(|t| toml_key(t)).collect::<Vec<_>>().join(".");
    let candidates: Vec<Option<String>> = match tables.as_slice() {
        [] => vec![Some(before_tables(text, &line))],
        [outer, inner @ ..] => vec![
            in_table(text, &tables, &line),
            in_inline_table(text, &tables, &line),
            // `in2.peak = …` under `[signal]`.
            inner
                .first()
                .filter(|inner| is_dotted(text, &[outer], inner))
                .and_then(|inner| in_table(text, &[outer], &format!("{}.{line}", toml_key(inner)))),
            Some(before_tables(text, &format!("{name}.{line}"))).filter(|_| is_dotted(text, &[], outer)),
            Some(with_table(text, outer, &format!("[{name}]\n{line}\n"))),
            Some(format!("{}{}[{name}]\n{line}\n", text, if text.is_empty() || text.ends_with('\n') { "\n" } else { "\n\n" })),
        ],
    };
    let reads = |candidate: &String| {
        let (document, errors) = DeTable::parse_recoverable(candidate);
        let holder = tables.iter().try_fold(document.get_ref(), |t, name| t.get(*name)?.get_ref().as_table());
        errors.is_empty() && holder.and_then(|t| t.get(key)).and_then(|v| v.get_ref().as_str()) == Some(value)
    };
    candidates.into_iter().flatten().find(reads).unwrap_or_else(|| text.to_owned())
}

/// The tables of a path, and its key: `signal.in2.peak`, `limits.gain_at 2.5 MHz`.
fn split(path: &str) -> (Vec<&str>, &str) {
    let Some((table, rest)) = path.split_once('.') else { return (Vec::new(), path) };
    match rest.split_once('.') {
        Some((input, key)) if BY_INPUT.contains(&table) => (vec![table, input], key),
        _ => (vec![table], rest),
    }
}

/// At the end of the keys that stand before the first table.
fn before_tables(text: &str, line: &str) -> String {
    let first = table_headers(text).next().map_or(text.len(), |(range, _)| range.start);
    inserted(text, 0..first, line)
}

/// At the end of the table's keys.
fn in_table(text: &str, tables: &[&str], line: &str) -> Option<String> {
    let mut headers = table_headers(text).skip_while(|(_, name)| name != tables);
    let (header, _) = headers.next()?;
    let next = headers.next().map_or(text.len(), |(range, _)| range.start);
    Some(inserted(text, header.end..next, line))
}

fn in_inline_table(text: &str, tables: &[&str], line: &str) -> Option<String> {
    let (document, _) = DeTable::parse_recoverable(text);
    let (last, outer) = tables.split_last()?;
    let holder = outer.iter().try_fold(document.get_ref(), |t, name| t.get(*name)?.get_ref().as_table())?;
    let value = holder.get(*last)?;
    let span = value.span();
    let inner = text.get(span.clone())?.strip_suffix('}')?;
    let empty = matches!(value.get_ref(), DeValue::Table(t) if t.is_empty());
    let comma = if empty { "" } else { "," };
    Some(format!("{}{}{comma} {line} }}{}", &text[..span.start], inner.trim_end(), &text[span.end..]))
}

/// Whether `key.…` stands among the keys of a table; of none: before the first table.
fn is_dotted(text: &str, tables: &[&str], key: &str) -> bool {
    let mut headers = table_headers(text);
    let start = if tables.is_empty() { Some(0) } else { headers.find(|(_, name)| name == tables).map(|(range, _)| range.end) };
    let Some(start) = start else { return false };
    let end = headers.next().map_or(text.len(), |(range, _)| range.start).max(start);
    text[start..end].lines().any(|l| l.trim_start().strip_prefix(key).is_some_and(|r| r.trim_start().starts_with('.')))
}

/// With a new table behind the last one that comes before it in the usual order; before the first one where none does.
fn with_table(text: &str, outer: &str, table: &str) -> String {
    let rank = |name: &str| ORDER.iter().position(|o| *o == name);
    let Some(own) = rank(outer) else { return String::new() };
    let headers: Vec<(Range<usize>, Vec<&str>)> = table_headers(text).collect();
    let before = headers.iter().rposition(|(_, name)| name.first().and_then(|n| rank(n)).is_some_and(|r| r <= own));
    let (start, next) = match before {
        Some(i) => (headers[i].0.end, headers.get(i + 1)),
        None => (0, headers.first()),
    };
    let at = end_of_keys(text, start..next.map_or(text.len(), |(range, _)| range.start));
    let (head, tail) = (&text[..at], &text[at..]);
    let gap = if head.is_empty() { "" } else { "\n\n" };
    if tail.trim().is_empty() {
        return format!("{head}{gap}{table}");
    }
    format!("{head}{gap}{table}\n{}", tail.trim_start_matches(['\n', '\r']))
}

/// Where a section's last line ends that is neither empty nor a remark about what follows: one that an empty line parts from
/// the keys above it.
fn end_of_keys(text: &str, section: Range<usize>) -> usize {
    let within = &text[section.clone()];
    let mut end = within.trim_end().len();
    if section.end < text.len() {
        let mut line_end = end;
        while let Some(line) = within[..line_end].rsplit('\n').next() {
            let start = line_end - line.len();
            if line.trim().is_empty() {
                end = within[..line_end].trim_end().len();
                break;
            }
            if !line.trim_start().starts_with('#') || start == 0 {
                break;
            }
            line_end = start - 1;
        }
    }
    section.start + end
}

/// Behind the last line of the section that is neither empty nor a remark about what follows.
fn inserted(text: &str, section: Range<usize>, line: &str) -> String {
    let at = end_of_keys(text, section.clone());
    let lead = if at == 0 { "" } else { "\n" };
    let rest = &text[at..];
    let tail = if rest.is_empty() || !rest.starts_with(['\n', '\r']) { "\n" } else { "" };
    format!("{}{lead}{line}{tail}{rest}", &text[..at])
}

/// Header lines `[name]` with their bytes (to the end of the line, without its end) and names: `[signal.in2]` has two.
fn table_headers(text: &str) -> impl Iterator<Item = (Range<usize>, Vec<&str>)> {
    let mut start = 0;
    text.split_inclusive('\n').filter_map(move |whole| {
        let at = start;
        start += whole.len();
        let line = whole.trim_end_matches(['\n', '\r']);
        let name = line.trim_start().strip_prefix('[')?.split_once(']')?.0;
        Some((at..at + line.len(), name.split('.').map(|n| n.trim().trim_matches(['"', '\''])).collect()))
    })
}
