//! Handbook rows about gain, edges and terminal resistance.

use core::f64::consts::TAU;

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    report::Outcome,
    stage::Toleranced,
};

use crate::{
    ledger::Ledger,
    setup::{Amplifier, Complete, ask, figure, map, report, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("gain.toml");

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    finite_gain(&rows, ledger);
    output_resistance(&rows, ledger);
    one_pole_edge(&rows, ledger);
    noise_gain_breakpoints(&rows, ledger);
    first_order_corner(&rows, ledger);
    tolerance_extremes(&rows, ledger);
    let row = rows.row("C105");
    // Second-order Butterworth: the loop of an integrator and one pole at ζ = 1/√2.
    let butterworth = crate::loops::two_pole_follower(1e5, core::f64::consts::FRAC_1_SQRT_2);
    let got = map(ask(&butterworth, Query::at(Figure::GainAt, 1e6)), |g| -20.0 * libm::log10(g));
    row.check(ledger, "butter2_at_10fc", Figure::GainAt, &got);
}

fn finite_gain(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C021");
    for (open_loop, name) in row.inputs("A").into_iter().zip(["G_1e3", "G_1e4", "G_1e5"]) {
        let amplifier = Amplifier::one_pole(open_loop, 1e6);
        let stage = stage(Kind::Inverting, amplifier.part()).with("Rin", row.input("R1_ohm")).with("Rf", row.input("R2_ohm"));
        row.check(ledger, name, Figure::Gain, &figure(&stage, Figure::Gain));
        if name == "G_1e3" {
            row.check(ledger, "err_1e3", Figure::GainError, &map(figure(&stage, Figure::GainError), |e| e * 100.0));
        }
    }

    let row = rows.row("C022");
    let rg = 1e3;
    let error = |open_loop: f64| {
        let amplifier = Amplifier::one_pole(open_loop, 1e6);
        let stage = stage(Kind::NonInverting, amplifier.part()).with("Rg", rg).with("Rf", (row.input("NG") - 1.0) * rg);
        // The source prints the loss as a positive number.
        map(figure(&stage, Figure::GainError), |e| -e * 100.0)
    };
    let gains = row.inputs("AVOL");
    let (large, small) = (error(gains[0]), error(gains[1]));
    row.check(ledger, "err_2e6", Figure::GainError, &large);
    row.check(ledger, "err_3e5", Figure::GainError, &small);
    let change = large.value().map_or(small.clone(), |large| map(small, |small| small - large));
    row.check(ledger, "change", Figure::GainError, &change);
}

fn output_resistance(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C027");
    let amplifier = Amplifier { output_resistance: row.input("Ro_ohm"), ..Amplifier::one_pole(row.input("A0"), 1e6) };
    let stage = stage(Kind::NonInverting, amplifier.part()).with("Rg", row.input("R1_ohm")).with("Rf", row.input("R2_ohm"));
    row.check(ledger, "Rout", Figure::OutputImpedance, &figure(&stage, Figure::OutputImpedance));
}

fn one_pole_edge(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C041");
    let amplifier = Amplifier::one_pole(row.input("A0"), row.input("A0") * row.input("fp1_hz"));
    let stage = stage(Kind::NonInverting, amplifier.part()).with("Rg", row.input("R1_ohm")).with("Rf", row.input("R2_ohm"));
    row.check(ledger, "f3dB", Figure::Bandwidth, &figure(&stage, Figure::Bandwidth));
    // The rule of thumb stands beside the exact edge in the working.
    let report = report(&stage, &[]);
    let rule = report.working.iter().find(|w| w.query.figure == Figure::Bandwidth);
    let rule = rule.map_or(Outcome::DoesNotApply("the working holds no rule for the bandwidth"), |w| Outcome::Value(w.handbook));
    row.check(ledger, "GBW_over_NG", Figure::Bandwidth, &rule);
}

fn noise_gain_breakpoints(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C070");
    // Around an ideal amplifier the non-inverting transfer is the noise gain.
    let amplifier = Amplifier::one_pole(1e12, 1e17);
    let mut stage = stage(Kind::NonInverting, amplifier.part())
        .with("Rg", row.input("R1_ohm"))
        .with("Rf", row.input("R2_ohm"))
        .with("Cf", row.input("C2_F"));
    stage.board.inverting_node = Some(Toleranced::exact(row.input("C1_F")));
    row.check(ledger, "NG_low", Figure::Gain, &figure(&stage, Figure::Gain));
    // Far above the breakpoints and far below the crossover.
    row.check(ledger, "NG_high", Figure::GainAt, &ask(&stage, Query::at(Figure::GainAt, 1e11)));
    let report = report(&stage, &[]);
    let lowest = |roots: &[stageleaf_math::report::Root]| {
        let magnitudes = roots.iter().map(|r| libm::hypot(r.re, r.im) / TAU);
        magnitudes.min_by(f64::total_cmp).map_or(Outcome::DoesNotApply("no root is reported"), Outcome::Value)
    };
    row.check(ledger, "f_zero", Figure::GainAt, &lowest(&report.zeros));
    row.check(ledger, "f_pole", Figure::GainAt, &lowest(&report.poles));
}

fn first_order_corner(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C104");
    let corner = |common_mode_resistance: Option<f64>| {
        let amplifier = Amplifier { common_mode_resistance, ..Amplifier::ideal() };
        let stage = stage(Kind::Follower, amplifier.part()).behind_resistance(row.input("R_ohm")).with("Cshunt", row.input("C_F"));
        figure(&stage, Figure::Bandwidth)
    };
    row.check(ledger, "fc", Figure::Bandwidth, &corner(None));
    // The load of the filter is the + input's resistance to ground.
    row.check(ledger, "fc_loaded", Figure::Bandwidth, &corner(Some(row.input("RL_ohm"))));
}

fn tolerance_extremes(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C080");
    let (ratio, tolerance, small) = (row.input("ratio"), row.input("tol"), 1e3);
    let ends = |kind: Kind, other: &str| {
        let stage =
            stage(kind, Amplifier::ideal().part()).with_tolerance("Rf", small * ratio, tolerance).with_tolerance(other, small, tolerance);
        let query = Query::of(Figure::Gain);
        let report = report(&stage, &[query]);
        let row = report.limits.first().expect("one limit was stated");
        let nothing = || (row.nominal.clone(), row.nominal.clone());
        row.range.map_or_else(nothing, |(low, high)| (Outcome::Value(low), Outcome::Value(high)))
    };
    let (low, high) = ends(Kind::Inverting, "Rin");
    // The row gives magnitudes of a negative gain.
    row.check(ledger, "inv_max", Figure::Gain, &map(low, |g| -g));
    row.check(ledger, "inv_min", Figure::Gain, &map(high, |g| -g));
    let (low, high) = ends(Kind::NonInverting, "Rg");
    row.check(ledger, "ni_max_pct", Figure::Gain, &map(high.clone(), |g| (g / (1.0 + ratio) - 1.0) * 100.0));
    row.check(ledger, "ni_max", Figure::Gain, &high);
    row.check(ledger, "ni_min", Figure::Gain, &low);
}

#[test]
fn handbook_gains_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
