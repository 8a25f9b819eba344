//! Handbook rows about swing, current, slew, dissipation and temperature.

use core::f64::consts::{FRAC_1_SQRT_2, SQRT_2};

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    part::PartFigure,
    report::Outcome,
    stage::Stage,
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, figure, map, outcome, report, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("swing.toml");

const ZERO_CELSIUS: f64 = 273.15;

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    slew(&rows, ledger);
    headroom(&rows, ledger);
    input_range(&rows, ledger);
    output_current(&rows, ledger);
    class_b(&rows, ledger);
    junction(&rows, ledger);
    by_hand(ledger);
}

/// Power figures that no table reaches, worked by hand.
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
    // 10 V peak into 1 kΩ: the positive supply gives half sines of 10 mA, whose mean is 10 mA/π; 1 mA quiescent.
    let follower = between_rails(Kind::Follower, 15.0, 1.0).stating(PartFigure::SupplyCurrent, 1e-3).loaded(Some(1e3), None).driven(
        0.0,
        10.0,
        Some(1e3),
        SQRT_2,
    );
    tell("supply current of a sine", Figure::SupplyCurrent, 1e-3 + 1e-2 / core::f64::consts::PI, &follower);
    // 1 V peak through 1 kΩ: 0.5 mW; 10 V peak across 10 kΩ: 5 mW.
    let inverting = between_rails(Kind::Inverting, 15.0, 1.0).with("Rin", 1e3).with("Rf", 1e4).driven(0.0, 1.0, Some(1.0), SQRT_2);
    tell("hottest resistor", Figure::ResistorDissipation, 5e-3, &inverting);
}

/// A stage of `kind` around an ideal amplifier between ± `rail`, with every large-signal figure stated generously.
pub fn between_rails(kind: Kind, rail: f64, headroom: f64) -> Stage {
    stage(kind, Amplifier::ideal().part())
        .at(298.15)
        .between(-rail, rail)
        .with_headroom(headroom)
        .stating(PartFigure::CurrentLimit, 10.0)
        .stating(PartFigure::SlewRise, 1e15)
        .stating(PartFigure::SlewFall, 1e15)
        .stating(PartFigure::SupplyCurrent, 0.0)
        .stating(PartFigure::RangeFromNegative, 0.0)
        .stating(PartFigure::RangeFromPositive, 0.0)
        .stating(PartFigure::Offset, 0.0)
        .stating(PartFigure::BiasCurrent, 0.0)
        .stating(PartFigure::OffsetCurrent, 0.0)
        .stating(PartFigure::Cmrr, 1e15)
        .stating(PartFigure::PsrrPositive, 1e15)
        .stating(PartFigure::PsrrNegative, 1e15)
}

fn slew(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C045");
    for ((rate, peak), name) in row.inputs("SR").into_iter().zip(row.inputs("Vp")).zip(["f1", "f2", "f3"]) {
        let stage = between_rails(Kind::Follower, 15.0, 1.0)
            .stating(PartFigure::SlewRise, rate)
            .stating(PartFigure::SlewFall, rate)
            .driven(0.0, peak, Some(1e3), SQRT_2);
        let wanted = row.expected(name);
        row.check(ledger, name, Figure::FullPowerBandwidth, &figure(&stage, Figure::FullPowerBandwidth));
        // At 1 kHz the sine needs 1 kHz/f of the rate.
        row.check(ledger, name, Figure::SlewMargin, &map(figure(&stage, Figure::SlewMargin), |m| m * 1e3));
        assert!(wanted > 1e3);
    }
}

fn headroom(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C142");
    let peak = 10.0;
    let stage = between_rails(Kind::Follower, row.input("Vs"), row.input("headroom")).driven(0.0, peak, Some(1e3), SQRT_2);
    let largest = map(figure(&stage, Figure::ClipMargin), |margin| peak + margin);
    row.check(ledger, "rms", Figure::ClipMargin, &map(largest.clone(), |v| v * FRAC_1_SQRT_2));
    row.check(ledger, "Vp", Figure::ClipMargin, &largest);
    let envelope = report(&stage, &[]).envelope.first().and_then(|point| point.rails);
    let envelope = envelope.map_or(Outcome::DoesNotApply("the envelope has no bound by the rails"), Outcome::Value);
    row.check(ledger, "Vp", Figure::ClipMargin, &envelope);
}

fn input_range(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C150");
    let (range, swing) = (row.inputs("ICMR"), row.inputs("Vout"));
    let rail = 5.0; // of the row's note: the range stops 1.5 V below the rail
    let margins = |gain: f64, input: f64| {
        let around = if gain > 1.0 { Kind::NonInverting } else { Kind::Follower };
        let mut stage = between_rails(around, rail, rail - swing[1])
            .between(0.0, rail)
            .stating(PartFigure::RangeFromNegative, range[0])
            .stating(PartFigure::RangeFromPositive, rail - range[1])
            .driven(input, 0.0, Some(1.0), 1.0);
        if gain > 1.0 {
            stage = stage.with("Rg", 1e6).with("Rf", (gain - 1.0) * 1e6);
        }
        let queries = [Figure::InputRangeMargin, Figure::ClipMargin].map(Query::of);
        let report = report(&stage, &queries);
        (outcome(&report, queries[0]), outcome(&report, queries[1]))
    };
    let both = |a: Outcome, b: Outcome, f: &dyn Fn(f64, f64) -> f64| match (a, b) {
        (Outcome::Value(a), Outcome::Value(b)) => Outcome::Value(f(a, b)),
        (Outcome::Value(_), other) | (other, _) => other,
    };
    for (gain, name) in row.inputs("gains").into_iter().zip(["vin_max_G1", "vin_max_G1.25", "vin_max_G2", "vin_max_G10"]) {
        // High in the range, so that the upper ends are the nearer ones.
        let input = 0.9 * row.expected(name);
        let (in_range, in_swing) = margins(gain, input);
        let largest = both(in_range, in_swing, &|range, clip| input + range.min(clip / gain));
        row.check(ledger, name, Figure::InputRangeMargin, &largest);
    }
    let (gain, input) = (10.0, 0.01); // low: the lower end of the swing is the nearer one
    let (_, in_swing) = margins(gain, input);
    row.check(ledger, "vin_min_G10", Figure::ClipMargin, &map(in_swing, |clip| input - clip / gain));
    // At this gain both ends are reached together: with the largest input, neither has room.
    let gain = row.expected("G_crossover");
    let (in_range, in_swing) = margins(gain, range[1]);
    let at_once = both(in_range, in_swing, &|range, clip| gain + range.abs().max(clip.abs()));
    row.check(ledger, "G_crossover", Figure::InputRangeMargin, &at_once);
}

fn output_current(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C153");
    let limit = row.input("Imax_A");
    let at = |peak: f64| {
        // Gain −1: the feedback resistor ends at the virtual ground.
        between_rails(Kind::Inverting, 15.0, 15.0 - row.input("Vrail_limit"))
            .stating(PartFigure::CurrentLimit, limit)
            .with("Rin", row.input("R2_ohm"))
            .with("Rf", row.input("R2_ohm"))
            .loaded(Some(row.input("RL_ohm")), None)
            .driven(0.0, peak, Some(1.0), SQRT_2)
    };
    let peak = 4.0;
    let resistance = map(figure(&at(peak), Figure::CurrentMargin), |margin| peak / (limit - margin));
    row.check(ledger, "Vp", Figure::CurrentMargin, &map(resistance.clone(), |r| limit * r));
    row.check(ledger, "R_eff", Figure::CurrentMargin, &resistance);
    let envelope = report(&at(peak), &[]).envelope.first().and_then(|point| point.current);
    let envelope = envelope.map_or(Outcome::DoesNotApply("the envelope has no bound by the current"), Outcome::Value);
    row.check(ledger, "Vp", Figure::CurrentMargin, &envelope);
}

fn class_b(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C120");
    let dissipation = |peak: f64| {
        let stage = between_rails(Kind::Follower, row.input("Vs_V"), 1.0).loaded(Some(row.input("RL_ohm")), None).driven(
            0.0,
            peak,
            Some(1e3),
            SQRT_2,
        );
        figure(&stage, Figure::Dissipation)
    };
    // A signal beyond the worst amplitude dissipates what the worst one does.
    row.check(ledger, "P_max_total", Figure::Dissipation, &dissipation(13.0));
    row.check(ledger, "P_max_total", Figure::Dissipation, &dissipation(row.expected("Vp_worst")));
    // The worst amplitude itself: just below it there is less.
    let (below, worst) = (dissipation(0.99 * row.expected("Vp_worst")).value(), row.expected("P_max_total"));
    let holds = below.is_some_and(|below| below < worst && below > 0.999 * worst);
    ledger.fact("C120", "Vp_worst", holds, &format!("just below the worst amplitude: {below:?} against {worst} W"));
}

fn junction(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C122");
    let rail = row.input("Vtotal") / 2.0;
    // A steady half of the rail into R dissipates rail²/(4R) in the output stage.
    let load = rail * rail / (4.0 * row.input("P_out"));
    let at = |celsius: f64| {
        between_rails(Kind::Follower, rail, 1.0)
            .at(celsius + ZERO_CELSIUS)
            .stating(PartFigure::SupplyCurrent, row.input("Iq"))
            .stating(PartFigure::JunctionToAmbient, row.input("theta"))
    };
    let quiet = at(row.input("Ta")).driven(0.0, 0.0, Some(1.0), 1.0);
    row.check(ledger, "Pq", Figure::Dissipation, &figure(&quiet, Figure::Dissipation));
    let hot = |celsius: f64| {
        let stage = at(celsius).loaded(Some(load), None).driven(rail / 2.0, 0.0, Some(1.0), 1.0);
        map(figure(&stage, Figure::JunctionTemperature), |kelvin| kelvin - ZERO_CELSIUS)
    };
    row.check(ledger, "Tj", Figure::JunctionTemperature, &hot(row.input("Ta")));
    // At the highest ambient the junction reaches 150 °C.
    let ambient = row.expected("Ta_max_for_150C");
    row.check(ledger, "Ta_max_for_150C", Figure::JunctionTemperature, &map(hot(ambient), |junction| ambient + 150.0 - junction));
}

#[test]
fn handbook_swing_is_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
