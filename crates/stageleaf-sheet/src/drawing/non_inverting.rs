//! Non-inverting stage: the signal at the + input, `Rg` from the other one to ground.

use super::{
    Labels,
    kit::{Canvas, LABEL_HEIGHT},
    surroundings as s,
};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (146, 0);
    s::amplifier_and_output(c, l, (x, y));
    let mut depth = 0;
    if let Some(label) = l.component("Rg") {
        s::grounded_gain_resistor(c, label, (x, y));
        depth = 24;
    }
    non_inverting_input(c, l, (x, y), depth);
}

/// The + input's line with the source: as deep as the noise-gain branch and what hangs `depth` below the inverting line ask.
pub fn non_inverting_input(c: &mut Canvas, l: &Labels, (x, y): (i32, i32), depth: i32) {
    let mut line = y + s::PITCH;
    let first = y + depth.max(4) + 24;
    let branch = l.has("Rng");
    if branch {
        line = first + 42 + 24;
    }
    if l.has("Rser") && (depth > 0 || branch) {
        line = line.max(y + depth + LABEL_HEIGHT + 16);
        if branch {
            line = line.max(first + 42 + LABEL_HEIGHT / 2 + LABEL_HEIGHT + 14);
        }
    }
    if branch {
        s::noise_gain(c, l, (x, y), first, line);
        c.dot(x, line);
    }
    s::source_and_input(c, l, line, x, x + s::DROP);
    c.wire(&[(x + s::DROP, line), (x + s::DROP, y + s::PITCH), (x + 34, y + s::PITCH)]);
}
