//! Names: figures with their arguments, stages in links, fingerprints of texts.
//!
//! In a link a figure stands behind the stage's slug and a dot, its argument behind dashes or encoded spaces:
//! `#hydrophone-line-amplifier.gain_at-20-kHz`, `#….gain_at%2020%20kHz`.

use stageleaf_math::{
    dimension::Dimension,
    figure::{Argument, Figure, Of, Query, Scope},
};

use crate::{
    letters::{is_letter_or_digit, lower},
    print::full,
    problem::{nearest, quoted},
    quantity::{Trouble, parse},
};

const ALLOWED: &str = "a figure id, with its frequency where it takes one (`gain_at 20 kHz`)";
const SETTLING: &str = "an error and a step of the output, as `settling_time to 0.1 % after 1 V`";

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
    let mut text: String = match argument_text(q, full) {
        Some(argument) => format!("{} {argument}", q.figure.id()),
        None => q.figure.id().into(),
    };
    if let Some(of) = q.of {
        text += &of_text(of);
    }
    text
}

/// A figure's argument alone: "20 kHz", "to 0.1 % after 1 V"; `show` makes text of a number.
#[must_use]
pub fn argument_text(q: Query, show: impl Fn(f64, Dimension) -> String) -> Option<String> {
    match (q.at, q.step) {
        (Some(error), Some(step)) => Some(format!("to {} after {}", show(error, Dimension::Fraction), show(step, Dimension::Voltage))),
        (Some(at), None) => Some(show(at, Dimension::Frequency)),
        (None, _) => None,
    }
}

/// What a figure is taken of: " of A2", " from in2".
#[must_use]
pub fn of_text(of: Of) -> String {
    match of {
        Of::Amplifier(number) => format!(" of A{number}"),
        Of::Input(name) => format!(" from {name}"),
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
    let (argument, of) = match narrowed(argument) {
        None => (argument, None),
        Some((rest, word, name)) => {
            let at = argument_range.end - name.len()..argument_range.end;
            match read_of(figure, word, name) {
                Ok(of) => (rest, Some(of)),
                Err((message, allowed)) => return Err(Trouble { range: at, message, allowed, attempt: None }),
            }
        }
    };
    let argument_range = argument_range.start..argument_range.start + argument.len();
    let query = |query: Query| Query { of, ..query };
    match (figure.argument(), argument.is_empty()) {
        (Argument::None, true) => Ok(query(Query::of(figure))),
        (Argument::Settling, _) => settling(argument).map(query).map_err(|t| t.shifted(argument_range.start)),
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
                Ok(query(Query::at(figure, at)))
            } else {
                trouble(argument_range, format!("`{id}` takes a frequency above zero; {} was given", quoted(argument)), None)
            }
        }
    }
}

/// "20 kHz", "of", "A1" from "20 kHz of A1"; nothing where neither `of` nor `from` stands in it.
fn narrowed(argument: &str) -> Option<(&str, &str, &str)> {
    let (before, name) = argument.rsplit_once(char::is_whitespace)?;
    let before = before.trim_end();
    let (rest, word) = before.rsplit_once(char::is_whitespace).unwrap_or(("", before));
    matches!(word, "of" | "from").then_some((rest.trim_end(), word, name))
}

/// The amplifier or the input; else what is wrong, and what is allowed.
fn read_of(figure: Figure, word: &str, name: &str) -> Result<Of, (String, String)> {
    let id = figure.id();
    match (figure.scope(), word) {
        (Scope::Amplifier, "of") => {
            let number = name.strip_prefix('A').and_then(|n| n.parse::<u8>().ok()).filter(|n| (1..=9).contains(n));
            number.map(Of::Amplifier).ok_or_else(|| (format!("no amplifier is called {}", quoted(name)), "`of A1`, `of A2`, …".into()))
        }
        (Scope::Input, "from") => {
            let input = Of::INPUTS.iter().find(|input| **input == name);
            input.map(|input| Of::Input(input)).ok_or_else(|| {
                (
                    format!("no input is called {}", quoted(name)),
                    "`from in2`, …, `from reference`, `from supply`; nothing for the first".into(),
                )
            })
        }
        (Scope::Amplifier, _) => {
            Err((format!("`{id}` is an amplifier's: `from` says nothing"), format!("`{id} of A1`, or `{id}` for the worst")))
        }
        (Scope::Input, _) => {
            Err((format!("`{id}` is no amplifier's: `of` says nothing"), format!("`{id} from in2`, or `{id}` for the first input")))
        }
        (Scope::Stage, _) => Err((format!("`{id}` is the whole stage's: `{word} {name}` says nothing"), format!("`{id}`"))),
    }
}

/// Reads "to 0.1 % after 1 V".
fn settling(argument: &str) -> Result<Query, Trouble> {
    let whole = |message| Trouble { range: 0..argument.len(), message, allowed: SETTLING.into(), attempt: None };
    let parts = argument.strip_prefix("to ").and_then(|rest| rest.split_once(" after "));
    let Some((error, step)) = parts else {
        let given = if argument.is_empty() { String::new() } else { format!("; {} was given", quoted(argument)) };
        return Err(whole(format!("`settling_time` needs an error and a step{given}")));
    };
    let number = |text: &str, at: usize, dimension| parse(text, dimension).map_err(|t| t.shifted(at));
    let (error, step) = (number(error, 3, Dimension::Fraction)?, number(step, argument.len() - step.len(), Dimension::Voltage)?);
    if error > 0.0 && error < 1.0 && step > 0.0 {
        Ok(Query::settling(error, step))
    } else {
        Err(whole(format!("`settling_time` takes an error between 0 and 100 % and a step above zero; {} was given", quoted(argument))))
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
        for text in ["bandwidth", "settling_time to 0.1 % after 1 V", "gain_at 20 kHz", "noise_density_at 1.5 MHz", "phase_at 10 Hz"] {
            let query = parse_query(text).unwrap();
            assert_eq!(query_text(query), text);
            assert_eq!(parse_anchor(&query_anchor(query)), Ok(query));
            assert_eq!(parse_anchor(&text.replace(' ', "%20")), Ok(query));
        }
        assert_eq!(parse_anchor("gain_at-2.5-kHz"), parse_query("gain_at 2500 Hz"));
        assert_eq!(parse_anchor("gain_at-20kHz"), parse_query("gain_at 20 kHz"));
    }

    #[test]
    fn figures_of_an_amplifier_or_from_an_input_round_trip() {
        for text in ["phase_margin of A2", "gain from in2", "gain_at 20 kHz from reference", "clip_margin of A1", "gain_error from in8"] {
            let query = parse_query(text).unwrap_or_else(|trouble| panic!("{text}: {trouble:?}"));
            assert_eq!(query_text(query), text);
            assert_eq!(parse_anchor(&query_anchor(query)), Ok(query));
            assert_eq!(parse_anchor(&text.replace(' ', "%20")), Ok(query));
        }
        assert_eq!(parse_query("phase_margin of A2").map(|q| q.amplifier()), Ok(Some(1)));
    }

    #[test]
    fn what_a_figure_cannot_be_of_is_told() {
        assert_eq!(error("phase_margin of B2"), "16..18 no amplifier is called \"B2\" | `of A1`, `of A2`, … | None");
        assert_eq!(
            error("gain from in9"),
            "10..13 no input is called \"in9\" | `from in2`, …, `from reference`, `from supply`; nothing for the first | None"
        );
        assert_eq!(
            error("gain of A1"),
            "8..10 `gain` is no amplifier's: `of` says nothing | `gain from in2`, or `gain` for the first input | None"
        );
        assert_eq!(
            error("clip_margin from in2"),
            "17..20 `clip_margin` is an amplifier's: `from` says nothing | `clip_margin of A1`, or `clip_margin` for the worst | None"
        );
        assert_eq!(error("output_noise of A1"), "16..18 `output_noise` is the whole stage's: `of A1` says nothing | `output_noise` | None");
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
