//! What drives a stage: signals, sources, the reference. Which tables and keys there are depends on the kind.
//!
//! - One signal: `[signal]`, `[source]`; at a current's or a charge's input the amplitude is in A or C.
//! - Several signals: `[signal.in1]`, `[signal.in2]`, …, and so for sources.
//! - A difference: `[signal]` is the difference of the inputs, with their `common_mode`; a source of `kind = "bridge"` has its
//!   resistance in both inputs, any other stands under `[source.in1]` or `[source.in2]`.
//! - A reference: `[reference]`.

use std::f64::consts::SQRT_2;

use stageleaf_math::{
    dimension::Dimension,
    kind::{Drives, Kind},
    network::Drive,
    stage::{ReferenceVoltage, Signal, Source, Span},
};

use crate::{
    parse,
    paths::{has_reference, signal_dimension, signal_inputs},
    problem::quoted,
    reading::{above_zero, listed, not_negative, takes},
    surroundings::{Least, Table},
    table::{Entry, Reader, shown},
    terms::parse_span,
    words::kind_text,
};

/// Keys of a signal.
const SIGNAL: &[&str] = &["peak", "peak_to_peak", "rms", "range", "frequency", "dc", "waveform", "crest_factor"];
/// Those of which exactly one states the amplitude.
const AMPLITUDES: &[&str] = &["peak", "peak_to_peak", "rms", "range"];
/// Keys of a source at a voltage's input.
const SOURCE: &[&str] = &["kind", "resistance", "capacitance"];
/// Keys of a source at a current's or a charge's input.
const CURRENT_SOURCE: &[&str] = &["kind", "resistance", "capacitance", "shunt_resistance", "dark_current"];

/// What these tables state.
#[derive(Default)]
pub struct Driving {
    pub sources: Vec<Option<Source>>,
    pub signals: Vec<Option<Signal>>,
    pub common_mode: Option<Span>,
    pub reference: Option<ReferenceVoltage>,
}

/// The inputs of a kind at which a signal can stand, and what it measures there.
pub struct Inputs {
    kind: Kind,
    names: Vec<&'static str>,
    /// The resistors of a summing stage that are missing, by input.
    lost: Vec<Option<String>>,
    drive: Drive,
}

impl Inputs {
    /// Those of a kind with these components (by name).
    pub fn of(kind: Kind, given: &[&str]) -> Self {
        let signals = signal_inputs(kind);
        // The first two are required: that one is missing is told elsewhere.
        let lost = |i: usize| (kind == Kind::Summing && i >= 2).then(|| format!("Rin{}", i + 1)).filter(|r| !given.contains(&r.as_str()));
        Self {
            kind,
            names: signals.iter().map(|i| i.name).collect(),
            lost: (0..signals.len()).map(lost).collect(),
            drive: signals.first().map_or(Drive::Voltage, |i| i.drive),
        }
    }

    /// What a signal's amplitude measures.
    const fn dimension(&self) -> Dimension {
        signal_dimension(self.drive)
    }

    const fn is_differential(&self) -> bool {
        matches!(self.kind.spec().drives, Drives::Differential)
    }

    fn has_several(&self) -> bool {
        self.names.len() > 1
    }

    /// The inputs that this stage has.
    fn present(&self) -> impl Iterator<Item = &'static str> + '_ {
        self.names.iter().zip(&self.lost).filter(|(_, lost)| lost.is_none()).map(|(name, _)| *name)
    }

    /// `[signal.in1]`, `[signal.in2]`.
    fn tables(&self, table: &str) -> String {
        self.present().map(|n| format!("`[{table}.{n}]`")).collect::<Vec<_>>().join(", ")
    }
}

/// Reads them all.
pub fn read<'a>(
    reader: &mut Reader<'a>,
    find: &dyn Fn(&str) -> Option<Entry<'a>>,
    start: &std::ops::Range<usize>,
    inputs: &Inputs,
) -> Driving {
    let mut driving = Driving::default();
    if let Some(entry) = find("source") {
        driving.sources = sources(reader, &entry, inputs);
    }
    if let Some(entry) = find("signal") {
        (driving.signals, driving.common_mode) = signals(reader, &entry, inputs);
    }
    driving.reference = reference(reader, find("reference"), start, inputs);
    driving
}

/// The entry of `name` under a table of inputs; what is no input, or no input of this stage, is told.
fn by_input<'t, 'a>(reader: &mut Reader<'a>, table: &'t Table<'a>, inputs: &Inputs) -> Vec<Option<&'t Entry<'a>>> {
    let kind = kind_text(inputs.kind);
    let present: Vec<&str> = inputs.present().collect();
    for entry in &table.entries {
        match inputs.names.iter().position(|n| *n == entry.key) {
            None => reader.unknown(entry, format!("{kind} has no input `{}`", shown(entry.key)), &present),
            Some(i) => {
                if let Some(resistor) = &inputs.lost[i] {
                    let allowed = format!("`{resistor}` under [components]; without it, {}", listed(&present));
                    reader.missing(entry.key_range(), format!("`{}` has no input resistor: there is no `{resistor}`", entry.key), allowed);
                }
            }
        }
    }
    inputs.names.iter().map(|n| table.find(n)).collect()
}

/// Tells of keys that name an input where the table itself is the one for all: `[signal.in1]` of a kind with one signal.
/// Says whether there are any.
fn names_inputs<'a>(reader: &mut Reader<'a>, table: &Table<'a>, why: &str) -> bool {
    let stray: Vec<&Entry<'a>> = table.entries.iter().filter(|e| is_input(e.key)).collect();
    for entry in &stray {
        let name = &table.name;
        let message = format!("there is no [{name}.{}]: {why}", entry.key);
        reader.problem(entry.key_range(), message, format!("the same keys under `[{name}]`"), None);
    }
    !stray.is_empty()
}

fn is_input(key: &str) -> bool {
    key.strip_prefix("in").is_some_and(|n| !n.is_empty() && n.len() <= 2 && n.bytes().all(|b| b.is_ascii_digit()))
}

/// Keys that the table has for some kinds, but not for this one.
fn of_other_kinds<'a>(reader: &mut Reader<'a>, table: &Table<'a>, keys: &[&str], inputs: &Inputs) {
    for entry in table.entries.iter().filter(|e| !keys.contains(&e.key) && !is_input(e.key)) {
        let message = match entry.key {
            "common_mode" | "shunt_resistance" | "dark_current" => {
                format!("{} has no `{}` under [{}]", kind_text(inputs.kind), entry.key, table.name)
            }
            key => format!("[{}] has no key `{}`", table.name, shown(key)),
        };
        reader.unknown(entry, message, keys);
    }
}

fn signals<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>, inputs: &Inputs) -> (Vec<Option<Signal>>, Option<Span>) {
    let d = inputs.dimension();
    let kind = kind_text(inputs.kind);
    let table = Table::open("signal", reader, entry);
    if inputs.is_differential() {
        let keys: Vec<&str> = SIGNAL.iter().copied().chain(["common_mode"]).collect();
        of_other_kinds(reader, &table, &keys, inputs);
        if names_inputs(reader, &table, &format!("the signal of {kind} is the difference in2 − in1")) {
            return (Vec::new(), None);
        }
        let common_mode = table.read(reader, "common_mode", takes(d), |t| parse_span(t, d));
        return (vec![signal(reader, &table, d)], common_mode);
    }
    if !inputs.has_several() {
        of_other_kinds(reader, &table, SIGNAL, inputs);
        if names_inputs(reader, &table, &format!("{kind} has one signal")) {
            return (Vec::new(), None);
        }
        return (vec![signal(reader, &table, d)], None);
    }
    if let Some(stray) = table.entries.iter().find(|e| SIGNAL.contains(&e.key)) {
        reader.problem(stray.key_range(), format!("`{}` does not say at which input of {kind}", stray.key), inputs.tables("signal"), None);
        return (Vec::new(), None);
    }
    let entries = by_input(reader, &table, inputs);
    let signals = entries
        .into_iter()
        .map(|entry| {
            let entry = entry?;
            let table = Table::called(&table.path(entry.key), reader, entry, SIGNAL);
            signal(reader, &table, d)
        })
        .collect();
    (trimmed(signals), None)
}

/// Without what is absent at the end.
fn trimmed<T>(mut list: Vec<Option<T>>) -> Vec<Option<T>> {
    while list.last().is_some_and(Option::is_none) {
        list.pop();
    }
    list
}

fn sources<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>, inputs: &Inputs) -> Vec<Option<Source>> {
    let kind = kind_text(inputs.kind);
    let table = Table::open("source", reader, entry);
    if !inputs.has_several() {
        let voltage = inputs.drive == Drive::Voltage;
        of_other_kinds(reader, &table, if voltage { SOURCE } else { CURRENT_SOURCE }, inputs);
        if names_inputs(reader, &table, &format!("{kind} has one input")) {
            return Vec::new();
        }
        let source = if voltage { voltage_source(reader, &table) } else { current_source(reader, &table) };
        return vec![source];
    }
    if inputs.is_differential() && table.find("kind").is_some() {
        return bridge(reader, &table, inputs).map_or_else(Vec::new, |source| vec![Some(source); 2]);
    }
    if let Some(stray) = table.entries.iter().find(|e| CURRENT_SOURCE.contains(&e.key)) {
        let alike = if inputs.is_differential() { "`kind = \"bridge\"` for both inputs alike, or " } else { "" };
        let message = format!("`{}` does not say at which input of {kind}", stray.key);
        reader.problem(stray.key_range(), message, format!("{alike}{}", inputs.tables("source")), None);
        return Vec::new();
    }
    let entries = by_input(reader, &table, inputs);
    let sources = entries
        .into_iter()
        .map(|entry| {
            let entry = entry?;
            let table = Table::called(&table.path(entry.key), reader, entry, SOURCE);
            voltage_source(reader, &table)
        })
        .collect();
    trimmed(sources)
}

/// A bridge: the same resistance in both inputs of a differential kind.
fn bridge<'a>(reader: &mut Reader<'a>, table: &Table<'a>, inputs: &Inputs) -> Option<Source> {
    let entry = table.find("kind")?;
    let text = reader.text(entry, "source.kind")?;
    if text.text != "bridge" {
        let message = format!("[source] of {} cannot be of kind {}", kind_text(inputs.kind), quoted(&text.text));
        let allowed = format!("`bridge` for both inputs alike; `resistive` or `capacitive` under {}", inputs.tables("source"));
        reader.problem(text.whole, message, allowed, None);
        return None;
    }
    for entry in table.entries.iter().filter(|e| !["kind", "resistance"].contains(&e.key)) {
        if is_input(entry.key) {
            let message = format!("a bridge is the source of both inputs; `{}` has another", entry.key);
            reader.problem(entry.key_range(), message, format!("either `kind = \"bridge\"` or {}", inputs.tables("source")), None);
        } else {
            reader.unknown(entry, format!("a bridge has no `{}`", shown(entry.key)), &["kind", "resistance"]);
        }
    }
    table.required(reader, "resistance", "ohms, as `350`, `1k 1%`: the bridge as each of both inputs sees it");
    let resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::Zero)?;
    Some(Source::Resistive { resistance })
}

fn voltage_source<'a>(reader: &mut Reader<'a>, table: &Table<'a>) -> Option<Source> {
    let kind = match table.find("kind") {
        Some(entry) => reader.word(entry, &table.path("kind"), &["resistive", "capacitive"])?,
        // The kind follows from what is stated.
        None if table.find("capacitance").is_some() => "capacitive",
        None => "resistive",
    };
    if kind == "capacitive" {
        return capacitive(reader, table, SOURCE);
    }
    foreign(reader, table, kind, SOURCE, &["resistance"]);
    table.required(reader, "resistance", "ohms, as `600`, `2k 5%`; `0` for an ideal source");
    let resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::Zero)?;
    Some(Source::Resistive { resistance })
}

/// A source of current or charge, with what stands across it.
fn current_source<'a>(reader: &mut Reader<'a>, table: &Table<'a>) -> Option<Source> {
    let kind = match table.find("kind") {
        Some(entry) => reader.word(entry, &table.path("kind"), &["photodiode", "resistive", "capacitive"])?,
        None if table.find("shunt_resistance").is_some() || table.find("dark_current").is_some() => "photodiode",
        None if table.find("capacitance").is_some() => "capacitive",
        None => "resistive",
    };
    match kind {
        "capacitive" => capacitive(reader, table, CURRENT_SOURCE),
        "resistive" => {
            foreign(reader, table, kind, CURRENT_SOURCE, &["resistance"]);
            table.required(reader, "resistance", "ohms, as `10M`: what stands across the source; leave [source] out for an ideal one");
            let resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::AboveZero)?;
            Some(Source::Resistive { resistance })
        }
        _ => {
            foreign(reader, table, kind, CURRENT_SOURCE, &["capacitance", "shunt_resistance", "dark_current"]);
            table.required(reader, "capacitance", "farads, as `70p 10%`: the junction at the bias that it has here");
            let shunt_resistance = table.toleranced(reader, "shunt_resistance", Dimension::Resistance, Least::AboveZero);
            let dark_current = table.toleranced(reader, "dark_current", Dimension::Current, Least::Zero);
            let capacitance = table.toleranced(reader, "capacitance", Dimension::Capacitance, Least::AboveZero)?;
            Some(Source::Photodiode { capacitance, shunt_resistance, dark_current })
        }
    }
}

fn capacitive<'a>(reader: &mut Reader<'a>, table: &Table<'a>, known: &[&str]) -> Option<Source> {
    foreign(reader, table, "capacitive", known, &["capacitance"]);
    table.required(reader, "capacitance", "farads, as `3n3`, `10 nF 5%`");
    let capacitance = table.toleranced(reader, "capacitance", Dimension::Capacitance, Least::AboveZero)?;
    Some(Source::Capacitive { capacitance })
}

/// Keys that sources have here, but not one of this kind.
fn foreign<'a>(reader: &mut Reader<'a>, table: &Table<'a>, kind: &str, known: &[&str], keys: &[&str]) {
    let source = if kind == "photodiode" { kind.to_owned() } else { format!("{kind} source") };
    for stray in table.entries.iter().filter(|e| e.key != "kind" && known.contains(&e.key) && !keys.contains(&e.key)) {
        reader.problem(stray.key_range(), format!("a {source} has no `{}`", stray.key), listed(keys), None);
    }
}

fn reference<'a>(
    reader: &mut Reader<'a>,
    entry: Option<Entry<'a>>,
    start: &std::ops::Range<usize>,
    inputs: &Inputs,
) -> Option<ReferenceVoltage> {
    let kind = kind_text(inputs.kind);
    let voltage = "`voltage`, as `2.5 V 0.1%`; and its output `resistance` where it counts";
    let Some(entry) = entry else {
        if has_reference(inputs.kind) {
            reader.missing(
                start.clone(),
                format!(
                    "[reference] is missing: {kind} takes its {} from it",
                    if inputs.kind.switches() { "thresholds" } else { "offset" }
                ),
                voltage,
            );
        }
        return None;
    };
    if !has_reference(inputs.kind) {
        let takers: Vec<&str> = Kind::ALL.iter().filter(|k| has_reference(**k)).map(|k| k.id()).collect();
        reader.problem(
            entry.key_range(),
            format!("{kind} takes no [reference]"),
            format!("[reference] in a stage of kind {}", listed(&takers)),
            None,
        );
        return None;
    }
    let table = Table::of(reader, &entry, &["voltage", "resistance"]);
    table.required(reader, "voltage", "volts, as `2.5 V 0.1%`");
    let resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::Zero);
    let voltage = table.toleranced(reader, "voltage", Dimension::Voltage, Least::Any)?;
    Some(ReferenceVoltage { voltage, resistance })
}

/// Amplitude, steady part, frequency and shape; or the steady part alone. Without a stated shape the signal is a sine; an rms amplitude needs the
/// shape stated, since the peak follows from it.
fn signal<'a>(reader: &mut Reader<'a>, table: &Table<'a>, d: Dimension) -> Option<Signal> {
    let size = |reader: &mut Reader<'a>, key| {
        table.read(reader, key, takes(d), |t| {
            let value = parse(t, d)?;
            not_negative(t, value, d).map(|()| value)
        })
    };
    let frequency = table.read(reader, "frequency", takes(Dimension::Frequency), |t| {
        let value = parse(t, Dimension::Frequency)?;
        above_zero(t, value, Dimension::Frequency).map(|()| value)
    });
    let dc = table.read(reader, "dc", takes(d), |t| parse(t, d));
    let crest_factor = crest_factor(reader, table);
    let given: Vec<&Entry<'_>> = AMPLITUDES.iter().filter_map(|k| table.find(k)).collect();
    let [amplitude] = given.as_slice() else {
        let allowed = "exactly one of `peak`, `peak_to_peak`, `rms`, `range`";
        let of_shape = || ["waveform", "crest_factor"].into_iter().find_map(|key| table.find(key));
        match given.get(1) {
            Some(second) => reader.problem(
                second.key_range(),
                format!("the amplitude is stated twice, as `{}` and as `{}`", given[0].key, second.key),
                allowed,
                None,
            ),
            None if !table.is_table => {}
            // A signal that stands still.
            None if table.find("dc").is_some() => {
                let Some(shape) = of_shape() else { return Some(Signal { peak: 0.0, frequency, dc: dc?, crest_factor: SQRT_2 }) };
                let message = format!("`{}` says nothing of a signal without an amplitude", shape.key);
                reader.problem(shape.key_range(), message, "`peak`, `peak_to_peak`, `rms` or `range` beside it", None);
            }
            None => {
                reader.missing(table.header.clone(), format!("[{}] states no amplitude", table.name), format!("{allowed}; or `dc` alone"))
            }
        }
        return None;
    };
    let sine = crest_factor.unwrap_or(SQRT_2);
    let signal = |peak: f64, dc: f64| Signal { peak, frequency, dc, crest_factor: sine };
    match amplitude.key {
        "peak" => Some(signal(size(reader, "peak")?, dc.unwrap_or(0.0))),
        "peak_to_peak" => Some(signal(size(reader, "peak_to_peak")? / 2.0, dc.unwrap_or(0.0))),
        "rms" => {
            let rms = size(reader, "rms")?;
            if table.find("waveform").is_none() && table.find("crest_factor").is_none() {
                let allowed = "`waveform`, as `sine`, or `crest_factor`, peak over rms";
                reader.missing(amplitude.key_range(), "`rms` does not say how high the peaks are", allowed);
                return None;
            }
            Some(signal(rms * sine, dc.unwrap_or(0.0)))
        }
        _ => {
            let range: Span = table.read(reader, "range", takes(d), |t| parse_span(t, d))?;
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
    let word = reader.word(entry, &table.path("waveform"), &["sine", "triangle", "square"])?;
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
