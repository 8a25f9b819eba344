//! Through time from event to event.
//!
//! # Formula
//! Steps are those of the ladder in [`super::core`]: short after an event and longer with the time since then, so that every mode is
//! looked at on its own scale. A step at whose end a constraint is broken, or may have been broken and mended on the way, is halved
//! down to the ladder's foot, where the series gives the moment. Right-hand side, pin voltages and currents are continuous from piece
//! to piece, so at an event only the piece changes. At a jump of the input the path from the old value to the new one is walked
//! through the pieces in the same way.
//!
//! # Source
//! The walk at a jump: J. Katzenelson, "An algorithm for solving nonlinear resistor networks", Bell System Technical Journal 44
//! (1965), from memory. The rest: derived here.

use alloc::{rc::Rc, vec, vec::Vec};

use super::{
    core::{Core, Equations, Switch, at},
    equations::SOURCES,
    matrix::{Matrix, dot},
    pieces::{AT_REST, Piece, Pin, Slew},
};

/// Steps and events after which a run gives up.
const MOST_STEPS: u32 = 400_000;
const MOST_EVENTS: u32 = 20_000;
/// Events at one moment.
const MOST_AT_ONCE: u32 = 100;
/// How much closer to zero a watch is read than a constraint.
const SHARPER: f64 = 1e3;
/// Doublings of the step when looking for the operating point.
const DOUBLINGS: i32 = 80;

/// Why a run ends early.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stopped {
    /// More steps or events than it may take.
    Bound,
    /// The network has no solution in some piece: nothing holds a node's voltage.
    Loose,
    /// Values leave the range of numbers.
    Unbounded,
}

/// What a run has been through.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Passed {
    /// An input stage at its slew limit.
    pub slew: bool,
    /// A pin at a rail.
    pub rail: bool,
    /// A pin at its current limit.
    pub current: bool,
    /// A pin at the positive rail at a current beyond the headroom table.
    pub beyond_high: bool,
    /// At the negative one.
    pub beyond_low: bool,
}

impl Passed {
    /// Whether nothing limited it.
    pub const fn is_linear(self) -> bool {
        !(self.slew || self.rail || self.current)
    }
}

/// A level of some quantity whose crossings are noted.
#[derive(Clone, Debug)]
pub struct Watch {
    /// The quantity by `ξ`; the level taken off.
    pub row: Vec<f64>,
    /// Which side it is on.
    pub above: bool,
}

/// A stage under way.
#[derive(Debug)]
pub struct Run<'e> {
    /// The stage.
    pub equations: &'e Equations,
    /// The linear piece that it is in.
    pub core: Rc<Core>,
    /// States and sources.
    pub state: Vec<f64>,
    /// s.
    pub time: f64,
    /// What it has been through.
    pub passed: Passed,
    /// Crossings to note.
    pub watches: Vec<Watch>,
    /// Longest step, s.
    pub longest: f64,
    /// Resonances: longest step, and how long after an event they ring, s.
    pub rings: Vec<(f64, f64)>,
    /// Whether amplifiers have limits at all.
    pub limited: bool,
    unit: f64,
    since: f64,
    steps: u32,
    events: u32,
    tolerance: f64,
    spare: Vec<f64>,
}

/// What a run tells on its way.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Mark {
    /// A moment reached; where the piece changes, once in either.
    Point,
    /// A watch changed sides.
    Crossed(usize),
}

/// What a piece of a step came to.
enum Reached {
    /// Its end.
    End(Vec<f64>),
    /// An event before that: when, the state, which constraint or (behind those) which watch.
    Event(f64, Vec<f64>, usize),
}

/// What moves at the input: `value + slope·t` and a sine given by its value and quadrature.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Moving {
    /// Value now.
    pub value: f64,
    /// Its slope, 1/s.
    pub slope: f64,
    /// The sine's value now.
    pub sine: f64,
    /// The sine a quarter of a period later.
    pub cosine: f64,
}

impl<'e> Run<'e> {
    /// Starts with nothing applied and every state at zero. `unit` is the step to which the ladder is aligned, s.
    pub fn new(equations: &'e Equations, unit: f64, limited: bool) -> Result<Self, Stopped> {
        let pieces: Vec<Piece> = equations.limits.iter().map(|l| Piece { row: l.row_of(0.0), ..AT_REST }).collect();
        let core = equations.core(&pieces, unit).ok_or(Stopped::Loose)?;
        let mut state = vec![0.0; equations.width()];
        state[equations.states] = 1.0;
        Ok(Self {
            equations,
            core,
            state,
            time: 0.0,
            passed: Passed::default(),
            watches: Vec::new(),
            longest: f64::INFINITY,
            rings: Vec::new(),
            limited,
            unit,
            since: 0.0,
            steps: 0,
            events: 0,
            tolerance: 1e-12,
            spare: Vec::new(),
        })
    }

    /// The output now.
    pub fn output(&self) -> f64 {
        dot(&self.core.output, &self.state)
    }

    /// Sets what rounding may make of a constraint, by the voltages at hand.
    fn set_tolerance(&mut self) {
        let rails = self.equations.limits.iter().flat_map(|l| &l.rows).map(|r| r.high.0.abs().max(r.low.0.abs())).fold(0.0, f64::max);
        let states = self.state[..self.equations.states].iter().fold(0.0, |m: f64, v| m.max(v.abs()));
        self.tolerance = 1e-13 * states.max(rails).max(1e-6);
    }

    /// Lets the input jump, through whatever pieces lie between.
    pub fn jump(&mut self, to: Moving) -> Result<(), Stopped> {
        let s = self.equations.states;
        let target = [to.value, to.slope, to.sine, to.cosine];
        self.since = 0.0;
        for _ in 0..MOST_AT_ONCE {
            let mut end = self.state.clone();
            end[s + 1..s + SOURCES].copy_from_slice(&target);
            let broken = self.broken_between(&end);
            let Some((share, index)) = broken else {
                self.state = end;
                self.set_tolerance();
                return Ok(());
            };
            for (now, then) in self.state[s + 1..].iter_mut().zip(&end[s + 1..]) {
                *now += share * (then - *now);
            }
            let switch = self.core.constraints[index].switch;
            self.switch(switch)?;
        }
        Err(Stopped::Bound)
    }

    /// The first constraint that breaks on a straight way to `end`.
    fn broken_between(&self, end: &[f64]) -> Option<(f64, usize)> {
        if !self.limited {
            return None;
        }
        let mut first: Option<(f64, usize)> = None;
        for (index, constraint) in self.core.constraints.iter().enumerate() {
            let (here, there) = (dot(&constraint.row, &self.state), dot(&constraint.row, end));
            if there < -self.tolerance && there < here {
                let share = (here / (here - there)).clamp(0.0, 1.0);
                if first.is_none_or(|(s, _)| share < s) {
                    first = Some((share, index));
                }
            }
        }
        first
    }

    fn switch(&mut self, switch: Switch) -> Result<(), Stopped> {
        let mut pieces = self.core.pieces.clone();
        pieces[switch.amplifier] = switch.to;
        self.core = self.equations.core(&pieces, self.unit).ok_or(Stopped::Loose)?;
        self.note();
        Ok(())
    }

    fn note(&mut self) {
        for (a, piece) in self.core.pieces.iter().enumerate() {
            self.passed.slew |= piece.slew != Slew::Linear;
            self.passed.current |= matches!(piece.pin, Pin::Source | Pin::Sink);
            let current = || dot(&self.core.currents[a], &self.state);
            let stated = self.equations.limits[a].stated;
            match piece.pin {
                Pin::High => {
                    self.passed.rail = true;
                    self.passed.beyond_high |= current() > stated.1 * (1.0 + 1e-9);
                }
                Pin::Low => {
                    self.passed.rail = true;
                    self.passed.beyond_low |= current() < stated.0 * (1.0 + 1e-9);
                }
                Pin::Free | Pin::Source | Pin::Sink => {}
            }
        }
    }

    /// The operating point with this input standing still: where the pieces' own fixed point is consistent, else after a long time.
    pub fn settle(&mut self, input: f64) -> Result<(), Stopped> {
        let moving = Moving { value: input, ..Moving::default() };
        let s = self.equations.states;
        self.state[s + 1..s + SOURCES].copy_from_slice(&[input, 0.0, 0.0, 0.0]);
        if let Some(point) = self.fixed_point() {
            let states = point.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
            let inside =
                self.core.constraints.iter().all(|c| dot(&c.row[..s], &point) + dot(&c.row[s..], &self.state[s..]) >= -1e-12 * states);
            if inside || !self.limited {
                self.state[..s].copy_from_slice(&point);
                self.set_tolerance();
                return Ok(());
            }
        }
        // From nothing: the input comes on, and time runs in steps that double.
        self.state[s + 1..].fill(0.0);
        self.set_tolerance();
        self.walk_on_supplies()?;
        self.jump(moving)?;
        let mut level = self.core.least;
        let start = level;
        while level < start + DOUBLINGS {
            self.span(self.core.length(level), &mut |_, _| {})?;
            level += 1;
            if let Some(point) = self.fixed_point() {
                let far = point.iter().zip(&self.state).map(|(p, x)| (p - x).abs()).fold(0.0, f64::max);
                let size = point.iter().fold(1e-9, |m: f64, v| m.max(v.abs()));
                if far <= 1e-9 * size {
                    self.state[..s].copy_from_slice(&point);
                    break;
                }
            }
        }
        self.time = 0.0;
        self.since = 0.0;
        (self.steps, self.events) = (0, 0);
        self.passed = Passed::default();
        self.note();
        self.set_tolerance();
        Ok(())
    }

    /// After states were set: the pieces in which they are.
    pub fn find_pieces(&mut self) -> Result<(), Stopped> {
        self.since = 0.0;
        self.walk_on_supplies()
    }

    /// With all at zero the pins may already be beyond a rail (a single supply): finds the pieces for that.
    fn walk_on_supplies(&mut self) -> Result<(), Stopped> {
        for _ in 0..MOST_AT_ONCE {
            let worst = self.core.constraints.iter().map(|c| dot(&c.row, &self.state)).enumerate().min_by(|a, b| a.1.total_cmp(&b.1));
            match worst {
                Some((index, value)) if value < -self.tolerance => self.switch(self.core.constraints[index].switch)?,
                _ => return Ok(()),
            }
        }
        Err(Stopped::Bound)
    }

    /// Where the present piece would come to rest.
    pub fn fixed_point(&self) -> Option<Vec<f64>> {
        let s = self.equations.states;
        let mut matrix = Matrix::zero(s, s);
        let mut right = Matrix::zero(s, 1);
        for i in 0..s {
            matrix.row_mut(i).copy_from_slice(&self.core.matrix.row(i)[..s]);
            *right.at(i, 0) = -dot(&self.core.matrix.row(i)[s..], &self.state[s..]);
        }
        matrix.solve(&mut right).then_some(right.values).filter(|p| p.iter().all(|v| v.is_finite()))
    }

    /// Where a state would be after a while, if the piece stays what it is.
    pub fn later(&self, from: &[f64], length: f64) -> Vec<f64> {
        let (mut state, mut left, mut next) = (from.to_vec(), length, Vec::new());
        let foot = self.core.length(self.core.least);
        while left >= foot {
            let mut level = libm::ilogb(left / self.unit);
            if self.core.length(level) > left {
                level -= 1;
            }
            let level = level.max(self.core.least);
            self.core.advance(level, &state, &mut next);
            core::mem::swap(&mut state, &mut next);
            left -= self.core.length(level);
        }
        if left > 0.0 { at(&self.core.series(&state, left), 1.0) } else { state }
    }

    /// Lets time pass, and tells what it comes by.
    pub fn span(&mut self, length: f64, seen: &mut dyn FnMut(&Self, Mark)) -> Result<(), Stopped> {
        let mut left = length;
        let mut at_once = 0;
        while left > 0.0 {
            self.steps += 1;
            if self.steps > MOST_STEPS || self.events > MOST_EVENTS || at_once > MOST_AT_ONCE {
                return Err(Stopped::Bound);
            }
            let foot = self.core.length(self.core.least);
            if left < foot {
                let state = self.state.clone();
                match self.foot(&state, left) {
                    Reached::End(end) => {
                        self.pass(left, end)?;
                        seen(self, Mark::Point);
                        break;
                    }
                    Reached::Event(after, state, index) => {
                        left -= after;
                        at_once = if after > 0.0 { 0 } else { at_once + 1 };
                        self.event(after, state, index, seen)?;
                    }
                }
                continue;
            }
            let ringing = self.rings.iter().filter(|r| self.since < r.1).map(|r| r.0).fold(self.longest, f64::min);
            let wanted = left.min(foot.max(0.5 * self.since)).min(ringing.max(foot));
            // The longest step of the ladder within that.
            let mut level = libm::ilogb(wanted / self.unit);
            if self.core.length(level) > wanted {
                level -= 1;
            }
            let level = level.max(self.core.least);
            let state = core::mem::take(&mut self.state);
            let reached = self.piece(level, &state);
            match reached {
                Reached::End(end) => {
                    self.spare = state;
                    let step = self.core.length(level);
                    left -= step;
                    at_once = 0;
                    self.pass(step, end)?;
                    seen(self, Mark::Point);
                }
                Reached::Event(after, end, index) => {
                    left -= after;
                    at_once = if after > 0.0 { 0 } else { at_once + 1 };
                    self.event(after, end, index, seen)?;
                }
            }
        }
        Ok(())
    }

    fn pass(&mut self, length: f64, state: Vec<f64>) -> Result<(), Stopped> {
        self.time += length;
        self.since += length;
        self.state = state;
        if dot(&self.state, &self.state) < f64::INFINITY { Ok(()) } else { Err(Stopped::Unbounded) }
    }

    fn event(&mut self, after: f64, state: Vec<f64>, index: usize, seen: &mut dyn FnMut(&Self, Mark)) -> Result<(), Stopped> {
        self.pass(after, state)?;
        seen(self, Mark::Point);
        self.events += 1;
        match index.checked_sub(self.core.constraints.len()) {
            Some(watch) => {
                self.watches[watch].above = !self.watches[watch].above;
                seen(self, Mark::Crossed(watch));
            }
            None => {
                self.since = 0.0;
                let switch = self.core.constraints[index].switch;
                self.switch(switch)?;
                seen(self, Mark::Point);
            }
        }
        Ok(())
    }

    /// What must stay above zero, as value and rate: constraints, then watches.
    fn margins<'a>(&'a self, state: &'a [f64]) -> impl Iterator<Item = (f64, f64)> + 'a {
        let constraints = if self.limited { &self.core.constraints[..] } else { &[] };
        let watched = self.watches.iter().map(move |w| {
            // A crossing that rounding repeats is harmless: nothing but its moment is taken.
            let sign = if w.above { SHARPER } else { -SHARPER };
            let rate: f64 =
                w.row.iter().enumerate().filter(|(_, v)| v.abs() > 0.0).map(|(i, v)| v * dot(self.core.matrix.row(i), state)).sum();
            (sign * dot(&w.row, state), sign * rate)
        });
        constraints.iter().map(move |c| (dot(&c.row, state), dot(&c.rate, state))).chain(watched)
    }

    /// Whether something breaks at the end of a step, or may have on the way.
    fn suspect(&self, from: &[f64], to: &[f64], length: f64) -> bool {
        self.margins(from).zip(self.margins(to)).any(|((here, falls), (there, rises))| {
            if there < -self.tolerance {
                return true;
            }
            // The tangents' crossing lies below the dip.
            falls < 0.0 && rises > 0.0 && {
                let moment = (there - here - rises * length) / (falls - rises);
                moment > 0.0 && moment < length && here + falls * moment < -self.tolerance
            }
        })
    }

    fn piece(&mut self, level: i32, from: &[f64]) -> Reached {
        let mut end = core::mem::take(&mut self.spare);
        self.core.advance(level, from, &mut end);
        if !self.suspect(from, &end, self.core.length(level)) {
            return Reached::End(end);
        }
        if level <= self.core.least {
            return self.foot(from, self.core.length(level));
        }
        match self.piece(level - 1, from) {
            Reached::End(middle) => match self.piece(level - 1, &middle) {
                Reached::End(_) => Reached::End(end),
                Reached::Event(after, state, index) => Reached::Event(self.core.length(level - 1) + after, state, index),
            },
            event @ Reached::Event(..) => event,
        }
    }

    /// A step short enough for the series, searched for its first event.
    fn foot(&self, from: &[f64], length: f64) -> Reached {
        let terms = self.core.series(from, length);
        let end = at(&terms, 1.0);
        if !self.suspect(from, &end, length) {
            return Reached::End(end);
        }
        let offset = if self.limited { 0 } else { self.core.constraints.len() };
        // Each margin as a polynomial in θ.
        let mut by_margin: Vec<Vec<f64>> = Vec::new();
        for term in &terms {
            for (i, (value, _)) in self.margins(term).enumerate() {
                if by_margin.len() <= i {
                    by_margin.push(Vec::new());
                }
                by_margin[i].push(value);
            }
        }
        let mut first: Option<(f64, usize)> = None;
        for (index, polynomial) in by_margin.iter().enumerate() {
            let value = |theta: f64| polynomial.iter().rev().fold(0.0, |sum, c| sum * theta + c);
            let broken = |theta: f64| value(theta) < -self.tolerance;
            if broken(0.0) && broken(1.0 / 8.0) {
                first = Some((0.0, index));
                break;
            }
            let Some(eighth) = (1..=8_u8).find(|&k| broken(f64::from(k) / 8.0)) else { continue };
            let (mut low, mut high) = (f64::from(eighth - 1) / 8.0, f64::from(eighth) / 8.0);
            for _ in 0..52 {
                let middle = f64::midpoint(low, high);
                if broken(middle) { high = middle } else { low = middle }
            }
            if first.is_none_or(|(theta, _)| high < theta) {
                first = Some((high, index));
            }
        }
        match first {
            Some((theta, index)) => Reached::Event(theta * length, at(&terms, theta), index + offset),
            None => Reached::End(end),
        }
    }
}

/// Whether an amplifier is where it is meant to be.
#[must_use]
pub fn at_rest(pieces: &[Piece]) -> bool {
    pieces.iter().all(|p| p.slew == Slew::Linear && p.pin == Pin::Free)
}
