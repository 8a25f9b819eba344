//! Random and hard circuits of the kinds with several inputs, drives or amplifiers, currents and charges, and of the filters,
//! solved by `oracle_kinds.py` in numpy and mpmath by another route than ours.
//!
//! `STAGELEAF_ORACLE_KINDS` may name another table of the same program (see `scripts/oracle`).

use std::collections::BTreeMap;

use serde::Deserialize;
use stageleaf_math::{
    analysis::{self, margins, sweep},
    figure::{Argument, Figure, Query},
    kind::{Drives, Kind},
    part::{Part, PartFigure, Rating, Zero},
    report::{NoiseOrigin, Outcome, Report},
    solution::{Solution, magnitude},
    stage::{Isolation, ReferenceVoltage, Source, Stage, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    oracle::{Stated, Values, compare_poles},
    oracle_around::Around,
    setup::{Amplifier, Complete, of_source, outcome, report, solved, stage, with_least_damped},
};

const TABLE: &str = include_str!("oracle_kinds.json");
const SOURCE: &str = "oracle_kinds.py: nodal matrices in mpmath (50 digits) and numpy";
/// What the table's 13 digits leave, relative.
const PRINTED: f64 = 5e-13;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: Expected,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Circuit {
    pub id: String,
    kind: String,
    components: BTreeMap<String, f64>,
    /// One for all, or one for each.
    pub amplifiers: Vec<Stated>,
    isolation: String,
    sources: Vec<Option<Driver>>,
    /// Output resistance of the reference.
    reference: Option<f64>,
    load: Values,
    board: Values,
    temperature: f64,
    band: [f64; 2],
    pub frequencies: Vec<f64>,
    signal_frequency: f64,
    signal_dc: f64,
    /// Offset voltage, bias current, offset current of every amplifier.
    offset: [f64; 3],
    /// What stands around it, in `oracle_around.json`.
    pub around: Option<Around>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Driver {
    resistance: Option<f64>,
    capacitance: Option<f64>,
    shunt_resistance: Option<f64>,
    /// Present with a photodiode.
    dark_current: Option<f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    #[serde(default)]
    no_dc_path: bool,
    #[serde(default)]
    stable: bool,
    #[serde(default)]
    poles: Vec<(f64, f64)>,
    #[serde(default)]
    loops: Vec<Loop>,
    /// By drive, at each of the circuit's frequencies: real and imaginary part.
    #[serde(default)]
    response: Vec<Vec<(f64, f64)>>,
    #[serde(default)]
    noise_sources: Vec<String>,
    #[serde(default)]
    noise_density: Vec<(f64, Vec<f64>)>,
    /// Null: unlimited.
    input_impedance: Option<f64>,
    output_impedance: Option<f64>,
    /// The sum, and the greatest of the terms that may cancel within it.
    output_offset: Option<(f64, f64)>,
    gain: Option<f64>,
    gain_at_signal: Option<f64>,
    bandwidth: Option<f64>,
    low_cutoff: Option<f64>,
    peaking: Option<f64>,
    natural_frequency: Option<f64>,
    q: Option<f64>,
    output_noise: Option<f64>,
    output_noise_by_source: Option<Vec<f64>>,
    noise_bandwidth: Option<f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Loop {
    /// Hz and rad between −T and the positive axis, of every |T| = 1.
    crossings: Vec<(f64, f64)>,
    /// Hz and |T|, of every T below zero and real.
    turns: Vec<(f64, f64)>,
    sensitivity_peak: f64,
}

impl Loop {
    /// The crossing nearest to −1: of a stable loop on whichever side, else the one furthest past it.
    fn worst(&self, stable: bool) -> Option<(f64, f64)> {
        let margins = self.crossings.iter().map(|&(f, angle)| (f, if stable { angle.abs() } else { angle }));
        margins.min_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// How far the return ratio may grow; only crossings where it is below one count, while there is one.
    fn gain_margin(&self) -> f64 {
        let factors = || self.turns.iter().map(|t| 1.0 / t.1);
        let growth = factors().filter(|g| *g >= 1.0).fold(f64::INFINITY, f64::min);
        let shrinkage = factors().filter(|g| *g < 1.0).fold(0.0, f64::max);
        if growth.is_finite() || shrinkage == 0.0 { growth } else { shrinkage }
    }
}

impl Driver {
    fn source(&self) -> Source {
        let exact = |value: Option<f64>| value.map(Toleranced::exact);
        match (self.resistance, self.capacitance) {
            (Some(ohms), _) => Source::Resistive { resistance: Toleranced::exact(ohms) },
            (None, Some(farads)) => match self.dark_current {
                Some(dark) => Source::Photodiode {
                    capacitance: Toleranced::exact(farads),
                    shunt_resistance: exact(self.shunt_resistance),
                    dark_current: Some(Toleranced::exact(dark)),
                },
                None => Source::Capacitive { capacitance: Toleranced::exact(farads) },
            },
            (None, None) => panic!("a source is a resistance or a capacitance"),
        }
    }
}

impl Circuit {
    fn part(&self, index: usize) -> Part {
        let stated = &self.amplifiers[index];
        let mut part = Amplifier {
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
        }
        .part();
        let [offset, bias, apart] = self.offset;
        // The steady voltage at the inputs counts for nothing.
        let rejection = (PartFigure::Cmrr, 1e30);
        for (figure, value) in
            [(PartFigure::Offset, offset), (PartFigure::BiasCurrent, bias), (PartFigure::OffsetCurrent, apart), rejection]
        {
            part.state(figure, Rating::typical(value));
        }
        part.state(PartFigure::OffsetDrift, Rating::typical(0.0));
        part
    }

    /// Its kind's id.
    pub fn kind(&self) -> &str {
        &self.kind
    }

    /// The stage.
    pub fn stage(&self) -> Stage {
        let kind = Kind::from_id(&self.kind).unwrap_or_else(|| panic!("{}: no kind is called {:?}", self.id, self.kind));
        let mut result = stage(kind, self.part(0))
            // The middle between the rails is the ground, from which the oracle counts the inputs' common mode.
            .between(-15.0, 15.0)
            .at(self.temperature)
            .over(self.band[0], self.band[1])
            .driven(self.signal_dc, 0.0, Some(self.signal_frequency), core::f64::consts::SQRT_2)
            .loaded(self.load.resistance, self.load.capacitance);
        result.parts = (1..self.amplifiers.len()).map(|index| (index + 1, self.part(index))).collect();
        for (name, &value) in &self.components {
            result = result.with(name, value);
        }
        result.isolation = if self.isolation == "inside" { Isolation::InsideLoop } else { Isolation::OutsideLoop };
        let inputs = (kind.spec().inputs)(&result).len();
        result.sources = self.sources.iter().take(inputs).map(|source| source.as_ref().map(Driver::source)).collect();
        result.reference =
            self.reference.map(|ohms| ReferenceVoltage { voltage: Toleranced::exact(2.5), resistance: Some(Toleranced::exact(ohms)) });
        result.board.inverting_node = self.board.inverting_node.map(Toleranced::exact);
        result.board.non_inverting_node = self.board.non_inverting_node.map(Toleranced::exact);
        result.board.across_feedback = self.board.across_feedback.map(Toleranced::exact);
        result
    }

    fn origin(&self, stage: &Stage, name: &str) -> NoiseOrigin {
        let numbered = name.rsplit_once('_').and_then(|(what, number)| Some((what, number.parse::<u8>().ok()?)));
        match numbered {
            Some(("voltage", k)) => NoiseOrigin::AmplifierVoltage(k),
            Some(("current_non_inverting", k)) => NoiseOrigin::CurrentNonInverting(k),
            Some(("current_inverting", k)) => NoiseOrigin::CurrentInverting(k),
            Some(("source_resistance", k)) => NoiseOrigin::SourceResistance(k),
            Some(("shot", k)) => NoiseOrigin::SourceShot(k),
            _ if name == "load_resistance" => NoiseOrigin::LoadResistance,
            _ if name == "reference_resistance" => NoiseOrigin::ReferenceResistance,
            _ => {
                let found = stage.components.iter().find(|c| c.name == name);
                NoiseOrigin::Component(found.unwrap_or_else(|| panic!("{}: no component is called {name}", self.id)).name)
            }
        }
    }
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
    fn value(&mut self, name: &str, figure: Figure, value: f64, got: f64) {
        let allowed = if value.is_finite() { budget(figure).around(value) + PRINTED * value.abs() } else { 0.0 };
        self.ledger.value(&Wanted { id: &self.circuit.id, name, figure, value, allowed, source: SOURCE }, got);
    }

    fn figure(&mut self, figure: Figure, value: f64) {
        self.tell(Query::of(figure), value);
    }

    fn tell(&mut self, query: Query, value: f64) {
        let name = query.at.map_or_else(|| query.figure.id().to_owned(), |f| format!("{} {f}", query.figure.id()));
        let allowed = if value.is_finite() { budget(query.figure).around(value) + PRINTED * value.abs() } else { 0.0 };
        let wanted = Wanted { id: &self.circuit.id, name: &name, figure: query.figure, value, allowed, source: SOURCE };
        self.ledger.outcome(&wanted, &outcome(self.report, query));
    }

    fn is(&mut self, figure: Figure, wanted: &str, holds: impl Fn(&Outcome) -> bool) {
        let got = outcome(self.report, Query::of(figure));
        self.ledger.fact(&self.circuit.id, figure.id(), holds(&got), &format!("wanted \"{wanted}\", got {got:?}"));
    }

    /// Each amplifier's loop with the others alive; the stage's is the worst.
    fn loops(&mut self, solution: &Solution<'_>) {
        let stable = self.expected.stable;
        for (index, wanted) in self.expected.loops.iter().enumerate() {
            let got = margins::of(solution, index);
            let name = |what: &str| format!("{what} of amplifier {}", index + 1);
            match wanted.worst(stable) {
                None => {
                    let none = got.crossover.is_none() && got.phase.is_none();
                    self.ledger.fact(&self.circuit.id, &name("crossover"), none, &format!("the loop has none, got {got:?}"));
                }
                Some((frequency, margin)) => {
                    self.value(&name("crossover"), Figure::Crossover, frequency, got.crossover.unwrap_or(f64::NAN));
                    self.value(&name("phase margin"), Figure::PhaseMargin, margin, got.phase.unwrap_or(f64::NAN));
                }
            }
            if stable {
                self.value(&name("gain margin"), Figure::GainMargin, wanted.gain_margin(), got.gain);
                self.value(&name("sensitivity peak"), Figure::SensitivityPeak, wanted.sensitivity_peak, got.sensitivity_peak);
                // The same by the figure's name: `gain_margin of A2`.
                for (figure, value) in
                    [(Figure::GainMargin, Some(wanted.gain_margin())), (Figure::PhaseMargin, wanted.worst(true).map(|worst| worst.1))]
                {
                    let number = u8::try_from(index + 1).expect("few amplifiers");
                    let got = analysis::outcome(solution, Query::of(figure).of_amplifier(number));
                    if let Some(value) = value {
                        self.value(&name(figure.id()), figure, value, got.value().unwrap_or(f64::NAN));
                    }
                }
            }
        }
        let worst = self.expected.loops.iter().filter_map(|l| l.worst(stable)).min_by(|a, b| a.1.total_cmp(&b.1));
        match worst {
            None => self.is(Figure::PhaseMargin, "does not apply", |o| matches!(o, Outcome::DoesNotApply(_))),
            Some((_, margin)) if stable || margin < 0.0 => self.figure(Figure::PhaseMargin, margin),
            Some(_) => self.is(Figure::PhaseMargin, "oscillates", |o| matches!(o, Outcome::Oscillates)),
        }
        if stable {
            self.figure(Figure::GainMargin, self.expected.loops.iter().map(Loop::gain_margin).fold(f64::INFINITY, f64::min));
            self.figure(Figure::SensitivityPeak, self.expected.loops.iter().map(|l| l.sensitivity_peak).fold(0.0, f64::max));
        }
    }

    /// Every drive's transfer, as a complex number: its distance from the wanted one.
    fn response(&mut self, solution: &Solution<'_>) {
        let stage = self.stage;
        for (drive, row) in self.expected.response.iter().enumerate() {
            for (&frequency, &(re, im)) in self.circuit.frequencies.iter().zip(row) {
                let got = solution.transfer(drive, solution.scaled(frequency));
                let size = libm::hypot(re, im);
                let distance = libm::hypot(got.re - re, got.im - im);
                // What is left of two large transfers that nearly cancel is no better than they are: the difference's stands for them.
                let rest = if drive == 1 && (stage.kind == Kind::Difference || stage.kind == Kind::Instrumentation) {
                    2e-14 * magnitude(solution.transfer(0, solution.scaled(frequency)))
                } else {
                    0.0
                };
                let allowed = budget(Figure::GainAt).around(size) + PRINTED * size + rest;
                let name = format!("transfer of drive {drive} at {frequency}");
                // As a figure of its own budget, so that the use of it shows.
                let wanted = Wanted { id: &self.circuit.id, name: &name, figure: Figure::GainAt, value: size, allowed, source: SOURCE };
                self.ledger.value(&wanted, size + distance);
                // The same by its input's name: `gain_at 1 kHz from in2`.
                let input = (stage.kind.spec().inputs)(stage).get(drive).filter(|_| matches!(stage.kind.spec().drives, Drives::Each));
                if let Some(input) = input.filter(|_| drive > 0) {
                    let query = Query::at(Figure::GainAt, frequency).from_input(input.name);
                    let name = format!("gain_at {frequency} from {}", input.name);
                    let wanted = Wanted { name: &name, ..wanted };
                    self.ledger.outcome(&wanted, &analysis::outcome(solution, query));
                }
            }
        }
        for (k, &frequency) in self.circuit.frequencies.iter().enumerate() {
            let (re, im) = self.expected.response[0][k];
            self.tell(Query::at(Figure::GainAt, frequency), libm::hypot(re, im));
        }
    }

    fn noise(&mut self, solution: &Solution<'_>) {
        let found = sweep::noise(solution, &self.circuit.frequencies);
        for (k, (total, by_source)) in self.expected.noise_density.iter().enumerate() {
            let frequency = self.circuit.frequencies[k];
            self.tell(Query::at(Figure::NoiseDensityAt, frequency), *total);
            let mut powers: BTreeMap<NoiseOrigin, f64> = BTreeMap::new();
            for (origin, row) in found.origins.iter().zip(&found.rows) {
                *powers.entry(*origin).or_default() += row[k];
            }
            let shares: Vec<_> = powers.into_iter().map(|(origin, power)| (origin, libm::sqrt(power))).collect();
            self.sources(&format!("density at {frequency}"), Figure::NoiseDensityAt, by_source, &shares);
        }
    }

    fn sources(&mut self, what: &str, figure: Figure, wanted: &[f64], got: &[(NoiseOrigin, f64)]) {
        let total = libm::sqrt(wanted.iter().map(|v| v * v).sum());
        let names = &self.expected.noise_sources;
        for name in names {
            let origin = self.circuit.origin(self.stage, name);
            // A source that has several elements in the network stands several times.
            let same = || names.iter().zip(wanted).filter(|(n, _)| self.circuit.origin(self.stage, n) == origin);
            let value = libm::sqrt(same().map(|(_, v)| v * v).sum());
            // Both quadratures end at 1e-12 or so of the total power, whatever a source's own part of it.
            let floor = 1e-11 * total * total / value.max(1e-5 * total);
            let allowed = budget(Figure::OutputNoise).around(value) + floor;
            let wanted = Wanted { id: &self.circuit.id, name: &format!("{name} {what}"), figure, value, allowed, source: SOURCE };
            self.ledger.value(&wanted, of_source(got, origin));
        }
        for (origin, value) in got.iter().filter(|(o, _)| !names.iter().any(|n| self.circuit.origin(self.stage, n) == *o)) {
            let otherwise = format!("{origin:?} contributes {value:e}, and the circuit has no such source");
            self.ledger.fact(&self.circuit.id, what, *value == 0.0, &otherwise);
        }
    }

    fn against_gain(&mut self) {
        let expected = self.expected;
        let Some(gain) = expected.gain else { return };
        self.figure(Figure::Gain, gain);
        self.figure(Figure::GainAtSignal, expected.gain_at_signal.expect("stands beside the gain"));
        self.figure(Figure::Bandwidth, expected.bandwidth.unwrap_or(f64::INFINITY));
        match expected.low_cutoff {
            Some(frequency) => self.figure(Figure::LowCutoff, frequency),
            None => self.is(Figure::LowCutoff, "does not apply", |o| matches!(o, Outcome::DoesNotApply(_))),
        }
        if let Some(peaking) = expected.peaking {
            self.figure(Figure::Peaking, peaking);
        }
        match (expected.natural_frequency, expected.q) {
            (Some(frequency), Some(q)) => {
                self.figure(Figure::NaturalFrequency, frequency);
                self.figure(Figure::Q, q);
            }
            _ => self.is(Figure::Q, "does not apply", |o| {
                // Real poles that coincide may split into a pair by rounding, and then have a Q of one half.
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
        self.sources("rms", Figure::OutputNoise, expected.output_noise_by_source.as_ref().expect("stands beside the gain"), &shares);
    }

    fn all(&mut self) {
        let expected = self.expected;
        if expected.no_dc_path {
            for figure in [Figure::Gain, Figure::Bandwidth, Figure::PhaseMargin, Figure::OutputOffset, Figure::OutputNoise] {
                self.is(figure, "no DC path", |o| matches!(o, Outcome::NoDcPath(_)));
            }
            return;
        }
        compare_poles(self.ledger, &self.circuit.id, &expected.poles, &self.report.poles);
        let stage = self.stage;
        solved(stage, |solution| {
            self.loops(solution);
            if expected.stable {
                self.response(solution);
                self.noise(solution);
            }
        });
        if !expected.stable {
            for figure in [Figure::Gain, Figure::Bandwidth, Figure::OutputNoise, Figure::Q] {
                self.is(figure, "oscillates", |o| matches!(o, Outcome::Oscillates));
            }
            return;
        }
        if self.circuit.amplifiers.iter().all(|a| a.differential_resistance.is_some() && a.common_mode_resistance.is_some()) {
            self.figure(Figure::InputImpedance, expected.input_impedance.unwrap_or(f64::INFINITY));
        } else {
            self.is(Figure::InputImpedance, "undetermined", |o| matches!(o, Outcome::Undetermined(_)));
        }
        let (value, most) = expected.output_offset.expect("stands beside the noise");
        let allowed = budget(Figure::OutputOffset).around(value) + 1e-13 * most;
        let wanted = Wanted { id: &self.circuit.id, name: "output_offset", figure: Figure::OutputOffset, value, allowed, source: SOURCE };
        self.ledger.outcome(&wanted, &outcome(self.report, Query::of(Figure::OutputOffset)));
        self.figure(Figure::OutputImpedance, expected.output_impedance.expect("stands beside the noise"));
        self.against_gain();
    }
}

/// Every circuit's kind, for the count of what is covered.
pub fn kinds() -> Vec<String> {
    let rows: Vec<Row> = serde_json::from_str(TABLE).unwrap_or_else(|error| panic!("oracle_kinds.json: {error}"));
    rows.into_iter().map(|row| row.circuit.kind).collect()
}

/// Compares every circuit.
pub fn all(ledger: &mut Ledger) {
    let other =
        std::env::var("STAGELEAF_ORACLE_KINDS").ok().map(|path| std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}")));
    let rows: Vec<Row> =
        serde_json::from_str(other.as_deref().unwrap_or(TABLE)).unwrap_or_else(|error| panic!("oracle_kinds.json: {error}"));
    for Row { circuit, expected } in &rows {
        let stage = circuit.stage();
        let mut queries: Vec<Query> =
            Figure::ALL.iter().filter(|f| matches!(f.argument(), Argument::None)).copied().map(Query::of).collect();
        for &frequency in &circuit.frequencies {
            queries.extend([Figure::GainAt, Figure::NoiseDensityAt].map(|f| Query::at(f, frequency)));
        }
        let report = with_least_damped(&stage, report(&stage, &queries));
        Comparison { ledger, circuit, expected, stage: &stage, report: &report }.all();
    }
}

#[test]
fn random_and_hard_circuits_of_every_kind_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
