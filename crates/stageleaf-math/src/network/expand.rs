//! Determinants of the nodal matrix as polynomials in s, by expansion over the network's branches.
//!
//! # Formula
//! The nodal matrix is a sum of rank-one stamps, `Y = Σ y_e·u_e·v_eᵀ`, so by Cauchy and Binet
//! `det Y = Σ_S Π_{e∈S} y_e · det U_S · det V_S` over all sets `S` of as many elements as there are nodes. Either
//! determinant is 0, 1 or −1: `S` must be a spanning tree of the graph in which currents flow (`u`) and of the one in
//! which voltages are sensed (`v`); for a passive branch both are the same. The sum is taken branch by branch, merging all
//! partial sets that leave the nodes joined in the same way.
//!
//! Passive networks have no negative term, so nothing cancels: a coefficient is as exact as the element values,
//! however badly they are scaled. A branch carries two polynomials, its weight when left out and when taken (`R` and 1 for
//! a resistor, 1 and `sC` for a capacitor), so that a resistance of zero needs no special case.
//!
//! # Source
//! Feussner's expansion and the two-graph method: W.-K. Chen, *Applied Graph Theory*, North-Holland, chapters 2 and 4, from
//! memory. Checked against a dense nodal solution in `tests/outside/`.

use alloc::{vec, vec::Vec};

use super::MAX_NODES;

/// Something that takes part in the expansion.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Column {
    /// A passive branch between two nodes.
    Branch(u8, u8),
    /// An amplifier's output: its resistance to ground, or its controlled source from `minus − plus`.
    Amplifier {
        /// Non-inverting input.
        plus: u8,
        /// Inverting input.
        minus: u8,
        /// Output pin.
        pin: u8,
    },
}

/// Which determinant to expand.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Shape {
    /// `det Y` with the nodes in `both` joined to ground, in the rows of `rows` and the columns of `columns` struck out.
    /// One row and one column at most.
    Closed {
        /// Joined to ground in both graphs (bit set).
        both: u32,
        /// Row struck out (node, or 0).
        row: u8,
        /// Column struck out (node, or 0).
        column: u8,
    },
    /// Voltages at all nodes for a voltage at, or a current into, `source`: outcomes are split by the nodes that follow it.
    Forward {
        /// The driven node.
        source: u8,
        /// Held at zero by other ideal sources (bit set).
        held: u32,
    },
    /// The voltage at `sense` for a current into each node: outcomes are split by the nodes that reach it.
    Adjoint {
        /// Held at zero by ideal sources (bit set).
        held: u32,
        /// Where the voltage is sensed.
        sense: u8,
    },
}

/// Numeric weight of a column: polynomials in s when left out, when taken, and, for an amplifier, the controlled source's
/// weight is kept symbolic (see [`Outcome::amplified`]).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Weight<const N: usize = 1> {
    /// When left out.
    pub out: [[f64; N]; DEGREE + 1],
    /// When taken.
    pub taken: [[f64; N]; DEGREE + 1],
}

impl<const N: usize> Weight<N> {
    /// The same for every build.
    #[must_use]
    pub fn alike(weight: &Weight) -> Self {
        let spread = |of: &[[f64; 1]; DEGREE + 1]| of.map(|[w]| [w; N]);
        Self { out: spread(&weight.out), taken: spread(&weight.taken) }
    }

    /// Puts the weight of one build in its lane.
    pub fn set(&mut self, lane: usize, weight: &Weight) {
        for power in 0..=DEGREE {
            self.out[power][lane] = weight.out[power][0];
            self.taken[power][lane] = weight.taken[power][0];
        }
    }
}

/// Greatest degree of a branch's weight.
pub const DEGREE: usize = 3;

/// Which powers of s a column's weights can have: lowest and highest, left out and taken.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Powers {
    /// When left out.
    pub out: (usize, usize),
    /// When taken.
    pub taken: (usize, usize),
}

/// Where an expansion's terms end up.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Outcome {
    /// Open side's nodes that are not joined to ground (bit set); 0 for closed shapes.
    pub joined: u32,
    /// Which amplifiers' gains the terms carry as factors (bit set, in the order of the amplifiers' columns).
    pub amplified: u8,
    /// Its polynomial in the terms that [`Plan::evaluate`] ends with.
    start: usize,
    length: usize,
}

#[derive(Clone, Copy, Debug)]
struct Step {
    from: u32,
    to: u32,
    length: u16,
    column: u16,
    /// Powers of s of the factor, lowest and highest.
    powers: (u8, u8),
    which: Which,
    negative: bool,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Which {
    Out,
    Taken,
    Controlled,
}

/// A compiled expansion: a flat list of multiply-and-add steps, for any element values.
#[derive(Clone, Debug)]
pub struct Plan {
    steps: Vec<Step>,
    /// Those that the constant terms need.
    constant: Vec<Step>,
    size: usize,
    /// Where the outcomes' terms start.
    tail: usize,
    /// Where the terms end up.
    pub outcomes: Vec<Outcome>,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
struct State {
    rows: [u8; MAX_NODES],
    columns: [u8; MAX_NODES],
    amplified: u8,
}

impl Which {
    const fn powers(self, of: Powers) -> (usize, usize) {
        match self {
            Self::Out => of.out,
            Self::Taken => of.taken,
            Self::Controlled => (0, 0),
        }
    }
}

impl State {
    /// Joins nodes (bit set) to ground in both graphs.
    fn hold(&mut self, nodes: u32) {
        for node in 1..MAX_NODES {
            if nodes >> node & 1 == 1 {
                self.rows[node] = 0;
                self.columns[node] = 0;
            }
        }
    }

    /// How many rows are left.
    fn live(&self, nodes: usize) -> usize {
        (1..nodes).filter(|&n| self.rows[n] != 0).count()
    }
}

/// Joins the nodes of a column with +1 at `a` and −1 at `b`; the sign of the pivot, or `None` when they are joined already.
fn join(partition: &mut [u8; MAX_NODES], a: u8, b: u8) -> Option<bool> {
    let (a, b) = (partition[usize::from(a)], partition[usize::from(b)]);
    if a == b {
        return None;
    }
    let (high, low) = if a > b { (a, b) } else { (b, a) };
    let below = (1..high).filter(|&node| partition[usize::from(node)] == node).count();
    for member in partition.iter_mut() {
        if *member == high {
            *member = low;
        }
    }
    Some((high != a) ^ (below % 2 == 1))
}

impl Plan {
    /// Compiles the expansion of `shape` for a network of `nodes` nodes (ground included).
    #[must_use]
    pub fn compile(nodes: usize, columns: &[(Column, Powers)], shape: Shape) -> Self {
        assert!(nodes <= MAX_NODES);
        let mut start = State { rows: [0; MAX_NODES], columns: [0; MAX_NODES], amplified: 0 };
        for node in 0..nodes {
            let label = u8::try_from(node).expect("few nodes");
            start.rows[node] = label;
            start.columns[node] = label;
        }
        let mut negative = false;
        let rank = |partition: &[u8; MAX_NODES], node: u8| (1..node).filter(|&n| partition[usize::from(n)] == n).count();
        match shape {
            Shape::Closed { both, row, column } => {
                start.hold(both);
                if row != 0 || column != 0 {
                    negative = (rank(&start.rows, row) + rank(&start.columns, column)) % 2 == 1;
                    start.rows[usize::from(row)] = 0;
                    start.columns[usize::from(column)] = 0;
                }
            }
            Shape::Forward { source, held } => {
                start.hold(held);
                negative = (start.live(nodes) + 1 + rank(&start.rows, source)) % 2 == 1;
                start.rows[usize::from(source)] = 0;
            }
            Shape::Adjoint { held, sense } => {
                start.hold(held);
                negative = (start.live(nodes) + 1 + rank(&start.columns, sense)) % 2 == 1;
                start.columns[usize::from(sense)] = 0;
            }
        }
        let (rows_open, columns_open) = match shape {
            Shape::Closed { .. } => (0, 0),
            Shape::Forward { .. } => (0, 1),
            Shape::Adjoint { .. } => (1, 0),
        };

        let mut layers: Vec<Vec<State>> = vec![vec![start]];
        let mut moves: Vec<Vec<(usize, usize, Which, bool)>> = Vec::new();
        let mut amplifier = 0;
        for (index, (column, _)) in columns.iter().enumerate() {
            let mut made: Vec<State> = Vec::new();
            // Slots of `made` in the order of what they hold.
            let mut order: Vec<usize> = Vec::new();
            let mut here = Vec::new();
            let rest = &columns[index + 1..];
            for (from, state) in layers[index].iter().enumerate() {
                let mut follow = |to: State, which: Which, sign: bool| {
                    if stranded(&to.rows, nodes, rest, true) <= rows_open && stranded(&to.columns, nodes, rest, false) <= columns_open {
                        let slot = match order.binary_search_by(|&slot: &usize| made[slot].cmp(&to)) {
                            Ok(at) => order[at],
                            Err(at) => {
                                order.insert(at, made.len());
                                made.push(to);
                                made.len() - 1
                            }
                        };
                        here.push((from, slot, which, sign));
                    }
                };
                follow(*state, Which::Out, false);
                let mut try_join = |(ua, ub): (u8, u8), (va, vb): (u8, u8), which: Which, amplified: u8| {
                    let mut to = *state;
                    if let (Some(u), Some(v)) = (join(&mut to.rows, ua, ub), join(&mut to.columns, va, vb)) {
                        to.amplified |= amplified;
                        follow(to, which, u ^ v);
                    }
                };
                match *column {
                    Column::Branch(a, b) => try_join((a, b), (a, b), Which::Taken, 0),
                    Column::Amplifier { plus, minus, pin } => {
                        try_join((pin, 0), (pin, 0), Which::Taken, 0);
                        try_join((pin, 0), (minus, plus), Which::Controlled, 1 << amplifier);
                    }
                }
            }
            if matches!(column, Column::Amplifier { .. }) {
                amplifier += 1;
            }
            layers.push(made);
            moves.push(here);
        }

        // Keep what reaches an end.
        let mut alive: Vec<Vec<bool>> = layers.iter().map(|l| vec![false; l.len()]).collect();
        let last = layers.len() - 1;
        let open = |partition: &[u8; MAX_NODES]| {
            let mut seen = 0u32;
            for &member in &partition[..nodes] {
                if member != 0 {
                    seen |= 1 << member;
                }
            }
            seen.count_ones()
        };
        for (slot, state) in layers[last].iter().enumerate() {
            alive[last][slot] = open(&state.rows) == rows_open && open(&state.columns) == columns_open;
        }
        for index in (0..last).rev() {
            for &(from, to, _, _) in &moves[index] {
                if alive[index + 1][to] {
                    alive[index][from] = true;
                }
            }
        }

        let mut place: Vec<Vec<(usize, usize)>> = layers.iter().map(|l| vec![(0, 0); l.len()]).collect();
        place[0][0] = (0, 1);
        let mut size = 1;
        let mut steps = Vec::new();
        for index in 0..last {
            let mut lengths = vec![0usize; layers[index + 1].len()];
            for &(from, to, which, _) in &moves[index] {
                if alive[index][from] && alive[index + 1][to] {
                    lengths[to] = lengths[to].max(place[index][from].1 + which.powers(columns[index].1).1);
                }
            }
            for (to, &length) in lengths.iter().enumerate() {
                if length > 0 {
                    place[index + 1][to] = (size, length);
                    size += length;
                }
            }
            for &(from, to, which, sign) in &moves[index] {
                if alive[index][from] && alive[index + 1][to] {
                    let narrow = |n: usize| u32::try_from(n).expect("small plan");
                    let (low, high) = which.powers(columns[index].1);
                    let small = |n: usize| u8::try_from(n).expect("small degree");
                    steps.push(Step {
                        powers: (small(low), small(high)),
                        from: narrow(place[index][from].0),
                        to: narrow(place[index + 1][to].0),
                        length: u16::try_from(place[index][from].1).expect("small degree"),
                        column: u16::try_from(index).expect("few columns"),
                        which,
                        negative: sign ^ (negative && index == 0),
                    });
                }
            }
        }
        let ends = (0..layers[last].len()).filter(|&slot| alive[last][slot]);
        let tail = ends.map(|slot| place[last][slot].0).min().unwrap_or(size);
        let outcomes = layers[last]
            .iter()
            .enumerate()
            .filter(|&(slot, _)| alive[last][slot])
            .map(|(slot, state)| {
                let side = if rows_open == 1 { &state.rows } else { &state.columns };
                let joined = (0..nodes).filter(|&n| side[n] != 0).fold(0u32, |bits, n| bits | 1 << n);
                let (start, length) = place[last][slot];
                let start = start - tail;
                Outcome { joined, amplified: state.amplified, start, length }
            })
            .collect();
        let constant = constant(&steps, tail);
        Self { steps, constant, size, tail, outcomes }
    }

    /// Carries out the expansion for `N` builds side by side. `scratch` is reused between calls; its last part holds the outcomes' terms
    /// (see [`Plan::ends`]).
    ///
    /// Every build goes through the same additions in the same order, whatever `N` is, so it has the same bits.
    pub fn evaluate<const N: usize>(&self, weights: &[Weight<N>], scratch: &mut Vec<[f64; N]>) {
        scratch.clear();
        scratch.resize(self.size, [0.0; N]);
        scratch[0] = [1.0; N];
        for step in &self.steps {
            let weight = &weights[usize::from(step.column)];
            let (from, to, length) = (step.from as usize, step.to as usize, usize::from(step.length));
            for power in usize::from(step.powers.0)..=usize::from(step.powers.1) {
                let mut factor = match step.which {
                    Which::Out => weight.out[power],
                    Which::Taken => weight.taken[power],
                    Which::Controlled => [1.0; N],
                };
                if step.negative {
                    factor = factor.map(|f| -f);
                }
                let (low, high) = scratch.split_at_mut(to + power);
                for (source, sink) in low[from..from + length].iter().zip(&mut high[..length]) {
                    for lane in 0..N {
                        sink[lane] += factor[lane] * source[lane];
                    }
                }
            }
        }
    }

    /// The part of [`Plan::evaluate`]'s result that outcomes refer to.
    #[must_use]
    pub fn ends<'s, T>(&self, scratch: &'s [T]) -> &'s [T] {
        &scratch[self.tail..self.size]
    }

    /// How many terms all outcomes have together.
    #[must_use]
    pub const fn terms(&self) -> usize {
        self.size - self.tail
    }

    /// Carries out the expansion for the constant terms alone: the same additions in the same order, so the same bits.
    pub fn evaluate_constants<const N: usize>(&self, weights: &[Weight<N>], scratch: &mut Vec<[f64; N]>) {
        scratch.clear();
        scratch.resize(self.size, [0.0; N]);
        scratch[0] = [1.0; N];
        for step in &self.constant {
            let weight = &weights[usize::from(step.column)];
            let factor = match step.which {
                Which::Out => weight.out[0],
                Which::Taken => weight.taken[0],
                Which::Controlled => [1.0; N],
            };
            let source = scratch[step.from as usize];
            let sink = &mut scratch[step.to as usize];
            for lane in 0..N {
                let factor = if step.negative { -factor[lane] } else { factor[lane] };
                sink[lane] += factor * source[lane];
            }
        }
    }

    /// The polynomial of one outcome in what [`Plan::ends`] gave.
    #[must_use]
    pub fn polynomial<'s, T>(&self, outcome: &Outcome, terms: &'s [T]) -> &'s [T] {
        &terms[outcome.start..outcome.start + outcome.length]
    }

    /// How many multiply-and-add steps an evaluation takes.
    #[must_use]
    pub fn steps(&self) -> usize {
        self.steps.len()
    }
}

/// The steps that bring a constant term from the start to an end, which are few: a capacitor has none when it is taken.
fn constant(steps: &[Step], tail: usize) -> Vec<Step> {
    let mut reached = vec![0];
    let mut list: Vec<Step> = Vec::new();
    for step in steps.iter().filter(|s| s.powers.0 == 0) {
        if reached.binary_search(&step.from).is_ok() {
            list.push(*step);
            if let Err(at) = reached.binary_search(&step.to) {
                reached.insert(at, step.to);
            }
        }
    }
    let mut needed: Vec<u32> = Vec::new();
    list.reverse();
    list.retain(|step| {
        let leads = step.to as usize >= tail || needed.binary_search(&step.to).is_ok();
        if leads && let Err(at) = needed.binary_search(&step.from) {
            needed.insert(at, step.from);
        }
        leads
    });
    list.reverse();
    list
}

/// How many groups of nodes, ground's apart, no remaining column can join to anything.
fn stranded(partition: &[u8; MAX_NODES], nodes: usize, rest: &[(Column, Powers)], rows: bool) -> u32 {
    let mut reachable = 1u32;
    for (column, _) in rest {
        let mut mark = |a: u8, b: u8| {
            let (a, b) = (partition[usize::from(a)], partition[usize::from(b)]);
            if a != b {
                reachable |= 1 << a | 1 << b;
            }
        };
        match *column {
            Column::Branch(a, b) => mark(a, b),
            Column::Amplifier { plus, minus, pin } => {
                mark(pin, 0);
                if !rows {
                    mark(minus, plus);
                }
            }
        }
    }
    let mut groups = 0u32;
    for &member in &partition[..nodes] {
        groups |= 1 << member;
    }
    (groups & !reachable).count_ones()
}
