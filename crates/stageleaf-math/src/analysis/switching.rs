//! Comparators with hysteresis: thresholds, output levels, and what both states ask of the parts around them.
//!
//! # Formula
//! While the output rests at a level, pin voltage and network are at rest (see [`crate::network::steady`]), and every voltage is linear
//! in the signal `Vs` and the pin's voltage `Vo`. The level: `Vo = V₊ − h(I)` or `V₋ + h(−I)`, `h` the headroom at the pin's own
//! current, solved on the straight pieces of its table. The threshold: the `Vs` at which the amplifier leaves that level, which is where
//! `Ve + V⁺ − V⁻ = (Vo + I·Ro − Vm)/A0` with `Vm` the middle between the rails. `Ve` gathers offset, drift and supply deviation over
//! rejection; the input currents flow into the network. Response: `overload recovery + |ΔVo|/min(SR, (I_lim − |I|)/C)`.
//!
//! # Units
//! V at the signal's source for thresholds, V at the load for levels, s.
//!
//! # Does not apply
//! - Data sheets give errors as magnitudes: at nominal values they are none, and the worst case takes them with either sign, all
//!   together but for the common-mode error, which has its own.
//! - The response is that of an amplifier driven far enough to slew all the way; just beyond a threshold it takes longer, and a filter
//!   at the input adds its own delay.
//! - Headroom is that of the first amplifier's part; the output stage's own slowness near the rails is part of overload recovery.
//!
//! # Source
//! Derived here. Checked in `tests/outside/`.

use alloc::{vec, vec::Vec};

use super::{Missing, dc, noise, swing, swing::Drive};
use crate::{
    figure::Figure,
    kind::Sense,
    model::Model,
    network::{Element, Law, Node, steady},
    part::{Headroom, PartFigure},
    report::{Need, NoiseOrigin, Outcome, Parameter, TransferPoint},
    solution::Solution,
    stage::Stage,
};

/// Why a comparator has none of the figures of a linear stage.
pub const TWO_LEVELS: &str = "a comparator's output rests at one of two levels";
/// Why a linear stage has none of a comparator's.
pub const FOLLOWS: &str = "the output follows the signal: comparators have thresholds";

const WEAK: &str = "there is no hysteresis: the positive feedback is weaker than what the open-loop gain asks";
const NO_ROOM: &str = "the headrooms leave the output no room between the rails";
const NO_SIGNAL: &str = "no signal reaches the amplifier's input at DC";
const BEYOND_RANGE: &str = "at the threshold an input lies outside its range";
const BEYOND_SIGNAL: &str = "the signal's range does not reach the threshold";
const NO_CURRENT: &str = "the load takes the whole output current, and its capacitance is not charged";

/// Whether a figure is one of a comparator's own.
#[must_use]
pub const fn is_own(figure: Figure) -> bool {
    use Figure as F;
    matches!(figure, F::ThresholdHigh | F::ThresholdLow | F::Hysteresis | F::ResponseTime | F::OutputHigh | F::OutputLow)
}

/// What is linear in signal and output.
#[derive(Clone, Copy, Debug)]
struct Line {
    /// With both at zero.
    base: f64,
    /// Per volt of the signal.
    signal: f64,
    /// Per volt at the pin.
    output: f64,
}

impl Line {
    fn at(self, signal: f64, output: f64) -> f64 {
        self.base + self.signal * signal + self.output * output
    }

    fn map2(self, other: Self, f: impl Fn(f64, f64) -> f64) -> Self {
        Self { base: f(self.base, other.base), signal: f(self.signal, other.signal), output: f(self.output, other.output) }
    }
}

/// A build at rest.
#[derive(Clone, Debug)]
pub struct Switch {
    /// For output at zero, per volt of the signal, per volt at the pin.
    volts: [steady::Voltages; 3],
    /// Current out of the pin.
    current: Line,
    rails: [f64; 2],
    position: f64,
    /// The signal at which the amplifier leaves a level, and the level, at the low and at the high one.
    edges: [(f64, f64); 2],
    sense: Sense,
}

/// A state of the stage: the signal, whether the output is high, the pin's voltage.
#[derive(Clone, Copy, Debug)]
struct Point {
    signal: f64,
    high: bool,
    output: f64,
}

/// The build at rest, worked out once.
pub fn switch<'s>(solution: &'s Solution<'_>) -> &'s Result<Switch, Outcome> {
    solution.switch.get_or_init(|| Switch::of(solution, true))
}

impl Switch {
    /// Solves a build; without the amplifier's input errors where only levels and currents are asked (the bias current depends on the heat
    /// that these make).
    fn of(solution: &Solution<'_>, errors: bool) -> Result<Self, Outcome> {
        let model = solution.model;
        let values = &solution.values;
        let network = &model.network;
        let amplifier = network.amplifiers[0];
        let Some(sense) = model.stage.kind.spec().switching else { return Err(Outcome::DoesNotApply(FOLLOWS)) };
        let Some((positive, negative)) = model.parameters.supply() else { return Err(Outcome::Undetermined(vec![Need::Supply])) };
        if let Some(terminal) = model.floating.input {
            return Err(Outcome::NoDcPath(terminal));
        }
        let rails = [values[negative], values[positive]];
        let reference = model.parameters.slot(Parameter::ReferenceVoltage).map_or(0.0, |slot| values[slot]);
        let mesh = steady::Mesh::of(network, values);
        let (signal_node, reference_node) = (network.input_node(0), network.input_node(1));
        let solve = |signal: f64, reference: f64, output: f64, injected: &[(Node, f64)]| {
            let held = [(signal_node, signal), (reference_node, reference), (amplifier.pin, output)];
            mesh.solve(&held, injected)
        };
        let mut base = solve(0.0, reference, 0.0, &[]);
        let (by_signal, by_output) = (solve(1.0, 0.0, 0.0, &[]), solve(0.0, 0.0, 1.0, &[]));
        let mut volts_in_series = 0.0;
        let mut rejection = 0.0;
        if errors {
            let sign = |parameter| model.parameters.slot(parameter).map_or(0.0, |slot| values[slot]);
            let (shift, common) = (sign(Parameter::ErrorSign), sign(Parameter::RejectionSign(0)));
            let part = |figure: PartFigure| solution.part(figure).ok_or_else(|| Outcome::Undetermined(vec![Need::Part(figure)]));
            let (at_plus, at_minus) = (solve(0.0, 0.0, 0.0, &[(amplifier.plus, 1.0)]), solve(0.0, 0.0, 0.0, &[(amplifier.minus, 1.0)]));
            let across = |v: &steady::Voltages| v[usize::from(amplifier.plus.0)] - v[usize::from(amplifier.minus.0)];
            let bias = match dc::bias_current(solution, 0) {
                Outcome::Value(v) => v,
                other => return Err(other),
            };
            let offset_current = part(PartFigure::OffsetCurrent)? / 2.0;
            // Each with the sign that shifts the inputs the same way.
            let bias = if across(&at_plus) + across(&at_minus) < 0.0 { -bias } else { bias };
            for (v, (p, m)) in base.iter_mut().zip(at_plus.iter().zip(&at_minus)) {
                *v += shift * ((bias + offset_current) * p + (bias - offset_current) * m);
            }
            let away = match model.parameters.temperature() {
                Some(slot) => values[slot] - dc::DATA_SHEET_TEMPERATURE,
                None => return Err(Outcome::Undetermined(vec![Need::Ambient])),
            };
            let mut sum = part(PartFigure::Offset)? + (part(PartFigure::OffsetDrift)? * away).abs();
            for (slot, figure) in [(positive, PartFigure::PsrrPositive), (negative, PartFigure::PsrrNegative)] {
                let deviation = (values[slot] - model.parameters.entries[slot].nominal).abs();
                if deviation > 0.0 {
                    sum += deviation / part(figure)?;
                }
            }
            volts_in_series = shift * sum;
            rejection = common / part(PartFigure::Cmrr)?;
        }
        let middle = f64::midpoint(rails[0], rails[1]);
        let volts = [base, by_signal, by_output];
        let at = |node: Node| Line {
            base: base[usize::from(node.0)],
            signal: by_signal[usize::from(node.0)],
            output: by_output[usize::from(node.0)],
        };
        let current = of_pin(&network.elements, values, amplifier.pin, &at);
        let (plus, minus) = (at(amplifier.plus), at(amplifier.minus));
        // What drives the amplifier beyond the edge of the level: at zero it leaves it.
        let open_loop = solution.part(PartFigure::OpenLoop).unwrap_or(f64::INFINITY);
        let resistance = solution.part(PartFigure::OutputResistance).unwrap_or(0.0);
        let mut excess = plus.map2(minus, |p, m| p - m).map2(plus, |d, p| d + rejection * p);
        excess = excess.map2(current, |d, i| d - i * resistance / open_loop);
        excess.output -= 1.0 / open_loop;
        excess.base += volts_in_series - rejection * middle + middle / open_loop;
        let wrong_way = match sense {
            Sense::NonInverting => excess.signal <= 0.0,
            Sense::Inverting => excess.signal >= 0.0,
        };
        let least = 1e-12 * (plus.signal.abs() + minus.signal.abs());
        if wrong_way || excess.signal.abs() <= least {
            return Err(Outcome::OutOfReach(NO_SIGNAL));
        }
        let mut this = Self { volts, current, rails, position: values[model.parameters.headroom()], edges: [(0.0, 0.0); 2], sense };
        for high in [false, true] {
            // On the edge, signal and current follow the output.
            let (offset, slope) = (-excess.base / excess.signal, -excess.output / excess.signal);
            let along = (current.base + current.signal * offset, current.output + current.signal * slope);
            let output = this.level(model.stage, high, along)?;
            this.edges[usize::from(high)] = (offset + slope * output, output);
        }
        if this.edges[1].1 <= this.edges[0].1 {
            return Err(Outcome::OutOfReach(NO_ROOM));
        }
        Ok(this)
    }

    /// The level at which the output rests where its current is `along.0 + along.1·V`.
    fn level(&self, stage: &Stage, high: bool, along: (f64, f64)) -> Result<f64, Outcome> {
        let (sign, rail, table, need) = if high {
            (1.0, self.rails[1], &stage.part.headroom_high, Need::HeadroomHigh)
        } else {
            (-1.0, self.rails[0], &stage.part.headroom_low, Need::HeadroomLow)
        };
        // With x the current in the direction that costs headroom: x + g·h(x) = k, its left side rising.
        let g = along.1;
        let k = sign * (along.0 + g * rail);
        let headroom = rest(table, self.position, g, k).ok_or_else(|| Outcome::Undetermined(vec![need]))?;
        Ok(rail - sign * headroom)
    }

    fn voltage(&self, node: Node, point: &Point) -> f64 {
        let n = usize::from(node.0);
        self.volts[0][n] + self.volts[1][n] * point.signal + self.volts[2][n] * point.output
    }

    /// The state at a signal.
    fn point(&self, stage: &Stage, signal: f64, high: bool) -> Result<Point, Outcome> {
        let along = (self.current.base + self.current.signal * signal, self.current.output);
        Ok(Point { signal, high, output: self.level(stage, high, along)? })
    }

    fn current(&self, point: &Point) -> f64 {
        self.current.at(point.signal, point.output)
    }

    /// Lower and upper threshold.
    fn thresholds(&self) -> (f64, f64) {
        match self.sense {
            Sense::NonInverting => (self.edges[1].0, self.edges[0].0),
            Sense::Inverting => (self.edges[0].0, self.edges[1].0),
        }
    }

    /// The ends of both states: at the thresholds, and at the signal's extremes where it is stated.
    fn points(&self, stage: &Stage) -> Result<Vec<Point>, Outcome> {
        let signal = stage.signal().map(|s| (s.dc - s.peak, s.dc + s.peak));
        let mut points = Vec::with_capacity(4);
        for high in [false, true] {
            let edge = self.edges[usize::from(high)].0;
            // A level is left upwards by the signal where the other one lies above.
            let below = high == (self.sense == Sense::Inverting);
            let edge = signal.map_or(edge, |(low, top)| edge.clamp(low, top));
            points.push(self.point(stage, edge, high)?);
            if let Some((low, top)) = signal {
                points.push(self.point(stage, if below { low } else { top }, high)?);
            }
        }
        Ok(points)
    }
}

/// The current out of the pin.
fn of_pin(elements: &[Element], values: &[f64], pin: Node, at: &impl Fn(Node) -> Line) -> Line {
    let mut sum = Line { base: 0.0, signal: 0.0, output: 0.0 };
    for element in elements {
        let other = match (element.a == pin, element.b == pin) {
            (true, false) => element.b,
            (false, true) => element.a,
            _ => continue,
        };
        if let Law::Resistance(slot) = element.law {
            let across = at(pin).map2(at(other), |p, o| p - o);
            sum = sum.map2(across, |i, v| i + v / values[slot]);
        }
    }
    sum
}

/// The headroom `h(x)` where `x + g·h(x) = k`; none beyond the table's last row.
fn rest(table: &[Headroom], position: f64, g: f64, k: f64) -> Option<f64> {
    let first = table.first()?;
    let start = swing::row_volts(first, position);
    if k - g * start <= first.current {
        return Some(start);
    }
    for pair in table.windows(2) {
        let (from, to) = (&pair[0], &pair[1]);
        let (a, b) = (swing::row_volts(from, position), swing::row_volts(to, position));
        let slope = (b - a) / (to.current - from.current);
        let x = (k - g * (a - slope * from.current)) / (1.0 + g * slope);
        if x <= to.current {
            return Some(a + slope * (x - from.current));
        }
    }
    None
}

/// What a comparator's figure lacks.
pub fn lacking(solution: &Solution<'_>, figure: Figure) -> Option<Outcome> {
    use Figure as F;
    let mut missing = Missing::default();
    let stage = solution.model.stage;
    let mut needs = |parts: &[PartFigure]| parts.iter().for_each(|&figure| missing.part(solution, figure));
    let with_thresholds = match figure {
        F::ThresholdHigh | F::ThresholdLow | F::Hysteresis | F::InputRangeMargin => {
            needs(&[PartFigure::Offset, PartFigure::OffsetDrift, PartFigure::BiasCurrent, PartFigure::OffsetCurrent, PartFigure::Cmrr]);
            let wide = |s: crate::stage::Span| s.low < s.high;
            for (span, figure) in
                [(stage.supply.map(|s| s.positive), PartFigure::PsrrPositive), (stage.supply.map(|s| s.negative), PartFigure::PsrrNegative)]
            {
                if span.is_some_and(wide) {
                    needs(&[figure]);
                }
            }
            if figure == F::InputRangeMargin {
                needs(&[PartFigure::RangeFromNegative, PartFigure::RangeFromPositive]);
            }
            true
        }
        F::ResponseTime => {
            needs(&[PartFigure::SlewRise, PartFigure::SlewFall, PartFigure::OverloadRecovery]);
            if stage.load.capacitance.is_some() {
                needs(&[PartFigure::CurrentLimit]);
            }
            false
        }
        F::CurrentMargin => {
            needs(&[PartFigure::CurrentLimit]);
            false
        }
        F::SupplyCurrent | F::Dissipation | F::JunctionTemperature => {
            needs(&[PartFigure::SupplyCurrent]);
            if figure == F::JunctionTemperature {
                needs(&[PartFigure::JunctionToAmbient]);
            }
            figure == F::JunctionTemperature
        }
        F::OutputHigh | F::OutputLow | F::ResistorDissipation => false,
        F::Gain
        | F::GainError
        | F::GainAtSignal
        | F::GainAt
        | F::PhaseAt
        | F::Bandwidth
        | F::LowCutoff
        | F::Peaking
        | F::Crossover
        | F::PhaseMargin
        | F::GainMargin
        | F::SensitivityPeak
        | F::NaturalFrequency
        | F::Q
        | F::InputImpedance
        | F::OutputImpedance
        | F::OutputOffset
        | F::InputOffset
        | F::OffsetDrift
        | F::GainDrift
        | F::StageCmrr
        | F::StageCmrrAt
        | F::StagePsrr
        | F::StagePsrrAt
        | F::RippleOutput
        | F::Overshoot
        | F::SettlingTime
        | F::SlewClipDistortion
        | F::OutputNoise
        | F::InputNoise
        | F::OutputNoisePeakToPeak
        | F::NoiseDensityAt
        | F::NoiseBandwidth
        | F::Snr
        | F::SnrBits
        | F::Enob
        | F::AcquisitionError
        | F::ClipMargin
        | F::FullScaleMargin
        | F::StartupTime
        | F::SlewMargin
        | F::FullPowerBandwidth => return Some(Outcome::DoesNotApply(TWO_LEVELS)),
    };
    needs(&[PartFigure::OpenLoop, PartFigure::OutputResistance]);
    missing.supply(solution);
    if stage.part.headroom_high.is_empty() {
        missing.need(Need::HeadroomHigh);
    }
    if stage.part.headroom_low.is_empty() {
        missing.need(Need::HeadroomLow);
    }
    if with_thresholds {
        missing.ambient(solution);
    }
    missing.outcome()
}

/// A comparator's figure in one build.
pub fn value(solution: &Solution<'_>, figure: Figure) -> Outcome {
    use Figure as F;
    let found = match figure {
        F::SupplyCurrent => return super::thermal::power(solution).supply_current.clone(),
        F::Dissipation => return super::thermal::hottest(solution, None, |p| &p.dissipation),
        F::JunctionTemperature => return super::thermal::hottest(solution, None, |p| &p.junction),
        F::ThresholdHigh | F::ThresholdLow | F::Hysteresis => threshold(solution, figure),
        F::InputRangeMargin => switch(solution).as_ref().map_err(Clone::clone).and_then(|s| range(solution, s)),
        _ => at_rest(solution).and_then(|(s, points)| of_levels(solution, &s, &points, figure)),
    };
    match found {
        Ok(v) if v.is_nan() => Outcome::DoesNotApply("the values leave the range in which it can be computed"),
        Ok(v) => Outcome::Value(v),
        Err(why) => why,
    }
}

/// The build without input errors, and its states.
fn at_rest(solution: &Solution<'_>) -> Result<(Switch, Vec<Point>), Outcome> {
    let switch = Switch::of(solution, false)?;
    let points = switch.points(solution.model.stage)?;
    Ok((switch, points))
}

fn threshold(solution: &Solution<'_>, figure: Figure) -> Result<f64, Outcome> {
    let switch = switch(solution).as_ref().map_err(Clone::clone)?;
    let (low, high) = switch.thresholds();
    if high <= low {
        return Err(Outcome::OutOfReach(WEAK));
    }
    let reach = |level: usize| reach(solution, switch, level);
    let at = |upper: bool| usize::from(upper == (switch.sense == Sense::Inverting));
    match figure {
        Figure::ThresholdHigh => reach(at(true)).map(|()| high),
        Figure::ThresholdLow => reach(at(false)).map(|()| low),
        _ => reach(0).and_then(|()| reach(1)).map(|()| high - low),
    }
}

/// Whether the threshold at which a level is left can be met with the inputs in their range and the signal in its own.
fn reach(solution: &Solution<'_>, switch: &Switch, level: usize) -> Result<(), Outcome> {
    let (signal, output) = switch.edges[level];
    let pins = solution.model.network.amplifiers[0];
    let point = Point { signal, high: level == 1, output };
    let inside = |node: Node| input_range(solution, switch).is_none_or(|(low, high)| (low..=high).contains(&switch.voltage(node, &point)));
    if !(inside(pins.plus) && inside(pins.minus)) {
        return Err(Outcome::OutOfReach(BEYOND_RANGE));
    }
    if solution.model.stage.signal().is_some_and(|s| (signal - s.dc).abs() > s.peak) {
        return Err(Outcome::OutOfReach(BEYOND_SIGNAL));
    }
    Ok(())
}

/// Lowest and highest allowed input, where the part states them.
fn input_range(solution: &Solution<'_>, switch: &Switch) -> Option<(f64, f64)> {
    let (below, above) = (solution.part(PartFigure::RangeFromNegative)?, solution.part(PartFigure::RangeFromPositive)?);
    Some((switch.rails[0] + below, switch.rails[1] - above))
}

fn range(solution: &Solution<'_>, switch: &Switch) -> Result<f64, Outcome> {
    let (low, high) = input_range(solution, switch).unwrap_or((f64::NAN, f64::NAN));
    let pins = solution.model.network.amplifiers[0];
    let points = switch.points(solution.model.stage)?;
    let rooms = points.iter().flat_map(|p| [pins.plus, pins.minus].map(|node| switch.voltage(node, p))).map(|v| (high - v).min(v - low));
    Ok(rooms.fold(f64::INFINITY, f64::min))
}

/// Figures of levels and currents.
fn of_levels(solution: &Solution<'_>, switch: &Switch, points: &[Point], figure: Figure) -> Result<f64, Outcome> {
    let network = &solution.model.network;
    let at_load = |high: bool| points.iter().filter(move |p| p.high == high).map(|p| switch.voltage(network.load, p));
    Ok(match figure {
        Figure::OutputHigh => at_load(true).fold(f64::INFINITY, f64::min),
        Figure::OutputLow => at_load(false).fold(f64::NEG_INFINITY, f64::max),
        Figure::CurrentMargin => {
            let limit = solution.part(PartFigure::CurrentLimit).unwrap_or(f64::NAN);
            limit - points.iter().map(|p| switch.current(p).abs()).fold(0.0, f64::max)
        }
        Figure::ResistorDissipation => resistors(solution).into_iter().map(|(_, power)| power).fold(f64::NAN, f64::max),
        _ => return response(solution, switch),
    })
}

fn response(solution: &Solution<'_>, switch: &Switch) -> Result<f64, Outcome> {
    let part = |figure| solution.part(figure).unwrap_or(f64::NAN);
    let capacitance = solution.model.parameters.slot(Parameter::LoadCapacitance).map(|slot| solution.values[slot]);
    let mut slowest: f64 = 0.0;
    for rises in [false, true] {
        // From the level that is left, at the threshold, to the other one at the same signal.
        let (signal, from) = switch.edges[usize::from(!rises)];
        let to = switch.point(solution.model.stage, signal, rises)?;
        let mut rate = part(if rises { PartFigure::SlewRise } else { PartFigure::SlewFall });
        if let Some(farads) = capacitance {
            let outwards = if rises { 1.0 } else { -1.0 };
            let before = Point { signal, high: !rises, output: from };
            let standing = (switch.current(&to) * outwards).max(switch.current(&before) * outwards).max(0.0);
            rate = rate.min((part(PartFigure::CurrentLimit) - standing) / farads);
        }
        if rate <= 0.0 {
            return Err(Outcome::OutOfReach(NO_CURRENT));
        }
        slowest = slowest.max((to.output - from).abs() / rate);
    }
    Ok(slowest + part(PartFigure::OverloadRecovery))
}

/// The steady states of the pin, for supply current and heat.
pub fn drives(solution: &Solution<'_>) -> Result<Vec<Drive>, Outcome> {
    let (switch, points) = at_rest(solution)?;
    Ok(points.iter().map(|p| Drive { v0: p.output, vp: 0.0, i0: switch.current(p), ip: 0.0, phase: (1.0, 0.0) }).collect())
}

/// The most power in every resistor of the stage: whose it is, W.
pub fn resistors(solution: &Solution<'_>) -> Vec<(NoiseOrigin, f64)> {
    let Ok((switch, points)) = at_rest(solution) else { return Vec::new() };
    let of = |element: &Element| {
        let origin = element.noise.filter(|o| matches!(o, NoiseOrigin::Component(_)))?;
        let Law::Resistance(slot) = element.law else { return None };
        let across = points.iter().map(|p| (switch.voltage(element.a, p) - switch.voltage(element.b, p)).abs()).fold(0.0, f64::max);
        (solution.values[slot] > 0.0).then(|| (origin, across * across / solution.values[slot]))
    };
    solution.model.network.elements.iter().filter_map(of).collect()
}

/// The greatest distance of the amplifier's inputs from each other, V.
pub fn differential(solution: &Solution<'_>) -> Option<f64> {
    let (switch, points) = at_rest(solution).ok()?;
    let pins = solution.model.network.amplifiers[0];
    Some(points.iter().map(|p| (switch.voltage(pins.plus, p) - switch.voltage(pins.minus, p)).abs()).fold(0.0, f64::max))
}

/// How far the noise over the band and the ripple of the supplies move the thresholds, peak to peak at the signal, V: what of both is
/// stated. The noise is that of the amplifier and of the resistance between its inputs.
pub fn disturbance(solution: &Solution<'_>) -> f64 {
    let model: &Model<'_> = solution.model;
    let Ok(rest) = Switch::of(solution, false) else { return 0.0 };
    let pins = model.network.amplifiers[0];
    let across = |v: &steady::Voltages| v[usize::from(pins.plus.0)] - v[usize::from(pins.minus.0)];
    let mut peak_to_peak = 0.0;
    if let (Some(band), Some(slot), Some(white)) =
        (model.stage.band, model.parameters.temperature(), solution.part(PartFigure::NoiseVoltage))
    {
        let mesh = steady::Mesh::of(&model.network, &solution.values);
        let at = |node: Node, amperes: f64| (node, amperes);
        let held = [at(model.network.input_node(0), 0.0), at(model.network.input_node(1), 0.0), at(pins.pin, 0.0)];
        let ohms = |injected: &[(Node, f64)]| across(&mesh.solve(&held, injected));
        let (plus, minus) = (ohms(&[(pins.plus, 1.0)]), ohms(&[(pins.minus, 1.0)]));
        let (wide, octaves) = (band.to - band.from, libm::log(band.to / band.from));
        let corner = |figure| solution.part(figure).unwrap_or(0.0);
        let exponent = solution.part(PartFigure::NoiseExponent).unwrap_or(1.0);
        let flicker = if (exponent - 1.0).abs() < 1e-9 {
            corner(PartFigure::NoiseVoltageCorner) * octaves
        } else {
            let powers = libm::pow(band.to, 1.0 - exponent) - libm::pow(band.from, 1.0 - exponent);
            libm::pow(corner(PartFigure::NoiseVoltageCorner), exponent) * powers / (1.0 - exponent)
        };
        let current = solution.part(PartFigure::NoiseCurrent).unwrap_or(0.0);
        let power = white * white * (wide + flicker)
            + current * current * (plus * plus + minus * minus) * (wide + corner(PartFigure::NoiseCurrentCorner) * octaves)
            + 4.0 * noise::BOLTZMANN * solution.values[slot] * (plus - minus) * wide;
        peak_to_peak = noise::PEAK_TO_PEAK * libm::sqrt(power) / across(&rest.volts[1]).abs();
    }
    let ripple = model.stage.supply.and_then(|s| s.ripple).map_or(0.0, |r| r.peak);
    if let (true, Some((positive, negative))) = (ripple > 0.0, model.parameters.supply()) {
        let mut moved = [0.0; 2];
        for slot in [positive, negative] {
            let at = |volts: f64| {
                let mut values = solution.values.clone();
                values[slot] += volts;
                Switch::of(&Solution::new(model, values, None), false).map(|s| s.edges.map(|e| e.0)).unwrap_or([0.0; 2])
            };
            let (up, down) = (at(ripple), at(-ripple));
            moved.iter_mut().zip(up.iter().zip(&down)).for_each(|(m, (u, d))| *m += (u - d).abs());
        }
        peak_to_peak += moved[0].max(moved[1]);
    }
    peak_to_peak
}

/// Points of a branch, beside those at the thresholds.
const STEPS: u32 = 20;

/// The output against the signal around the thresholds, at nominal values: twice the hysteresis to either side.
pub fn transfer(solution: &Solution<'_>) -> Vec<TransferPoint> {
    let Ok(switch) = Switch::of(solution, false) else { return Vec::new() };
    let (low, high) = switch.thresholds();
    if high <= low {
        return Vec::new();
    }
    let stage = solution.model.stage;
    let above = switch.sense == Sense::NonInverting;
    let at = |input: f64, is_high: bool| {
        switch.point(stage, input, is_high).map_or(f64::NAN, |p| switch.voltage(solution.model.network.load, &p))
    };
    let (from, to) = (low - 2.0 * (high - low), high + 2.0 * (high - low));
    let mut points: Vec<(f64, bool, bool)> =
        (0..=STEPS).map(|k| from + (to - from) * f64::from(k) / f64::from(STEPS)).map(|v| (v, v > high, v > low)).collect();
    points.extend([(high, false, true), (high, true, true), (low, false, false), (low, false, true)]);
    points.sort_by(|a, b| a.0.total_cmp(&b.0).then((a.1, a.2).cmp(&(b.1, b.2))));
    // Whether each branch has passed its threshold says at which level it is.
    let point = |(input, rising, falling): (f64, bool, bool)| TransferPoint {
        input,
        rising: at(input, rising == above),
        falling: at(input, falling == above),
    };
    points.into_iter().map(point).collect()
}
