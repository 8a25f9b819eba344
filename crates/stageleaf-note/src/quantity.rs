//! One quantity from text: number, prefix, unit.
//!
//! Decimal point and decimal comma are both read. What could be read in two ways is an error: `1,000` (one or a
//! thousand?), `1 000`, `20 mhz`, a bare `100` for a capacitor. Digits and prefix are turned into binary in one step,
//! so `4k7`, `4.7k` and `4700` are the same bits.
//!
//! # Source
//! Letter-and-digit codes (`4k7`, `R47`): IEC 60062:2016; from memory. The number formats: common practice, no source.

use std::{f64::consts::PI, ops::Range};

use stageleaf_math::dimension::Dimension;

use crate::{
    decimal,
    problem::quoted,
    unit::{self, Reading},
};

/// What is wrong with a quantity's text. The message continues "`Rf` takes a resistance; …".
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Trouble {
    /// The bytes of the text that are meant.
    pub range: Range<usize>,
    /// What was given and what is wrong with it.
    pub message: String,
    /// What is allowed.
    pub allowed: String,
    /// What to try, where that follows from what was given.
    pub attempt: Option<String>,
}

impl Trouble {
    /// The same about a longer text, in which this one begins at `offset`.
    #[must_use]
    pub fn shifted(mut self, offset: usize) -> Self {
        self.range = self.range.start + offset..self.range.end + offset;
        self
    }

    pub(crate) fn new(range: Range<usize>, message: String, d: Dimension) -> Self {
        Self { range, message, allowed: unit::allowed(d).into(), attempt: None }
    }

    pub(crate) fn attempt(mut self, attempt: String) -> Self {
        self.attempt = Some(attempt);
        self
    }
}

/// A quantity with the way in which it was written.
#[derive(Clone, Debug, PartialEq)]
pub struct Quantity {
    /// The value in SI units.
    pub value: f64,
    /// Power of ten of the last digit written, in the unit as written.
    pub last_place: i32,
    /// How many significant digits were written.
    pub digits: usize,
    /// A decimal comma was written.
    pub comma: bool,
    /// The bytes of the number, sign included.
    pub number: Range<usize>,
    /// The bytes of prefix and unit; empty where there are none, or where the prefix stands inside the number.
    pub suffix: Range<usize>,
    /// How the number became SI.
    pub reading: Reading,
}

/// Reads a quantity of dimension `d` in SI units (rad, K, fractions, V/V).
///
/// # Units
/// A unit may be left out for a resistance (`91k`), a pure number, a gain and a number of bits; a capacitance needs at
/// least its prefix (`100n`). Elsewhere only zero goes without one.
///
/// # Errors
/// A [`Trouble`] that says what was given, what is allowed and, where it follows, what to try.
///
/// # Example
/// ```
/// use stageleaf_math::dimension::Dimension;
/// assert_eq!(stageleaf_note::parse("−12 V", Dimension::Voltage).unwrap(), -12.0);
/// assert_eq!(stageleaf_note::parse("40 dB", Dimension::Level).unwrap(), 100.0);
/// ```
pub fn parse(text: &str, d: Dimension) -> Result<f64, Trouble> {
    read(text, d).map(|q| q.value)
}

/// Reads a quantity and keeps how it was written.
///
/// # Errors
/// As [`parse`].
pub fn read(text: &str, d: Dimension) -> Result<Quantity, Trouble> {
    let start = text.len() - text.trim_start().len();
    let body = text.trim();
    if body.is_empty() {
        return Err(Trouble::new(0..text.len(), "nothing was given".into(), d));
    }
    quantity(body, d).map_err(|t| t.shifted(start)).map(|mut q| {
        q.number = q.number.start + start..q.number.end + start;
        q.suffix = q.suffix.start + start..q.suffix.end + start;
        q
    })
}

/// The digits at the front of a text.
struct Number {
    negative: bool,
    /// Digits with a point at most.
    mantissa: String,
    /// Power of ten, from an exponent or a letter inside the number.
    power: i64,
    /// The letter inside the number.
    letter: Option<char>,
    comma: bool,
    end: usize,
}

fn quantity(text: &str, d: Dimension) -> Result<Quantity, Trouble> {
    let number = number(text, d)?;
    let rest = &text[number.end..];
    let suffix = rest.trim_start();
    let suffix_range = text.len() - suffix.len()..text.len();
    if suffix.contains(|c: char| c.is_ascii_digit()) && !suffix.contains("^0.5") && suffix != "1/K" {
        return Err(more_than_one(text, rest, d));
    }
    let zero = number.mantissa.bytes().all(|b| b == b'0' || b == b'.');
    let reading = match number.letter {
        // `4k7Ω`: the unit may follow, without another prefix.
        Some(_) => unit::reading(suffix, d).filter(|r| *r == Reading::Power(0)).or(suffix.is_empty().then_some(Reading::Power(0))),
        None => unit::reading(suffix, d),
    };
    let reading = match reading {
        Some(reading) => reading,
        None if suffix.is_empty() && zero && !matches!(d, Dimension::Temperature | Dimension::Level) => Reading::Power(0),
        None => return Err(wrong_unit(text, &number, suffix, d)),
    };
    let power = number.power + if let Reading::Power(p) = reading { i64::from(p) } else { 0 };
    let size = decimal::number(&number.mantissa, power);
    let raw = if number.negative { -size } else { size };
    let value = match reading {
        Reading::Power(_) => raw,
        Reading::Decibel => libm::pow(10.0, raw / 20.0),
        Reading::Degree => raw * (PI / 180.0),
        Reading::Celsius => raw + 273.15,
    };
    let whole = 0..text.len();
    if !value.is_finite() {
        return Err(Trouble::new(whole, format!("{} is too large to work with", quoted(text)), d));
    }
    if raw == 0.0 && !zero || (d == Dimension::Level && value == 0.0 && reading == Reading::Decibel) {
        return Err(Trouble::new(whole, format!("{} is too small to work with", quoted(text)), d));
    }
    if d == Dimension::Temperature && value < 0.0 {
        return Err(Trouble::new(whole, format!("{} lies below absolute zero", quoted(text)), d));
    }
    if d == Dimension::Level && value <= 0.0 {
        return Err(Trouble::new(whole, format!("{} is not above zero, and a ratio must be", quoted(text)), d));
    }
    let decimals = number.mantissa.split_once('.').map_or(0, |(_, f)| f.len());
    let significant = number.mantissa.replace('.', "");
    Ok(Quantity {
        value,
        last_place: i32::try_from(number.power).unwrap_or(0) - i32::try_from(decimals).unwrap_or(0),
        digits: significant.trim_start_matches('0').len().max(1),
        comma: number.comma,
        number: 0..number.end,
        suffix: suffix_range,
        reading,
    })
}

fn number(text: &str, d: Dimension) -> Result<Number, Trouble> {
    let whole = 0..text.len();
    let not_a_number = || Trouble::new(whole.clone(), format!("{} does not begin with a number", quoted(text)), d);
    let mut rest = text;
    let mut negative = false;
    if let Some(sign) = rest.chars().next().filter(|c| "+-−–—".contains(*c)) {
        rest = rest[sign.len_utf8()..].trim_start();
        negative = sign != '+';
        if "–—".contains(sign) {
            let message = format!("{} begins with a dash, which is no minus sign", quoted(text));
            return Err(Trouble::new(whole.clone(), message, d).attempt(format!("-{rest}")));
        }
    }
    let (first, after) = digits(rest);
    let mut number = Number { negative, mantissa: first.into(), power: 0, letter: None, comma: false, end: 0 };
    rest = after;
    if let Some(mark) = rest.chars().next().filter(|c| ".,".contains(*c)) {
        let (second, after) = digits(&rest[1..]);
        if first.is_empty() && second.is_empty() {
            return Err(not_a_number());
        }
        if after.starts_with(['.', ',', '\'', '_', '’']) && digits(&after[1..]).0.len() + after.len() > after.len() {
            return Err(thousands(text, d));
        }
        number.comma = mark == ',';
        if number.comma && second.len() == 3 && (1..=3).contains(&first.len()) && first.trim_start_matches('0') == first {
            let message = format!("{} could be {first}.{second} or {first}{second}", quoted(text));
            return Err(Trouble::new(whole, message, d));
        }
        if second.is_empty() && number.comma {
            return Err(Trouble::new(whole, format!("{} has a comma without digits behind it", quoted(text)), d));
        }
        number.mantissa = format!("{}.{}", if first.is_empty() { "0" } else { first }, if second.is_empty() { "0" } else { second });
        rest = after;
    } else if rest.starts_with(['\'', '_', '’']) && !first.is_empty() {
        return Err(thousands(text, d));
    }
    letter_inside(text, &mut rest, &mut number, d)?;
    if number.mantissa.is_empty() {
        return Err(not_a_number());
    }
    if let Some(exponent) = rest.strip_prefix(['e', 'E']).filter(|_| number.letter.is_none()) {
        let (minus, magnitude) = match exponent.chars().next() {
            Some(c @ ('-' | '−')) => (true, &exponent[c.len_utf8()..]),
            Some('+') => (false, &exponent[1..]),
            _ => (false, exponent),
        };
        let (power, after) = digits(magnitude);
        if !power.is_empty() {
            let power = power.parse::<i64>().unwrap_or(i64::MAX).min(100_000);
            number.power = if minus { -power } else { power };
            rest = after;
        }
    }
    number.end = text.len() - rest.len();
    Ok(number)
}

/// A prefix or unit letter in place of the decimal point: `4k7`, `R47`, `3p3`, `3V3`.
fn letter_inside(text: &str, rest: &mut &str, number: &mut Number, d: Dimension) -> Result<(), Trouble> {
    let Some(letter) = rest.chars().next() else { return Ok(()) };
    let (fraction, after) = digits(&rest[letter.len_utf8()..]);
    let exponent = matches!(letter, 'e' | 'E') && !number.mantissa.is_empty();
    let code = letter == 'R' || letter == 'F' || letter == 'K' || letter == 'V' || unit::prefix_power(letter).is_some();
    if fraction.is_empty() || exponent || !code {
        return Ok(());
    }
    let range = 0..text.len();
    if number.mantissa.contains('.') {
        return Err(Trouble::new(range, format!("{} has two decimal marks", quoted(text)), d));
    }
    let of_resistance = match letter {
        'R' => Some(0),
        'K' => Some(3),
        'k' | 'M' | 'G' | 'T' => unit::prefix_power(letter),
        _ => None,
    };
    let of_capacitance = match letter {
        'F' => Some(0),
        'a' | 'f' | 'p' | 'n' | 'u' | 'µ' | 'μ' | 'm' => unit::prefix_power(letter),
        _ => None,
    };
    let (power, other) = match d {
        Dimension::Resistance => (of_resistance, "a capacitance"),
        Dimension::Capacitance => (of_capacitance, "a resistance"),
        Dimension::Voltage if letter == 'V' => (Some(0), ""),
        _ => (None, ""),
    };
    let whole = if number.mantissa.is_empty() { "0" } else { &number.mantissa };
    let Some(power) = power else {
        let component = matches!(d, Dimension::Resistance | Dimension::Capacitance);
        let trouble = match (d, letter) {
            (Dimension::Resistance, 'm') => milliohms(text, range, d),
            (Dimension::Capacitance, 'M') => mega_farads(text, range, d),
            _ if component && letter == 'V' => Trouble::new(range, format!("{} is a voltage", quoted(text)), d),
            _ if component => Trouble::new(range, format!("{} is {other}", quoted(text)), d),
            _ => {
                let trouble =
                    Trouble::new(range, format!("{} has a letter for its decimal point; only components are written so", quoted(text)), d);
                let unit = format!("{letter}{}", unit::spellings(d).first().unwrap_or(&""));
                if unit::reading(&unit, d).is_some() { trouble.attempt(format!("{whole}.{fraction} {unit}")) } else { trouble }
            }
        };
        return Err(trouble);
    };
    number.mantissa = format!("{whole}.{fraction}");
    number.power = i64::from(power);
    number.letter = Some(letter);
    *rest = after;
    Ok(())
}

/// Why the suffix cannot be read.
fn wrong_unit(text: &str, number: &Number, suffix: &str, d: Dimension) -> Trouble {
    let range = 0..text.len();
    let at_suffix = text.len() - suffix.len()..text.len();
    let given = &text[..number.end];
    if suffix.is_empty() {
        let message = match d {
            Dimension::Capacitance => format!("{} has neither prefix nor unit: pF, nF and µF are all usual", quoted(text)),
            _ => format!("{} has no unit", quoted(text)),
        };
        return Trouble::new(range, message, d);
    }
    match (d, suffix) {
        (Dimension::Capacitance, "M" | "MF") => return mega_farads(text, range, d),
        (Dimension::Resistance, "m") => return milliohms(text, range, d),
        (Dimension::Temperature | Dimension::TemperatureDifference, "C" | "°" | "deg") => {
            let message = format!("{} has the unit {}, which is none of temperature", quoted(text), quoted(suffix));
            return Trouble::new(at_suffix, message, d).attempt(format!("{given} °C"));
        }
        _ => {}
    }
    let alone = suffix.chars().count() == 1 && suffix.starts_with(|c| unit::prefix_power(c).is_some());
    if alone
        && !matches!(d, Dimension::Resistance | Dimension::Capacitance)
        && let Some(symbol) = unit::spellings(d).first().filter(|s| unit::reading(&format!("{suffix}{s}"), d).is_some())
    {
        let message = format!("{} has a prefix but no unit", quoted(text));
        return Trouble::new(range, message, d).attempt(format!("{given} {suffix}{symbol}"));
    }
    if let Some(other) = unit::identify(suffix).filter(|&o| !same_words(o, d)) {
        let trouble = Trouble::new(range, format!("{} is {}", quoted(text), unit::noun(other)), d);
        let prefix: String = suffix.chars().take(1).filter(|c| unit::prefix_power(*c).is_some()).collect();
        let bare = format!("{given}{prefix}");
        let component = matches!(d, Dimension::Resistance | Dimension::Capacitance);
        return if component && suffix.chars().count() > 1 && read(&bare, d).is_ok() { trouble.attempt(bare) } else { trouble };
    }
    let fits = unit::by_other_case(suffix, d);
    match fits.as_slice() {
        [] => Trouble::new(at_suffix, format!("{} ends in {}, which is no unit known here", quoted(text), quoted(suffix)), d),
        [one] => Trouble::new(at_suffix, format!("{} ends in {}, which is no unit; case matters", quoted(text), quoted(suffix)), d)
            .attempt(format!("{given} {one}")),
        several => {
            let choice = several.join(" or ");
            Trouble::new(at_suffix, format!("{}: {} could be {choice}", quoted(text), quoted(suffix)), d)
        }
    }
}

fn more_than_one(text: &str, rest: &str, d: Dimension) -> Trouble {
    let next = rest.trim_start();
    let (group, after) = digits(next);
    if rest.len() > next.len() && group.len() == 3 && !after.trim_start().starts_with('%') {
        return thousands(text, d);
    }
    Trouble::new(0..text.len(), format!("{} holds more than one number", quoted(text)), d)
}

pub(crate) fn thousands(text: &str, d: Dimension) -> Trouble {
    let message = format!("{} has a thousands separator, which could be a decimal mark", quoted(text));
    let mut trouble = Trouble::new(0..text.len(), message, d);
    trouble.allowed = format!("digits without separators and one decimal point or comma; {}", trouble.allowed);
    trouble
}

fn milliohms(text: &str, range: Range<usize>, d: Dimension) -> Trouble {
    let mut trouble = Trouble::new(range, format!("{}: `m` is milli, and milliohms are written out; `M` is mega", quoted(text)), d);
    trouble.allowed = "`10 mΩ` for milliohms, `10M` for megohms".into();
    trouble
}

fn mega_farads(text: &str, range: Range<usize>, d: Dimension) -> Trouble {
    Trouble::new(range, format!("{}: `M` is mega, and no capacitor is that large; `m` is milli, `µ` micro", quoted(text)), d)
}

/// Dimensions that share units, so that one cannot be told from the other by its unit.
const fn same_words(a: Dimension, b: Dimension) -> bool {
    a as u8 == b as u8
        || matches!(
            (a, b),
            (Dimension::Temperature | Dimension::TemperatureDifference, Dimension::Temperature | Dimension::TemperatureDifference)
                | (Dimension::Gain | Dimension::Level, Dimension::Gain | Dimension::Level)
        )
}

fn digits(text: &str) -> (&str, &str) {
    text.split_at(text.bytes().take_while(u8::is_ascii_digit).count())
}
