//! The stage while every amplifier stays in one piece: `ξ' = A·ξ`, what must hold for that, and exact steps.
//!
//! # Formula
//! `ξ` holds the states and behind them `1`, the moving input's value and slope, its sine and cosine, so that steps, ramps and sines
//! are inside the matrix. A step is `ξ + E·ξ` with `E = exp(A·h) − 1`: a series where `‖A‖·h` is small, from there `E₂ₕ = 2E + E²`.
//! Kept as the difference from one, slow modes keep their digits beside fast ones.
//!
//! # Source
//! Scaling and squaring: C. Moler, C. Van Loan, "Nineteen dubious ways to compute the exponential of a matrix", SIAM Review 45 (2003),
//! from memory; on the difference from one: derived here.

use alloc::{rc::Rc, vec, vec::Vec};
use core::cell::RefCell;

use super::{
    equations::{Passive, SOURCES},
    matrix::{Matrix, add, dot},
    pieces::{Limits, Piece, Pin, Slew},
};
use crate::solution::Solution;

/// Terms of the series; with `‖A‖·h` up to a sixteenth the rest is below the last bit.
const TERMS: u8 = 10;
const SMALL: f64 = 0.0625;

/// A stage in the time domain.
#[derive(Debug)]
pub struct Equations {
    /// The network without the amplifiers.
    pub passive: Passive,
    /// By amplifier.
    pub limits: Vec<Limits>,
    /// Nodes of each amplifier: plus, minus, pin.
    terminals: Vec<[usize; 3]>,
    /// Where the output is taken.
    load: usize,
    /// By input: what stands still.
    still: Vec<f64>,
    /// By input: what the moving drive puts on it.
    moving: Vec<f64>,
    /// Angular frequency of the sine in it.
    omega: f64,
    /// Where each amplifier's states begin.
    begins: Vec<usize>,
    /// How many states.
    pub states: usize,
    cores: RefCell<Vec<Rc<Core>>>,
}

/// What a constraint's end does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Switch {
    /// Which amplifier.
    pub amplifier: usize,
    /// What it becomes.
    pub to: Piece,
}

/// What must stay above zero for the pieces to hold, in V.
#[derive(Clone, Debug)]
pub struct Constraint {
    /// Its value by the states.
    pub row: Vec<f64>,
    /// Its rate of change.
    pub rate: Vec<f64>,
    /// What follows.
    pub switch: Switch,
}

/// One linear piece of the whole stage.
#[derive(Debug)]
pub struct Core {
    /// What every amplifier is in.
    pub pieces: Vec<Piece>,
    /// The matrix.
    pub matrix: Matrix,
    /// What must hold.
    pub constraints: Vec<Constraint>,
    /// The output.
    pub output: Vec<f64>,
    /// By amplifier: current out of its pin.
    pub currents: Vec<Vec<f64>>,
    /// By amplifier: voltage of its pin.
    pub pins: Vec<Vec<f64>>,
    /// Step `2^level` of the time unit that the series reaches.
    pub least: i32,
    unit: f64,
    ladder: RefCell<Vec<Rc<[f64]>>>,
}

impl Equations {
    /// The equations of a build for one moving drive. `omega` is the sine's angular frequency, if there is one.
    pub fn of(solution: &Solution<'_>, drive: usize, omega: f64) -> Option<Self> {
        let model = solution.model;
        let passive = Passive::of(solution)?;
        let limits: Vec<Limits> = (0..solution.amplifiers()).map(|a| Limits::of(solution, a)).collect::<Option<_>>()?;
        let node = |n: crate::network::Node| passive.node[usize::from(n.0)];
        let terminals = model.network.amplifiers.iter().map(|a| [node(a.plus), node(a.minus), node(a.pin)]).collect();
        let mut still = vec![0.0; model.network.inputs.len()];
        for level in super::super::swing::levels(solution).filter(|l| l.drive != drive) {
            add(&mut still, &model.drives[level.drive], level.dc);
        }
        let mut states = passive.dynamic;
        let begins = limits
            .iter()
            .map(|l| {
                states += 1 + l.poles.len();
                states - 1 - l.poles.len()
            })
            .collect();
        let load = node(model.network.load);
        let moving = model.drives[drive].clone();
        Some(Self { passive, limits, terminals, load, still, moving, omega, begins, states, cores: RefCell::default() })
    }

    /// Width of `ξ`.
    pub fn width(&self) -> usize {
        self.states + SOURCES
    }

    /// The stage in these pieces, made once; nothing where the network has no solution there.
    pub fn core(&self, pieces: &[Piece], unit: f64) -> Option<Rc<Core>> {
        if let Some(core) = self.cores.borrow().iter().find(|c| c.pieces == pieces) {
            return Some(core.clone());
        }
        let core = Rc::new(self.build(pieces, unit)?);
        self.cores.borrow_mut().push(core.clone());
        Some(core)
    }

    fn constant(&self, value: f64) -> Vec<f64> {
        let mut row = vec![0.0; self.width()];
        row[self.states] = value;
        row
    }

    fn build(&self, pieces: &[Piece], unit: f64) -> Option<Core> {
        let (passive, width) = (&self.passive, self.width());
        let (dynamic, free) = (passive.dynamic, passive.algebraic);
        // Inputs by ξ.
        let inputs = self.still.len();
        let mut input = Matrix::zero(inputs.max(1), width);
        for i in 0..inputs {
            *input.at(i, self.states) = self.still[i];
            *input.at(i, self.states + 1) = self.moving[i];
            *input.at(i, self.states + 3) = self.moving[i];
        }
        // Tree branches' voltages, with what the inputs add; node voltages without what no capacitor holds.
        let mut branch = Matrix::zero(dynamic, width);
        for i in 0..dynamic {
            *branch.at(i, i) = 1.0;
            for (j, jump) in passive.jump.row(i).iter().enumerate() {
                add(branch.row_mut(i), input.row(j), -jump);
            }
        }
        let nodes = passive.tree.rows();
        let mut volts = passive.held.times(&input);
        for n in 0..nodes {
            for i in 0..dynamic {
                add(volts.row_mut(n), branch.row(i), passive.tree.row(n)[i]);
            }
        }
        let sources: Vec<Vec<f64>> = (0..self.limits.len()).map(|a| self.source(a)).collect();
        // Unknown: what no capacitor holds, and the pins' currents.
        let size = free + self.limits.len();
        let mut matrix = Matrix::zero(size, size);
        let mut right = Matrix::zero(size, width);
        for i in 0..free {
            for j in 0..free {
                *matrix.at(i, j) = passive.projected(dynamic + i, dynamic + j);
            }
            let out = passive.current_into_branch(dynamic + i, &volts);
            add(right.row_mut(i), &out, -1.0);
            self.inject(dynamic + i, &input, right.row_mut(i));
            for (a, terminals) in self.terminals.iter().enumerate() {
                *matrix.at(i, free + a) = -passive.tree.row(terminals[2])[dynamic + i];
            }
        }
        for (a, (limits, piece)) in self.limits.iter().zip(pieces).enumerate() {
            let (row, pin) = (free + a, self.terminals[a][2]);
            let (volt, ohms, target) = match piece.pin {
                Pin::Free => (1.0, limits.resistance, sources[a].clone()),
                Pin::High => (1.0, limits.rows[piece.row].high.1, self.constant(limits.rows[piece.row].high.0)),
                Pin::Low => (1.0, limits.rows[piece.row].low.1, self.constant(limits.rows[piece.row].low.0)),
                Pin::Source => (0.0, 1.0, self.constant(limits.current?)),
                Pin::Sink => (0.0, 1.0, self.constant(-limits.current?)),
            };
            for j in 0..free {
                *matrix.at(row, j) = volt * passive.tree.row(pin)[dynamic + j];
            }
            *matrix.at(row, row) += ohms;
            add(right.row_mut(row), &target, 1.0);
            add(right.row_mut(row), volts.row(pin), -volt);
        }
        if !matrix.solve(&mut right) {
            return None;
        }
        for n in 0..nodes {
            for i in 0..free {
                let share = passive.tree.row(n)[dynamic + i];
                add(volts.row_mut(n), right.row(i), share);
            }
        }
        let currents: Vec<Vec<f64>> = (0..self.limits.len()).map(|a| right.row(free + a).to_vec()).collect();
        // The capacitors.
        let mut slopes = Matrix::zero(dynamic, width);
        for i in 0..dynamic {
            let out = passive.current_into_branch(i, &volts);
            add(slopes.row_mut(i), &out, -1.0);
            self.inject(i, &input, slopes.row_mut(i));
            for (current, terminals) in currents.iter().zip(&self.terminals) {
                add(slopes.row_mut(i), current, passive.tree.row(terminals[2])[i]);
            }
        }
        if dynamic > 0 && !passive.capacitance.clone().solve(&mut slopes) {
            return None;
        }
        let mut matrix = Matrix::zero(width, width);
        for i in 0..dynamic {
            matrix.row_mut(i).copy_from_slice(slopes.row(i));
        }
        let mut constraints = Vec::new();
        let mut pins = Vec::new();
        for (a, piece) in pieces.iter().enumerate() {
            let [plus, minus, pin] = self.terminals[a];
            let mut input = volts.row(plus).to_vec();
            add(&mut input, volts.row(minus), -1.0);
            let at = Pinned { volts: volts.row(pin), current: &currents[a], source: &sources[a], input: &input };
            self.amplifier(a, *piece, &at, &mut matrix, &mut constraints);
            pins.push(volts.row(pin).to_vec());
        }
        let s = self.states;
        *matrix.at(s + 1, s + 2) = 1.0;
        *matrix.at(s + 3, s + 4) = self.omega;
        *matrix.at(s + 4, s + 3) = -self.omega;
        for constraint in &mut constraints {
            let mut rate = vec![0.0; width];
            for (i, &share) in constraint.row.iter().enumerate().filter(|(_, v)| v.abs() > 0.0) {
                add(&mut rate, matrix.row(i), share);
            }
            constraint.rate = rate;
        }
        let norm = (0..s).map(|i| matrix.row(i)[..s].iter().map(|v| v.abs()).sum()).fold(self.omega, f64::max);
        let finite = matrix.values.iter().chain(constraints.iter().flat_map(|c| &c.row)).all(|v| v.is_finite());
        if !(finite && norm.is_finite() && unit > 0.0 && unit.is_finite()) {
            return None;
        }
        // `norm · unit · 2^least ≤ SMALL`.
        let least = libm::ilogb(SMALL / (norm * unit).max(1e-200));
        Some(Core {
            pieces: pieces.to_vec(),
            matrix,
            constraints,
            output: volts.row(self.load).to_vec(),
            currents,
            pins,
            least,
            unit,
            ladder: RefCell::default(),
        })
    }

    fn inject(&self, branch: usize, input: &Matrix, row: &mut [f64]) {
        for n in 0..self.passive.injected.rows() {
            let share = self.passive.tree.row(n)[branch];
            for (i, &current) in self.passive.injected.row(n).iter().enumerate() {
                if (share * current).abs() > 0.0 {
                    add(row, input.row(i), share * current);
                }
            }
        }
    }

    /// The controlled source behind the output resistance, by `ξ`.
    fn source(&self, amplifier: usize) -> Vec<f64> {
        let mut row = vec![0.0; self.width()];
        row[self.begins[amplifier]] = 1.0;
        for (i, (pole, zero)) in self.limits[amplifier].poles.iter().enumerate() {
            // (1 + s/ωz)/(1 + s/ωp) is the state plus ωp/ωz of what it still lacks.
            let share = zero.map_or(0.0, |z| pole / z);
            row.iter_mut().for_each(|v| *v *= share);
            row[self.begins[amplifier] + 1 + i] += 1.0 - share;
        }
        row
    }

    /// An amplifier's own rows of the matrix and its constraints.
    fn amplifier(&self, a: usize, piece: Piece, at: &Pinned<'_>, matrix: &mut Matrix, constraints: &mut Vec<Constraint>) {
        let (limits, begin, width) = (&self.limits[a], self.begins[a], self.width());
        let sum = |parts: &[(&[f64], f64)], constant: f64| {
            let mut row = self.constant(constant);
            for (part, factor) in parts {
                add(&mut row, part, *factor);
            }
            row
        };
        let ohms = limits.resistance;
        let rails = limits.rows.get(piece.row);
        let excess = sum(&[(at.source, 1.0), (at.current, -ohms), (at.volts, -1.0)], 0.0);
        let hold = if piece.pin == Pin::Free { 0.0 } else { limits.hold };
        // The integrator.
        let mut rate = vec![0.0; width];
        match piece.slew {
            Slew::Linear => add(&mut rate, at.input, limits.omega),
            Slew::Rise => rate[self.states] += limits.rise.unwrap_or(0.0),
            Slew::Fall => rate[self.states] -= limits.fall.unwrap_or(0.0),
        }
        rate[begin] -= limits.dominant;
        add(&mut rate, &excess, -hold);
        matrix.row_mut(begin).copy_from_slice(&rate);
        let mut before = vec![0.0; width];
        before[begin] = 1.0;
        for (i, (pole, zero)) in limits.poles.iter().enumerate() {
            let row = begin + 1 + i;
            let mut rate = vec![0.0; width];
            add(&mut rate, &before, *pole);
            rate[row] -= pole;
            add(&mut rate, &excess, -hold);
            matrix.row_mut(row).copy_from_slice(&rate);
            let share = zero.map_or(0.0, |z| pole / z);
            before.iter_mut().for_each(|v| *v *= share);
            before[row] += 1.0 - share;
        }
        // What must hold.
        let mut must = |row: Vec<f64>, to: Piece| {
            constraints.push(Constraint { row, rate: Vec::new(), switch: Switch { amplifier: a, to } });
        };
        let slews = |slew| Piece { slew, ..piece };
        let reach = |rate: Option<f64>| rate.map(|r| r / limits.omega);
        match piece.slew {
            Slew::Linear => {
                if let Some(most) = reach(limits.rise) {
                    must(sum(&[(at.input, -1.0)], most), slews(Slew::Rise));
                }
                if let Some(most) = reach(limits.fall) {
                    must(sum(&[(at.input, 1.0)], most), slews(Slew::Fall));
                }
            }
            Slew::Rise => must(sum(&[(at.input, 1.0)], -reach(limits.rise).unwrap_or(0.0)), slews(Slew::Linear)),
            Slew::Fall => must(sum(&[(at.input, -1.0)], -reach(limits.fall).unwrap_or(0.0)), slews(Slew::Linear)),
        }
        let pinned = |pin| Piece { pin, ..piece };
        let beyond_high = |limits: &Limits| Piece { pin: Pin::Source, row: limits.row_of(limits.current.unwrap_or(0.0)), ..piece };
        let beyond_low = |limits: &Limits| Piece { pin: Pin::Sink, row: limits.row_of(-limits.current.unwrap_or(0.0)), ..piece };
        let within_rail = |line: (f64, f64), sign: f64| sum(&[(at.volts, -sign), (at.current, -sign * line.1)], sign * line.0);
        let wants_more = |sign: f64| sum(&[(&excess, sign)], 0.0);
        let moves = !matches!(piece.pin, Pin::Source | Pin::Sink);
        match piece.pin {
            Pin::Free => {
                if let Some(r) = rails {
                    must(within_rail(r.high, 1.0), pinned(Pin::High));
                    must(within_rail(r.low, -1.0), pinned(Pin::Low));
                }
            }
            Pin::High => must(wants_more(1.0), pinned(Pin::Free)),
            Pin::Low => must(wants_more(-1.0), pinned(Pin::Free)),
            Pin::Source => {
                must(wants_more(1.0), pinned(Pin::Free));
                if let Some(r) = rails {
                    must(within_rail(r.high, 1.0), pinned(Pin::High));
                }
            }
            Pin::Sink => {
                must(wants_more(-1.0), pinned(Pin::Free));
                if let Some(r) = rails {
                    must(within_rail(r.low, -1.0), pinned(Pin::Low));
                }
            }
        }
        if moves {
            if let Some(most) = limits.current {
                must(sum(&[(at.current, -ohms)], ohms * most), beyond_high(limits));
                must(sum(&[(at.current, ohms)], ohms * most), beyond_low(limits));
            }
            if piece.row + 1 < limits.rows.len() {
                must(sum(&[(at.current, -ohms)], ohms * limits.rows[piece.row].until), Piece { row: piece.row + 1, ..piece });
            }
            if piece.row > 0 && !limits.rows.is_empty() {
                must(sum(&[(at.current, ohms)], -ohms * limits.rows[piece.row - 1].until), Piece { row: piece.row - 1, ..piece });
            }
        }
    }
}

/// An amplifier's terminals by `ξ`.
struct Pinned<'a> {
    volts: &'a [f64],
    current: &'a [f64],
    source: &'a [f64],
    input: &'a [f64],
}

impl Core {
    /// Length of a step of the ladder, s.
    pub fn length(&self, level: i32) -> f64 {
        libm::ldexp(self.unit, level)
    }

    /// `exp(A·h) − 1` for a step of the ladder, from `least` up.
    pub fn step(&self, level: i32) -> Rc<[f64]> {
        let index = usize::try_from(level - self.least).unwrap_or(0);
        let mut ladder = self.ladder.borrow_mut();
        let n = self.matrix.columns;
        while ladder.len() <= index {
            let next: Vec<f64> = match ladder.last() {
                None => {
                    let h = self.length(self.least);
                    // Horner: A·h·(1 + A·h/2·(1 + A·h/3·(…))).
                    let mut sum = Matrix::zero(n, n);
                    for term in (1..=TERMS).rev() {
                        let factor = h / f64::from(term);
                        for i in 0..n {
                            *sum.at(i, i) += 1.0;
                        }
                        sum = self.matrix.times(&sum);
                        sum.values.iter_mut().for_each(|v| *v *= factor);
                    }
                    sum.values
                }
                Some(last) => {
                    let e = Matrix { columns: n, values: last.to_vec() };
                    let mut square = e.times(&e);
                    add(&mut square.values, last, 2.0);
                    square.values
                }
            };
            ladder.push(next.into());
        }
        ladder[index].clone()
    }

    /// A whole step.
    pub fn advance(&self, level: i32, from: &[f64], to: &mut Vec<f64>) {
        let step = self.step(level);
        to.clear();
        to.extend(from.iter().zip(step.chunks_exact(from.len())).map(|(x, row)| x + dot(row, from)));
    }

    /// The terms of the series for a step of at most the least length: what `θ^j` is multiplied by, `θ` from 0 to 1 over `length`.
    pub fn series(&self, from: &[f64], length: f64) -> Vec<Vec<f64>> {
        let mut terms = vec![from.to_vec()];
        for j in 1..=TERMS {
            let last = &terms[terms.len() - 1];
            let factor = length / f64::from(j);
            terms.push((0..from.len()).map(|i| factor * dot(self.matrix.row(i), last)).collect());
        }
        terms
    }
}

/// The series at `θ`.
pub fn at(terms: &[Vec<f64>], theta: f64) -> Vec<f64> {
    let mut sum = vec![0.0; terms[0].len()];
    for term in terms.iter().rev() {
        for (s, t) in sum.iter_mut().zip(term) {
            *s = *s * theta + t;
        }
    }
    sum
}
