//! Instrumentation stage: the input amplifiers with `Rg` between them, one the other's mirror image; the difference stage behind.

use super::{
    Labels, difference,
    kit::{Canvas, Symbol, Upper},
    surroundings as s,
};

/// From an input amplifier's middle to the line of its feedback resistor, beyond the rail's text and the resistor's label.
const UNDER: i32 = 108;
/// From A1's middle to A2's.
const APART: i32 = 236;
/// From the column of `Rg` to the input amplifiers' pins, their output nodes, and the inverting node of A3.
const PINS: i32 = 34;
const OUTPUT: i32 = 132;
const BEHIND: i32 = 248;

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let x = 146;
    let (positive, negative) = l.rails();
    let rails = (positive.as_str(), negative.as_deref());
    let half = s::PITCH / 2;
    let output = x + OUTPUT;

    // A1, its + input above; A2, its + input below.
    let (tip, first) = c.amplifier_named((x + PINS, -half), Upper::NonInverting, Some("A1"), rails);
    let (_, second) = c.amplifier_named((x + PINS, APART - half), Upper::Inverting, Some("A2"), rails);
    // Left of all that hangs at the pins.
    let end = if l.has_source_impedance() { x } else { x - 100 };
    for (input, line) in [first - half, second + half].into_iter().enumerate() {
        s::input(c, l, input, None, (end, line));
        c.wire(&[(end, line), (x + PINS, line)]);
    }
    let (upper, lower) = (first + UNDER, second - 70);
    for (middle, inverting, line, name) in [(first, first + half, upper, "Rf1"), (second, second - half, lower, "Rf2")] {
        c.wire(&[(x + PINS, inverting), (x, inverting), (x, line)]);
        c.dot(x, line);
        if let Some(label) = l.component(name) {
            c.across(Symbol::Resistor, x, output, x + OUTPUT / 2, line, label);
        }
        c.wire(&[(output, line), (output, middle)]);
        c.wire(&[(tip, middle), (output, middle)]);
        c.dot(output, middle);
    }
    if let Some(label) = l.component("Rg") {
        c.upright_left(Symbol::Resistor, x, upper, lower, i32::midpoint(upper, lower), label);
    }

    // A3 in the middle of both.
    let (node, pin) = (x + BEHIND, i32::midpoint(first, second) - half);
    s::amplifier_with(c, l, (node, pin), difference::feedback(l, (node, pin)));
    for (middle, name) in [(first, "R1"), (second, "R3")] {
        if let Some(label) = l.component(name) {
            c.across(Symbol::Resistor, output, node, node - 58, middle, label);
        }
    }
    // R1 meets the column of the feedback, which rises from the pin to where its paths end.
    let level = pin - 66;
    c.wire(&[(node, first), (node, pin)]);
    c.dot(node, if l.has("C2") { first } else { level });
    let drop = node + s::NEAR;
    c.wire(&[(node, second), (drop, second), (drop, pin + s::PITCH), (node + PINS, pin + s::PITCH)]);
    c.dot(drop, second);
    s::to_ground_below(c, l, (drop, second), pin, ("R4", "C4"));
}
