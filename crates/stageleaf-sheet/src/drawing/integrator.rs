//! Integrator: the signal through `Rin` at the − input, `Cf` from there to the output.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (146, 0);
    s::source_and_input(c, l, y, 0, 0);
    if let Some(label) = l.component("Rin") {
        c.across(Symbol::Resistor, s::SOURCE_X, x, x - 58, y, label);
    }
    c.dot(x, y);
    s::amplifier_and_output(c, l, (x, y));
    s::balanced_input(c, l, (x, y), 0);
}
