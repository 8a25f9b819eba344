//! The shelf: amplifiers as part files state them.
//!
//! Tables: `[part]` `[supply]` `[input]` `[gain]` `[slew]` `[output]` `[noise]` `[thermal]`. A figure is a text, which is
//! its typical value, or a table `{ typ, min, max, source }`. Everything but `[part] name` may be left out.

use stageleaf_math::part::Part;

#[cfg(feature = "toml")]
pub use crate::stocking::read_part;

/// A part with the file that states it.
#[derive(Clone, Debug, PartialEq)]
pub struct ShelfPart {
    /// The part.
    pub part: Part,
    /// The file, as it was named to the reader.
    pub file: String,
    /// The file's text.
    pub text: String,
}

/// The parts that stages can choose.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Shelf {
    /// In the order in which they were added.
    pub parts: Vec<ShelfPart>,
}

impl Shelf {
    /// The part called `id`.
    #[must_use]
    pub fn find(&self, id: &str) -> Option<&ShelfPart> {
        self.parts.iter().find(|p| p.part.id == id)
    }
}
