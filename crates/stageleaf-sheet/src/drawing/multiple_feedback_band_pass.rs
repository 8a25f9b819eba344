//! Multiple-feedback band-pass: `R1` and `C2` to the − input, perhaps `R2` from between them to ground, `C1` and `R3` back from the output.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    multiple_feedback_low_pass::section,
    surroundings::{self as s, End},
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    // The noise-gain branch clears the label beside the inner node.
    let (x, y) = (s::INNER + if l.has("Rng") { 120 } else { 115 }, 0);
    section(c, l, (x, y), [(Symbol::Resistor, "R3", End::Sensed), (Symbol::Capacitor, "C1", End::Sensed)], (Symbol::Capacitor, "C2"));
    if let Some(label) = l.component("R2") {
        c.upright_right(Symbol::Resistor, s::INNER, y, y + 58, y + 32, label);
        c.ground(s::INNER, y + 58);
    }
}
