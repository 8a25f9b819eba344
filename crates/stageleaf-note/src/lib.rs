//! Text of design notes: quantities and units, stage blocks, part files, settings, and the prose that quotes figures.
//!
//! Text goes in once, as SI numbers with the place of every value; numbers come out as the trade writes them:
//! `"4k7"` ⇄ 4700 Ω. What is wrong with a text is collected as [`Problem`]s with file, line, column, what was given,
//! what is allowed and what to try; one bad block hides nothing.
//!
//! # What is left out
//! `[converter]` is reported as unknown. Tolerance letters of IEC 60062 (`4k7J`) are not read: write `1 %`.
//!
//! # Example
//! ```
//! use stageleaf_math::dimension::Dimension;
//! use stageleaf_note::{code, format, parse};
//!
//! assert_eq!(parse("4k7", Dimension::Resistance).unwrap(), 4700.0);
//! assert_eq!(parse("4,7 kΩ", Dimension::Resistance).unwrap(), 4700.0);
//! assert_eq!(code(4700.0, Dimension::Resistance), "4k7");
//! assert_eq!(format(-13.2, Dimension::Voltage, 3), "−13.2 V");
//! ```

pub mod block;
pub mod decimal;
#[cfg(feature = "toml")]
mod driving;
pub mod letters;
pub mod limit;
#[cfg(feature = "markdown")]
pub mod markdown;
pub mod paths;
pub mod place;
pub mod print;
pub mod problem;
pub mod quantity;
pub mod query;
mod quoting;
#[cfg(feature = "toml")]
mod reading;
#[cfg(feature = "toml")]
mod rewriting;
pub mod settings;
pub mod shelf;
#[cfg(feature = "toml")]
mod stocking;
#[cfg(feature = "toml")]
mod surroundings;
#[cfg(feature = "toml")]
mod table;
pub mod template;
pub mod terms;
pub mod unit;
pub mod words;
pub mod worked;

#[cfg(feature = "toml")]
pub use block::read_block;
pub use block::{Block, Field, Measured, Place};
pub use limit::{limit_text, parse_limit};
#[cfg(feature = "markdown")]
pub use markdown::{Note, Quote, duplicate_names, read_note};
pub use print::{code, format, full, spoken};
pub use problem::Problem;
pub use quantity::{Trouble, parse};
pub use query::{argument_text, fingerprint, of_text, parse_query, query_anchor, query_text, slug};
pub use quoting::{quote_agrees, quote_for};
pub use settings::Settings;
#[cfg(feature = "toml")]
pub use settings::read_settings;
#[cfg(feature = "toml")]
pub use shelf::read_part;
pub use shelf::{Shelf, ShelfPart};
pub use template::template;
pub use terms::{parse_span, parse_toleranced};
