//! Transfer and noise over many frequencies at once: eight side by side, so that the compiler uses vector registers.
//!
//! # Formula
//! Each polynomial is evaluated on the imaginary axis as an even and an odd part in `x = −ω²`. The additions and multiplications
//! are those of [`Polynomial::at`], in the same order, so a polynomial has the same bits in a sweep as at a single point.
//!
//! # Units
//! Frequencies in Hz; densities squared, V²/Hz.

use alloc::{vec, vec::Vec};

use num_complex::Complex64;

use super::noise;
use crate::{polynomial::Polynomial, report::NoiseOrigin, solution::Solution};

/// How many frequencies stand side by side.
pub const LANES: usize = 8;

/// One number for each of [`LANES`] frequencies.
pub type Lane = [f64; LANES];

/// A polynomial at eight scaled angular frequencies: real and imaginary parts.
#[inline]
#[must_use]
pub fn at(polynomial: &Polynomial, omega: &Lane) -> (Lane, Lane) {
    let (mut even, mut odd) = ([0.0; LANES], [0.0; LANES]);
    let mut x = [0.0; LANES];
    for (x, w) in x.iter_mut().zip(omega) {
        *x = -w * w;
    }
    let mut rest = &polynomial.0[..];
    if rest.len() % 2 == 1 {
        even = [rest[rest.len() - 1]; LANES];
        rest = &rest[..rest.len() - 1];
    }
    for pair in rest.chunks_exact(2).rev() {
        for lane in 0..LANES {
            odd[lane] = odd[lane] * x[lane] + pair[1];
            even[lane] = even[lane] * x[lane] + pair[0];
        }
    }
    for (o, w) in odd.iter_mut().zip(omega) {
        *o *= w;
    }
    (even, odd)
}

/// `|p|²` at eight scaled angular frequencies.
#[inline]
#[must_use]
pub fn squared(polynomial: &Polynomial, omega: &Lane) -> Lane {
    let (mut re, im) = at(polynomial, omega);
    for (r, i) in re.iter_mut().zip(&im) {
        *r = *r * *r + i * i;
    }
    re
}

/// Ratio of two polynomials over the frequencies.
#[must_use]
pub fn ratio(solution: &Solution<'_>, above: &Polynomial, below: &Polynomial, frequencies: &[f64]) -> Vec<Complex64> {
    let mut values = Vec::with_capacity(frequencies.len());
    for chunk in frequencies.chunks(LANES) {
        let omega = lanes(solution, chunk);
        let ((nr, ni), (dr, di)) = (at(above, &omega), at(below, &omega));
        for lane in 0..chunk.len() {
            values.push(Complex64::new(nr[lane], ni[lane]) / Complex64::new(dr[lane], di[lane]));
        }
    }
    values
}

/// Noise at the load by generator.
#[derive(Clone, Debug)]
pub struct Noise {
    /// Whose noise each row is; a component with several elements has several rows.
    pub origins: Vec<NoiseOrigin>,
    /// V²/Hz, row by row, one number for each frequency.
    pub rows: Vec<Vec<f64>>,
    /// Their sums.
    pub total: Vec<f64>,
}

/// Noise density, squared, by generator over the frequencies.
#[must_use]
pub fn noise(solution: &Solution<'_>, frequencies: &[f64]) -> Noise {
    let generators = noise::generators(solution);
    let closed = &solution.looped().closed;
    let n = frequencies.len();
    let mut rows = vec![vec![0.0; n]; generators.len()];
    let mut total = vec![0.0; n];
    for (index, chunk) in frequencies.chunks(LANES).enumerate() {
        let start = index * LANES;
        let omega = lanes(solution, chunk);
        let mut hertz = [chunk[chunk.len() - 1]; LANES];
        hertz[..chunk.len()].copy_from_slice(chunk);
        let mut inverse = squared(closed, &omega);
        for d in &mut inverse {
            *d = 1.0 / *d;
        }
        for (row, generator) in rows.iter_mut().zip(&generators) {
            let mut power = squared(&generator.numerator, &omega);
            let spectrum = generator.spectrum.at_lanes(&hertz);
            for lane in 0..LANES {
                power[lane] = power[lane] * inverse[lane] * spectrum[lane];
            }
            row[start..start + chunk.len()].copy_from_slice(&power[..chunk.len()]);
            for (sum, p) in total[start..start + chunk.len()].iter_mut().zip(&power) {
                *sum += p;
            }
        }
    }
    Noise { origins: generators.iter().map(|g| g.origin).collect(), rows, total }
}

/// A chunk's scaled angular frequencies; unused lanes repeat the last.
pub(crate) fn lanes(solution: &Solution<'_>, chunk: &[f64]) -> Lane {
    let mut omega = [solution.scaled(chunk[chunk.len() - 1]); LANES];
    for (w, f) in omega.iter_mut().zip(chunk) {
        *w = solution.scaled(*f);
    }
    omega
}
