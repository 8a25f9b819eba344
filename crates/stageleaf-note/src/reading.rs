//! Reading a stage block: the whole stage, or everything that is wrong with it.
//!
//! Keys at the top: `stage`, `name`, `part`, `isolation`. Tables: `[parts]`, `[components]`, `[supply]`, `[source]`, `[signal]`,
//! `[reference]`, `[load]`, `[converter]`, `[ambient]`, `[band]`, `[board]`, `[limits]`, `[measured]`. Which of `[parts]`, `[source]`, `[signal]` and
//! `[reference]` a stage takes, and with which keys, depends on its kind.

use std::{collections::BTreeSet, ops::Range};

use stageleaf_math::{
    Error,
    dimension::Dimension,
    figure::Scope,
    kind::{Drives, Kind},
    limit::Limit,
    measured::Measurement,
    part::Part,
    stage::{Component, Isolation, Stage},
};

use crate::{
    block::{Block, Measured, Place},
    driving::{self, Driving, Inputs},
    limit::parse_limit,
    problem::{Problem, nearest, quoted},
    quantity::Trouble,
    query::{parse_query, query_text},
    settings::Settings,
    shelf::Shelf,
    surroundings,
    table::{Entry, Reader, entries, shown, toml_string},
    terms::{parse_span, toleranced},
    unit,
    words::kind_text,
};

const KEYS: &[&str] = &[
    "stage",
    "name",
    "part",
    "isolation",
    "parts",
    "components",
    "supply",
    "source",
    "signal",
    "reference",
    "load",
    "converter",
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
    let parts = kind.map_or_else(Vec::new, |kind| parts(&mut reader, find("parts"), kind, shelf));
    let (components, named) = components(&mut reader, find("components"), &start, kind, settings);
    if let Some(entry) = find("isolation").filter(|_| kind.is_some() && !components.iter().any(|c| c.name == "Riso")) {
        reader.missing(entry.key_range(), "`isolation` says where `Riso` stands, and there is no `Riso`", "`Riso` under [components]");
    }
    let around = surroundings::read(&mut reader, &find, settings);
    let driving = kind.map_or_else(Driving::default, |kind| driving::read(&mut reader, &find, &start, &Inputs::of(kind, &named)));
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
        sources: driving.sources,
        signals: driving.signals,
        common_mode: driving.common_mode,
        reference: driving.reference,
        parts,
        load: around.load,
        converter: around.converter,
        board: around.board,
        ambient: around.ambient,
        band: around.band,
        limits,
        measured: measured.iter().map(|m| Measurement { query: m.query, value: m.value, temperature: m.temperature }).collect(),
    };
    if let Err(error) = stageleaf_math::check(&stage) {
        let range = place_of(&reader, &error).unwrap_or(start);
        reader.problem(range, error.to_string(), "", None);
        return (name, Err(reader.into_problems()));
    }
    for limit in stage.limits.iter().filter(|l| !l.query.exists_in(&stage)) {
        let named = |f: &&crate::block::Field| f.path.strip_prefix("limits.").and_then(|key| parse_query(key).ok()) == Some(limit.query);
        let range = reader.fields.iter().find(named).map_or(start.clone(), |f| f.whole.clone());
        let message = format!("{} has nothing that `{}` could be", kind_text(stage.kind), query_text(limit.query));
        reader.problem(range, message, whose(&stage, limit.query.figure.scope()), Some(limit.query.figure.id().into()));
    }
    if reader.has_problems() {
        return (name, Err(reader.into_problems()));
    }
    let mut fields = std::mem::take(&mut reader.fields);
    fields.sort_by_key(|f| f.span.start);
    (name, Ok(Block { stage, text: text.to_owned(), file: place.file.clone(), line: place.first_line, fields, measured }))
}

/// What a stage's figures can be taken of.
fn whose(stage: &Stage, scope: Scope) -> String {
    let names: Vec<String> = match scope {
        Scope::Stage => Vec::new(),
        Scope::Amplifier => (1..=stage.kind.spec().amplifiers).map(|n| format!("`of A{n}`")).collect(),
        Scope::Input => (stage.kind.spec().inputs)(stage)
            .iter()
            .filter(|_| matches!(stage.kind.spec().drives, Drives::Each))
            .skip(1)
            .map(|input| format!("`from {}`", input.name))
            .collect(),
    };
    if names.is_empty() { "the figure alone".into() } else { format!("{}; or the figure alone", names.join(", ")) }
}

fn stage_kind(reader: &mut Reader<'_>, entry: Option<Entry<'_>>, start: &Range<usize>) -> Option<Kind> {
    let ids: Vec<&str> = Kind::ALL.iter().map(|k| k.id()).collect();
    let allowed = ids.iter().map(|id| format!("`{id}`")).collect::<Vec<_>>().join(", ");
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
    match entry {
        Some(entry) => from_shelf(reader, &entry, "part", shelf),
        None => {
            reader.missing(start.clone(), "`part` is missing", on_shelf(shelf).1);
            None
        }
    }
}

/// `[parts]`: amplifiers whose part is another than `part`.
fn parts<'a>(reader: &mut Reader<'a>, entry: Option<Entry<'a>>, kind: Kind, shelf: &Shelf) -> Vec<(usize, Part)> {
    let Some(entry) = entry else { return Vec::new() };
    let count = kind.spec().amplifiers;
    if count < 2 {
        reader.problem(
            entry.key_range(),
            format!("{} has one amplifier, whose part is `part`", kind_text(kind)),
            "`part` above the tables",
            None,
        );
        return Vec::new();
    }
    let names: Vec<String> = (1..=count).map(|n| format!("A{n}")).collect();
    let mut found = Vec::new();
    for entry in reader.table(&entry).map(entries).unwrap_or_default() {
        let Some(place) = names.iter().position(|n| n == entry.key) else {
            let names: Vec<&str> = names.iter().map(String::as_str).collect();
            reader.unknown(&entry, format!("{} has no amplifier `{}`", kind_text(kind), shown(entry.key)), &names);
            continue;
        };
        found.extend(from_shelf(reader, &entry, &format!("parts.{}", entry.key), shelf).map(|part| (place + 1, part)));
    }
    found
}

/// The ids of the shelf's parts, and what is allowed where one is named.
fn on_shelf(shelf: &Shelf) -> (Vec<&str>, String) {
    let mut ids: Vec<&str> = shelf.parts.iter().map(|p| p.part.id.as_str()).collect();
    ids.sort_unstable();
    let allowed = if ids.is_empty() {
        "a part file's name without `.toml`; the shelf holds none".into()
    } else {
        format!("on the shelf: {}", listed(&ids))
    };
    (ids, allowed)
}

fn from_shelf(reader: &mut Reader<'_>, entry: &Entry<'_>, path: &str, shelf: &Shelf) -> Option<Part> {
    let text = reader.text(entry, path)?;
    if let Some(found) = shelf.find(&text.text) {
        return Some(found.part.clone());
    }
    let (ids, allowed) = on_shelf(shelf);
    let attempt = nearest(&text.text, ids).map(|id| format!("{} = {}", entry.key, toml_string(id)));
    reader.problem(text.whole, format!("no part on the shelf is called {}", quoted(&text.text)), allowed, attempt);
    None
}

/// The components, and the names of all that were given, also of those whose value cannot be read.
fn components<'a>(
    reader: &mut Reader<'a>,
    entry: Option<Entry<'a>>,
    start: &Range<usize>,
    kind: Option<Kind>,
    settings: &Settings,
) -> (Vec<Component>, Vec<&'static str>) {
    let Some(kind) = kind else { return (Vec::new(), Vec::new()) };
    let specs = kind.components();
    let kind_name = kind_text(kind);
    let names: Vec<&str> = specs.iter().map(|s| s.name).collect();
    let mut found = Vec::new();
    let mut given: Vec<(&'static str, Range<usize>)> = Vec::new();
    let table = entry.and_then(|e| reader.table(&e).map(entries)).unwrap_or_default();
    for entry in &table {
        let Some(spec) = specs.iter().find(|s| s.name == entry.key) else {
            reader.unknown(entry, format!("{kind_name} has no component `{}`", shown(entry.key)), &names);
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
        // "has its feedback resistor", "has it from the + input to ground".
        let its = if spec.role.starts_with("from ") { "it" } else { "its" };
        let message = format!("`{}` is missing: {kind_name} has {its} {}", spec.name, spec.role);
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
    let given_names: Vec<&'static str> = given.iter().map(|(n, _)| *n).collect();
    for (name, range) in &given {
        // The inputs of a summing stage are numbered without a gap; that one of the first two is missing has been told.
        let before = input_number(kind, name).filter(|n| *n > 3).map(|n| format!("Rin{}", n - 1));
        if let Some(before) = before.filter(|b| !given_names.contains(&b.as_str())) {
            let message = format!("`{name}` needs `{before}`, which is not there: inputs are numbered without a gap");
            reader.missing(range.clone(), message, format!("`Rin1`, `Rin2` and so on up to `{name}`"));
        }
    }
    (found, given_names)
}

/// The number of the input whose resistor this is.
fn input_number(kind: Kind, name: &str) -> Option<usize> {
    if kind == Kind::Summing { name.strip_prefix("Rin")?.parse().ok() } else { None }
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
        if !named.insert((query.figure, query.at.map(f64::to_bits), query.step.map(f64::to_bits), query.of)) {
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
    let what: &str = match error {
        Error::NotPositive { what, .. }
        | Error::BeyondReason { what, .. }
        | Error::Negative { what, .. }
        | Error::MissingComponent { what }
        | Error::RangeReversed { what, .. } => what,
        Error::Unpaired { given, .. } => given,
        Error::SupplyReversed { .. } => "supply.positive",
    };
    // The engine names `signal.peak`, whichever signal is meant.
    let fits = |path: &str| {
        let Some((table, key)) = path.rsplit_once('.') else { return path == what };
        path == what || key == what || table.split_once('.').is_some_and(|(outer, _)| format!("{outer}.{key}") == what)
    };
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
        Dimension::Current => "takes a current",
        Dimension::Charge => "takes a charge",
        Dimension::Frequency => "takes a frequency",
        Dimension::Temperature => "takes a temperature",
        Dimension::Time => "takes a time",
        Dimension::Number => "takes a number",
        Dimension::Fraction => "takes a fraction",
        _ => "takes a quantity",
    }
}

/// Names in backticks, at most a dozen of them.
pub fn listed(names: &[&str]) -> String {
    let mut list: Vec<String> = names.iter().take(12).map(|n| format!("`{n}`")).collect();
    if names.len() > 12 {
        list.push(format!("and {} more", names.len() - 12));
    }
    list.join(", ")
}
