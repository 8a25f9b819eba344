//! Handbook rows about stability.

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    part::StatedPhaseMargin,
    stage::{Stage, Toleranced},
};

use crate::{
    ledger::Ledger,
    setup::{Amplifier, Complete, figure, map, outcome, report, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("loop.toml");

/// Open-loop gain whose dominant pole is so low that the loop is an integrator to nine digits.
const INTEGRATOR: f64 = 1e10;

/// A follower with the return ratio `w0²/(s·(s + 2ζ·w0))`, `f0` in Hz.
pub fn two_pole_follower(f0: f64, zeta: f64) -> Stage {
    let amplifier = Amplifier { higher_poles: Some(vec![2.0 * zeta * f0]), ..Amplifier::one_pole(INTEGRATOR, f0 / (2.0 * zeta)) };
    stage(Kind::Follower, amplifier.part())
}

fn decibels(ratio: f64) -> f64 {
    20.0 * libm::log10(ratio)
}

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    second_order(&rows, ledger);
    second_pole_for_a_margin(&rows, ledger);
    capacitive_load(&rows, ledger);
    input_capacitance(&rows, ledger);
}

fn second_order(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C032");
    let f0 = 1e5;
    for zeta in row.inputs("zeta") {
        let stage = two_pole_follower(f0, zeta);
        let queries = [Figure::PhaseMargin, Figure::Peaking, Figure::Bandwidth, Figure::Q].map(Query::of);
        let report = report(&stage, &queries);
        let of = |figure| outcome(&report, Query::of(figure));
        let name = |what: &str| {
            let shown = format!("{zeta:.4}");
            format!("{what}_zeta_{}", shown.trim_end_matches('0'))
        };
        row.check(ledger, &name("pm_deg"), Figure::PhaseMargin, &map(of(Figure::PhaseMargin), f64::to_degrees));
        row.check(ledger, &name("peaking_db"), Figure::Peaking, &map(of(Figure::Peaking), decibels));
        row.check(ledger, &name("f3db_over_f0"), Figure::Bandwidth, &map(of(Figure::Bandwidth), |f| f / f0));
        row.check(ledger, &name("q"), Figure::Q, &of(Figure::Q));
    }

    let row = rows.row("C034");
    let margin = |zeta| map(figure(&two_pole_follower(f0, zeta), Figure::PhaseMargin), f64::to_degrees);
    row.check(ledger, "PM_0.4", Figure::PhaseMargin, &margin(row.input("zeta")));
    row.check(ledger, "PM_5pct", Figure::PhaseMargin, &margin(row.expected("zeta_5pct")));
}

fn second_pole_for_a_margin(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C039");
    let gbw = 1e6;
    for degrees in row.inputs("PM_deg") {
        let (pole, crossover) = (format!("fp2_over_GBW_PM{degrees}"), format!("fc_over_GBW_PM{degrees}"));
        let one_pole = Amplifier::one_pole(INTEGRATOR, gbw);
        // With the pole stated, the margin follows; with the margin stated, the pole: both give the crossover.
        let by_pole = Amplifier { higher_poles: Some(vec![row.expected(&pole) * gbw]), ..one_pole.clone() };
        let by_pole = stage(Kind::Follower, by_pole.part());
        let got = map(figure(&by_pole, Figure::Crossover), |f| f / gbw);
        row.check(ledger, &crossover, Figure::Crossover, &got);
        let mut part = Amplifier { higher_poles: None, ..one_pole }.part();
        part.phase_margin =
            Some(StatedPhaseMargin { margin: degrees.to_radians(), gain: 1.0, load_resistance: None, load_capacitance: None });
        let by_margin = stage(Kind::Follower, part);
        let got = map(figure(&by_margin, Figure::Crossover), |f| f / gbw);
        row.check(ledger, &crossover, Figure::Crossover, &got);
        // For this loop w0² = GBW·fp2: the natural frequency gives the pole.
        for stage in [&by_pole, &by_margin] {
            let got = map(figure(stage, Figure::PhaseMargin), f64::to_degrees);
            let holds = got.value().is_some_and(|got| (got - degrees).abs() < 1e-4);
            ledger.fact("C039", &format!("PM{degrees}"), holds, &format!("wanted {degrees}°, got {got:?}"));
        }
        let product = |stage: &Stage| {
            let queries = [Figure::NaturalFrequency, Figure::Q].map(Query::of);
            let report = report(stage, &queries);
            map(outcome(&report, queries[0]), |f| f * f / (gbw * gbw))
        };
        // Real poles above a margin of 76.3° (ζ = 1); all of this row's lie below.
        row.check(ledger, &pole, Figure::NaturalFrequency, &product(&by_margin));
    }
}

fn capacitive_load(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C110");
    let amplifier = Amplifier { output_resistance: row.input("Ro_ohm"), ..Amplifier::one_pole(INTEGRATOR, row.input("GBW_hz")) };
    let bare = stage(Kind::Follower, amplifier.part()).loaded(None, Some(row.input("CL_F")));
    let isolated = bare.clone().with("Riso", row.input("Riso_ohm"));
    for (stage, crossover, margin) in [(bare, "fc_no_riso", "PM_no_riso"), (isolated, "fc_riso", "PM_riso")] {
        row.check(ledger, crossover, Figure::Crossover, &figure(&stage, Figure::Crossover));
        row.check(ledger, margin, Figure::PhaseMargin, &map(figure(&stage, Figure::PhaseMargin), f64::to_degrees));
    }
}

fn input_capacitance(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C112");
    let amplifier = Amplifier::one_pole(INTEGRATOR, row.input("GBW_hz"));
    let mut bare = stage(Kind::NonInverting, amplifier.part()).with("Rg", row.input("R1_ohm")).with("Rf", row.input("R2_ohm"));
    bare.board.inverting_node = Some(Toleranced::exact(row.input("Cin_F")));
    row.check(ledger, "fc", Figure::Crossover, &figure(&bare, Figure::Crossover));
    row.check(ledger, "PM", Figure::PhaseMargin, &map(figure(&bare, Figure::PhaseMargin), f64::to_degrees));
    let led = bare.with("Cf", row.expected("Cf"));
    row.check(ledger, "PM_with_Cf", Figure::PhaseMargin, &map(figure(&led, Figure::PhaseMargin), f64::to_degrees));
}

#[test]
fn handbook_margins_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
