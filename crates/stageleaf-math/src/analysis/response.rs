//! The closed loop's response: −3 dB edge, peaking, natural frequency, impedances, drift of the gain.

use alloc::vec::Vec;
use core::f64::consts::TAU;

use num_complex::Complex64;

use super::search;
use crate::{
    figure::Figure,
    kind::Reference,
    model::Probe,
    parameters::{Entry, touch},
    polynomial::Polynomial,
    report::{ResponsePoint, Root},
    solution::{Solution, magnitude},
    together,
};

/// Where the kind's gain is taken, and the gain there.
#[derive(Clone, Copy, Debug)]
pub struct ReferencePoint {
    /// Scaled angular frequency; 0 at DC.
    pub omega: f64,
    /// The gain: magnitude with the sign of the ideal gain.
    pub gain: f64,
}

/// The pass-band reference of the first drive's transfer.
pub fn reference(solution: &Solution<'_>) -> ReferencePoint {
    // Where a capacitive source blocks DC, the pass band is where the response is largest.
    let reference = match solution.model.stage.kind.spec().reference {
        Reference::Dc if solution.load_numerator().constant().abs() <= 0.0 => Reference::Peak,
        other => other,
    };
    let solution = solution.network();
    *solution.reference.get_or_init(|| match reference {
        Reference::Dc => ReferencePoint { omega: 0.0, gain: solution.dc_gain(0) },
        Reference::Frequency(frequency) => {
            let omega = solution.scaled(frequency(solution.model.stage));
            if omega <= 0.0 {
                return ReferencePoint { omega: 0.0, gain: solution.dc_gain(0) };
            }
            ReferencePoint { omega, gain: signed(solution, solution.transfer(0, omega)) }
        }
        Reference::Peak => {
            let looped = solution.looped();
            let numerator = solution.load_numerator();
            let power = |omega: f64| numerator.at(omega).norm_sqr() / looped.closed.at(omega).norm_sqr();
            let grid = solution.grid();
            let Some(top) = (0..grid.len()).max_by(|&a, &b| power(grid[a]).total_cmp(&power(grid[b]))) else {
                return ReferencePoint { omega: 0.0, gain: solution.dc_gain(0) };
            };
            let (omega, _) = search::peak(grid[top.saturating_sub(1)], grid[(top + 1).min(grid.len() - 1)], power);
            ReferencePoint { omega, gain: signed(solution, solution.transfer(0, omega)) }
        }
    })
}

/// Whether the kind's gain is the one at DC.
pub fn steady(solution: &Solution<'_>) -> bool {
    matches!(solution.model.stage.kind.spec().reference, Reference::Dc) && solution.load_numerator().constant().abs() > 0.0
}

/// Magnitude with the sign of the ideal gain.
fn signed(solution: &Solution<'_>, h: Complex64) -> f64 {
    let stage = solution.model.stage;
    if (stage.kind.spec().ideal_gain)(stage) < 0.0 { -magnitude(h) } else { magnitude(h) }
}

/// Edges and peak.
#[derive(Clone, Copy, Debug)]
pub struct Edges {
    /// Lowest frequency above the reference at which `|H|` is 1/√2 of its value there, Hz; infinite where it never falls so far.
    pub bandwidth: f64,
    /// Highest frequency below the reference at which it is, Hz; zero where it never falls so far.
    pub low_cutoff: f64,
    /// `max |H|` over the value at the reference, at least 1.
    pub peaking: f64,
}

/// Edges and peak of the first drive's transfer to the load.
///
/// # Formula
/// Sign changes of `|H|² − ½·|H(ref)|²` between grid points, refined to the last digits; the peak by golden section.
pub fn edges(solution: &Solution<'_>) -> Edges {
    let solution = solution.network();
    *solution.edges.get_or_init(|| {
        let looped = solution.looped();
        let numerator = solution.load_numerator();
        let ReferencePoint { omega: middle, gain } = reference(solution);
        let half = 0.5 * gain * gain;
        let power = |omega: f64| numerator.at(omega).norm_sqr() / looped.closed.at(omega).norm_sqr();
        let grid = solution.grid();
        let (mut bandwidth, mut low_cutoff) = (f64::INFINITY, 0.0);
        let mut powers = Vec::with_capacity(grid.len());
        powers.extend(grid.iter().map(|&w| power(w)));
        let start = grid.partition_point(|&w| w <= middle);
        let mut before = if middle > 0.0 { middle } else { grid.first().map_or(0.0, |w| w * 0.5) };
        for (i, &omega) in grid.iter().enumerate().skip(start) {
            let here = powers[i];
            if bandwidth.is_infinite() && here < half {
                bandwidth = solution.hertz(search::root(before, omega, |w| power(w) - half));
            }
            before = omega;
        }
        let mut after = middle;
        for (i, &omega) in grid.iter().enumerate().take(start).rev() {
            let here = powers[i];
            if low_cutoff <= 0.0 && here < half {
                low_cutoff = solution.hertz(search::root(omega, after, |w| power(w) - half));
            }
            after = omega;
        }
        let mut best = search::highest(grid, &powers, power).max(power(0.0));
        if middle > 0.0 && start > 0 && start < grid.len() {
            // A flat top may lie beside the reference, between two grid points.
            best = best.max(search::peak(grid[start - 1], grid[start], power).1);
        }
        let mut peaking = libm::sqrt(best) / gain.abs();
        // A rise that only rounding makes is none.
        if peaking < 1.0 + 1e-12 {
            peaking = 1.0;
        }
        Edges { bandwidth, low_cutoff, peaking }
    })
}

/// Natural frequency in Hz and Q: of a filter's own pair of poles, which is the one nearest to what its closed form says (two real poles
/// count as a pair with a Q below ½); of any other kind, of the least damped complex pair.
pub fn own_pair(solution: &Solution<'_>) -> Option<(f64, f64)> {
    let stage = solution.model.stage;
    let ideal = (stage.kind.spec().working)(stage).into_iter().find(|w| w.query.figure == Figure::NaturalFrequency);
    let Some(wanted) = ideal.map(|w| w.handbook).filter(|f| *f > 0.0 && f.is_finite()) else { return least_damped(solution) };
    let wanted = solution.scaled(wanted);
    let poles = solution.poles();
    let far = |size: f64| libm::log(size / wanted).abs();
    let complex = poles.iter().filter(|p| p.im > 0.0).map(|p| (magnitude(*p), magnitude(*p) / (2.0 * p.re.abs())));
    let mut real: Vec<f64> = poles.iter().filter(|p| p.im.abs() <= 0.0 && p.re < 0.0).map(|p| -p.re).collect();
    real.sort_by(|a, b| far(*a).total_cmp(&far(*b)));
    let two_real = match real[..] {
        [a, b, ..] => Some((libm::sqrt(a * b), libm::sqrt(a * b) / (a + b))),
        _ => None,
    };
    let (size, q) = complex.chain(two_real).min_by(|a, b| far(a.0).total_cmp(&far(b.0)))?;
    Some((solution.hertz(size), q))
}

/// Natural frequency in Hz and Q of the least damped complex pair of closed-loop poles.
pub fn least_damped(solution: &Solution<'_>) -> Option<(f64, f64)> {
    // Not by the imaginary part, which of a pair of high Q is the magnitude to the last digit.
    let damping = |p: &Complex64| -p.re / magnitude(*p);
    let pair = solution.poles().iter().filter(|p| p.im > 0.0).min_by(|a, b| damping(a).total_cmp(&damping(b)))?;
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
    let omega = solution.scaled(solution.model.stage.signal().and_then(|s| s.frequency).unwrap_or(0.0));
    let size = |expansion| magnitude(solution.determinant(expansion, &probe.network).at(omega));
    let (above, below) = (size(&probe.above), size(&probe.below));
    if below <= 0.0 { f64::INFINITY } else { above / below * solution.model.scale.0 }
}

/// Largest relative change of the gain per kelvin: the sum of `|∂ln G/∂ln x|·tc` over the components.
///
/// # Formula
/// Central differences of 1e-4; the worst combination of signs, since a stated coefficient has none.
pub fn gain_drift(solution: &Solution<'_>) -> f64 {
    const STEP: f64 = 1e-4;
    let model = solution.model;
    let at_dc = steady(solution) && model.floating.islands == 0;
    let counts = |slot: usize, entry: &Entry| entry.drift > 0.0 && entry.touches & touch::NETWORK != 0 && !(at_dc && model.reactive(slot));
    let slots: Vec<usize> = model.parameters.entries.iter().enumerate().filter(|(s, e)| counts(*s, e)).map(|(s, _)| s).collect();
    let gain = reference(solution).gain;
    let moved = |slot: usize, factor: f64| {
        let mut values = solution.values.clone();
        values[slot] *= factor;
        values
    };
    // By slot: the relative change over both steps.
    let changes: Vec<f64> = if at_dc {
        together::dc_changes(solution, &slots, STEP)
    } else {
        let there = |slot, factor| reference(&Solution::new(model, moved(slot, factor), None)).gain;
        slots.iter().map(|&slot| (there(slot, 1.0 + STEP) - there(slot, 1.0 - STEP)) / gain).collect()
    };
    slots.iter().zip(changes).map(|(slot, change)| (change / (2.0 * STEP)).abs() * model.parameters.entries[*slot].drift).sum()
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
