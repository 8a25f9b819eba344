//! stub
use crate::{block::Block, problem::Problem, settings::Settings, shelf::Shelf};
use stageleaf_math::{dimension::Dimension, figure::Query};
use std::ops::Range;
/// A figure quoted in prose.
#[derive(Clone, Debug, PartialEq)]
pub struct Quote {
    /// The text shown.
    pub shown: String,
    /// The stage, as [`crate::slug`] writes its name.
    pub slug: String,
    /// The figure.
    pub query: Query,
    /// The bytes of the shown text in the file.
    pub range: Range<usize>,
    /// Line in the file.
    pub line: usize,
    /// Column in the file.
    pub column: usize,
}
/// A note: what could be read, and what is wrong with the rest.
#[derive(Clone, Debug, Default)]
pub struct Note {
    /// The file.
    pub file: String,
    /// Stage blocks that could be read, in order.
    pub blocks: Vec<Block>,
    /// Figures quoted in prose, in order.
    pub quotes: Vec<Quote>,
    /// What is wrong, in order of the file.
    pub problems: Vec<Problem>,
    /// The bytes of each stage block's fence, from the first character of the opening to the last of the closing one.
    pub fences: Vec<Range<usize>>,
}
/// Reads a note.
#[must_use]
pub fn read_note(_bytes: &[u8], file: &str, _shelf: &Shelf, _settings: &Settings) -> Note {
    Note { file: file.to_owned(), ..Note::default() }
}
/// Stage names that occur in more than one of several notes, as problems at every later occurrence.
#[must_use]
pub fn duplicate_names(_notes: &[Note]) -> Vec<Problem> {
    vec![]
}
/// Whether the shown digits equal the value rounded to as many digits.
#[must_use]
pub fn quote_agrees(_shown: &str, _value: f64, _: Dimension) -> bool {
    false
}
/// The current value, with as many digits as shown.
#[must_use]
pub fn quote_for(shown: &str, _value: f64, _: Dimension) -> String {
    shown.to_owned()
}
