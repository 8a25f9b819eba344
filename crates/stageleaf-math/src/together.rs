//! Several builds of a stage at once: their expansions are carried out eight side by side, in vector registers.
//!
//! A build's bits do not depend on its neighbours (see [`Plan::evaluate`](crate::network::expand::Plan::evaluate)).

use alloc::vec::Vec;
use core::cell::OnceCell;

use crate::{
    analysis::sweep::LANES,
    model::{Expansion, Model},
    network::expand::Weight,
    part::PartFigure,
    solution::{Roots, Solution},
};

/// Builds that differ from `nominal` in these slots.
pub fn solve<'m>(nominal: &Solution<'m>, near: Option<&'m Roots>, changes: &[Vec<(usize, f64)>]) -> Vec<Solution<'m>> {
    let model = nominal.model;
    let base = nominal.weights();
    let mut builds = Vec::with_capacity(changes.len());
    for group in changes.chunks(LANES) {
        let first = builds.len();
        builds.extend(group.iter().map(|changed| nominal.moved(near, changed)));
        let group = &mut builds[first..];
        let mut together: Vec<Weight<LANES>> = base.iter().map(Weight::alike).collect();
        for (lane, build) in group.iter().enumerate() {
            for (lanes, weight) in together.iter_mut().zip(build.weights()) {
                lanes.set(lane, weight);
            }
        }
        let forward = run(model, &together, group.len(), model.forward_expansions().map(|e| (e, None)));
        let backward = run(model, &together, group.len(), model.backward_expansions());
        for ((build, forward), backward) in group.iter_mut().zip(forward).zip(backward) {
            build.forward = OnceCell::from(forward);
            build.backward = OnceCell::from(backward);
        }
    }
    builds
}

/// The relative change of the first drive's DC gain when each of these slots goes from `1 − step` to `1 + step` times its value.
pub fn dc_changes(solution: &Solution<'_>, slots: &[usize], step: f64) -> Vec<f64> {
    /// Slots at once: each takes two lanes.
    const PAIRS: usize = LANES / 2;
    let model = solution.model;
    let base = solution.weights();
    let resistances = model.output_resistances(&solution.values);
    let amplifiers = 0..solution.amplifiers();
    let open_loop: Vec<f64> = amplifiers.map(|a| solution.part_of(a, PartFigure::OpenLoop).unwrap_or(1.0)).collect();
    let [middle] = model.dc_gains(base, &open_loop, &mut model.scratch.borrow_mut());
    let mut changes = Vec::with_capacity(slots.len());
    let mut values = solution.values.clone();
    for group in slots.chunks(PAIRS) {
        let mut together: Vec<Weight<LANES>> = base.iter().map(Weight::alike).collect();
        for (pair, &slot) in group.iter().enumerate() {
            for (side, factor) in [1.0 - step, 1.0 + step].into_iter().enumerate() {
                values[slot] = solution.values[slot] * factor;
                for column in model.adjoint.columns_of(slot, &model.network, &model.parameters) {
                    let weight = model.adjoint.weight(column, &model.network, &values, &resistances, model.scale);
                    together[column].set(2 * pair + side, &weight);
                }
            }
            values[slot] = solution.values[slot];
        }
        let gains = model.dc_gains(&together, &open_loop, &mut model.lanes.borrow_mut());
        changes.extend(gains.chunks(2).take(group.len()).map(|pair| (pair[1] - pair[0]) / middle));
    }
    changes
}

/// Each build's terms of some expansions, one after the other.
fn run<'e>(
    model: &Model<'_>,
    weights: &[Weight<LANES>],
    builds: usize,
    expansions: impl Iterator<Item = (&'e Expansion, Option<usize>)> + Clone,
) -> Vec<Vec<f64>> {
    let scratch = &mut *model.lanes.borrow_mut();
    let total = expansions.clone().map(|(e, _)| e.plan.terms()).sum();
    let mut terms: Vec<Vec<f64>> = (0..builds).map(|_| Vec::with_capacity(total)).collect();
    for (expansion, struck) in expansions {
        match struck {
            None => expansion.plan.evaluate(weights, scratch),
            Some(amplifier) => expansion.plan.evaluate(&expansion.struck(weights, amplifier), scratch),
        }
        let ends = expansion.plan.ends(scratch);
        for (lane, terms) in terms.iter_mut().enumerate() {
            terms.extend(ends.iter().map(|term| term[lane]));
        }
    }
    terms
}
