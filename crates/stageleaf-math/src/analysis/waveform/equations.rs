//! The stage's network as state equations, amplifiers still apart.
//!
//! # Formula
//! Nodes joined by zero ohms are one node. The capacitors' largest spanning tree gives the states: the voltages of its branches `y`,
//! so that node voltages are `v = T·y + H·u` and `C·y' + Cᵤ·u' + Tᵀ·G·v = Tᵀ·i`. With `z = y + C⁻¹·Cᵤ·u` no derivative of an input is
//! left: `z` passes a step of the input unmoved, and the charge that capacitors on a driven node pass on at that moment is in
//! `C⁻¹·Cᵤ`. A charge that is an input enters in the same way. What no capacitor holds is algebraic.
//!
//! # Source
//! State variables from a tree of capacitors: E. S. Kuh, R. A. Rohrer, "The state-variable approach to network analysis", Proc. IEEE 53
//! (1965), from memory.

use alloc::{vec, vec::Vec};

use super::matrix::{Matrix, add, dot};
use crate::{
    network::{Drive, Law, Network},
    solution::Solution,
};

/// Columns behind the states: one, the moving input's value and slope, its sine and cosine.
pub const SOURCES: usize = 5;

/// The passive network of a build.
#[derive(Clone, Debug)]
pub struct Passive {
    /// By node: which node stands for it.
    pub node: Vec<usize>,
    /// How many capacitor voltages are states.
    pub dynamic: usize,
    /// How many voltages no capacitor holds.
    pub algebraic: usize,
    /// Node voltages by tree branches, then by what no capacitor holds.
    pub tree: Matrix,
    /// Node voltages by inputs.
    pub held: Matrix,
    /// Conductances between nodes.
    pub conductance: Matrix,
    /// What an input adds to a tree branch's voltage beyond its state.
    pub jump: Matrix,
    /// Currents into nodes by inputs.
    pub injected: Matrix,
    /// Capacitance matrix over the tree branches.
    pub capacitance: Matrix,
}

/// A two-terminal element, values in place.
struct Branch {
    a: usize,
    b: usize,
    value: f64,
}

impl Passive {
    /// Lays out the equations; nothing where a charge is put on a node that no capacitor holds, or the capacitors contradict.
    pub fn of(solution: &Solution<'_>) -> Option<Self> {
        let network = &solution.model.network;
        let (mut resistors, mut capacitors, mut nodes) = (Vec::new(), Vec::new(), network.nodes);
        let mut join: Vec<usize> = (0..nodes).collect();
        for element in &network.elements {
            let (a, b) = (usize::from(element.a.0), usize::from(element.b.0));
            match element.law {
                Law::Resistance(r) if solution.values[r] <= 0.0 => {
                    let (a, b) = (root(&join, a), root(&join, b));
                    join[a.max(b)] = a.min(b);
                }
                Law::Resistance(r) => resistors.push(Branch { a, b, value: 1.0 / solution.values[r] }),
                Law::Capacitance(c) => capacitors.push(Branch { a, b, value: solution.values[c] }),
                Law::SeriesRc(r, c) if solution.values[r] <= 0.0 => capacitors.push(Branch { a, b, value: solution.values[c] }),
                Law::SeriesRc(r, c) => {
                    join.push(nodes);
                    resistors.push(Branch { a, b: nodes, value: 1.0 / solution.values[r] });
                    capacitors.push(Branch { a: nodes, b, value: solution.values[c] });
                    nodes += 1;
                }
            }
        }
        let node: Vec<usize> = (0..nodes).map(|n| root(&join, n)).collect();
        for branch in resistors.iter_mut().chain(&mut capacitors) {
            (branch.a, branch.b) = (node[branch.a], node[branch.b]);
        }
        resistors.retain(|b| b.a != b.b);
        capacitors.retain(|b| b.a != b.b && b.value > 0.0);
        // The largest first: their voltages are the states, and small ones beside them lose no digits.
        capacitors.sort_by(|a, b| b.value.total_cmp(&a.value));
        Self::assemble(network, node, &resistors, &capacitors)
    }

    fn assemble(network: &Network, node: Vec<usize>, resistors: &[Branch], capacitors: &[Branch]) -> Option<Self> {
        let (nodes, inputs) = (node.len(), network.inputs.len());
        let held_by = |n: usize| (0..inputs).find(|&i| network.inputs[i] == Drive::Voltage && node[i + 1] == n);
        let fixed = |n: usize| n == 0 || held_by(n).is_some();
        // The largest spanning tree, everything fixed counting as one node.
        let mut join: Vec<usize> = (0..nodes).map(|n| if fixed(n) { 0 } else { n }).collect();
        let mut branches = Vec::new();
        for capacitor in capacitors {
            let (a, b) = (root(&join, capacitor.a), root(&join, capacitor.b));
            if a != b {
                join[a.max(b)] = a.min(b);
                branches.push((capacitor.a, capacitor.b));
            }
        }
        let free: Vec<usize> = (0..nodes).filter(|&n| node[n] == n && !fixed(n) && root(&join, n) == n).collect();
        let dynamic = branches.len();
        let mut tree = Matrix::zero(nodes, (dynamic + free.len()).max(1));
        let mut held = Matrix::zero(nodes, inputs.max(1));
        let mut known: Vec<bool> = (0..nodes).map(fixed).collect();
        for n in 0..nodes {
            if let Some(input) = held_by(n) {
                *held.at(n, input) = 1.0;
            }
        }
        for (i, &n) in free.iter().enumerate() {
            *tree.at(n, dynamic + i) = 1.0;
            known[n] = true;
        }
        // Outwards along the branches.
        while let Some((i, &(a, b))) = branches.iter().enumerate().find(|(_, (a, b))| known[*a] != known[*b]) {
            let (from, to, sign) = if known[a] { (a, b, -1.0) } else { (b, a, 1.0) };
            let (along, source) = (tree.row(from).to_vec(), held.row(from).to_vec());
            tree.row_mut(to).copy_from_slice(&along);
            held.row_mut(to).copy_from_slice(&source);
            *tree.at(to, i) += sign;
            known[to] = true;
        }
        for (n, &of) in node.iter().enumerate() {
            if of != n {
                let (along, source) = (tree.row(of).to_vec(), held.row(of).to_vec());
                tree.row_mut(n).copy_from_slice(&along);
                held.row_mut(n).copy_from_slice(&source);
            }
        }
        let mut conductance = Matrix::zero(nodes, nodes);
        for resistor in resistors {
            *conductance.at(resistor.a, resistor.a) += resistor.value;
            *conductance.at(resistor.b, resistor.b) += resistor.value;
            *conductance.at(resistor.a, resistor.b) -= resistor.value;
            *conductance.at(resistor.b, resistor.a) -= resistor.value;
        }
        let mut injected = Matrix::zero(nodes, inputs.max(1));
        let mut capacitance = Matrix::zero(dynamic, dynamic.max(1));
        let mut jump = Matrix::zero(dynamic, inputs.max(1));
        for capacitor in capacitors {
            let difference = |m: &Matrix| -> Vec<f64> { m.row(capacitor.a).iter().zip(m.row(capacitor.b)).map(|(x, y)| x - y).collect() };
            let (across, driven) = (difference(&tree), difference(&held));
            for (i, &share) in across[..dynamic].iter().enumerate().filter(|(_, s)| s.abs() > 0.0) {
                add(capacitance.row_mut(i), &across[..dynamic], share * capacitor.value);
                add(jump.row_mut(i), &driven, share * capacitor.value);
            }
        }
        for (i, drive) in network.inputs.iter().enumerate() {
            let at = node[i + 1];
            match drive {
                Drive::Voltage => {}
                Drive::Current => *injected.at(at, i) += 1.0,
                Drive::Charge => {
                    if tree.row(at)[dynamic..].iter().any(|t| t.abs() > 0.0) {
                        return None;
                    }
                    for branch in 0..dynamic {
                        *jump.at(branch, i) -= tree.row(at)[branch];
                    }
                }
            }
        }
        if dynamic > 0 && !capacitance.clone().solve(&mut jump) {
            return None;
        }
        Some(Self { node, dynamic, algebraic: free.len(), tree, held, conductance, jump, injected, capacitance })
    }

    /// A column of the tree times the current that leaves each node through resistors, `row` by row of `voltages`.
    pub fn current_into_branch(&self, branch: usize, voltages: &Matrix) -> Vec<f64> {
        let mut sum = vec![0.0; voltages.columns];
        for n in 0..self.tree.rows() {
            let share = self.tree.row(n)[branch];
            if self.node[n] == n && share.abs() > 0.0 {
                for (other, &siemens) in self.conductance.row(n).iter().enumerate() {
                    if siemens.abs() > 0.0 {
                        add(&mut sum, voltages.row(other), share * siemens);
                    }
                }
            }
        }
        sum
    }

    /// `Tᵀ·G·T` between two unknowns.
    pub fn projected(&self, a: usize, b: usize) -> f64 {
        let column: Vec<f64> = (0..self.tree.rows()).map(|n| self.tree.row(n)[b]).collect();
        (0..self.tree.rows())
            .filter(|&n| self.node[n] == n && self.tree.row(n)[a].abs() > 0.0)
            .map(|n| self.tree.row(n)[a] * dot(self.conductance.row(n), &column))
            .sum()
    }
}

fn root(join: &[usize], mut n: usize) -> usize {
    while join[n] != n {
        n = join[n];
    }
    n
}
