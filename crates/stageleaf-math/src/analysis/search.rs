//! Roots and peaks of functions on a grid that is fine enough to bracket them.

/// A root of `f` between `a` and `b` in ln of the argument, given that the signs differ.
///
/// # Formula
/// Ridders' method, which keeps the bracket; ends when the bracket is a few ulps wide.
///
/// # Source
/// C. Ridders, "A new algorithm for computing a single root of a real continuous function", IEEE Trans. Circuits and Systems 26
/// (1979), from memory.
pub fn root(mut a: f64, mut b: f64, mut f: impl FnMut(f64) -> f64) -> f64 {
    let (mut fa, mut fb) = (f(a), f(b));
    if fa.abs() <= 0.0 {
        return a;
    }
    if fb.abs() <= 0.0 {
        return b;
    }
    for _ in 0..60 {
        let m = libm::sqrt(a * b);
        if (b - a).abs() <= 4e-16 * b.abs() || m <= a || m >= b {
            break;
        }
        let fm = f(m);
        let discriminant = libm::sqrt(fm * fm - fa * fb);
        if discriminant.is_nan() || discriminant <= 0.0 {
            return m;
        }
        // In ln of the argument: x = m · (b/m)^(±fm/discriminant)
        let shift = fm / discriminant * if fa > fb { 1.0 } else { -1.0 };
        let x = m * libm::exp(libm::log(b / m) * shift);
        let (x, fx) = if x > a && x < b { (x, f(x)) } else { (m, fm) };
        if fx.abs() <= 0.0 {
            return x;
        }
        let before = b - a;
        if (fm < 0.0) != (fx < 0.0) {
            let (low, flow, high, fhigh) = if m < x { (m, fm, x, fx) } else { (x, fx, m, fm) };
            (a, fa, b, fb) = (low, flow, high, fhigh);
        } else if (fa < 0.0) == (fx < 0.0) {
            let (x, fx) = if m > x { (m, fm) } else { (x, fx) };
            (a, fa) = (x, fx);
        } else {
            let (x, fx) = if m < x { (m, fm) } else { (x, fx) };
            (b, fb) = (x, fx);
        }
        if b - a >= before {
            break;
        }
    }
    if fa.abs() < fb.abs() { a } else { b }
}

/// The largest value of `f` between `a` and `c` around the grid point where it was largest; argument and value.
///
/// # Formula
/// Golden-section search in ln of the argument; a maximum is flat, so half the digits of the argument give all of the value's.
///
/// # Source
/// J. Kiefer, "Sequential minimax search for a maximum", Proc. AMS 4 (1953), from memory.
pub fn peak(a: f64, c: f64, mut f: impl FnMut(f64) -> f64) -> (f64, f64) {
    const RATIO: f64 = 0.618_033_988_749_894_9;
    let (mut low, mut high) = (libm::log(a), libm::log(c));
    let mut x1 = high - RATIO * (high - low);
    let mut x2 = low + RATIO * (high - low);
    let (mut f1, mut f2) = (f(libm::exp(x1)), f(libm::exp(x2)));
    for _ in 0..26 {
        if f1 > f2 {
            high = x2;
            (x2, f2) = (x1, f1);
            x1 = high - RATIO * (high - low);
            f1 = f(libm::exp(x1));
        } else {
            low = x1;
            (x1, f1) = (x2, f2);
            x2 = low + RATIO * (high - low);
            f2 = f(libm::exp(x2));
        }
    }
    if f1 > f2 { (libm::exp(x1), f1) } else { (libm::exp(x2), f2) }
}

/// The largest value of `f` over a grid on which `values` were found: every local peak that comes near the highest is refined, since
/// the grid may catch one of two better than the other.
pub fn highest(grid: &[f64], values: &[f64], mut f: impl FnMut(f64) -> f64) -> f64 {
    /// How near, as a ratio: eight points to a decade and a pole's own places catch any peak better than this.
    const NEAR: f64 = 0.8;
    let top = values.iter().copied().fold(0.0, f64::max);
    let last = values.len().saturating_sub(1);
    let mut best = top;
    for (i, &v) in values.iter().enumerate() {
        let (before, after) = (i.saturating_sub(1), (i + 1).min(last));
        if v >= NEAR * top && v >= values[before] && v >= values[after] && (v > values[before] || v > values[after]) {
            best = best.max(peak(grid[before], grid[after], &mut f).1);
        }
    }
    best
}
