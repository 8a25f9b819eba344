//! Stages of every kind for the laws that hold whatever the numbers.

use stageleaf_math::{
    kind::Kind,
    part::{Part, PartFigure, Rating},
    stage::{Ambient, Band, Board, Component, Converter, Isolation, Load, Signal, Source, Span, Stage, Supply, Toleranced},
};

/// A part with typical values and bounds for everything that the figures below need.
fn part(impedance: f64, time: f64) -> Part {
    use PartFigure as P;
    let mut part = Part { poles: Some(vec![2.5e7 / time]), ..Part::default() };
    let bounded = |typ: f64, low: f64, high: f64| Rating { min: Some(typ * low), typ: Some(typ), max: Some(typ * high), source: None };
    for (figure, rating) in [
        (P::OpenLoop, bounded(1e6, 0.3, 2.0)),
        (P::Gbw, bounded(1e7 / time, 0.7, 1.3)),
        (P::OutputResistance, Rating::typical(50.0 * impedance)),
        (P::DifferentialCapacitance, Rating::typical(2e-12 * time / impedance)),
        (P::CommonModeCapacitance, Rating::typical(4e-12 * time / impedance)),
        (P::NoiseVoltage, bounded(5e-9, 1.0, 1.5)),
        (P::NoiseVoltageCorner, Rating::typical(30.0)),
        (P::NoiseCurrent, Rating::typical(1e-12)),
        (P::NoiseCurrentCorner, Rating::typical(100.0)),
        (P::Offset, bounded(1e-4, 0.0, 5.0)),
        (P::OffsetDrift, bounded(1e-6, 0.0, 5.0)),
        (P::BiasCurrent, bounded(1e-9, 0.0, 10.0)),
        (P::OffsetCurrent, bounded(1e-10, 0.0, 10.0)),
        (P::Cmrr, bounded(1e5, 0.1, 1.0)),
        (P::PsrrPositive, bounded(1e5, 0.1, 1.0)),
        (P::PsrrNegative, bounded(1e5, 0.1, 1.0)),
    ] {
        part.state(figure, rating);
    }
    part
}

/// A stage of the kind with every component it needs, its impedances and time constants scaled.
pub fn stage(kind: Kind, impedance: f64, time: f64) -> Stage {
    let toleranced = |nominal: f64| Toleranced { nominal, minus: 0.02, plus: 0.02, drift: 50e-6, rating: None };
    let components = kind
        .components()
        .iter()
        .filter(|c| c.required || kind == Kind::Charge && c.name == "Rf")
        .enumerate()
        .map(|(i, c)| {
            #[expect(clippy::cast_precision_loss, reason = "a few components")]
            let step = 1.0 + i as f64 * 0.37;
            let value = if c.name.starts_with('R') { 1e4 * step * impedance } else { 1e-9 / step * time / impedance };
            Component { name: c.name, value: toleranced(value) }
        })
        .collect();
    Stage {
        name: "any".into(),
        kind,
        components,
        part: part(impedance, time),
        isolation: Isolation::OutsideLoop,
        supply: Some(Supply {
            positive: Span { low: 11.0, nominal: 12.0, high: 13.0 },
            negative: Span { low: -13.0, nominal: -12.0, high: -11.0 },
            ripple: None,
        }),
        sources: vec![match (kind.spec().inputs)(&bare(kind))[0].drive {
            stageleaf_math::network::Drive::Voltage => Some(Source::Resistive { resistance: toleranced(600.0 * impedance) }),
            _ => Some(Source::Capacitive { capacitance: toleranced(1e-10 * time / impedance) }),
        }],
        signals: vec![Some(Signal { peak: 0.1, frequency: Some(1e3 / time), dc: 0.0, crest_factor: std::f64::consts::SQRT_2 })],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load {
            resistance: Some(toleranced(1e4 * impedance)),
            capacitance: Some(Toleranced { minus: 0.9, plus: 1.0, ..toleranced(1e-10 * time / impedance) }),
        },
        converter: Converter::default(),
        board: Board::default(),
        ambient: Some(Ambient::of(Span { low: 263.0, nominal: 293.0, high: 323.0 })),
        band: Some(Band { from: 10.0, to: 1e5 }),
        limits: vec![],
        measured: vec![],
    }
}

/// Enough of a stage to ask a kind for its inputs.
fn bare(kind: Kind) -> Stage {
    let components =
        kind.components().iter().filter(|c| c.required).map(|c| Component { name: c.name, value: Toleranced::exact(1.0) }).collect();
    Stage {
        name: String::new(),
        kind,
        components,
        part: Part::default(),
        isolation: Isolation::OutsideLoop,
        supply: None,
        sources: vec![],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load::default(),
        converter: Converter::default(),
        board: Board::default(),
        ambient: None,
        band: None,
        limits: vec![],
        measured: vec![],
    }
}
