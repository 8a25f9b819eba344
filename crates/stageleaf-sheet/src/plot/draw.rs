//! A chart as SVG: axes with units, labels on the curves, marks.

use std::fmt::Write as _;

use maud::{Markup, PreEscaped, html};

use super::{
    AREA_LEFT, AREA_WIDTH,
    axis::{Axis, plain, short},
    charts::{Chart, Curve, Words},
};
use crate::sheet::{capital, whole};

/// Upper edge of the area.
const TOP: f64 = 22.0;
/// Room below the area for tick labels and title.
const BELOW: f64 = 38.0;
/// Room right of the area for curve labels, where there are several curves.
const LABELS: f64 = 124.0;
/// Room that a mark's words take, with their distance from the point.
const WORDS: f64 = 130.0;
/// Curves are drawn on a grid this many times finer, so that their numbers are whole.
const FINE: f64 = 10.0;

/// The chart as a figure: SVG that takes the focus, and an empty readout.
#[must_use]
pub fn svg(c: &Chart) -> Markup {
    let several = c.curves.len() > 1;
    let height = if c.unit == super::axis::Unit::Degree { 108.0 } else { 170.0 };
    let (width, total) = (AREA_LEFT + AREA_WIDTH + if several { LABELS } else { 24.0 }, TOP + height + BELOW);
    let (x_ruler, y_ruler) = (c.x_axis.ruler(), c.y_axis.ruler());
    let px = |v: f64| AREA_LEFT + AREA_WIDTH * x_ruler.place(v);
    let py = |v: f64| TOP + height * (1.0 - y_ruler.place(v));
    let (right, bottom) = (AREA_LEFT + AREA_WIDTH, TOP + height);
    let mut lines = String::new();
    let x_ticks = c.x_axis.ticks();
    let y_ticks = c.y_axis.ticks();
    for x in &x_ticks {
        let _ = write!(lines, "M{} {}V{}", tenth(px(*x)), whole(bottom), whole(TOP));
    }
    for y in &y_ticks {
        let _ = write!(lines, "M{} {}H{}", whole(AREA_LEFT), tenth(py(*y)), whole(right));
    }
    let mut minor = String::new();
    for x in c.x_axis.minor_ticks() {
        let _ = write!(minor, "M{} {}v-4", tenth(px(x)), whole(bottom));
    }
    let xs: Vec<Option<i32>> =
        c.x.iter().map(|x| Some(x_ruler.place(*x)).filter(|p| p.is_finite()).map(|p| grid(p * AREA_WIDTH * FINE))).collect();
    let shape = if several { "plot several" } else { "plot" };
    html! {
        figure class=(shape) data-plot=(c.id) data-points=(c.x.len()) {
            svg viewBox=(format_args!("0 0 {} {}", whole(width), whole(total))) role="img" tabindex="0" aria-label=(summary(c)) {
                path class="grid" d=(PreEscaped(lines)) {}
                path class="minor" d=(PreEscaped(minor)) {}
                @if let Some(level) = c.reference { path class="reference" d=(format_args!("M{} {}H{}", whole(AREA_LEFT), tenth(py(level)), whole(right))) {} }
                svg x=(whole(AREA_LEFT)) y=(whole(TOP)) width=(whole(AREA_WIDTH)) height=(whole(height)) viewBox=(format_args!("0 0 {} {}", whole(AREA_WIDTH * FINE), whole(height * FINE))) {
                    // The first curve is the one that counts, and lies above the others.
                    @for (k, curve) in c.curves.iter().enumerate().rev() {
                        path class=(format_args!("curve c{k}")) d=(PreEscaped(path(&xs, &c.y_axis, curve, height))) {}
                    }
                }
                path class="frame" d=(format_args!("M{} {}V{}H{}", whole(AREA_LEFT), whole(TOP), whole(bottom), whole(right))) {}
                @for x in &x_ticks { text x=(tenth(px(*x))) y=(whole(bottom + 17.0)) text-anchor="middle" { (c.x_axis.step.map_or_else(|| short(*x), |step| plain(*x, decimals(step)))) } }
                @for y in &y_ticks { text x=(whole(AREA_LEFT - 6.0)) y=(tenth((py(*y) + 4.0).min(bottom + 1.0))) text-anchor="end" { (tick(c, *y)) } }
                text class="axis" x=(whole(right)) y=(whole(bottom + 33.0)) text-anchor="end" { (c.over_name()) ", " (c.over.si_unit()) }
                text class="axis" x="4" y="12" { (c.title) }
                @if several { (labels(c, height)) }
                @for m in &c.marks { (mark(c, m, &px, &py)) }
                line class="cursor" x1="0" x2="0" y1=(whole(TOP)) y2=(whole(bottom)) visibility="hidden" {}
            }
            output class="readout" {}
        }
    }
}

/// Decimals that tell multiples of a step of 1, 2 or 5 apart.
fn decimals(step: f64) -> usize {
    (0..9).find(|d| step * libm::pow(10.0, f64::from(*d)) > 0.99).map_or(9, |d| usize::try_from(d).unwrap_or(0))
}

fn tick(c: &Chart, value: f64) -> String {
    match c.unit {
        super::axis::Unit::Si(_) => short(value),
        _ => plain(value, 2),
    }
}

fn mark(c: &Chart, m: &super::Mark, px: &impl Fn(f64) -> f64, py: &impl Fn(f64) -> f64) -> Markup {
    let (x, y) = (px(m.x), py(m.y));
    let inside = |v: f64, axis: &Axis| (-0.001..=1.001).contains(&axis.place(v));
    if !inside(m.x, &c.x_axis) || !inside(m.y, &c.y_axis) {
        return html! {};
    }
    let (before, behind) = (x - AREA_LEFT, AREA_LEFT + AREA_WIDTH - x);
    // Where the words of an edge find no room outside the band, they stand inside, below the curve, those of the lower edge deeper.
    let (left, baseline) = match (m.to, m.words) {
        (Some(to), _) => (behind < AREA_WIDTH * 0.38, f64::midpoint(y, py(to)) + 4.0),
        (None, Words::Rising) if before < WORDS => (false, y + 34.0),
        (None, Words::Rising) => (true, y + 4.0),
        (None, Words::Falling) if behind < WORDS => (true, y + 19.0),
        (None, Words::Falling | Words::Right) => (false, y + 4.0),
        (None, Words::Left) => (true, y + 4.0),
        // Curves fall to the right, so right of the point is free, unless the edge is near.
        (None, words) => {
            let left = behind < AREA_WIDTH * 0.38;
            (left, if left || words == Words::Below { y + 16.0 } else { y - 7.0 })
        }
    };
    html! {
        @if let Some(to) = m.to { path class="span" d=(format_args!("M{} {}V{}", tenth(x), tenth(y), tenth(py(to)))) {} }
        circle class="mark" cx=(tenth(x)) cy=(tenth(y)) r="4" {}
        text class="mark" x=(tenth(if left { x - 9.0 } else { x + 9.0 })) y=(tenth(baseline)) text-anchor=(if left { "end" } else { "start" }) { (m.text) }
    }
}

/// Names of the curves beside their right ends, spread so that none covers another.
fn labels(c: &Chart, height: f64) -> Markup {
    let mut ends: Vec<(f64, usize)> = Vec::new();
    for (k, curve) in c.curves.iter().enumerate() {
        let place = curve.y.iter().rev().find(|v| v.is_finite()).map_or(0.0, |v| c.y_axis.place(*v));
        ends.push((TOP + height * (1.0 - place.clamp(0.0, 1.0)), k));
    }
    ends.sort_by(|a, b| a.0.total_cmp(&b.0));
    let mut at: Vec<f64> = ends.iter().map(|e| e.0).collect();
    for i in 1..at.len() {
        at[i] = at[i].max(at[i - 1] + 17.0);
    }
    let mut bound = TOP + height;
    for y in at.iter_mut().rev() {
        *y = y.min(bound);
        bound = *y - 17.0;
    }
    let right = AREA_LEFT + AREA_WIDTH;
    html! {
        @for ((end, k), y) in ends.iter().zip(&at) {
            path class=(format_args!("leader c{k}")) d=(format_args!("M{} {}L{} {}", whole(right), tenth(*end), whole(right + 10.0), tenth(*y))) {}
            text class=(format_args!("name c{k}")) x=(whole(right + 13.0)) y=(tenth(y + 4.0)) { (c.curves[*k].name) }
        }
    }
}

/// A curve as a path in whole numbers; broken where there is no value, and held near the area where it leaves it.
fn path(x: &[Option<i32>], y_axis: &Axis, curve: &Curve, height: f64) -> String {
    let mut d = String::with_capacity(curve.y.len() * 8);
    let ruler = y_axis.ruler();
    let mut last: Option<(i32, i32)> = None;
    for (x, y) in x.iter().zip(&curve.y) {
        let y = ruler.place(*y);
        let (Some(x), false) = (*x, y.is_nan()) else {
            last = None;
            continue;
        };
        let point = (x, grid((1.0 - y.clamp(-1.0, 2.0)) * height * FINE));
        match last {
            None => {
                d.push('M');
                push(&mut d, point.0);
                d.push(' ');
                push(&mut d, point.1);
            }
            Some(p) => {
                d.push('l');
                push(&mut d, point.0 - p.0);
                if point.1 >= p.1 {
                    d.push(' ');
                }
                push(&mut d, point.1 - p.1);
            }
        }
        last = Some(point);
    }
    d
}

/// Writes a whole number; a curve has hundreds, and the formatting machinery takes most of a sheet's time for them.
fn push(d: &mut String, value: i32) {
    if value < 0 {
        d.push('-');
    }
    let mut rest = value.unsigned_abs();
    let mut power = 1;
    while rest / power >= 10 {
        power *= 10;
    }
    while power > 0 {
        d.push(char::from_digit(rest / power, 10).unwrap_or('0'));
        rest %= power;
        power /= 10;
    }
}

#[expect(clippy::cast_possible_truncation, reason = "clamped to the drawing's grid")]
fn grid(value: f64) -> i32 {
    libm::round(value.clamp(-30_000.0, 30_000.0)) as i32
}

/// One decimal, as SVG wants it.
fn tenth(value: f64) -> String {
    let n = grid(value.clamp(-2000.0, 2000.0) * 10.0);
    let mut text = String::with_capacity(7);
    if n < 0 {
        text.push('-');
    }
    push(&mut text, n.abs() / 10);
    if n % 10 != 0 {
        text.push('.');
        push(&mut text, n.abs() % 10);
    }
    text
}

/// The chart in one sentence, for those who do not see it.
fn summary(c: &Chart) -> String {
    let place = |v: f64| c.place_text(v);
    let (first, last) = (c.x.first().copied().unwrap_or(0.0), c.x.last().copied().unwrap_or(0.0));
    let mut text = format!("{} against {}, {} to {}.", capital(c.title), c.over_name(), place(first), place(last));
    for curve in &c.curves {
        let finite = || curve.y.iter().copied().filter(|v| v.is_finite());
        if let (Some(a), Some(b)) = (finite().next(), finite().next_back()) {
            let _ = write!(text, " {}: {} at the left, {} at the right.", capital(&curve.name), c.unit.text(a, 3), c.unit.text(b, 3));
        }
    }
    for m in &c.marks {
        let at = place(m.x);
        let _ = if m.text.contains(&at) { write!(text, " {}.", capital(&m.text)) } else { write!(text, " {} at {at}.", capital(&m.text)) };
    }
    text.push_str(" The numbers are in the table below.");
    text
}
