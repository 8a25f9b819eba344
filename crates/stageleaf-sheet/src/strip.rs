//! A limit as a strip: the nominal tick, the spread's whiskers, the limit with its forbidden side, the thin zone.

use std::fmt::Write as _;

use maud::{Markup, PreEscaped, html};
use stageleaf_math::{
    limit::{Bound, Thin},
    report::{LimitRow, Outcome},
};

use crate::sheet::whole;

/// Width of the strip, in units of its view box.
const WIDTH: f64 = 240.0;
/// Height of the band.
const BAND: (i32, i32) = (6, 28);
/// Height at which whiskers and tick lie.
const MIDDLE: i32 = 17;

/// Places of everything that a strip shows, in units of its view box.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Places {
    /// The limit, or both.
    pub limits: Vec<(f64, f64)>,
    /// Forbidden stretches.
    pub forbidden: Vec<(f64, f64)>,
    /// Stretches where a limit holds thinly.
    pub thin: Vec<(f64, f64)>,
    /// The spread.
    pub whiskers: Option<(f64, f64)>,
    /// The nominal value, if it is finite.
    pub nominal: Option<f64>,
    /// Whether nominal value or spread has no upper bound.
    pub unbounded: bool,
}

/// Finds the places; none where nothing can be placed.
#[must_use]
pub fn places(row: &LimitRow) -> Option<Places> {
    let (least, most) = match row.limit.bound {
        Bound::AtLeast(v) => (Some(v), None),
        Bound::AtMost(v) => (None, Some(v)),
        Bound::Between { low, high } => (Some(low), Some(high)),
        Bound::Report => (None, None),
    };
    // A limit that is no finite number bounds nothing that could be drawn.
    let (least, most) = (least.filter(|v| v.is_finite()), most.filter(|v| v.is_finite()));
    let edge = |limit: f64, inward: f64| {
        let distance = match (row.limit.thin, row.limit.bound) {
            (Thin::Distance(d), _) => d,
            (Thin::Fraction(f), Bound::Between { low, high }) => f * (high - low) / 2.0,
            (Thin::Fraction(f), _) => f * limit.abs(),
        };
        limit + inward * distance.max(0.0)
    };
    let thin_low = least.map(|v| edge(v, 1.0));
    let thin_high = most.map(|v| edge(v, -1.0));
    let nominal = row.nominal.value().filter(|v| !v.is_nan());
    let endless = |v: f64| v.is_infinite() && v > 0.0;
    let mut spread = row.range.filter(|(a, b)| !a.is_nan() && !b.is_nan());
    if let Some(w) = row.worst.value().filter(|v| !v.is_nan()) {
        // The spread encloses the worst case even where the row states none.
        let (a, b) = spread.unwrap_or_else(|| nominal.map_or((w, w), |n| (n, n)));
        spread = Some((a.min(w), b.max(w)));
    }
    let all = [least, most, thin_low, thin_high, nominal, spread.map(|s| s.0), spread.map(|s| s.1)];
    let scale = Scale::around(all.into_iter().flatten(), least.is_some(), most.is_some())?;
    let at = |v: f64| scale.place(v);
    let mut p = Places {
        // A value without bound has no place: its whisker's arrow says so.
        nominal: nominal.filter(|v| v.is_finite()).map(at),
        unbounded: nominal.is_some_and(endless) || spread.is_some_and(|s| endless(s.1)),
        whiskers: spread.map(|(a, b)| (at(a), at(b))),
        ..Places::default()
    };
    if let (Some(v), Some(t)) = (least, thin_low) {
        p.limits.push((at(v), v));
        p.forbidden.push((0.0, at(v)));
        p.thin.push((at(v), at(t)));
    }
    if let (Some(v), Some(t)) = (most, thin_high) {
        p.limits.push((at(v), v));
        p.forbidden.push((at(v), WIDTH));
        p.thin.push((at(t), at(v)));
    }
    Some(p)
}

struct Scale {
    low: f64,
    high: f64,
    logarithmic: bool,
}

impl Scale {
    fn around(values: impl Iterator<Item = f64>, below: bool, above: bool) -> Option<Self> {
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        for v in values.filter(|v| v.is_finite() && v.abs() < 1e300) {
            low = low.min(v);
            high = high.max(v);
        }
        if high < low {
            return None;
        }
        let logarithmic = low > 0.0 && high / low > 20.0;
        if logarithmic {
            (low, high) = (libm::log10(low), libm::log10(high));
        }
        let mut span = high - low;
        if span <= 1e-12 * high.abs() {
            span = if high == 0.0 { 1.0 } else { high.abs() * 0.2 };
        }
        // The forbidden side is always seen, and nothing touches the ends.
        low -= span * if below { 0.22 } else { 0.1 };
        high += span * if above { 0.22 } else { 0.1 };
        Some(Self { low, high, logarithmic })
    }

    fn place(&self, value: f64) -> f64 {
        let v = if !self.logarithmic {
            value
        } else if value > 0.0 {
            libm::log10(value)
        } else {
            f64::NEG_INFINITY
        };
        let place = WIDTH * ((v - self.low) / (self.high - self.low));
        if place.is_nan() { 0.0 } else { place.clamp(0.0, WIDTH) }
    }
}

/// The strip as SVG. It repeats what the words beside it say, so it is hidden from screen readers.
#[must_use]
pub fn strip(row: &LimitRow, text: impl Fn(f64) -> String) -> Markup {
    let Some(p) = places(row) else { return html! {} };
    let (top, bottom) = BAND;
    let mut hatch = String::new();
    for (a, b) in &p.forbidden {
        hatched(&mut hatch, whole(*a), whole(*b));
    }
    html! {
        svg class="strip" viewBox=(format_args!("0 0 {} 44", whole(WIDTH))) aria-hidden="true" {
            rect class="ground" x="0" y=(top) width=(whole(WIDTH)) height=(bottom - top) {}
            @for (a, b) in &p.thin { rect class="thinly" x=(whole(*a)) y=(top) width=((whole(*b) - whole(*a)).max(0)) height=(bottom - top) {} }
            @for (a, b) in &p.thin { path class="edge" d=(format_args!("M{} {top}V{bottom}", whole(if p.limits.iter().any(|l| whole(l.0) == whole(*a)) { *b } else { *a }))) {} }
            @for (a, b) in &p.forbidden { rect class="forbidden" x=(whole(*a)) y=(top) width=((whole(*b) - whole(*a)).max(0)) height=(bottom - top) {} }
            path class="hatch" d=(PreEscaped(hatch)) {}
            @for (x, value) in &p.limits {
                path class="limit" d=(format_args!("M{} {}V{}", whole(*x), top - 4, bottom + 2)) {}
                text x=(whole(*x).clamp(24, whole(WIDTH) - 24)) y=(bottom + 14) text-anchor="middle" { (text(*value)) }
            }
            @if let Some((a, b)) = p.whiskers {
                @let (a, b) = (whole(a), whole(b));
                path class="whisker" d=(format_args!("M{a} {}v10M{a} {MIDDLE}H{b}", MIDDLE - 5)) {}
                @if !p.unbounded { path class="whisker" d=(format_args!("M{b} {}v10", MIDDLE - 5)) {} }
                @if p.unbounded { path class="whisker" d=(format_args!("M{} {}l6 5l-6 5", whole(WIDTH) - 7, MIDDLE - 5)) {} }
            }
            @if let Some(x) = p.nominal { path class="nominal" d=(format_args!("M{} {MIDDLE}l5-6l5 6l-5 6z", whole(x) - 5)) {} }
            @if !matches!(row.nominal, Outcome::Value(_)) { text class="unknown" x=(whole(WIDTH / 2.0)) y=(MIDDLE + 5) text-anchor="middle" { "?" } }
        }
    }
}

/// Slanted lines between two places.
fn hatched(d: &mut String, a: i32, b: i32) {
    let (top, bottom) = BAND;
    let height = bottom - top;
    let mut x = a - height + 3;
    while x < b {
        // A line rises from (x, bottom) to (x + height, top); only its part between a and b is drawn.
        let (x0, x1) = (x.max(a), (x + height).min(b));
        if x1 > x0 {
            let _ = write!(d, "M{x0} {}L{x1} {}", bottom - (x0 - x), bottom - (x1 - x));
        }
        x += 6;
    }
}
