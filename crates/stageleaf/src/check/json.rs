//! `check --format json`, version 1.
//!
//! `{"version":1,"stages":[{"file","line","name","kind","figures":{id:…},"limits":[…],"measured":[…],"cautions":[…]}],"errors":[{"file","line","column","message"}]}`.
//! SI units and full precision: a number read back has the same bits. JSON has no infinity: there a number is `null` with
//! `"unlimited": true` beside it. A figure that is not a number is `{"undetermined": "why"}`, `{"does_not_apply": "why"}`,
//! `{"oscillates": true}` or `{"no_dc_path": true}`.
//! A caution is `{"kind","text"}`: its kind is for programs, its text is what the text form prints.
//! An error's `sort` says what it is: `input`, `stale` (the prose quotes a number that is no longer the figure's) or `bug`.

use serde::{Serialize, Serializer, ser::SerializeMap};
use stageleaf_math::{
    dimension::Dimension,
    measured::MeasuredRow,
    report::{Caution, FigureRow, LimitRow, Outcome},
};
use stageleaf_note::{query_text, words};

use super::{
    examine::{Current, Examined, ExaminedStage, QuoteState},
    text::outcome_words,
};
use crate::fault::Fault;

/// The document.
#[derive(Debug, Serialize)]
pub struct Document {
    version: u32,
    stages: Vec<Stage>,
    errors: Vec<Entry>,
}

impl Default for Document {
    fn default() -> Self {
        Self { version: 1, stages: Vec::new(), errors: Vec::new() }
    }
}

impl Document {
    /// Takes a note in.
    pub fn note(&mut self, note: &Examined) {
        self.stages.extend(note.stages.iter().map(|stage| Stage::of(&note.file, stage)));
        self.errors.extend(note.faults.iter().map(Entry::of));
        self.errors.extend(note.stale().map(|quote| Entry::stale(&note.file, quote)));
    }

    /// Takes a fault in.
    pub fn fault(&mut self, fault: &Fault) {
        self.errors.push(Entry::of(fault));
    }

    /// The document as text, with a line's end.
    #[must_use]
    pub fn text(&self) -> String {
        let mut text = serde_json::to_string_pretty(self).expect("the document holds only strings, finite numbers and maps with text keys");
        text.push('\n');
        text
    }
}

#[derive(Debug, Serialize)]
struct Stage {
    file: String,
    line: usize,
    name: String,
    kind: &'static str,
    figures: Figures,
    limits: Vec<Judged>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    measured: Vec<Measured>,
    cautions: Vec<Warned>,
}

impl Stage {
    fn of(file: &str, stage: &ExaminedStage) -> Self {
        let part = &stage.part_file;
        Self {
            file: file.to_owned(),
            line: stage.block.line,
            name: stage.block.stage.name.clone(),
            kind: stage.block.stage.kind.id(),
            figures: Figures(stage.figures().iter().map(|row| (query_text(row.query), Figure::of(row, part))).collect()),
            limits: stage.limits_in_words().map(|(row, words)| Judged::of(row, words, stage, part)).collect(),
            measured: stage.report.measured.iter().enumerate().map(|(i, row)| Measured::of(row, i, stage)).collect(),
            cautions: stage.report.cautions.iter().map(Warned::of).collect(),
        }
    }
}

/// A measurement beside its prediction.
#[derive(Debug, Serialize)]
struct Measured {
    figure: String,
    value: f64,
    low: f64,
    high: f64,
    unit: &'static str,
    sample: Option<String>,
    temperature: Option<f64>,
    predicted: Figure,
    agreement: &'static str,
}

impl Measured {
    fn of(row: &MeasuredRow, index: usize, stage: &ExaminedStage) -> Self {
        let measurement = row.measurement;
        let dimension = measurement.query.figure.dimension_in(stage.block.stage.kind);
        let predicted =
            FigureRow { query: measurement.query, dimension, amplifier: None, nominal: row.nominal.clone(), range: row.range, basis: None };
        Self {
            figure: query_text(measurement.query),
            value: measurement.value.nominal,
            low: measurement.value.low,
            high: measurement.value.high,
            unit: dimension.si_unit(),
            sample: stage.block.measured.get(index).and_then(|m| m.unit.clone()),
            temperature: measurement.temperature,
            predicted: Figure::of(&predicted, &stage.part_file),
            agreement: row.agreement.word(),
        }
    }
}

/// A caution.
#[derive(Debug, Serialize)]
struct Warned {
    kind: &'static str,
    text: String,
}

impl Warned {
    fn of(caution: &Caution) -> Self {
        let kind = match caution {
            Caution::BelowStableGain { .. } => "below_stable_gain",
            Caution::SupplySpan { .. } => "supply_span",
            Caution::JunctionHot { .. } => "junction_hot",
            Caution::ThermalRunaway => "thermal_runaway",
            Caution::ResistorHot { .. } => "resistor_hot",
            Caution::HighVoltage { .. } => "high_voltage",
            Caution::PhaseReversal => "phase_reversal",
            Caution::TakenAsIdeal(_) => "taken_as_ideal",
            Caution::Oscillates => "oscillates",
            Caution::PairApart => "pair_apart",
            Caution::OscillatesWithin => "oscillates_within",
            Caution::Exceeded { .. } => "exceeded",
            Caution::OffsetBeyondSupply { .. } => "offset_beyond_supply",
            Caution::DifferentialInput { .. } => "differential_input",
            Caution::Chatter { .. } => "chatter",
            Caution::TakenAsExact(_) => "taken_as_exact",
        };
        Self { kind, text: words::caution_text(caution) }
    }
}

/// Figures by id, in the order of the report.
#[derive(Debug)]
struct Figures(Vec<(String, Figure)>);

impl Serialize for Figures {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut map = serializer.serialize_map(Some(self.0.len()))?;
        for (id, figure) in &self.0 {
            map.serialize_entry(id, figure)?;
        }
        map.end()
    }
}

#[derive(Debug, Serialize)]
#[serde(untagged)]
enum Figure {
    Value {
        value: Option<f64>,
        unit: &'static str,
        low: Option<f64>,
        high: Option<f64>,
        basis: Option<&'static str>,
        #[serde(skip_serializing_if = "Option::is_none")]
        amplifier: Option<String>,
        #[serde(skip_serializing_if = "is_false")]
        unlimited: bool,
    },
    Other(Other),
}

impl Figure {
    fn of(row: &FigureRow, part: &str) -> Self {
        match &row.nominal {
            Outcome::Value(value) => Self::Value {
                value: finite(*value),
                unit: row.dimension.si_unit(),
                low: row.range.and_then(|(low, _)| finite(low)),
                high: row.range.and_then(|(_, high)| finite(high)),
                basis: row.basis.map(stageleaf_math::limit::Basis::word),
                amplifier: amplifier(row.amplifier),
                unlimited: value.is_infinite() || row.range.is_some_and(|(low, high)| low.is_infinite() || high.is_infinite()),
            },
            other => Self::Other(Other::of(other, row.dimension, part)),
        }
    }
}

fn amplifier(number: Option<u8>) -> Option<String> {
    number.map(|number| format!("A{number}"))
}

/// A figure that is not a number.
#[derive(Debug, Serialize)]
#[serde(rename_all = "snake_case")]
enum Other {
    AtLeast(f64),
    Undetermined(String),
    DoesNotApply(String),
    Oscillates(bool),
    NoDcPath(bool),
    NoSteadyTemperature(bool),
}

impl Other {
    fn of(outcome: &Outcome, dimension: Dimension, part: &str) -> Self {
        match outcome {
            Outcome::DoesNotApply(why) => Self::DoesNotApply((*why).to_owned()),
            Outcome::Oscillates => Self::Oscillates(true),
            Outcome::NoDcPath(_) => Self::NoDcPath(true),
            Outcome::NoSteadyTemperature => Self::NoSteadyTemperature(true),
            Outcome::AtLeast(least) => Self::AtLeast(*least),
            Outcome::OutOfReach(why) => Self::Undetermined((*why).to_owned()),
            Outcome::Undetermined(_) | Outcome::Value(_) => Self::Undetermined(outcome_words(outcome, dimension, part)),
        }
    }
}

#[derive(Debug, Serialize)]
#[serde(untagged)]
enum Worst {
    Value(Option<f64>),
    Other(Other),
}

#[derive(Debug, Serialize)]
struct Judged {
    figure: String,
    /// Whose it is, where it is the worst of several.
    #[serde(skip_serializing_if = "Option::is_none")]
    amplifier: Option<String>,
    limit: String,
    verdict: &'static str,
    basis: Option<&'static str>,
    worst: Worst,
    #[serde(skip_serializing_if = "is_false")]
    unlimited: bool,
    margin: Option<f64>,
    unit: &'static str,
    corner: Vec<Coordinate>,
    dominant: Option<String>,
}

impl Judged {
    fn of(row: &LimitRow, limit: &str, stage: &ExaminedStage, part: &str) -> Self {
        let dimension = row.dimension;
        let worst = match &row.worst {
            Outcome::Value(value) => Worst::Value(finite(*value)),
            other => Worst::Other(Other::of(other, dimension, part)),
        };
        let corner = row.corner.iter().map(|c| Coordinate {
            parameter: words::parameter_text(c.parameter),
            value: finite(c.value),
            nominal: finite(c.nominal),
            unit: words::parameter_dimension(c.parameter, &stage.block.stage).si_unit(),
        });
        Self {
            figure: query_text(row.limit.query),
            amplifier: amplifier(row.amplifier),
            limit: limit.to_owned(),
            verdict: row.verdict.word(),
            basis: row.basis.map(stageleaf_math::limit::Basis::word),
            unlimited: row.worst.value().is_some_and(f64::is_infinite) || row.margin.is_some_and(f64::is_infinite),
            worst,
            margin: row.margin.and_then(finite),
            unit: dimension.si_unit(),
            corner: corner.collect(),
            dominant: row.dominant.map(words::parameter_text),
        }
    }
}

#[derive(Debug, Serialize)]
struct Coordinate {
    parameter: String,
    value: Option<f64>,
    nominal: Option<f64>,
    unit: &'static str,
}

#[derive(Debug, Serialize)]
struct Entry {
    file: String,
    line: Option<usize>,
    column: Option<usize>,
    message: String,
    sort: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    allowed: Option<String>,
    #[serde(rename = "try", skip_serializing_if = "Option::is_none")]
    attempt: Option<String>,
}

impl Entry {
    fn of(fault: &Fault) -> Self {
        match fault {
            Fault::Text(p) => Self {
                file: p.file.clone(),
                line: Some(p.line),
                column: Some(p.column),
                message: p.message.clone(),
                sort: "input",
                allowed: p.allowed.clone(),
                attempt: p.attempt.clone(),
            },
            Fault::Path { path, message, allowed, attempt } => Self {
                file: path.clone(),
                line: None,
                column: None,
                message: message.clone(),
                sort: "input",
                allowed: allowed.clone(),
                attempt: attempt.clone(),
            },
            Fault::Bug { file, line, stage, message } => Self {
                file: file.clone(),
                line: Some(*line),
                column: Some(1),
                message: format!("bug in stageleaf at the stage “{stage}”: {message}"),
                sort: "bug",
                allowed: None,
                attempt: None,
            },
        }
    }

    fn stale(file: &str, state: &QuoteState) -> Self {
        let quote = &state.quote;
        let now = match &state.current {
            Current::Is { text } => format!("is {text} now"),
            Current::NoValue { outcome, dimension } => {
                format!("has no value now: {}", outcome_words(outcome, *dimension, &state.part_file))
            }
            Current::Agrees => "agrees".to_owned(),
        };
        Self {
            file: file.to_owned(),
            line: Some(quote.line),
            column: Some(quote.column),
            message: format!("the prose says “{}”; `{}` of “{}” {now}", quote.shown, query_text(quote.query), state.stage),
            sort: "stale",
            allowed: None,
            attempt: match &state.current {
                Current::Is { text } => Some(text.clone()),
                Current::Agrees | Current::NoValue { .. } => None,
            },
        }
    }
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

#[expect(clippy::trivially_copy_pass_by_ref, reason = "serde hands the field by reference")]
const fn is_false(value: &bool) -> bool {
    !*value
}
