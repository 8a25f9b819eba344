//! Junction temperatures where the bias current that heats the junction doubles with it, and output currents beyond the limit.

use core::f64::consts::{PI, SQRT_2};

use stageleaf_math::{
    analyse,
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin, Verdict},
    part::{PartFigure, Rating},
    report::{Caution, Outcome},
    stage::Stage,
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Complete, figure},
    swing::between_rails,
};

/// A quiet follower between ±15 V at 85 °C whose bias current doubles every 10 K.
fn leaking(bias: f64) -> Stage {
    between_rails(Kind::Follower, 15.0, 1.0)
        .at(358.15)
        .driven(0.0, 0.0, Some(1.0), SQRT_2)
        .stating(PartFigure::SupplyCurrent, 1e-3)
        .stating(PartFigure::JunctionToAmbient, 200.0)
        .stating(PartFigure::BiasCurrent, bias)
        .stating(PartFigure::BiasDoubling, 10.0)
}

/// Compares every case.
pub fn all(ledger: &mut Ledger) {
    let source = "thermal.py: Lambert's W in mpmath, 30 digits";
    for (name, bias, kelvin) in
        [("mild", 1e-6, 365.421_303_575_437_9), ("strong", 4e-6, 372.397_117_549_165_4), ("nearly away", 4.55e-6, 377.673_213_315_293_75)]
    {
        let asked = Figure::JunctionTemperature;
        let wanted = Wanted { id: "thermal", name, figure: asked, value: kelvin, allowed: budget(asked).around(kelvin), source };
        ledger.outcome(&wanted, &figure(&leaking(bias), asked));
    }
    let mut tell = |name: &str, asked: Figure, value: f64, stage: &Stage| {
        let source = "worked by hand, beside the call";
        let wanted = Wanted { id: "thermal", name, figure: asked, value, allowed: budget(asked).around(value), source };
        ledger.outcome(&wanted, &figure(stage, asked));
    };
    // 10 V peak at 10 kHz would drive 2π·10 kHz·1 µF·10 V = 0.63 A; 20 mA are to be had. Half of the time each way from ±15 V into a
    // capacitor, which takes none: 15 V · 20 mA. From the positive rail alone, the mean is 10 mA.
    let mut overdriven = between_rails(Kind::Follower, 15.0, 1.0).loaded(None, Some(1e-6)).driven(0.0, 10.0, Some(1e4), SQRT_2);
    overdriven.part.state(PartFigure::CurrentLimit, Rating::typical(0.02));
    tell("heat beyond the current limit", Figure::Dissipation, 0.3, &overdriven);
    tell("supply current beyond the current limit", Figure::SupplyCurrent, 0.01, &overdriven);
    // 2 V steady into 10 Ω would be 0.2 A; at 20 mA the output stands at 0.2 V: (15 − 0.2) V · 20 mA.
    let mut shorted = between_rails(Kind::Follower, 15.0, 1.0).loaded(Some(10.0), None).driven(2.0, 0.0, Some(1.0), SQRT_2);
    shorted.part.state(PartFigure::CurrentLimit, Rating::typical(0.02));
    tell("heat of a steady current beyond the limit", Figure::Dissipation, 0.296, &shorted);
    // The same 10 V at 100 Hz drive 6.3 mA: within the limit, sines from ±15 V into a capacitor, 2·15 V·Ip/π.
    let mut within = overdriven.clone();
    within.signals[0].as_mut().expect("driven").frequency = Some(100.0);
    tell("heat within the current limit", Figure::Dissipation, 30.0 * 2.0 * PI * 100.0 * 1e-6 * 10.0 / PI, &within);
}

#[test]
fn junctions_and_heat_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}

/// Lambert's W has no value there: `thermal.py` prints "none".
#[test]
fn a_junction_without_a_steady_temperature_says_so_and_what_depends_on_it_too() {
    let mut stage = leaking(4.6e-6).behind_resistance(1e3).stating(PartFigure::OffsetDrift, 0.0);
    let at_most = |figure, edge| Limit { query: Query::of(figure), bound: Bound::AtMost(edge), thin: Thin::Fraction(0.1) };
    stage.limits = vec![at_most(Figure::JunctionTemperature, 400.0), at_most(Figure::OutputOffset, 1.0), at_most(Figure::Dissipation, 1.0)];
    let report = analyse(&stage).expect("a valid stage");
    let nominal: Vec<_> = report.limits.iter().map(|row| (&row.nominal, row.verdict)).collect();
    assert_eq!(nominal[0], (&Outcome::NoSteadyTemperature, Verdict::Breaks));
    assert_eq!(nominal[1], (&Outcome::NoSteadyTemperature, Verdict::Breaks));
    assert_eq!(nominal[2].1, Verdict::Holds, "{:?}", nominal[2].0);
    assert!(report.cautions.contains(&Caution::ThermalRunaway), "{:?}", report.cautions);
}

/// Sheer heat does it too: 30 V · 20 mA at 1000 K/W is 300 K above 85 °C, where no junction works.
#[test]
fn heat_alone_can_leave_no_steady_temperature() {
    let stage = leaking(0.0).stating(PartFigure::SupplyCurrent, 2e-2).stating(PartFigure::JunctionToAmbient, 1e3);
    assert_eq!(figure(&stage, Figure::JunctionTemperature), Outcome::NoSteadyTemperature);
    assert!(matches!(figure(&stage.stating(PartFigure::JunctionToAmbient, 100.0), Figure::JunctionTemperature), Outcome::Value(_)));
}
