//! Quantities as text: engineering prefixes, the trade's units, U+2212 for minus.

use std::f64::consts::PI;

use stageleaf_math::dimension::Dimension;

use crate::{decimal::Decimal, unit::prefix_symbol};

/// How a dimension is shown.
struct Style {
    /// Behind the prefix.
    symbol: &'static str,
    /// As it is said, one and many.
    words: (&'static str, &'static str),
    /// Power of ten from the SI unit to the shown unit without prefix.
    shift: i32,
    /// Least and greatest prefix.
    prefixes: (i32, i32),
    /// The last digit is not finer than this power of ten.
    finest: i32,
}

const fn style(d: Dimension) -> Style {
    let (symbol, words, shift, prefixes, finest) = match d {
        Dimension::Number | Dimension::Gain => ("", ("", ""), 0, (0, 0), -400),
        Dimension::Level => ("dB", ("decibel", "decibels"), 0, (0, 0), -4),
        Dimension::Fraction => ("%", ("percent", "percent"), 2, (0, 0), -400),
        Dimension::Angle => ("°", ("degree", "degrees"), 0, (0, 0), -4),
        Dimension::Frequency => ("Hz", ("hertz", "hertz"), 0, (-3, 12), -400),
        Dimension::Time => ("s", ("second", "seconds"), 0, (-15, 0), -400),
        Dimension::Resistance => ("Ω", ("ohm", "ohms"), 0, (-3, 12), -400),
        Dimension::Capacitance => ("F", ("farad", "farads"), 0, (-18, 0), -400),
        Dimension::Voltage => ("V", ("volt", "volts"), 0, (-18, 6), -400),
        Dimension::Current => ("A", ("ampere", "amperes"), 0, (-18, 3), -400),
        Dimension::Power => ("W", ("watt", "watts"), 0, (-18, 6), -400),
        Dimension::Charge => ("C", ("coulomb", "coulombs"), 0, (-18, 0), -400),
        Dimension::VoltsPerCoulomb => ("V/C", ("volt per coulomb", "volts per coulomb"), 0, (-3, 12), -400),
        Dimension::Temperature => ("°C", ("degree Celsius", "degrees Celsius"), 0, (0, 0), -3),
        Dimension::TemperatureDifference => ("K", ("kelvin", "kelvins"), 0, (0, 0), -400),
        Dimension::ThermalResistance => ("K/W", ("kelvin per watt", "kelvins per watt"), 0, (0, 0), -400),
        Dimension::SlewRate => ("V/µs", ("volt per microsecond", "volts per microsecond"), -6, (-9, 6), -400),
        Dimension::VoltageDensity => ("V/√Hz", ("volt per root hertz", "volts per root hertz"), 0, (-18, 0), -400),
        Dimension::CurrentDensity => ("A/√Hz", ("ampere per root hertz", "amperes per root hertz"), 0, (-18, 0), -400),
        Dimension::VoltageDrift => ("V/K", ("volt per kelvin", "volts per kelvin"), 0, (-18, 0), -400),
        Dimension::FractionDrift => ("ppm/K", ("part per million per kelvin", "parts per million per kelvin"), 6, (0, 0), -400),
        Dimension::Bits => ("bits", ("bit", "bits"), 0, (0, 0), -3),
    };
    Style { symbol, words, shift, prefixes, finest }
}

/// Text of a value with `digits` significant digits: "512 kHz", "−13.2 V", "54.3 °", "110 dB".
///
/// Infinite values are "unlimited"; a value that is no number is "undetermined", so that the letters NaN never reach a
/// reader. Levels are shown in dB, angles in degrees, temperatures in °C, small fractions in ppm.
///
/// # Example
/// ```
/// use stageleaf_math::dimension::Dimension;
/// assert_eq!(stageleaf_note::format(999.96, Dimension::Frequency, 3), "1.00 kHz");
/// ```
#[must_use]
pub fn format(value: f64, d: Dimension, digits: usize) -> String {
    text(value, d, digits, false)
}

/// The same without zeros at the end: "91 kΩ", "0.4 V".
#[must_use]
pub fn trimmed(value: f64, d: Dimension, digits: usize) -> String {
    text(value, d, digits, true)
}

/// A value as it should be said aloud, with up to four digits: "4.7 kilohms", "minus 12 volts".
#[must_use]
pub fn spoken(value: f64, d: Dimension) -> String {
    let Some((style, decimal)) = natural(value, d, 4) else { return unusual(value).trim_start_matches('−').into() };
    let power = engineering(&decimal, &style);
    let number = decimal.clone().trimmed().scaled(-power);
    let plain = number.plain();
    let prefix = match power {
        -18 => "atto",
        -15 => "femto",
        -12 => "pico",
        -9 => "nano",
        -6 => "micro",
        -3 => "milli",
        3 => "kilo",
        6 => "mega",
        9 => "giga",
        12 => "tera",
        _ => "",
    };
    let unit = if plain == "1" && !number.negative { style.words.0 } else { style.words.1 };
    // Kilohm and megohm drop a vowel.
    let prefix = if d == Dimension::Resistance {
        prefix.strip_suffix(['o', 'a']).filter(|p| *p == "kil" || *p == "meg").unwrap_or(prefix)
    } else {
        prefix
    };
    let sign = if number.negative { "minus " } else { "" };
    format!("{sign}{plain} {prefix}{unit}").trim_end().into()
}

/// The letter-and-digit code of a resistance or capacitance: 4700 Ω is "4k7", 0.47 Ω "R47". It reads back as the same bits.
///
/// Other dimensions, and values that have no code, come as [`full`].
///
/// # Source
/// IEC 60062:2016, letter and digit code; from memory. Lower-case `k`, the common variant.
#[must_use]
pub fn code(value: f64, d: Dimension) -> String {
    let (least, greatest, one) = match d {
        Dimension::Resistance => (0, 12, "R"),
        Dimension::Capacitance => (-12, 0, "F"),
        _ => return full(value, d),
    };
    let Some(decimal) = Decimal::shortest(value).filter(|n| !n.negative && !n.is_zero() && (-30..=30).contains(&n.exponent)) else {
        return full(value, d);
    };
    let power = (decimal.exponent.div_euclid(3) * 3).clamp(least, greatest);
    let letter = if power == 0 { one } else { prefix_symbol(power) };
    let plain = decimal.scaled(-power).plain();
    match plain.split_once('.') {
        Some(("0", part)) => format!("{letter}{part}"),
        Some((whole, part)) => format!("{whole}{letter}{part}"),
        // The standard shows at least two digits: 1k0.
        None if plain.len() == 1 => format!("{plain}{letter}0"),
        None => format!("{plain}{letter}"),
    }
}

/// Text with all digits, which reads back as the same bits; angles in rad, temperatures in K, levels as V/V, since
/// the way through degrees or dB may lose the last bit.
#[must_use]
pub fn full(value: f64, d: Dimension) -> String {
    let Some(decimal) = Decimal::shortest(value) else { return unusual(value).into() };
    let mut style = style(d);
    style.symbol = match d {
        Dimension::Level => "V/V",
        Dimension::Angle => "rad",
        Dimension::Temperature => "K",
        _ => style.symbol,
    };
    let decimal = decimal.scaled(style.shift);
    let power = engineering(&decimal, &style);
    assemble(&decimal.scaled(-power), power, &style)
}

fn text(value: f64, d: Dimension, digits: usize, trim: bool) -> String {
    let Some((mut style, decimal)) = natural(value, d, digits) else { return unusual(value).into() };
    let mut decimal = if trim { decimal.trimmed() } else { decimal };
    if d == Dimension::Fraction && decimal.exponent < -2 && !decimal.is_zero() {
        style.symbol = "ppm";
        decimal = decimal.scaled(4);
    }
    if d == Dimension::Bits && decimal.plain() == "1" {
        style.symbol = "bit";
    }
    let power = engineering(&decimal, &style);
    assemble(&decimal.scaled(-power), power, &style)
}

/// The number in the shown unit without prefix, rounded once; `None` where there is none to show.
fn natural(value: f64, d: Dimension, digits: usize) -> Option<(Style, Decimal)> {
    let style = style(d);
    let shown = match d {
        Dimension::Level => 20.0 * libm::log10(value),
        Dimension::Angle => value * (180.0 / PI),
        Dimension::Temperature => value - 273.15,
        _ => value,
    };
    let rounded = Decimal::significant(shown, digits)?;
    let rounded = if rounded.last_place() < style.finest { Decimal::at_place(shown, style.finest)? } else { rounded };
    let rounded =
        if rounded.is_zero() { Decimal { negative: false, digits: "0".into(), exponent: 0 } } else { rounded.scaled(style.shift) };
    Some((style, rounded))
}

/// The power of ten of the prefix.
fn engineering(decimal: &Decimal, style: &Style) -> i32 {
    if decimal.is_zero() {
        return 0;
    }
    (decimal.exponent.div_euclid(3) * 3).clamp(style.prefixes.0, style.prefixes.1)
}

fn assemble(number: &Decimal, power: i32, style: &Style) -> String {
    let sign = if number.negative { "−" } else { "" };
    let digits = if (-5..=7).contains(&number.exponent) || number.is_zero() {
        number.plain()
    } else {
        let minus = if number.exponent < 0 { "−" } else { "" };
        format!("{}e{minus}{}", number.clone().scaled(-number.exponent).plain(), number.exponent.unsigned_abs())
    };
    let space = if style.symbol.is_empty() { "" } else { " " };
    format!("{sign}{digits}{space}{}{}", prefix_symbol(power), style.symbol)
}

const fn unusual(value: f64) -> &'static str {
    if value.is_nan() {
        "undetermined"
    } else if value > 0.0 {
        "unlimited"
    } else {
        "−unlimited"
    }
}
