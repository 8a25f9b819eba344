//! Whole circuits that an independent program solved: response, loop, poles, noise.

use serde::Deserialize;
use stageleaf_math::{
    analysis::margins,
    figure::{Figure, Query},
    kind::Kind,
    report::{NoiseOrigin, Outcome},
    stage::{Isolation, Source, Stage, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted, half_unit},
    places::{Role, place},
    setup::{Amplifier, Complete, density_by_source, of_source, outcome, report, solved, stage, with_least_damped},
};

/// The tables.
pub const TABLES: [&str; 7] = [
    include_str!("follower.toml"),
    include_str!("non_inverting.toml"),
    include_str!("inverting.toml"),
    include_str!("several_inputs.toml"),
    include_str!("shaping.toml"),
    include_str!("transimpedance.toml"),
    include_str!("filters.toml"),
];

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Table {
    source: String,
    status: String,
    circuit: Vec<Circuit>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Circuit {
    id: String,
    kind: String,
    #[serde(default)]
    note: String,
    temperature: f64,
    isolation: String,
    netlist: Vec<(String, String, String, String, f64)>,
    /// +, −, output pin of the only amplifier.
    amplifier_nodes: Option<(String, String, String)>,
    /// Name, +, −, output pin of each of several.
    #[serde(default)]
    amplifiers: Vec<(String, String, String, String)>,
    amplifier: Stated,
    expected: Expected,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Stated {
    open_loop: f64,
    pole: f64,
    higher_poles: Vec<f64>,
    output_resistance: f64,
    differential_capacitance: f64,
    common_mode_capacitance: f64,
    voltage_noise: f64,
    voltage_corner: f64,
    current_noise: f64,
    current_corner: f64,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    gain: f64,
    low_cutoff: Option<f64>,
    bandwidth: f64,
    peaking: Option<f64>,
    /// Every input's gain at DC.
    #[serde(default)]
    input_gains: Vec<f64>,
    common_mode_gain: Option<f64>,
    /// The only amplifier's loop, …
    return_ratio_at_dc: Option<f64>,
    crossover: Option<f64>,
    phase_margin: Option<f64>,
    gain_margin: Option<f64>,
    phase_crossover: Option<f64>,
    /// … or each one's.
    #[serde(default)]
    loops: Vec<Loop>,
    least_damped_pole: Option<Pole>,
    response: Vec<(f64, f64, f64)>,
    noise_sources: Vec<String>,
    noise_density: Vec<(f64, f64, Vec<f64>)>,
    integrated_noise: Integrated,
}

#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Loop {
    return_ratio_at_dc: f64,
    crossover: f64,
    phase_margin: f64,
    gain_margin: Option<f64>,
    phase_crossover: Option<f64>,
}

impl Expected {
    /// Every amplifier's loop.
    fn loops(&self) -> Vec<Loop> {
        let only = self.crossover.zip(self.phase_margin).zip(self.return_ratio_at_dc);
        only.map_or_else(
            || self.loops.clone(),
            |((crossover, phase_margin), return_ratio_at_dc)| {
                let (gain_margin, phase_crossover) = (self.gain_margin, self.phase_crossover);
                vec![Loop { return_ratio_at_dc, crossover, phase_margin, gain_margin, phase_crossover }]
            },
        )
    }
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Pole {
    frequency: f64,
    damping: f64,
    /// Relative error of the source, where it is known to be wrong; the reason stands in the table.
    #[serde(default)]
    source_error: f64,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Integrated {
    from: f64,
    to: f64,
    total: f64,
    by_source: Vec<f64>,
}

impl Circuit {
    fn kind(&self) -> Kind {
        Kind::from_id(&self.kind).unwrap_or_else(|| panic!("{}: no kind is called {:?}", self.id, self.kind))
    }

    /// What a node is (see [`place`]).
    fn label(&self, node: &str) -> String {
        if node == "0" || node == "out" || node.starts_with("in") {
            return node.into();
        }
        let several = self.amplifiers.iter().zip(1..).map(|((_, plus, minus, pin), k)| (plus, minus, pin, k.to_string()));
        let only = self.amplifier_nodes.iter().map(|(plus, minus, pin)| (plus, minus, pin, String::new()));
        for (plus, minus, pin, number) in only.chain(several) {
            for (name, label) in [(plus, "+"), (minus, "-"), (pin, "pin")] {
                if name == node {
                    return format!("{label}{number}");
                }
            }
        }
        "inner".into()
    }

    /// An element's role by the nodes that it joins; its name says nothing.
    fn role(&self, element: &(String, String, String, String, f64)) -> Role {
        let (name, sort, a, b, _) = element;
        if let Some(role) = place(self.kind(), sort, &self.label(a), &self.label(b)) {
            return role;
        }
        let (plus, minus, pin) = self.amplifier_nodes.as_ref().map_or(("", "", ""), |(plus, minus, pin)| (plus, minus, pin));
        let joins = |x: &str, y: &str| (a == x && b == y) || (a == y && b == x);
        let inside = self.isolation == "inside";
        match (sort.as_str(), self.kind()) {
            ("R", Kind::Inverting) if joins("in", minus) => Role::Component("Rin"),
            ("R", Kind::Inverting) if joins(plus, "0") => Role::Component("Rp"),
            ("R", Kind::NonInverting | Kind::Follower) if joins("in", plus) => Role::SourceResistance,
            ("R", Kind::NonInverting) if joins(minus, "0") => Role::Component("Rg"),
            ("R", Kind::Inverting | Kind::NonInverting) if joins(minus, if inside { "out" } else { pin }) => Role::Component("Rf"),
            ("R", _) if joins(pin, "out") => Role::Component("Riso"),
            ("R", _) if joins("out", "0") => Role::LoadResistance,
            ("C", _) if joins(minus, pin) => Role::Component("Cf"),
            ("C", _) if joins(minus, "0") => Role::StrayInverting,
            ("C", _) if joins("out", "0") => Role::LoadCapacitance,
            _ => panic!("{}: {name} from {a} to {b} has no place in a {} stage", self.id, self.kind),
        }
    }

    fn stage(&self) -> Stage {
        let stated = &self.amplifier;
        let amplifier = Amplifier {
            higher_poles: Some(stated.higher_poles.clone()),
            output_resistance: stated.output_resistance,
            differential_capacitance: stated.differential_capacitance,
            common_mode_capacitance: stated.common_mode_capacitance,
            voltage_noise: stated.voltage_noise,
            voltage_corner: stated.voltage_corner,
            current_noise: stated.current_noise,
            current_corner: stated.current_corner,
            ..Amplifier::one_pole(stated.open_loop, stated.open_loop * stated.pole)
        };
        let integrated = &self.expected.integrated_noise;
        let mut result = stage(self.kind(), amplifier.part()).at(self.temperature).over(integrated.from, integrated.to);
        result.isolation = if self.isolation == "inside" { Isolation::InsideLoop } else { Isolation::OutsideLoop };
        for element in &self.netlist {
            let value = Toleranced::exact(element.4);
            match self.role(element) {
                Role::Component(name) => result = result.with(name, element.4),
                Role::SourceResistance => result.sources = vec![Some(Source::Resistive { resistance: value })],
                Role::JunctionCapacitance => {
                    let shunt = self.netlist.iter().find(|e| self.role(e) == Role::ShuntResistance);
                    let shunt_resistance = shunt.map(|e| Toleranced::exact(e.4));
                    result.sources = vec![Some(Source::Photodiode { capacitance: value, shunt_resistance, dark_current: None })];
                }
                // Stands beside the junction's capacitance.
                Role::ShuntResistance => {}
                Role::LoadResistance => result.load.resistance = Some(value),
                Role::LoadCapacitance => result.load.capacitance = Some(value),
                Role::StrayInverting => result.board.inverting_node = Some(value),
            }
        }
        result
    }

    fn origin(&self, source: &str) -> NoiseOrigin {
        let Some((amplifier, generator)) = source.split_once('.') else {
            let element = self.netlist.iter().find(|e| e.0 == source);
            return self.role(element.unwrap_or_else(|| panic!("{}: no element is called {source}", self.id))).origin();
        };
        let index = self.amplifiers.iter().position(|a| a.0 == amplifier).unwrap_or(0);
        let index = u8::try_from(index).expect("few amplifiers");
        match generator {
            "en" => NoiseOrigin::AmplifierVoltage(index),
            "in+" => NoiseOrigin::CurrentNonInverting(index),
            "in-" => NoiseOrigin::CurrentInverting(index),
            _ => panic!("{}: {source} is no noise source", self.id),
        }
    }

    fn compare(&self, ledger: &mut Ledger, source: &str) {
        let expected = &self.expected;
        let stage = self.stage();
        let mut queries: Vec<Query> = [
            Figure::Gain,
            Figure::Bandwidth,
            Figure::LowCutoff,
            Figure::Peaking,
            Figure::Crossover,
            Figure::PhaseMargin,
            Figure::GainMargin,
            Figure::NaturalFrequency,
            Figure::Q,
            Figure::OutputNoise,
        ]
        .map(Query::of)
        .into();
        for point in &expected.response {
            queries.extend([Query::at(Figure::GainAt, point.0), Query::at(Figure::PhaseAt, point.0)]);
        }
        queries.extend(expected.noise_density.iter().map(|row| Query::at(Figure::NoiseDensityAt, row.0)));
        let report = with_least_damped(&stage, report(&stage, &queries));

        let mut tell = |name: &str, query: Query, value: f64, half_digit: f64| {
            let allowed = budget(query.figure).around(value) + half_digit;
            let wanted = Wanted { id: &self.id, name, figure: query.figure, value, allowed, source };
            ledger.outcome(&wanted, &outcome(&report, query));
        };
        let printed = |value: f64| half_unit(value, 10);
        tell("gain", Query::of(Figure::Gain), expected.gain, printed(expected.gain));
        tell("bandwidth", Query::of(Figure::Bandwidth), expected.bandwidth, printed(expected.bandwidth));
        if let Some(frequency) = expected.low_cutoff {
            tell("low_cutoff", Query::of(Figure::LowCutoff), frequency, printed(frequency));
        }
        if let Some(peaking) = expected.peaking {
            let (ratio, half) = level(peaking, 6);
            tell("peaking", Query::of(Figure::Peaking), ratio, half);
        }
        // The stage's margins are those of its worst loop.
        let loops = expected.loops();
        let worst = loops.iter().min_by(|a, b| a.phase_margin.total_cmp(&b.phase_margin)).expect("a stage has a loop");
        tell("crossover", Query::of(Figure::Crossover), worst.crossover, printed(worst.crossover));
        let margin = worst.phase_margin;
        tell("phase_margin", Query::of(Figure::PhaseMargin), margin.to_radians(), printed(margin).to_radians());
        // No −180° crossing: the return ratio may grow without bound.
        let bound = |one: &Loop| one.gain_margin.map_or((f64::INFINITY, 0.0), |decibels| level(decibels, 10));
        let (ratio, half) = loops.iter().map(bound).min_by(|a, b| a.0.total_cmp(&b.0)).expect("a stage has a loop");
        tell("gain_margin", Query::of(Figure::GainMargin), ratio, half);
        if let Some(pole) = &expected.least_damped_pole {
            let (frequency, q) = (pole.frequency, 0.5 / pole.damping);
            let error = pole.source_error;
            tell("natural_frequency", Query::of(Figure::NaturalFrequency), frequency, printed(frequency) + error * frequency);
            tell("q", Query::of(Figure::Q), q, (printed(pole.damping) / pole.damping + error) * q);
        }
        for &(frequency, magnitude, degrees) in &expected.response {
            tell(&format!("gain_at {frequency}"), Query::at(Figure::GainAt, frequency), magnitude, printed(magnitude));
            let half = half_unit(degrees, 9).to_radians();
            tell(&format!("phase_at {frequency}"), Query::at(Figure::PhaseAt, frequency), degrees.to_radians(), half);
        }
        for (frequency, total, _) in &expected.noise_density {
            tell(&format!("noise_density_at {frequency}"), Query::at(Figure::NoiseDensityAt, *frequency), *total, printed(*total));
        }
        let total = expected.integrated_noise.total;
        tell("output_noise", Query::of(Figure::OutputNoise), total, printed(total));

        if let Some(Pole { damping, source_error, .. }) = &expected.least_damped_pole
            && let Outcome::Value(q) = outcome(&report, Query::of(Figure::Q))
        {
            // An exemption that is not needed fails.
            let needed = *source_error == 0.0 || (q * 2.0 * damping - 1.0).abs() > source_error * 1e-2;
            ledger.fact(&self.id, "q", needed, "the source's error is far smaller than the table says");
        } else {
            let none = matches!(outcome(&report, Query::of(Figure::Q)), Outcome::DoesNotApply(_));
            ledger.fact(&self.id, "q", none, "the circuit has no complex poles, yet `q` is not \"does not apply\"");
        }
        self.compare_loops(ledger, source, &loops);
        self.compare_drives(ledger, source);

        let shares: Vec<_> = report.noise_shares.iter().map(|s| (s.origin, s.rms)).collect();
        self.compare_sources(ledger, source, "rms", Figure::OutputNoise, &expected.integrated_noise.by_source, &shares);
        for (frequency, _, by_source) in &expected.noise_density {
            let got = density_by_source(&stage, *frequency);
            self.compare_sources(ledger, source, &format!("density at {frequency}"), Figure::NoiseDensityAt, by_source, &got);
        }
        ledger.fact(&self.id, "circuit", true, "");
    }

    /// Each amplifier's loop, the others alive.
    fn compare_loops(&self, ledger: &mut Ledger, source: &str, loops: &[Loop]) {
        let stage = self.stage();
        for (index, one) in loops.iter().enumerate() {
            let (found, at_dc) = solved(&stage, |s| (margins::of(s, index), s.return_ratio(index, 0.0).re));
            let (ratio, half) = one.gain_margin.map_or((f64::INFINITY, 0.0), |decibels| level(decibels, 10));
            let margin = one.phase_margin;
            let printed = |value: f64| half_unit(value, 10);
            for (name, figure, value, half, got) in [
                ("return ratio at DC", Figure::Gain, one.return_ratio_at_dc, printed(one.return_ratio_at_dc), Some(at_dc)),
                ("crossover", Figure::Crossover, one.crossover, printed(one.crossover), found.crossover),
                ("phase margin", Figure::PhaseMargin, margin.to_radians(), printed(margin).to_radians(), found.phase),
                ("gain margin", Figure::GainMargin, ratio, half, Some(found.gain)),
            ] {
                let name = format!("{name} of amplifier {}", index + 1);
                let allowed = budget(figure).around(value) + half;
                ledger.value(&Wanted { id: &self.id, name: &name, figure, value, allowed, source }, got.unwrap_or(f64::NAN));
            }
            let both = one.phase_crossover.is_some() == one.gain_margin.is_some();
            ledger.fact(&self.id, "phase_crossover", both, "the table gives one of gain margin and its frequency alone");
        }
    }

    /// What the first signal's figures do not show: every input's gain, the common mode's.
    fn compare_drives(&self, ledger: &mut Ledger, source: &str) {
        let stage = self.stage();
        let inputs = self
            .expected
            .input_gains
            .iter()
            .copied()
            .enumerate()
            .map(|(drive, gain)| (format!("gain of input {}", drive + 1), drive, gain));
        let common = self.expected.common_mode_gain.map(|gain| ("common-mode gain".to_owned(), 1, gain));
        for (name, drive, value) in inputs.chain(common) {
            // The common mode's gain is what two gains near one leave: rounding of 1e-16 of them stays.
            let allowed = budget(Figure::Gain).around(value) + half_unit(value, 10) + 1e-13;
            let got = solved(&stage, |s| s.dc_gain(drive));
            ledger.value(&Wanted { id: &self.id, name: &name, figure: Figure::Gain, value, allowed, source }, got);
        }
    }

    fn compare_sources(&self, ledger: &mut Ledger, source: &str, what: &str, figure: Figure, wanted: &[f64], got: &[(NoiseOrigin, f64)]) {
        assert_eq!(wanted.len(), self.expected.noise_sources.len(), "{}: {what}", self.id);
        // A density by source is a share of a narrow band: the integral's budget.
        let exactness = budget(Figure::OutputNoise);
        for (name, &value) in self.expected.noise_sources.iter().zip(wanted) {
            let allowed = exactness.around(value) + half_unit(value, 8);
            let wanted = Wanted { id: &self.id, name: &format!("{name} {what}"), figure, value, allowed, source };
            ledger.value(&wanted, of_source(got, self.origin(name)));
        }
        let listed: Vec<_> = self.expected.noise_sources.iter().map(|name| self.origin(name)).collect();
        for (origin, value) in got.iter().filter(|(origin, _)| !listed.contains(origin)) {
            ledger.fact(&self.id, what, *value == 0.0, &format!("{origin:?} contributes {value:e}, and the circuit has no such source"));
        }
    }
}

/// A level printed in dB to `digits` digits, as a ratio with half a unit of its last digit.
fn level(decibels: f64, digits: i32) -> (f64, f64) {
    let ratio = libm::pow(10.0, decibels / 20.0);
    (ratio, ratio * half_unit(decibels, digits) * core::f64::consts::LN_10 / 20.0)
}

/// Every circuit's kind, for the count of what is covered.
pub fn kinds() -> Vec<String> {
    let tables = TABLES.iter().map(|text| toml::from_str::<Table>(text).unwrap_or_else(|error| panic!("{error}")));
    tables.flat_map(|table| table.circuit).map(|circuit| circuit.kind).collect()
}

/// Compares every circuit.
pub fn all(ledger: &mut Ledger) {
    for text in TABLES {
        let table: Table = toml::from_str(text).unwrap_or_else(|error| panic!("{error}"));
        let source = format!("{} [{}]", table.source, table.status);
        for circuit in &table.circuit {
            circuit.compare(ledger, &format!("{source} {}", circuit.note));
        }
    }
}

#[test]
fn solved_circuits_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
