//! Sums of exponentials: what a network does in time, exact in its poles.
//!
//! # Formula
//! A transfer `N(s)/D(s)` with simple poles `p` is `Σ N(p)/D'(p)·e^(p·t)` in time. Nothing is sampled: the sum is exact at any time, and
//! only the search for its peaks and crossings walks along it, in steps of a twentieth of the fastest term that still counts.
//!
//! # Does not apply
//! Poles that coincide exactly: one of them is moved by a ten-millionth, which is what is lost.
//!
//! # Source
//! Partial fractions; the search is derived here. Checked in `tests/outside/` by `oracle_around.py`.

use alloc::vec::Vec;

use num_complex::Complex64;

use crate::{
    network::{Network, Node, dense::admittance},
    part::PartFigure,
    polynomial::Polynomial,
    solution::{Solution, magnitude},
};

/// A term's share of a step.
const STEP: f64 = 0.05;
/// What counts of a term, against what is sought.
const COUNTS: f64 = 1e-4;
/// Bounded work.
const MOST_STEPS: usize = 50_000;

/// `Re Σ a·e^(p·t)`.
#[derive(Clone, Debug, Default)]
pub struct Modes(pub Vec<(Complex64, Complex64)>);

impl Modes {
    /// The terms of `numerators/denominator`, whose roots are `poles`, by partial fractions, in rad/s where the roots are scaled by `omega`: one sum for each
    /// numerator, all over the same poles.
    pub fn of(
        numerators: &[&Polynomial],
        denominator: &Polynomial,
        mut poles: Vec<Complex64>,
        omega: f64,
    ) -> (Vec<Complex64>, Vec<Vec<Complex64>>) {
        for i in 1..poles.len() {
            if poles[..i].iter().any(|p| (p - poles[i]).norm_sqr() <= 0.0) {
                poles[i] *= 1.0 + 1e-7;
            }
        }
        let lead = denominator.0.iter().rev().find(|c| c.abs() > 0.0).copied().unwrap_or(1.0);
        let residues = numerators
            .iter()
            .map(|numerator| {
                let residue = |(i, &p): (usize, &Complex64)| {
                    // Divided one by one, so that nothing overflows.
                    let start = numerator.0.iter().rev().fold(Complex64::new(0.0, 0.0), |sum, c| sum * p + c) * (omega / lead);
                    poles.iter().enumerate().filter(|(j, _)| *j != i).fold(start, |sum, (_, q)| sum / (p - q))
                };
                poles.iter().enumerate().map(residue).collect()
            })
            .collect();
        (poles.iter().map(|p| p * omega).collect(), residues)
    }

    /// The value at a time.
    pub fn at(&self, time: f64) -> f64 {
        self.0.iter().map(|(pole, a)| a.re * grown(pole, time).re - a.im * grown(pole, time).im).sum()
    }

    /// What the value never exceeds from a time on, where all terms decay.
    pub fn envelope(&self, time: f64) -> f64 {
        self.0.iter().map(|(pole, a)| magnitude(*a) * libm::exp(pole.re * time)).sum()
    }

    /// The slope, as another sum.
    pub fn slope(&self) -> Self {
        Self(self.0.iter().map(|(pole, a)| (*pole, a * pole)).collect())
    }

    /// The step to the next time at which to look: small against every term that counts beside `against`.
    fn step(&self, time: f64, against: f64) -> f64 {
        let counts = |(pole, a): &&(Complex64, Complex64)| magnitude(*a) * libm::exp(pole.re * time) > COUNTS * against;
        STEP / self.0.iter().filter(counts).map(|(pole, _)| magnitude(*pole)).fold(0.0, f64::max)
    }

    /// The largest magnitude from a time on.
    pub fn largest_from(&self, start: f64) -> f64 {
        let size = |t: f64| self.at(t).abs();
        let (mut before, mut last) = ((start, size(start)), (start, size(start)));
        // What stands still is reached at the end.
        let rest: f64 = self.0.iter().filter(|(pole, _)| pole.norm_sqr() <= 0.0).map(|(_, a)| a.re).sum();
        let mut best = last.1.max(rest.abs());
        for _ in 0..MOST_STEPS {
            let envelope = self.envelope(last.0);
            let step = self.step(last.0, best.max(1e-9 * envelope));
            if !step.is_finite() {
                break;
            }
            let here = (last.0 + step, size(last.0 + step));
            if last.1 >= before.1 && last.1 >= here.1 {
                best = best.max(peak(before.0, here.0, size));
            }
            best = best.max(here.1);
            if envelope <= best {
                break;
            }
            (before, last) = (last, here);
        }
        best
    }

    /// The last time at which the magnitude is `level`; zero where it starts below and stays there. `None` where it never decays.
    pub fn last_beyond(&self, level: f64) -> Option<f64> {
        let slowest = self.0.iter().filter(|(_, a)| magnitude(*a) > 0.0).map(|(pole, _)| -pole.re).fold(f64::INFINITY, f64::min);
        if slowest <= 0.0 {
            return None;
        }
        if slowest.is_infinite() || self.envelope(0.0) <= level {
            return Some(0.0);
        }
        // Where the envelope has fallen to the level, or a hair below.
        let (mut low, mut high) = (0.0, 1.0 / slowest);
        while self.envelope(high) > level {
            (low, high) = (high, high * 2.0);
            if !high.is_finite() {
                return None;
            }
        }
        while high - low > 1e-3 * high {
            let middle = f64::midpoint(low, high);
            if self.envelope(middle) > level { low = middle } else { high = middle }
        }
        let over = |t: f64| self.at(t).abs() - level;
        let (mut after, mut time) = (high, high);
        for _ in 0..MOST_STEPS {
            let next = (time - self.step(time, level).min(time)).max(0.0);
            let middle = over(time);
            // A peak between two looks may just reach over.
            let top = if middle > -0.01 * level && middle >= over(next) && middle >= over(after) && next < after {
                peak_at(next, after, |t| over(t) + level)
            } else {
                time
            };
            for (at, beyond) in [(top, after), (next, time)] {
                if over(at) > 0.0 {
                    let (mut inside, mut outside) = (at, beyond);
                    for _ in 0..200 {
                        let middle = f64::midpoint(inside, outside);
                        if middle <= inside || middle >= outside {
                            break;
                        }
                        if over(middle) > 0.0 { inside = middle } else { outside = middle }
                    }
                    return Some(outside);
                }
            }
            if next <= 0.0 {
                return Some(0.0);
            }
            (after, time) = (time, next);
        }
        Some(time)
    }
}

/// What an amplifier's controlled source and the current out of its pin take of each term, from what the nodes take of it.
pub fn at_pin(
    solution: &Solution<'_>,
    network: &Network,
    amplifier: usize,
    poles: &[Complex64],
    at: impl Fn(Node, usize) -> Complex64,
) -> (Vec<Complex64>, Vec<Complex64>) {
    let pin = network.amplifiers[amplifier].pin;
    let ohms = solution.part_of(amplifier, PartFigure::OutputResistance).unwrap_or(0.0);
    let of_pole = |(i, pole): (usize, &Complex64)| {
        let mut current = Complex64::new(0.0, 0.0);
        for element in &network.elements {
            let other = match (element.a == pin, element.b == pin) {
                (true, false) => element.b,
                (false, true) => element.a,
                _ => continue,
            };
            current += (at(pin, i) - at(other, i)) * admittance(element.law, &solution.values, *pole);
        }
        (at(pin, i) + current * ohms, current)
    };
    poles.iter().enumerate().map(of_pole).unzip()
}

/// `e^(p·t)`.
fn grown(pole: &Complex64, time: f64) -> Complex64 {
    let size = libm::exp(pole.re * time);
    if pole.im.abs() > 0.0 {
        Complex64::new(size * libm::cos(pole.im * time), size * libm::sin(pole.im * time))
    } else {
        Complex64::new(size, 0.0)
    }
}

/// The largest value between two times around a peak, by golden section.
fn peak(a: f64, b: f64, f: impl Fn(f64) -> f64) -> f64 {
    f(peak_at(a, b, &f))
}

fn peak_at(mut a: f64, mut b: f64, f: impl Fn(f64) -> f64) -> f64 {
    const RATIO: f64 = 0.618_033_988_749_894_9;
    for _ in 0..48 {
        let (x, y) = (b - RATIO * (b - a), a + RATIO * (b - a));
        if f(x) < f(y) { a = x } else { b = y }
    }
    f64::midpoint(a, b)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn modes(terms: &[(f64, f64, f64, f64)]) -> Modes {
        Modes(terms.iter().map(|&(pr, pi, ar, ai)| (Complex64::new(pr, pi), Complex64::new(ar, ai))).collect())
    }

    #[test]
    fn one_decaying_exponential_by_hand() {
        let one = modes(&[(-2.0, 0.0, 3.0, 0.0)]);
        assert!((one.largest_from(1.0) - 3.0 * libm::exp(-2.0)).abs() < 1e-15);
        // 3·e^(−2t) = 0.03 at t = ln(100)/2.
        assert!((one.last_beyond(0.03).unwrap() - libm::log(100.0) / 2.0).abs() < 1e-12);
        assert_eq!(one.last_beyond(4.0), Some(0.0));
        assert_eq!(modes(&[(0.0, 0.0, 1.0, 0.0)]).last_beyond(0.1), None);
    }

    #[test]
    fn a_ringing_term_peaks_later_by_hand() {
        // e^(−t)·sin(10t): the slope is zero at tan(10t) = 10; the first such time after a quarter period is the second peak.
        let ringing = modes(&[(-1.0, 10.0, 0.0, -0.5), (-1.0, -10.0, 0.0, 0.5)]);
        let turn = (libm::atan(10.0) + core::f64::consts::PI) / 10.0;
        let wanted = libm::exp(-turn) * libm::sin(10.0 * turn);
        assert!((ringing.largest_from(0.25) - wanted.abs()).abs() < 1e-9, "{} {wanted}", ringing.largest_from(0.25));
        // Just below that peak, the last time lies just behind it.
        let last = ringing.last_beyond(wanted.abs() * (1.0 - 1e-6)).unwrap();
        assert!(last > turn && last - turn < 1e-3, "{last} {turn}");
    }

    #[test]
    fn partial_fractions_by_hand() {
        // 1/((s + 1)(s + 2)) = 1/(s + 1) − 1/(s + 2)
        let one = |c: &[f64]| Polynomial(crate::polynomial::Coefficients::from_slice(c));
        let (poles, residues) = Modes::of(&[&one(&[1.0])], &one(&[2.0, 3.0, 1.0]), one(&[2.0, 3.0, 1.0]).roots(None), 1.0);
        let sum = Modes(poles.into_iter().zip(residues[0].iter().copied()).collect());
        assert!((sum.at(0.7) - (libm::exp(-0.7) - libm::exp(-1.4))).abs() < 1e-14);
    }
}
