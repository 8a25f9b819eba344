//! Overshoot, settling, distortion and whole waveforms: closed forms, and random nonlinear stages stepped by `oracle_waveform.py` with
//! scipy's adaptive solver, from equations written there by another route than ours.
//!
//! `STAGELEAF_ORACLE_WAVEFORM` may name another table of the same program (see `scripts/oracle`).

use std::f64::consts::{PI, SQRT_2, TAU};

use serde::Deserialize;
use stageleaf_math::{
    analysis::waveform::{
        core::Equations,
        figures::{Settling, overshoot, settling_time, slew_clip_distortion},
        run::{Moving, Run},
    },
    figure::Figure,
    kind::Kind,
    model::Model,
    part::{Headroom, Part, PartFigure as P, Rating, Zero},
    report::Outcome,
    solution::Solution,
    stage::{Ambient, Board, Component, Isolation, Load, Signal, Source, Span, Stage, Supply, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
};

const TABLE: &str = include_str!("oracle_waveform.json");

/// An amplifier's headroom by rising current: A, V.
type Rows = Vec<(f64, f64)>;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Amplifier {
    open_loop: f64,
    gbw: f64,
    poles: Vec<f64>,
    zeros: Vec<f64>,
    output_resistance: f64,
    differential_capacitance: f64,
    common_mode_capacitance: f64,
    slew_rise: f64,
    slew_fall: f64,
    current_limit: f64,
    headroom_high: Rows,
    headroom_low: Rows,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields, rename_all = "snake_case", tag = "kind")]
enum Input {
    Steps { steps: Vec<(f64, f64)> },
    Sine { dc: f64, peak: f64, frequency: f64 },
    Ramp { slope: f64 },
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Circuit {
    id: String,
    kind: String,
    values: std::collections::BTreeMap<String, f64>,
    amplifier: Amplifier,
    supply: [f64; 2],
    input: Input,
    #[expect(dead_code, reason = "the last moment says it")]
    window: f64,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: Expected,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    times: Vec<f64>,
    output: Vec<f64>,
}

impl Circuit {
    fn stage(&self) -> Stage {
        let a = &self.amplifier;
        let kind = Kind::from_id(&self.kind).unwrap_or_else(|| panic!("{}: no kind {}", self.id, self.kind));
        let zeros = a.zeros.iter().map(|&frequency| Zero { frequency, right_half_plane: false }).collect();
        let mut part = Part { poles: Some(a.poles.clone()), zeros, ..Part::default() };
        for (figure, value) in [
            (P::OpenLoop, a.open_loop),
            (P::Gbw, a.gbw),
            (P::OutputResistance, a.output_resistance),
            (P::DifferentialCapacitance, a.differential_capacitance),
            (P::CommonModeCapacitance, a.common_mode_capacitance),
            (P::SlewRise, a.slew_rise),
            (P::SlewFall, a.slew_fall),
            (P::CurrentLimit, a.current_limit),
        ] {
            part.state(figure, Rating::typical(value));
        }
        let headroom = |rows: &Rows| rows.iter().map(|&(current, volts)| Headroom { current, volts: Rating::typical(volts) }).collect();
        (part.headroom_high, part.headroom_low) = (headroom(&a.headroom_high), headroom(&a.headroom_low));
        let value = |name: &str| self.values.get(name).map(|&v| Toleranced::exact(v));
        let components = kind.components().iter().filter_map(|c| value(c.name).map(|value| Component { name: c.name, value })).collect();
        Stage {
            components,
            sources: vec![value("Rs").map(|resistance| Source::Resistive { resistance })],
            load: Load { resistance: value("RL"), capacitance: value("CL") },
            ..plain(kind, part, self.supply)
        }
    }
}

fn plain(kind: Kind, part: Part, supply: [f64; 2]) -> Stage {
    Stage {
        name: "any".into(),
        kind,
        components: vec![],
        part,
        isolation: Isolation::OutsideLoop,
        supply: Some(Supply { positive: Span::exact(supply[0]), negative: Span::exact(supply[1]), ripple: None }),
        sources: vec![],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load::default(),
        board: Board::default(),
        ambient: Some(Ambient { range: Span::exact(298.15), values_at: None }),
        band: None,
        limits: vec![],
        converter: stageleaf_math::stage::Converter::default(),
        measured: vec![],
    }
}

fn solved<T>(stage: &Stage, ask: impl FnOnce(&Solution<'_>) -> T) -> T {
    let model = Model::compile(stage);
    let solution = Solution::new(&model, model.parameters.nominal(), None);
    ask(&solution)
}

/// The output at the circuit's moments.
fn waveform(circuit: &Circuit, times: &[f64]) -> Vec<f64> {
    let stage = circuit.stage();
    solved(&stage, |solution| {
        let omega = if let Input::Sine { frequency, .. } = circuit.input { TAU * frequency } else { 0.0 };
        let equations = Equations::of(solution, 0, omega).expect("equations");
        let mut run = Run::new(&equations, 1.0 / 1_073_741_824.0, true).expect("a start");
        run.settle(0.0).expect("a point");
        let still = Moving::default();
        let mut jumps = match &circuit.input {
            Input::Steps { steps } => steps.iter().map(|&(at, value)| (at, Moving { value, ..still })).collect(),
            Input::Sine { dc, peak, .. } => {
                run.longest = TAU / omega / 64.0;
                vec![(0.0, Moving { value: *dc, cosine: *peak, ..still })]
            }
            Input::Ramp { slope } => vec![(0.0, Moving { slope: *slope, ..still })],
        };
        jumps.reverse();
        let mut output = Vec::new();
        for &time in times {
            while let Some(&(at, moving)) = jumps.last()
                && at <= time
            {
                // The table's moment belongs to what was before.
                if at >= time {
                    break;
                }
                run.span(at - run.time, &mut |_, _| {}).expect("time");
                run.jump(moving).expect("a jump");
                jumps.pop();
            }
            run.span(time - run.time, &mut |_, _| {}).expect("time");
            output.push(run.output());
        }
        output
    })
}

/// A follower around one pole at 10 MHz and 10 V/µs, with what limits it stated.
fn follower(poles: Vec<f64>) -> Stage {
    let mut part = Part { poles: Some(poles), ..Part::default() };
    for (figure, value) in [
        (P::OpenLoop, 1e12),
        (P::Gbw, 1e7),
        (P::OutputResistance, 1.0),
        (P::DifferentialCapacitance, 0.0),
        (P::CommonModeCapacitance, 0.0),
        (P::SlewRise, 1e7),
        (P::SlewFall, 1e7),
        (P::CurrentLimit, 1.0),
    ] {
        part.state(figure, Rating::typical(value));
    }
    let flat = vec![Headroom { current: 1.0, volts: Rating::typical(1.0) }];
    (part.headroom_high, part.headroom_low) = (flat.clone(), flat);
    plain(Kind::Follower, part, [12.0, -12.0])
}

const SECOND_ORDER: &str = "textbook relation of a second-order system, exp(−πζ/√(1 − ζ²)), from memory";
const ONE_POLE: &str = "exact mathematics: τ·ln(1/ε)";

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let mut tell = |id: &str, name: &str, figure: Figure, value: f64, got: Outcome, source: &'static str| {
        let wanted = Wanted { id, name, figure, value, allowed: budget(figure).around(value), source };
        ledger.outcome(&wanted, &got);
    };
    // A loop of an integrator and one pole: ζ = ½·√(f2/GBW).
    let damped = |zeta: f64| solved(&follower(vec![4e7 * zeta * zeta]), overshoot);
    for (zeta, name, percent) in [
        (0.1, "overshoot_pct_zeta_0.1", 72.924_761_428_767_1),
        (0.2, "overshoot_pct_zeta_0.2", 52.662_059_933_030_31),
        (0.3, "overshoot_pct_zeta_0.3", 37.232_610_492_658_644),
        (0.4, "overshoot_pct_zeta_0.4", 25.382_672_198_010_87),
        (0.5, "overshoot_pct_zeta_0.5", 16.303_353_482_158_048),
        (0.6, "overshoot_pct_zeta_0.6", 9.478_022_484_215_485),
        (std::f64::consts::FRAC_1_SQRT_2, "overshoot_pct_zeta_0.7071", 4.321_391_826_377_225_5),
        (0.8, "overshoot_pct_zeta_0.8", 1.516_461_986_454_656_2),
        (0.9, "overshoot_pct_zeta_0.9", 0.152_375_582_051_940_96),
    ] {
        tell("C032", name, Figure::Overshoot, percent / 100.0, damped(zeta), SECOND_ORDER);
    }
    tell("C034", "OS_0.4", Figure::Overshoot, 0.253_826_721_980_108_7, damped(0.4), SECOND_ORDER);
    tell("C034", "zeta_5pct", Figure::Overshoot, 0.05, damped(0.690_106_730_559_413_3), SECOND_ORDER);
    let settles = |error, step| solved(&follower(vec![]), |s| settling_time(s, Settling { error, step }));
    let tau = 1.0 / (TAU * 1e7);
    for (bits, name) in [(8, "N8"), (10, "N10"), (12, "N12"), (14, "N14"), (16, "N16"), (18, "N18"), (20, "N20"), (24, "N24")] {
        let wanted = f64::from(bits) * std::f64::consts::LN_2 * tau;
        tell(
            "C036",
            name,
            Figure::SettlingTime,
            wanted,
            settles(libm::ldexp(1.0, -bits), 0.1),
            "SLYW038D, time to settle to N bits (looked up), t/τ = N·ln 2",
        );
    }
    for (error, name) in [(1e-2, "1pct"), (1e-3, "0.1pct"), (1e-4, "0.01pct"), (1e-5, "0.001pct")] {
        tell("C038", name, Figure::SettlingTime, -libm::log(error) * tau, settles(error, 0.1), ONE_POLE);
    }
    tell(
        "C047",
        "t_settle",
        Figure::SettlingTime,
        5.391_591_235_949_58e-7,
        settles(1e-3, 5.0),
        "exact mathematics: ΔV/SR − τ + τ·ln(SR·τ/(ε·ΔV))",
    );
    // The triangle that a slew rate leaves of a sine far beyond it, and the sine that symmetric rails cut.
    let sine = |peak, frequency| {
        let mut stage = follower(vec![]);
        stage.signals = vec![Some(Signal { peak, frequency: Some(frequency), dc: 0.0, crest_factor: SQRT_2 })];
        solved(&stage, slew_clip_distortion)
    };
    let cut: f64 = 11.0 / 13.0;
    let a = libm::asin(cut);
    let fundamental = 2.0 / PI * (a - libm::sin(a) * libm::cos(a)) + 4.0 / PI * cut * libm::cos(a);
    let square = 2.0 / PI * (a / 2.0 - libm::sin(a) * libm::cos(a) / 2.0 + cut * cut * (PI / 2.0 - a));
    let wanted = libm::sqrt(2.0 * square / (fundamental * fundamental) - 1.0);
    tell(
        "clipped-sine",
        "distortion",
        Figure::SlewClipDistortion,
        wanted,
        sine(13.0, 10.0),
        "exact mathematics: Fourier series of the clipped sine",
    );
    // The slew limit is entered at SR·τ of step.
    let slews = |step: f64| {
        solved(&follower(vec![]), |s| {
            let equations = Equations::of(s, 0, 0.0).expect("equations");
            let mut run = Run::new(&equations, 1.0 / 1_073_741_824.0, true).expect("a start");
            run.settle(0.0).expect("a point");
            run.jump(Moving { value: step, ..Moving::default() }).expect("a jump");
            run.passed.slew
        })
    };
    let threshold = 0.159_154_943_091_895_35;
    let holds = !slews(threshold * (1.0 - 1e-9)) && slews(threshold * (1.0 + 1e-9));
    ledger.fact("C047", "threshold", holds, "the slew limit is not entered at SR·τ");
    let other = std::env::var("STAGELEAF_ORACLE_WAVEFORM").ok().map(|p| std::fs::read_to_string(&p).unwrap_or_else(|e| panic!("{p}: {e}")));
    let rows: Vec<Row> =
        serde_json::from_str(other.as_deref().unwrap_or(TABLE)).unwrap_or_else(|error| panic!("oracle_waveform.json: {error}"));
    assert!(rows.len() >= 20, "the table holds circuits");
    for Row { circuit, expected } in &rows {
        let got = waveform(circuit, &expected.times);
        let swing = expected.output.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
        let worst = got.iter().zip(&expected.output).map(|(g, w)| (g - w).abs()).fold(0.0, f64::max);
        // What the solver's own tolerance and the table's digits leave.
        let holds = worst <= 2e-6 * swing && got.len() == expected.output.len();
        ledger.fact(&circuit.id, "waveform", holds, &format!("{worst:.3e} V of {swing:.3} V apart"));
    }
}

#[test]
fn waveforms_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
