//! Quantities with something behind them: tolerances, drifts, ranges.
//!
//! A text is cut into terms before each number: `91k 1% 50ppm` is `91k`, `1%`, `50ppm`. Behind a component value `%`
//! is its tolerance and a bare `ppm` its temperature coefficient; `± 0.25 pF` is a tolerance too. In `12 ± 0.5 V` and
//! `-20 to 50 °C` the first number takes the unit of the second, but never its prefix: `300 to 500 kHz` is an error.

use std::ops::Range;

use stageleaf_math::{
    dimension::Dimension,
    stage::{Span, Toleranced},
};

use crate::{
    problem::quoted,
    quantity::{Quantity, Trouble, read, thousands},
    unit::{self, Reading},
};

/// Reads a component value: nominal, then tolerance, temperature coefficient and power rating in any order.
///
/// `91k 1% 50ppm`, `100n +20% -10%`, `3p3 ± 0.25p`, `100 1% 0.25W`. A lone `+20%` is a tolerance upwards only.
///
/// # Errors
/// A [`Trouble`] with the bytes of the term that is meant.
pub fn parse_toleranced(text: &str, d: Dimension) -> Result<Toleranced, Trouble> {
    toleranced(text, d).map(|(value, _)| value)
}

/// The same, and whether a tolerance was stated at all.
pub(crate) fn toleranced(text: &str, d: Dimension) -> Result<(Toleranced, bool), Trouble> {
    let terms = split(text);
    let mut value = read_term(text, &terms[0], d).map(|q| Toleranced::exact(q.value)).map_err(|t| extended(t, d))?;
    let (mut minus, mut plus, mut drift) = (None, None, None);
    for range in &terms[1..] {
        let Term { sign, body, start } = term(text, range);
        let trouble = |message: String| extended(Trouble::new(range.clone(), message, d), d);
        let suffix = body.trim_start_matches(|c: char| c.is_ascii_digit() || ".,".contains(c)).trim();
        let twice = match suffix {
            "%" => {
                let fraction = read(body, Dimension::Fraction).map_err(|t| extended(t.shifted(start), d))?.value;
                set(sign, fraction, &mut minus, &mut plus)
            }
            "W" | "mW" if d == Dimension::Resistance && sign == Sign::None => {
                let rating = read(body, Dimension::Power).map_err(|t| extended(t.shifted(start), d))?.value;
                if rating <= 0.0 {
                    return Err(trouble(format!("{} is a rating, which must be above zero", quoted(body))));
                }
                value.rating.replace(rating).is_some()
            }
            s if s.starts_with("ppm") && matches!(sign, Sign::None | Sign::Both) => {
                let per_kelvin = if s == "ppm" { format!("{body}/K") } else { body.to_owned() };
                let stated =
                    read(&per_kelvin, Dimension::FractionDrift).map_err(|_| trouble(format!("{} is no drift", quoted(body))))?.value;
                drift.replace(stated).is_some()
            }
            _ if sign != Sign::None && !suffix.is_empty() => {
                let absolute = read(body, d).map_err(|t| extended(t.shifted(start), d))?.value;
                set(sign, absolute / value.nominal.abs(), &mut minus, &mut plus)
            }
            "" => {
                let group = body.len() == 3 && text[..range.start].trim_end().ends_with(|c: char| c.is_ascii_digit());
                return Err(if group { extended(thousands(text, d), d) } else { trouble(format!("{} has no unit", quoted(body))) });
            }
            _ => return Err(trouble(format!("{} is neither tolerance, drift nor rating", quoted(&text[range.clone()])))),
        };
        if twice {
            return Err(trouble(format!("{} states something a second time", quoted(&text[range.clone()]))));
        }
    }
    let stated = minus.is_some() || plus.is_some();
    value.minus = minus.unwrap_or(0.0);
    value.plus = plus.unwrap_or(0.0);
    value.drift = drift.unwrap_or(0.0);
    if value.minus >= 1.0 || !value.plus.is_finite() || !value.minus.is_finite() {
        return Err(extended(
            Trouble::new(0..text.len(), format!("{} could become zero: its tolerance is 100 % or more", quoted(text)), d),
            d,
        ));
    }
    Ok((value, stated))
}

/// Reads a quantity that varies: `12 V ± 5 %`, `12 V ± 0.5 V`, `12 V +10 % -5 %`, `3.0 V to 4.2 V, 3.7 V nominal`,
/// `-20 °C to 50 °C`, or one value. The nominal of a range is its middle unless it is stated.
///
/// # Errors
/// A [`Trouble`]: what [`crate::parse`] refuses, ends in the wrong order, a nominal outside.
pub fn parse_span(text: &str, d: Dimension) -> Result<Span, Trouble> {
    let (main, nominal) = match after_comma(text, |tail| tail.contains("nominal")) {
        Some((main, tail)) => {
            let words = &text[tail.clone()];
            let value = words.replacen("nominal", "", 1);
            let nominal = read(value.trim(), d).map_err(|mut t| {
                t.range = tail.clone();
                t
            })?;
            (&text[..main], Some((nominal.value, tail)))
        }
        None => (text, None),
    };
    let mut span = match main.split_once(" to ") {
        Some((low, high)) => {
            let (low, high) = pair(low, 0, high, low.len() + 4, d)?;
            Span { low: low.value, nominal: f64::midpoint(low.value, high.value), high: high.value }
        }
        None => band(main, d)?,
    };
    if span.low > span.high {
        let message = format!("{} runs downwards: its first end is above its second", quoted(main.trim()));
        let attempt = main.split_once(" to ").map(|(a, b)| format!("{} to {}", b.trim(), a.trim()));
        let mut trouble = Trouble::new(0..main.len(), message, d);
        trouble.attempt = attempt;
        return Err(trouble);
    }
    if let Some((nominal, range)) = nominal {
        if !(span.low..=span.high).contains(&nominal) {
            return Err(Trouble::new(range, format!("the nominal of {} lies outside its range", quoted(text)), d));
        }
        span.nominal = nominal;
    }
    Ok(span)
}

/// One value, or one value with deviations: `20.4 ± 3 %`, `12 V +10 % -5 %`.
pub(crate) fn band(text: &str, d: Dimension) -> Result<Span, Trouble> {
    let terms = split(text);
    let whole = || 0..text.len();
    if terms.len() == 1 {
        return read_term(text, &terms[0], d).map(|q| Span::exact(q.value));
    }
    let mut nominal = read_term(text, &terms[0], d);
    if nominal.is_err() {
        // `12 ± 0.5 V`: the unit stands behind the deviation.
        let Term { body, start, .. } = term(text, &terms[1]);
        let borrowed = read(body, difference(d)).ok().and_then(|q| lent(&body[q.suffix], d));
        if let Some(unit) = borrowed.filter(|_| start > 0) {
            nominal =
                read(&format!("{} {unit}", &text[terms[0].clone()]), d).map_err(|_| Trouble::new(whole(), String::new(), d)).or(nominal);
        }
    }
    let nominal = nominal?;
    let (mut minus, mut plus) = (None, None);
    for range in &terms[1..] {
        let Term { sign, body, start } = term(text, range);
        if sign == Sign::None {
            return Err(Trouble::new(whole(), format!("{} holds more than one number", quoted(text)), d));
        }
        let amount = deviation(body, &nominal, d).map_err(|t| t.shifted(start))?;
        if set(sign, amount, &mut minus, &mut plus) {
            return Err(Trouble::new(range.clone(), format!("{} states a deviation a second time", quoted(text)), d));
        }
    }
    let (minus, plus) = (minus.unwrap_or(0.0), plus.unwrap_or(0.0));
    let v = nominal.value;
    let span = if nominal.reading == Reading::Decibel {
        Span { low: v / libm::pow(10.0, minus / 20.0), nominal: v, high: v * libm::pow(10.0, plus / 20.0) }
    } else {
        Span { low: v - minus, nominal: v, high: v + plus }
    };
    if span.low.is_finite() && span.high.is_finite() {
        Ok(span)
    } else {
        Err(Trouble::new(whole(), format!("{} is too large to work with", quoted(text)), d))
    }
}

/// Two quantities of which the first may take the unit, not the prefix, of the second.
pub(crate) fn pair(low: &str, low_at: usize, high: &str, high_at: usize, d: Dimension) -> Result<(Quantity, Quantity), Trouble> {
    let upper = read(high, d).map_err(|t| t.shifted(high_at))?;
    let lower = read(low, d).or_else(|trouble| {
        let unit = lent(&high[upper.suffix.clone()], d);
        unit.and_then(|unit| read(&format!("{} {unit}", low.trim()), d).ok()).ok_or_else(|| trouble.shifted(low_at))
    })?;
    Ok((lower, upper))
}

/// The part of `text` behind the first comma or semicolon with space behind it that is as wanted: where the main part
/// ends, and the bytes of the tail. A decimal comma has no space behind it.
pub(crate) fn after_comma(text: &str, wanted: impl Fn(&str) -> bool) -> Option<(usize, Range<usize>)> {
    text.match_indices([',', ';']).find_map(|(at, _)| {
        let tail = &text[at + 1..];
        let body = tail.trim_start();
        let start = text.len() - body.len();
        (body.len() < tail.len() && wanted(body.trim_end())).then(|| (at, start..start + body.trim_end().len()))
    })
}

/// The dimension of a distance between two values of `d`.
pub(crate) const fn difference(d: Dimension) -> Dimension {
    match d {
        Dimension::Temperature => Dimension::TemperatureDifference,
        d => d,
    }
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Sign {
    None,
    Both,
    Plus,
    Minus,
}

/// A term without its sign, and where its body begins in the text.
struct Term<'a> {
    sign: Sign,
    body: &'a str,
    start: usize,
}

fn term<'a>(text: &'a str, range: &Range<usize>) -> Term<'a> {
    let piece = &text[range.clone()];
    let signs = [("+/-", Sign::Both), ("+-", Sign::Both), ("±", Sign::Both), ("+", Sign::Plus), ("-", Sign::Minus), ("−", Sign::Minus)];
    let (sign, body) = signs.into_iter().find_map(|(s, sign)| piece.strip_prefix(s).map(|b| (sign, b))).unwrap_or((Sign::None, piece));
    let body = body.trim_start();
    Term { sign, body, start: range.end - body.len() }
}

/// The bytes of each term: one begins at each number or sign behind a space, and at each `±`.
fn split(text: &str) -> Vec<Range<usize>> {
    let mut starts = vec![text.len() - text.trim_start().len()];
    let mut before = ' ';
    let mut spaced = false;
    let mut after_sign = true;
    for (i, c) in text.char_indices().skip_while(|(_, c)| c.is_whitespace()) {
        if c.is_whitespace() {
            spaced = true;
            continue;
        }
        let sign = "±+-−".contains(c);
        let begins = (c == '±' && !after_sign)
            || (sign && !after_sign && (spaced || !"eE/".contains(before)))
            || (c.is_ascii_digit() && spaced && !after_sign);
        // `1/K` and `V / 1`: a number behind a stroke belongs to the unit.
        if begins && before != '/' && i > starts[0] {
            starts.push(i);
        }
        after_sign = sign || (after_sign && c == '/');
        before = c;
        spaced = false;
    }
    let end = text.trim_end().len().max(starts[0]);
    let ends: Vec<usize> = starts[1..].iter().copied().chain([end]).collect();
    starts.iter().zip(ends).map(|(&s, e)| s..s + text[s..e].trim_end().len()).collect()
}

fn read_term(text: &str, range: &Range<usize>, d: Dimension) -> Result<Quantity, Trouble> {
    if range.start == 0 && range.end == text.len() {
        return read(text, d);
    }
    read(&text[range.clone()], d).map_err(|t| t.shifted(range.start))
}

/// A deviation from `nominal`, in its unit; in dB where the nominal was written in dB.
fn deviation(body: &str, nominal: &Quantity, d: Dimension) -> Result<f64, Trouble> {
    let trouble = |message: String| Trouble::new(0..body.len(), message, d);
    let amount = if body.trim_end().ends_with('%') {
        if d == Dimension::Fraction {
            return Err(trouble(format!(
                "{} could mean a part of the value or be added to it; write both ends with `between`",
                quoted(body)
            )));
        }
        if nominal.reading == Reading::Decibel || matches!(d, Dimension::Temperature | Dimension::Level) {
            return Err(trouble(format!("{} of {} has no meaning", quoted(body), unit::noun(d))));
        }
        read(body, Dimension::Fraction)?.value * nominal.value.abs()
    } else if nominal.reading == Reading::Decibel {
        20.0 * libm::log10(read(body, Dimension::Level)?.value)
    } else {
        read(body, difference(d))?.value
    };
    if amount < 0.0 { Err(trouble(format!("{} is negative, and a deviation has its sign in front", quoted(body)))) } else { Ok(amount) }
}

/// A unit without prefix that another number may borrow.
fn lent(suffix: &str, d: Dimension) -> Option<&str> {
    let unprefixed = match unit::reading(suffix, d)? {
        Reading::Power(0) => true,
        Reading::Power(-6) => suffix.starts_with("ppm"),
        Reading::Power(-2) => suffix.starts_with('%'),
        Reading::Power(_) => false,
        _ => true,
    };
    (unprefixed && !suffix.is_empty()).then_some(suffix)
}

/// Sets one or both sides; true if a side was set before.
fn set(sign: Sign, amount: f64, minus: &mut Option<f64>, plus: &mut Option<f64>) -> bool {
    match sign {
        Sign::None | Sign::Both => {
            let twice = minus.is_some() || plus.is_some();
            (*minus, *plus) = (Some(amount), Some(amount));
            twice
        }
        Sign::Plus => plus.replace(amount).is_some(),
        Sign::Minus => minus.replace(amount).is_some(),
    }
}

fn extended(mut trouble: Trouble, d: Dimension) -> Trouble {
    if trouble.allowed == unit::allowed(d) || trouble.allowed == unit::allowed(Dimension::Fraction) {
        trouble.allowed = format!("{}; then tolerance and drift, as `1% 50ppm`", unit::allowed(d));
    }
    trouble
}
