//! Random and hard comparators, solved by `oracle_switching.py` in mpmath and numpy by another route than ours.
//!
//! `STAGELEAF_ORACLE_SWITCHING` may name another table of the same program (see `scripts/oracle`).

use std::collections::BTreeMap;

use serde::Deserialize;
use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    part::{Headroom, Part, PartFigure, Rating},
    report::Outcome,
    stage::{Isolation, ReferenceVoltage, Span, Stage, Supply, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Complete, report, stage},
};

const TABLE: &str = include_str!("oracle_switching.json");
const SOURCE: &str = "oracle_switching.py: nodal matrices in mpmath (40 digits), extremes over all corners in numpy";
/// What the table's 13 digits leave, relative; and numpy's own rounding at the corners.
const PRINTED: f64 = 5e-13;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: BTreeMap<String, Value>,
}

#[derive(Debug, Deserialize)]
#[serde(untagged)]
enum Value {
    One(f64),
    Range(f64, f64),
    Fact(bool),
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Circuit {
    id: String,
    kind: String,
    components: BTreeMap<String, f64>,
    isolation: String,
    source: f64,
    reference: f64,
    reference_resistance: f64,
    load_resistance: Option<f64>,
    load_capacitance: Option<f64>,
    positive: [f64; 3],
    negative: [f64; 3],
    temperature: f64,
    tolerance: f64,
    /// Steady part and peak.
    signal: Option<[f64; 2]>,
    part: Stated,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Stated {
    // Typical, worse bound.
    offset: [f64; 2],
    drift: [f64; 2],
    bias: [f64; 2],
    offset_current: [f64; 2],
    cmrr: [f64; 2],
    psrr_positive: [f64; 2],
    psrr_negative: [f64; 2],
    open_loop: f64,
    output_resistance: f64,
    differential_resistance: Option<f64>,
    common_mode_resistance: Option<f64>,
    slew_rise: f64,
    slew_fall: f64,
    overload_recovery: f64,
    current_limit: f64,
    supply_current: f64,
    junction_to_ambient: f64,
    range: [f64; 2],
    // Current, typical and guaranteed volts.
    headroom_high: Vec<[f64; 3]>,
    headroom_low: Vec<[f64; 3]>,
}

impl Stated {
    fn part(&self) -> Part {
        use PartFigure as P;
        let mut part = Part::default();
        for (figure, [typ, worse]) in [
            (P::Offset, self.offset),
            (P::OffsetDrift, self.drift),
            (P::BiasCurrent, self.bias),
            (P::OffsetCurrent, self.offset_current),
            (P::Cmrr, self.cmrr),
            (P::PsrrPositive, self.psrr_positive),
            (P::PsrrNegative, self.psrr_negative),
        ] {
            let (min, max) = if worse > typ { (None, Some(worse)) } else { (Some(worse), None) };
            part.state(figure, Rating { min, typ: Some(typ), max, source: None });
        }
        for (figure, value) in [
            (P::OpenLoop, Some(self.open_loop)),
            (P::OutputResistance, Some(self.output_resistance)),
            (P::DifferentialResistance, self.differential_resistance),
            (P::CommonModeResistance, self.common_mode_resistance),
            (P::SlewRise, Some(self.slew_rise)),
            (P::SlewFall, Some(self.slew_fall)),
            (P::OverloadRecovery, Some(self.overload_recovery)),
            (P::CurrentLimit, Some(self.current_limit)),
            (P::SupplyCurrent, Some(self.supply_current)),
            (P::JunctionToAmbient, Some(self.junction_to_ambient)),
            (P::RangeFromNegative, Some(self.range[0])),
            (P::RangeFromPositive, Some(self.range[1])),
        ] {
            if let Some(value) = value {
                part.state(figure, Rating::typical(value));
            }
        }
        let rows = |table: &[[f64; 3]]| {
            let row = |&[current, typ, max]: &[f64; 3]| Headroom {
                current,
                volts: Rating { min: None, typ: Some(typ), max: Some(max), source: None },
            };
            table.iter().map(row).collect()
        };
        part.headroom_high = rows(&self.headroom_high);
        part.headroom_low = rows(&self.headroom_low);
        part
    }
}

impl Circuit {
    fn stage(&self) -> Stage {
        let kind = Kind::from_id(&self.kind).unwrap_or_else(|| panic!("{}: no kind is called {}", self.id, self.kind));
        let bare = stage(kind, self.part.part());
        let mut stage = self.components.iter().fold(bare, |stage, (name, value)| stage.with_tolerance(name, *value, self.tolerance));
        let span = |[low, nominal, high]: [f64; 3]| Span { low, nominal, high };
        stage.supply = Some(Supply { positive: span(self.positive), negative: span(self.negative), ripple: None });
        stage.isolation = if self.isolation == "inside" { Isolation::InsideLoop } else { Isolation::OutsideLoop };
        stage.reference = Some(ReferenceVoltage {
            voltage: Toleranced { minus: self.tolerance, plus: self.tolerance, ..Toleranced::exact(self.reference) },
            resistance: Some(Toleranced::exact(self.reference_resistance)),
        });
        stage = stage.behind_resistance(self.source).loaded(self.load_resistance, self.load_capacitance).at(self.temperature);
        if let Some([dc, peak]) = self.signal {
            stage = stage.driven(dc, peak, None, 1.0);
        }
        stage
    }
}

fn rows() -> Vec<Row> {
    let text = match std::env::var("STAGELEAF_ORACLE_SWITCHING") {
        Ok(path) => std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{path}: {error}")),
        Err(_) => TABLE.to_owned(),
    };
    serde_json::from_str(&text).unwrap_or_else(|error| panic!("{error}"))
}

/// The kinds that the table holds.
pub fn kinds() -> impl Iterator<Item = String> {
    rows().into_iter().map(|row| row.circuit.kind)
}

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    for row in rows() {
        compare(ledger, &row);
    }
}

fn compare(ledger: &mut Ledger, row: &Row) {
    let id = &row.circuit.id;
    let figures: Vec<Figure> = Figure::ALL.iter().copied().filter(|f| row.expected.contains_key(f.id())).collect();
    let asked = if figures.is_empty() { vec![Figure::Hysteresis] } else { figures };
    let queries: Vec<Query> = asked.iter().map(|f| Query::of(*f)).collect();
    let report = report(&row.circuit.stage(), &queries);
    for found in &report.limits {
        let figure = found.limit.query.figure;
        // Voltages of some volts: what twelve digits leave of them.
        let allowed = |value: f64| budget(figure).around(value).max(PRINTED * row.circuit.positive[2].abs());
        let wanted = |name, value| Wanted { id, name, figure, value, allowed: allowed(value), source: SOURCE };
        match row.expected.get(figure.id()) {
            Some(Value::One(value)) => ledger.outcome(&wanted(figure.id(), *value), &found.nominal),
            Some(other) => panic!("{id}: {other:?}"),
            None => {
                assert!(matches!(row.expected.get("no_hysteresis"), Some(Value::Fact(true))), "{id}: {:?}", row.expected);
                let lost = matches!(found.nominal, Outcome::OutOfReach(_));
                ledger.fact(id, "no_hysteresis", lost, &format!("{:?}", found.nominal));
            }
        }
        let name = format!("{}_range", figure.id());
        if let Some(&Value::Range(low, high)) = row.expected.get(&name) {
            // Where some corner has no hysteresis left, there is no range but that.
            let lost = matches!(row.expected.get("hysteresis_range"), Some(Value::Range(least, _)) if *least <= 0.0);
            match found.range {
                Some(range) => {
                    // numpy's matrices leave nine digits. A corner where two parameters act together against their single effects is
                    // missed (see `analysis::spread`): by a two-thousandth of the range at the most.
                    let near = (high - low) / 2000.0;
                    let corner = |value| Wanted { allowed: allowed(value).max(1e-9).max(near), ..wanted(&name, value) };
                    ledger.value(&corner(low), range.0);
                    ledger.value(&corner(high), range.1);
                }
                None => ledger.fact(id, &name, lost, "a range was wanted, and there is none"),
            }
        }
    }
}
