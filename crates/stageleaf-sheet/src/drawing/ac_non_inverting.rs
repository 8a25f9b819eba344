//! AC-coupled non-inverting stage: the signal through `Cin` at the + input, which `Rb` ties to a divider of the supply; `Rg` and
//! `Cg` in series from the other input to ground.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (270, 0);
    s::amplifier_and_output(c, l, (x, y));
    c.dot(x, y);
    let end = x - 216;
    if let Some(label) = l.component("Rg") {
        c.across(Symbol::Resistor, x - 108, x, x - 56, y, label);
    }
    if let Some(label) = l.component("Cg") {
        c.across(Symbol::Capacitor, end, x - 108, x - 164, y, label);
    }
    c.wire(&[(end, y), (end, y + 12)]);
    c.ground(end, y + 12);

    // The input capacitor's label stands between the two lines.
    let line = y + 80;
    let drop = x + s::DROP;
    s::coupled_source(c, l, line, 120);
    c.wire(&[(120, line), (drop, line), (drop, y + s::PITCH), (x + 34, y + s::PITCH)]);
    c.dot(x, line);
    let divider = line + 100;
    if let Some(label) = l.component("Rb") {
        c.upright_left(Symbol::Resistor, x, line, divider, line + 30, label);
    }
    s::supply_divider(c, l, (x, divider));
}
