//! stub
use crate::problem::Problem;
use stageleaf_math::part::Part;
/// A part with the file that states it.
#[derive(Clone, Debug)]
pub struct ShelfPart {
    /// The part.
    pub part: Part,
    /// The file.
    pub file: String,
    /// Its text.
    pub text: String,
}
/// The parts that stages can choose.
#[derive(Clone, Debug, Default)]
pub struct Shelf {
    /// In no particular order.
    pub parts: Vec<ShelfPart>,
}
impl Shelf {
    /// The part called `id`.
    #[must_use]
    pub fn find(&self, id: &str) -> Option<&ShelfPart> {
        self.parts.iter().find(|p| p.part.id == id)
    }
}
/// Reads a part file; its id is the file's stem.
#[cfg(feature = "toml")]
pub fn read_part(_text: &str, _file: &str) -> Result<Part, Vec<Problem>> {
    Err(vec![])
}
