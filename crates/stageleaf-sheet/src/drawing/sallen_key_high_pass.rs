//! Sallen–Key high-pass: `C1` and `C2` to the + input, `R1` from between them to the output, `R2` to ground.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    sallen_key_low_pass::section,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    section(c, l, [(Symbol::Capacitor, "C1"), (Symbol::Capacitor, "C2")], (Symbol::Resistor, "R1"), (Symbol::Resistor, "R2"));
}
