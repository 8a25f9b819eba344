//! Voltages at rest, with some nodes held: for networks whose amplifiers rest at their limits.
//!
//! # Formula
//! Each free node in turn is replaced by conductances between its neighbours, `g_i·g_j/Σg`, and the current into it is shared among
//! them, `J·g_i/Σg`; backwards, its voltage is the mean of theirs, `(J + Σ g_i·V_i)/Σg`. Nothing is subtracted, so that badly scaled
//! networks keep their digits.
//!
//! # Does not apply
//! Anything that moves: capacitors are left out.
//!
//! # Source
//! Star–mesh transformation: A. Rosen, "A new network theorem", Journal of the IEE 62 (1924), from memory.

use super::{Law, MAX_NODES, Network, Node};

/// A voltage for every node.
pub type Voltages = [f64; MAX_NODES];

/// Nodes and conductances of a network at rest, shorts joined.
#[derive(Clone, Debug)]
pub struct Mesh {
    nodes: usize,
    /// For each node, the one that stands for it.
    joined: [usize; MAX_NODES],
    siemens: [[f64; MAX_NODES]; MAX_NODES],
}

impl Mesh {
    /// The resistances of a network.
    #[must_use]
    pub fn of(network: &Network, values: &[f64]) -> Self {
        let mut mesh = Self { nodes: network.nodes, joined: core::array::from_fn(|n| n), siemens: [[0.0; MAX_NODES]; MAX_NODES] };
        let ohms = |law: Law| if let Law::Resistance(slot) = law { Some(values[slot]) } else { None };
        for element in network.elements.iter().filter(|e| ohms(e.law).is_some_and(|r| r <= 0.0)) {
            // The lower number stays: sources drive the first nodes.
            let (a, b) = (mesh.node(element.a), mesh.node(element.b));
            let (kept, gone) = (a.min(b), a.max(b));
            mesh.joined.iter_mut().filter(|n| **n == gone).for_each(|n| *n = kept);
        }
        for element in &network.elements {
            let (a, b) = (mesh.node(element.a), mesh.node(element.b));
            if let (Some(r), true) = (ohms(element.law), a != b) {
                mesh.siemens[a][b] += 1.0 / r;
                mesh.siemens[b][a] += 1.0 / r;
            }
        }
        mesh
    }

    fn node(&self, node: Node) -> usize {
        self.joined[usize::from(node.0)]
    }

    /// The voltages with these nodes held (ground is held at 0 V by itself) and these currents into nodes. A node without a path to a held
    /// one is left at 0 V: see [`Network::floating`].
    #[must_use]
    pub fn solve(&self, held: &[(Node, f64)], injected: &[(Node, f64)]) -> Voltages {
        let mut volts = [0.0; MAX_NODES];
        let mut fixed = [false; MAX_NODES];
        fixed[0] = true;
        for &(node, voltage) in held {
            fixed[self.node(node)] = true;
            volts[self.node(node)] = voltage;
        }
        let mut current = [0.0; MAX_NODES];
        for &(node, amperes) in injected {
            current[self.node(node)] += amperes;
        }
        let mut siemens = self.siemens;
        let free = |n: &usize| self.joined[*n] == *n && !fixed[*n];
        let mut gone = [false; MAX_NODES];
        for k in (0..self.nodes).rev().filter(free) {
            gone[k] = true;
            let sum: f64 = (0..self.nodes).filter(|j| !gone[*j]).map(|j| siemens[k][j]).sum();
            if sum <= 0.0 {
                continue;
            }
            for i in (0..self.nodes).filter(|i| !gone[*i]) {
                let share = siemens[k][i] / sum;
                current[i] += current[k] * share;
                for j in (0..self.nodes).filter(|j| !gone[*j] && *j != i) {
                    siemens[i][j] += share * siemens[k][j];
                }
            }
        }
        for k in (0..self.nodes).filter(free) {
            gone[k] = false;
            // Its neighbours at that time were those that are there again.
            let others = || (0..self.nodes).filter(|j| !gone[*j] && *j != k);
            let sum: f64 = others().map(|j| siemens[k][j]).sum();
            if sum <= 0.0 {
                continue;
            }
            volts[k] = (current[k] + others().map(|j| siemens[k][j] * volts[j]).sum::<f64>()) / sum;
        }
        for n in 0..self.nodes {
            volts[n] = volts[self.joined[n]];
        }
        volts
    }
}
