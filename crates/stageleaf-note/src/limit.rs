//! stub
use crate::quantity::Trouble;
use stageleaf_math::{
    dimension::Dimension,
    limit::{Bound, Limit, Thin},
};
/// Reads the text of a limit on a figure of dimension `d`; `fraction` is the thin fraction where the text states none.
pub fn parse_limit(text: &str, _: Dimension, _fraction: f64) -> Result<(Bound, Thin), Trouble> {
    Err(Trouble { range: 0..text.len(), message: String::new(), allowed: String::new(), attempt: None })
}
/// The limit as a note states it.
#[must_use]
pub fn limit_text(_: &Limit) -> String {
    String::new()
}
