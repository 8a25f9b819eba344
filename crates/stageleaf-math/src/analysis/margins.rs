//! The loop: crossings of the return ratio, phase and gain margin, sensitivity peak.
//!
//! # Formula
//! `T = A·XA/X0`, the return ratio of the amplifier's controlled source. Phase margin: the angle of `−T` where `|T| = 1`; of
//! several crossings the least. Gain margin: `1/|T|` where `T` is negative real, the least above 1 (one below 1, of a
//! conditionally stable loop, only where there is no other). Sensitivity peak: `max |1/(1+T)|`.
//!
//! # Source
//! H. W. Bode, *Network Analysis and Feedback Amplifier Design*, Van Nostrand 1945 (return ratio), from memory. Checked in
//! `tests/outside/`.

use super::search;
use crate::solution::{Solution, magnitude};

/// What the loop shows.
#[derive(Clone, Copy, Debug)]
pub struct Margins {
    /// Hz, of the crossing with the least phase margin.
    pub crossover: Option<f64>,
    /// rad, at that crossing.
    pub phase: Option<f64>,
    /// Factor; infinite without a −180° crossing.
    pub gain: f64,
    /// max |1/(1+T)|.
    pub sensitivity_peak: f64,
}

/// Crossings, margins, sensitivity peak.
pub fn margins(solution: &Solution<'_>) -> Margins {
    *solution.margins.get_or_init(|| {
        let looped = solution.looped();
        let grid = solution.grid();
        let at = |w: f64| (looped.returned.at(w), looped.open.at(w));
        let size = |w: f64| {
            let (r, o) = at(w);
            r.norm_sqr() / o.norm_sqr() - 1.0
        };
        // Im T has the sign of Im(N·conj D), without the division.
        let turn = |w: f64| {
            let (r, o) = at(w);
            (r * o.conj()).im
        };
        let sensitivity = |w: f64| looped.open.at(w).norm_sqr() / looped.closed.at(w).norm_sqr();
        let mut worst: Option<(f64, f64)> = None;
        let (mut above, mut below) = (f64::INFINITY, 0.0f64);
        let (mut top, mut top_at) = (0.0, 0);
        let mut before: Option<(f64, f64, f64)> = None;
        for (i, &omega) in grid.iter().enumerate() {
            let (r, o) = at(omega);
            let open = o.norm_sqr();
            let (s, t, e) = (r.norm_sqr() - open, (r * o.conj()).im, open / (r + o).norm_sqr());
            if e > top {
                (top, top_at) = (e, i);
            }
            if let Some((w, s0, t0)) = before {
                if (s0 < 0.0) != (s < 0.0) {
                    let at = search::root(w, omega, size);
                    let ratio = solution.return_ratio(at);
                    let margin = libm::atan2(-ratio.im, -ratio.re);
                    if worst.is_none_or(|(_, m)| margin < m) {
                        worst = Some((at, margin));
                    }
                }
                if (t0 < 0.0) != (t < 0.0) {
                    let at = search::root(w, omega, turn);
                    let ratio = solution.return_ratio(at);
                    if ratio.re < 0.0 {
                        let factor = 1.0 / magnitude(ratio);
                        if factor >= 1.0 { above = above.min(factor) } else { below = below.max(factor) }
                    }
                }
            }
            before = Some((omega, s, t));
        }
        let mut sensitivity_peak = 1.0;
        if !grid.is_empty() {
            let (a, c) = (grid[top_at.saturating_sub(1)], grid[(top_at + 1).min(grid.len() - 1)]);
            sensitivity_peak = libm::sqrt(search::peak(a, c, sensitivity).1.max(top));
        }
        let unstable = solution.oscillates();
        let gain = if unstable && below > 0.0 {
            below
        } else if above.is_finite() || below <= 0.0 {
            above
        } else {
            below
        };
        Margins { crossover: worst.map(|(w, _)| solution.hertz(w)), phase: worst.map(|(_, m)| m), gain, sensitivity_peak }
    })
}
