//! Follower: the signal at the + input, the output back to the other one.

use super::{Labels, kit::Canvas, surroundings as s};

/// Draws the stage.
pub fn draw(c: &mut Canvas, l: &Labels) {
    let (x, y) = (146, 0);
    s::amplifier_and_output(c, l, (x, y));
    super::non_inverting::non_inverting_input(c, l, (x, y), 0);
}
