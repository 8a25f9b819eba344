//! A chart as SVG: axes with units, labels on the curves, marks.

use std::fmt::Write as _;

use maud::{Markup, PreEscaped, html};
use stageleaf_math::dimension::Dimension;

use super::{
    AREA_LEFT, AREA_WIDTH,
    axis::{plain, short},
    charts::{Chart, Curve},
};
use crate::sheet::whole;

/// Upper edge of the area.
const TOP: f64 = 22.0;
/// Room below the area for tick labels and title.
const BELOW: f64 = 36.0;
/// Room right of the area for curve labels, where there are several curves.
const LABELS: f64 = 112.0;
/// Curves are drawn on a grid this many times finer, so that their numbers are whole.
const FINE: f64 = 10.0;

/// The chart as a figure: SVG that takes the focus, and an empty readout.
#[must_use]
pub fn svg(c: &Chart) -> Markup {
    let several = c.curves.len() > 1;
    let height = if c.unit == super::axis::Unit::Degree { 108.0 } else { 170.0 };
    let (width, total) = (AREA_LEFT + AREA_WIDTH + if several { LABELS } else { 24.0 }, TOP + height + BELOW);
    let px = |v: f64| AREA_LEFT + AREA_WIDTH * c.x_axis.place(v);
    let py = |v: f64| TOP + height * (1.0 - c.y_axis.place(v));
    let (right, bottom) = (AREA_LEFT + AREA_WIDTH, TOP + height);
    let mut grid = String::new();
    let x_ticks = c.x_axis.ticks();
    let y_ticks = c.y_axis.ticks();
    for x in &x_ticks {
        let _ = write!(grid, "M{} {}V{}", tenth(px(*x)), whole(bottom), whole(TOP));
    }
    for y in &y_ticks {
        let _ = write!(grid, "M{} {}H{}", whole(AREA_LEFT), tenth(py(*y)), whole(right));
    }
    let mut minor = String::new();
    for x in c.x_axis.minor_ticks() {
        let _ = write!(minor, "M{} {}v-4", tenth(px(x)), whole(bottom));
    }
    let shape = if several { "plot several" } else { "plot" };
    html! {
        figure class=(shape) data-plot=(c.id) data-points=(c.x.len()) {
            svg viewBox=(format_args!("0 0 {} {}", whole(width), whole(total))) role="img" tabindex="0" aria-label=(summary(c)) {
                path class="grid" d=(PreEscaped(grid)) {}
                path class="minor" d=(PreEscaped(minor)) {}
                @if let Some(level) = c.reference { path class="reference" d=(format_args!("M{} {}H{}", whole(AREA_LEFT), tenth(py(level)), whole(right))) {} }
                svg x=(whole(AREA_LEFT)) y=(whole(TOP)) width=(whole(AREA_WIDTH)) height=(whole(height)) viewBox=(format_args!("0 0 {} {}", whole(AREA_WIDTH * FINE), whole(height * FINE))) {
                    @for (k, curve) in c.curves.iter().enumerate() {
                        path class=(format_args!("curve c{k}")) d=(PreEscaped(path(c, curve, height))) {}
                    }
                }
                path class="frame" d=(format_args!("M{} {}V{}H{}", whole(AREA_LEFT), whole(TOP), whole(bottom), whole(right))) {}
                @for x in &x_ticks { text x=(tenth(px(*x))) y=(whole(bottom + 15.0)) text-anchor="middle" { (short(*x)) } }
                @for y in &y_ticks { text x=(whole(AREA_LEFT - 6.0)) y=(tenth(py(*y) + 4.0)) text-anchor="end" { (tick(c, *y)) } }
                text class="axis" x=(whole(right)) y=(whole(bottom + 31.0)) text-anchor="end" { "frequency, Hz" }
                text class="axis" x="4" y="12" { (c.title) }
                @if several { (labels(c, height)) }
                @for m in &c.marks { (mark(c, m, &px, &py)) }
                line class="cursor" x1="0" x2="0" y1=(whole(TOP)) y2=(whole(bottom)) visibility="hidden" {}
            }
            output class="readout" {}
        }
    }
}

fn tick(c: &Chart, value: f64) -> String {
    match c.unit {
        super::axis::Unit::Si(_) => short(value),
        _ => plain(value, 2),
    }
}

fn mark(c: &Chart, m: &super::Mark, px: &impl Fn(f64) -> f64, py: &impl Fn(f64) -> f64) -> Markup {
    let (x, y) = (px(m.x), py(m.y));
    let inside = |v: f64, axis: &super::axis::Axis| (-0.001..=1.001).contains(&axis.place(v));
    if !inside(m.x, &c.x_axis) || !inside(m.y, &c.y_axis) {
        return html! {};
    }
    // The words go to the emptier side: curves fall to the right, so right of the point is free, unless the edge is near.
    let left = x > AREA_LEFT + AREA_WIDTH * 0.62;
    html! {
        @if let Some(to) = m.to { path class="span" d=(format_args!("M{} {}V{}", tenth(x), tenth(y), tenth(py(to)))) {} }
        circle class="mark" cx=(tenth(x)) cy=(tenth(y)) r="4" {}
        text class="mark" x=(tenth(if left { x - 9.0 } else { x + 9.0 })) y=(tenth(if left || m.below { y + 16.0 } else { y - 7.0 })) text-anchor=(if left { "end" } else { "start" }) { (m.text) }
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
        at[i] = at[i].max(at[i - 1] + 15.0);
    }
    let mut bound = TOP + height;
    for y in at.iter_mut().rev() {
        *y = y.min(bound);
        bound = *y - 15.0;
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
fn path(c: &Chart, curve: &Curve, height: f64) -> String {
    let mut d = String::with_capacity(curve.y.len() * 8);
    let mut last: Option<(i32, i32)> = None;
    for (x, y) in c.x.iter().zip(&curve.y) {
        let (x, y) = (c.x_axis.place(*x), c.y_axis.place(*y));
        if !x.is_finite() || y.is_nan() {
            last = None;
            continue;
        }
        let point = (grid(x * AREA_WIDTH * FINE), grid((1.0 - y.clamp(-1.0, 2.0)) * height * FINE));
        match last {
            None => {
                let _ = write!(d, "M{} {}", point.0, point.1);
            }
            Some(p) => {
                let (dx, dy) = (point.0 - p.0, point.1 - p.1);
                let _ = write!(d, "l{dx}{}{dy}", if dy < 0 { "" } else { " " });
            }
        }
        last = Some(point);
    }
    d
}

#[expect(clippy::cast_possible_truncation, reason = "clamped to the drawing's grid")]
fn grid(value: f64) -> i32 {
    libm::round(value.clamp(-30_000.0, 30_000.0)) as i32
}

/// One decimal, as SVG wants it.
fn tenth(value: f64) -> String {
    let n = grid(value.clamp(-2000.0, 2000.0) * 10.0);
    let sign = if n < 0 { "-" } else { "" };
    let (units, tenths) = (n.abs() / 10, n.abs() % 10);
    if tenths == 0 { format!("{sign}{units}") } else { format!("{sign}{units}.{tenths}") }
}

/// The chart in one sentence, for those who do not see it.
fn summary(c: &Chart) -> String {
    let hertz = |v: f64| stageleaf_note::format(v, Dimension::Frequency, 3);
    let (first, last) = (c.x.first().copied().unwrap_or(0.0), c.x.last().copied().unwrap_or(0.0));
    let mut text = format!("{} against frequency, {} to {}.", capital(c.title), hertz(first), hertz(last));
    for curve in &c.curves {
        let finite = || curve.y.iter().copied().filter(|v| v.is_finite());
        if let (Some(a), Some(b)) = (finite().next(), finite().next_back()) {
            let _ = write!(text, " {}: {} at the left, {} at the right.", capital(&curve.name), c.unit.text(a, 3), c.unit.text(b, 3));
        }
    }
    for m in &c.marks {
        let at = hertz(m.x);
        let _ = if m.text.contains(&at) { write!(text, " {}.", capital(&m.text)) } else { write!(text, " {} at {at}.", capital(&m.text)) };
    }
    text.push_str(" The numbers are in the table below.");
    text
}

fn capital(text: &str) -> String {
    let mut chars = text.chars();
    chars.next().map_or_else(String::new, |c| c.to_uppercase().chain(chars).collect())
}
