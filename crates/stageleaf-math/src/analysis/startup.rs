//! From switching on to a settled output.
//!
//! # Formula
//! At `t = 0` every capacitor is empty, and supplies, reference and steady signals step to their values. The output is
//! `v(t) = v(∞) + Σ a·e^(p·t)` over the closed loop's poles, `a = Σ dc·N(p)/(p·D'(p))`: the slow poles of bias dividers and coupling
//! capacitors and the fast ones of the loop in one sum. The start-up time is the last time at which `v` is a hundredth of `v(∞)` away from
//! it, and the part's own start-up time before that. An amplifier whose controlled source would have to move faster than it slews
//! takes its whole way at the slew rate first: both times are added.
//!
//! # Units
//! s.
//!
//! # Does not apply
//! Supplies that rise slowly, and a stage whose output would leave the rails on its way by more than the same hundredth: it then recovers from the rail, which is not
//! linear. A stage whose output stands at zero has nothing to reach.
//!
//! # Source
//! Partial fractions; that slewing and linear settling add up: common practice, no source. Checked in `tests/outside/` by
//! `oracle_around.py`.

use alloc::vec::Vec;

use num_complex::Complex64;

use super::{
    modes::{Modes, at_pin},
    swing,
};
use crate::{
    network::Node,
    part::PartFigure,
    polynomial::Polynomial,
    report::{Need, Outcome},
    solution::Solution,
};

/// How near the output has come, as a fraction of its final value.
pub const NEAR: f64 = 0.01;

/// The start-up time.
pub fn startup_time(solution: &Solution<'_>) -> Outcome {
    let model = solution.model;
    let Some((positive, negative)) = model.parameters.supply() else { return Outcome::Undetermined(alloc::vec![Need::Supply]) };
    let network = &model.network;
    let levels: Vec<(usize, f64)> = swing::levels(solution).map(|l| (l.drive, l.dc)).filter(|(_, dc)| dc.abs() > 0.0).collect();
    let end = |node: Node| levels.iter().map(|&(drive, dc)| dc * solution.voltage(drive, node, 0.0).re).sum::<f64>();
    let end_of_load = end(network.load);
    if end_of_load.abs() <= 0.0 {
        return Outcome::DoesNotApply("the output stands at zero, from the start on");
    }
    let numerators: Vec<Polynomial> = (0..network.nodes)
        .map(|node| {
            let mut sum = Polynomial::default();
            for &(drive, dc) in levels.iter().filter(|_| node > 0) {
                sum.add_scaled(&solution.numerator(drive, Node(u8::try_from(node).unwrap_or(0))).0, dc);
            }
            sum
        })
        .collect();
    let roots = solution.roots().poles.clone();
    let (poles, mut residues) = Modes::of(&numerators.iter().collect::<Vec<_>>(), &solution.looped().closed, roots, model.scale.1);
    for of_node in &mut residues {
        for (residue, pole) in of_node.iter_mut().zip(&poles) {
            *residue /= pole;
        }
    }
    let sum = |terms: &[Complex64]| Modes(poles.iter().copied().zip(terms.iter().copied()).collect());
    let steady = |terms: &[Complex64], value: f64| {
        let mut modes = sum(terms);
        modes.0.push((Complex64::new(0.0, 0.0), Complex64::new(value, 0.0)));
        modes
    };
    let (middle, half) = {
        let (high, low) = (solution.values[positive], solution.values[negative]);
        (f64::midpoint(high, low), (high - low) / 2.0)
    };
    let (mut slewing, mut starting) = (0.0_f64, 0.0_f64);
    for (index, amplifier) in network.amplifiers.iter().enumerate() {
        let pin = usize::from(amplifier.pin.0);
        if steady(&residues[pin], end(amplifier.pin) - middle).largest_from(0.0) > half + NEAR * end_of_load.abs() {
            return Outcome::OutOfReach("on its way the output would leave the rails");
        }
        let (behind, _) = at_pin(solution, network, index, &poles, |node, i| residues[usize::from(node.0)][i]);
        let rate = swing::slew_rate(solution, index);
        if sum(&behind).slope().largest_from(0.0) > rate {
            let behind_end: f64 = levels.iter().map(|&(drive, dc)| dc * swing::pin(solution, index, drive, 0.0).behind.re).sum();
            slewing = slewing.max(steady(&behind, behind_end).largest_from(0.0) / rate);
        }
        starting = starting.max(solution.part_of(index, PartFigure::Startup).unwrap_or(0.0));
    }
    match sum(&residues[usize::from(network.load.0)]).last_beyond(NEAR * end_of_load.abs()) {
        Some(linear) => Outcome::Value(starting + slewing + linear),
        None => Outcome::DoesNotApply("the output never settles"),
    }
}
