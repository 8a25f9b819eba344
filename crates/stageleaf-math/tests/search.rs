//! The searches against closed forms that are solved by hand for the edge.

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin, Verdict},
    part::{Part, PartFigure, Rating},
    search::{
        Judge,
        alternates::{alternate, rank},
        needs::{Needs, Room, needs},
    },
    stage::{Ambient, Board, Component, Isolation, Load, Signal, Source, Span, Stage, Supply, Toleranced},
};

fn part(id: &str) -> Part {
    let mut part = Part { id: id.into(), poles: Some(Vec::new()), ..Part::default() };
    for (figure, value) in [
        (PartFigure::OpenLoop, 1e6),
        (PartFigure::Gbw, 10e6),
        (PartFigure::OutputResistance, 0.0),
        (PartFigure::DifferentialCapacitance, 0.0),
        (PartFigure::CommonModeCapacitance, 0.0),
        (PartFigure::SlewRise, 20e6),
        (PartFigure::SlewFall, 20e6),
        (PartFigure::Offset, 1e-3),
        (PartFigure::OffsetDrift, 0.0),
        (PartFigure::BiasCurrent, 0.0),
        (PartFigure::OffsetCurrent, 0.0),
        (PartFigure::Cmrr, 1e12),
        (PartFigure::PsrrPositive, 1e12),
        (PartFigure::PsrrNegative, 1e12),
    ] {
        part.state(figure, Rating { min: Some(value), typ: Some(value), max: Some(value), source: None });
    }
    part
}

/// Gain 10 from 9 kΩ and 1 kΩ, 0.5 V of 100 kHz.
fn stage(limits: Vec<Limit>) -> Stage {
    let exact = Toleranced::exact;
    Stage {
        name: "Times ten".into(),
        kind: Kind::NonInverting,
        components: vec![Component { name: "Rf", value: exact(9e3) }, Component { name: "Rg", value: exact(1e3) }],
        part: part("oak"),
        isolation: Isolation::OutsideLoop,
        supply: Some(Supply { positive: Span::exact(12.0), negative: Span::exact(-12.0), ripple: None }),
        sources: vec![Some(Source::Resistive { resistance: exact(0.0) })],
        signals: vec![Some(Signal { peak: 0.5, frequency: Some(100e3), dc: 0.0, crest_factor: std::f64::consts::SQRT_2 })],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load::default(),
        converter: Default::default(),
        board: Board::default(),
        ambient: Some(Ambient::of(Span::exact(298.15))),
        band: None,
        limits,
        measured: vec![],
    }
}

fn limit(figure: Figure, bound: Bound) -> Limit {
    Limit { query: Query::of(figure), bound, thin: Thin::Fraction(0.1) }
}

fn found(stage: &Stage) -> Needs {
    needs(stage, |_, _| true).expect("not stopped")
}

fn least(needs: &Needs, figure: PartFigure) -> f64 {
    match needs.part.iter().find(|n| n.figure == figure).map(|n| &n.room) {
        Some(Room::Between { least: Some(edge), .. }) => edge.value,
        other => panic!("{figure:?}: {other:?}"),
    }
}

fn greatest(needs: &Needs, figure: PartFigure) -> f64 {
    match needs.part.iter().find(|n| n.figure == figure).map(|n| &n.room) {
        Some(Room::Between { greatest: Some(edge), .. }) => edge.value,
        other => panic!("{figure:?}: {other:?}"),
    }
}

/// Within the bracket and the three digits, on the side that holds.
fn close(value: f64, exact: f64, above: bool) {
    let off = (value - exact) / exact;
    let side = if above { off } else { -off };
    assert!((-1e-9..0.012).contains(&side), "{value} for {exact}");
}

#[test]
fn the_edges_of_an_amplifier_are_those_solved_by_hand() {
    // ε = −1/(1 + A0/10) ≥ −1 %: A0 ≥ 990.
    close(least(&found(&stage(vec![limit(Figure::GainError, Bound::AtLeast(-0.01))])), PartFigure::OpenLoop), 990.0, true);
    // One pole: the edge lies at GBW/10·(1 + 10/A0), ω_d = 2π·GBW/A0: at least 300 kHz needs GBW of 3 MHz less a hundred-thousandth.
    let gbw = 3e6 / (1.0 + 10.0 / 1e6);
    close(least(&found(&stage(vec![limit(Figure::Bandwidth, Bound::AtLeast(300e3))])), PartFigure::Gbw), gbw, true);
    // Ten times the offset, less what the finite gain takes: at most 50 mV.
    let offset = 5e-3 * (1.0 + 10.0 / 1e6);
    close(greatest(&found(&stage(vec![limit(Figure::OutputOffset, Bound::AtMost(50e-3))])), PartFigure::Offset), offset, false);
    // The output's peak at 100 kHz is 5 V/√(1 + 0.1²) nearly; its slope has to stay 4 times below the slew rate.
    let peak = 5.0 / libm::sqrt(1.01);
    let rate = 4.0 * std::f64::consts::TAU * 100e3 * peak;
    let needs = found(&stage(vec![limit(Figure::SlewMargin, Bound::AtLeast(4.0))]));
    close(least(&needs, PartFigure::SlewRise), rate, true);
    close(least(&needs, PartFigure::SlewFall), rate, true);
    // No limit asks for anything else but what makes the signal.
    assert!(needs.part.iter().all(|n| n.figure != PartFigure::Offset && n.figure != PartFigure::SupplyCurrent), "{:?}", needs.part);
}

#[test]
fn a_tolerance_is_let_out_until_the_gain_leaves_its_band() {
    // G = 1 + 9·(1 ± t) within 10 ± 2 %: t ≤ 0.2/9, with an open-loop gain of a million nearly.
    let mut of = stage(vec![limit(Figure::Gain, Bound::Between { low: 9.8, high: 10.2 })]);
    of.components[0].value.plus = 0.001;
    of.components[0].value.minus = 0.001;
    let needs = found(&of);
    let edge = needs.tolerances.iter().find(|t| t.name == "Rf").and_then(|t| t.loosest.clone()).expect("an edge");
    assert!((edge.value - 0.2 / 9.0).abs() < 2e-4 && edge.value <= 0.2 / 9.0 + 1e-5, "{}", edge.value);
    // Without a tolerance that helps: the nominal gain is outside.
    let needs = found(&stage(vec![limit(Figure::Gain, Bound::AtLeast(11.0))]));
    assert!(needs.tolerances.iter().all(|t| t.loosest.is_none()));
    assert_eq!(needs.lost_now.len(), 1);
}

#[test]
fn two_limits_that_pull_against_each_other_leave_no_value() {
    // More bandwidth than the second limit allows at one frequency: no GBW keeps both.
    let at = Limit { query: Query::at(Figure::GainAt, 1e6), bound: Bound::AtMost(2.0), thin: Thin::Fraction(0.1) };
    let needs = found(&stage(vec![limit(Figure::Bandwidth, Bound::AtLeast(500e3)), at]));
    let gbw = needs.part.iter().find(|n| n.figure == PartFigure::Gbw).expect("it matters");
    assert!(matches!(&gbw.room, Room::None(lost) if lost.len() == 1), "{:?}", gbw.room);
}

#[test]
fn a_search_can_be_stopped() {
    assert_eq!(needs(&stage(vec![limit(Figure::Gain, Bound::AtLeast(9.0))]), |done, _| done < 3), None);
}

#[test]
fn what_holds_at_an_edge_is_lost_beyond_it() {
    let limits = vec![
        limit(Figure::Bandwidth, Bound::AtLeast(300e3)),
        limit(Figure::GainError, Bound::AtLeast(-0.01)),
        limit(Figure::OutputOffset, Bound::AtMost(50e-3)),
        limit(Figure::SlewMargin, Bound::AtLeast(4.0)),
    ];
    let of = stage(limits);
    for need in found(&of).part {
        let Room::Between { least, greatest } = need.room else { continue };
        for (edge, beyond) in [(least, 0.98), (greatest, 1.02)] {
            let Some(edge) = edge else { continue };
            let kept = |value: f64| {
                let mut of = of.clone();
                of.part.state(need.figure, Rating { min: Some(value), typ: Some(value), max: Some(value), source: None });
                let report = Judge::default().report(&of).expect("a report");
                report.limits.iter().all(|l| !matches!(l.verdict, Verdict::Breaks | Verdict::Undetermined))
            };
            assert!(kept(edge.value) && !kept(edge.value * beyond), "{:?} at {}", need.figure, edge.value);
        }
    }
}

#[test]
fn parts_are_ranked_by_what_they_lose() {
    let of = stage(vec![limit(Figure::Bandwidth, Bound::AtLeast(300e3)), limit(Figure::OutputOffset, Bound::AtMost(50e-3))]);
    let made = |id: &str, figure: PartFigure, rating: Rating| {
        let mut part = part(id);
        part.state(figure, rating);
        part
    };
    let exactly = |v: f64| Rating { min: Some(v), typ: Some(v), max: Some(v), source: None };
    let shelf = [
        made("slow", PartFigure::Gbw, exactly(1e6)),
        made("silent", PartFigure::Offset, Rating::default()),
        made("near", PartFigure::Gbw, exactly(3.1e6)),
        made("fast", PartFigure::Gbw, exactly(30e6)),
    ];
    let mut judge = Judge::default();
    let mut list: Vec<_> = shelf.iter().filter_map(|p| alternate(&mut judge, &of, p, None)).collect();
    rank(&mut list);
    assert_eq!(list.iter().map(|a| a.part.as_str()).collect::<Vec<_>>(), ["fast", "near", "silent", "slow"]);
    assert!(list[0].survives() && list[1].survives() && list[1].thin == 1 && !list[2].survives());
    assert_eq!(list[2].missing.len(), 1, "it says what is missing");
    assert_eq!(list[3].breaks[0].query, Query::of(Figure::Bandwidth));
}
