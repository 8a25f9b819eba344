//! Stages and parts from a row's numbers, and a question put to the engine.

use stageleaf_math::{
    analyse,
    analysis::response::least_damped,
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin},
    model::Model,
    part::{Headroom, Part, PartFigure, Rating, Zero},
    report::{NoiseOrigin, Outcome, Report},
    solution::Solution,
    stage::{Ambient, Band, Board, Component, Isolation, Load, Signal, Source, Span, Stage, Supply, Toleranced},
};

/// An amplifier's small-signal and noise figures. `None` is not stated.
#[derive(Clone, Debug, PartialEq)]
pub struct Amplifier {
    pub open_loop: f64,
    pub gbw: f64,
    pub higher_poles: Option<Vec<f64>>,
    pub zeros: Vec<Zero>,
    pub output_resistance: f64,
    pub differential_resistance: Option<f64>,
    pub common_mode_resistance: Option<f64>,
    pub differential_capacitance: f64,
    pub common_mode_capacitance: f64,
    pub voltage_noise: f64,
    pub voltage_corner: f64,
    pub exponent: f64,
    pub current_noise: f64,
    pub current_corner: f64,
}

impl Amplifier {
    /// Gain and gain-bandwidth product so large that the stage is ideal to twelve digits; noiseless.
    pub const fn ideal() -> Self {
        Self::one_pole(1e12, 1e18)
    }

    /// One pole and nothing else.
    pub const fn one_pole(open_loop: f64, gbw: f64) -> Self {
        Self {
            open_loop,
            gbw,
            higher_poles: Some(Vec::new()),
            zeros: Vec::new(),
            output_resistance: 0.0,
            differential_resistance: None,
            common_mode_resistance: None,
            differential_capacitance: 0.0,
            common_mode_capacitance: 0.0,
            voltage_noise: 0.0,
            voltage_corner: 0.0,
            exponent: 1.0,
            current_noise: 0.0,
            current_corner: 0.0,
        }
    }

    /// The part that states these figures.
    pub fn part(&self) -> Part {
        let mut part = Part {
            id: "outside".into(),
            name: "outside".into(),
            poles: self.higher_poles.clone(),
            zeros: self.zeros.clone(),
            ..Part::default()
        };
        for (figure, value) in [
            (PartFigure::OpenLoop, Some(self.open_loop)),
            (PartFigure::Gbw, Some(self.gbw)),
            (PartFigure::OutputResistance, Some(self.output_resistance)),
            (PartFigure::DifferentialResistance, self.differential_resistance),
            (PartFigure::CommonModeResistance, self.common_mode_resistance),
            (PartFigure::DifferentialCapacitance, Some(self.differential_capacitance)),
            (PartFigure::CommonModeCapacitance, Some(self.common_mode_capacitance)),
            (PartFigure::NoiseVoltage, Some(self.voltage_noise)),
            (PartFigure::NoiseVoltageCorner, Some(self.voltage_corner)),
            (PartFigure::NoiseExponent, Some(self.exponent)),
            (PartFigure::NoiseCurrent, Some(self.current_noise)),
            (PartFigure::NoiseCurrentCorner, Some(self.current_corner)),
        ] {
            if let Some(value) = value {
                part.state(figure, Rating::typical(value));
            }
        }
        part
    }
}

/// A stage of `kind` around `part`, without supply, signal or load.
pub fn stage(kind: Kind, part: Part) -> Stage {
    Stage {
        name: "outside".into(),
        kind,
        components: Vec::new(),
        part,
        isolation: Isolation::OutsideLoop,
        supply: None,
        sources: Vec::new(),
        signals: Vec::new(),
        common_mode: None,
        reference: None,
        parts: Vec::new(),
        load: Load::default(),
        converter: Default::default(),
        board: Board::default(),
        ambient: None,
        band: None,
        limits: Vec::new(),
        measured: Vec::new(),
    }
}

/// Short ways to complete a stage.
pub trait Complete: Sized {
    /// With a component.
    fn with(self, name: &str, value: f64) -> Self;
    /// With a component of ± `tolerance`.
    fn with_tolerance(self, name: &str, value: f64, tolerance: f64) -> Self;
    /// At an ambient temperature in K.
    fn at(self, kelvin: f64) -> Self;
    /// Integrating noise over a band.
    fn over(self, from: f64, to: f64) -> Self;
    /// Driven through a resistance.
    fn behind_resistance(self, ohms: f64) -> Self;
    /// With a signal.
    fn driven(self, dc: f64, peak: f64, frequency: Option<f64>, crest_factor: f64) -> Self;
    /// Between two rails.
    fn between(self, negative: f64, positive: f64) -> Self;
    /// Loaded.
    fn loaded(self, ohms: Option<f64>, farads: Option<f64>) -> Self;
    /// With one more figure of the part.
    fn stating(self, figure: PartFigure, value: f64) -> Self;
    /// With the same headroom to either rail at every current.
    fn with_headroom(self, volts: f64) -> Self;
}

impl Complete for Stage {
    fn with(self, name: &str, value: f64) -> Self {
        self.with_tolerance(name, value, 0.0)
    }

    fn with_tolerance(mut self, name: &str, value: f64, tolerance: f64) -> Self {
        let spec = self.kind.components().iter().find(|c| c.name == name);
        let name = spec.unwrap_or_else(|| panic!("a {} stage has no `{name}`", self.kind.id())).name;
        self.components.push(Component { name, value: Toleranced { minus: tolerance, plus: tolerance, ..Toleranced::exact(value) } });
        self
    }

    fn at(mut self, kelvin: f64) -> Self {
        self.ambient = Some(Ambient::of(Span::exact(kelvin)));
        self
    }

    fn over(mut self, from: f64, to: f64) -> Self {
        self.band = Some(Band { from, to });
        self
    }

    fn behind_resistance(mut self, ohms: f64) -> Self {
        self.sources = vec![Some(Source::Resistive { resistance: Toleranced::exact(ohms) })];
        self
    }

    fn driven(mut self, dc: f64, peak: f64, frequency: Option<f64>, crest_factor: f64) -> Self {
        self.signals = vec![Some(Signal { peak, frequency, dc, crest_factor })];
        self
    }

    fn between(mut self, negative: f64, positive: f64) -> Self {
        self.supply = Some(Supply { positive: Span::exact(positive), negative: Span::exact(negative), ripple: None });
        self
    }

    fn loaded(mut self, ohms: Option<f64>, farads: Option<f64>) -> Self {
        self.load = Load { resistance: ohms.map(Toleranced::exact), capacitance: farads.map(Toleranced::exact) };
        self
    }

    fn stating(mut self, figure: PartFigure, value: f64) -> Self {
        self.part.state(figure, Rating::typical(value));
        self
    }

    fn with_headroom(mut self, volts: f64) -> Self {
        let table =
            vec![Headroom { current: 0.0, volts: Rating::typical(volts) }, Headroom { current: 1.0, volts: Rating::typical(volts) }];
        self.part.headroom_high.clone_from(&table);
        self.part.headroom_low = table;
        self
    }
}

/// The engine's report, with `queries` as its limits.
pub fn report(stage: &Stage, queries: &[Query]) -> Report {
    let mut stage = stage.clone();
    stage.limits = queries.iter().map(|&query| Limit { query, bound: Bound::Report, thin: Thin::Fraction(0.1) }).collect();
    analyse(&stage).unwrap_or_else(|error| panic!("the engine refuses the stage: {error}\n{stage:#?}"))
}

/// The report with the least damped pair under `natural_frequency` and `q`. A filter's report gives its own pair there; the tables
/// outside give the least damped of all, which the engine finds for every kind.
pub fn with_least_damped(stage: &Stage, mut report: Report) -> Report {
    let is_filter = (stage.kind.spec().working)(stage).iter().any(|w| w.query.figure == Figure::NaturalFrequency);
    if is_filter {
        let pair = solved(stage, least_damped);
        for row in &mut report.limits {
            let of_pair = match row.limit.query.figure {
                Figure::NaturalFrequency => pair.map(|p| p.0),
                Figure::Q => pair.map(|p| p.1),
                _ => continue,
            };
            if matches!(row.nominal, Outcome::Value(_) | Outcome::DoesNotApply(_)) {
                row.nominal = of_pair.map_or(Outcome::DoesNotApply("all poles are real"), Outcome::Value);
            }
        }
    }
    report
}

/// The outcome of one query; a report without it fails.
pub fn outcome(report: &Report, query: Query) -> Outcome {
    let row = report.limits.iter().find(|row| row.limit.query == query);
    row.map(|row| row.nominal.clone()).unwrap_or_else(|| panic!("the report has no limit row for {query:?}"))
}

/// One question, one answer.
pub fn ask(stage: &Stage, query: Query) -> Outcome {
    outcome(&report(stage, &[query]), query)
}

/// A figure without an argument, nominal.
pub fn figure(stage: &Stage, figure: Figure) -> Outcome {
    ask(stage, Query::of(figure))
}

/// An outcome with its value converted.
pub fn map(outcome: Outcome, convert: impl Fn(f64) -> f64) -> Outcome {
    match outcome {
        Outcome::Value(value) => Outcome::Value(convert(value)),
        other => other,
    }
}

/// The nominal build, for what no figure gives: a further signal's transfer, one of several amplifiers' loops.
pub fn solved<T>(stage: &Stage, ask: impl FnOnce(&Solution<'_>) -> T) -> T {
    let model = Model::compile(stage);
    ask(&Solution::new(&model, model.parameters.nominal(), None))
}

/// Output noise density at `frequency` by source: the shares of a band so narrow that the density does not change over it.
pub fn density_by_source(stage: &Stage, frequency: f64) -> Vec<(NoiseOrigin, f64)> {
    const HALF_WIDTH: f64 = 1e-5; // the mean over the band differs from its middle by its square
    let band = Band { from: frequency * (1.0 - HALF_WIDTH), to: frequency * (1.0 + HALF_WIDTH) };
    let width = libm::sqrt(band.to - band.from);
    let mut stage = stage.clone();
    stage.band = Some(band);
    report(&stage, &[]).noise_shares.iter().map(|share| (share.origin, share.rms / width)).collect()
}

/// The entry of one source; a source that is not listed contributes nothing.
pub fn of_source(shares: &[(NoiseOrigin, f64)], origin: NoiseOrigin) -> f64 {
    shares.iter().find(|share| share.0 == origin).map_or(0.0, |share| share.1)
}
