//! Stage blocks: a stage with the place of every value, so that one value can be changed and everything else kept.
//!
//! A value's path is its table and key. Which paths a kind has, and what stands there, is listed in [`crate::paths`].

use std::ops::Range;

use stageleaf_math::{
    figure::Query,
    stage::{Span, Stage},
};

#[cfg(feature = "toml")]
pub use crate::reading::read_block;

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
    /// Table and key: `components.Rf`, `signal.in2.peak`, `limits.gain_at 2 MHz`, `part` (see [`crate::paths`]).
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

    /// The block's text with the value at `path` replaced, everything else kept: comments, order, spacing.
    ///
    /// A key that is not there is added at the end of its table; a table that is not there, among the others in their usual
    /// order: parts, supply, components, source, signal, reference, load, board, ambient, band, limits, measured.
    /// The value is written as a TOML string, whatever it holds.
    #[cfg(feature = "toml")]
    #[must_use]
    pub fn rewrite(&self, path: &str, value: &str) -> String {
        match self.field(path) {
            Some(field) => crate::rewriting::replaced(&self.text, &field.whole, value),
            None => crate::rewriting::added(&self.text, path, value),
        }
    }

    /// The block's text without the value at `path`: its line goes if nothing else stands on it. What is not there, or
    /// shares its line, stays.
    #[must_use]
    pub fn without(&self, path: &str) -> String {
        let Some(field) = self.field(path) else { return self.text.clone() };
        let start = self.text[..field.whole.start].rfind('\n').map_or(0, |i| i + 1);
        let end = self.text[field.whole.end..].find('\n').map_or(self.text.len(), |i| field.whole.end + i + 1);
        let before = self.text[start..field.whole.start].trim();
        let after = self.text[field.whole.end..end].trim();
        let alone = before.ends_with('=')
            && before.matches('=').count() == 1
            && !before.contains('{')
            && (after.is_empty() || after.starts_with('#'));
        if alone { format!("{}{}", &self.text[..start], &self.text[end..]) } else { self.text.clone() }
    }
}
