//! Random and hard circuits of every kind, solved by `oracle.py` in numpy and mpmath by another route than ours.
//!
//! `STAGELEAF_ORACLE` may name another table of the same program (see `scripts/oracle`).

use core::f64::consts::TAU;
use std::collections::BTreeMap;

use serde::Deserialize;
use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    part::Zero,
    report::{NoiseOrigin, Outcome, Report, Root},
    stage::{Isolation, Source, Stage, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, density_by_source, of_source, outcome, report, stage},
};

const TABLE: &str = include_str!("oracle.json");
const SOURCE: &str = "oracle.py: nodal matrices in mpmath (50 digits) and numpy";
/// What the table's 14 digits leave, relative.
const PRINTED: f64 = 5e-14;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: Expected,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Circuit {
    id: String,
    kind: String,
    components: BTreeMap<String, f64>,
    amplifier: Stated,
    isolation: String,
    source: Option<Driver>,
    load: Values,
    board: Values,
    temperature: f64,
    band: [f64; 2],
    frequencies: Vec<f64>,
    signal_frequency: f64,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Stated {
    pub open_loop: f64,
    pub gbw: f64,
    pub higher_poles: Vec<f64>,
    pub zeros: Vec<(f64, bool)>,
    pub output_resistance: f64,
    pub differential_resistance: Option<f64>,
    pub common_mode_resistance: Option<f64>,
    pub differential_capacitance: f64,
    pub common_mode_capacitance: f64,
    pub voltage_noise: f64,
    pub voltage_corner: f64,
    pub exponent: f64,
    pub current_noise: f64,
    pub current_corner: f64,
}

#[derive(Debug, Deserialize)]
#[serde(rename_all = "snake_case")]
enum Driver {
    Resistance(f64),
    Capacitance(f64),
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Values {
    pub resistance: Option<f64>,
    pub capacitance: Option<f64>,
    pub inverting_node: Option<f64>,
    pub non_inverting_node: Option<f64>,
    pub across_feedback: Option<f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    stable: bool,
    poles: Vec<(f64, f64)>,
    response: Vec<(f64, f64, f64)>,
    /// Hz and rad, of every |T| = 1.
    crossings: Vec<(f64, f64)>,
    /// Hz and |T|, of every T below zero and real.
    turns: Vec<(f64, f64)>,
    sensitivity_peak: f64,
    noise_sources: Vec<String>,
    noise_density: Vec<(f64, f64, Vec<f64>)>,
    /// Absent: the input is a terminal of the source itself; null: unlimited.
    input_impedance: Option<f64>,
    output_impedance: f64,
    gain: Option<f64>,
    gain_at_signal: Option<f64>,
    bandwidth: Option<f64>,
    peaking: Option<f64>,
    natural_frequency: Option<f64>,
    q: Option<f64>,
    output_noise: Option<f64>,
    output_noise_by_source: Option<Vec<f64>>,
    noise_bandwidth: Option<f64>,
}

impl Circuit {
    fn stage(&self) -> Stage {
        let stated = &self.amplifier;
        let amplifier = Amplifier {
            open_loop: stated.open_loop,
            gbw: stated.gbw,
            higher_poles: Some(stated.higher_poles.clone()),
            zeros: stated.zeros.iter().map(|&(frequency, right_half_plane)| Zero { frequency, right_half_plane }).collect(),
            output_resistance: stated.output_resistance,
            differential_resistance: stated.differential_resistance,
            common_mode_resistance: stated.common_mode_resistance,
            differential_capacitance: stated.differential_capacitance,
            common_mode_capacitance: stated.common_mode_capacitance,
            voltage_noise: stated.voltage_noise,
            voltage_corner: stated.voltage_corner,
            exponent: stated.exponent,
            current_noise: stated.current_noise,
            current_corner: stated.current_corner,
        };
        let kind = Kind::from_id(&self.kind).unwrap_or_else(|| panic!("{}: no kind is called {:?}", self.id, self.kind));
        let mut result = stage(kind, amplifier.part()).at(self.temperature).over(self.band[0], self.band[1]).driven(
            0.0,
            0.0,
            Some(self.signal_frequency),
            core::f64::consts::SQRT_2,
        );
        for (name, &value) in &self.components {
            result = result.with(name, value);
        }
        result.isolation = if self.isolation == "inside" { Isolation::InsideLoop } else { Isolation::OutsideLoop };
        result.sources = vec![self.source.as_ref().map(|driver| match *driver {
            Driver::Resistance(ohms) => Source::Resistive { resistance: Toleranced::exact(ohms) },
            Driver::Capacitance(farads) => Source::Capacitive { capacitance: Toleranced::exact(farads) },
        })];
        let mut result = result.loaded(self.load.resistance, self.load.capacitance);
        result.board.inverting_node = self.board.inverting_node.map(Toleranced::exact);
        result.board.non_inverting_node = self.board.non_inverting_node.map(Toleranced::exact);
        result.board.across_feedback = self.board.across_feedback.map(Toleranced::exact);
        result
    }

    fn origin(&self, stage: &Stage, name: &str) -> NoiseOrigin {
        match name {
            "voltage" => NoiseOrigin::AmplifierVoltage(0),
            "current_non_inverting" => NoiseOrigin::CurrentNonInverting(0),
            "current_inverting" => NoiseOrigin::CurrentInverting(0),
            "source_resistance" => NoiseOrigin::SourceResistance(0),
            "load_resistance" => NoiseOrigin::LoadResistance,
            component => {
                let found = stage.components.iter().find(|c| c.name == component);
                NoiseOrigin::Component(found.unwrap_or_else(|| panic!("{}: no component is called {component}", self.id)).name)
            }
        }
    }
}

/// Compares closed-loop poles, given as real and imaginary part in rad/s, those above the real axis alone.
pub fn compare_poles(ledger: &mut Ledger, id: &str, wanted: &[(f64, f64)], got: &[Root]) {
    for &(re, im) in wanted {
        let size = libm::hypot(re, im);
        let nearest = got.iter().map(|p| libm::hypot(p.re - re, p.im.abs() - im)).fold(f64::INFINITY, f64::min);
        // Two or three poles that coincide move as the root of the rounding error.
        let close = wanted.iter().filter(|p| libm::hypot(p.0 - re, p.1 - im) < 1e-2 * size).count();
        let allowed = if close > 1 { 1e-4 } else { 1e-8 } * size;
        let holds = nearest <= allowed;
        let otherwise = format!("pole {re:e} ± j{im:e} rad/s: the nearest reported lies {:e} of it away", nearest / size);
        ledger.fact(id, "poles", holds, &otherwise);
    }
    let count: usize = wanted.iter().map(|p| if p.1 > 0.0 { 2 } else { 1 }).sum();
    let listed: usize = got.len();
    ledger.fact(id, "pole count", count == listed, &format!("{count} poles wanted, {listed} reported: {got:?}"));
}

/// One circuit's comparisons.
struct Comparison<'a> {
    ledger: &'a mut Ledger,
    circuit: &'a Circuit,
    expected: &'a Expected,
    stage: &'a Stage,
    report: &'a Report,
}

impl Comparison<'_> {
    fn tell(&mut self, query: Query, value: f64) {
        let name = query.at.map_or_else(|| query.figure.id().to_owned(), |f| format!("{} {f}", query.figure.id()));
        let allowed = if value.is_finite() { budget(query.figure).around(value) + PRINTED * value.abs() } else { 0.0 };
        let wanted = Wanted { id: &self.circuit.id, name: &name, figure: query.figure, value, allowed, source: SOURCE };
        self.ledger.outcome(&wanted, &outcome(self.report, query));
    }

    fn figure(&mut self, figure: Figure, value: f64) {
        self.tell(Query::of(figure), value);
    }

    fn is(&mut self, figure: Figure, wanted: &str, holds: impl Fn(&Outcome) -> bool) {
        let got = outcome(self.report, Query::of(figure));
        self.ledger.fact(&self.circuit.id, figure.id(), holds(&got), &format!("wanted \"{wanted}\", got {got:?}"));
    }

    fn margins(&mut self) {
        // The angle between the return ratio and −180°. Where the loop is stable it has no side: a crossing at which the
        // magnitude rises, or the phase leads, is as far from −180° as one where it falls and lags.
        let margin = |unwrapped: f64| {
            let angle = libm::remainder(unwrapped, TAU);
            if self.expected.stable { angle.abs() } else { angle }
        };
        let margins = self.expected.crossings.iter().map(|&(frequency, angle)| (frequency, margin(angle)));
        match margins.min_by(|a, b| a.1.total_cmp(&b.1)) {
            None => {
                self.is(Figure::Crossover, "does not apply", |o| matches!(o, Outcome::DoesNotApply(_)));
                self.is(Figure::PhaseMargin, "does not apply", |o| matches!(o, Outcome::DoesNotApply(_)));
            }
            Some((frequency, margin)) => {
                self.figure(Figure::Crossover, frequency);
                if self.expected.stable || margin < 0.0 {
                    self.figure(Figure::PhaseMargin, margin);
                } else {
                    self.is(Figure::PhaseMargin, "oscillates", |o| matches!(o, Outcome::Oscillates));
                }
            }
        }
        if self.expected.stable {
            // How far the return ratio may grow: only crossings where it is below one count, while there is one.
            let growth = self.expected.turns.iter().map(|t| 1.0 / t.1).filter(|g| *g >= 1.0).fold(f64::INFINITY, f64::min);
            let shrinkage = self.expected.turns.iter().map(|t| 1.0 / t.1).filter(|g| *g < 1.0).fold(0.0, f64::max);
            let margin = if growth.is_finite() || shrinkage == 0.0 { growth } else { shrinkage };
            self.figure(Figure::GainMargin, margin);
            self.figure(Figure::SensitivityPeak, self.expected.sensitivity_peak);
        }
    }

    fn against_dc(&mut self) {
        let expected = self.expected;
        let Some(gain) = expected.gain else { return };
        self.figure(Figure::Gain, gain);
        self.figure(Figure::GainAtSignal, expected.gain_at_signal.expect("stands beside the gain"));
        self.figure(Figure::Bandwidth, expected.bandwidth.unwrap_or(f64::INFINITY));
        if let Some(peaking) = expected.peaking {
            self.figure(Figure::Peaking, peaking);
        }
        match (expected.natural_frequency, expected.q) {
            (Some(frequency), Some(q)) => {
                self.figure(Figure::NaturalFrequency, frequency);
                self.figure(Figure::Q, q);
            }
            // Real poles that coincide may split into a pair by rounding, and then have a Q of one half.
            _ => self.is(Figure::Q, "does not apply", |o| {
                matches!(o, Outcome::DoesNotApply(_)) || o.value().is_some_and(|q| (q - 0.5).abs() < 1e-6)
            }),
        }
        let total = expected.output_noise.expect("stands beside the gain");
        self.figure(Figure::OutputNoise, total);
        self.figure(Figure::InputNoise, total / gain.abs());
        // Common practice: 6.6 times the rms.
        self.figure(Figure::OutputNoisePeakToPeak, 6.6 * total);
        self.figure(Figure::NoiseBandwidth, expected.noise_bandwidth.unwrap_or(f64::INFINITY));
        let shares: Vec<_> = self.report.noise_shares.iter().map(|s| (s.origin, s.rms)).collect();
        let by_source = expected.output_noise_by_source.as_ref().expect("stands beside the gain");
        self.sources("rms", Figure::OutputNoise, by_source, &shares);
    }

    fn sources(&mut self, what: &str, figure: Figure, wanted: &[f64], got: &[(NoiseOrigin, f64)]) {
        let exactness = budget(Figure::OutputNoise);
        let total = libm::sqrt(wanted.iter().map(|v| v * v).sum());
        for (name, &value) in self.expected.noise_sources.iter().zip(wanted) {
            // Both quadratures end at 1e-12 or so of the total power, whatever a source's own part of it.
            let floor = 1e-11 * total * total / value.max(1e-5 * total);
            let allowed = exactness.around(value) + floor;
            let got = of_source(got, self.circuit.origin(self.stage, name));
            let wanted = Wanted { id: &self.circuit.id, name: &format!("{name} {what}"), figure, value, allowed, source: SOURCE };
            self.ledger.value(&wanted, got);
        }
    }

    fn all(&mut self) {
        compare_poles(self.ledger, &self.circuit.id, &self.expected.poles, &self.report.poles);
        self.margins();
        if !self.expected.stable {
            for figure in [Figure::Gain, Figure::Bandwidth, Figure::OutputNoise, Figure::Q] {
                self.is(figure, "oscillates", |o| matches!(o, Outcome::Oscillates));
            }
            return;
        }
        let expected = self.expected;
        for &(frequency, magnitude, phase) in &expected.response {
            self.tell(Query::at(Figure::GainAt, frequency), magnitude);
            self.phase(frequency, phase);
        }
        for (frequency, total, by_source) in &expected.noise_density {
            self.tell(Query::at(Figure::NoiseDensityAt, *frequency), *total);
            let shares = density_by_source(self.stage, *frequency);
            self.sources(&format!("density at {frequency}"), Figure::NoiseDensityAt, by_source, &shares);
        }
        let stated = &self.circuit.amplifier;
        if stated.differential_resistance.is_some() && stated.common_mode_resistance.is_some() {
            if let Some(ohms) = expected.input_impedance {
                self.figure(Figure::InputImpedance, ohms);
            }
        } else {
            self.is(Figure::InputImpedance, "undetermined", |o| matches!(o, Outcome::Undetermined(_)));
        }
        self.figure(Figure::OutputImpedance, expected.output_impedance);
        self.against_dc();
    }

    /// Phases compare on the circle: −π and π are one angle.
    fn phase(&mut self, frequency: f64, wanted: f64) {
        let query = Query::at(Figure::PhaseAt, frequency);
        let got = match outcome(self.report, query) {
            Outcome::Value(got) => Outcome::Value(wanted + libm::remainder(got - wanted, TAU)),
            other => other,
        };
        let allowed = budget(Figure::PhaseAt).around(wanted) + PRINTED * wanted.abs();
        let name = format!("phase_at {frequency}");
        self.ledger
            .outcome(&Wanted { id: &self.circuit.id, name: &name, figure: Figure::PhaseAt, value: wanted, allowed, source: SOURCE }, &got);
    }
}

/// Every circuit's kind, for the count of what is covered.
pub fn kinds() -> Vec<String> {
    let rows: Vec<Row> = serde_json::from_str(TABLE).unwrap_or_else(|error| panic!("oracle.json: {error}"));
    rows.into_iter().map(|row| row.circuit.kind).collect()
}

/// Compares every circuit.
pub fn all(ledger: &mut Ledger) {
    let other = std::env::var("STAGELEAF_ORACLE").ok().map(|path| std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}")));
    let rows: Vec<Row> = serde_json::from_str(other.as_deref().unwrap_or(TABLE)).unwrap_or_else(|error| panic!("oracle.json: {error}"));
    for Row { circuit, expected } in &rows {
        let stage = circuit.stage();
        let mut queries: Vec<Query> =
            Figure::ALL.iter().filter(|f| matches!(f.argument(), stageleaf_math::figure::Argument::None)).copied().map(Query::of).collect();
        for &frequency in &circuit.frequencies {
            queries.extend([Figure::GainAt, Figure::PhaseAt, Figure::NoiseDensityAt].map(|f| Query::at(f, frequency)));
        }
        let report = report(&stage, &queries);
        Comparison { ledger, circuit, expected, stage: &stage, report: &report }.all();
    }
}

#[test]
fn random_and_hard_circuits_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
