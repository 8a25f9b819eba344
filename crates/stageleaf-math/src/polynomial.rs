//! Real polynomials in s: evaluation on the imaginary axis, products, roots.

use alloc::{vec, vec::Vec};

use num_complex::Complex64;
use smallvec::SmallVec;

/// Coefficients: up to sixteen without a trip to the allocator, which would otherwise take a third of the engine's time.
pub type Coefficients = SmallVec<[f64; 16]>;

/// A real polynomial, lowest power first. Empty is zero.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Polynomial(pub Coefficients);

impl Polynomial {
    /// Adds `factor · other`.
    pub fn add_scaled(&mut self, other: &[f64], factor: f64) {
        if self.0.len() < other.len() {
            self.0.resize(other.len(), 0.0);
        }
        for (sink, source) in self.0.iter_mut().zip(other) {
            *sink += factor * source;
        }
    }

    /// The product with another.
    #[must_use]
    pub fn times(&self, other: &[f64]) -> Self {
        if self.0.is_empty() || other.is_empty() {
            return Self::default();
        }
        let mut product = Coefficients::from_elem(0.0, self.0.len() + other.len() - 1);
        for (i, a) in self.0.iter().enumerate() {
            for (j, b) in other.iter().enumerate() {
                product[i + j] += a * b;
            }
        }
        Self(product)
    }

    /// The value at `s = jω`: real and imaginary part.
    #[must_use]
    pub fn at(&self, omega: f64) -> Complex64 {
        let x = -omega * omega;
        let (mut even, mut odd) = (0.0, 0.0);
        let mut i = self.0.len();
        if i % 2 == 1 {
            i -= 1;
            even = self.0[i];
        }
        while i >= 2 {
            odd = odd * x + self.0[i - 1];
            even = even * x + self.0[i - 2];
            i -= 2;
        }
        Complex64::new(even, odd * omega)
    }

    /// `|p(jω)|²` as a polynomial in `x = ω²`.
    #[must_use]
    pub fn squared_magnitude(&self) -> Coefficients {
        // The coefficient of x^k: the sum of a_i·a_j over i + j = 2k, with the sign of j^i·(−j)^j.
        let a = &self.0;
        let mut square = Coefficients::from_elem(0.0, a.len());
        for (k, sum) in square.iter_mut().enumerate() {
            *sum = a[k] * a[k];
            let mut minus = true;
            for d in 1..=k.min(a.len() - 1 - k) {
                let term = 2.0 * a[k - d] * a[k + d];
                *sum += if minus { -term } else { term };
                minus = !minus;
            }
        }
        square
    }

    /// The value at a real argument.
    #[must_use]
    pub fn horner(&self, x: f64) -> f64 {
        self.0.iter().rev().fold(0.0, |sum, c| sum * x + c)
    }

    /// The constant term.
    #[must_use]
    pub fn constant(&self) -> f64 {
        self.0.first().copied().unwrap_or(0.0)
    }

    /// Whether every coefficient is zero.
    #[must_use]
    pub fn is_zero(&self) -> bool {
        self.0.iter().all(|c| c.abs() <= 0.0)
    }

    /// The roots, from `guesses` where their number fits (the roots of a neighbour), else from the Newton polygon.
    ///
    /// # Formula
    /// Aberth's simultaneous Newton iteration; beyond the unit circle on the reversed polynomial, so that nothing overflows.
    ///
    /// # Source
    /// O. Aberth, "Iteration methods for finding all zeros of a polynomial simultaneously", Math. Comp. 27 (1973);
    /// starting points: D. Bini, "Numerical computation of polynomial zeros by means of Aberth's method", Numer. Algorithms 13
    /// (1996); both from memory. Rejected: the eigenvalues of `C⁻¹G`, which lose the small poles when time constants span decades.
    #[must_use]
    pub fn roots(&self, guesses: Option<&[Complex64]>) -> Vec<Complex64> {
        let first = self.0.iter().position(|c| c.abs() > 0.0);
        let last = self.0.iter().rposition(|c| c.abs() > 0.0);
        let (Some(first), Some(last)) = (first, last) else { return Vec::new() };
        let coefficients = &self.0[first..=last];
        let degree = coefficients.len() - 1;
        let guesses = guesses.filter(|g| g.len() == first + degree).map(|g| &g[first..]);
        let mut roots = match guesses.and_then(|g| followed(coefficients, g)) {
            Some(roots) => roots,
            None => {
                let mut roots = guesses.map_or_else(|| starting_points(coefficients), unsettled);
                if !aberth(coefficients, &mut roots) && guesses.is_some() {
                    roots = starting_points(coefficients);
                    aberth(coefficients, &mut roots);
                }
                roots
            }
        };
        pair_up(&mut roots);
        let mut all = vec![Complex64::new(0.0, 0.0); first];
        all.append(&mut roots);
        all
    }
}

/// Points on the circles that the upper convex hull of `(k, ln|a_k|)` gives.
fn starting_points(coefficients: &[f64]) -> Vec<Complex64> {
    let degree = coefficients.len() - 1;
    let logs: Vec<Option<f64>> = coefficients.iter().map(|c| (c.abs() > 0.0).then(|| libm::log(c.abs()))).collect();
    let mut hull: Vec<usize> = Vec::new();
    for k in 0..=degree {
        let Some(y) = logs[k] else { continue };
        while hull.len() >= 2 {
            let (a, b) = (hull[hull.len() - 2], hull[hull.len() - 1]);
            let (ya, yb) = (logs[a].unwrap_or(0.0), logs[b].unwrap_or(0.0));
            if (yb - ya) * span(a, k) <= (y - ya) * span(a, b) {
                hull.pop();
            } else {
                break;
            }
        }
        hull.push(k);
    }
    let mut points = Vec::with_capacity(degree);
    for pair in hull.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let radius = libm::exp((logs[a].unwrap_or(0.0) - logs[b].unwrap_or(0.0)) / span(a, b));
        for k in 0..b - a {
            // Spread over the circle, slightly off the axes; the constant only breaks the symmetry.
            let angle = core::f64::consts::TAU * (span(0, k) + 0.25) / span(a, b) + 0.7 + span(0, a);
            points.push(Complex64::new(radius * libm::cos(angle), radius * libm::sin(angle)));
        }
    }
    points
}

#[expect(clippy::cast_precision_loss, reason = "degrees are far below 2^53")]
fn span(a: usize, b: usize) -> f64 {
    (b - a) as f64
}

/// A neighbour's roots as guesses, each turned a little its own way: from exactly real or exactly conjugate points the iteration cannot
/// leave the axis, and a pair that has become complex would never be found.
fn unsettled(roots: &[Complex64]) -> Vec<Complex64> {
    // By the golden angle, so that no two are turned alike.
    let mut turn = Complex64::new(0.764_842_187_284_488_5, 0.644_217_687_237_691);
    let step = Complex64::new(-0.737_368_878_078_32, 0.675_490_294_261_524);
    roots
        .iter()
        .map(|root| {
            turn *= step;
            root * (turn * 1e-4 + 1.0)
        })
        .collect()
}

/// Each of a neighbour's roots followed by Newton's iteration alone; `None` unless that has provably found them all.
///
/// # Formula
/// A disk of radius `n·|p/p'|` around a point holds a root of a polynomial of degree `n`. Where the disks around all `n` points are
/// apart, each holds exactly one. Complex roots come in pairs, of which one is followed.
///
/// # Source
/// P. Henrici, *Applied and Computational Complex Analysis* 1, Wiley 1974, section 6.4, from memory.
fn followed(coefficients: &[f64], guesses: &[Complex64]) -> Option<Vec<Complex64>> {
    const STEPS: usize = 8;
    /// Squared, relative: what is left after a step of this size is below rounding.
    const SETTLED: f64 = 1e-18;
    let n = guesses.len();
    let mut disks: SmallVec<[(Complex64, f64); 16]> = SmallVec::new();
    for &guess in guesses {
        if guess.im < 0.0 {
            continue;
        }
        let mut z = guess;
        let mut left = STEPS;
        let step = loop {
            let step = if z.im == 0.0 { Complex64::new(newton_real(coefficients, z.re), 0.0) } else { newton(coefficients, z) };
            z -= step;
            let (size, moved) = (z.norm_sqr(), step.norm_sqr());
            if moved <= SETTLED * size {
                break libm::sqrt(moved);
            }
            left -= 1;
            // A point that is far off, or that moves for ever, is no neighbour's root.
            let near = moved <= 0.25 * size;
            if left == 0 || !near {
                return None;
            }
        };
        let radius = span(0, n + 1) * step;
        disks.push((z, radius));
        if z.im != 0.0 {
            disks.push((z.conj(), radius));
        }
    }
    let apart = |i: usize| {
        let (a, r) = disks[i];
        disks[..i].iter().all(|&(b, s)| (a - b).norm_sqr() > (r + s) * (r + s))
    };
    (disks.len() == n && (1..n).all(apart)).then(|| disks.iter().map(|(z, _)| *z).collect())
}

/// Newton's correction at a real point.
fn newton_real(coefficients: &[f64], x: f64) -> f64 {
    let (mut p, mut d) = (0.0, 0.0);
    if x.abs() <= 1.0 {
        for &c in coefficients.iter().rev() {
            d = d * x + p;
            p = p * x + c;
        }
        if p.abs() <= 0.0 { 0.0 } else { p / d }
    } else {
        let w = 1.0 / x;
        for &c in coefficients {
            d = d * w + p;
            p = p * w + c;
        }
        if p.abs() <= 0.0 { 0.0 } else { x / (span(0, coefficients.len() - 1) - w * d / p) }
    }
}

/// Newton's correction `p/p'` at `z`, without overflow.
fn newton(coefficients: &[f64], z: Complex64) -> Complex64 {
    let zero = Complex64::new(0.0, 0.0);
    let (mut p, mut d) = (zero, zero);
    if z.norm_sqr() <= 1.0 {
        for &c in coefficients.iter().rev() {
            d = d * z + p;
            p = p * z + c;
        }
        if p.l1_norm() <= 0.0 { zero } else { p / d }
    } else {
        // p(z) = zⁿ·q(1/z): p'/p = n/z − q'(1/z)/(z²·q(1/z))
        let w = Complex64::new(1.0, 0.0) / z;
        for &c in coefficients {
            d = d * w + p;
            p = p * w + c;
        }
        if p.l1_norm() <= 0.0 {
            return zero;
        }
        let ratio = w * (Complex64::new(span(0, coefficients.len() - 1), 0.0) - w * d / p);
        Complex64::new(1.0, 0.0) / ratio
    }
}

/// Moves all roots to their places; whether each came to rest.
fn aberth(coefficients: &[f64], roots: &mut [Complex64]) -> bool {
    /// A step that is this small against its root no longer matters to any figure: a cluster of roots gets no further.
    const AT_REST: f64 = 1e-7;
    let mut last = vec![f64::INFINITY; roots.len()];
    let n = roots.len();
    let mut done = vec![false; n];
    for _ in 0..200 {
        let mut moving = false;
        for i in 0..n {
            if done[i] {
                continue;
            }
            let step = newton(coefficients, roots[i]);
            let mut repulsion = Complex64::new(0.0, 0.0);
            for j in 0..n {
                if j != i {
                    let gap = roots[i] - roots[j];
                    let size = gap.norm_sqr();
                    if size > 0.0 {
                        repulsion += gap.conj() / size;
                    }
                }
            }
            let correction = step / (Complex64::new(1.0, 0.0) - step * repulsion);
            if !(correction.re.is_finite() && correction.im.is_finite()) {
                done[i] = true;
                continue;
            }
            roots[i] -= correction;
            let moved = correction.norm_sqr() / roots[i].norm_sqr();
            // Near a double root the corrections stop shrinking far above the last digit: rounding moves the point about.
            let stalled = moved <= AT_REST * AT_REST && moved > 0.1 * last[i];
            last[i] = moved;
            if moved <= 1e-30 || stalled {
                done[i] = true;
            } else {
                moving = true;
            }
        }
        if !moving {
            break;
        }
    }
    last.iter().all(|step| *step <= AT_REST * AT_REST)
}

/// Real coefficients: roots are real or come in conjugate pairs. Orders them by magnitude.
fn pair_up(roots: &mut [Complex64]) {
    for root in roots.iter_mut() {
        if root.im.abs() <= 1e-9 * root.re.abs() {
            root.im = 0.0;
        }
    }
    roots.sort_by(|a, b| a.norm_sqr().total_cmp(&b.norm_sqr()).then(a.re.total_cmp(&b.re)).then(a.im.total_cmp(&b.im)));
    let mut used = vec![false; roots.len()];
    for i in 0..roots.len() {
        if used[i] || roots[i].im == 0.0 {
            continue;
        }
        used[i] = true;
        let mirrored = roots[i].conj();
        let partner = (0..roots.len())
            .filter(|&j| !used[j] && roots[j].im != 0.0)
            .min_by(|&a, &b| (roots[a] - mirrored).norm_sqr().total_cmp(&(roots[b] - mirrored).norm_sqr()));
        if let Some(j) = partner {
            used[j] = true;
            let (re, im) = ((roots[i].re + roots[j].re) / 2.0, (roots[i].im - roots[j].im).abs() / 2.0);
            roots[i] = Complex64::new(re, -im);
            roots[j] = Complex64::new(re, im);
        } else {
            // The odd one of a cluster that rounding has spread: it is real.
            roots[i].im = 0.0;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn polynomial(coefficients: &[f64]) -> Polynomial {
        Polynomial(Coefficients::from_slice(coefficients))
    }

    #[test]
    fn squared_magnitude_by_hand() {
        // p = 1 + 2s + 3s²: |p(jω)|² = (1 − 3x)² + 4x = 1 − 2x + 9x², x = ω²
        assert_eq!(polynomial(&[1.0, 2.0, 3.0]).squared_magnitude().as_slice(), [1.0, -2.0, 9.0]);
    }

    #[test]
    fn roots_over_thirteen_decades_are_found() {
        // By hand: (s+1)(s+1e6)(s+1e13)
        let p = polynomial(&[1.0, 1.0]).times(&[1e6, 1.0]).times(&[1e13, 1.0]);
        let roots = p.roots(None);
        for (root, want) in roots.iter().zip([-1.0, -1e6, -1e13]) {
            assert!((root.re / want - 1.0).abs() < 1e-12 && root.im == 0.0, "{root} {want}");
        }
    }

    #[test]
    fn a_conjugate_pair_is_exact() {
        // s² + 2s + 5: −1 ± 2j
        let roots = polynomial(&[5.0, 2.0, 1.0]).roots(None);
        assert!((roots[0] - Complex64::new(-1.0, -2.0)).norm() < 1e-14, "{}", roots[0]);
        assert!((roots[1] - Complex64::new(-1.0, 2.0)).norm() < 1e-14, "{}", roots[1]);
    }

    /// x² + 2x + 1.1 has the roots −1 ± j·√0.1; its neighbour x² + 2x + 0.99 has −0.9 and −1.1.
    #[test]
    fn a_pair_that_became_complex_is_found_from_real_guesses() {
        let guesses = [Complex64::new(-0.9, 0.0), Complex64::new(-1.1, 0.0)];
        let roots = polynomial(&[1.1, 2.0, 1.0]).roots(Some(&guesses));
        assert!((roots[1] - Complex64::new(-1.0, libm::sqrt(0.1))).norm() < 1e-14, "{roots:?}");
        let back = [Complex64::new(-1.0, -0.3), Complex64::new(-1.0, 0.3)];
        let roots = polynomial(&[0.99, 2.0, 1.0]).roots(Some(&back));
        assert!((roots[0].re + 0.9).abs() < 1e-13 && roots[0].im == 0.0, "{roots:?}");
    }

    /// Perturbed cubics: warm starts must find what cold ones find, and never a root on the wrong side.
    #[test]
    fn warm_starts_find_what_cold_starts_find() {
        let mut seed = 1u64;
        let mut unit = || {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            f64::from(u32::try_from(seed >> 33).unwrap_or(0)) / f64::from(1u32 << 31)
        };
        for _ in 0..2000 {
            let near = [1.0, 3.0 * (0.5 + unit()), 3.0 * (0.5 + unit()), 1.0];
            let here = near.map(|c| c * (0.6 + 0.8 * unit()));
            let guesses = polynomial(&near).roots(None);
            let (warm, cold) = (polynomial(&here).roots(Some(&guesses)), polynomial(&here).roots(None));
            for (a, b) in warm.iter().zip(&cold) {
                assert!((a - b).norm() <= 1e-6 * b.norm(), "{here:?}: {warm:?} and {cold:?}");
            }
        }
    }

    #[test]
    fn value_on_the_imaginary_axis() {
        // (1 + 2s + 3s² + 4s³) at s = 2j: 1 − 12 + j(4 − 32)
        let v = polynomial(&[1.0, 2.0, 3.0, 4.0]).at(2.0);
        assert!((v.re + 11.0).abs() < 1e-14 && (v.im + 28.0).abs() < 1e-14);
    }
}
