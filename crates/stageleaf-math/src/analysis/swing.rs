//! Large signal at the amplifier's pins: clipping, input range, output current, slew.
//!
//! # Formula
//! The network gives pin voltage and current as phasors; with the DC part they are `V(θ) = V0 + Vp·cos θ` and
//! `I(θ) = I0 + Ip·cos(θ + φ)`. Clip margin: the least distance of `V(θ)`, widened by the output offset, from the rail less the
//! headroom at `I(θ)`. Headroom is measured at the pin, so it is not added to the drop in the output resistance. Slew needed:
//! `ω·|E|`, `E` the controlled source behind the output resistance; available: the smaller of rise and fall, or what the current
//! limit leaves for the load's capacitance.
//!
//! # Does not apply
//! Waveforms other than a sine at the highest frequency and full amplitude.
//!
//! # Source
//! Common practice, no source; derived here.

use alloc::vec::Vec;
use core::f64::consts::TAU;

use num_complex::Complex64;

use super::{Missing, search};
use crate::{
    kind::{Drives, Feed},
    network::{Law, Node, dense::admittance},
    part::{Headroom, PartFigure},
    report::{EnvelopePoint, Need, Outcome, Parameter},
    solution::{Solution, magnitude},
};

/// What a drive applies: its steady value, and a sine.
#[derive(Clone, Copy, Debug)]
pub struct Level {
    /// Which drive.
    pub drive: usize,
    /// Steady value.
    pub dc: f64,
    /// Peak of the alternating part.
    pub peak: f64,
    /// Hz.
    pub frequency: f64,
}

/// What every drive of the stage applies in this build.
pub fn levels<'s>(solution: &'s Solution<'_>) -> impl Iterator<Item = Level> + 's {
    let model = solution.model;
    let spec = model.stage.kind.spec();
    let inputs = (spec.inputs)(model.stage);
    (0..model.drives.len()).filter_map(move |drive| {
        let signal = model.stage.signal_of(drive);
        let fed = match (spec.drives, inputs.get(drive).map(|i| i.feed)) {
            (Drives::Differential, _) => (drive == 1).then(|| model.parameters.slot(Parameter::CommonMode)).flatten(),
            (_, Some(Feed::Reference)) => model.parameters.slot(Parameter::ReferenceVoltage),
            (_, Some(Feed::Supply)) => model.parameters.supply().map(|(positive, _)| positive),
            _ => None,
        };
        let dc = signal.map_or(0.0, |s| s.dc) + fed.map_or(0.0, |slot| solution.values[slot]);
        let (peak, frequency) = signal.map_or((0.0, 0.0), |s| (s.peak, s.frequency.unwrap_or(0.0)));
        (signal.is_some() || fed.is_some()).then_some(Level { drive, dc, peak, frequency })
    })
}

/// The steady voltage at a node from all drives.
pub fn steady(solution: &Solution<'_>, node: Node) -> f64 {
    levels(solution).map(|l| if l.dc.abs() > 0.0 { l.dc * solution.voltage(l.drive, node, 0.0).re } else { 0.0 }).sum()
}

/// An output pin, per unit of a drive.
#[derive(Clone, Copy, Debug)]
pub struct Pin {
    /// Voltage.
    pub voltage: Complex64,
    /// Current out of the pin, S.
    pub current: Complex64,
    /// The controlled source behind the output resistance.
    pub behind: Complex64,
}

/// An amplifier's output pin at a frequency in Hz; at 0 the DC transfer.
pub fn pin(solution: &Solution<'_>, amplifier: usize, drive: usize, frequency: f64) -> Pin {
    let network = &solution.model.network;
    let omega = solution.scaled(frequency);
    let at = |node: Node| solution.voltage(drive, node, omega);
    let node = network.amplifiers[amplifier].pin;
    let voltage = at(node);
    let s = Complex64::new(0.0, TAU * frequency);
    let mut current = Complex64::new(0.0, 0.0);
    for element in &network.elements {
        let other = match (element.a == node, element.b == node) {
            (true, false) => element.b,
            (false, true) => element.a,
            _ => continue,
        };
        if matches!(element.law, Law::Resistance(slot) if solution.values[slot] <= 0.0) {
            continue; // a short: its current is found on the other side
        }
        current += (voltage - at(other)) * admittance(element.law, &solution.values, s);
    }
    let behind = voltage + current * solution.part_of(amplifier, PartFigure::OutputResistance).unwrap_or(0.0);
    Pin { voltage, current, behind }
}

/// The signal at the pin: DC and peak of voltage and current, with the current's phase against the voltage.
#[derive(Clone, Copy, Debug)]
pub struct Drive {
    /// DC pin voltage, V.
    pub v0: f64,
    /// Peak of the alternating pin voltage, V.
    pub vp: f64,
    /// DC pin current, A.
    pub i0: f64,
    /// Peak of the alternating pin current, A.
    pub ip: f64,
    /// Its phase against the voltage, as cosine and sine.
    pub phase: (f64, f64),
}

/// The stage's own signals at an amplifier's pin: of several, the steady parts add up, and the alternating ones as if all were at
/// their peak there at once.
fn drive(solution: &Solution<'_>, amplifier: usize) -> Drive {
    let mut drive = Drive { v0: 0.0, vp: 0.0, i0: 0.0, ip: 0.0, phase: (1.0, 0.0) };
    let mut phasor = Complex64::new(0.0, 0.0);
    for level in levels(solution) {
        if level.dc.abs() > 0.0 {
            let steady = pin(solution, amplifier, level.drive, 0.0);
            drive.v0 += steady.voltage.re * level.dc;
            drive.i0 += steady.current.re * level.dc;
        }
        if level.peak > 0.0 {
            let moving = pin(solution, amplifier, level.drive, level.frequency);
            let (v, i) = (magnitude(moving.voltage), magnitude(moving.current));
            drive.vp += v * level.peak;
            let turned = if v > 0.0 { moving.current * moving.voltage.conj() / v } else { Complex64::new(i, 0.0) };
            phasor += turned * level.peak;
        }
    }
    drive.ip = magnitude(phasor);
    if drive.ip > 0.0 {
        drive.phase = (phasor.re / drive.ip, phasor.im / drive.ip);
    }
    drive
}

impl Drive {
    fn set_alternating(&mut self, moving: &Pin, peak: f64) {
        let (v, i) = (magnitude(moving.voltage), magnitude(moving.current));
        self.vp = v * peak;
        self.ip = i * peak;
        if v * i > 0.0 {
            let product = moving.current * moving.voltage.conj();
            self.phase = (product.re / (v * i), product.im / (v * i));
        }
    }

    fn at(&self, cos: f64, sin: f64) -> (f64, f64) {
        (self.v0 + self.vp * cos, self.i0 + self.ip * (cos * self.phase.0 - sin * self.phase.1))
    }
}

/// A row's headroom between typical (0) and guaranteed (1).
pub(super) fn row_volts(row: &Headroom, position: f64) -> f64 {
    let typ = row.volts.typ.or(row.volts.max).unwrap_or(0.0);
    let max = row.volts.max.or(row.volts.typ).unwrap_or(0.0);
    typ + position * (max - typ)
}

/// Headroom at a current, between typical (0) and guaranteed (1), and whether the table states it: beyond its last row the headroom is at
/// least that row's.
pub(super) fn headroom(table: &[Headroom], position: f64, current: f64) -> (f64, bool) {
    let volts = |row: &Headroom| row_volts(row, position);
    let Some(first) = table.first() else { return (0.0, false) };
    if current <= first.current {
        return (volts(first), true);
    }
    for pair in table.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        if current <= b.current {
            return (volts(a) + (volts(b) - volts(a)) * (current - a.current) / (b.current - a.current), true);
        }
    }
    (table.last().map_or(0.0, volts), false)
}

/// The rails' distance for a drive: least margin over a period, or which table ends too early.
struct Rails<'a> {
    high: f64,
    low: f64,
    above: &'a [Headroom],
    below: &'a [Headroom],
    position: f64,
    offset: f64,
}

/// How finely a period is looked through: turns, golden-section steps after that.
#[derive(Clone, Copy)]
enum Fineness {
    /// For a figure.
    Figure,
    /// For a plot.
    Plot,
}

impl Rails<'_> {
    fn margin(&self, drive: &Drive, fineness: Fineness) -> Result<f64, Need> {
        // Steps, cos and sin of 2π over them, golden-section steps.
        let (steps, turn, golden) = match fineness {
            Fineness::Figure => (24, (0.965_925_826_289_068_3, 0.258_819_045_102_520_74), 16),
            Fineness::Plot => (12, (0.866_025_403_784_438_6, 0.5), 8),
        };
        const RATIO: f64 = 0.618_033_988_749_894_9;
        let mut beyond = None;
        let mut room = |cos: f64, sin: f64| {
            let (v, i) = drive.at(cos, sin);
            let (up, up_stated) = headroom(self.above, self.position, i);
            let (down, down_stated) = headroom(self.below, self.position, -i);
            if !up_stated {
                beyond = Some(Need::HeadroomHigh);
            } else if !down_stated {
                beyond = Some(Need::HeadroomLow);
            }
            (self.high - up - v - self.offset).min(v - self.offset - self.low - down)
        };
        let mut least = room(1.0, 0.0);
        if drive.vp > 0.0 || drive.ip > 0.0 {
            let mut least_at = (1.0, 0.0);
            let (mut cos, mut sin) = (1.0, 0.0);
            for _ in 0..steps {
                let here = room(cos, sin);
                if here < least {
                    (least, least_at) = (here, (cos, sin));
                }
                (cos, sin) = (cos * turn.0 - sin * turn.1, sin * turn.0 + cos * turn.1);
            }
            // Golden section around the least sample, by small rotations from it.
            let mut near = |angle: f64| {
                let (c, s) = (libm::cos(angle), libm::sin(angle));
                room(least_at.0 * c - least_at.1 * s, least_at.1 * c + least_at.0 * s)
            };
            let (mut a, mut b) = (-turn.1, turn.1);
            let (mut x, mut y) = (b - RATIO * (b - a), a + RATIO * (b - a));
            let (mut fx, mut fy) = (near(x), near(y));
            for _ in 0..golden {
                if fx < fy {
                    b = y;
                    (y, fy) = (x, fx);
                    x = b - RATIO * (b - a);
                    fx = near(x);
                } else {
                    a = x;
                    (x, fx) = (y, fy);
                    y = a + RATIO * (b - a);
                    fy = near(y);
                }
            }
            least = least.min(fx).min(fy);
        }
        // Beyond the tables' last rows the room is less than this: enough to break, not to hold.
        match beyond {
            Some(need) if least >= 0.0 => Err(need),
            _ => Ok(least),
        }
    }
}

/// A margin of one amplifier, else the least over all; what is missing for one is missing for the least of all.
fn least(solution: &Solution<'_>, amplifier: Option<usize>, of: impl Fn(usize) -> Outcome) -> Outcome {
    let mut least = of(amplifier.unwrap_or(0));
    if amplifier.is_some() {
        return least;
    }
    for amplifier in 1..solution.amplifiers() {
        let here = of(amplifier);
        if let (Some(a), Some(b)) = (least.value(), here.value()) {
            least = Outcome::Value(a.min(b));
        } else if least.value().is_some() {
            least = here;
        }
    }
    least
}

/// Clip margin, V.
pub fn clip_margin(solution: &Solution<'_>, amplifier: Option<usize>) -> Outcome {
    let least = || least(solution, amplifier, |a| clip(solution, a, &drives(solution)[a]));
    if amplifier.is_some() { least() } else { solution.clip.get_or_init(least).clone() }
}

/// Input range margin, V.
pub fn input_range_margin(solution: &Solution<'_>, amplifier: Option<usize>) -> Outcome {
    least(solution, amplifier, |a| range(solution, a))
}

/// Output current margin, A.
pub fn current_margin(solution: &Solution<'_>, amplifier: Option<usize>) -> Outcome {
    least(solution, amplifier, |a| current(solution, a, &drives(solution)[a]))
}

/// Slew available over slew needed.
pub fn slew_margin(solution: &Solution<'_>, amplifier: Option<usize>) -> Outcome {
    least(solution, amplifier, |a| slew(solution, a, &drives(solution)[a]))
}

/// The signals at every amplifier's pin.
pub fn drives<'s>(solution: &'s Solution<'_>) -> &'s [Drive] {
    // A twin has the same transfers; where what is applied is the same too, so are the drives.
    if let Some(twin) = solution.twin()
        && levels(twin).map(|l| l.dc.to_bits()).eq(levels(solution).map(|l| l.dc.to_bits()))
    {
        return drives(twin);
    }
    solution.drives.get_or_init(|| (0..solution.amplifiers()).map(|a| drive(solution, a)).collect())
}

fn rails<'a>(solution: &'a Solution<'_>, amplifier: usize) -> Result<Rails<'a>, Outcome> {
    let model = solution.model;
    let Some((positive, negative)) = model.parameters.supply() else { return Err(Outcome::Undetermined(alloc::vec![Need::Supply])) };
    let part = model.stage.part_of(amplifier);
    let mut missing = Missing::default();
    if part.headroom_high.is_empty() {
        missing.need(Need::HeadroomHigh);
    }
    if part.headroom_low.is_empty() {
        missing.need(Need::HeadroomLow);
    }
    let offset = match &super::dc::budget(solution).total {
        Outcome::Value(v) => *v,
        Outcome::Undetermined(needs) => {
            for need in needs {
                missing.need(*need);
            }
            0.0
        }
        other => return Err(other.clone()),
    };
    if let Some(undetermined) = missing.outcome() {
        return Err(undetermined);
    }
    Ok(Rails {
        high: solution.values[positive],
        low: solution.values[negative],
        above: &part.headroom_high,
        below: &part.headroom_low,
        position: solution.values[model.parameters.headroom()],
        offset,
    })
}

/// One side of the room at a pin, as one works it out by hand.
#[derive(Clone, Copy, Debug)]
pub struct Side {
    /// The rail, V.
    pub rail: f64,
    /// Headroom at the peak current, V.
    pub headroom: f64,
    /// Steady part at the pin, V.
    pub dc: f64,
    /// Peak at the pin, V.
    pub peak: f64,
    /// What is left, V.
    pub room: f64,
}

/// Room above and below by hand, without DC errors: for the working of a stage of one amplifier.
pub fn simple_room(solution: &Solution<'_>) -> Option<(Side, Side)> {
    let [drive] = drives(solution) else { return None };
    let rails = rails(solution, 0).ok()?;
    let (up, up_stated) = headroom(rails.above, rails.position, drive.i0 + drive.ip);
    let (down, down_stated) = headroom(rails.below, rails.position, drive.ip - drive.i0);
    let side = |rail, headroom, room| Side { rail, headroom, dc: drive.v0, peak: drive.vp, room };
    (up_stated && down_stated).then(|| {
        let above = side(rails.high, up, rails.high - up - drive.v0 - drive.vp);
        (above, side(rails.low, down, drive.v0 - drive.vp - down - rails.low))
    })
}

/// The rails in this build, V.
pub fn supplies(solution: &Solution<'_>) -> Option<(f64, f64)> {
    solution.model.parameters.supply().map(|(high, low)| (solution.values[high], solution.values[low]))
}

fn clip(solution: &Solution<'_>, amplifier: usize, drive: &Drive) -> Outcome {
    match rails(solution, amplifier) {
        Err(outcome) => outcome,
        Ok(rails) => match rails.margin(drive, Fineness::Figure) {
            Ok(margin) => Outcome::Value(margin),
            Err(need) => Outcome::Undetermined(alloc::vec![need]),
        },
    }
}

fn range(solution: &Solution<'_>, amplifier: usize) -> Outcome {
    let model = solution.model;
    let part = |figure| solution.part_of(amplifier, figure);
    let (Some((positive, negative)), Some(from_negative), Some(from_positive)) =
        (model.parameters.supply(), part(PartFigure::RangeFromNegative), part(PartFigure::RangeFromPositive))
    else {
        let mut missing = Missing::default();
        for figure in [PartFigure::RangeFromNegative, PartFigure::RangeFromPositive] {
            if part(figure).is_none() {
                missing.need(Need::Part(figure));
            }
        }
        missing.supply(solution);
        return missing.outcome().unwrap_or(Outcome::Undetermined(Vec::new()));
    };
    let (low, high) = (solution.values[negative] + from_negative, solution.values[positive] - from_positive);
    let pins = model.network.amplifiers[amplifier];
    let mut margin = f64::INFINITY;
    for node in [pins.plus, pins.minus] {
        let middle = steady(solution, node);
        let moving: f64 = levels(solution)
            .filter(|l| l.peak > 0.0)
            .map(|l| magnitude(solution.voltage(l.drive, node, solution.scaled(l.frequency))) * l.peak)
            .sum();
        margin = margin.min(high - middle - moving).min(middle - moving - low);
    }
    Outcome::Value(margin)
}

fn current(solution: &Solution<'_>, amplifier: usize, drive: &Drive) -> Outcome {
    match solution.part_of(amplifier, PartFigure::CurrentLimit) {
        Some(limit) => Outcome::Value(limit - drive.i0.abs() - drive.ip),
        None => Outcome::Undetermined(alloc::vec![Need::Part(PartFigure::CurrentLimit)]),
    }
}

/// The steepest slope that the signals ask of an amplifier, V/s.
pub(super) fn slope(solution: &Solution<'_>, amplifier: usize) -> f64 {
    let moving = levels(solution).filter(|l| l.peak > 0.0 && l.frequency > 0.0);
    moving.map(|l| TAU * l.frequency * magnitude(pin(solution, amplifier, l.drive, l.frequency).behind) * l.peak).sum()
}

pub(super) fn slew_rate(solution: &Solution<'_>, amplifier: usize) -> f64 {
    let part = |figure| solution.part_of(amplifier, figure).unwrap_or(f64::INFINITY);
    part(PartFigure::SlewRise).min(part(PartFigure::SlewFall))
}

fn slew(solution: &Solution<'_>, amplifier: usize, drive: &Drive) -> Outcome {
    let (_, capacitive) = solution.model.stage.is_loaded();
    let mut missing = Missing::default();
    for figure in [PartFigure::SlewRise, PartFigure::SlewFall, PartFigure::CurrentLimit] {
        if solution.part_of(amplifier, figure).is_none() && (capacitive || figure != PartFigure::CurrentLimit) {
            missing.need(Need::Part(figure));
        }
    }
    if let Some(undetermined) = missing.outcome() {
        return undetermined;
    }
    let needed = slope(solution, amplifier);
    if needed <= 0.0 {
        return Outcome::Value(f64::INFINITY);
    }
    let mut ratio = slew_rate(solution, amplifier) / needed;
    let charging = drive.ip * drive.phase.1.abs();
    if let (true, Some(limit)) = (capacitive && charging > 0.0, solution.part_of(amplifier, PartFigure::CurrentLimit)) {
        ratio = ratio.min((limit - drive.i0.abs()).max(0.0) / charging);
    }
    Outcome::Value(ratio)
}

/// Highest frequency at which the first signal's amplitude at the pins (as at the pass-band reference) stays within slew and current
/// limit.
///
/// # Formula
/// `ω·|E/V|·Vp = SR`, for a pin without output resistance `f = SR/(2π·Vp)`; and `|I/V|·Vp + |I0| = I_limit`. The lower of the two;
/// of several amplifiers the lowest.
///
/// # Does not apply
/// The rails do not depend on frequency: see `clip_margin`.
pub fn full_power_bandwidth(solution: &Solution<'_>, amplifier: Option<usize>) -> Outcome {
    if let Some(amplifier) = amplifier {
        return full_power_bandwidth_of(solution, amplifier);
    }
    let mut lowest: Option<Outcome> = None;
    for amplifier in 0..solution.amplifiers() {
        let here = full_power_bandwidth_of(solution, amplifier);
        lowest = match (lowest, here) {
            (Some(Outcome::Value(a)), Outcome::Value(b)) => Some(Outcome::Value(a.min(b))),
            (None | Some(Outcome::Value(_)), other) => Some(other),
            (Some(worse), _) => Some(worse),
        };
    }
    lowest.unwrap_or(Outcome::DoesNotApply("the stage has no amplifier"))
}

fn full_power_bandwidth_of(solution: &Solution<'_>, amplifier: usize) -> Outcome {
    let stage = solution.model.stage;
    let (loaded, _) = stage.is_loaded();
    let limit = solution.part_of(amplifier, PartFigure::CurrentLimit);
    if loaded && limit.is_none() {
        return Outcome::Undetermined(alloc::vec![Need::Part(PartFigure::CurrentLimit)]);
    }
    let peak = stage.signal().map_or(0.0, |s| s.peak);
    let reference = solution.hertz(super::response::reference(solution).omega);
    let amplitude = magnitude(pin(solution, amplifier, 0, reference).voltage) * peak;
    if amplitude <= 0.0 {
        return Outcome::DoesNotApply("the signal has no alternating part");
    }
    let standing: f64 =
        levels(solution).filter(|l| l.dc.abs() > 0.0).map(|l| pin(solution, amplifier, l.drive, 0.0).current.re * l.dc).sum();
    let rate = slew_rate(solution, amplifier);
    let excess = |omega: f64| {
        let here = pin(solution, amplifier, 0, solution.hertz(omega));
        let volts = magnitude(here.voltage);
        let slope = omega * solution.model.scale.1 * magnitude(here.behind) / volts * amplitude / rate;
        let amperes = limit.filter(|_| loaded).map_or(0.0, |l| (magnitude(here.current) / volts * amplitude + standing.abs()) / l);
        slope.max(amperes) - 1.0
    };
    // Bracket around the frequency that the slew rate alone gives.
    let plain = rate / amplitude / solution.model.scale.1;
    let (mut low, mut high) = (plain, plain);
    for _ in 0..200 {
        if excess(low) <= 0.0 {
            break;
        }
        low /= 2.0;
    }
    if excess(low) > 0.0 {
        return Outcome::DoesNotApply("the output current exceeds the limit at any frequency");
    }
    for _ in 0..200 {
        if excess(high) >= 0.0 {
            break;
        }
        high *= 2.0;
    }
    Outcome::Value(solution.hertz(if high > low { search::root(low, high, excess) } else { low }))
}

/// The output envelope: the largest clean peak at the load against frequency, of all amplifiers the least.
pub fn envelope(solution: &Solution<'_>, from: f64, to: f64, points: usize) -> Vec<EnvelopePoint> {
    let bounds: Vec<_> = (0..solution.amplifiers())
        .map(|a| {
            let mut standing = drives(solution)[a];
            (standing.vp, standing.ip, standing.phase) = (0.0, 0.0, (1.0, 0.0));
            (a, standing, rails(solution, a).ok(), solution.part_of(a, PartFigure::CurrentLimit), slew_rate(solution, a))
        })
        .collect();
    super::response::frequencies(from, to, points)
        .map(|frequency| {
            let gain = magnitude(solution.transfer(0, solution.scaled(frequency)));
            let mut point = EnvelopePoint { frequency, rails: None, current: None, slew: None };
            let mut lower = |slot: fn(&mut EnvelopePoint) -> &mut Option<f64>, bound: Option<f64>| {
                if let Some(b) = bound.filter(|b| b.is_finite()) {
                    let slot = slot(&mut point);
                    *slot = Some(slot.map_or(b, |s: f64| s.min(b)));
                }
            };
            for (a, standing, rails, limit, rate) in &bounds {
                let here = pin(solution, *a, 0, frequency);
                let clean = rails.as_ref().and_then(|r| largest(r, &mut standing.clone(), &here));
                lower(|p| &mut p.rails, clean.map(|peak| peak * gain));
                lower(|p| &mut p.current, limit.map(|l| (l - standing.i0.abs()).max(0.0) / magnitude(here.current) * gain));
                lower(|p| &mut p.slew, rate.is_finite().then(|| rate / (TAU * frequency * magnitude(here.behind)) * gain));
            }
            point
        })
        .collect()
}

/// The source amplitude at which the clip margin is spent, or at which the current leaves what the headroom tables state.
fn largest(rails: &Rails<'_>, drive: &mut Drive, here: &Pin) -> Option<f64> {
    let mut room = |peak: f64| {
        drive.set_alternating(here, peak);
        rails.margin(drive, Fineness::Plot).unwrap_or(-1.0)
    };
    let still = room(0.0);
    if still <= 0.0 {
        return Some(0.0);
    }
    // No headroom at all would allow this much; less is allowed.
    let (mut low, mut high) = (0.0, (rails.high - rails.low) / magnitude(here.voltage));
    if !high.is_finite() {
        return None;
    }
    for _ in 0..24 {
        let middle = f64::midpoint(low, high);
        if room(middle) > 0.0 { low = middle } else { high = middle }
    }
    Some(low)
}
