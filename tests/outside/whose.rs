//! Figures of one amplifier or from one input: by hand, and the worst of several as the one that it is.

use stageleaf_math::{
    analyse,
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin},
    part::{PartFigure, Rating},
    report::Outcome,
    stage::Stage,
};

use crate::{
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, ask, stage},
    swing::between_rails,
};

/// Compares every case.
pub fn all(ledger: &mut Ledger) {
    let mut tell = |stage: &Stage, query: Query, name: &str, value: f64| {
        // The amplifier of the setup leaves 1e-12 of the noise gain.
        let allowed = 1e-10 * value.abs().max(1.0);
        let wanted = Wanted { id: "whose", name, figure: query.figure, value, allowed, source: "worked by hand, beside the call" };
        ledger.outcome(&wanted, &ask(stage, query));
    };
    let ideal = |kind: Kind| stage(kind, Amplifier::ideal().part());
    // −10 kΩ over 10 kΩ, 22 kΩ and 47 kΩ.
    let summing = ideal(Kind::Summing).with("Rin1", 10e3).with("Rin2", 22e3).with("Rin3", 47e3).with("Rf", 10e3);
    tell(&summing, Query::of(Figure::Gain), "gain", -1.0);
    tell(&summing, Query::of(Figure::Gain).from_input("in2"), "gain from in2", -10.0 / 22.0);
    tell(&summing, Query::at(Figure::GainAt, 10.0).from_input("in3"), "gain_at 10 Hz from in3", 10.0 / 47.0);
    tell(&summing, Query::of(Figure::GainError).from_input("in3"), "gain_error from in3", 0.0);
    // 1.2 kΩ of source before 22 kΩ: 22/23.2 of the gain.
    let mut behind = summing.clone().behind_resistance(1e3);
    behind.sources.insert(0, None);
    behind.sources[1] =
        behind.sources[1].map(|_| stageleaf_math::stage::Source::Resistive { resistance: stageleaf_math::stage::Toleranced::exact(1.2e3) });
    tell(&behind, Query::of(Figure::GainError).from_input("in2"), "gain_error behind a source", 22.0 / 23.2 - 1.0);
    tell(&behind, Query::of(Figure::GainError), "gain_error of the first", 0.0);
    // (1 + 10/20)·10/(20 + 10) of the signal, (1 + 10/20)·20/30 of the reference.
    let shift = ideal(Kind::ScaleAndShift).with("R1", 20e3).with("R2", 10e3).with("Rf", 10e3).with("Rg", 20e3);
    tell(&shift, Query::of(Figure::Gain), "gain of a shift", 0.5);
    tell(&shift, Query::of(Figure::Gain).from_input("reference"), "gain from reference", 1.0);
    tell(&shift, Query::of(Figure::GainError).from_input("reference"), "gain_error from reference", 0.0);

    // 2 mV of difference, gain 21 in front and 10 behind, 3 V of common mode: A1 stands at 3 V − 21 mV, A2 at 3 V + 21 mV, A3 at
    // 0.42 V; ±15 V less 1 V of headroom leave 11.021 V, 10.979 V and 13.58 V.
    let bridge = instrumentation();
    tell(&bridge, Query::of(Figure::ClipMargin).of_amplifier(1), "clip_margin of A1", 11.021);
    tell(&bridge, Query::of(Figure::ClipMargin).of_amplifier(2), "clip_margin of A2", 10.979);
    tell(&bridge, Query::of(Figure::ClipMargin).of_amplifier(3), "clip_margin of A3", 13.58);
    tell(&bridge, Query::of(Figure::ClipMargin), "clip_margin", 10.979);
    // Each in a package of its own: 30 V · 1 mA, of A3 30 V · 2 mA, at 100 K/W.
    tell(&bridge, Query::of(Figure::Dissipation).of_amplifier(3), "dissipation of A3", 0.06 + output_heat());
}

/// What A3 turns to heat while it holds 0.42 V across R1…R4 alone: (15 − 0.42) V · 0.42 V over R2 in series with what stands at −.
fn output_heat() -> f64 {
    // R2 of 100 kΩ from 0.42 V to the inverting input at (3 + 0.021) V · 100/110: the current flows into the pin, from −15 V.
    let minus = 3.021 * 100.0 / 110.0;
    let sunk = (minus - 0.42) / 100e3;
    sunk * (0.42 + 15.0)
}

fn instrumentation() -> Stage {
    let mut bridge = between_rails(Kind::Instrumentation, 15.0, 1.0).driven(2e-3, 0.0, Some(1.0), 1.0);
    for (name, ohms) in [("Rg", 1e3), ("Rf1", 10e3), ("Rf2", 10e3), ("R1", 10e3), ("R2", 100e3), ("R3", 10e3), ("R4", 100e3)] {
        bridge = bridge.with(name, ohms);
    }
    bridge.common_mode = Some(stageleaf_math::stage::Span::exact(3.0));
    bridge = bridge.stating(PartFigure::SupplyCurrent, 1e-3).stating(PartFigure::OffsetDrift, 0.0);
    let mut last = bridge.part.clone();
    last.state(PartFigure::SupplyCurrent, Rating::typical(2e-3));
    bridge.parts = vec![(3, last)];
    bridge
}

#[test]
fn figures_of_amplifiers_and_inputs_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}

/// The rows say whose figure the worst is, at nominal values and at a limit's corner.
#[test]
fn the_worst_amplifier_is_named() {
    let mut stage = instrumentation();
    let limit = |query, bound| Limit { query, bound, thin: Thin::Fraction(0.1) };
    stage.limits = vec![
        limit(Query::of(Figure::ClipMargin), Bound::AtLeast(1.0)),
        limit(Query::of(Figure::ClipMargin).of_amplifier(1), Bound::AtLeast(1.0)),
        limit(Query::of(Figure::Dissipation), Bound::Report),
    ];
    let report = analyse(&stage).expect("a valid stage");
    let named: Vec<_> = report.limits.iter().map(|row| row.amplifier).collect();
    assert_eq!(named, [Some(2), None, Some(3)]);
    let row = report.figures.iter().find(|row| row.query == Query::of(Figure::ClipMargin)).expect("listed");
    assert_eq!(row.amplifier, Some(2));
    // What the stage has not, it has no figure of.
    for query in [Query::of(Figure::ClipMargin).of_amplifier(4), Query::of(Figure::Gain).from_input("in2")] {
        assert!(matches!(ask(&stage, query), Outcome::DoesNotApply(_)), "{query:?}");
    }
}
