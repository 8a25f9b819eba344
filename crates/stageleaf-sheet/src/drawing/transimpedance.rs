//! Transimpedance stage: a photodiode or another current at the − input, the other one at ground, directly or through `Rp ∥ Cp`.

use super::{Labels, kit::Canvas, surroundings as s};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let y = 0;
    let room = s::current_source(c, l, y, "Is");
    let x = room.node;
    c.wire(&[(room.column, y), (x, y)]);
    c.dot(x, y);
    s::amplifier_and_output(c, l, (x, y));
    s::balanced_input(c, l, (x, y), room.below);
}
