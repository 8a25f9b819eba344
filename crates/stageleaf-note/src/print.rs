//! stub
use stageleaf_math::dimension::Dimension;
/// Text of a value with `digits` significant digits.
#[must_use]
pub fn format(value: f64, _: Dimension, _digits: usize) -> String {
    value.to_string()
}
/// As a screen reader should say it.
#[must_use]
pub fn spoken(value: f64, _: Dimension) -> String {
    value.to_string()
}
/// Letter-and-digit code.
#[must_use]
pub fn code(value: f64, _: Dimension) -> String {
    value.to_string()
}
/// Text that reads back as the same bits.
#[must_use]
pub fn full(value: f64, _: Dimension) -> String {
    value.to_string()
}
