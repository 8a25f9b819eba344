//! The same network by dense modified nodal analysis at one complex frequency: the check on the expansion.
//!
//! # Source
//! Ho, Ruehli, Brennan, "The modified nodal approach to network analysis", IEEE Trans. Circuits and Systems 22 (1975).

use alloc::{vec, vec::Vec};

use num_complex::Complex64;

use super::{Drive as Input, GROUND, Law, Network, Node};

/// What drives the network; every ideal voltage source that does not is at zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Drive {
    /// One volt at, or one ampere into, an input's node.
    Input(usize),
    /// One ampere out of `from` and into `to`.
    Current {
        /// Where it leaves.
        from: Node,
        /// Where it enters.
        to: Node,
    },
    /// One volt in series with an amplifier's non-inverting input.
    AmplifierInput(usize),
}

/// Node voltages (by node number, ground included), or `None` when the matrix is singular.
///
/// `values` is the parameter table's; `amplifiers` gives each one's open-loop gain and output resistance at `s`.
#[must_use]
pub fn solve(network: &Network, values: &[f64], amplifiers: &[(Complex64, f64)], s: Complex64, drive: Drive) -> Option<Vec<Complex64>> {
    let nodes = network.nodes;
    // Unknowns: voltages, one current for each input, one for each amplifier.
    let inputs = nodes - 1;
    let sources = inputs + network.inputs.len();
    let n = sources + network.amplifiers.len();
    let mut matrix = vec![Complex64::new(0.0, 0.0); n * n];
    let mut right = vec![Complex64::new(0.0, 0.0); n];
    let row = |node: Node| usize::from(node.0).checked_sub(1);
    let mut add = |r: Option<usize>, c: Option<usize>, y: Complex64| {
        if let (Some(r), Some(c)) = (r, c) {
            matrix[r * n + c] += y;
        }
    };
    for element in &network.elements {
        let y = admittance(element.law, values, s);
        let (a, b) = (row(element.a), row(element.b));
        add(a, a, y);
        add(b, b, y);
        add(a, b, -y);
        add(b, a, -y);
    }
    let one = Complex64::new(1.0, 0.0);
    for (i, kind) in network.inputs.iter().enumerate() {
        let unknown = Some(inputs + i);
        if *kind == Input::Voltage {
            let node = row(network.input_node(i));
            add(node, unknown, one);
            add(unknown, node, one);
        } else {
            add(unknown, unknown, one);
        }
    }
    for (i, (amplifier, &(gain, resistance))) in network.amplifiers.iter().zip(amplifiers).enumerate() {
        let unknown = Some(sources + i);
        add(row(amplifier.pin), unknown, -one);
        add(unknown, row(amplifier.pin), one);
        add(unknown, unknown, Complex64::new(resistance, 0.0));
        add(unknown, row(amplifier.plus), -gain);
        add(unknown, row(amplifier.minus), gain);
    }
    match drive {
        Drive::Input(i) if network.inputs[i] == Input::Voltage => right[inputs + i] = one,
        Drive::Input(i) => right[row(network.input_node(i))?] = one,
        Drive::Current { from, to } => {
            if let Some(r) = row(to) {
                right[r] += one;
            }
            if let Some(r) = row(from) {
                right[r] -= one;
            }
        }
        Drive::AmplifierInput(i) => right[sources + i] = amplifiers[i].0,
    }
    eliminate(&mut matrix, &mut right, n)?;
    let mut voltages = vec![Complex64::new(0.0, 0.0); nodes];
    voltages[1..].copy_from_slice(&right[..nodes - 1]);
    voltages[usize::from(GROUND.0)] = Complex64::new(0.0, 0.0);
    Some(voltages)
}

/// The admittance of an element at `s`.
#[must_use]
pub fn admittance(law: Law, values: &[f64], s: Complex64) -> Complex64 {
    match law {
        Law::Resistance(r) => Complex64::new(1.0 / values[r], 0.0),
        Law::Capacitance(c) => s * values[c],
        Law::SeriesRc(r, c) => s * values[c] / (s * (values[r] * values[c]) + 1.0),
    }
}

/// Gaussian elimination with row scaling and partial pivoting; the solution replaces `right`.
fn eliminate(matrix: &mut [Complex64], right: &mut [Complex64], n: usize) -> Option<()> {
    for r in 0..n {
        let scale = matrix[r * n..(r + 1) * n].iter().map(|v| v.l1_norm()).fold(0.0, f64::max);
        if scale <= 0.0 {
            return None;
        }
        for v in &mut matrix[r * n..(r + 1) * n] {
            *v /= scale;
        }
        right[r] /= scale;
    }
    for k in 0..n {
        let pivot = (k..n).max_by(|&a, &b| matrix[a * n + k].l1_norm().total_cmp(&matrix[b * n + k].l1_norm()))?;
        if matrix[pivot * n + k].l1_norm() <= 0.0 {
            return None;
        }
        if pivot != k {
            for c in 0..n {
                matrix.swap(pivot * n + c, k * n + c);
            }
            right.swap(pivot, k);
        }
        let inverse = Complex64::new(1.0, 0.0) / matrix[k * n + k];
        for r in k + 1..n {
            let factor = matrix[r * n + k] * inverse;
            if factor.l1_norm() <= 0.0 {
                continue;
            }
            for c in k..n {
                let step = factor * matrix[k * n + c];
                matrix[r * n + c] -= step;
            }
            let step = factor * right[k];
            right[r] -= step;
        }
    }
    for k in (0..n).rev() {
        let mut sum = right[k];
        for c in k + 1..n {
            sum -= matrix[k * n + c] * right[c];
        }
        right[k] = sum / matrix[k * n + k];
    }
    Some(())
}
