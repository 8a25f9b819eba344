//! Summing stage: every signal through a resistor of its own into the inverting node, one row per input.

use super::{Labels, kit::Canvas, surroundings as s};

/// From one input's row to the next.
const ROW: i32 = 62;

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (146, 0);
    let present = l.stage().kind.components().iter().map(|k| k.name).filter(|name| name.starts_with("Rin") && l.has(name));
    let names: Vec<&str> = present.collect();
    // The last row is level with the pin, the others above it; their column stands beside the feedback's.
    let column = x - 20;
    let mut row = y;
    for _ in 1..names.len() {
        c.dot(column, row);
        c.wire(&[(column, row), (column, row - ROW)]);
        row -= ROW;
    }
    for (input, name) in names.iter().enumerate() {
        s::input(c, l, input, Some(name), (column, row));
        row += ROW;
    }
    c.wire(&[(column, y), (x, y)]);
    c.dot(x, y);
    s::amplifier_and_output(c, l, (x, y));
    s::balance(c, l, (x, y), y);
}
