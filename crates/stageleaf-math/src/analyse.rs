//! From a stage to its report.

use alloc::vec::Vec;

use crate::{
    Error,
    analysis::{
        self, dc, margins, noise, outcome, response,
        spread::{Extreme, Spread},
        swing, switching,
    },
    caution, check,
    figure::{Argument, Figure, Query, Scope},
    kind::{Drives, Feed},
    limit::{Bound, Limit, Thin, Verdict},
    measured,
    model::{Model, Plans},
    report::{DcLine, FigureRow, LimitRow, Outcome, Report},
    rules,
    solution::{Roots, Solution},
    stage::{Converter, Stage},
};

/// Points of a curve.
const POINTS: usize = 161;
/// Points of the output envelope.
const ENVELOPE_POINTS: usize = 41;

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
///     supply: None, sources: vec![], signals: vec![], common_mode: None, reference: None, parts: vec![], load: Load::default(), converter: Converter::default(), board: Board::default(),
///     ambient: None, band: None, limits: vec![], measured: vec![],
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
    /// What limits judge, with its ranges; the other figures at nominal values, waveforms' left out; no curve, no budget.
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
    // A comparator rests at its limits, where its poles say nothing.
    let switches = stage.kind.switches();
    let near = if switches { Roots::default() } else { first.roots() };
    let mut spread = Spread::new(&model, &near);
    let queries = queries(stage);
    // A waveform takes some hundred times what other figures take: its range is sought where a limit asks for it.
    let costly = |query: &Query| matches!(query.figure, Figure::SlewClipDistortion | Figure::Overshoot);
    let judged = |query: &Query| detail == Detail::Full && !costly(query) || stage.limits.iter().any(|l| l.query == *query);
    spread.prepare(queries.iter().copied().filter(judged));
    let figures = queries
        .into_iter()
        // While the hand moves, what is costly and judged by nothing waits.
        .filter(|query| detail > Detail::Limits || !costly(query) || judged(query))
        .map(|query| {
            if judged(&query) {
                figure_row(&mut spread, query)
            } else {
                let nominal = outcome(&spread.nominal, query);
                FigureRow {
                    query,
                    dimension: query.figure.dimension_in(stage.kind),
                    amplifier: whose(&spread.nominal, query, &nominal),
                    nominal,
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
        measured: if detail > Detail::Limits { measured::compared(stage, plans)? } else { Vec::new() },
        response: Vec::new(),
        transfer: Vec::new(),
        loop_gain: Vec::new(),
        density: Vec::new(),
        noise_shares: Vec::new(),
        dc_budget: if detail > Detail::Limits && !switches { dc_budget(&mut spread) } else { Vec::new() },
        envelope: Vec::new(),
        poles: Vec::new(),
        zeros: Vec::new(),
        working: Vec::new(),
        cautions: caution::cautions(&mut spread),
    };
    if switches && detail > Detail::Limits {
        report.transfer = switching::transfer(&spread.nominal);
        report.working = rules::working(&spread.nominal, &report.figures);
    } else if detail > Detail::Limits {
        curves(&spread.nominal, &mut report);
        report.working = rules::working(&spread.nominal, &report.figures);
    }
    Ok(report)
}

/// Figures without an argument (gain and its error from every signal's input), and those with one that limits name.
fn queries(stage: &Stage) -> Vec<Query> {
    let mut list = Vec::new();
    let spec = stage.kind.spec();
    let signals = (spec.inputs)(stage).iter().skip(1).filter(|i| i.feed != Feed::Supply && matches!(spec.drives, Drives::Each));
    for &figure in Figure::ALL {
        let silent = figure.is_of_converter() && stage.converter == Converter::default();
        if matches!(figure.argument(), Argument::None) && !silent {
            list.push(Query::of(figure));
            if matches!(figure, Figure::Gain | Figure::GainError) {
                list.extend(signals.clone().map(|input| Query::of(figure).from_input(input.name)));
            }
        }
        for limit in &stage.limits {
            if limit.query.figure == figure && !list.contains(&limit.query) {
                list.push(limit.query);
            }
        }
    }
    list
}

/// The amplifier, from 1, that makes a figure what it is, where it is the worst of several.
fn whose(solution: &Solution<'_>, query: Query, found: &Outcome) -> Option<u8> {
    if query.of.is_some() || query.figure.scope() != Scope::Amplifier || solution.amplifiers() < 2 {
        return None;
    }
    (1u8..).take(solution.amplifiers()).find(|&number| outcome(solution, query.of_amplifier(number)) == *found)
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
    let amplifier = whose(&spread.nominal, query, &extremes.centre);
    FigureRow { query, dimension, range: range(&extremes.low, &extremes.high), nominal: extremes.centre.clone(), basis, amplifier }
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
        (Outcome::Oscillates | Outcome::NoDcPath(_) | Outcome::NoSteadyTemperature, ..) => Verdict::Breaks,
        _ => Verdict::Undetermined,
    };
    let mut extreme = extreme.clone();
    let (verdict, margin) = match extreme.outcome {
        Outcome::Value(least) if query.is_lower_bound() && matches!(verdict, Verdict::Holds | Verdict::Thin) => {
            extreme.outcome = Outcome::AtLeast(least);
            (Verdict::Undetermined, None)
        }
        _ => (verdict, margin),
    };
    let amplifier = match limit.bound {
        Bound::Report => whose(&spread.nominal, query, &nominal),
        _ => whose(&spread.at(&extreme), query, &extreme.outcome),
    };
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
        amplifier,
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

fn curves(solution: &Solution<'_>, report: &mut Report) {
    if analysis::missing_small_signal(solution).is_some() || solution.no_dc_path().is_some() {
        return;
    }
    report.poles = response::unscaled(solution, solution.poles());
    report.zeros = response::unscaled(solution, &solution.features().zeros);
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
