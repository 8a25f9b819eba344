//! What surrounds a stage: supply, source, signal, load, board, ambient, band.

use std::f64::consts::SQRT_2;

use stageleaf_math::{
    dimension::Dimension,
    stage::{Ambient, Band, Board, Load, Signal, Source, Span, Supply, Toleranced},
};

use crate::{
    parse,
    problem::quoted,
    reading::{above_zero, not_negative, takes},
    settings::Settings,
    table::{Entry, Reader, entries, shown},
    terms::{parse_span, parse_toleranced},
};

/// What these tables state.
#[derive(Default)]
pub struct Surroundings {
    pub supply: Option<Supply>,
    pub source: Option<Source>,
    pub signal: Option<Signal>,
    pub load: Load,
    pub board: Board,
    pub ambient: Option<Ambient>,
    pub band: Option<Band>,
}

pub fn read<'a>(reader: &mut Reader<'a>, find: &dyn Fn(&str) -> Option<Entry<'a>>, settings: &Settings) -> Surroundings {
    let mut around = Surroundings { ambient: settings.ambient, ..Surroundings::default() };
    if let Some(entry) = find("supply") {
        around.supply = supply(reader, &entry);
    }
    if let Some(entry) = find("source") {
        around.source = source(reader, &entry);
    }
    if let Some(entry) = find("signal") {
        around.signal = signal(reader, &entry);
    }
    if let Some(entry) = find("load") {
        let table = Table::of(reader, &entry, &["resistance", "capacitance"]);
        around.load.resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::AboveZero);
        around.load.capacitance = table.toleranced(reader, "capacitance", Dimension::Capacitance, Least::Zero);
    }
    if let Some(entry) = find("board") {
        let table = Table::of(reader, &entry, &["inverting_node", "non_inverting_node", "across_feedback"]);
        let mut stray = |key| table.toleranced(reader, key, Dimension::Capacitance, Least::Zero);
        around.board = Board {
            inverting_node: stray("inverting_node"),
            non_inverting_node: stray("non_inverting_node"),
            across_feedback: stray("across_feedback"),
        };
    }
    if let Some(entry) = find("ambient") {
        around.ambient = ambient(reader, &entry);
    }
    if let Some(entry) = find("band") {
        around.band = band(reader, &entry);
    }
    around
}

/// `[ambient]`, in blocks and in the settings.
pub fn ambient<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Ambient> {
    let table = Table::of(reader, entry, &["range", "temperature"]);
    if let (Some(_), Some(second)) = (table.find("range"), table.find("temperature")) {
        reader.problem(second.key_range(), "`range` and `temperature` state the same thing", "one of `range`, `temperature`", None);
        return None;
    }
    if table.find("range").is_none() && table.find("temperature").is_none() {
        reader.missing(entry.key_range(), "[ambient] states no temperature", "`range`, as `-20 °C to 50 °C`, or `temperature`");
        return None;
    }
    let key = if table.find("range").is_some() { "range" } else { "temperature" };
    table.read(reader, key, takes(Dimension::Temperature), |t| parse_span(t, Dimension::Temperature)).map(|range| Ambient { range })
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Least {
    AboveZero,
    Zero,
}

/// A table of a block whose keys are all known.
struct Table<'a> {
    name: &'a str,
    entries: Vec<Entry<'a>>,
    header: std::ops::Range<usize>,
}

impl<'a> Table<'a> {
    fn of(reader: &mut Reader<'a>, entry: &Entry<'a>, keys: &[&str]) -> Self {
        let entries = reader.table(entry).map(entries).unwrap_or_default();
        for unknown in entries.iter().filter(|e| !keys.contains(&e.key)) {
            reader.unknown(unknown, format!("[{}] has no key `{}`", entry.key, shown(unknown.key)), keys);
        }
        Self { name: entry.key, entries, header: entry.key_range() }
    }

    fn find(&self, key: &str) -> Option<&Entry<'a>> {
        self.entries.iter().find(|e| e.key == key)
    }

    fn read<T>(&self, reader: &mut Reader<'a>, key: &str, takes: &str, parse: impl FnOnce(&str) -> Result<T, crate::Trouble>) -> Option<T> {
        let entry = self.find(key)?;
        reader.read(entry, &format!("{}.{key}", self.name), takes, parse)
    }

    fn toleranced(&self, reader: &mut Reader<'a>, key: &str, d: Dimension, least: Least) -> Option<Toleranced> {
        self.read(reader, key, takes(d), |t| {
            let value = parse_toleranced(t, d)?;
            if least == Least::Zero {
                not_negative(t, value.nominal, d)?
            } else {
                above_zero(t, value.nominal, d)?
            }
            Ok(value)
        })
    }

    fn required(&self, reader: &mut Reader<'a>, key: &str, allowed: &str) {
        if self.find(key).is_none() {
            reader.missing(self.header.clone(), format!("[{}] has no `{key}`", self.name), allowed);
        }
    }
}

fn supply<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Supply> {
    let table = Table::of(reader, entry, &["positive", "negative"]);
    table.required(reader, "positive", "volts against the stage's ground, as `12 V ± 5 %` or `3.0 V to 4.2 V, 3.7 V nominal`");
    table.required(reader, "negative", "volts against the stage's ground, as `-12 V ± 5 %`; `0 V` for a single supply");
    let mut rail = |key| table.read(reader, key, takes(Dimension::Voltage), |t| parse_span(t, Dimension::Voltage));
    let (positive, negative) = (rail("positive")?, rail("negative")?);
    if positive.low <= negative.high {
        let place = table.find("positive").map_or(table.header.clone(), |e| e.value.span());
        let show = |v| crate::print::trimmed(v, Dimension::Voltage, 4);
        let message =
            format!("the supply is reversed: `positive` goes down to {}, `negative` up to {}", show(positive.low), show(negative.high));
        reader.problem(place, message, "`positive` above `negative` over their whole ranges", None);
        return None;
    }
    Some(Supply { positive, negative, ripple: None })
}

fn source<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Source> {
    let table = Table::of(reader, entry, &["kind", "resistance", "capacitance"]);
    let kind = match table.find("kind") {
        Some(entry) => reader.word(entry, "source.kind", &["resistive", "capacitive"])?,
        // The kind follows from what is stated.
        None if table.find("capacitance").is_some() => "capacitive",
        None => "resistive",
    };
    let (key, other) = if kind == "resistive" { ("resistance", "capacitance") } else { ("capacitance", "resistance") };
    if let Some(stray) = table.find(other) {
        reader.problem(stray.key_range(), format!("a {kind} source has no `{other}`"), format!("`{key}`"), None);
    }
    table.required(
        reader,
        key,
        if kind == "resistive" { "ohms, as `600`, `2k 5%`; `0` for an ideal source" } else { "farads, as `3n3`, `10 nF 5%`" },
    );
    if kind == "resistive" {
        let resistance = table.toleranced(reader, key, Dimension::Resistance, Least::Zero)?;
        Some(Source::Resistive { resistance })
    } else {
        let capacitance = table.toleranced(reader, key, Dimension::Capacitance, Least::AboveZero)?;
        Some(Source::Capacitive { capacitance })
    }
}

/// Amplitude, steady part, frequency and shape. Without a stated shape the signal is a sine; an rms amplitude needs the
/// shape stated, since the peak follows from it.
fn signal<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Signal> {
    const AMPLITUDES: [&str; 4] = ["peak", "peak_to_peak", "rms", "range"];
    let table = Table::of(reader, entry, &["peak", "peak_to_peak", "rms", "range", "frequency", "dc", "waveform", "crest_factor"]);
    let volts = |reader: &mut Reader<'a>, key| {
        table.read(reader, key, takes(Dimension::Voltage), |t| {
            let value = parse(t, Dimension::Voltage)?;
            not_negative(t, value, Dimension::Voltage).map(|()| value)
        })
    };
    let frequency = table.read(reader, "frequency", takes(Dimension::Frequency), |t| {
        let value = parse(t, Dimension::Frequency)?;
        above_zero(t, value, Dimension::Frequency).map(|()| value)
    });
    let dc = table.read(reader, "dc", takes(Dimension::Voltage), |t| parse(t, Dimension::Voltage));
    let crest_factor = crest_factor(reader, &table);
    let given: Vec<&Entry<'_>> = AMPLITUDES.iter().filter_map(|k| table.find(k)).collect();
    let [amplitude] = given.as_slice() else {
        let allowed = "exactly one of `peak`, `peak_to_peak`, `rms`, `range`";
        match given.get(1) {
            Some(second) => reader.problem(
                second.key_range(),
                format!("the amplitude is stated twice, as `{}` and as `{}`", given[0].key, second.key),
                allowed,
                None,
            ),
            None => reader.missing(table.header.clone(), "[signal] states no amplitude", allowed),
        }
        return None;
    };
    let sine = crest_factor.unwrap_or(SQRT_2);
    let signal = |peak: f64, dc: f64| Signal { peak, frequency, dc, crest_factor: sine };
    match amplitude.key {
        "peak" => Some(signal(volts(reader, "peak")?, dc.unwrap_or(0.0))),
        "peak_to_peak" => Some(signal(volts(reader, "peak_to_peak")? / 2.0, dc.unwrap_or(0.0))),
        "rms" => {
            let rms = volts(reader, "rms")?;
            if table.find("waveform").is_none() && table.find("crest_factor").is_none() {
                let allowed = "`waveform`, as `sine`, or `crest_factor`, peak over rms";
                reader.missing(amplitude.key_range(), "`rms` does not say how high the peaks are", allowed);
                return None;
            }
            Some(signal(rms * sine, dc.unwrap_or(0.0)))
        }
        _ => {
            let range: Span = table.read(reader, "range", takes(Dimension::Voltage), |t| parse_span(t, Dimension::Voltage))?;
            if let Some(dc) = table.find("dc") {
                reader.problem(
                    dc.key_range(),
                    "`range` states the steady part already",
                    "`dc` beside `peak`, `peak_to_peak` or `rms`",
                    None,
                );
                return None;
            }
            Some(signal((range.high - range.low) / 2.0, f64::midpoint(range.low, range.high)))
        }
    }
}

fn crest_factor<'a>(reader: &mut Reader<'a>, table: &Table<'a>) -> Option<f64> {
    let stated = table.read(reader, "crest_factor", "takes a number", |t| {
        let value = parse(t, Dimension::Number)?;
        let allowed = "peak over rms, at least 1".into();
        let below = || crate::Trouble { range: 0..t.len(), message: format!("{} is below 1", quoted(t)), allowed, attempt: None };
        if value >= 1.0 { Ok(value) } else { Err(below()) }
    });
    let Some(entry) = table.find("waveform") else { return stated };
    let word = reader.word(entry, "signal.waveform", &["sine", "triangle", "square"])?;
    if table.find("crest_factor").is_some() {
        reader.problem(entry.key_range(), "`waveform` and `crest_factor` state the same thing", "one of `waveform`, `crest_factor`", None);
        return None;
    }
    // Peak over rms: √2, √3, 1; by integrating the squares over a quarter period.
    Some(match word {
        "sine" => SQRT_2,
        "triangle" => libm::sqrt(3.0),
        _ => 1.0,
    })
}

fn band<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Band> {
    let table = Table::of(reader, entry, &["from", "to"]);
    table.required(reader, "from", "the lower edge, as `10 Hz`; above zero, since 1/f noise diverges there");
    table.required(reader, "to", "the upper edge, as `20 kHz`");
    let mut edge = |key| {
        table.read(reader, key, takes(Dimension::Frequency), |t| {
            let value = parse(t, Dimension::Frequency)?;
            above_zero(t, value, Dimension::Frequency).map(|()| value)
        })
    };
    let (from, to) = (edge("from"), edge("to"));
    let (from, to) = (from?, to?);
    if from >= to {
        let place = table.find("to").map_or(table.header.clone(), |e| e.value.span());
        reader.problem(place, "the band ends where it begins or below", "`to` above `from`", None);
        return None;
    }
    Some(Band { from, to })
}
