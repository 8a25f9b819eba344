//! What must hold for any comparator, whatever its numbers.

use stageleaf_math::{
    analyse,
    analysis::{outcome, switching},
    figure::{Argument, Figure, Query},
    kind::Kind,
    model::Model,
    part::{Headroom, Part, PartFigure, Rating},
    report::{Caution, Need, Outcome, Report, Terminal},
    solution::Solution,
    stage::{Ambient, Band, Board, Component, Isolation, Load, ReferenceVoltage, Ripple, Signal, Source, Span, Stage, Supply, Toleranced},
};

const KINDS: [Kind; 2] = [Kind::ComparatorInverting, Kind::ComparatorNonInverting];
const OWN: [Figure; 6] =
    [Figure::ThresholdHigh, Figure::ThresholdLow, Figure::Hysteresis, Figure::ResponseTime, Figure::OutputHigh, Figure::OutputLow];

/// SplitMix64, as in `dense.rs`.
struct Draw(u64);

impl Draw {
    fn unit(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^= z >> 31;
        #[expect(clippy::cast_precision_loss, reason = "53 bits")]
        let unit = (z >> 11) as f64 / 9_007_199_254_740_992.0;
        unit
    }

    fn spread(&mut self, low: f64, high: f64) -> f64 {
        low * libm::pow(high / low, self.unit())
    }
}

fn part(draw: &mut Draw) -> Part {
    use PartFigure as P;
    let mut part = Part::default();
    let bounded = |typ: f64, low: f64, high: f64| Rating { min: Some(typ * low), typ: Some(typ), max: Some(typ * high), source: None };
    for (figure, rating) in [
        (P::OpenLoop, bounded(draw.spread(1e5, 1e7), 0.3, 2.0)),
        (P::OutputResistance, Rating::typical(draw.spread(10.0, 1e3))),
        (P::Offset, bounded(draw.spread(1e-5, 2e-3), 0.0, 4.0)),
        (P::OffsetDrift, bounded(draw.spread(1e-7, 5e-6), 0.0, 3.0)),
        (P::BiasCurrent, bounded(draw.spread(1e-12, 1e-8), 0.0, 4.0)),
        (P::OffsetCurrent, bounded(draw.spread(1e-13, 1e-9), 0.0, 4.0)),
        (P::Cmrr, bounded(draw.spread(1e4, 1e6), 0.2, 1.0)),
        (P::PsrrPositive, bounded(1e5, 0.2, 1.0)),
        (P::PsrrNegative, bounded(1e5, 0.2, 1.0)),
        (P::SlewRise, bounded(1e6, 0.7, 1.0)),
        (P::SlewFall, bounded(2e6, 0.7, 1.0)),
        (P::OverloadRecovery, Rating::typical(1e-6)),
        (P::CurrentLimit, bounded(20e-3, 0.5, 1.0)),
        (P::SupplyCurrent, bounded(1e-3, 0.5, 1.5)),
        (P::JunctionToAmbient, Rating::typical(150.0)),
    ] {
        part.state(figure, rating);
    }
    let rows = |volts: [f64; 2]| {
        let row = |(current, typ): (f64, f64)| Headroom { current, volts: bounded(typ, 1.0, 2.0) };
        [0.0, 15e-3].into_iter().zip(volts).map(row).collect::<Vec<_>>()
    };
    part.headroom_high = rows([0.02, 0.4]);
    part.headroom_low = rows([0.01, 0.3]);
    part
}

/// A comparator on ±6 V with values anywhere.
fn stage(kind: Kind, seed: u64) -> Stage {
    let mut draw = Draw(seed);
    let toleranced = |nominal: f64| Toleranced { nominal, minus: 0.01, plus: 0.01, drift: 50e-6, rating: None };
    let scale = draw.spread(1e3, 1e5);
    let mut components = vec![
        Component { name: "R1", value: toleranced(scale) },
        Component { name: "R2", value: toleranced(scale * draw.spread(2.0, 300.0)) },
    ];
    if draw.unit() < 0.5 {
        components.push(Component { name: "R3", value: toleranced(scale * draw.spread(0.5, 10.0)) });
    }
    Stage {
        name: "any".into(),
        kind,
        components,
        part: part(&mut draw),
        isolation: Isolation::OutsideLoop,
        supply: Some(Supply {
            positive: Span { low: 5.7, nominal: 6.0, high: 6.3 },
            negative: Span { low: -6.3, nominal: -6.0, high: -5.7 },
            ripple: None,
        }),
        sources: vec![Some(Source::Resistive { resistance: Toleranced::exact(draw.spread(1.0, 1e3)) })],
        signals: vec![],
        common_mode: None,
        reference: Some(ReferenceVoltage { voltage: toleranced(4.0 * draw.unit() - 2.0), resistance: Some(toleranced(10.0)) }),
        parts: vec![],
        load: Load { resistance: Some(toleranced(draw.spread(2e3, 1e5))), capacitance: Some(toleranced(1e-9)) },
        board: Board::default(),
        converter: stageleaf_math::stage::Converter::default(),
        ambient: Some(Ambient { range: Span { low: 263.0, nominal: 293.0, high: 323.0 }, values_at: None }),
        band: None,
        limits: vec![],
        measured: vec![],
    }
}

fn row(report: &Report, figure: Figure) -> (Outcome, Option<(f64, f64)>) {
    let row = report.figures.iter().find(|r| r.query.figure == figure).unwrap();
    (row.nominal.clone(), row.range)
}

fn nominal(report: &Report, figure: Figure) -> f64 {
    row(report, figure).0.value().unwrap_or_else(|| panic!("{}: {:?}", figure.id(), row(report, figure).0))
}

/// Everything below ground mirrored: the rails and their tables change places.
fn mirrored(stage: &Stage) -> Stage {
    let mut other = stage.clone();
    let turned = |s: Span| Span { low: -s.high, nominal: -s.nominal, high: -s.low };
    let supply = stage.supply.unwrap();
    other.supply = Some(Supply { positive: turned(supply.negative), negative: turned(supply.positive), ripple: None });
    other.reference.as_mut().unwrap().voltage.nominal *= -1.0;
    (other.part.headroom_high, other.part.headroom_low) = (stage.part.headroom_low.clone(), stage.part.headroom_high.clone());
    other.part.state(PartFigure::SlewRise, stage.part.rating(PartFigure::SlewFall).clone());
    other.part.state(PartFigure::SlewFall, stage.part.rating(PartFigure::SlewRise).clone());
    other.part.state(PartFigure::PsrrPositive, stage.part.rating(PartFigure::PsrrNegative).clone());
    other.part.state(PartFigure::PsrrNegative, stage.part.rating(PartFigure::PsrrPositive).clone());
    other
}

/// Thresholds change sign and place, with their ranges; hysteresis and response stay.
#[test]
fn a_mirrored_comparator_has_mirrored_thresholds() {
    for seed in 0..12 {
        for kind in KINDS {
            let stage = stage(kind, seed);
            let (one, other) = (analyse(&stage).unwrap(), analyse(&mirrored(&stage)).unwrap());
            for (a, b, sign) in [
                (Figure::ThresholdHigh, Figure::ThresholdLow, -1.0),
                (Figure::ThresholdLow, Figure::ThresholdHigh, -1.0),
                (Figure::OutputHigh, Figure::OutputLow, -1.0),
                (Figure::Hysteresis, Figure::Hysteresis, 1.0),
                (Figure::ResponseTime, Figure::ResponseTime, 1.0),
                (Figure::Dissipation, Figure::Dissipation, 1.0),
            ] {
                let (x, y) = (nominal(&one, a), sign * nominal(&other, b));
                assert!((x - y).abs() <= 1e-12 + 1e-10 * x.abs(), "{kind:?} {seed} {}: {x} and {y}", a.id());
                let (Some((low, high)), Some((other_low, other_high))) = (row(&one, a).1, row(&other, b).1) else {
                    panic!("{kind:?} {seed}")
                };
                let turned = if sign < 0.0 { (-other_high, -other_low) } else { (other_low, other_high) };
                let near = 1e-3 * (high - low) + 1e-12;
                assert!(
                    (low - turned.0).abs() <= near && (high - turned.1).abs() <= near,
                    "{kind:?} {seed} {}: {low} {high} {turned:?}",
                    a.id()
                );
            }
        }
    }
}

/// Both senses with the same network around the + input: the one's signal is the other's reference. Driven with a signal at the other's
/// threshold, each is on the edge: then the other's own threshold is that reference.
#[test]
fn each_sense_finds_the_other_s_reference() {
    for seed in 0..12 {
        let mut inverting = stage(Kind::ComparatorInverting, seed);
        // What is in one's signal path is in the other's reference path.
        inverting.sources = vec![Some(Source::Resistive { resistance: Toleranced::exact(10.0) })];
        let thresholds = analyse(&inverting).unwrap();
        for (figure, twin) in [(Figure::ThresholdHigh, Figure::ThresholdLow), (Figure::ThresholdLow, Figure::ThresholdHigh)] {
            let mut other = inverting.clone();
            other.kind = Kind::ComparatorNonInverting;
            other.reference.as_mut().unwrap().voltage.nominal = nominal(&thresholds, figure);
            // The level before switching is the same one, high or low.
            let found = nominal(&analyse(&other).unwrap(), twin);
            let wanted = inverting.reference.unwrap().voltage.nominal;
            // The edge lies on the same side of the same line, but for the open-loop gain's share.
            assert!((found - wanted).abs() <= 1e-9, "{seed} {}: {found} and {wanted}", figure.id());
        }
    }
}

#[test]
fn thresholds_rise_with_the_reference() {
    for seed in 0..8 {
        for kind in KINDS {
            let mut last = [f64::NEG_INFINITY; 2];
            for step in -8..=8 {
                let mut stage = stage(kind, seed);
                stage.reference.as_mut().unwrap().voltage.nominal = 0.25 * f64::from(step);
                let report = analyse(&stage).unwrap();
                let here = [nominal(&report, Figure::ThresholdLow), nominal(&report, Figure::ThresholdHigh)];
                assert!(here[0] > last[0] && here[1] > last[1], "{kind:?} {seed} at {step}: {last:?} then {here:?}");
                last = here;
            }
        }
    }
}

/// Whatever the values: a hysteresis above zero, or none and the reason; never a threshold of the wrong order.
#[test]
fn a_comparator_has_hysteresis_or_says_that_it_has_none() {
    let mut without = 0;
    for seed in 0..200 {
        for kind in KINDS {
            let mut stage = stage(kind, seed);
            stage.components[1].value.nominal *= Draw(seed + 1000).spread(1.0, 1e7);
            let model = Model::compile(&stage);
            let solution = Solution::new(&model, model.parameters.nominal(), None);
            let of = |figure| outcome(&solution, Query::of(figure));
            match (of(Figure::Hysteresis), of(Figure::ThresholdHigh), of(Figure::ThresholdLow)) {
                (Outcome::Value(h), Outcome::Value(high), Outcome::Value(low)) => assert!(h > 0.0 && high > low, "{kind:?} {seed}: {h}"),
                (Outcome::OutOfReach(a), Outcome::OutOfReach(b), Outcome::OutOfReach(_)) => {
                    assert_eq!(a, b, "{kind:?} {seed}");
                    without += 1;
                }
                other => panic!("{kind:?} {seed}: {other:?}"),
            }
        }
    }
    assert!(without > 20, "hardly any without hysteresis: {without}");
}

/// No build anywhere in the ranges lies outside the range that the report gives.
#[test]
fn the_worst_case_encloses_random_builds() {
    for seed in 0..6 {
        for kind in KINDS {
            let stage = stage(kind, seed);
            let report = analyse(&stage).unwrap();
            let model = Model::compile(&stage);
            let mut draw = Draw(seed + 77);
            for round in 0..300 {
                // Corners, and places between.
                let mut place = || if round % 2 == 0 { libm::round(draw.unit()) } else { draw.unit() };
                let values: Vec<f64> =
                    model.parameters.entries.iter().map(|e| e.low + (e.high - e.low) * place()).chain(std::iter::once(1.0)).collect();
                let build = Solution::new(&model, values, None);
                for figure in OWN {
                    let Some((low, high)) = row(&report, figure).1 else { panic!("{kind:?} {seed} {}", figure.id()) };
                    let here = outcome(&build, Query::of(figure)).value().unwrap();
                    let slack = 1e-3 * (high - low);
                    assert!(here >= low - slack && here <= high + slack, "{kind:?} {seed} {}: {here} in {low} to {high}", figure.id());
                }
            }
        }
    }
}

#[test]
fn what_is_of_linear_stages_does_not_apply_and_the_other_way_round() {
    let report = analyse(&stage(Kind::ComparatorInverting, 1)).unwrap();
    let linear = [Figure::Gain, Figure::Bandwidth, Figure::PhaseMargin, Figure::OutputNoise, Figure::OutputOffset, Figure::ClipMargin];
    for figure in linear {
        assert_eq!(row(&report, figure).0, Outcome::DoesNotApply(switching::TWO_LEVELS), "{}", figure.id());
    }
    assert!(!report.cautions.contains(&Caution::Oscillates), "a pole in the right half plane is what makes it switch");
    let mut linear = stage(Kind::ComparatorInverting, 1);
    (linear.kind, linear.reference) = (Kind::Follower, None);
    let report = analyse(&linear).unwrap();
    for figure in Figure::ALL.iter().filter(|f| switching::is_own(**f)) {
        assert!(matches!(figure.argument(), Argument::None));
        assert_eq!(row(&report, *figure).0, Outcome::DoesNotApply(switching::FOLLOWS), "{}", figure.id());
    }
}

#[test]
fn a_threshold_that_is_not_reached_is_no_number() {
    let mut stage = stage(Kind::ComparatorNonInverting, 3);
    let report = analyse(&stage).unwrap();
    let (low, high) = (nominal(&report, Figure::ThresholdLow), nominal(&report, Figure::ThresholdHigh));
    let signal = |from: f64, to: f64| Signal { peak: (to - from) / 2.0, frequency: None, dc: f64::midpoint(from, to), crest_factor: 1.0 };
    // A signal that ends between the thresholds meets the lower one alone.
    stage.signals = vec![Some(signal(low - 1.0, f64::midpoint(low, high)))];
    let report = analyse(&stage).unwrap();
    assert!(matches!(row(&report, Figure::ThresholdHigh).0, Outcome::OutOfReach(why) if why.contains("signal")));
    assert!(matches!(row(&report, Figure::Hysteresis).0, Outcome::OutOfReach(_)));
    assert!((nominal(&report, Figure::ThresholdLow) - low).abs() < 1e-12);
    // Inputs that must stay 9 V below the positive rail never meet the reference.
    stage.signals = vec![];
    stage.part.state(PartFigure::RangeFromNegative, Rating::typical(0.0));
    stage.part.state(PartFigure::RangeFromPositive, Rating::typical(11.9));
    let report = analyse(&stage).unwrap();
    assert!(matches!(row(&report, Figure::ThresholdHigh).0, Outcome::OutOfReach(why) if why.contains("range")));
    // No room between the rails.
    for table in [&mut stage.part.headroom_high, &mut stage.part.headroom_low] {
        table.iter_mut().for_each(|row| row.volts = Rating::typical(7.0));
    }
    let report = analyse(&stage).unwrap();
    assert!(matches!(row(&report, Figure::OutputHigh).0, Outcome::OutOfReach(why) if why.contains("room")));
}

/// Behind a capacitor a signal at rest reaches nothing; the inverting input, with no input resistance stated, has no DC path at all.
#[test]
fn behind_a_capacitor_there_is_no_threshold() {
    for kind in KINDS {
        let mut stage = stage(kind, 8);
        stage.sources = vec![Some(Source::Capacitive { capacitance: Toleranced::exact(1e-9) })];
        let found = row(&analyse(&stage).unwrap(), Figure::ThresholdHigh).0;
        match kind {
            Kind::ComparatorInverting => assert_eq!(found, Outcome::NoDcPath(Terminal { amplifier: 0, inverting: true })),
            _ => assert!(matches!(found, Outcome::OutOfReach(why) if why.contains("no signal")), "{found:?}"),
        }
    }
}

#[test]
fn what_is_missing_is_named() {
    let mut stage = stage(Kind::ComparatorInverting, 4);
    stage.part.state(PartFigure::OverloadRecovery, Rating::default());
    stage.part.state(PartFigure::Offset, Rating::default());
    stage.part.headroom_low.clear();
    let report = analyse(&stage).unwrap();
    let needs = |figure| match row(&report, figure).0 {
        Outcome::Undetermined(needs) => needs,
        other => panic!("{other:?}"),
    };
    assert_eq!(needs(Figure::ThresholdHigh), [Need::Part(PartFigure::Offset), Need::HeadroomLow]);
    assert_eq!(needs(Figure::ResponseTime), [Need::Part(PartFigure::OverloadRecovery), Need::HeadroomLow]);
    assert_eq!(needs(Figure::OutputLow), [Need::HeadroomLow]);
}

/// An amplifier of 100 nV/√Hz over 1 MHz: 0.66 mV peak to peak at the thresholds, by hand.
#[test]
fn hysteresis_less_than_the_noise_is_a_caution() {
    let mut stage = stage(Kind::ComparatorInverting, 5);
    for (figure, value) in [(PartFigure::NoiseVoltage, 100e-9), (PartFigure::NoiseVoltageCorner, 1e-3)] {
        stage.part.state(figure, Rating::typical(value));
    }
    stage.band = Some(Band { from: 1.0, to: 1e6 });
    let chatters = |stage: &Stage| analyse(stage).unwrap().cautions.into_iter().find(|c| matches!(c, Caution::Chatter { .. }));
    assert_eq!(chatters(&stage), None);
    stage.components.truncate(2);
    stage.reference.as_mut().unwrap().resistance = None;
    stage.part.state(PartFigure::OpenLoop, Rating::typical(1e9));
    stage.components[0].value.nominal = 1.0;
    stage.components[1].value.nominal = 1e5;
    let Some(Caution::Chatter { hysteresis, disturbance }) = chatters(&stage) else { panic!("no caution") };
    assert!(hysteresis > 0.0 && hysteresis < 150e-6, "{hysteresis}");
    assert!((disturbance / (6.6 * 1e-4) - 1.0).abs() < 0.01, "{disturbance}");
    // Ripple of the supplies moves the levels, and the thresholds by their share.
    stage.band = None;
    stage.supply.as_mut().unwrap().ripple = Some(Ripple { peak: 5.9, frequency: 100.0 });
    assert!(matches!(chatters(&stage), Some(Caution::Chatter { disturbance, .. }) if disturbance > 110e-6 && disturbance < 125e-6));
}

#[test]
fn inputs_that_come_too_far_apart_are_a_caution() {
    let mut stage = stage(Kind::ComparatorInverting, 6);
    stage.part.state(PartFigure::DifferentialMax, Rating { min: Some(0.5), typ: None, max: None, source: None });
    let apart = |stage: &Stage| analyse(stage).unwrap().cautions.into_iter().any(|c| matches!(c, Caution::DifferentialInput { .. }));
    stage.signals = vec![Some(Signal { peak: 5.0, frequency: None, dc: 0.0, crest_factor: 1.0 })];
    assert!(apart(&stage));
    stage.part.state(PartFigure::DifferentialMax, Rating { min: Some(12.0), typ: None, max: None, source: None });
    assert!(!apart(&stage));
}

#[test]
fn the_transfer_jumps_at_the_thresholds() {
    for kind in KINDS {
        let mut stage = stage(kind, 7);
        stage.part.state(PartFigure::Offset, Rating::typical(0.0));
        let report = analyse(&stage).unwrap();
        let (low, high) = (nominal(&report, Figure::ThresholdLow), nominal(&report, Figure::ThresholdHigh));
        let jump = |of: fn(&stageleaf_math::report::TransferPoint) -> f64| {
            let pair = report.transfer.windows(2).find(|p| (of(&p[0]) - of(&p[1])).abs() > 1.0).unwrap();
            assert!((pair[0].input - pair[1].input).abs() <= 0.0, "{kind:?}: not upright");
            pair[0].input
        };
        assert!((jump(|p| p.rising) - high).abs() < 1e-12 && (jump(|p| p.falling) - low).abs() < 1e-12, "{kind:?}");
        let ends = (report.transfer.first().unwrap(), report.transfer.last().unwrap());
        let rises = ends.1.rising > ends.0.rising;
        assert_eq!(rises, kind == Kind::ComparatorNonInverting);
        assert!((ends.0.rising - ends.0.falling).abs() <= 0.0 && (ends.1.rising - ends.1.falling).abs() <= 0.0);
    }
}
