//! Names: figures with their arguments, stages in links, fingerprints of texts.
//!
//! In a link a figure stands behind the stage's slug and a dot, its argument behind dashes or encoded spaces:
//! `#hydrophone-line-amplifier.gain_at-20-kHz`, `#….gain_at%2020%20kHz`.

use stageleaf_math::{
    dimension::Dimension,
    figure::{Argument, Figure, Query},
};

use crate::{
    letters::{is_letter_or_digit, lower},
    print::full,
    problem::{nearest, quoted},
    quantity::{Trouble, parse},
};

const ALLOWED: &str = "a figure id, with its frequency where it takes one (`gain_at 20 kHz`)";

/// A stage's name as it stands in links: lower-case letters and digits with single dashes between.
///
/// # Example
/// ```
/// assert_eq!(stageleaf_note::slug("Hydrophone line amplifier"), "hydrophone-line-amplifier");
/// ```
#[must_use]
pub fn slug(name: &str) -> String {
    let mut slug = String::with_capacity(name.len());
    for c in name.chars() {
        if is_letter_or_digit(c) {
            slug.push(lower(c));
        } else if !slug.is_empty() && !slug.ends_with('-') {
            slug.push('-');
        }
    }
    slug.truncate(slug.trim_end_matches('-').len());
    if slug.is_empty() { "stage".into() } else { slug }
}

/// A figure with its argument, as limits name it: "bandwidth", "gain_at 20 kHz".
#[must_use]
pub fn query_text(q: Query) -> String {
    match q.at {
        Some(at) => format!("{} {}", q.figure.id(), full(at, Dimension::Frequency)),
        None => q.figure.id().into(),
    }
}

/// The same as it stands in a link behind the slug and a dot: "gain_at-20-kHz".
#[must_use]
pub fn query_anchor(q: Query) -> String {
    query_text(q).replace(' ', "-")
}

/// Reads a figure with its argument, as limits name it.
///
/// # Errors
/// An unknown id (with the nearest one), a missing or superfluous frequency, a frequency that is not above zero.
pub fn parse_query(text: &str) -> Result<Query, Trouble> {
    let start = text.len() - text.trim_start().len();
    let body = text.trim();
    let (id, argument) = body.split_once(char::is_whitespace).map_or((body, ""), |(id, a)| (id, a.trim()));
    let trouble = |range, message: String, attempt: Option<String>| Err(Trouble { range, message, allowed: ALLOWED.into(), attempt });
    let id_range = start..start + id.len();
    let Some(figure) = Figure::ALL.iter().copied().find(|f| f.id() == id) else {
        let fits = nearest(id, Figure::ALL.iter().map(|f| f.id()));
        let attempt = fits.map(|f| if argument.is_empty() { f.into() } else { format!("{f} {argument}") });
        let message =
            if id.is_empty() { "a figure is missing".into() } else { format!("no figure is called `{}`", quoted(id).trim_matches('"')) };
        return trouble(id_range, message, attempt);
    };
    let argument_range = text.trim_end().len() - argument.len()..text.trim_end().len();
    match (figure.argument(), argument.is_empty()) {
        (Argument::None, true) => Ok(Query::of(figure)),
        (Argument::None, false) => {
            trouble(argument_range, format!("`{id}` takes no frequency; {} was given", quoted(argument)), Some(id.into()))
        }
        (Argument::Frequency, true) => trouble(id_range, format!("`{id}` needs a frequency"), None),
        (Argument::Frequency, false) => {
            let at = parse(argument, Dimension::Frequency).map_err(|mut t| {
                t.message = format!("`{id}` takes a frequency; {}", t.message);
                t.attempt = t.attempt.map(|a| format!("{id} {a}"));
                t.shifted(argument_range.start)
            })?;
            if at > 0.0 {
                Ok(Query::at(figure, at))
            } else {
                trouble(argument_range, format!("`{id}` takes a frequency above zero; {} was given", quoted(argument)), None)
            }
        }
    }
}

/// Reads a figure from a link, behind the slug and the dot: "gain_at-20-kHz", "gain_at%2020%20kHz".
///
/// # Errors
/// As [`parse_query`].
pub fn parse_anchor(text: &str) -> Result<Query, Trouble> {
    let decoded = percent_decoded(text);
    let at = decoded.find(['-', '+', ' ']).unwrap_or(decoded.len());
    let (id, argument) = decoded.split_at(at);
    // Only one sign is possible in a frequency's exponent, and there it stands directly behind the `e`.
    let argument = argument.trim_start_matches(['-', '+', ' ']).replace("e-", "e−").replace(['-', '+'], " ").replace("e−", "e-");
    parse_query(format!("{id} {argument}").trim())
}

/// `%20` and the like as the characters they stand for; what is no such code stays.
#[must_use]
pub fn percent_decoded(text: &str) -> String {
    let bytes = text.as_bytes();
    let mut decoded = Vec::with_capacity(bytes.len());
    let mut i = 0;
    while i < bytes.len() {
        let code = (bytes[i] == b'%').then(|| text.get(i + 1..i + 3)).flatten().filter(|h| h.bytes().all(|b| b.is_ascii_hexdigit()));
        if let Some(byte) = code.and_then(|h| u8::from_str_radix(h, 16).ok()) {
            decoded.push(byte);
            i += 3;
        } else {
            decoded.push(bytes[i]);
            i += 1;
        }
    }
    String::from_utf8_lossy(&decoded).into_owned()
}

/// A short hash of a text as 16 hexadecimal digits, for provenance; it guards against mistakes, not against malice.
///
/// # Source
/// FNV-1a with 64 bits: Fowler, Noll, Vo, Eastlake and Hansen, The FNV Non-Cryptographic Hash Algorithm; from memory.
#[must_use]
pub fn fingerprint(text: &str) -> String {
    let hash = text.bytes().fold(0xcbf2_9ce4_8422_2325_u64, |h, b| (h ^ u64::from(b)).wrapping_mul(0x0100_0000_01b3));
    format!("{hash:016x}")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn error(text: &str) -> String {
        let t = parse_query(text).unwrap_err();
        format!("{:?} {} | {} | {:?}", t.range, t.message, t.allowed, t.attempt)
    }

    #[test]
    fn figures_with_arguments_round_trip() {
        for text in ["bandwidth", "gain_at 20 kHz", "noise_density_at 1.5 MHz", "phase_at 10 Hz"] {
            let query = parse_query(text).unwrap();
            assert_eq!(query_text(query), text);
            assert_eq!(parse_anchor(&query_anchor(query)), Ok(query));
            assert_eq!(parse_anchor(&text.replace(' ', "%20")), Ok(query));
        }
        assert_eq!(parse_anchor("gain_at-2.5-kHz"), parse_query("gain_at 2500 Hz"));
        assert_eq!(parse_anchor("gain_at-20kHz"), parse_query("gain_at 20 kHz"));
    }

    #[test]
    fn wrong_figures_say_what_is_allowed() {
        let allowed = "a figure id, with its frequency where it takes one (`gain_at 20 kHz`)";
        assert_eq!(error("phase_margn"), format!("0..11 no figure is called `phase_margn` | {allowed} | Some(\"phase_margin\")"));
        assert_eq!(error("gain_at"), format!("0..7 `gain_at` needs a frequency | {allowed} | None"));
        assert_eq!(
            error("bandwidth 2 Hz"),
            format!("10..14 `bandwidth` takes no frequency; \"2 Hz\" was given | {allowed} | Some(\"bandwidth\")")
        );
        assert_eq!(error("gain_at 0 Hz"), format!("8..12 `gain_at` takes a frequency above zero; \"0 Hz\" was given | {allowed} | None"));
        assert_eq!(error("gain_at 2 V"), "8..11 `gain_at` takes a frequency; \"2 V\" is a voltage | hertz, as `20 kHz`, `1.5 MHz` | None");
    }

    #[test]
    fn slugs_hold_letters_digits_and_single_dashes() {
        assert_eq!(slug("Hydrophone line amplifier"), "hydrophone-line-amplifier");
        assert_eq!(slug("  <b>\"x\" & 'y'  "), "b-x-y");
        assert_eq!(slug("Tiefe Höhe 2"), "tiefe-höhe-2");
        assert_eq!(slug("—"), "stage");
    }

    #[test]
    fn fingerprints_are_fnv_1a() {
        // Test vectors of the algorithm's authors; from memory.
        assert_eq!(fingerprint(""), "cbf29ce484222325");
        assert_eq!(fingerprint("a"), "af63dc4c8601ec8c");
        assert_eq!(fingerprint("foobar"), "85944171f73967e8");
    }
}
