//! Handbook rows about DC errors.

use stageleaf_math::{
    figure::Figure,
    kind::Kind,
    part::{PartFigure, Rating},
    report::{DcCause, Outcome, Report},
    stage::{Ambient, Span, Supply},
};

use crate::{
    ledger::Ledger,
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
    stage.ambient = Some(Ambient { range: Span { low: 298.15, nominal: 298.15, high: 298.15 + rise } });
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
    stage.supply =
        Some(Supply { positive: Span { low: 15.0 - deviation, nominal: 15.0, high: 15.0 + deviation }, negative: Span::exact(-15.0) });
    let report = report(&stage, &[]);
    row.check(ledger, "e_cm", Figure::OutputOffset, &line(&report, DcCause::CommonMode, false));
    row.check(ledger, "e_ps", Figure::OutputOffset, &line(&report, DcCause::SupplyPositive, true));
}

#[test]
fn handbook_dc_errors_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
