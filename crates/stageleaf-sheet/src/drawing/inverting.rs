//! Inverting stage: the signal through `Rin` at the − input, the other one at ground, directly or through `Rp ∥ Cp`.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let extended = l.has("Rser") || l.has("Cshunt") || l.has("Rng");
    let (x, y) = (if extended { 270 } else { 146 }, 0);
    let shunt = 140;
    s::amplifier_and_output(c, l, (x, y));
    s::source_and_input(c, l, y, shunt, if extended { shunt } else { 0 });
    if let Some(label) = l.component("Rin") {
        c.across(Symbol::Resistor, if extended { shunt } else { 20 }, x, x - 58, y, label);
        c.dot(x, y);
    }
    s::balanced_input(c, l, (x, y), 0);
}
