//! Handbook rows about DC errors.

use stageleaf_math::{
    figure::Figure,
    kind::Kind,
    part::{PartFigure, Rating},
    report::{DcCause, Outcome, Report},
    stage::{Ambient, Ripple, Span, Stage, Supply},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, figure, map, report, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("dc.toml");

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    drift(&rows, ledger);
    rejection(&rows, ledger);
    by_hand(ledger);
}

/// Offset, bias and drift that no table reaches, worked by hand.
fn by_hand(ledger: &mut Ledger) {
    let mut tell = |name: &str, figure_asked: Figure, value: f64, stage: &Stage| {
        let wanted = Wanted {
            id: "by hand",
            name,
            figure: figure_asked,
            value,
            allowed: budget(figure_asked).around(value),
            source: "worked by hand, beside the call",
        };
        ledger.outcome(&wanted, &figure(stage, figure_asked));
    };
    let times_ten = stage(Kind::NonInverting, Amplifier::ideal().part())
        .with("Rf", 9e3)
        .with("Rg", 1e3)
        .stating(PartFigure::Offset, 1e-3)
        .stating(PartFigure::BiasCurrent, 1e-7)
        .stating(PartFigure::OffsetCurrent, 2e-8)
        .stating(PartFigure::OffsetDrift, 0.0)
        // Where data sheets state the offset: at 25 °C, the inputs in the middle between the rails.
        .at(298.15)
        .between(-15.0, 15.0);
    // 1 mV × 10, 100 nA × 9 kΩ, half of 20 nA × 9 kΩ: 10 mV + 0.9 mV + 0.09 mV.
    tell("offset and bias, grounded input", Figure::OutputOffset, 10.99e-3, &times_ten);
    tell("offset and bias at the input", Figure::InputOffset, 1.099e-3, &times_ten);
    // 900 Ω at the other input carry the same bias current the other way; the offset current's halves add.
    let balanced = times_ten.clone().behind_resistance(900.0);
    tell("bias balanced", Figure::OutputOffset, 10e-3 + 0.18e-3, &balanced);

    let drifting = |mut stage: Stage| {
        for component in &mut stage.components {
            component.value.drift = 50e-6;
        }
        stage
    };
    // G = 1 + Rf/Rg: 9/10 of the ratio's 100 ppm/K; G = −Rf/Rin: all of it.
    tell("drift of 1 + Rf/Rg", Figure::GainDrift, 90e-6, &drifting(times_ten));
    let inverting = stage(Kind::Inverting, Amplifier::ideal().part()).with("Rf", 1e4).with("Rin", 1e3);
    tell("drift of Rf/Rin", Figure::GainDrift, 100e-6, &drifting(inverting));
}

fn line(report: &Report, cause: DcCause, worst: bool) -> Outcome {
    let line = report.dc_budget.iter().find(|line| line.cause == cause);
    line.map_or(Outcome::DoesNotApply("the DC budget has no such line"), |l| if worst { l.worst.clone() } else { l.nominal.clone() })
}

fn drift(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C076");
    let (gain, rise) = (row.input("NG"), row.input("dT"));
    let drift = row.input("drift_uV_per_C") * 1e-6;
    let mut stage = stage(Kind::NonInverting, Amplifier::ideal().part()).with("Rg", 1e3).with("Rf", (gain - 1.0) * 1e3);
    stage.part.state(PartFigure::OffsetDrift, Rating { typ: Some(drift), max: Some(drift), ..Rating::default() });
    for figure in [PartFigure::Offset, PartFigure::BiasCurrent, PartFigure::OffsetCurrent] {
        stage.part.state(figure, Rating::typical(0.0));
    }
    stage.ambient = Some(Ambient::of(Span { low: 298.15, nominal: 298.15, high: 298.15 + rise }));
    let slope = figure(&stage, Figure::OffsetDrift);
    row.check(ledger, "rti", Figure::OffsetDrift, &map(slope.clone(), |s| s * rise / gain));
    row.check(ledger, "rto", Figure::OffsetDrift, &map(slope, |s| s * rise));
    let worst = line(&report(&stage, &[]), DcCause::OffsetDrift, true);
    row.check(ledger, "rto", Figure::OffsetDrift, &worst);
}

fn rejection(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C077");
    let ratio = |name: &str| libm::pow(10.0, row.input(name) / 20.0);
    let deviation = row.input("dVs");
    let mut stage =
        stage(Kind::Follower, Amplifier::ideal().part()).at(298.15).with_headroom(1.0).driven(row.input("dVcm"), 0.0, Some(1.0), 1.0);
    let stated = |value: f64| Rating { typ: Some(value), min: Some(value), ..Rating::default() };
    stage.part.state(PartFigure::Cmrr, stated(ratio("CMRR_dB")));
    stage.part.state(PartFigure::PsrrPositive, stated(ratio("PSRR_dB")));
    for figure in [PartFigure::Offset, PartFigure::OffsetDrift, PartFigure::BiasCurrent, PartFigure::OffsetCurrent] {
        stage.part.state(figure, Rating::typical(0.0));
    }
    stage.supply = Some(Supply {
        positive: Span { low: 15.0 - deviation, nominal: 15.0, high: 15.0 + deviation },
        negative: Span::exact(-15.0),
        ripple: None,
    });
    let report = report(&stage, &[]);
    row.check(ledger, "e_cm", Figure::OutputOffset, &line(&report, DcCause::CommonMode, false));
    row.check(ledger, "e_ps", Figure::OutputOffset, &line(&report, DcCause::SupplyPositive, true));

    // The row takes each rejection for itself: no common-mode error on what the supply makes.
    stage.part.state(PartFigure::Cmrr, stated(1e15));
    // The same error as a ratio, and as what a ripple of that size leaves; the negative rail rejects beyond all question.
    stage.part.state(PartFigure::PsrrNegative, stated(1e18));
    for corner in [PartFigure::PsrrPositiveCorner, PartFigure::PsrrNegativeCorner] {
        stage.part.state(corner, stated(1e9));
    }
    if let Some(supply) = &mut stage.supply {
        supply.ripple = Some(Ripple { peak: deviation, frequency: 1.0 });
    }
    row.check(ledger, "e_ps", Figure::StagePsrr, &map(figure(&stage, Figure::StagePsrr), |psrr| deviation / psrr));
    row.check(ledger, "e_ps", Figure::RippleOutput, &figure(&stage, Figure::RippleOutput));
}

#[test]
fn handbook_dc_errors_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
