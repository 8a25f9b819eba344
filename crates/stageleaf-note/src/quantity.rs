//! stub
use stageleaf_math::dimension::Dimension;
use std::ops::Range;
/// What is wrong with a quantity's text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Trouble {
    /// The bytes of the text that are meant.
    pub range: Range<usize>,
    /// What was given and what is wrong with it.
    pub message: String,
    /// What is allowed.
    pub allowed: String,
    /// What to try, where that follows from what was given.
    pub attempt: Option<String>,
}
/// Reads a quantity.
pub fn parse(text: &str, _: Dimension) -> Result<f64, Trouble> {
    Err(Trouble { range: 0..text.len(), message: String::new(), allowed: String::new(), attempt: None })
}
