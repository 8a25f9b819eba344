//! A closed form as text: its numbers in place, and how far the network's value lies from it.

use stageleaf_math::{
    dimension::Dimension,
    report::{Outcome, Working},
};

use crate::{format, print::trimmed};

/// What stands between the figure's symbol and its formula.
const RELATIONS: [char; 3] = ['=', '≈', '≥'];

/// The formula with its symbols replaced by their values: "f_c ≈ 10 MHz/20.4".
#[must_use]
pub fn in_place(working: &Working) -> String {
    // What follows a comma explains the symbols.
    let formula = working.formula.split(", ").next().unwrap_or_default();
    // The left side names the figure; only what follows the last relation is computed.
    let (head, body) = match formula.rfind(RELATIONS) {
        Some(at) => {
            let (head, tail) = formula.split_at(at);
            let mark = tail.chars().next().map_or(0, char::len_utf8);
            (head.split(RELATIONS).next().unwrap_or_default().trim(), tail.split_at(mark))
        }
        None => ("", ("", formula)),
    };
    let (mark, body) = body;
    let mut text = if head.is_empty() { String::new() } else { [head, " ", mark, " "].concat() };
    let mut rest = body.trim();
    while let Some(first) = rest.chars().next() {
        let end = if is_symbol(first) { rest.find(|c| !is_symbol(c)) } else { rest.find(is_symbol) };
        let (token, after) = rest.split_at(end.unwrap_or(rest.len()));
        match working.numbers.iter().find(|(symbol, ..)| *symbol == token) {
            Some((_, value, dimension)) => {
                let number = number(*value, *dimension);
                // A power of a number with its unit, or of a negative one, has to say what is raised.
                let raised = after.starts_with('²') || (number.starts_with('−') && text.trim_end().ends_with(['−', '+', '·', '/']));
                text.push_str(&if raised { ["(", &number, ")"].concat() } else { number });
            }
            None => text.push_str(token),
        }
        rest = after;
    }
    text
}

fn number(v: f64, d: Dimension) -> String {
    if v.is_nan() { "–".to_owned() } else { trimmed(v, d, 4) }
}

/// Letters, Greek ones too, digits, underscore.
const fn is_symbol(c: char) -> bool {
    c.is_ascii_alphanumeric() || c == '_' || matches!(c, 'Α'..='ω')
}

/// What [`difference`] says where rounding alone is left.
pub const SAME: &str = "none";

/// How far the network's value lies from the closed form's.
#[must_use]
pub fn difference(working: &Working) -> Option<String> {
    let (d, handbook) = (working.dimension, working.handbook);
    let Outcome::Value(exact) = working.exact else { return None };
    let off = exact - handbook;
    if !off.is_finite() {
        return None;
    }
    match d {
        // What rounding alone leaves is no difference.
        _ if off.abs() <= 1e-9 * handbook.abs() => Some(SAME.into()),
        // A fraction's fraction helps nobody.
        Dimension::Fraction => Some(format(off, d, 2)),
        Dimension::Angle => Some(format(off, d, 2)),
        Dimension::Level if handbook > 0.0 && exact > 0.0 => Some(format(exact / handbook, d, 2)),
        Dimension::Temperature => Some(format(off, Dimension::TemperatureDifference, 2)),
        _ if handbook.abs() > 0.0 => Some(format(off / handbook.abs(), Dimension::Fraction, 2)),
        _ => None,
    }
}
