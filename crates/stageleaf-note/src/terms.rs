//! stub
use crate::quantity::{Trouble, parse};
use stageleaf_math::{
    dimension::Dimension,
    stage::{Span, Toleranced},
};
/// Reads a value with tolerance.
pub fn parse_toleranced(text: &str, d: Dimension) -> Result<Toleranced, Trouble> {
    parse(text, d).map(Toleranced::exact)
}
/// Reads a span.
pub fn parse_span(text: &str, d: Dimension) -> Result<Span, Trouble> {
    parse(text, d).map(Span::exact)
}
