//! A shelf, a block, and problems as text.

use stageleaf_note::{Block, Place, Problem, Settings, Shelf, ShelfPart, read_block, read_part};

/// A part with every table.
pub const ALDER: &str = include_str!("alder-10.toml");

/// A block with every table.
pub const BLOCK: &str = include_str!("block.txt");

pub fn shelf() -> Shelf {
    let part = |text: &str, file: &str| {
        let part = read_part(text, file).unwrap_or_else(|p| panic!("{}", written(&p)));
        ShelfPart { part, file: file.into(), text: text.into() }
    };
    Shelf { parts: vec![part(ALDER, "shelf/alder-10.toml"), part("[part]\nname = \"Birch 2\"\n", "shelf/birch-2.toml")] }
}

pub fn read(text: &str) -> Result<Block, Vec<Problem>> {
    read_block(text, &Place::new("notes/a.md", 10), &shelf(), &Settings::default())
}

pub fn written(problems: &[Problem]) -> String {
    problems.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")
}

/// The problems of a block, as they are shown.
pub fn problems(text: &str) -> String {
    written(&read(text).expect_err("the block has a problem"))
}
