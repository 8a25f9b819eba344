//! Non-inverting comparator: the signal through `R1` at the + input, the reference at the other one.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let extended = l.has("Rser") || l.has("Cshunt") || l.has("R3");
    let (x, y) = (if extended { 270 } else { 146 }, 0);
    let shunt = 140;
    let column = s::comparator(c, l, (x, y));
    s::source_and_input(c, l, y, shunt, if extended { shunt } else { 0 });
    if let Some(label) = l.component("R1") {
        c.across(Symbol::Resistor, if extended { shunt } else { s::SOURCE_X }, x, x - 58, y, label);
    }
    // Below the source and what hangs from the + input.
    let top = y + 112;
    c.wire(&[(column, y + s::PITCH), (column, top)]);
    s::reference(c, l, column, top);
}
