//! The paths of a block's values: what a sheet can offer a field for, and what each measures.
//!
//! | path | where | value |
//! |---|---|---|
//! | `stage`, `name`, `part`, `isolation` | every kind | text |
//! | `parts.A2` | kinds with several amplifiers | a part of the shelf |
//! | `components.Rf` | the kind's components | resistance or capacitance, toleranced |
//! | `supply.positive`, `supply.negative` | every kind | voltage, a span |
//! | `supply.ripple`, `supply.ripple_frequency` | every kind | voltage that says `peak` or `peak to peak`; frequency |
//! | `signal.peak` (or `peak_to_peak`, `rms`, `range`), `signal.dc` | kinds with one signal | V, at a current's or charge's input A or C |
//! | `signal.frequency`, `signal.waveform`, `signal.crest_factor` | kinds with one signal | frequency, word, number |
//! | `signal.common_mode` | differential kinds, whose `signal.peak` is that of the difference | voltage, a span |
//! | `signal.in2.peak` and so on | kinds with several signals, each input | as above |
//! | `source.kind`, `source.resistance`, `source.capacitance` | kinds with one signal | word, toleranced |
//! | `source.shunt_resistance`, `source.dark_current` | kinds driven by a current or a charge | toleranced |
//! | `source.resistance` beside `source.kind` of `bridge` | differential kinds: both inputs | toleranced |
//! | `source.in1.resistance`, `source.in1.capacitance`, `source.in1.kind` | differential kinds and those with several signals | toleranced |
//! | `reference.voltage`, `reference.resistance` | kinds with a reference | toleranced |
//! | `load.resistance`, `load.capacitance` | every kind | toleranced |
//! | `converter.series_resistance`, `converter.shunt_capacitance`, `converter.sample_capacitance`, `converter.switch_resistance` | every kind | toleranced |
//! | `converter.full_scale`, `converter.bits`, `converter.acquisition_time`, `converter.noise` | every kind | a range in V, a whole number, a time, V rms |
//! | `board.inverting_node`, `board.non_inverting_node`, `board.across_feedback` | every kind | capacitance, toleranced |
//! | `ambient.range` or `ambient.temperature` | every kind | temperature, a span |
//! | `ambient.values_at` | every kind | temperature at which component values hold |
//! | `band.from`, `band.to` | every kind | frequency |
//! | `limits.bandwidth`, `limits.gain_at 2 MHz` | every kind | a limit |
//! | `measured.gain.value` | every kind | what was measured |

use stageleaf_math::{
    dimension::Dimension,
    kind::{Drives, Feed, InputSpec, Kind},
    network::Drive,
    part::Part,
    stage::{Board, Component, Converter, Isolation, Load, Stage, Toleranced},
};

/// What the value at `path` measures in a stage of this kind; `None` where it is a word, a limit, or nothing of this kind's.
#[must_use]
pub fn dimension(path: &str, kind: Kind) -> Option<Dimension> {
    let (table, rest) = path.split_once('.')?;
    let inputs = signal_inputs(kind);
    let several = inputs.len() > 1;
    let differential = matches!(kind.spec().drives, Drives::Differential);
    let (input, key) = match rest.split_once('.') {
        Some((input, key)) if matches!(table, "signal" | "source") => (Some(input), key),
        _ => (None, rest),
    };
    if input.is_some_and(|name| !several || !inputs.iter().any(|i| i.name == name)) {
        return None;
    }
    let by_table = if table == "signal" { several && !differential } else { several };
    let here = input.is_some() == by_table;
    let drive = inputs.first().map_or(Drive::Voltage, |i| i.drive);
    match (table, key) {
        ("components", name) => kind.components().iter().find(|c| c.name == name).map(|c| c.dimension),
        ("signal", "frequency") if here => Some(Dimension::Frequency),
        ("signal", "crest_factor") if here => Some(Dimension::Number),
        ("signal", "common_mode") => (differential && input.is_none()).then_some(Dimension::Voltage),
        ("signal", "peak" | "peak_to_peak" | "rms" | "range" | "dc") if here => Some(signal_dimension(drive)),
        // A bridge's resistance stands in both inputs.
        ("source", "resistance") if here || (differential && input.is_none()) => Some(Dimension::Resistance),
        ("source", "capacitance") if here => Some(Dimension::Capacitance),
        ("source", "shunt_resistance") if drive != Drive::Voltage => Some(Dimension::Resistance),
        ("source", "dark_current") if drive != Drive::Voltage => Some(Dimension::Current),
        ("reference", "voltage") if has_reference(kind) => Some(Dimension::Voltage),
        ("reference", "resistance") if has_reference(kind) => Some(Dimension::Resistance),
        ("supply", "positive" | "negative" | "ripple") => Some(Dimension::Voltage),
        ("supply", "ripple_frequency") => Some(Dimension::Frequency),
        ("load", "resistance") | ("converter", "series_resistance" | "switch_resistance") => Some(Dimension::Resistance),
        ("converter", "sample_capacitance" | "shunt_capacitance") => Some(Dimension::Capacitance),
        ("converter", "full_scale" | "noise") => Some(Dimension::Voltage),
        ("converter", "bits") => Some(Dimension::Number),
        ("converter", "acquisition_time") => Some(Dimension::Time),
        ("load", "capacitance") | ("board", "inverting_node" | "non_inverting_node" | "across_feedback") => Some(Dimension::Capacitance),
        ("ambient", "range" | "temperature" | "values_at") => Some(Dimension::Temperature),
        ("band", "from" | "to") => Some(Dimension::Frequency),
        _ => None,
    }
}

/// What a signal's amplitude measures at an input.
#[must_use]
pub const fn signal_dimension(drive: Drive) -> Dimension {
    match drive {
        Drive::Voltage => Dimension::Voltage,
        Drive::Current => Dimension::Current,
        Drive::Charge => Dimension::Charge,
    }
}

/// The inputs that a kind can have for signals: all eight of a summing stage.
#[must_use]
pub fn signal_inputs(kind: Kind) -> Vec<&'static InputSpec> {
    all_inputs(kind).iter().filter(|i| i.feed == Feed::Signal).collect()
}

/// Whether a kind takes a `[reference]`.
#[must_use]
pub fn has_reference(kind: Kind) -> bool {
    all_inputs(kind).iter().any(|i| i.feed == Feed::Reference)
}

/// Every input that a kind can have: those of a stage with all of its components.
fn all_inputs(kind: Kind) -> &'static [InputSpec] {
    let whole = Stage {
        name: String::new(),
        kind,
        components: kind.components().iter().map(|c| Component { name: c.name, value: Toleranced::exact(1.0) }).collect(),
        part: Part::default(),
        isolation: Isolation::default(),
        supply: None,
        sources: Vec::new(),
        signals: Vec::new(),
        common_mode: None,
        reference: None,
        parts: Vec::new(),
        load: Load::default(),
        converter: Converter::default(),
        board: Board::default(),
        ambient: None,
        band: None,
        limits: Vec::new(),
        measured: Vec::new(),
    };
    (kind.spec().inputs)(&whole)
}
