//! Scale-and-shift stage: the signal through `R1` and the reference through `R2` at the + input, `Rg` from the other one to ground.

use super::{
    Labels,
    kit::{Canvas, Symbol},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (270, 0);
    s::amplifier_and_output(c, l, (x, y));
    if let Some(label) = l.component("Rg") {
        s::grounded_gain_resistor(c, label, (x, y));
    }
    let mut line = y + s::PITCH;
    if l.has("Rng") {
        let first = y + 48;
        line = first + 66;
        s::noise_gain(c, l, (x, y), first, line);
    }
    s::source_through(c, l, "R1", line, 140, x + s::DROP);
    c.wire(&[(x + s::DROP, line), (x + s::DROP, y + s::PITCH), (x + 34, y + s::PITCH)]);
    c.dot(x, line);

    // The reference stands below the node that it shifts.
    let mut end = line + 60;
    if let Some(label) = l.component("R2") {
        c.upright_left(Symbol::Resistor, x, line, end, line + 32, label);
    }
    if let Some(label) = l.reference_resistance() {
        c.upright_left(Symbol::Resistor, x, end, end + 50, end + 24, label);
        end += 50;
    }
    c.steady(x, end, end + 18, l.reference_voltage().ok_or("Vref"));
}
