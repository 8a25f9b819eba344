//! A stage and a report made up by hand, to look at and to render in tests. No figure in it is a result.

use stageleaf_math::{
    dimension::Dimension,
    figure::{Argument, Figure, Query},
    kind::{ComponentSpec, Drives, Feed, Kind},
    limit::{Basis, Bound, Limit, Thin, Verdict},
    network::Drive,
    part::{Part, PartFigure},
    report::{
        Caution, Coordinate, DcCause, DcLine, DensityPoint, EnvelopePoint, FigureRow, LimitRow, Need, NoiseOrigin, NoiseShare, Outcome,
        Parameter, Report, ResponsePoint, Root, TransferPoint, Working,
    },
    stage::{Ambient, Band, Board, Component, Isolation, Load, ReferenceVoltage, Signal, Source, Span, Stage, Supply, Toleranced},
};
use stageleaf_note::{Block, Field, ShelfPart};

/// Values as a note writes them, by component; those not listed have one value per dimension.
const WRITTEN: [(&str, &str, f64); 13] = [
    ("Rf", "91k 1% 50ppm", 91e3),
    ("Rg", "4k7 1% 50ppm", 4.7e3),
    ("Rin", "4k7 1% 50ppm", 4.7e3),
    ("Cf", "3p3 5%", 3.3e-12),
    ("Rp", "4k3 1%", 4.3e3),
    ("Cp", "100n 10%", 1e-7),
    ("Rser", "100 1%", 100.0),
    ("Cshunt", "220p 5%", 2.2e-10),
    ("Riso", "47 1% 50ppm", 47.0),
    ("Rsn", "22 5%", 22.0),
    ("Csn", "1n 10%", 1e-9),
    ("Rng", "1k5 1% 100ppm", 1.5e3),
    ("Cng", "470p 5%", 4.7e-10),
];

fn value(nominal: f64) -> Toleranced {
    Toleranced { nominal, minus: 0.01, plus: 0.01, drift: 50e-6, rating: None }
}

fn field(path: &str, text: &str) -> Field {
    Field { path: path.into(), text: text.into(), span: 0..0, whole: 0..0, line: 1, column: 1 }
}

/// A stage of a kind with these components, load and source as told.
pub fn block(kind: Kind, components: &[&str], isolation: Isolation, load: (bool, bool), source: bool) -> Block {
    let of = |spec: &ComponentSpec| match WRITTEN.iter().find(|w| w.0 == spec.name) {
        Some(w) => (spec.name, w.1, w.2),
        None if spec.dimension == Dimension::Capacitance => (spec.name, "2n2 1% 30ppm", 2.2e-9),
        None => (spec.name, "18k2 1% 50ppm", 18.2e3),
    };
    let components: Vec<(&'static str, &str, f64)> = kind.components().iter().filter(|s| components.contains(&s.name)).map(of).collect();
    let mut stage = Stage {
        name: "Hydrophone line amplifier".into(),
        kind,
        components: components.iter().map(|c| Component { name: c.0, value: value(c.2) }).collect(),
        part: part().part,
        isolation,
        supply: Some(Supply {
            positive: Span { low: 11.4, nominal: 12.0, high: 12.6 },
            negative: Span { low: -12.6, nominal: -12.0, high: -11.4 },
            ripple: None,
        }),
        sources: vec![],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load { resistance: load.0.then(|| value(2e3)), capacitance: load.1.then(|| value(1e-9)) },
        converter: Default::default(),
        board: Board::default(),
        ambient: Some(Ambient::of(Span { low: 253.15, nominal: 298.15, high: 323.15 })),
        band: Some(Band { from: 10.0, to: 20e3 }),
        limits: Vec::new(),
        measured: Vec::new(),
    };
    let mut fields: Vec<Field> = components.iter().map(|c| field(&format!("components.{}", c.0), c.1)).collect();
    for (path, text) in [
        ("part", "alder-10"),
        ("supply.positive", "12 V ± 5 %"),
        ("supply.negative", "-12 V ± 5 %"),
        ("ambient.range", "-20 °C to 50 °C"),
        ("band.from", "10 Hz"),
        ("band.to", "20 kHz"),
    ] {
        fields.push(field(path, text));
    }
    driven(&mut stage, &mut fields, source);
    if load.0 {
        fields.push(field("load.resistance", "2k"));
    }
    if load.1 {
        fields.push(field("load.capacitance", "1n"));
    }
    let text = format!("stage = \"{}\"\npart = \"alder-10\"\n", kind.id());
    Block { stage, text, file: "notes/hydrophone.md".into(), line: 12, fields, measured: Vec::new() }
}

/// Signals at the inputs, the source's resistance in each if there is one, and what else comes from outside.
fn driven(stage: &mut Stage, fields: &mut Vec<Field>, source: bool) {
    let spec = stage.kind.spec();
    let inputs: Vec<_> = (spec.inputs)(stage).iter().filter(|i| i.feed == Feed::Signal).collect();
    let several = inputs.len() > 1;
    let each = several && spec.drives == Drives::Each;
    for input in &inputs {
        let place = |table: &str, by_input: bool| if by_input { format!("{table}.{}", input.name) } else { table.to_owned() };
        if source {
            stage.sources.push(Some(Source::Resistive { resistance: Toleranced::exact(600.0) }));
            fields.push(field(&format!("{}.resistance", place("source", several)), "600"));
        }
        if each || stage.signals.is_empty() {
            let (peak, text) = match input.drive {
                Drive::Voltage => (0.4, "0.4 V"),
                Drive::Current => (20e-6, "20 µA"),
                Drive::Charge => (5e-12, "5 pC"),
            };
            stage.signals.push(Some(Signal { peak, frequency: Some(20e3), dc: 0.0, crest_factor: std::f64::consts::SQRT_2 }));
            fields.push(field(&format!("{}.peak", place("signal", each)), text));
            fields.push(field(&format!("{}.frequency", place("signal", each)), "20 kHz"));
        }
    }
    if spec.drives == Drives::Differential {
        stage.common_mode = Some(Span { low: 2.4, nominal: 2.5, high: 2.6 });
        fields.push(field("signal.common_mode", "2.5 V ± 0.1 V"));
    }
    if (spec.inputs)(stage).iter().any(|i| i.feed == Feed::Reference) {
        stage.reference = Some(ReferenceVoltage { voltage: value(2.5), resistance: None });
        fields.push(field("reference.voltage", "2.5 V 0.1%"));
    }
}

/// A part of the shelf.
pub fn part() -> ShelfPart {
    let part = Part {
        id: "alder-10".into(),
        name: "alder-10".into(),
        description: Some("precision amplifier, ±15 V, 10 MHz".into()),
        source: Some("alder data sheet, revision C".into()),
        ..Part::default()
    };
    ShelfPart { part, file: "site/shelf/alder-10.toml".into(), text: "[part]\nname = \"alder-10\"\n".into() }
}

fn row(query: Query, bound: Bound, numbers: (f64, f64, f64), worst: f64, margin: f64, verdict: Verdict) -> LimitRow {
    LimitRow {
        amplifier: None,
        dimension: query.figure.dimension(),
        limit: Limit { query, bound, thin: Thin::Fraction(0.1) },
        nominal: Outcome::Value(numbers.0),
        range: Some((numbers.1, numbers.2)),
        worst: Outcome::Value(worst),
        margin: Some(margin),
        verdict,
        basis: Some(Basis::Mixed),
        corner: vec![
            Coordinate { parameter: Parameter::Component("Rf"), value: 91.91e3, nominal: 91e3 },
            Coordinate { parameter: Parameter::Component("Rg"), value: 4653.0, nominal: 4.7e3 },
            Coordinate { parameter: Parameter::Temperature, value: 323.15, nominal: 298.15 },
            Coordinate { parameter: Parameter::Part(PartFigure::Gbw), value: 7e6, nominal: 10e6 },
        ],
        dominant: Some(Parameter::Part(PartFigure::Gbw)),
    }
}

fn sweep(low: f64, decades: i32, per: i32) -> impl Iterator<Item = f64> {
    (0..=decades * per).map(move |k| low * libm::pow(10.0, f64::from(k) / f64::from(per)))
}

/// A report in which every list holds something and every verdict occurs.
pub fn report(kind: Kind) -> Report {
    let figure = Query::of;
    let limits = vec![
        row(figure(Figure::GainAtSignal), Bound::Between { low: 19.8, high: 21.0 }, (20.3, 19.9, 20.7), 19.9, 0.1, Verdict::Holds),
        row(figure(Figure::Bandwidth), Bound::AtLeast(300e3), (512e3, 320e3, 560e3), 320e3, 20e3, Verdict::Thin),
        row(figure(Figure::PhaseMargin), Bound::AtLeast(0.8727), (1.02, 0.75, 1.1), 0.75, -0.1227, Verdict::Breaks),
        row(figure(Figure::OutputNoise), Bound::AtMost(120e-6), (61e-6, 58e-6, 92e-6), 92e-6, 28e-6, Verdict::Holds),
        row(figure(Figure::ClipMargin), Bound::AtLeast(0.5), (2.1, 1.4, 2.9), 1.4, 0.9, Verdict::Holds),
        row(figure(Figure::GainMargin), Bound::AtLeast(2.0), (f64::INFINITY, 8.0, f64::INFINITY), 8.0, 6.0, Verdict::Holds),
        row(figure(Figure::FullPowerBandwidth), Bound::AtLeast(20e3), (2.1e6, 0.9e6, 3e6), 0.9e6, 0.88e6, Verdict::Holds),
        row(Query::at(Figure::GainAt, 2e6), Bound::Report, (4.9, 3.1, 5.6), 3.1, 0.0, Verdict::Reported),
        LimitRow {
            amplifier: None,
            dimension: Dimension::Temperature,
            limit: Limit { query: figure(Figure::JunctionTemperature), bound: Bound::AtMost(358.15), thin: Thin::Distance(10.0) },
            nominal: Outcome::Undetermined(vec![Need::Part(PartFigure::JunctionToAmbient)]),
            range: None,
            worst: Outcome::Undetermined(vec![Need::Part(PartFigure::JunctionToAmbient)]),
            margin: None,
            verdict: Verdict::Undetermined,
            basis: None,
            corner: Vec::new(),
            dominant: None,
        },
    ];
    let figures = Figure::ALL
        .iter()
        .filter(|f| f.argument() == Argument::None)
        .map(|f| FigureRow {
            amplifier: None,
            query: Query::of(*f),
            dimension: f.dimension(),
            nominal: match f {
                Figure::JunctionTemperature => Outcome::Undetermined(vec![Need::Part(PartFigure::JunctionToAmbient)]),
                Figure::Crossover => Outcome::Value(480e3),
                Figure::Bandwidth => Outcome::Value(512e3),
                Figure::PhaseMargin => Outcome::Value(1.02),
                Figure::GainAtSignal | Figure::Gain => Outcome::Value(20.3),
                Figure::Q => Outcome::DoesNotApply("no complex pole pair"),
                _ => Outcome::Value(match f.dimension() {
                    Dimension::Voltage => 1.234e-3,
                    Dimension::Level => 12.3,
                    Dimension::Temperature => 331.0,
                    Dimension::Fraction => -0.0012,
                    _ => 4.56,
                }),
            },
            range: (*f != Figure::JunctionTemperature).then_some((0.9, 1.1)),
            basis: Some(Basis::Typical),
        })
        .collect();
    let response = sweep(1.0, 8, 20)
        .map(|f| {
            let x = f / 512e3;
            ResponsePoint { frequency: f, magnitude: 20.3 / libm::sqrt(1.0 + x * x), phase: -libm::atan(x) }
        })
        .collect();
    let loop_gain = sweep(1.0, 8, 20)
        .map(|f| {
            let (a, b) = (f / 5.0, f / 900e3);
            ResponsePoint {
                frequency: f,
                magnitude: 9.6e4 / libm::sqrt((1.0 + a * a) * (1.0 + b * b)),
                phase: -libm::atan(a) - libm::atan(b),
            }
        })
        .collect();
    let shares = [
        (NoiseOrigin::AmplifierVoltage(0), 0.52),
        (NoiseOrigin::Component("Rf"), 0.11),
        (NoiseOrigin::Component("Rg"), 0.2),
        (NoiseOrigin::SourceResistance(0), 0.09),
        (NoiseOrigin::CurrentNonInverting(0), 0.05),
        (NoiseOrigin::CurrentInverting(0), 0.03),
    ];
    let density = sweep(10.0, 6, 20)
        .map(|f| {
            let roll = 20.3 / libm::sqrt(1.0 + (f / 512e3) * (f / 512e3));
            let total = 22e-9 * roll * libm::sqrt(1.0 + 300.0 / f);
            DensityPoint { frequency: f, total, by_source: shares.iter().map(|s| total * libm::sqrt(s.1)).collect() }
        })
        .collect();
    let envelope = sweep(10.0, 6, 20)
        .map(|f| EnvelopePoint { frequency: f, rails: Some(10.2), current: Some(22.0), slew: Some(20e6 / (std::f64::consts::TAU * f)) })
        .collect();
    let cause = |cause, nominal, worst| DcLine { cause, nominal: Outcome::Value(nominal), worst: Outcome::Value(worst) };
    Report {
        name: "Hydrophone line amplifier".into(),
        figures,
        limits,
        measured: Vec::new(),
        response,
        transfer: [(2.0, 0.1, 0.1), (2.5, 0.1, 0.1), (2.5, 0.1, 4.9), (3.0, 0.1, 4.9), (3.0, 4.9, 4.9), (3.5, 4.9, 4.9)]
            .map(|(input, rising, falling)| TransferPoint { input, rising, falling })
            .to_vec(),
        loop_gain,
        density,
        noise_shares: shares.iter().map(|s| NoiseShare { origin: s.0, rms: 61e-6 * libm::sqrt(s.1), share: s.1 }).collect(),
        dc_budget: vec![
            cause(DcCause::Offset, 1e-3, 4.1e-3),
            cause(DcCause::OffsetDrift, 0.1e-3, 0.6e-3),
            cause(DcCause::BiasCurrent, 0.4e-3, 1.3e-3),
            DcLine {
                cause: DcCause::CommonMode,
                nominal: Outcome::Undetermined(vec![Need::Part(PartFigure::Cmrr)]),
                worst: Outcome::Undetermined(vec![Need::Part(PartFigure::Cmrr)]),
            },
        ],
        envelope,
        poles: vec![Root { re: -2.1e6, im: 2.4e6 }, Root { re: -2.1e6, im: -2.4e6 }, Root { re: -9e7, im: 0.0 }],
        zeros: vec![Root { re: -3.3e6, im: 0.0 }],
        working: vec![Working {
            query: Query::of(Figure::Gain),
            dimension: Dimension::Gain,
            formula: if kind == Kind::Inverting { "G = −Rf/Rin" } else { "G = 1 + Rf/Rg" },
            numbers: vec![("Rf", 91e3, Dimension::Resistance), ("Rg", 4.7e3, Dimension::Resistance)],
            handbook: 20.36,
            exact: Outcome::Value(20.31),
            against: stageleaf_math::report::Against::Nominal,
            source: "derived here: the two resistors are a divider",
            difference: "the amplifier's gain is finite, and the source's resistance counts",
        }],
        cautions: vec![Caution::BelowStableGain { noise_gain: 3.0, needed: 5.0 }, Caution::TakenAsIdeal(PartFigure::OutputResistance)],
    }
}
