//! Reading a stage block: the whole stage, or everything that is wrong with it.
//!
//! Keys at the top: `stage`, `name`, `part`, `isolation`. Tables: `[components]`, `[supply]`, `[source]`, `[signal]`,
//! `[load]`, `[ambient]`, `[band]`, `[board]`, `[limits]`, `[measured]`.

use std::{collections::BTreeSet, ops::Range};

use stageleaf_math::{
    Error,
    dimension::Dimension,
    kind::Kind,
    limit::Limit,
    part::Part,
    stage::{Component, Isolation, Stage},
};

use crate::{
    block::{Block, Measured, Place},
    limit::parse_limit,
    problem::{Problem, nearest, quoted},
    quantity::Trouble,
    query::parse_query,
    settings::Settings,
    shelf::Shelf,
    surroundings,
    table::{Entry, Reader, entries, shown, toml_string},
    terms::{parse_span, toleranced},
    unit,
};

const KEYS: &[&str] = &[
    "stage",
    "name",
    "part",
    "isolation",
    "components",
    "supply",
    "source",
    "signal",
    "load",
    "ambient",
    "band",
    "board",
    "limits",
    "measured",
];

/// Reads a stage block.
///
/// # Errors
/// Everything that is wrong with it, in the order of the text; at least one problem.
pub fn read_block(text: &str, place: &Place, shelf: &Shelf, settings: &Settings) -> Result<Block, Vec<Problem>> {
    read_named(text, place, shelf, settings).1
}

/// The same, and the stage's name wherever it could be read.
pub(crate) fn read_named(text: &str, place: &Place, shelf: &Shelf, settings: &Settings) -> (Option<String>, Result<Block, Vec<Problem>>) {
    let mut reader = Reader::new(text, place);
    let document = reader.document();
    let top = entries(document.get_ref());
    let find = |key: &str| top.iter().find(|e| e.key == key).copied();
    let start = 0..text.lines().next().map_or(0, str::len);
    for entry in top.iter().filter(|e| !KEYS.contains(&e.key)) {
        reader.unknown(entry, format!("a stage block has no key `{}`", shown(entry.key)), KEYS);
    }

    let kind = stage_kind(&mut reader, find("stage"), &start);
    let name = stage_name(&mut reader, find("name"), &start);
    let part = part(&mut reader, find("part"), &start, shelf);
    let isolation = find("isolation").and_then(|e| reader.word(&e, "isolation", &["outside", "inside"]));
    let isolation = if isolation == Some("inside") { Isolation::InsideLoop } else { Isolation::OutsideLoop };
    let components = components(&mut reader, find("components"), &start, kind, settings);
    if let Some(entry) = find("isolation").filter(|_| kind.is_some() && !components.iter().any(|c| c.name == "Riso")) {
        reader.missing(entry.key_range(), "`isolation` says where `Riso` stands, and there is no `Riso`", "`Riso` under [components]");
    }
    let around = surroundings::read(&mut reader, &find, settings);
    let limits = limits(&mut reader, find("limits"), kind, settings);
    let measured = measured(&mut reader, find("measured"), kind);

    let (Some(kind), Some(stage_name), Some(part), false) = (kind, name.clone(), part, reader.has_problems()) else {
        return (name, Err(reader.into_problems()));
    };
    let stage = Stage {
        name: stage_name,
        kind,
        components,
        part,
        isolation,
        supply: around.supply,
        sources: vec![around.source],
        signals: vec![around.signal],
        common_mode: None,
        reference: None,
        parts: Vec::new(),
        load: around.load,
        board: around.board,
        ambient: around.ambient,
        band: around.band,
        limits,
    };
    if let Err(error) = stageleaf_math::check(&stage) {
        let range = place_of(&reader, &error).unwrap_or(start);
        reader.problem(range, error.to_string(), "", None);
        return (name, Err(reader.into_problems()));
    }
    let mut fields = std::mem::take(&mut reader.fields);
    fields.sort_by_key(|f| f.span.start);
    (name, Ok(Block { stage, text: text.to_owned(), file: place.file.clone(), line: place.first_line, fields, measured }))
}

fn stage_kind(reader: &mut Reader<'_>, entry: Option<Entry<'_>>, start: &Range<usize>) -> Option<Kind> {
    let ids: Vec<&str> = Kind::ALL.iter().map(|k| k.id()).collect();
    let allowed = listed(&ids);
    let Some(entry) = entry else {
        reader.missing(start.clone(), "`stage` is missing", allowed);
        return None;
    };
    let text = reader.text(&entry, "stage")?;
    let kind = Kind::from_id(&text.text);
    if kind.is_none() {
        let attempt = nearest(&text.text, ids).map(|k| format!("stage = {}", toml_string(k)));
        reader.problem(text.whole, format!("no stage kind is called {}", quoted(&text.text)), allowed, attempt);
    }
    kind
}

fn stage_name(reader: &mut Reader<'_>, entry: Option<Entry<'_>>, start: &Range<usize>) -> Option<String> {
    let allowed = "a name, once in all notes, as a heading would have it";
    let Some(entry) = entry else {
        reader.missing(start.clone(), "`name` is missing", allowed);
        return None;
    };
    let text = reader.text(&entry, "name")?;
    if text.text.trim().is_empty() {
        reader.problem(text.whole, "`name` is empty", allowed, None);
        return None;
    }
    if text.text.chars().count() > 200 {
        reader.problem(text.whole, "`name` is longer than 200 characters", allowed, None);
        return None;
    }
    Some(text.text.trim().to_owned())
}

fn part(reader: &mut Reader<'_>, entry: Option<Entry<'_>>, start: &Range<usize>, shelf: &Shelf) -> Option<Part> {
    let mut ids: Vec<&str> = shelf.parts.iter().map(|p| p.part.id.as_str()).collect();
    ids.sort_unstable();
    let allowed = if ids.is_empty() {
        "a part file's name without `.toml`; the shelf holds none".into()
    } else {
        format!("on the shelf: {}", listed(&ids))
    };
    let Some(entry) = entry else {
        reader.missing(start.clone(), "`part` is missing", allowed);
        return None;
    };
    let text = reader.text(&entry, "part")?;
    if let Some(found) = shelf.find(&text.text) {
        return Some(found.part.clone());
    }
    let attempt = nearest(&text.text, ids).map(|id| format!("part = {}", toml_string(id)));
    reader.problem(text.whole, format!("no part on the shelf is called {}", quoted(&text.text)), allowed, attempt);
    None
}

fn components<'a>(
    reader: &mut Reader<'a>,
    entry: Option<Entry<'a>>,
    start: &Range<usize>,
    kind: Option<Kind>,
    settings: &Settings,
) -> Vec<Component> {
    let Some(kind) = kind else { return Vec::new() };
    let specs = kind.components();
    let kind_name = kind.spec().title.to_lowercase();
    let names: Vec<&str> = specs.iter().map(|s| s.name).collect();
    let mut found = Vec::new();
    let mut given: Vec<(&str, Range<usize>)> = Vec::new();
    let table = entry.and_then(|e| reader.table(&e).map(entries)).unwrap_or_default();
    for entry in &table {
        let Some(spec) = specs.iter().find(|s| s.name == entry.key) else {
            reader.unknown(entry, format!("{} has no component `{}`", article(&kind_name), shown(entry.key)), &names);
            continue;
        };
        given.push((spec.name, entry.key_range()));
        let path = format!("components.{}", spec.name);
        let value = reader.read(entry, &path, takes(spec.dimension), |t| {
            let (mut value, stated) = toleranced(t, spec.dimension)?;
            above_zero(t, value.nominal, spec.dimension)?;
            if !stated {
                let default =
                    if spec.dimension == Dimension::Resistance { settings.resistor_tolerance } else { settings.capacitor_tolerance };
                value.minus = default.unwrap_or(0.0);
                value.plus = value.minus;
            }
            Ok(value)
        });
        found.extend(value.map(|value| Component { name: spec.name, value }));
    }
    let header = entry.map_or(start.clone(), |e| e.key_range());
    for spec in specs.iter().filter(|s| s.required && !given.iter().any(|(n, _)| *n == s.name)) {
        let message = format!("`{}` is missing: {} has its {}", spec.name, article(&kind_name), spec.role);
        let example =
            if spec.dimension == Dimension::Resistance { "with its value as `91k 1% 50ppm`" } else { "with its value as `100n 5%`" };
        reader.missing(header.clone(), message, format!("`{}` under [components], {example}", spec.name));
    }
    for spec in specs {
        let here = given.iter().find(|(n, _)| *n == spec.name);
        if let (Some((_, range)), Some(other)) = (here, spec.with)
            && !given.iter().any(|(n, _)| *n == other)
        {
            let message = format!("`{}` needs `{other}`, which is not there", spec.name);
            reader.missing(range.clone(), message, format!("`{}` ({}) and `{other}` together", spec.name, spec.role));
        }
    }
    found
}

fn limits<'a>(reader: &mut Reader<'a>, entry: Option<Entry<'a>>, kind: Option<Kind>, settings: &Settings) -> Vec<Limit> {
    let mut limits: Vec<Limit> = Vec::new();
    let mut named = BTreeSet::new();
    for entry in entry.and_then(|e| reader.table(&e).map(entries)).unwrap_or_default() {
        let path = format!("limits.{}", entry.key);
        let Some(query) = query(reader, &entry) else {
            reader.text(&entry, &path);
            continue;
        };
        if !named.insert((query.figure, query.at.map(f64::to_bits))) {
            reader.problem(entry.key_range(), format!("`{}` has a limit already", shown(entry.key)), "one limit for each figure", None);
        }
        let d = kind.map_or(query.figure.dimension(), |k| query.figure.dimension_in(k));
        let is = format!("is {}", unit::noun(d));
        if let Some((bound, thin)) = reader.read(&entry, &path, &is, |t| parse_limit(t, d, settings.thin)) {
            limits.push(Limit { query, bound, thin });
        }
    }
    limits
}

fn measured<'a>(reader: &mut Reader<'a>, entry: Option<Entry<'a>>, kind: Option<Kind>) -> Vec<Measured> {
    const KEYS: &[&str] = &["value", "unit", "at"];
    let mut all = Vec::new();
    for entry in entry.and_then(|e| reader.table(&e).map(entries)).unwrap_or_default() {
        let path = format!("measured.{}", entry.key);
        let Some(query) = query(reader, &entry) else { continue };
        let d = kind.map_or(query.figure.dimension(), |k| query.figure.dimension_in(k));
        let is = format!("is {}", unit::noun(d));
        let Some(table) = entry.value.get_ref().as_table() else {
            let value = reader.read(&entry, &path, &is, |t| parse_span(t, d));
            all.extend(value.map(|value| Measured { query, value, unit: None, temperature: None }));
            continue;
        };
        let (mut value, mut unit, mut temperature) = (None, None, None);
        let keys = entries(table);
        if !keys.iter().any(|k| k.key == "value") {
            reader.missing(entry.key_range(), format!("`{}` has no `value`", shown(entry.key)), unit::allowed(d));
        }
        for key in keys {
            let path = format!("{path}.{}", key.key);
            match key.key {
                "value" => value = reader.read(&key, &path, &is, |t| parse_span(t, d)),
                "unit" => unit = reader.text(&key, &path).map(|t| t.text.into_owned()),
                "at" => {
                    for condition in reader.table(&key).map(entries).unwrap_or_default() {
                        match condition.key {
                            "temperature" => {
                                let path = format!("{path}.temperature");
                                temperature =
                                    reader.read(&condition, &path, "takes a temperature", |t| crate::parse(t, Dimension::Temperature));
                            }
                            _ => reader.unknown(
                                &condition,
                                format!("a measurement has no condition `{}`", shown(condition.key)),
                                &["temperature"],
                            ),
                        }
                    }
                }
                _ => reader.unknown(&key, format!("a measurement has no key `{}`", shown(key.key)), KEYS),
            }
        }
        all.extend(value.map(|value| Measured { query, value, unit, temperature }));
    }
    all
}

/// The figure that a key names.
fn query(reader: &mut Reader<'_>, entry: &Entry<'_>) -> Option<stageleaf_math::figure::Query> {
    match parse_query(entry.key) {
        Ok(query) => Some(query),
        Err(trouble) => {
            let key = entry.key_range();
            let quotes = usize::from(key.len() > entry.key.len());
            let all = trouble.range.len() == entry.key.len();
            let range = if all { key } else { key.start + quotes + trouble.range.start..key.start + quotes + trouble.range.end };
            reader.problem(range, trouble.message, trouble.allowed, trouble.attempt);
            None
        }
    }
}

/// Where a value stands that the engine refuses.
fn place_of(reader: &Reader<'_>, error: &Error) -> Option<Range<usize>> {
    let what = match error {
        Error::NotPositive { what, .. }
        | Error::Negative { what, .. }
        | Error::MissingComponent { what }
        | Error::RangeReversed { what, .. } => what,
        Error::Unpaired { given, .. } => given,
        Error::SupplyReversed { .. } => "supply.positive",
    };
    let fits = |path: &str| path == what || path.rsplit_once('.').is_some_and(|(_, key)| key == what);
    reader.fields.iter().find(|f| fits(&f.path)).map(|f| f.whole.clone())
}

pub fn above_zero(text: &str, value: f64, d: Dimension) -> Result<(), Trouble> {
    if value > 0.0 {
        return Ok(());
    }
    Err(Trouble::new(0..text.len(), format!("{} is not above zero", quoted(text)), d))
}

pub fn not_negative(text: &str, value: f64, d: Dimension) -> Result<(), Trouble> {
    if value >= 0.0 {
        return Ok(());
    }
    Err(Trouble::new(0..text.len(), format!("{} is below zero", quoted(text)), d))
}

/// "takes a resistance".
pub const fn takes(d: Dimension) -> &'static str {
    match d {
        Dimension::Resistance => "takes a resistance",
        Dimension::Capacitance => "takes a capacitance",
        Dimension::Voltage => "takes a voltage",
        Dimension::Frequency => "takes a frequency",
        Dimension::Temperature => "takes a temperature",
        Dimension::Fraction => "takes a fraction",
        _ => "takes a quantity",
    }
}

fn article(noun: &str) -> String {
    let vowel = noun.starts_with(['a', 'e', 'i', 'o', 'u']);
    format!("{} {noun}", if vowel { "an" } else { "a" })
}

/// Names in backticks, at most a dozen of them.
pub fn listed(names: &[&str]) -> String {
    let mut list: Vec<String> = names.iter().take(12).map(|n| format!("`{n}`")).collect();
    if names.len() > 12 {
        list.push(format!("and {} more", names.len() - 12));
    }
    list.join(", ")
}
