//! Byte offsets of a text as lines and columns, both counted from 1, columns in characters.

use std::ops::Range;

/// How many bytes lie between two remembered character counts: a column costs at most this many bytes of counting,
/// however long its line is.
const STRIDE: usize = 256;

/// Where a text's lines begin. A line ends with LF, CR LF or a lone CR, as Markdown has it.
#[derive(Clone, Debug)]
pub struct Lines<'a> {
    text: &'a str,
    starts: Vec<usize>,
    counts: Vec<usize>,
}

impl<'a> Lines<'a> {
    /// Finds the lines of `text`. A byte-order mark belongs to no column.
    #[must_use]
    pub fn of(text: &'a str) -> Self {
        let bytes = text.as_bytes();
        let mut starts = vec![if text.starts_with('\u{feff}') { 3 } else { 0 }];
        let mut counts = Vec::with_capacity(bytes.len() / STRIDE + 1);
        let mut characters = 0;
        for (i, &b) in bytes.iter().enumerate() {
            if i % STRIDE == 0 {
                counts.push(characters);
            }
            // Bytes 0b10xxxxxx continue a character.
            characters += usize::from(b & 0xc0 != 0x80);
            if b == b'\n' || (b == b'\r' && bytes.get(i + 1) != Some(&b'\n')) {
                starts.push(i + 1);
            }
        }
        if bytes.len().is_multiple_of(STRIDE) {
            counts.push(characters);
        }
        Self { text, starts, counts }
    }

    /// How many lines there are (an empty text has one).
    #[must_use]
    pub fn count(&self) -> usize {
        self.starts.len()
    }

    /// Line and column of a byte offset; past the end is the end.
    #[must_use]
    pub fn position(&self, offset: usize) -> (usize, usize) {
        let offset = offset.min(self.text.len());
        let line = self.starts.partition_point(|&s| s <= offset).max(1);
        let start = self.starts[line - 1].min(offset);
        (line, self.characters_before(offset) - self.characters_before(start) + 1)
    }

    /// The bytes of a line (from 1), without its end.
    #[must_use]
    pub fn range(&self, line: usize) -> Range<usize> {
        let Some(&start) = line.checked_sub(1).and_then(|i| self.starts.get(i)) else {
            return self.text.len()..self.text.len();
        };
        let end = self.starts.get(line).copied().unwrap_or(self.text.len());
        let body = self.text[start.min(end)..end].trim_end_matches(['\n', '\r']);
        start..start + body.len()
    }

    fn characters_before(&self, offset: usize) -> usize {
        let block = (offset / STRIDE).min(self.counts.len() - 1);
        let rest = &self.text.as_bytes()[block * STRIDE..offset];
        self.counts[block] + rest.iter().filter(|&&b| b & 0xc0 != 0x80).count()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_count_characters_and_lines_end_three_ways() {
        let lines = Lines::of("aµb\r\nc\rd\n");
        assert_eq!(lines.count(), 4);
        assert_eq!(lines.position(3), (1, 3));
        assert_eq!(lines.position(6), (2, 1));
        assert_eq!(lines.position(8), (3, 1));
        assert_eq!(lines.position(99), (4, 1));
        assert_eq!(lines.range(1), 0..4);
    }

    #[test]
    fn the_byte_order_mark_has_no_column() {
        assert_eq!(Lines::of("\u{feff}ab").position(4), (1, 2));
        assert_eq!(Lines::of("\u{feff}ab").position(0), (1, 1));
        assert_eq!(Lines::of("").position(0), (1, 1));
    }

    #[test]
    fn far_columns_of_a_long_line_are_right() {
        let text = "µ".repeat(10_000);
        let lines = Lines::of(&text);
        for column in [1, 2, 2048, 2049, 4097, 10_000] {
            assert_eq!(lines.position((column - 1) * 2), (1, column));
        }
    }
}
