//! Limits as text: `at least 300 kHz`, `20.4 ± 3 %`, `± 0.1 %`, `at most 1 dB, thin above 0.5 dB`, `report`.
//!
//! Where a limit does not say when it counts as thin, a fraction of its own scale does. A limit at zero has no scale of
//! its own, nor has one in dB or on a temperature (10 % of 398 K would be 40 K): those must say it.

use std::ops::Range;

use stageleaf_math::{
    dimension::Dimension,
    limit::{Bound, Limit, Thin},
};

use crate::{
    print::trimmed,
    problem::quoted,
    quantity::{Quantity, Trouble, read},
    terms::{after_comma, band, difference, pair},
    unit::Reading,
};

/// Reads the text of a limit on a figure of dimension `d`; `fraction` of the limit's own scale counts as thin where the
/// text does not say.
///
/// # Errors
/// A [`Trouble`]: what cannot be read, a direction that is missing, a thin distance that is missing or on the wrong side.
pub fn parse_limit(text: &str, d: Dimension, fraction: f64) -> Result<(Bound, Thin), Trouble> {
    let (main, thin) = match after_comma(text, |tail| tail.starts_with("thin ")) {
        Some((end, tail)) => (&text[..end], Some(tail)),
        None => (text, None),
    };
    let start = main.len() - main.trim_start().len();
    let body = main.trim();
    let whole = start..start + body.len();
    let keyword = |word: &str| body.strip_prefix(word).filter(|rest| rest.starts_with(char::is_whitespace));
    let thin_text = |tail: &Range<usize>| &text[tail.clone()];

    if body == "report" {
        return match thin {
            None => Ok((Bound::Report, Thin::Fraction(fraction))),
            Some(tail) => Err(grammar(tail.clone(), format!("{}: what is only reported is never thin", quoted(thin_text(&tail))), None)),
        };
    }
    if let Some((word, rest)) = ["at least", "at most"].into_iter().find_map(|w| keyword(w).map(|r| (w, r))) {
        let q = read(rest, d).map_err(|t| t.shifted(whole.end - rest.len()))?;
        let least = word == "at least";
        let thin = match thin {
            Some(tail) => distance(text, tail, &q, least, d)?,
            None if q.value == 0.0 || q.reading == Reading::Decibel || d == Dimension::Temperature => {
                let why = match (q.reading, d) {
                    (Reading::Decibel, _) => "in dB",
                    (_, Dimension::Temperature) => "on a temperature",
                    _ => "at zero",
                };
                let message = format!("{}: a limit {why} has no scale of its own and must say when it is thin", quoted(body));
                let attempt = format!("{body}, thin within … {}", step_unit(&rest[q.suffix], d));
                return Err(grammar(whole, message, Some(attempt.trim_end().to_owned())));
            }
            None => Thin::Fraction(fraction),
        };
        return Ok((if least { Bound::AtLeast(q.value) } else { Bound::AtMost(q.value) }, thin));
    }
    let (low, high) = if let Some(rest) = keyword("between") {
        let offset = whole.end - rest.len();
        let Some((a, b)) = rest.split_once(" and ") else {
            return Err(grammar(whole, format!("{} has no `and`", quoted(body)), None));
        };
        let (low, high) = pair(a, offset, b, offset + a.len() + 5, d)?;
        (low.value, high.value)
    } else if let Some(about_zero) = body.strip_prefix('±').or_else(|| body.strip_prefix("+/-")) {
        let half = read(about_zero, d).map_err(|t| t.shifted(whole.end - about_zero.len()))?;
        match (half.reading, d) {
            // 0 dB is a ratio of 1.
            (Reading::Decibel, _) => (1.0 / half.value, half.value),
            (_, Dimension::Temperature | Dimension::Level) => return Err(no_direction(body, whole, d)),
            _ => (-half.value, half.value),
        }
    } else if body.contains('±') || body.contains("+/-") || body.contains("+-") {
        let span = band(body, d).map_err(|t| t.shifted(start))?;
        (span.low, span.high)
    } else {
        return Err(no_direction(body, whole, d));
    };
    if low >= high {
        return Err(grammar(whole, format!("{} leaves no room between its ends", quoted(body)), None));
    }
    let thin = match thin {
        None => Thin::Fraction(fraction),
        Some(tail) => within(text, tail, low, high, d)?,
    };
    Ok((Bound::Between { low, high }, thin))
}

/// The limit as a note states it, on a figure of dimension `d`.
#[must_use]
pub fn limit_text(limit: &Limit, d: Dimension) -> String {
    let show = |v: f64| trimmed(v, d, 6);
    let apart =
        |v: f64| if d == Dimension::Level { format!("{} V/V", trimmed(v, Dimension::Number, 6)) } else { trimmed(v, difference(d), 6) };
    match (limit.bound, limit.thin) {
        (Bound::Report, _) => "report".into(),
        (Bound::AtLeast(v), Thin::Fraction(_)) => format!("at least {}", show(v)),
        (Bound::AtMost(v), Thin::Fraction(_)) => format!("at most {}", show(v)),
        (Bound::AtLeast(v), Thin::Distance(by)) => format!("at least {}, thin below {}", show(v), show(v + by)),
        (Bound::AtMost(v), Thin::Distance(by)) => format!("at most {}, thin above {}", show(v), show(v - by)),
        (Bound::Between { low, high }, Thin::Fraction(_)) => format!("between {} and {}", show(low), show(high)),
        (Bound::Between { low, high }, Thin::Distance(by)) => {
            format!("between {} and {}, thin within {}", show(low), show(high), apart(by))
        }
    }
}

/// The thin distance of a one-sided limit.
fn distance(text: &str, tail: Range<usize>, limit: &Quantity, least: bool, d: Dimension) -> Result<Thin, Trouble> {
    let words = &text[tail.clone()];
    let rest = words["thin ".len()..].trim_start();
    let side = if least { "below" } else { "above" };
    if let Some(value) = rest.strip_prefix(side) {
        let at = read(value, d).map_err(|t| t.shifted(tail.end - value.len()))?.value;
        let by = if least { at - limit.value } else { limit.value - at };
        return if by > 0.0 {
            Ok(Thin::Distance(by))
        } else {
            let message = format!("{}: the limit breaks before it is thin", quoted(words));
            Err(grammar(tail, message, None))
        };
    }
    if let Some(value) = rest.strip_prefix("within") {
        let (by, decibel) = apart(value, d).map_err(|t| t.shifted(tail.end - value.len()))?;
        // A distance in dB is a factor, and lies on the side where the limit holds.
        let by = match (decibel, least) {
            (true, true) => limit.value * (by - 1.0),
            (true, false) => limit.value * (1.0 - 1.0 / by),
            (false, _) => by,
        };
        return if by > 0.0 {
            Ok(Thin::Distance(by))
        } else {
            Err(grammar(tail, format!("{} is no distance above zero", quoted(words)), None))
        };
    }
    let other = if least { "above" } else { "below" };
    let attempt =
        rest.strip_prefix(other).map(|value| format!("{}, thin {side}{value}", text[..tail.start].trim_end().trim_end_matches([',', ';'])));
    let word = if least { "at least" } else { "at most" };
    Err(grammar(tail, format!("{} does not go with `{word}`", quoted(words)), attempt))
}

/// The thin distance of a two-sided limit.
fn within(text: &str, tail: Range<usize>, low: f64, high: f64, d: Dimension) -> Result<Thin, Trouble> {
    let words = &text[tail.clone()];
    let Some(value) = words["thin ".len()..].trim_start().strip_prefix("within") else {
        return Err(grammar(tail, format!("{} does not go with a limit of two ends", quoted(words)), None));
    };
    let (by, decibel) = apart(value, d).map_err(|t| t.shifted(tail.end - value.len()))?;
    let by = if decibel { (low * (by - 1.0)).min(high * (1.0 - 1.0 / by)) } else { by };
    if by > 0.0 { Ok(Thin::Distance(by)) } else { Err(grammar(tail, format!("{} is no distance above zero", quoted(words)), None)) }
}

/// A distance, and whether it is a factor that was written in dB.
fn apart(value: &str, d: Dimension) -> Result<(f64, bool), Trouble> {
    let q = read(value, difference(d))?;
    Ok((q.value, q.reading == Reading::Decibel))
}

fn step_unit(suffix: &str, d: Dimension) -> &str {
    if d == Dimension::Temperature { "K" } else { suffix }
}

fn no_direction(body: &str, whole: Range<usize>, d: Dimension) -> Trouble {
    for (sign, words) in [(">=", "at least"), ("≥", "at least"), (">", "at least"), ("<=", "at most"), ("≤", "at most"), ("<", "at most")]
    {
        if let Some(value) = body.strip_prefix(sign) {
            return grammar(whole, format!("{} is written with a sign", quoted(body)), Some(format!("{words} {}", value.trim())));
        }
    }
    if let Some((a, b)) = body.split_once(" to ").filter(|(a, b)| pair(a, 0, b, 0, d).is_ok()) {
        return grammar(whole, format!("{} is no limit", quoted(body)), Some(format!("between {} and {}", a.trim(), b.trim())));
    }
    match read(body, d) {
        Ok(_) => grammar(whole, format!("{} does not say which way it limits", quoted(body)), None),
        Err(t) if body.starts_with(|c: char| c.is_ascii_digit() || "-−+".contains(c)) => t.shifted(whole.start),
        Err(_) => grammar(whole, format!("{} is no limit", quoted(body)), None),
    }
}

fn grammar(range: Range<usize>, message: String, attempt: Option<String>) -> Trouble {
    let allowed =
        "`at least X`, `at most X`, `between A and B`, `X ± Y`, `± Y`, `report`; then `, thin below X`, `, thin above X` or `, thin within X`"
            .into();
    Trouble { range, message, allowed, attempt }
}
