//! AC-coupled inverting stage: the signal through `Cin` and `Rin` at the − input, the other one on a divider of the supply.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (262, 0);
    s::amplifier_and_output(c, l, (x, y));
    let between = x - 116;
    s::coupled_source(c, l, y, between);
    if let Some(label) = l.component("Rin") {
        c.across(Symbol::Resistor, between, x, x - 58, y, label);
        c.dot(x, y);
    }
    let drop = x + s::NEAR;
    let divider = y + if l.has("Rsn") && l.has("Cb") { 172 } else { 96 };
    c.wire(&[(x + 34, y + s::PITCH), (drop, y + s::PITCH), (drop, divider)]);
    s::supply_divider(c, l, (drop, divider));
}
