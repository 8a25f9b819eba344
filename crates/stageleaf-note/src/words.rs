//! stub
use stageleaf_math::{
    dimension::Dimension,
    report::{Caution, DcCause, Need, NoiseOrigin, Outcome, Parameter},
};
/// "`Rf`", "supply, positive".
#[must_use]
pub fn parameter_text(_: Parameter) -> String {
    String::new()
}
/// What must be stated, and where.
#[must_use]
pub fn need_text(_: Need, _part_file: &str) -> String {
    String::new()
}
/// The caution in a sentence.
#[must_use]
pub fn caution_text(_: &Caution) -> String {
    String::new()
}
/// The cause of a DC error.
#[must_use]
pub fn cause_text(_: DcCause) -> String {
    String::new()
}
/// The source of noise.
#[must_use]
pub fn origin_text(_: NoiseOrigin) -> String {
    String::new()
}
/// A value, or why there is none, in a few words.
#[must_use]
pub fn outcome_text(_: &Outcome, _: Dimension, _digits: usize) -> String {
    String::new()
}
