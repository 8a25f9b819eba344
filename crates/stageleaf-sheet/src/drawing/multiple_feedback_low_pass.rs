//! Multiple-feedback low-pass: `R1` and `R3` to the − input, `C1` from between them to ground, `R2` and `C2` back from the output.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings::{self as s, End, Path},
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    // The noise-gain branch clears the label beside the inner node.
    let (x, y) = (s::INNER + if l.has("Rng") { 120 } else { 115 }, 0);
    section(c, l, (x, y), [(Symbol::Capacitor, "C2", End::Pin), (Symbol::Resistor, "R2", End::Sensed)], (Symbol::Resistor, "R3"));
    if let Some(label) = l.component("C1") {
        c.upright_right(Symbol::Capacitor, s::INNER, y, y + 48, y + 30, label);
        c.ground(s::INNER, y + 48);
    }
}

/// A multiple-feedback section: `R1` to an inner node, `second` from there to the − input; of the paths from the output, the
/// first leads to the − input, the other to the inner node.
pub fn section(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), paths: [(Symbol, &str, End); 2], second: (Symbol, &str)) {
    let nodes = [(x, y), (s::INNER, y)];
    let paths =
        paths.into_iter().zip(nodes).map(|((symbol, name, to), from)| Path { from, to, part: l.component(name).map(|n| (symbol, n)) });
    s::amplifier_with(c, l, (x, y), paths.collect());
    // The source's own impedance stands lower than what hangs from the inner node.
    s::voltage_source(c, l, y, y + if l.source_impedance().is_some() { 88 } else { 32 });
    if let Some(label) = l.component("R1") {
        c.across(Symbol::Resistor, s::SOURCE_X, s::INNER, s::FIRST, y, label);
    }
    c.dot(s::INNER, y);
    if let Some(label) = l.component(second.1) {
        c.across(second.0, s::INNER, x, x - 55, y, label);
    }
    c.dot(x, y);
    s::balanced_input(c, l, (x, y), y + 104);
}
