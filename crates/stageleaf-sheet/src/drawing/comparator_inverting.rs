//! Inverting comparator: the reference through `R1` at the + input, the signal at the other one, on a line below.

use super::{
    Labels,
    kit::{Canvas, LABEL_HEIGHT, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (270, 0);
    let column = s::comparator(c, l, (x, y));
    let standing = x - 126;
    if let Some(label) = l.component("R1") {
        c.across(Symbol::Resistor, standing, x, x - 58, y, label);
    }
    let below = s::reference(c, l, standing, y);

    let line = below.max(y + 84) + if l.has("Rser") { LABEL_HEIGHT + 14 } else { 20 };
    s::source_and_input(c, l, line, 140, column);
    c.wire(&[(column, line), (column, y + s::PITCH)]);
    if let Some(label) = l.component("R4") {
        c.dot(x, line);
        c.upright_left(Symbol::Resistor, x, line, line + 64, line + 36, label);
        c.ground(x, line + 64);
    }
}
