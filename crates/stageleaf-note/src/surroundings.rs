//! What surrounds a stage: supply, load, board, ambient, band. What drives it is read in [`crate::driving`].

use stageleaf_math::{
    dimension::Dimension,
    stage::{Ambient, Band, Board, Converter, Load, Ripple, Supply, Toleranced},
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
    pub load: Load,
    pub converter: Converter,
    pub board: Board,
    pub ambient: Option<Ambient>,
    pub band: Option<Band>,
}

pub fn read<'a>(reader: &mut Reader<'a>, find: &dyn Fn(&str) -> Option<Entry<'a>>, settings: &Settings) -> Surroundings {
    let mut around = Surroundings { ambient: settings.ambient, ..Surroundings::default() };
    if let Some(entry) = find("supply") {
        around.supply = supply(reader, &entry);
    }
    if let Some(entry) = find("load") {
        let table = Table::of(reader, &entry, &["resistance", "capacitance"]);
        around.load.resistance = table.toleranced(reader, "resistance", Dimension::Resistance, Least::AboveZero);
        around.load.capacitance = table.toleranced(reader, "capacitance", Dimension::Capacitance, Least::Zero);
    }
    if let Some(entry) = find("converter") {
        around.converter = converter(reader, &entry);
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
    let table = Table::of(reader, entry, &["range", "temperature", "values_at"]);
    if let (Some(_), Some(second)) = (table.find("range"), table.find("temperature")) {
        reader.problem(second.key_range(), "`range` and `temperature` state the same thing", "one of `range`, `temperature`", None);
        return None;
    }
    if table.find("range").is_none() && table.find("temperature").is_none() {
        reader.missing(entry.key_range(), "[ambient] states no temperature", "`range`, as `-20 °C to 50 °C`, or `temperature`");
        return None;
    }
    let key = if table.find("range").is_some() { "range" } else { "temperature" };
    let range = table.read(reader, key, takes(Dimension::Temperature), |t| parse_span(t, Dimension::Temperature));
    let values_at = table.read(reader, "values_at", takes(Dimension::Temperature), |t| parse(t, Dimension::Temperature));
    range.map(|range| Ambient { range, values_at })
}

#[derive(Clone, Copy, PartialEq, Eq)]
pub enum Least {
    AboveZero,
    Zero,
    /// Of either sign.
    Any,
}

/// A table of a block whose keys are all known.
pub struct Table<'a> {
    /// As its header has it, and as the paths of its values begin: `signal.in2`.
    pub name: String,
    pub entries: Vec<Entry<'a>>,
    pub header: std::ops::Range<usize>,
    /// False where something else stands in its place, which has been told: nothing is missing from it then.
    pub is_table: bool,
}

impl<'a> Table<'a> {
    pub fn of(reader: &mut Reader<'a>, entry: &Entry<'a>, keys: &[&str]) -> Self {
        Self::called(entry.key, reader, entry, keys)
    }

    /// A table in a table.
    pub fn called(name: &str, reader: &mut Reader<'a>, entry: &Entry<'a>, keys: &[&str]) -> Self {
        let table = Self::open(name, reader, entry);
        for unknown in table.entries.iter().filter(|e| !keys.contains(&e.key)) {
            reader.unknown(unknown, format!("[{name}] has no key `{}`", shown(unknown.key)), keys);
        }
        table
    }

    /// A table whose keys the caller looks at.
    pub fn open(name: &str, reader: &mut Reader<'a>, entry: &Entry<'a>) -> Self {
        let table = reader.table_called(name, entry);
        Self {
            name: name.to_owned(),
            entries: table.map(entries).unwrap_or_default(),
            header: entry.key_range(),
            is_table: table.is_some(),
        }
    }

    pub fn path(&self, key: &str) -> String {
        format!("{}.{key}", self.name)
    }

    pub fn find(&self, key: &str) -> Option<&Entry<'a>> {
        self.entries.iter().find(|e| e.key == key)
    }

    pub fn read<T>(
        &self,
        reader: &mut Reader<'a>,
        key: &str,
        takes: &str,
        parse: impl FnOnce(&str) -> Result<T, crate::Trouble>,
    ) -> Option<T> {
        let entry = self.find(key)?;
        reader.read(entry, &self.path(key), takes, parse)
    }

    pub fn toleranced(&self, reader: &mut Reader<'a>, key: &str, d: Dimension, least: Least) -> Option<Toleranced> {
        self.read(reader, key, takes(d), |t| {
            let value = parse_toleranced(t, d)?;
            match least {
                Least::AboveZero => above_zero(t, value.nominal, d)?,
                Least::Zero => not_negative(t, value.nominal, d)?,
                Least::Any => {}
            }
            Ok(value)
        })
    }

    pub fn required(&self, reader: &mut Reader<'a>, key: &str, allowed: &str) {
        if self.is_table && self.find(key).is_none() {
            reader.missing(self.header.clone(), format!("[{}] has no `{key}`", self.name), allowed);
        }
    }
}

fn supply<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Option<Supply> {
    let table = Table::of(reader, entry, &["positive", "negative", "ripple", "ripple_frequency"]);
    table.required(reader, "positive", "volts against the stage's ground, as `12 V ± 5 %` or `3.0 V to 4.2 V, 3.7 V nominal`");
    table.required(reader, "negative", "volts against the stage's ground, as `-12 V ± 5 %`; `0 V` for a single supply");
    let mut rail = |key| table.read(reader, key, takes(Dimension::Voltage), |t| parse_span(t, Dimension::Voltage));
    let (positive, negative) = (rail("positive"), rail("negative"));
    let ripple = ripple(reader, &table);
    let (positive, negative) = (positive?, negative?);
    if positive.low <= negative.high {
        let place = table.find("positive").map_or(table.header.clone(), |e| e.value.span());
        let show = |v| crate::print::trimmed(v, Dimension::Voltage, 4);
        let message =
            format!("the supply is reversed: `positive` goes down to {}, `negative` up to {}", show(positive.low), show(negative.high));
        reader.problem(place, message, "`positive` above `negative` over their whole ranges", None);
        return None;
    }
    Some(Supply { positive, negative, ripple })
}

/// `ripple` says itself whether it is a peak or peak to peak, since both are in use; it comes with its frequency.
fn ripple<'a>(reader: &mut Reader<'a>, table: &Table<'a>) -> Option<Ripple> {
    let peak = table.read(reader, "ripple", takes(Dimension::Voltage), parse_peak);
    let frequency = table.read(reader, "ripple_frequency", takes(Dimension::Frequency), |t| {
        let value = parse(t, Dimension::Frequency)?;
        above_zero(t, value, Dimension::Frequency).map(|()| value)
    });
    for (given, missing, allowed) in [
        ("ripple", "ripple_frequency", "`ripple_frequency`, as `100 Hz`, `300 kHz`"),
        ("ripple_frequency", "ripple", "`ripple`, as `20 mV peak to peak`"),
    ] {
        if let (Some(entry), None) = (table.find(given), table.find(missing)) {
            reader.missing(entry.key_range(), format!("`{given}` needs `{missing}`, which is not there"), allowed);
        }
    }
    Some(Ripple { peak: peak?, frequency: frequency? })
}

/// Reads an amplitude that says what it is: `20 mV peak to peak`, `10 mV p-p`, `10 mV peak`. Gives the peak.
fn parse_peak(text: &str) -> Result<f64, crate::Trouble> {
    let body = text.trim_end();
    let words = [("peak to peak", 2.0), ("peak-to-peak", 2.0), ("p-p", 2.0), ("peak", 1.0)];
    let stated = words.into_iter().find_map(|(word, over)| body.strip_suffix(word).map(|volts| (volts, over)));
    let volts = stated.map_or(body, |(volts, _)| volts).trim_end();
    let d = Dimension::Voltage;
    let value = parse(volts, d).and_then(|value| not_negative(volts, value, d).map(|()| value));
    let value = value.map_err(|mut trouble| {
        trouble.allowed = AMPLITUDE.into();
        trouble
    })?;
    match stated {
        Some((_, over)) => Ok(value / over),
        None => Err(crate::Trouble {
            range: 0..text.len(),
            message: format!("{} does not say whether it is a peak or peak to peak", quoted(text)),
            allowed: AMPLITUDE.into(),
            attempt: Some(format!("{volts} peak to peak")),
        }),
    }
}

const AMPLITUDE: &str = "volts with what they count, as `20 mV peak to peak`, `10 mV peak`";

fn converter<'a>(reader: &mut Reader<'a>, entry: &Entry<'a>) -> Converter {
    const KEYS: &[&str] = &[
        "full_scale",
        "bits",
        "noise",
        "sample_capacitance",
        "switch_resistance",
        "acquisition_time",
        "series_resistance",
        "shunt_capacitance",
    ];
    let table = Table::of(reader, entry, KEYS);
    let full_scale = table.read(reader, "full_scale", takes(Dimension::Voltage), |t| {
        let allowed = "both ends of the input range, as `0 V to 4.096 V`, `-2.5 V to 2.5 V`";
        let trouble = |message, attempt| crate::Trouble { range: 0..t.len(), message, allowed: allowed.into(), attempt };
        let span = parse_span(t, Dimension::Voltage)?;
        if !t.contains(" to ") {
            return Err(trouble(format!("{} does not say where the input range begins and ends", quoted(t)), Some(format!("0 V to {t}"))));
        }
        if span.low < span.high { Ok([span.low, span.high]) } else { Err(trouble(format!("{} is no range", quoted(t)), None)) }
    });
    let bits = table.read(reader, "bits", takes(Dimension::Number), |t| {
        let value = parse(t, Dimension::Number)?;
        let whole = (1.0..=32.0).contains(&value) && libm::floor(value) >= value;
        let trouble = || {
            let message = format!("{} is no number of bits", quoted(t));
            crate::Trouble { range: 0..t.len(), message, allowed: "a whole number from 1 to 32".into(), attempt: None }
        };
        if whole { Ok(value) } else { Err(trouble()) }
    });
    let noise = table.read(reader, "noise", takes(Dimension::Voltage), |t| {
        let value = parse(t, Dimension::Voltage)?;
        not_negative(t, value, Dimension::Voltage).map(|()| value)
    });
    let acquisition_time = table.read(reader, "acquisition_time", takes(Dimension::Time), |t| {
        let value = parse(t, Dimension::Time)?;
        above_zero(t, value, Dimension::Time).map(|()| value)
    });
    let mut part = |key, d| table.toleranced(reader, key, d, Least::AboveZero);
    Converter {
        full_scale,
        bits,
        noise,
        acquisition_time,
        sample_capacitance: part("sample_capacitance", Dimension::Capacitance),
        switch_resistance: part("switch_resistance", Dimension::Resistance),
        series_resistance: part("series_resistance", Dimension::Resistance),
        shunt_capacitance: part("shunt_capacitance", Dimension::Capacitance),
    }
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
