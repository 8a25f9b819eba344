//! The closed loop's response: −3 dB edge, peaking, natural frequency, impedances, drift of the gain.

use alloc::vec::Vec;
use core::f64::consts::TAU;

use num_complex::Complex64;

use super::search;
use crate::{
    model::Probe,
    parameters::touch,
    polynomial::Polynomial,
    report::{ResponsePoint, Root},
    solution::{Solution, magnitude},
};

/// Edge and peak.
#[derive(Clone, Copy, Debug)]
pub struct Edges {
    /// Lowest frequency at which `|H|` is `|H(0)|/√2`, Hz; infinite where it never falls so far.
    pub bandwidth: f64,
    /// `max |H| / |H(0)|`, at least 1.
    pub peaking: f64,
}

/// Edge and peak of the transfer to the load.
///
/// # Formula
/// Sign changes of `|N|²·|D(0)|² − ½·|N(0)|²·|D|²` between grid points, refined to the last digits; the peak by golden section.
pub fn edges(solution: &Solution<'_>) -> Edges {
    *solution.edges.get_or_init(|| {
        let looped = solution.looped();
        let numerator = &looped.forward[usize::from(solution.model.network.load.0)];
        let reference = numerator.constant() / looped.closed.constant();
        let half = 0.5 * reference * reference;
        let power = |omega: f64| numerator.at(omega).norm_sqr() / looped.closed.at(omega).norm_sqr();
        let grid = solution.grid();
        let mut bandwidth = f64::INFINITY;
        let (mut top, mut top_at) = (reference * reference, None);
        let mut before: Option<f64> = None;
        for (i, &omega) in grid.iter().enumerate() {
            let here = power(omega);
            if here > top {
                (top, top_at) = (here, Some(i));
            }
            if bandwidth.is_infinite() && here < half {
                let from = before.unwrap_or(omega * 0.5);
                bandwidth = solution.hertz(search::root(from, omega, |w| power(w) - half));
            }
            before = Some(omega);
        }
        let mut peaking = 1.0;
        if let Some(i) = top_at {
            let (a, c) = (grid[i.saturating_sub(1)], grid[(i + 1).min(grid.len() - 1)]);
            let (_, best) = search::peak(a, c, power);
            peaking = libm::sqrt(best.max(top)) / reference.abs();
            // A rise that only rounding makes is none.
            if peaking < 1.0 + 1e-12 {
                peaking = 1.0;
            }
        }
        Edges { bandwidth, peaking }
    })
}

/// Natural frequency in Hz and Q of the least damped complex pair of closed-loop poles.
pub fn least_damped(solution: &Solution<'_>) -> Option<(f64, f64)> {
    let pair = solution
        .roots()
        .poles
        .iter()
        .filter(|p| p.im > 0.0)
        .max_by(|a, b| (a.im / magnitude(**a) - b.im / magnitude(**b)).total_cmp(&0.0).then((-a.re).total_cmp(&-b.re).reverse()))?;
    let size = magnitude(*pair);
    Some((solution.hertz(size), size / (2.0 * pair.re.abs())))
}

/// Magnitude of the impedance that the source sees at the stage's terminal, at the signal's frequency, else at DC; Ω.
pub fn input_impedance(solution: &Solution<'_>) -> f64 {
    impedance(solution, solution.model.input_probe())
}

/// Magnitude of the impedance at the output terminal without the load, at the signal's frequency, else at DC; Ω.
pub fn output_impedance(solution: &Solution<'_>) -> f64 {
    impedance(solution, solution.model.output_probe())
}

fn impedance(solution: &Solution<'_>, probe: &Probe) -> f64 {
    let omega = solution.scaled(solution.model.stage.signal.and_then(|s| s.frequency).unwrap_or(0.0));
    let size = |expansion| magnitude(solution.determinant(expansion, &probe.network).at(omega));
    let (above, below) = (size(&probe.above), size(&probe.below));
    if below <= 0.0 { f64::INFINITY } else { above / below * solution.model.scale.0 }
}

/// Largest relative change of the DC gain per kelvin: the sum of `|∂ln G/∂ln x|·tc` over the components.
///
/// # Formula
/// Central differences of 1e-4; the worst combination of signs, since a stated coefficient has none.
pub fn gain_drift(solution: &Solution<'_>) -> f64 {
    const STEP: f64 = 1e-4;
    let gain = solution.dc_gain();
    let mut values = solution.values.clone();
    let mut sum = 0.0;
    for (slot, entry) in solution.model.parameters.entries.iter().enumerate() {
        if entry.drift > 0.0 && entry.touches & touch::NETWORK != 0 {
            let nominal = values[slot];
            values[slot] = nominal * (1.0 + STEP);
            let more = solution.model.dc_gain(&values);
            values[slot] = nominal * (1.0 - STEP);
            let less = solution.model.dc_gain(&values);
            values[slot] = nominal;
            sum += ((more - less) / (2.0 * STEP * gain)).abs() * entry.drift;
        }
    }
    sum
}

/// The curve of a ratio of polynomials over `points` frequencies between two, phase unwrapped from its value at the lowest.
pub fn curve(solution: &Solution<'_>, above: &Polynomial, below: &Polynomial, from: f64, to: f64, points: usize) -> Vec<ResponsePoint> {
    let frequencies: Vec<f64> = frequencies(from, to, points).collect();
    let values = super::sweep::ratio(solution, above, below, &frequencies);
    let mut turns = 0.0;
    let mut before: Option<f64> = None;
    frequencies
        .into_iter()
        .zip(values)
        .map(|(frequency, value)| {
            let angle = libm::atan2(value.im, value.re);
            if let Some(b) = before {
                if angle - b > core::f64::consts::PI {
                    turns -= TAU;
                } else if angle - b < -core::f64::consts::PI {
                    turns += TAU;
                }
            }
            before = Some(angle);
            ResponsePoint { frequency, magnitude: magnitude(value), phase: angle + turns }
        })
        .collect()
}

/// Log-spaced frequencies, both ends included.
#[expect(clippy::cast_precision_loss, reason = "a few hundred points")]
pub fn frequencies(from: f64, to: f64, points: usize) -> impl Iterator<Item = f64> {
    let (start, step) = (libm::log(from), (libm::log(to) - libm::log(from)) / (points.max(2) - 1) as f64);
    (0..points).map(move |i| if i == 0 { from } else { libm::exp(start + step * i as f64) })
}

/// Poles or zeros in rad/s.
pub fn unscaled(solution: &Solution<'_>, roots: &[Complex64]) -> Vec<Root> {
    let omega = solution.model.scale.1;
    roots.iter().map(|r| Root { re: r.re * omega, im: r.im * omega }).collect()
}
