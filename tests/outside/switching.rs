//! Handbook rows about comparators, and closed forms worked by hand.

use stageleaf_math::{
    figure::Figure,
    kind::Kind,
    part::PartFigure,
    report::Outcome,
    stage::{ReferenceVoltage, Stage, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, figure, map, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("switching.toml");

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    single_supply(&rows, ledger);
    symmetric(&rows, ledger);
    by_hand(ledger);
}

/// A comparator without any error of its own, whose output reaches the rails.
fn ideal(kind: Kind, rails: (f64, f64), reference: f64) -> Stage {
    let mut stage = stage(kind, Amplifier::ideal().part()).between(rails.0, rails.1).with_headroom(0.0).at(298.15);
    for figure in [PartFigure::Offset, PartFigure::OffsetDrift, PartFigure::BiasCurrent, PartFigure::OffsetCurrent] {
        stage = stage.stating(figure, 0.0);
    }
    stage.reference = Some(ReferenceVoltage { voltage: Toleranced::exact(reference), resistance: None });
    stage.stating(PartFigure::Cmrr, 1e12)
}

fn single_supply(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C090");
    // Their divider from the supply is our reference with R1 and R3; their R3 is the feedback.
    let supply = row.input("V");
    let stage = ideal(Kind::ComparatorInverting, (0.0, supply), supply)
        .with("R1", row.input("R1_ohm"))
        .with("R3", row.input("R2_ohm"))
        .with("R2", row.input("R3_ohm"));
    for (name, asked) in [("VH", Figure::ThresholdHigh), ("VL", Figure::ThresholdLow), ("hyst", Figure::Hysteresis)] {
        row.check(ledger, name, asked, &figure(&stage, asked));
    }
}

fn symmetric(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C092");
    let rail = row.input("Vsat");
    let stage = ideal(Kind::ComparatorInverting, (-rail, rail), 0.0).with("R1", row.input("R1_ohm")).with("R2", row.input("R2_ohm"));
    row.check(ledger, "VT", Figure::ThresholdHigh, &figure(&stage, Figure::ThresholdHigh));
    row.check(ledger, "VT", Figure::ThresholdLow, &map(figure(&stage, Figure::ThresholdLow), |v| -v));
}

/// The standard closed forms (common practice; any textbook on bistable circuits, from memory), with numbers worked by hand.
fn by_hand(ledger: &mut Ledger) {
    let mut tell = |name: &str, stage: &Stage, asked: Figure, value: f64| {
        let source = "closed form from memory, worked by hand beside the call";
        let wanted = Wanted { id: "by hand", name, figure: asked, value, allowed: budget(asked).around(value), source };
        ledger.outcome(&wanted, &figure(stage, asked));
    };
    // Vref·(1 + R1/R2) ∓ V·R1/R2 = 2·1.1 ∓ 12·0.1.
    let non_inverting = ideal(Kind::ComparatorNonInverting, (-12.0, 12.0), 2.0).with("R1", 1e4).with("R2", 1e5);
    tell("non-inverting, upper", &non_inverting, Figure::ThresholdHigh, 3.4);
    tell("non-inverting, lower", &non_inverting, Figure::ThresholdLow, 1.0);
    tell("non-inverting, hysteresis", &non_inverting, Figure::Hysteresis, 2.4);
    // 24 V at 1 V/µs falling, the slower way, behind 2 µs of recovery.
    let slow = non_inverting
        .clone()
        .stating(PartFigure::SlewRise, 4e6)
        .stating(PartFigure::SlewFall, 1e6)
        .stating(PartFigure::OverloadRecovery, 2e-6);
    tell("response", &slow, Figure::ResponseTime, 26e-6);
    // Fallen at 1 V of signal, V+ is (1 V/10k − 12 V/100k)/(1/10k + 1/100k) = −2/11 V, and R2 gives (12 − 2/11) V/100 kΩ of the limit.
    let loaded = slow.loaded(None, Some(2e-8)).stating(PartFigure::CurrentLimit, 10e-3);
    let charging = 10e-3 - (12.0 - 2.0 / 11.0) / 1e5;
    tell("response into a capacitance", &loaded, Figure::ResponseTime, 24.0 / (charging / 2e-8) + 2e-6);
    // Headroom at the load's own current: 12 V less 10 Ω·I into 990 Ω is 11.88 V.
    let mut resistive = ideal(Kind::ComparatorInverting, (-12.0, 12.0), 0.0).with("R1", 1e9).with("R2", 1e15).loaded(Some(990.0), None);
    resistive.part.headroom_high[1].volts.typ = Some(10.0);
    tell("level under load", &resistive, Figure::OutputHigh, 11.88);
    tell("the other level", &resistive, Figure::OutputLow, -12.0);
    let hopeless = ideal(Kind::ComparatorInverting, (-12.0, 12.0), 0.0).with("R1", 1.0).with("R2", 1e13);
    let outcome = figure(&hopeless, Figure::Hysteresis);
    ledger.fact("by hand", "no hysteresis", matches!(outcome, Outcome::OutOfReach(_)), &format!("{outcome:?}"));
}
