//! Reading a part file: the whole part, or everything that is wrong with it.

use std::ops::Range;

use stageleaf_math::{
    dimension::Dimension,
    part::{Headroom, Part, PartFigure, Rating, StatedPhaseMargin, Zero},
};
use toml::de::DeValue;

use crate::{
    block::Place,
    parse,
    problem::{Problem, quoted},
    quantity::Trouble,
    reading::{above_zero, not_negative},
    table::{Entry, Reader, entries, shown},
    terms::parse_span,
    unit,
};

const TABLES: &[&str] = &["part", "supply", "input", "gain", "slew", "output", "noise", "thermal"];

/// Reads a part file. The part's id is the file's name without folder and `.toml`.
///
/// # Errors
/// Everything that is wrong with it, in the order of the text; at least one problem.
pub fn read_part(text: &str, file: &str) -> Result<Part, Vec<Problem>> {
    let place = Place::new(file, 1);
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    let mut reader = Reader::new(text, &place);
    let document = reader.document();
    let mut part = Part { id: stem(file).to_owned(), ..Part::default() };
    let top = entries(document.get_ref());
    if !top.iter().any(|e| e.key == "part") {
        let start = 0..text.lines().next().map_or(0, str::len);
        reader.missing(start, "the part has no name", "`[part]` with `name`");
    }
    for entry in top {
        if !TABLES.contains(&entry.key) {
            reader.unknown(&entry, format!("a part file has no key `{}`", shown(entry.key)), TABLES);
            continue;
        }
        let Some(table) = reader.table(&entry) else { continue };
        let keys = entries(table);
        if entry.key == "part" {
            heading(&mut reader, &mut part, &entry.key_range(), &keys);
        } else {
            for key in keys {
                stated(&mut reader, &mut part, entry.key, &key);
            }
        }
    }
    let problems = reader.into_problems();
    if problems.is_empty() { Ok(part) } else { Err(problems) }
}

/// A file's name without folder and ending.
fn stem(file: &str) -> &str {
    let name = file.rsplit(['/', '\\']).next().unwrap_or(file);
    name.strip_suffix(".toml").unwrap_or(name)
}

fn heading<'a>(reader: &mut Reader<'a>, part: &mut Part, header: &Range<usize>, keys: &[Entry<'a>]) {
    const KEYS: &[&str] = &["name", "description", "amplifiers", "source"];
    for key in keys {
        let path = format!("part.{}", key.key);
        let text = |reader: &mut Reader<'a>| reader.text(key, &path).map(|t| t.text.into_owned());
        match key.key {
            "name" => part.name = text(reader).unwrap_or_default(),
            "description" => part.description = text(reader),
            "source" => part.source = text(reader),
            "amplifiers" => {
                part.amplifiers = reader.read(key, &path, "takes a number", |t| {
                    t.trim().parse::<u32>().ok().filter(|n| (1..=16).contains(n)).ok_or_else(|| Trouble {
                        range: 0..t.len(),
                        message: format!("{} was given", quoted(t)),
                        allowed: "a whole number from 1 to 16".into(),
                        attempt: None,
                    })
                });
            }
            _ => reader.unknown(key, format!("[part] has no key `{}`", shown(key.key)), KEYS),
        }
    }
    if part.name.trim().is_empty() && !keys.iter().any(|k| k.key == "name" && part.name.is_empty() && reader.has_problems()) {
        reader.missing(header.clone(), "the part has no name", "`name` under [part]");
    }
}

/// A key of a table other than `[part]`.
fn stated<'a>(reader: &mut Reader<'a>, part: &mut Part, table: &str, entry: &Entry<'a>) {
    let path = format!("{table}.{}", entry.key);
    match path.as_str() {
        "supply.span" => span(reader, part, entry),
        "input.range" => range(reader, part, entry),
        "input.cmrr" => rejection(reader, part, entry, PartFigure::Cmrr, PartFigure::CmrrCorner),
        "input.psrr_positive" => rejection(reader, part, entry, PartFigure::PsrrPositive, PartFigure::PsrrPositiveCorner),
        "input.psrr_negative" => rejection(reader, part, entry, PartFigure::PsrrNegative, PartFigure::PsrrNegativeCorner),
        "input.phase_reversal" => match entry.value.get_ref() {
            DeValue::Boolean(reverses) => part.phase_reversal = Some(*reverses),
            _ => reader.problem(entry.value.span(), "`phase_reversal` takes true or false", "`true`, `false`, without quotes", None),
        },
        "gain.poles" => part.poles = list(reader, entry, &path, "takes frequencies", |t| positive(t, Dimension::Frequency)),
        "gain.zeros" => part.zeros = list(reader, entry, &path, "takes frequencies", zero).unwrap_or_default(),
        "gain.phase_margin" => part.phase_margin = phase_margin(reader, entry),
        "output.headroom_high" => part.headroom_high = headroom(reader, entry, &path),
        "output.headroom_low" => part.headroom_low = headroom(reader, entry, &path),
        _ => match figure(&path) {
            Some(figure) => {
                if let Some(rating) = rating(reader, entry, &path, figure.dimension(), floor(figure), &[]) {
                    part.state(figure, rating);
                }
            }
            None => reader.unknown(entry, format!("[{table}] has no key `{}`", shown(entry.key)), &keys_of(table)),
        },
    }
}

/// The keys that a table of a part file can have.
fn keys_of(table: &str) -> Vec<&'static str> {
    let own: &[&'static str] = match table {
        "supply" => &["span", "current"],
        "input" => &["range", "cmrr", "psrr_positive", "psrr_negative", "phase_reversal"],
        "gain" => &["poles", "zeros", "phase_margin"],
        "output" => &["headroom_high", "headroom_low"],
        _ => &[],
    };
    let figures = PartFigure::ALL.iter().filter_map(|f| f.id().split_once('.').filter(|(t, _)| *t == table).map(|(_, key)| key));
    let plain = figures.filter(|key| figure(&format!("{table}.{key}")).is_some());
    let mut keys: Vec<&'static str> = plain.chain(own.iter().copied()).collect();
    keys.sort_unstable();
    keys.dedup();
    keys
}

/// The scalar figure of a key, for keys without a form of their own.
fn figure(path: &str) -> Option<PartFigure> {
    PartFigure::ALL.iter().copied().find(|f| f.id() == path).filter(|f| {
        !matches!(
            f,
            PartFigure::SupplySpanMin
                | PartFigure::SupplySpanMax
                | PartFigure::RangeFromNegative
                | PartFigure::RangeFromPositive
                | PartFigure::CmrrCorner
                | PartFigure::PsrrPositiveCorner
                | PartFigure::PsrrNegativeCorner
        )
    })
}

/// The least value that a figure can have.
#[derive(Clone, Copy)]
enum Floor {
    None,
    Zero,
    AboveZero,
}

/// Error sources may be zero; what divides, or sets a pole, may not.
const fn floor(figure: PartFigure) -> Floor {
    match figure {
        PartFigure::RangeFromNegative | PartFigure::RangeFromPositive | PartFigure::JunctionMax => Floor::None,
        PartFigure::Offset
        | PartFigure::OffsetDrift
        | PartFigure::BiasCurrent
        | PartFigure::OffsetCurrent
        | PartFigure::SupplyCurrent
        | PartFigure::DifferentialCapacitance
        | PartFigure::CommonModeCapacitance
        | PartFigure::OutputResistance
        | PartFigure::OverloadRecovery
        | PartFigure::Startup
        | PartFigure::NoiseVoltage
        | PartFigure::NoiseVoltageCorner
        | PartFigure::NoiseCurrent
        | PartFigure::NoiseCurrentCorner => Floor::Zero,
        _ => Floor::AboveZero,
    }
}

fn checked(text: &str, d: Dimension, floor: Floor) -> Result<f64, Trouble> {
    let value = parse(text, d)?;
    match floor {
        Floor::None => Ok(()),
        Floor::Zero => not_negative(text, value, d),
        Floor::AboveZero => above_zero(text, value, d),
    }?;
    Ok(value)
}

fn positive(text: &str, d: Dimension) -> Result<f64, Trouble> {
    checked(text, d, Floor::AboveZero)
}

/// A figure: a text (typical), or a table of `typ`, `min`, `max`, `source` and whatever stands in `beside`.
fn rating<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>, path: &str, d: Dimension, floor: Floor, beside: &[&str]) -> Option<Rating> {
    let takes = format!("takes {}", unit::noun(d));
    let Some(table) = entry.value.get_ref().as_table() else {
        return reader.read(entry, path, &takes, |t| checked(t, d, floor)).map(Rating::typical);
    };
    let mut rating = Rating::default();
    let mut readable = true;
    let names = ["typ", "min", "max", "source"];
    for key in entries(table) {
        let path = format!("{path}.{}", key.key);
        let mut value = |reader: &mut Reader<'a>| {
            let value = reader.read(&key, &path, &takes, |t| checked(t, d, floor));
            readable &= value.is_some();
            value
        };
        match key.key {
            "typ" => rating.typ = value(reader),
            "min" => rating.min = value(reader),
            "max" => rating.max = value(reader),
            "source" => rating.source = reader.text(&key, &path).map(|t| t.text.into_owned()),
            other if beside.contains(&other) => {}
            _ => {
                let names: Vec<&str> = names.iter().chain(beside).copied().collect();
                reader.unknown(&key, format!("`{}` has no key `{}`", entry.key, shown(key.key)), &names);
                readable = false;
            }
        }
    }
    if readable && rating.is_empty() && beside.is_empty() {
        reader.problem(entry.value.span(), format!("`{}` states no value", entry.key), "`typ`, `min`, `max`, and `source`", None);
        return None;
    }
    let ordered = [rating.min, rating.typ, rating.max].into_iter().flatten().is_sorted();
    if !ordered {
        reader.problem(
            entry.value.span(),
            format!("`{}` is out of order", entry.key),
            "`min` not above `typ`, `typ` not above `max`",
            None,
        );
    }
    ordered.then_some(rating)
}

/// `span = "4.5 V to 36 V"`: both ends are the maker's bounds.
fn span<'a>(reader: &mut Reader<'a>, part: &mut Part, entry: &Entry<'a>) {
    let read = |t: &str| {
        let span = parse_span(t, Dimension::Voltage)?;
        not_negative(t, span.low, Dimension::Voltage).map(|()| span)
    };
    if let Some(span) = reader.read(entry, "supply.span", "takes a range of voltage", read) {
        part.state(PartFigure::SupplySpanMin, Rating { max: Some(span.low), ..Rating::default() });
        part.state(PartFigure::SupplySpanMax, Rating { min: Some(span.high), ..Rating::default() });
    }
}

/// `range = { from_negative = "1 V", from_positive = "1.5 V" }`; negative where the range goes beyond the rail.
fn range<'a>(reader: &mut Reader<'a>, part: &mut Part, entry: &Entry<'a>) {
    for key in reader.table(entry).map(entries).unwrap_or_default() {
        let figure = match key.key {
            "from_negative" => PartFigure::RangeFromNegative,
            "from_positive" => PartFigure::RangeFromPositive,
            _ => {
                reader.unknown(&key, format!("`range` has no key `{}`", shown(key.key)), &["from_negative", "from_positive"]);
                continue;
            }
        };
        if let Some(rating) = rating(reader, &key, figure.id(), Dimension::Voltage, Floor::None, &[]) {
            part.state(figure, rating);
        }
    }
}

/// `cmrr = { typ = "100 dB", min = "86 dB", corner = "2 kHz" }`.
fn rejection<'a>(reader: &mut Reader<'a>, part: &mut Part, entry: &Entry<'a>, figure: PartFigure, corner: PartFigure) {
    if let Some(rating) = rating(reader, entry, figure.id(), Dimension::Level, Floor::AboveZero, &["corner"]) {
        part.state(figure, rating);
    }
    let corners = entry.value.get_ref().as_table().map(entries).unwrap_or_default();
    for key in corners.iter().filter(|k| k.key == "corner") {
        let path = format!("{}.corner", figure.id());
        if let Some(rating) = rating(reader, key, &path, Dimension::Frequency, Floor::AboveZero, &[]) {
            part.state(corner, rating);
        }
    }
}

fn list<'a, T>(
    reader: &mut Reader<'a>,
    entry: &Entry<'a>,
    path: &str,
    takes: &str,
    parse: impl Fn(&str) -> Result<T, Trouble>,
) -> Option<Vec<T>> {
    let Some(array) = entry.value.get_ref().as_array() else {
        let message = format!("`{}` {takes} in a list", entry.key);
        reader.problem(entry.value.span(), message, "a list of texts, as `[\"22 MHz\"]`; `[]` states that there are none", None);
        return None;
    };
    let mut all = Vec::new();
    for (i, value) in array.iter().enumerate() {
        let item = Entry { value, ..*entry };
        all.push(reader.read(&item, &format!("{path}.{i}"), takes, &parse)?);
    }
    Some(all)
}

/// `5 MHz`, `5 MHz left`, `5 MHz right`: the half plane of a zero is the left one unless stated.
fn zero(text: &str) -> Result<Zero, Trouble> {
    let body = text.trim_end();
    let (value, right_half_plane) = match (body.strip_suffix("right"), body.strip_suffix("left")) {
        (Some(value), _) => (value, true),
        (None, Some(value)) => (value, false),
        (None, None) => (body, false),
    };
    Ok(Zero { frequency: positive(value, Dimension::Frequency)?, right_half_plane })
}

/// `phase_margin = { value = "62 °", gain = "1", load_resistance = "2k", load_capacitance = "20p" }`.
fn phase_margin<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<StatedPhaseMargin> {
    const KEYS: &[&str] = &["value", "gain", "load_resistance", "load_capacitance", "source"];
    let keys = entries(reader.table(entry)?);
    let (mut margin, mut gain, mut load_resistance, mut load_capacitance) = (None, None, None, None);
    for key in &keys {
        let path = format!("gain.phase_margin.{}", key.key);
        let mut read = |d, floor| reader.read(key, &path, &format!("takes {}", unit::noun(d)), |t| checked(t, d, floor));
        match key.key {
            "value" => margin = read(Dimension::Angle, Floor::AboveZero),
            "gain" => gain = read(Dimension::Number, Floor::AboveZero),
            "load_resistance" => load_resistance = read(Dimension::Resistance, Floor::AboveZero),
            "load_capacitance" => load_capacitance = read(Dimension::Capacitance, Floor::Zero),
            "source" => drop(reader.text(key, &path)),
            _ => reader.unknown(key, format!("`phase_margin` has no key `{}`", shown(key.key)), KEYS),
        }
    }
    for (name, allowed) in [("value", "the margin, as `62 °`"), ("gain", "the noise gain at which it holds, as `1`")] {
        if !keys.iter().any(|k| k.key == name) {
            reader.missing(entry.key_range(), format!("`phase_margin` has no `{name}`"), allowed);
        }
    }
    Some(StatedPhaseMargin { margin: margin?, gain: gain?, load_resistance, load_capacitance })
}

/// `[ { current = "0 mA", typ = "0.9 V", max = "1.2 V" }, … ]`, by rising current.
fn headroom<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>, path: &str) -> Vec<Headroom> {
    let allowed = "a list of rows, as `[ { current = \"0 mA\", typ = \"0.9 V\" } ]`, by rising current";
    let Some(array) = entry.value.get_ref().as_array() else {
        reader.problem(entry.value.span(), format!("`{}` takes a list of rows", entry.key), allowed, None);
        return Vec::new();
    };
    let mut rows: Vec<Headroom> = Vec::new();
    for (i, value) in array.iter().enumerate() {
        let row = Entry { value, ..*entry };
        let path = format!("{path}.{i}");
        let Some(keys) = value.get_ref().as_table().map(entries) else {
            reader.problem(value.span(), format!("a row of `{}` is a table", entry.key), allowed, None);
            continue;
        };
        let Some(current) = keys.iter().find(|k| k.key == "current") else {
            reader.missing(value.span(), format!("a row of `{}` has no `current`", entry.key), allowed);
            continue;
        };
        let current = reader.read(current, &format!("{path}.current"), "takes a current", |t| checked(t, Dimension::Current, Floor::Zero));
        let volts = rating(reader, &row, &path, Dimension::Voltage, Floor::Zero, &["current"]);
        let (Some(current), Some(volts)) = (current, volts) else { continue };
        if volts.is_empty() {
            reader.problem(value.span(), format!("a row of `{}` states no voltage", entry.key), "`typ`, `max` beside `current`", None);
        } else if rows.last().is_some_and(|last| last.current >= current) {
            reader.problem(value.span(), format!("the rows of `{}` are out of order", entry.key), allowed, None);
        } else {
            rows.push(Headroom { current, volts });
        }
    }
    rows
}
