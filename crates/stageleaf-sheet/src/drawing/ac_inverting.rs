//! To be drawn.

use super::{Labels, kit::Canvas};

/// Draws the stage.
pub fn draw(_c: &mut Canvas, _l: &Labels) {}
