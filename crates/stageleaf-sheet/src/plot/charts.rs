//! Which charts a report holds, as data.

use super::axis::{Axis, Unit, tick_step};
use crate::Sheet;
use stageleaf_math::{
    dimension::Dimension,
    figure::Figure,
    report::{DensityPoint, EnvelopePoint, NoiseOrigin, Report, ResponsePoint, TransferPoint},
};

/// Curves of a chart are thinned to this many points.
const MOST_POINTS: usize = 200;
/// Density curves shown beside the total.
pub const MOST_SOURCES: usize = 4;

/// A curve.
#[derive(Clone, Debug)]
pub struct Curve {
    /// What it shows.
    pub name: String,
    /// Its values, in the chart's unit; not finite where there is none.
    pub y: Vec<f64>,
}

/// A marked point, or a span between two heights.
#[derive(Clone, Debug)]
pub struct Mark {
    /// Hz.
    pub x: f64,
    /// Height in the chart's unit.
    pub y: f64,
    /// Other end of a vertical span.
    pub to: Option<f64>,
    /// Its words.
    pub text: String,
    /// Where the words stand.
    pub words: Words,
}

/// Where a mark's words stand, so that no curve runs through them.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Words {
    /// Above the point, or below it near the right edge.
    Above,
    /// Below the point, where a bound runs above it.
    Below,
    /// Before a curve that rises through the point.
    Rising,
    /// Behind a curve that falls through the point.
    Falling,
    /// Left of the point.
    Left,
    /// Right of the point.
    Right,
}

/// What most charts are over.
const HERTZ: Dimension = Dimension::Frequency;

/// A chart against frequency, or against the signal.
#[derive(Clone, Debug)]
pub struct Chart {
    /// `response-magnitude`: the value of `data-plot`.
    pub id: &'static str,
    /// Title of the vertical axis, with its unit.
    pub title: &'static str,
    /// Hz, or V of the signal.
    pub x: Vec<f64>,
    /// Curves over `x`.
    pub curves: Vec<Curve>,
    /// Marked points.
    pub marks: Vec<Mark>,
    /// Level drawn as a reference line.
    pub reference: Option<f64>,
    /// What `x` measures.
    pub over: Dimension,
    /// Unit of the heights.
    pub unit: Unit,
    /// Frequencies, or the signal.
    pub x_axis: Axis,
    /// Heights.
    pub y_axis: Axis,
}

/// Ids of all charts, in the sheet's order.
pub const IDS: [&str; 7] = ["transfer", "response-magnitude", "response-phase", "loop-magnitude", "loop-phase", "noise", "envelope"];

/// The charts that the report has data for, by the start of their id.
#[must_use]
pub fn charts(sheet: &Sheet, start: &str) -> Vec<Chart> {
    IDS.iter().filter(|id| id.starts_with(start)).filter_map(|id| chart(sheet, id)).collect()
}

/// One chart, if the report has data for it.
#[must_use]
pub fn chart(sheet: &Sheet, id: &str) -> Option<Chart> {
    let r = sheet.report;
    match id {
        "transfer" => transfer(r),
        "response-magnitude" => response(sheet),
        "response-phase" => phase("response-phase", &r.response, Vec::new(), None),
        "loop-magnitude" => {
            let marks = nominal(r, Figure::Crossover).map(|x| Mark {
                x,
                y: 0.0,
                to: None,
                text: format!("crossover {}", stageleaf_note::format(x, Dimension::Frequency, 3)),
                words: Words::Above,
            });
            magnitude("loop-magnitude", "loop gain |T|, dB", &r.loop_gain, marks.into_iter().collect(), Some(0.0), 160.0)
        }
        "loop-phase" => phase("loop-phase", &r.loop_gain, phase_margin_mark(r).into_iter().collect(), Some(-180.0)),
        "noise" => noise(sheet),
        "envelope" => envelope(sheet),
        _ => None,
    }
}

fn thinned<T>(points: &[T]) -> impl Iterator<Item = &T> {
    let step = points.len().div_ceil(MOST_POINTS).max(1);
    let last = points.len().saturating_sub(1);
    points.iter().enumerate().filter(move |(i, _)| i % step == 0 || *i == last).map(|(_, p)| p)
}

fn x_axis(x: &[f64]) -> Option<Axis> {
    Axis::decades(x.iter().copied(), false)
}

fn magnitude(
    id: &'static str,
    title: &'static str,
    points: &[ResponsePoint],
    marks: Vec<Mark>,
    reference: Option<f64>,
    depth: f64,
) -> Option<Chart> {
    let x: Vec<f64> = thinned(points).map(|p| p.frequency).collect();
    let y: Vec<f64> = thinned(points).map(|p| decibels(p.magnitude)).collect();
    let x_axis = x_axis(&x)?;
    let y_axis = Axis::linear(y.iter().copied().chain(reference), depth, None)?;
    let curves = vec![Curve { name: "magnitude".into(), y }];
    Some(Chart { id, title, x, curves, marks, reference, over: HERTZ, unit: Unit::Decibel, x_axis, y_axis })
}

fn phase(id: &'static str, points: &[ResponsePoint], marks: Vec<Mark>, reference: Option<f64>) -> Option<Chart> {
    let x: Vec<f64> = thinned(points).map(|p| p.frequency).collect();
    let y: Vec<f64> = thinned(points).map(|p| p.phase.to_degrees()).collect();
    let x_axis = x_axis(&x)?;
    let probe = Axis::linear(y.iter().copied().chain(reference), 2000.0, None)?;
    let step = if probe.high - probe.low > 300.0 { 90.0 } else { 45.0 };
    let y_axis = Axis::linear(y.iter().copied().chain(reference), 2000.0, Some(step))?;
    let curves = vec![Curve { name: "phase".into(), y }];
    Some(Chart { id, title: "phase, °", x, curves, marks, reference, over: HERTZ, unit: Unit::Degree, x_axis, y_axis })
}

impl Chart {
    /// What the chart is over, in a word.
    #[must_use]
    pub fn over_name(&self) -> &'static str {
        if self.over == Dimension::Voltage { "signal" } else { "frequency" }
    }

    /// One of its places, as text.
    #[must_use]
    pub fn place_text(&self, x: f64) -> String {
        stageleaf_note::format(x, self.over, if self.over == Dimension::Voltage { 4 } else { 3 })
    }
}

/// A comparator's output on both branches, with its thresholds.
fn transfer(r: &Report) -> Option<Chart> {
    let x: Vec<f64> = r.transfer.iter().map(|p| p.input).collect();
    let branch = |name: &str, of: fn(&TransferPoint) -> f64| Curve { name: name.into(), y: r.transfer.iter().map(of).collect() };
    let curves = vec![branch("rising signal", |p| p.rising), branch("falling signal", |p| p.falling)];
    // From end to end, so that the branches' names stand beside their ends.
    let (from, to) = (*x.first()?, *x.last()?);
    let x_axis = Axis { low: from, high: to, step: Some(tick_step(to - from)) };
    let y_axis = Axis::linear(curves.iter().flat_map(|c| c.y.iter().copied()), f64::INFINITY, None)?;
    let (low, high) = curves.iter().flat_map(|c| &c.y).fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
    let thresholds = [(Figure::ThresholdLow, "falling", Words::Left), (Figure::ThresholdHigh, "rising", Words::Right)];
    let mark = |(figure, way, words): (Figure, &str, Words)| {
        let x = nominal(r, figure)?;
        let text = format!("{way} {}", stageleaf_note::format(x, Dimension::Voltage, 4));
        Some(Mark { x, y: f64::midpoint(low, high), to: None, text, words })
    };
    let marks = thresholds.into_iter().filter_map(mark).collect();
    let unit = Unit::Si(Dimension::Voltage);
    Some(Chart {
        id: "transfer",
        title: "output at the load, V",
        x,
        curves,
        marks,
        reference: None,
        over: Dimension::Voltage,
        unit,
        x_axis,
        y_axis,
    })
}

/// The transfer's magnitude: in dB where it is a ratio, else in its own unit on an axis of decades.
fn response(sheet: &Sheet) -> Option<Chart> {
    let r = sheet.report;
    let (id, dimension) = ("response-magnitude", sheet.block.stage.kind.spec().gain);
    let title = match dimension {
        Dimension::Resistance => "transimpedance, Ω",
        Dimension::VoltsPerCoulomb => "charge gain, V/C",
        _ => return magnitude(id, "magnitude, dB", &r.response, edge_marks(r, decibels), None, 100.0),
    };
    let x: Vec<f64> = thinned(&r.response).map(|p| p.frequency).collect();
    let y: Vec<f64> = thinned(&r.response).map(|p| p.magnitude).collect();
    let x_axis = x_axis(&x)?;
    // A quarter more, so that a flat curve never runs along the frame.
    let mut y_axis = Axis::decades(y.iter().flat_map(|v| [*v, 1.25 * v]), true)?;
    y_axis.low = y_axis.low.max(y_axis.high * 1e-5);
    let (curves, marks) = (vec![Curve { name: "magnitude".into(), y }], edge_marks(r, |m| m));
    Some(Chart { id, title, x, curves, marks, reference: None, over: HERTZ, unit: Unit::Si(dimension), x_axis, y_axis })
}

/// Where the response has fallen by 3 dB from the gain; `height` takes a magnitude to the chart's unit.
fn edge_marks(r: &Report, height: impl Fn(f64) -> f64) -> Vec<Mark> {
    let Some(gain) = nominal(r, Figure::Gain) else { return Vec::new() };
    let y = height(gain.abs() * std::f64::consts::FRAC_1_SQRT_2);
    let edges = [(Figure::LowCutoff, Words::Rising), (Figure::Bandwidth, Words::Falling)];
    let marks = edges.into_iter().filter_map(|(figure, words)| {
        let x = nominal(r, figure)?;
        Some(Mark { x, y, to: None, text: format!("−3 dB at {}", stageleaf_note::format(x, Dimension::Frequency, 3)), words })
    });
    marks.collect()
}

fn phase_margin_mark(r: &Report) -> Option<Mark> {
    let (x, margin) = (nominal(r, Figure::Crossover)?, nominal(r, Figure::PhaseMargin)?);
    let text = format!("phase margin {}", stageleaf_note::format(margin, Dimension::Angle, 3));
    Some(Mark { x, y: margin.to_degrees() - 180.0, to: Some(-180.0), text, words: Words::Above })
}

fn noise(sheet: &Sheet) -> Option<Chart> {
    let r = sheet.report;
    // Far above the response's edge and the band there is nothing to see.
    let edge = nominal(r, Figure::Bandwidth).map(|f| 10.0 * f);
    let end = edge.map_or(f64::INFINITY, |f| f.max(sheet.block.stage.band.map_or(0.0, |b| b.to)) * 1.001);
    let points: Vec<&DensityPoint> = thinned(&r.density).filter(|p| p.frequency <= end).collect();
    let x: Vec<f64> = points.iter().map(|p| p.frequency).collect();
    let mut curves = vec![Curve { name: "total".into(), y: points.iter().map(|p| p.total).collect() }];
    let mut order: Vec<usize> = (0..r.noise_shares.len()).collect();
    order.sort_by(|a, b| r.noise_shares[*b].share.total_cmp(&r.noise_shares[*a].share));
    for k in order.into_iter().take(MOST_SOURCES) {
        let y = points.iter().map(|p| p.by_source.get(k).copied().unwrap_or(f64::NAN)).collect();
        curves.push(Curve { name: short_name(r.noise_shares[k].origin), y });
    }
    let x_axis = x_axis(&x)?;
    let mut y_axis = Axis::decades(curves.iter().flat_map(|c| c.y.iter().copied()), true)?;
    y_axis.low = y_axis.low.max(y_axis.high * 1e-5);
    curves.retain(|c| c.y.iter().any(|v| *v >= y_axis.low));
    let unit = Unit::Si(Dimension::VoltageDensity);
    Some(Chart {
        id: "noise",
        title: "density at the output, V/√Hz",
        x,
        curves,
        marks: Vec::new(),
        reference: None,
        over: HERTZ,
        unit,
        x_axis,
        y_axis,
    })
}

/// A source's name beside its curve; the table of shares has the whole one.
fn short_name(origin: NoiseOrigin) -> String {
    let of = |what: &str, a: u8| if a == 0 { what.to_owned() } else { format!("{what}, A{}", u32::from(a) + 1) };
    match origin {
        NoiseOrigin::AmplifierVoltage(a) => return of("voltage noise", a),
        NoiseOrigin::CurrentNonInverting(a) => return of("current noise +", a),
        NoiseOrigin::CurrentInverting(a) => return of("current noise −", a),
        NoiseOrigin::Component(name) => name,
        NoiseOrigin::SourceResistance(_) => "source",
        NoiseOrigin::SourceShot(_) => "shot noise",
        NoiseOrigin::ReferenceResistance => "reference",
        NoiseOrigin::LoadResistance => "load",
        NoiseOrigin::ConverterSeries => "Radc",
    }
    .to_owned()
}

fn envelope(sheet: &Sheet) -> Option<Chart> {
    let r = sheet.report;
    let mut marks = Vec::new();
    if let Some(signal) = sheet.block.stage.signal()
        && let (Some(x), Some(gain)) = (signal.frequency, nominal(r, Figure::GainAtSignal).or_else(|| nominal(r, Figure::Gain)))
    {
        let y = signal.peak * gain.abs();
        if x.is_finite() && y.is_finite() && y > 0.0 {
            marks.push(Mark {
                x,
                y,
                to: None,
                text: format!("signal {}", stageleaf_note::format(y, Dimension::Voltage, 3)),
                words: Words::Below,
            });
        }
    }
    // The lowest of the bounds that there are decides; how far the others rise above it is of no use, nor is what it falls to
    // far below its best, nor where no bound is known.
    let lowest =
        |p: &EnvelopePoint| [p.rails, p.current, p.slew].into_iter().flatten().filter(|v| v.is_finite()).fold(f64::INFINITY, f64::min);
    let best = thinned(&r.envelope).map(lowest).filter(|v| v.is_finite()).fold(0.0, f64::max);
    let floor = marks.iter().fold(best * 1e-3, |floor, m| floor.min(m.y / 2.0));
    let last = marks.iter().fold(0.0, |last: f64, m| last.max(10.0 * m.x));
    let wanted = |p: &&EnvelopePoint| lowest(p).is_finite() && (lowest(p) >= floor || p.frequency <= last);
    let points: Vec<&EnvelopePoint> = thinned(&r.envelope).filter(wanted).collect();
    let x: Vec<f64> = points.iter().map(|p| p.frequency).collect();
    let mut curves = vec![Curve { name: "clean output".into(), y: points.iter().map(|p| lowest(p)).collect() }];
    for (name, pick) in
        [("rails", (|p| p.rails) as fn(&EnvelopePoint) -> Option<f64>), ("current", |p| p.current), ("slew rate", |p| p.slew)]
    {
        let y: Vec<f64> = points.iter().map(|p| pick(p).unwrap_or(f64::NAN)).collect();
        if y.iter().any(|v| v.is_finite()) {
            curves.push(Curve { name: name.into(), y });
        }
    }
    let x_axis = x_axis(&x)?;
    let mut y_axis = Axis::decades(points.iter().map(|p| lowest(p)).chain(marks.iter().map(|m| m.y)), true)?;
    y_axis.high *= 2.0;
    y_axis.low = y_axis.low.max(y_axis.high * 1e-5);
    let unit = Unit::Si(Dimension::Voltage);
    Some(Chart {
        id: "envelope",
        title: "largest clean output, V peak",
        x,
        curves,
        marks,
        reference: None,
        over: HERTZ,
        unit,
        x_axis,
        y_axis,
    })
}

/// A figure at nominal values, if it has a finite one.
#[must_use]
pub fn nominal(r: &Report, figure: Figure) -> Option<f64> {
    r.figures.iter().find(|f| f.query.figure == figure).and_then(|f| f.nominal.value()).filter(|v| v.is_finite())
}

fn decibels(magnitude: f64) -> f64 {
    20.0 * libm::log10(magnitude)
}
