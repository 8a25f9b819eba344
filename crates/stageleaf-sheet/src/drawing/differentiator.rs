//! Differentiator: the signal through `Cin` at the − input, perhaps with `Rin` before it.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let y = 0;
    let mut from = s::SOURCE_X;
    s::source_and_input(c, l, y, 0, 0);
    if let Some(label) = l.component("Rin") {
        c.across(Symbol::Resistor, from, s::INNER, s::FIRST, y, label);
        from = s::INNER;
    }
    let x = from + if from == s::INNER { 104 } else { 126 };
    if let Some(label) = l.component("Cin") {
        c.across(Symbol::Capacitor, from, x, x - 55, y, label);
    }
    c.dot(x, y);
    s::amplifier_and_output(c, l, (x, y));
    s::balanced_input(c, l, (x, y), 0);
}
