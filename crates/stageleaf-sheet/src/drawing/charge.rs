//! Charge stage: a charge at the − input, directly or through `Rser`, the other one at ground, directly or through `Rp ∥ Cp`.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let y = 0;
    let room = s::current_source(c, l, y, "Qs");
    let x = room.node;
    match l.component("Rser") {
        Some(label) => c.across(Symbol::Resistor, room.column, x, x - 58, y, label),
        None => c.wire(&[(room.column, y), (x, y)]),
    }
    c.dot(x, y);
    s::amplifier_and_output(c, l, (x, y));
    s::balanced_input(c, l, (x, y), room.below);
}
