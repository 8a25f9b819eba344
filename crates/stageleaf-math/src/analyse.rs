//! From a stage to its report.

use alloc::vec::Vec;

use crate::{
    Error,
    analysis::{
        self, dc, margins, noise, outcome, response,
        spread::{Extreme, Spread},
        swing, thermal,
    },
    dimension::Dimension,
    figure::{Argument, Figure, Query},
    limit::{Bound, Limit, Thin, Verdict},
    model::{Model, Plans},
    part::PartFigure,
    report::{Caution, DcLine, FigureRow, LimitRow, NoiseOrigin, Outcome, Report},
    solution::Solution,
    stage::{Source, Stage},
};

/// Points of a curve.
const POINTS: usize = 161;
/// Points of the output envelope.
const ENVELOPE_POINTS: usize = 41;
/// The extra-low-voltage limit for direct current: 60 V in dry locations (IEC 61140, from memory).
const EXTRA_LOW_VOLTAGE: f64 = 60.0;

/// Everything about a stage: figures, verdicts, curves, budgets, working.
///
/// # Errors
/// What [`check`] finds.
///
/// # Example
/// ```
/// use stageleaf_math::{analyse, figure::Figure, kind::Kind, part::{Part, PartFigure, Rating}, stage::*};
///
/// let mut part = Part::default();
/// part.state(PartFigure::OpenLoop, Rating::typical(1e6));
/// let stage = Stage {
///     name: "Times ten".into(),
///     kind: Kind::NonInverting,
///     components: vec![
///         Component { name: "Rf", value: Toleranced::exact(9e3) },
///         Component { name: "Rg", value: Toleranced::exact(1e3) },
///     ],
///     part,
///     isolation: Isolation::OutsideLoop,
///     supply: None, sources: vec![], signals: vec![], common_mode: None, reference: None, parts: vec![], load: Load::default(), board: Board::default(),
///     ambient: None, band: None, limits: vec![],
/// };
/// let report = analyse(&stage)?;
/// let gain = report.figures.iter().find(|f| f.query.figure == Figure::Gain).unwrap();
/// // By hand: 10/(1 + 10/1e6) = 9.9999
/// assert!((gain.nominal.value().unwrap() - 9.9999).abs() < 1e-6);
/// # Ok::<(), stageleaf_math::Error>(())
/// ```
pub fn analyse(stage: &Stage) -> Result<Report, Error> {
    analyse_in(stage, Detail::Full)
}

/// How much of the spread to work out.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Detail {
    /// What limits judge, with its ranges; the other figures at nominal values; no curve, no budget.
    Limits,
    /// The same with curves and budgets.
    Judged,
    /// Ranges of every figure.
    Full,
}

/// [`analyse`] with less detail, for a page that follows the hand: figures that no limit judges have no range and no basis.
///
/// # Errors
/// What [`check`] finds.
pub fn analyse_in(stage: &Stage, detail: Detail) -> Result<Report, Error> {
    analyse_with(stage, detail, &Plans::default())
}

/// [`analyse_in`], with what was compiled for earlier stages: an edit that only changes values compiles nothing.
///
/// # Errors
/// What [`check`] finds.
pub fn analyse_with(stage: &Stage, detail: Detail, plans: &Plans) -> Result<Report, Error> {
    check(stage)?;
    let model = Model::compile_with(stage, plans);
    let first = Solution::new(&model, model.parameters.nominal(), None);
    let near = first.roots().clone();
    let mut spread = Spread::new(&model, &near);
    let figures = queries(stage)
        .into_iter()
        .map(|query| {
            let judged = stage.limits.iter().any(|l| l.query == query);
            if judged || detail == Detail::Full {
                figure_row(&mut spread, query)
            } else {
                FigureRow {
                    query,
                    dimension: query.figure.dimension_in(stage.kind),
                    nominal: outcome(&spread.nominal, query),
                    range: None,
                    basis: None,
                }
            }
        })
        .collect();
    let limits: Vec<LimitRow> = stage.limits.iter().map(|limit| limit_row(&mut spread, limit)).collect();
    let mut report = Report {
        name: stage.name.clone(),
        figures,
        limits,
        response: Vec::new(),
        loop_gain: Vec::new(),
        density: Vec::new(),
        noise_shares: Vec::new(),
        dc_budget: if detail > Detail::Limits { dc_budget(&mut spread) } else { Vec::new() },
        envelope: Vec::new(),
        poles: Vec::new(),
        zeros: Vec::new(),
        working: working(&spread.nominal),
        cautions: cautions(&mut spread),
    };
    if detail > Detail::Limits {
        curves(&spread.nominal, &mut report);
    }
    Ok(report)
}

/// Whether the stage's values can be analysed at all.
///
/// # Errors
/// The first [`Error`] found: a missing component, a value that is zero, negative or not finite, reversed supplies or ranges.
pub fn check(stage: &Stage) -> Result<(), Error> {
    for spec in stage.kind.components() {
        match stage.component(spec.name) {
            None if spec.required => return Err(Error::MissingComponent { what: spec.name }),
            None => {}
            Some(value) => {
                component_value(spec.name, spec.dimension, value.nominal)?;
                tolerance(spec.name, value)?;
                if let Some(other) = spec.with
                    && stage.component(other).is_none()
                {
                    return Err(Error::Unpaired { given: spec.name, missing: other });
                }
            }
        }
    }
    for source in stage.sources.iter().flatten() {
        match source {
            Source::Resistive { resistance } => {
                if resistance.nominal < 0.0 || !resistance.nominal.is_finite() {
                    return Err(Error::Negative { what: "source.resistance", given: resistance.nominal });
                }
                tolerance("source.resistance", resistance)?;
            }
            Source::Capacitive { capacitance } => {
                positive("source.capacitance", capacitance.nominal)?;
                tolerance("source.capacitance", capacitance)?;
            }
            Source::Photodiode { capacitance, shunt_resistance, dark_current } => {
                positive("source.capacitance", capacitance.nominal)?;
                tolerance("source.capacitance", capacitance)?;
                if let Some(shunt) = shunt_resistance {
                    positive("source.shunt_resistance", shunt.nominal)?;
                    tolerance("source.shunt_resistance", shunt)?;
                }
                if let Some(dark) = dark_current {
                    if dark.nominal < 0.0 || !dark.nominal.is_finite() {
                        return Err(Error::Negative { what: "source.dark_current", given: dark.nominal });
                    }
                    tolerance("source.dark_current", dark)?;
                }
            }
        }
    }
    for (what, value) in [
        ("load.resistance", &stage.load.resistance),
        ("load.capacitance", &stage.load.capacitance),
        ("board.inverting_node", &stage.board.inverting_node),
        ("board.non_inverting_node", &stage.board.non_inverting_node),
        ("board.across_feedback", &stage.board.across_feedback),
    ] {
        if let Some(value) = value {
            positive(what, value.nominal)?;
            tolerance(what, value)?;
        }
    }
    if let Some(supply) = stage.supply {
        span("supply.positive", supply.positive.low, supply.positive.high)?;
        span("supply.negative", supply.negative.low, supply.negative.high)?;
        if supply.positive.low <= supply.negative.high {
            return Err(Error::SupplyReversed { positive: supply.positive.low, negative: supply.negative.high });
        }
    }
    if let Some(ambient) = stage.ambient {
        span("ambient.range", ambient.range.low, ambient.range.high)?;
        positive("ambient.range", ambient.range.low)?;
    }
    if let Some(band) = stage.band {
        positive("band.from", band.from)?;
        positive("band.to", band.to)?;
        span("band", band.from, band.to)?;
    }
    for signal in stage.signals.iter().flatten() {
        if signal.peak < 0.0 || !signal.peak.is_finite() {
            return Err(Error::Negative { what: "signal.peak", given: signal.peak });
        }
        if let Some(frequency) = signal.frequency {
            positive("signal.frequency", frequency)?;
        }
        positive("signal.crest_factor", signal.crest_factor)?;
    }
    if let Some(common) = stage.common_mode {
        span("signal.common_mode", common.low, common.high)?;
    }
    for limit in &stage.limits {
        if matches!(limit.query.figure.argument(), Argument::Frequency) {
            positive(limit.query.figure.id(), limit.query.at.unwrap_or(0.0))?;
        }
    }
    for amplifier in 0..stage.kind.spec().amplifiers {
        part(stage.part_of(amplifier))?;
    }
    Ok(())
}

/// What no amplifier has: a figure that is zero, negative or not finite where the model divides by it.
fn part(part: &crate::part::Part) -> Result<(), Error> {
    for &figure in PartFigure::ALL {
        let rating = part.rating(figure);
        let may_be_zero = matches!(
            figure,
            PartFigure::OutputResistance
                | PartFigure::DifferentialCapacitance
                | PartFigure::CommonModeCapacitance
                | PartFigure::Offset
                | PartFigure::OffsetDrift
                | PartFigure::BiasCurrent
                | PartFigure::OffsetCurrent
                | PartFigure::SupplyCurrent
                | PartFigure::SupplySpanMin
                | PartFigure::NoiseVoltage
                | PartFigure::NoiseVoltageCorner
                | PartFigure::NoiseCurrent
                | PartFigure::NoiseCurrentCorner
                | PartFigure::JunctionToAmbient
                | PartFigure::OverloadRecovery
        );
        let signed = matches!(figure, PartFigure::RangeFromNegative | PartFigure::RangeFromPositive);
        for value in [rating.min, rating.typ, rating.max].into_iter().flatten() {
            if !value.is_finite() || !signed && !may_be_zero && value <= 0.0 {
                return Err(Error::NotPositive { what: figure.id(), given: value });
            }
            if value.abs() > GREATEST || value != 0.0 && value.abs() < SMALLEST {
                return Err(Error::BeyondReason { what: figure.id(), given: value });
            }
            if may_be_zero && value < 0.0 {
                return Err(Error::Negative { what: figure.id(), given: value });
            }
        }
    }
    for &pole in part.poles.iter().flatten() {
        positive("gain.poles", pole)?;
    }
    for zero in &part.zeros {
        positive("gain.zeros", zero.frequency)?;
    }
    Ok(())
}

/// What no value of a circuit leaves, in SI units: beyond it sums of products lose their meaning before they lose their digits.
const SMALLEST: f64 = 1e-30;
/// See [`SMALLEST`].
const GREATEST: f64 = 1e30;

fn positive(what: &'static str, given: f64) -> Result<(), Error> {
    if !(given > 0.0 && given.is_finite()) {
        return Err(Error::NotPositive { what, given });
    }
    if (SMALLEST..=GREATEST).contains(&given) { Ok(()) } else { Err(Error::BeyondReason { what, given }) }
}

/// A component's value: what can be bought or built, with room to spare.
fn component_value(what: &'static str, dimension: Dimension, given: f64) -> Result<(), Error> {
    positive(what, given)?;
    let sane = if matches!(dimension, Dimension::Resistance) { 1e-6..=1e15 } else { 1e-18..=1e3 };
    if sane.contains(&given) { Ok(()) } else { Err(Error::BeyondReason { what, given }) }
}

fn tolerance(what: &'static str, value: &crate::stage::Toleranced) -> Result<(), Error> {
    let sane = |v: f64| v >= 0.0 && v.is_finite();
    if !sane(value.plus) || !sane(value.drift) || !sane(value.minus) {
        return Err(Error::Negative { what, given: value.minus.min(value.plus).min(value.drift) });
    }
    if value.minus >= 1.0 && value.nominal > 0.0 {
        return Err(Error::NotPositive { what, given: value.nominal * (1.0 - value.minus) });
    }
    Ok(())
}

fn span(what: &'static str, low: f64, high: f64) -> Result<(), Error> {
    if low <= high && low.is_finite() && high.is_finite() { Ok(()) } else { Err(Error::RangeReversed { what, low, high }) }
}

/// Figures without an argument, and those with one that limits name.
fn queries(stage: &Stage) -> Vec<Query> {
    let mut list = Vec::new();
    for &figure in Figure::ALL {
        if matches!(figure.argument(), Argument::None) {
            list.push(Query::of(figure));
        } else {
            for limit in &stage.limits {
                if limit.query.figure == figure && !list.contains(&limit.query) {
                    list.push(limit.query);
                }
            }
        }
    }
    list
}

fn range(low: &Extreme, high: &Extreme) -> Option<(f64, f64)> {
    Some((low.outcome.value()?, high.outcome.value()?))
}

fn figure_row(spread: &mut Spread<'_>, query: Query) -> FigureRow {
    let extremes = spread.extremes(query);
    let basis = extremes
        .centre
        .value()
        .map(|_| spread.basis(query, &extremes, Some(&extremes.low)).max(spread.basis(query, &extremes, Some(&extremes.high))));
    let dimension = query.figure.dimension_in(spread.kind());
    FigureRow { query, dimension, range: range(&extremes.low, &extremes.high), nominal: extremes.centre.clone(), basis }
}

fn limit_row(spread: &mut Spread<'_>, limit: &Limit) -> LimitRow {
    let query = limit.query;
    let extremes = spread.extremes(query);
    let nominal = extremes.centre.clone();
    let range = range(&extremes.low, &extremes.high);
    let room = |extreme: &Extreme, edge: f64, upper: bool| extreme.outcome.value().map(|v| if upper { edge - v } else { v - edge });
    // The side with less room decides; a side without a value decides at once.
    let (extreme, margin) = match limit.bound {
        Bound::Report => (&extremes.low, None),
        Bound::AtLeast(edge) => (&extremes.low, room(&extremes.low, edge, false)),
        Bound::AtMost(edge) => (&extremes.high, room(&extremes.high, edge, true)),
        Bound::Between { low, high } => match (room(&extremes.low, low, false), room(&extremes.high, high, true)) {
            (Some(a), Some(b)) if b < a => (&extremes.high, Some(b)),
            (Some(a), _) => (&extremes.low, Some(a)),
            (None, _) => (&extremes.low, None),
        },
    };
    let verdict = match (&extreme.outcome, limit.bound, margin) {
        (_, Bound::Report, _) => Verdict::Reported,
        (_, _, Some(margin)) if margin.is_nan() => Verdict::Undetermined,
        (_, _, Some(margin)) if margin < 0.0 => Verdict::Breaks,
        (_, _, Some(margin)) if margin < thin_below(limit) => Verdict::Thin,
        (_, _, Some(_)) => Verdict::Holds,
        (Outcome::Oscillates | Outcome::NoDcPath, ..) => Verdict::Breaks,
        _ => Verdict::Undetermined,
    };
    let extreme = extreme.clone();
    let basis = match limit.bound {
        Bound::Report => nominal.value().map(|_| spread.basis(query, &extremes, None)),
        _ => extreme.outcome.value().map(|_| spread.basis(query, &extremes, Some(&extreme))),
    };
    // What nominal values already miss, no parameter's spread uses up.
    let missed = match (nominal.value(), limit.bound) {
        (Some(v), Bound::AtLeast(edge)) => v < edge,
        (Some(v), Bound::AtMost(edge)) => v > edge,
        (Some(v), Bound::Between { low, high }) => v < low || v > high,
        _ => false,
    };
    let dominant = extreme.effects.iter().max_by(|a, b| a.1.abs().total_cmp(&b.1.abs())).map(|&(slot, _)| spread.parameter(slot));
    let corner = if matches!(limit.bound, Bound::Report) { Vec::new() } else { extreme.corner };
    LimitRow {
        limit: limit.clone(),
        dimension: query.figure.dimension_in(spread.kind()),
        range,
        worst: if matches!(limit.bound, Bound::Report) { nominal.clone() } else { extreme.outcome },
        nominal,
        margin,
        verdict,
        basis,
        corner,
        dominant: if missed || matches!(limit.bound, Bound::Report) { None } else { dominant },
    }
}

/// The margin below which a limit counts as thin, in the figure's unit.
#[must_use]
pub fn thin_below(limit: &Limit) -> f64 {
    match (limit.thin, limit.bound) {
        (Thin::Distance(distance), _) => distance,
        (Thin::Fraction(f), Bound::AtLeast(edge) | Bound::AtMost(edge)) => f * edge.abs(),
        (Thin::Fraction(f), Bound::Between { low, high }) => f * (high - low) / 2.0,
        (Thin::Fraction(_), Bound::Report) => 0.0,
    }
}

/// Each cause's magnitude at nominal values and where the whole offset is greatest, so that the lines add up to it. Where the whole
/// lacks data, each line at its own worst: part figures at their worse ends, at whichever ends of temperature and supply.
fn dc_budget(spread: &mut Spread<'_>) -> Vec<DcLine> {
    let lines = dc::budget(&spread.nominal).lines.clone();
    let at_greatest = spread.at_greatest(Query::of(Figure::OutputOffset)).map(|build| dc::budget(&build).lines.clone());
    let extremes: Vec<_> = match at_greatest {
        Some(_) => Vec::new(),
        None => spread.dc_corners().iter().map(|build| dc::budget(build).lines.clone()).collect(),
    };
    lines
        .into_iter()
        .enumerate()
        .map(|(i, (cause, nominal))| {
            let mut worst = at_greatest.as_ref().map_or_else(|| nominal.clone(), |there| there[i].1.clone());
            for there in &extremes {
                if let (Some(so_far), Some(here)) = (worst.value(), there[i].1.value())
                    && here > so_far
                {
                    worst = Outcome::Value(here);
                }
            }
            DcLine { cause, nominal, worst }
        })
        .collect()
}

fn working(solution: &Solution<'_>) -> Vec<crate::report::Working> {
    let stage = solution.model.stage;
    let mut lines = (stage.kind.spec().working)(stage);
    lines.retain(|l| l.handbook.is_finite());
    for line in &mut lines {
        line.dimension = line.query.figure.dimension_in(stage.kind);
        line.exact = outcome(solution, line.query);
    }
    lines.extend(full_power(solution));
    lines
}

/// The handbook's full-power bandwidth beside ours.
fn full_power(solution: &Solution<'_>) -> Option<crate::report::Working> {
    let signal = solution.model.stage.signal()?;
    let slew = solution.part(PartFigure::SlewRise)?.min(solution.part(PartFigure::SlewFall)?);
    let amplitude = response::reference(solution).gain.abs() * signal.peak;
    if !(amplitude > 0.0 && amplitude.is_finite()) {
        return None;
    }
    let query = Query::of(Figure::FullPowerBandwidth);
    Some(crate::report::Working {
        query,
        dimension: Dimension::Frequency,
        formula: "f = SR/(2π·Vpk)",
        numbers: alloc::vec![("SR", slew, Dimension::SlewRate), ("Vpk", amplitude, Dimension::Voltage)],
        handbook: slew / (core::f64::consts::TAU * amplitude),
        exact: outcome(solution, query),
        source: "common practice, no source; the steepest slope of a sine is 2πf·Vpk",
        difference: "the drop in the output resistance, and the output current where it ends first",
    })
}

fn cautions(spread: &mut Spread<'_>) -> Vec<Caution> {
    let solution = &spread.nominal;
    let model = solution.model;
    let stage = model.stage;
    let mut list = Vec::new();
    for figure in [PartFigure::DifferentialResistance, PartFigure::CommonModeResistance] {
        if solution.part(figure).is_none() {
            list.push(Caution::TakenAsIdeal(figure));
        }
    }
    if let (Some(needed), None) = (solution.part(PartFigure::StableGainMin), analysis::missing_small_signal(solution))
        && let Some(crossover) = margins::margins(solution).crossover
    {
        let (above, below) = solution.amplifier(margins::margins(solution).amplifier);
        let omega = solution.scaled(crossover);
        // At crossover |A·β| = 1, so the noise gain there is |A|.
        let noise_gain = crate::solution::magnitude(above.at(omega) / below.at(omega));
        if noise_gain < needed {
            list.push(Caution::BelowStableGain { noise_gain, needed });
        }
    }
    if stage.part.phase_reversal == Some(true) {
        list.push(Caution::PhaseReversal);
    }
    if let Some(supply) = stage.supply {
        let (least, greatest) = (supply.positive.low - supply.negative.high, supply.positive.high - supply.negative.low);
        let allowed = |figure: PartFigure| solution.part(figure);
        if let Some(allowed) = allowed(PartFigure::SupplySpanMax)
            && greatest > allowed
        {
            list.push(Caution::SupplySpan { span: greatest, allowed });
        }
        if let Some(allowed) = allowed(PartFigure::SupplySpanMin)
            && least < allowed
        {
            list.push(Caution::SupplySpan { span: least, allowed });
        }
        if greatest > EXTRA_LOW_VOLTAGE {
            list.push(Caution::HighVoltage { span: greatest });
        }
    }
    if analysis::missing_small_signal(solution).is_none() && !solution.no_dc_path() && !solution.oscillates() {
        for (origin, power) in thermal::resistors(solution) {
            if let NoiseOrigin::Component(component) = origin
                && let Some(rating) = stage.component(component).and_then(|c| c.rating)
                && power > rating
            {
                list.push(Caution::ResistorHot { component, power, rating });
            }
        }
    }
    if analysis::missing_small_signal(solution).is_none() && !solution.no_dc_path() {
        if solution.oscillates() {
            list.push(Caution::Oscillates);
        } else {
            for (figure, edge) in
                [(Figure::ClipMargin, 0.0), (Figure::InputRangeMargin, 0.0), (Figure::CurrentMargin, 0.0), (Figure::SlewMargin, 1.0)]
            {
                if let Some(margin) = outcome(solution, Query::of(figure)).value()
                    && margin < edge
                {
                    list.push(Caution::Exceeded { figure, margin });
                }
            }
            if let (Some(offset), Some(supply)) = (outcome(solution, Query::of(Figure::OutputOffset)).value(), stage.supply)
                && offset > supply.positive.nominal - supply.negative.nominal
            {
                list.push(Caution::OffsetBeyondSupply { offset });
            }
        }
    }
    let exact: Vec<_> = stage.components.iter().filter(|c| c.value.minus + c.value.plus <= 0.0).map(|c| c.name).collect();
    if !exact.is_empty() {
        list.push(Caution::TakenAsExact(exact));
    }
    let junction_max = solution.part(PartFigure::JunctionMax);
    if let Some(allowed) = junction_max
        && let Some(junction) = spread.extremes(Query::of(Figure::JunctionTemperature)).high.outcome.value()
        && junction > allowed
    {
        list.push(Caution::JunctionHot { junction, allowed });
    }
    list
}

fn curves(solution: &Solution<'_>, report: &mut Report) {
    if analysis::missing_small_signal(solution).is_some() || solution.no_dc_path() {
        return;
    }
    let roots = solution.roots();
    report.poles = response::unscaled(solution, &roots.poles);
    report.zeros = response::unscaled(solution, &roots.zeros);
    let loop_edge = margins::margins(solution).crossover;
    let (from, to) = window(solution, loop_edge);
    let looped = solution.looped();
    let worst = margins::margins(solution).amplifier;
    report.loop_gain = response::curve(solution, &looped.returned[worst], &looped.open[worst], from, to, POINTS);
    if solution.oscillates() {
        return;
    }
    let load = solution.load_numerator();
    report.response = response::curve(solution, load, &looped.closed, from, to, POINTS);
    if outcome(solution, Query::at(Figure::NoiseDensityAt, 1e3)).value().is_some() {
        report.noise_shares = noise::shares(solution);
        let (low, high) = solution.model.stage.band.map_or((from, to), |b| (f64::min(b.from, from), f64::max(b.to, to)));
        report.density = noise::curve(solution, low, high, POINTS, &report.noise_shares);
    }
    if solution.model.stage.signal().is_some() {
        report.envelope = swing::envelope(solution, from, to, ENVELOPE_POINTS);
    }
}

/// Whole decades around what the response and the loop do.
fn window(solution: &Solution<'_>, crossover: Option<f64>) -> (f64, f64) {
    let bandwidth = response::edges(solution).bandwidth;
    let mut low = crossover.unwrap_or(f64::INFINITY).min(bandwidth);
    let mut high = crossover.unwrap_or(0.0).max(if bandwidth.is_finite() { bandwidth } else { 0.0 });
    if let Some(frequency) = solution.model.stage.signal().and_then(|s| s.frequency) {
        low = low.min(frequency);
        high = high.max(frequency);
    }
    if !(low.is_finite() && low > 0.0 && high > 0.0) {
        (low, high) = (1e3, 1e6);
    }
    let decade = |x: f64| libm::pow(10.0, x);
    (decade(libm::floor(libm::log10(low)) - 2.0), decade(libm::ceil(libm::log10(high)) + 1.0))
}
