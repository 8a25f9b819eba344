//! The same network by sparse LU: the order of elimination and every operation are worked out once, then carried out for eight
//! frequencies side by side. The check on the polynomials that shares nothing with them but the layout.
//!
//! # Formula
//! Unknowns are the voltages of all nodes that no source holds. An amplifier's pin has the row
//! `a·(v_pin + ro·Σ y·(v_pin − v)) − v₊ + v₋ = 0`, `a = 1/A(s)`, so that an output resistance of zero and a high gain divide nothing.
//! Pivots are chosen at five sample frequencies at once: of those that are not small against their rows at any of them, the one that
//! fills in least (Markowitz). One factorisation serves the voltages of a drive and, transposed, the transfers to the load.
//!
//! # Does not apply
//! Resistances of zero between nodes: the expansion takes them, an admittance cannot.
//!
//! # Condition
//! [`Swept::doubt`] bounds the response's relative error, `Σ|λ_i|·(|r_i| + n·ε·Σ|a_ij·x_j|)/|x_load|`: what is left of the equations and
//! what their rounding may hide, weighed by the transposed solution (Skeel's condition of one component).
//!
//! # Source
//! H. Markowitz, Management Science 3 (1957); R. Skeel, J. ACM 26 (1979); both from memory.

use alloc::{vec, vec::Vec};

use num_complex::Complex64;

use super::{Drive, Law, Network, Node, dense::admittance};
use crate::{
    analysis::{
        noise::{From, sources},
        sweep::{self, LANES, Lane, Noise},
    },
    solution::Solution,
};

/// Eight complex numbers.
#[derive(Clone, Copy, Debug, Default)]
struct Lanes {
    re: Lane,
    im: Lane,
}

impl Lanes {
    fn times(&self, other: &Self) -> Self {
        let mut product = Self::default();
        for i in 0..LANES {
            product.re[i] = self.re[i] * other.re[i] - self.im[i] * other.im[i];
            product.im[i] = self.re[i] * other.im[i] + self.im[i] * other.re[i];
        }
        product
    }

    fn inverse(&self) -> Self {
        let mut inverse = Self::default();
        for i in 0..LANES {
            let scale = 1.0 / (self.re[i] * self.re[i] + self.im[i] * self.im[i]);
            inverse.re[i] = self.re[i] * scale;
            inverse.im[i] = -self.im[i] * scale;
        }
        inverse
    }

    fn add(&mut self, other: &Self, sign: f64) {
        for i in 0..LANES {
            self.re[i] += sign * other.re[i];
            self.im[i] += sign * other.im[i];
        }
    }

    fn squared(&self) -> Lane {
        core::array::from_fn(|i| self.re[i] * self.re[i] + self.im[i] * self.im[i])
    }

    fn lane(&self, i: usize) -> Complex64 {
        Complex64::new(self.re[i], self.im[i])
    }
}

/// What a matrix entry is made of: a sum of these.
#[derive(Clone, Copy, Debug)]
enum Stamp {
    /// An element's admittance.
    Element(usize),
    /// The same in an amplifier's row: times `a·ro`.
    Weighed(usize, usize),
    /// An amplifier's `a`.
    Gain(usize),
    /// One.
    One,
}

/// One operation on slots.
#[derive(Clone, Copy, Debug)]
enum Step {
    /// Its reciprocal.
    Invert(u16),
    /// Times another slot.
    Scale(u16, u16),
    /// Less the product of two others.
    Subtract(u16, u16, u16),
}

/// A compiled solution.
#[derive(Clone, Debug)]
pub struct Lu {
    /// Entries: slot, what is added, its sign.
    stamps: Vec<(u16, Stamp, f64)>,
    /// Where the entries stand: row and column, by slot.
    places: Vec<(usize, usize)>,
    steps: Vec<Step>,
    slots: usize,
    /// By unknown: the node.
    nodes: Vec<Node>,
    /// By unknown: slots of its voltage and of its row's transfer to the load, where they are not nothing.
    voltages: Vec<Option<u16>>,
    transfers: Vec<Option<u16>>,
}

/// A sweep's results.
#[derive(Clone, Debug)]
pub struct Swept {
    /// The first drive's transfer to the load.
    pub response: Vec<Complex64>,
    /// A bound on the relative error of each.
    pub doubt: Vec<f64>,
    /// Noise at the load, squared.
    pub noise: Noise,
}

const SAMPLES: usize = 5;

impl Lu {
    /// Works out the order for a build of a stage, from its values at five frequencies between two (Hz); it then serves any values of
    /// this topology for which the pivots stay sound. `None` where an element is a short or no sound pivot is left.
    #[must_use]
    pub fn compile(solution: &Solution<'_>, from: f64, to: f64) -> Option<Self> {
        let network = &solution.model.network;
        let short = |law: Law| matches!(law, Law::Resistance(r) if solution.values[r] <= 0.0);
        if network.elements.iter().any(|e| short(e.law)) {
            return None;
        }
        let held = network.held();
        let nodes: Vec<Node> = (1..u8::try_from(network.nodes).ok()?).filter(|n| held >> n & 1 == 0).map(Node).collect();
        let n = nodes.len();
        let (entries, source) = entries(network, &nodes, &solution.model.drives[0]);
        let mut lu = Self {
            stamps: Vec::new(),
            places: Vec::new(),
            steps: Vec::new(),
            slots: 0,
            nodes,
            voltages: vec![None; n],
            transfers: vec![None; n],
        };
        // Slots by place: the matrix, then the driven side, then the transposed one.
        let mut slot = vec![vec![None; n]; n];
        let mut right = vec![None; n];
        for (row, column, stamp, sign) in entries {
            let at = *slot[row][column].get_or_insert_with(|| lu.slot((row, column)));
            lu.stamps.push((at, stamp, sign));
        }
        for (row, stamp, sign) in source {
            let at = *right[row].get_or_insert_with(|| lu.slot((row, n)));
            lu.stamps.push((at, stamp, sign));
        }
        let order = lu.factor(solution, &mut slot, from, to)?;
        lu.substitute(&slot, &order, right);
        let load = lu.nodes.iter().position(|node| *node == network.load)?;
        lu.transpose(&slot, &order, load);
        Some(lu)
    }

    fn slot(&mut self, place: (usize, usize)) -> u16 {
        self.slots += 1;
        self.places.push(place);
        u16::try_from(self.slots - 1).unwrap_or(u16::MAX)
    }

    /// Chooses pivots and notes the elimination; returns rows and columns in order.
    fn factor(&mut self, solution: &Solution<'_>, slot: &mut [Vec<Option<u16>>], from: f64, to: f64) -> Option<Vec<(usize, usize)>> {
        /// The least that a pivot may be against its row.
        const SOUND: f64 = 0.03;
        let n = slot.len();
        let mut lanes = vec![Lanes::default(); self.slots];
        let samples: Vec<f64> = crate::analysis::response::frequencies(from, to, SAMPLES).collect();
        self.fill(solution, &sweep::lanes(solution, &samples), &mut lanes);
        let size = |lanes: &[Lanes], at: Option<u16>, i: usize| at.map_or(0.0, |s| lanes[usize::from(s)].lane(i).l1_norm());
        let (mut rows, mut columns): (Vec<usize>, Vec<usize>) = ((0..n).collect(), (0..n).collect());
        let mut order = Vec::with_capacity(n);
        while !rows.is_empty() {
            let mut best: Option<(f64, usize, usize, usize)> = None;
            for &row in &rows {
                let largest: [f64; SAMPLES] =
                    core::array::from_fn(|i| columns.iter().map(|&c| size(&lanes, slot[row][c], i)).fold(0.0, f64::max));
                for &column in columns.iter().filter(|&&c| slot[row][c].is_some()) {
                    let share = (0..SAMPLES).map(|i| size(&lanes, slot[row][column], i) / largest[i]).fold(1.0, f64::min);
                    let wide = columns.iter().filter(|&&c| slot[row][c].is_some()).count() - 1;
                    let tall = rows.iter().filter(|&&r| slot[r][column].is_some()).count() - 1;
                    let (sound, fill) = (share.min(SOUND), wide * tall);
                    if best.is_none_or(|(s, f, ..)| sound > s || sound >= s && fill < f) {
                        best = Some((sound, fill, row, column));
                    }
                }
            }
            let (sound, _, row, column) = best?;
            if sound.is_nan() || sound <= 0.0 {
                return None;
            }
            rows.retain(|r| *r != row);
            columns.retain(|c| *c != column);
            let pivot = slot[row][column]?;
            self.step(&mut lanes, Step::Invert(pivot));
            for &below in &rows {
                let Some(factor) = slot[below][column] else { continue };
                self.step(&mut lanes, Step::Scale(factor, pivot));
                for &right in &columns {
                    if let Some(above) = slot[row][right] {
                        let target = *slot[below][right].get_or_insert_with(|| self.slot((below, right)));
                        lanes.resize(self.slots, Lanes::default());
                        self.step(&mut lanes, Step::Subtract(target, factor, above));
                    }
                }
            }
            order.push((row, column));
        }
        Some(order)
    }

    fn step(&mut self, lanes: &mut [Lanes], step: Step) {
        step.carry_out(lanes);
        self.steps.push(step);
    }

    /// The voltages of the first drive.
    fn substitute(&mut self, slot: &[Vec<Option<u16>>], order: &[(usize, usize)], mut right: Vec<Option<u16>>) {
        let n = order.len();
        for (k, &(row, column)) in order.iter().enumerate() {
            let Some(known) = right[row] else { continue };
            for &(below, _) in &order[k + 1..] {
                if let Some(factor) = slot[below][column] {
                    let target = *right[below].get_or_insert_with(|| self.slot((below, n)));
                    self.steps.push(Step::Subtract(target, factor, known));
                }
            }
        }
        for (k, &(row, column)) in order.iter().enumerate().rev() {
            for &(_, known) in &order[k + 1..] {
                if let (Some(factor), Some(x)) = (slot[row][known], self.voltages[known]) {
                    let target = *right[row].get_or_insert_with(|| self.slot((row, n)));
                    self.steps.push(Step::Subtract(target, factor, x));
                }
            }
            if let (Some(at), Some(pivot)) = (right[row], slot[row][column]) {
                self.steps.push(Step::Scale(at, pivot));
                self.voltages[column] = Some(at);
            }
        }
    }

    /// The transfers of all rows to the load: the transposed equations, with one at the load's column.
    fn transpose(&mut self, slot: &[Vec<Option<u16>>], order: &[(usize, usize)], load: usize) {
        let n = order.len();
        let mut by_column = vec![None; n];
        by_column[load] = Some(self.slot((load, n + 1)));
        if let Some(at) = by_column[load] {
            self.stamps.push((at, Stamp::One, 1.0));
        }
        for (k, &(row, column)) in order.iter().enumerate() {
            for &(above, earlier) in &order[..k] {
                if let (Some(factor), Some(z)) = (slot[above][column], by_column[earlier]) {
                    let target = *by_column[column].get_or_insert_with(|| self.slot((column, n + 1)));
                    self.steps.push(Step::Subtract(target, factor, z));
                }
            }
            if let (Some(at), Some(pivot)) = (by_column[column], slot[row][column]) {
                self.steps.push(Step::Scale(at, pivot));
            }
        }
        for (k, &(row, column)) in order.iter().enumerate().rev() {
            for &(below, _) in &order[k + 1..] {
                if let (Some(factor), Some(known)) = (slot[below][column], self.transfers[below]) {
                    let target = *by_column[column].get_or_insert_with(|| self.slot((column, n + 1)));
                    self.steps.push(Step::Subtract(target, factor, known));
                }
            }
            self.transfers[row] = by_column[column];
        }
    }

    /// How many operations a frequency takes.
    #[must_use]
    pub fn operations(&self) -> usize {
        self.stamps.len() + self.steps.len()
    }

    /// Admittances and gains at eight frequencies, put into the matrix.
    fn fill(&self, solution: &Solution<'_>, omega: &Lane, lanes: &mut [Lanes]) -> Gains {
        let network = &solution.model.network;
        lanes.fill(Lanes::default());
        let radians = omega.map(|w| w * solution.model.scale.1);
        let mut admittances: Vec<Lanes> = Vec::with_capacity(network.elements.len());
        for element in &network.elements {
            let mut y = Lanes::default();
            match element.law {
                Law::Resistance(r) => y.re = [1.0 / solution.values[r]; LANES],
                Law::Capacitance(c) => y.im = radians.map(|w| w * solution.values[c]),
                law @ Law::SeriesRc(..) => {
                    for (i, w) in radians.iter().enumerate() {
                        let at = admittance(law, &solution.values, Complex64::new(0.0, *w));
                        (y.re[i], y.im[i]) = (at.re, at.im);
                    }
                }
            }
            admittances.push(y);
        }
        let mut gains = Gains { a: Vec::new(), ohms: solution.model.output_resistances(&solution.values) };
        let mut weighed: Vec<Lanes> = Vec::new();
        for (index, ohms) in gains.ohms.iter().enumerate() {
            let (above, below) = solution.amplifier(index);
            let at = |p| {
                let (re, im) = sweep::at(p, omega);
                Lanes { re, im }
            };
            let a = at(&below).times(&at(&above).inverse());
            gains.a.push(a);
            let mut weight = a;
            for i in 0..LANES {
                weight.re[i] *= ohms;
                weight.im[i] *= ohms;
            }
            weighed.push(weight);
        }
        let one = Lanes { re: [1.0; LANES], im: [0.0; LANES] };
        for &(slot, stamp, sign) in &self.stamps {
            let slot = &mut lanes[usize::from(slot)];
            match stamp {
                Stamp::Element(e) => slot.add(&admittances[e], sign),
                Stamp::Weighed(a, e) => slot.add(&weighed[a].times(&admittances[e]), sign),
                Stamp::Gain(a) => slot.add(&gains.a[a], sign),
                Stamp::One => slot.add(&one, sign),
            }
        }
        gains
    }

    /// Response and noise over frequencies in Hz.
    #[must_use]
    pub fn sweep(&self, solution: &Solution<'_>, frequencies: &[f64]) -> Swept {
        let (network, n) = (&solution.model.network, self.nodes.len());
        let sources = sources(solution);
        let count = frequencies.len();
        let noise =
            Noise { origins: sources.iter().map(|s| s.0).collect(), rows: vec![vec![0.0; count]; sources.len()], total: vec![0.0; count] };
        let mut swept = Swept { response: Vec::with_capacity(count), doubt: Vec::with_capacity(count), noise };
        let mut lanes = vec![Lanes::default(); self.slots];
        let mut filled = Vec::new();
        // What a current into a node does, by node; ground's and held nodes' stay nothing.
        let mut from_current = vec![Lanes::default(); network.nodes];
        let amplifiers: Vec<Option<usize>> = self.nodes.iter().map(|node| network.amplifiers.iter().position(|a| a.pin == *node)).collect();
        let load = self.nodes.iter().position(|node| *node == network.load);
        let charge = network.inputs.first() == Some(&Drive::Charge);
        for (index, chunk) in frequencies.chunks(LANES).enumerate() {
            let omega = sweep::lanes(solution, chunk);
            let gains = self.fill(solution, &omega, &mut lanes);
            filled.clone_from(&lanes);
            for step in &self.steps {
                step.carry_out(&mut lanes);
            }
            let at = |slot: Option<u16>| slot.map_or_else(Lanes::default, |s| lanes[usize::from(s)]);
            let mut response = at(load.and_then(|l| self.voltages[l]));
            let doubt = self.doubt(&filled, &lanes, &response, n);
            if charge {
                let rate = Lanes { re: [0.0; LANES], im: omega.map(|w| w * solution.model.scale.1) };
                response = response.times(&rate);
            }
            swept.response.extend((0..chunk.len()).map(|i| response.lane(i)));
            swept.doubt.extend_from_slice(&doubt[..chunk.len()]);
            for (row, node) in self.nodes.iter().enumerate() {
                let mut transfer = at(self.transfers[row]);
                if let Some(a) = amplifiers[row] {
                    transfer = transfer.times(&gains.a[a]);
                    for i in 0..LANES {
                        transfer.re[i] *= gains.ohms[a];
                        transfer.im[i] *= gains.ohms[a];
                    }
                }
                from_current[usize::from(node.0)] = transfer;
            }
            let input = |a: usize| {
                self.nodes
                    .iter()
                    .position(|node| *node == network.amplifiers[a].pin)
                    .map_or_else(Lanes::default, |row| at(self.transfers[row]))
            };
            let mut hertz = [chunk[chunk.len() - 1]; LANES];
            hertz[..chunk.len()].copy_from_slice(chunk);
            // The generators' currents are scaled by the network's impedance.
            let per_ohm = 1.0 / (solution.model.scale.0 * solution.model.scale.0);
            let start = index * LANES;
            for (row, (_, from, spectrum)) in swept.noise.rows.iter_mut().zip(&sources) {
                let (mut transfer, scale) = match *from {
                    From::Between(a, _) | From::Into(a) => (from_current[usize::from(a.0)], per_ohm),
                    From::Input(a) => (input(a), 1.0),
                };
                if let From::Between(_, b) = *from {
                    transfer.add(&from_current[usize::from(b.0)], -1.0);
                }
                let (power, spectrum) = (transfer.squared(), spectrum.at_lanes(&hertz));
                for i in 0..chunk.len() {
                    row[start + i] = power[i] * scale * spectrum[i];
                    swept.noise.total[start + i] += row[start + i];
                }
            }
        }
        swept
    }

    /// See [`Swept::doubt`].
    fn doubt(&self, filled: &[Lanes], solved: &[Lanes], response: &Lanes, n: usize) -> Lane {
        let value = |slot: Option<u16>, i: usize| slot.map_or_else(|| Complex64::new(0.0, 0.0), |s| solved[usize::from(s)].lane(i));
        #[expect(clippy::cast_precision_loss, reason = "a few unknowns")]
        let rounding = n as f64 * f64::EPSILON;
        core::array::from_fn(|i| {
            let mut left = vec![(Complex64::new(0.0, 0.0), 0.0); n];
            for (&(row, column), entry) in self.places.iter().zip(filled) {
                if column > n {
                    continue;
                }
                let term = if column == n { entry.lane(i) } else { -entry.lane(i) * value(self.voltages[column], i) };
                left[row].0 += term;
                left[row].1 += term.l1_norm();
            }
            let weighed = |(row, (rest, size)): (usize, &(Complex64, f64))| {
                value(self.transfers[row], i).l1_norm() * (rest.l1_norm() + rounding * size)
            };
            left.iter().enumerate().map(weighed).sum::<f64>() / response.lane(i).l1_norm()
        })
    }
}

/// By amplifier: `1/A` and the output resistance.
struct Gains {
    a: Vec<Lanes>,
    ohms: Vec<f64>,
}

impl Step {
    #[inline]
    fn carry_out(self, lanes: &mut [Lanes]) {
        match self {
            Self::Invert(at) => lanes[usize::from(at)] = lanes[usize::from(at)].inverse(),
            Self::Scale(at, by) => lanes[usize::from(at)] = lanes[usize::from(at)].times(&lanes[usize::from(by)]),
            Self::Subtract(target, a, b) => {
                let product = lanes[usize::from(a)].times(&lanes[usize::from(b)]);
                lanes[usize::from(target)].add(&product, -1.0);
            }
        }
    }
}

/// Row, column, what is added, its sign; and the same for the first drive's side.
type Entries = (Vec<(usize, usize, Stamp, f64)>, Vec<(usize, Stamp, f64)>);

fn entries(network: &Network, nodes: &[Node], weights: &[f64]) -> Entries {
    let unknown = |node: Node| nodes.iter().position(|n| *n == node);
    // What the first drive puts on a node that an input holds.
    let held = |node: Node| usize::from(node.0).checked_sub(1).and_then(|input| weights.get(input)).copied().unwrap_or(0.0);
    let (mut list, mut source) = (Vec::new(), Vec::new());
    for (e, element) in network.elements.iter().enumerate() {
        for (here, there) in [(element.a, element.b), (element.b, element.a)] {
            let Some(row) = unknown(here) else { continue };
            let stamp = network.amplifiers.iter().position(|a| a.pin == here).map_or(Stamp::Element(e), |a| Stamp::Weighed(a, e));
            list.push((row, row, stamp, 1.0));
            match unknown(there) {
                Some(column) => list.push((row, column, stamp, -1.0)),
                None => source.push((row, stamp, held(there))),
            }
        }
    }
    for (a, amplifier) in network.amplifiers.iter().enumerate() {
        let Some(row) = unknown(amplifier.pin) else { continue };
        list.push((row, row, Stamp::Gain(a), 1.0));
        for (node, sign) in [(amplifier.plus, -1.0), (amplifier.minus, 1.0)] {
            match unknown(node) {
                Some(column) => list.push((row, column, Stamp::One, sign)),
                None => source.push((row, Stamp::One, -sign * held(node))),
            }
        }
    }
    for (input, weight) in weights.iter().enumerate() {
        if let Some(row) = unknown(network.input_node(input)) {
            source.push((row, Stamp::One, *weight));
        }
    }
    source.retain(|(_, _, sign)| sign.abs() > 0.0);
    (list, source)
}
