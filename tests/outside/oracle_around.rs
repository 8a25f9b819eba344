//! What stands around random stages of every kind (ripple on the supplies, a sampling converter at the output), solved by `oracle_around.py` in mpmath by another route
//! than ours.
//!
//! `STAGELEAF_ORACLE_AROUND` may name another table of the same program (see `scripts/oracle`).

use serde::Deserialize;
use stageleaf_math::{
    analysis::outcome,
    figure::{Figure, Query},
    part::{Part, PartFigure, Rating},
    report::Outcome,
    stage::{Converter, Ripple, Signal, Span, Stage, Supply, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    oracle_kinds::Circuit,
    setup::solved,
};

const TABLE: &str = include_str!("oracle_around.json");
const SOURCE: &str = "oracle_around.py: nodal matrices in mpmath (50 digits)";
/// What the table's 13 digits leave, relative.
const PRINTED: f64 = 5e-13;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: Expected,
}

/// What stands around a circuit.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Around {
    /// Positive and negative rail, V.
    supply: [f64; 2],
    /// Rejection of the positive rail and its corner, of the negative rail and its corner.
    psrr: [f64; 4],
    /// Peak and frequency.
    ripple: [f64; 2],
    /// Steady value, peak and frequency of the first drive.
    signal: [f64; 3],
    /// The part's own start-up time, and its slew rate while the stage starts.
    startup: [f64; 2],
    /// The converter's input range.
    range: [f64; 2],
    converter: Sampling,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Sampling {
    bits: f64,
    noise: Option<f64>,
    sample_capacitance: f64,
    acquisition_time: f64,
    series_resistance: Option<f64>,
    shunt_capacitance: Option<f64>,
    switch_resistance: Option<f64>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    /// The first drive's transfer at the circuit's frequencies, real and imaginary part.
    response: Vec<[f64; 2]>,
    ripple_output: f64,
    /// With the slew rate and current limit far away.
    acquisition_error: Option<f64>,
    /// By amplifier: the steepest slope and the largest current that the kick asks.
    kick: Option<Vec<[f64; 2]>>,
    startup_time: Option<f64>,
    /// Whether an output would leave the rails on its way.
    #[serde(default)]
    startup_clips: bool,
    enob: f64,
    full_scale_margin: f64,
}

impl Around {
    fn stand(&self, stage: &mut Stage) {
        let [peak, frequency] = self.ripple;
        let [positive, negative] = self.supply.map(Span::exact);
        stage.supply = Some(Supply { positive, negative, ripple: Some(Ripple { peak, frequency }) });
        let [dc, peak, frequency] = self.signal;
        stage.signals = vec![Some(Signal { peak, frequency: Some(frequency), dc, crest_factor: core::f64::consts::SQRT_2 })];
        let exact = |value: Option<f64>| value.map(Toleranced::exact);
        stage.converter = Converter {
            full_scale: Some(self.range),
            bits: Some(self.converter.bits),
            noise: self.converter.noise,
            acquisition_time: Some(self.converter.acquisition_time),
            sample_capacitance: exact(Some(self.converter.sample_capacitance)),
            switch_resistance: exact(self.converter.switch_resistance),
            series_resistance: exact(self.converter.series_resistance),
            shunt_capacitance: exact(self.converter.shunt_capacitance),
        };
        let figures = [PartFigure::PsrrPositive, PartFigure::PsrrPositiveCorner, PartFigure::PsrrNegative, PartFigure::PsrrNegativeCorner];
        for part in parts(stage) {
            for (figure, value) in figures.into_iter().zip(self.psrr) {
                part.state(figure, Rating::typical(value));
            }
        }
    }
}

/// The parts of a stage's amplifiers.
fn parts(stage: &mut Stage) -> impl Iterator<Item = &mut Part> {
    core::iter::once(&mut stage.part).chain(stage.parts.iter_mut().map(|(_, part)| part))
}

/// The stage with these slew rates and current limits, by amplifier.
fn limited(stage: &Stage, limits: impl Fn(usize) -> [f64; 2]) -> Stage {
    let mut stage = stage.clone();
    // Each amplifier has a part of its own, so that each can have limits of its own.
    stage.parts = (1..stage.kind.spec().amplifiers).map(|index| (index + 1, stage.part_of(index).clone())).collect();
    for (index, part) in parts(&mut stage).enumerate() {
        let [slew, current] = limits(index);
        for (figure, value) in [(PartFigure::SlewRise, slew), (PartFigure::SlewFall, slew), (PartFigure::CurrentLimit, current)] {
            part.state(figure, Rating::typical(value));
        }
    }
    stage
}

/// Compares every circuit.
pub fn all(ledger: &mut Ledger) {
    let other =
        std::env::var("STAGELEAF_ORACLE_AROUND").ok().map(|path| std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}")));
    let rows: Vec<Row> =
        serde_json::from_str(other.as_deref().unwrap_or(TABLE)).unwrap_or_else(|error| panic!("oracle_around.json: {error}"));
    for Row { circuit, expected } in &rows {
        let mut stage = circuit.stage();
        circuit.around.as_ref().expect("something stands around every circuit").stand(&mut stage);
        for (&frequency, [re, im]) in circuit.frequencies.iter().zip(&expected.response) {
            let value = libm::hypot(*re, *im);
            let allowed = budget(Figure::GainAt).around(value) + PRINTED * value;
            let name = format!("gain_at {frequency}");
            let wanted = Wanted { id: &circuit.id, name: &name, figure: Figure::GainAt, value, allowed, source: SOURCE };
            ledger.outcome(&wanted, &solved(&stage, |solution| outcome(solution, Query::at(Figure::GainAt, frequency))));
        }
        let nominal = |stage: &Stage, of: Figure| solved(stage, |solution| outcome(solution, Query::of(of)));
        let mut compare = |stage: &Stage, of: Figure, value: f64| {
            let allowed = budget(of).around(value) + PRINTED * value.abs();
            let wanted = Wanted { id: &circuit.id, name: of.id(), figure: of, value, allowed, source: SOURCE };
            ledger.outcome(&wanted, &nominal(stage, of));
        };
        compare(&stage, Figure::RippleOutput, expected.ripple_output);
        compare(&stage, Figure::Enob, expected.enob);
        compare(&stage, Figure::FullScaleMargin, expected.full_scale_margin);
        let [own, slew] = circuit.around.as_ref().expect("see above").startup;
        let mut starting = limited(&stage, |_| [slew, 1e30]);
        for part in parts(&mut starting) {
            part.state(PartFigure::Startup, Rating::typical(own));
        }
        match expected.startup_time {
            Some(time) => compare(&starting, Figure::StartupTime, time),
            None if expected.startup_clips => {
                let got = nominal(&starting, Figure::StartupTime);
                ledger.fact(
                    &circuit.id,
                    "startup_time",
                    matches!(got, Outcome::OutOfReach(_)),
                    &format!("it leaves the rails, got {got:?}"),
                );
            }
            None => {}
        }
        let (Some(error), Some(kick)) = (expected.acquisition_error, &expected.kick) else { continue };
        // After hundreds of time constants nothing is left but the rounding of volts.
        let allowed = budget(Figure::AcquisitionError).around(error) + PRINTED * error + 1e-15;
        let name = Figure::AcquisitionError.id();
        let wanted = Wanted { id: &circuit.id, name, figure: Figure::AcquisitionError, value: error, allowed, source: SOURCE };
        ledger.outcome(&wanted, &nominal(&limited(&stage, |_| [1e30, 1e30]), Figure::AcquisitionError));
        // Without a signal, so that the kick alone asks for slope and current; the reference and the supply may not stand either.
        stage.signals.clear();
        stage.reference = None;
        stage.supply = None;
        for (which, row) in kick.iter().enumerate() {
            // What no kick reaches (an ideal output outside the loop) moves by rounding alone.
            for bound in (0..2).filter(|&bound| row[bound] > 1e-20) {
                let at = |factor: f64| {
                    let limit = |index: usize| core::array::from_fn(|i| if (index, i) == (which, bound) { row[i] * factor } else { 1e30 });
                    nominal(&limited(&stage, limit), Figure::AcquisitionError)
                };
                let holds = matches!(at(1.0 + 1e-5), Outcome::Value(_)) && matches!(at(1.0 - 1e-5), Outcome::OutOfReach(_));
                let name = format!("{} of the kick at amplifier {}", ["slope", "current"][bound], which + 1);
                let otherwise = format!("not {:e}: just above it is {:?}, just below {:?}", row[bound], at(1.0 + 1e-5), at(1.0 - 1e-5));
                ledger.fact(&circuit.id, &name, holds, &otherwise);
            }
        }
    }
}

#[test]
fn what_stands_around_random_circuits_is_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
