//! Difference stage: in1 through `R1` at the − input, in2 through `R3` at the + input, `R4` from there to ground.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings::{self as s, End, Path},
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (146, 0);
    s::amplifier_with(c, l, (x, y), feedback(l, (x, y)));
    s::input(c, l, 0, Some("R1"), (x, y));
    c.dot(x, y);
    // R3's label stands between the two lines, and below the noise-gain branch.
    let branch = l.has("Rng");
    let line = y + if branch { 142 } else { 64 };
    let (drop, column) = if branch { (x + s::DROP, x) } else { (x + s::NEAR, x + s::NEAR) };
    if branch {
        s::noise_gain(c, l, (x, y), y + 30, line);
    }
    s::input(c, l, 1, Some("R3"), (x, line));
    c.wire(&[(x, line), (drop, line), (drop, y + s::PITCH), (x + 34, y + s::PITCH)]);
    c.dot(column, line);
    s::to_ground_below(c, l, (column, line), y, ("R4", "C4"));
}

/// `R2` with `C2` inside it, since the capacitor senses the pin.
pub fn feedback(l: &Labels, from: (i32, i32)) -> Vec<Path> {
    let mut paths = Vec::new();
    if let Some(label) = l.component("C2") {
        paths.push(Path { from, to: End::Pin, part: Some((Symbol::Capacitor, label)) });
    }
    if let Some(label) = l.component("R2") {
        paths.push(Path { from, to: End::Sensed, part: Some((Symbol::Resistor, label)) });
    }
    paths
}
