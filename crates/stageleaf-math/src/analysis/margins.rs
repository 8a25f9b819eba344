//! The loop: crossings of the return ratio, phase and gain margin, sensitivity peak.
//!
//! # Formula
//! `T = A·XA/X0`, the return ratio of the amplifier's controlled source. Phase margin: the angle of `−T` where `|T| = 1`; of
//! several crossings the one nearest to −1, on whichever side of it a stable loop passes. Gain margin: `1/|T|` where `T` is negative real, the least above 1 (one below 1, of a
//! conditionally stable loop, only where there is no other). Sensitivity peak: `max |1/(1+T)|`.
//!
//! # Source
//! H. W. Bode, *Network Analysis and Feedback Amplifier Design*, Van Nostrand 1945 (return ratio), from memory. Checked in
//! `tests/outside/`.

use alloc::vec::Vec;

use super::search;
use crate::{
    polynomial::Polynomial,
    solution::{Solution, magnitude},
};

/// What the loop shows.
#[derive(Clone, Copy, Debug)]
pub struct Margins {
    /// Whose loop it is (from 0).
    pub amplifier: usize,
    /// Hz, of the crossing with the least phase margin.
    pub crossover: Option<f64>,
    /// Hz, of the highest crossing: where the loop's gain ends.
    pub last: Option<f64>,
    /// rad, at the crossing with the least phase margin.
    pub phase: Option<f64>,
    /// Factor; infinite without a −180° crossing.
    pub gain: f64,
    /// max |1/(1+T)|.
    pub sensitivity_peak: f64,
}

/// Crossings, margins, sensitivity peak: of the amplifier with the least phase margin, with the least of the others.
pub fn margins(solution: &Solution<'_>) -> Margins {
    let solution = solution.network();
    *solution.margins.get_or_init(|| {
        let mut worst = of(solution, 0);
        for amplifier in 1..solution.amplifiers() {
            let here = of(solution, amplifier);
            if here.phase.is_some_and(|p| worst.phase.is_none_or(|w| p < w)) {
                (worst.phase, worst.crossover, worst.amplifier) = (here.phase, here.crossover, here.amplifier);
            }
            worst.gain = worst.gain.min(here.gain);
            worst.sensitivity_peak = worst.sensitivity_peak.max(here.sensitivity_peak);
        }
        worst
    })
}

/// Crossings, margins, sensitivity peak of one amplifier's loop.
#[must_use]
pub fn of(solution: &Solution<'_>, amplifier: usize) -> Margins {
    let looped = solution.looped();
    let (returned, open) = (&looped.returned[amplifier], &looped.open[amplifier]);
    let grid = solution.grid();
    let at = |w: f64| (returned.at(w), open.at(w));
    let size = |w: f64| {
        let (r, o) = at(w);
        r.norm_sqr() / o.norm_sqr() - 1.0
    };
    // Im T has the sign of Im(N·conj D), without the division.
    let turn = |w: f64| {
        let (r, o) = at(w);
        (r * o.conj()).im
    };
    let sensitivity = |w: f64| open.at(w).norm_sqr() / looped.closed.at(w).norm_sqr();
    let stable = !solution.oscillates();
    // In a stable loop the crossing nearest to −1 in angle, on whichever side; else the one that is furthest past it.
    let rank = |margin: f64| if stable { margin.abs() } else { margin };
    let mut worst: Option<(f64, f64)> = None;
    let mut crossings: Vec<f64> = Vec::new();
    let (mut above, mut below) = (f64::INFINITY, 0.0f64);
    let mut before: Option<(f64, f64, f64)> = None;
    let mut sensitivities = Vec::with_capacity(grid.len());
    for &omega in grid {
        let (r, o) = at(omega);
        let power = o.norm_sqr();
        let (s, t, e) = (r.norm_sqr() - power, (r * o.conj()).im, power / (r + o).norm_sqr());
        sensitivities.push(e);
        if let Some((w, s0, t0)) = before {
            if (s0 < 0.0) != (s < 0.0) {
                crossings.push(search::root(w, omega, size));
            }
            if (t0 < 0.0) != (t < 0.0) {
                let at = search::root(w, omega, turn);
                let ratio = solution.return_ratio(amplifier, at);
                if ratio.re < 0.0 {
                    let factor = 1.0 / magnitude(ratio);
                    if factor >= 1.0 { above = above.min(factor) } else { below = below.max(factor) }
                }
            }
        }
        before = Some((omega, s, t));
    }
    // With several amplifiers, a rise or a dip that another one makes may pass one and return between two grid points.
    for w in grid.windows(3).filter(|_| solution.amplifiers() > 1) {
        let [low, here, high] = [size(w[0]), size(w[1]), size(w[2])];
        let turned = if here < 0.0 && here > -0.7 && here >= low && here >= high {
            Some(search::peak(w[0], w[2], size)).filter(|(_, top)| *top > 0.0)
        } else if here > 0.0 && here < 2.0 && here <= low && here <= high {
            Some(search::peak(w[0], w[2], |w| -size(w))).filter(|(_, top)| *top > 0.0)
        } else {
            None
        };
        if let Some((between, _)) = turned {
            crossings.extend([search::root(w[0], between, size), search::root(between, w[2], size)]);
        }
    }
    let last = crossings.iter().copied().reduce(f64::max);
    for at in crossings {
        let ratio = solution.return_ratio(amplifier, at);
        let margin = rank(libm::atan2(-ratio.im, -ratio.re));
        if worst.is_none_or(|(_, m)| margin < m) {
            worst = Some((at, margin));
        }
    }
    // Beyond the grid T tends to the ratio of its leading coefficients: to nothing, as a rule.
    let ends = sensitivity_limit(returned, open).max(sensitivity(0.0));
    let sensitivity_peak = libm::sqrt(search::highest(grid, &sensitivities, sensitivity).max(ends));
    // A −180° crossing with |T| > 1 says how far a conditionally stable loop may fall, or how far an oscillating one is off.
    let gain = if below > 0.0 && (!stable || above.is_infinite()) { below } else { above };
    let last = last.map(|w| solution.hertz(w));
    Margins { amplifier, last, crossover: worst.map(|(w, _)| solution.hertz(w)), phase: worst.map(|(_, m)| m), gain, sensitivity_peak }
}

/// `|1/(1+T)|²` at infinite frequency.
fn sensitivity_limit(returned: &Polynomial, open: &Polynomial) -> f64 {
    let degree = |p: &Polynomial| p.0.iter().rposition(|c| c.abs() > 0.0);
    match (degree(returned), degree(open)) {
        (Some(r), Some(o)) if r == o => {
            let ratio = open.0[o] / (open.0[o] + returned.0[r]);
            ratio * ratio
        }
        (Some(r), Some(o)) if r > o => 0.0,
        _ => 1.0,
    }
}
