//! stub
use crate::{problem::Problem, settings::Settings, shelf::Shelf};
use stageleaf_math::{
    figure::Query,
    stage::{Span, Stage},
};
use std::ops::Range;

/// Where a block's text stands in its file.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Place {
    /// The file.
    pub file: String,
    /// Line in the file of the block text's first line.
    pub first_line: usize,
    /// What stands in the file before each line of the block's text (list indent, `> `); missing lines have nothing.
    pub prefixes: Vec<String>,
}
impl Place {
    /// A block whose lines begin at the file's margin.
    #[must_use]
    pub fn new(file: &str, first_line: usize) -> Self {
        Self { file: file.to_owned(), first_line, prefixes: Vec::new() }
    }
}
/// A value of a block, with its place.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Field {
    /// `components.Rf`, `supply.positive`, `limits.bandwidth`, `part`.
    pub path: String,
    /// The value's text.
    pub text: String,
    /// The bytes of the value's content in the block's text, without quotes.
    pub span: Range<usize>,
    /// The bytes of the whole value in the block's text, with its quotes.
    pub whole: Range<usize>,
    /// Line in the file.
    pub line: usize,
    /// Column in the file of the content.
    pub column: usize,
}
/// A figure measured at the bench.
#[derive(Clone, Debug, PartialEq)]
pub struct Measured {
    /// The figure.
    pub query: Query,
    /// The value with its uncertainty.
    pub value: Span,
    /// Which unit was measured.
    pub unit: Option<String>,
    /// Temperature in K at which it was measured.
    pub temperature: Option<f64>,
}
/// A stage block that could be read.
#[derive(Clone, Debug, PartialEq)]
pub struct Block {
    /// The stage.
    pub stage: Stage,
    /// The block's text.
    pub text: String,
    /// The file.
    pub file: String,
    /// Line in the file of the text's first line.
    pub line: usize,
    /// Every value, in the order of the text.
    pub fields: Vec<Field>,
    /// What `[measured]` states.
    pub measured: Vec<Measured>,
}
impl Block {
    /// The value at `path`.
    #[must_use]
    pub fn field(&self, path: &str) -> Option<&Field> {
        self.fields.iter().find(|f| f.path == path)
    }
    /// The block's text with the value at `path` replaced by `value` (or added), everything else kept.
    #[must_use]
    pub fn rewrite(&self, _path: &str, _value: &str) -> String {
        self.text.clone()
    }
}
/// Reads a block.
#[cfg(feature = "toml")]
pub fn read_block(_text: &str, _place: &Place, _shelf: &Shelf, _settings: &Settings) -> Result<Block, Vec<Problem>> {
    Err(vec![])
}
