//! stub
use crate::quantity::Trouble;
use stageleaf_math::figure::Query;
/// The name of a stage as it stands in links.
#[must_use]
pub fn slug(name: &str) -> String {
    name.to_owned()
}
/// "gain_at 20 kHz".
#[must_use]
pub fn query_text(q: Query) -> String {
    q.figure.id().to_owned()
}
/// "gain_at-20-kHz": the query as it stands in a link after the stage's slug and a dot.
#[must_use]
pub fn query_anchor(q: Query) -> String {
    q.figure.id().to_owned()
}
/// Reads "gain_at 20 kHz".
pub fn parse_query(text: &str) -> Result<Query, Trouble> {
    Err(Trouble { range: 0..text.len(), message: String::new(), allowed: String::new(), attempt: None })
}
/// A short hash of a text (16 hexadecimal digits), for provenance; not for security.
#[must_use]
pub fn fingerprint(text: &str) -> String {
    text.len().to_string()
}
