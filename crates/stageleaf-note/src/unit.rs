//! Units and prefixes as text.
//!
//! # Source
//! Symbols and prefixes: BIPM, The International System of Units, 9th edition, tables 2, 4 and 7; from memory.
//! `R`, `ohm`, `u`, `deg`, `rtHz` for keyboards without the symbols: common practice, no source.

use std::borrow::Cow;

use stageleaf_math::dimension::Dimension;

use crate::letters::lowered;

/// How the number before a unit becomes SI.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reading {
    /// Times a power of ten.
    Power(i32),
    /// `10^(x/20)`.
    Decibel,
    /// `x · π/180`.
    Degree,
    /// `x + 273.15`.
    Celsius,
}

/// Every dimension, in the order in which a foreign unit is recognised.
pub const DIMENSIONS: [Dimension; 23] = [
    Dimension::Voltage,
    Dimension::Current,
    Dimension::Resistance,
    Dimension::Capacitance,
    Dimension::Frequency,
    Dimension::Time,
    Dimension::Power,
    Dimension::Charge,
    Dimension::VoltsPerCoulomb,
    Dimension::Fraction,
    Dimension::Level,
    Dimension::Gain,
    Dimension::Angle,
    Dimension::Temperature,
    Dimension::TemperatureDifference,
    Dimension::ThermalResistance,
    Dimension::SlewRate,
    Dimension::VoltageDensity,
    Dimension::CurrentDensity,
    Dimension::VoltageDrift,
    Dimension::FractionDrift,
    Dimension::Bits,
    Dimension::Number,
];

/// The power of ten of a prefix.
#[must_use]
pub const fn prefix_power(prefix: char) -> Option<i32> {
    Some(match prefix {
        'a' => -18,
        'f' => -15,
        'p' => -12,
        'n' => -9,
        'u' | 'µ' | 'μ' => -6,
        'm' => -3,
        'k' => 3,
        'M' => 6,
        'G' => 9,
        'T' => 12,
        _ => return None,
    })
}

/// The prefix of a power of ten; "" for 0.
#[must_use]
pub const fn prefix_symbol(power: i32) -> &'static str {
    match power {
        -18 => "a",
        -15 => "f",
        -12 => "p",
        -9 => "n",
        -6 => "µ",
        -3 => "m",
        3 => "k",
        6 => "M",
        9 => "G",
        12 => "T",
        _ => "",
    }
}

/// How to read a number with this suffix as a quantity of dimension `d`; `None` where the suffix is no unit of it.
/// The suffix may be empty, a prefix alone (`k`), or a unit with its prefix.
#[must_use]
pub fn reading(suffix: &str, d: Dimension) -> Option<Reading> {
    let s = &*simplified(suffix);
    let power = |p: Option<i32>| p.map(Reading::Power);
    match d {
        Dimension::Number => (s.is_empty()).then_some(Reading::Power(0)),
        Dimension::Bits => matches!(s, "" | "bit" | "bits").then_some(Reading::Power(0)),
        Dimension::Gain => match s {
            "" | "V/V" => Some(Reading::Power(0)),
            "dB" => Some(Reading::Decibel),
            "V/mV" => Some(Reading::Power(3)),
            "V/µV" => Some(Reading::Power(6)),
            "k" | "M" | "G" => power(s.chars().next().and_then(prefix_power)),
            _ => None,
        },
        Dimension::Level => match s {
            "dB" => Some(Reading::Decibel),
            "V/V" => Some(Reading::Power(0)),
            _ => None,
        },
        Dimension::Fraction => match s {
            "%" => Some(Reading::Power(-2)),
            "ppm" => Some(Reading::Power(-6)),
            _ => None,
        },
        Dimension::Angle => match s {
            "°" | "deg" | "degree" | "degrees" => Some(Reading::Degree),
            "rad" => Some(Reading::Power(0)),
            _ => None,
        },
        Dimension::Temperature => match s {
            "°C" | "degC" => Some(Reading::Celsius),
            "K" => Some(Reading::Power(0)),
            _ => None,
        },
        Dimension::TemperatureDifference => matches!(s, "K" | "°C" | "degC").then_some(Reading::Power(0)),
        Dimension::Resistance => power(resistance(s)),
        Dimension::Capacitance => {
            let s = s.strip_suffix('F').unwrap_or(if s.is_empty() { "none" } else { s });
            power(one_prefix(s).filter(|&p| p <= 0))
        }
        Dimension::Frequency => power(prefixed(s, "Hz")),
        Dimension::Time => power(prefixed(s, "s")),
        Dimension::Voltage => power(prefixed(s, "V")),
        Dimension::Current => power(prefixed(s, "A")),
        Dimension::Power => power(prefixed(s, "W")),
        Dimension::Charge => power(prefixed(s, "C")),
        Dimension::VoltsPerCoulomb => {
            let (volts, coulombs) = s.split_once('/')?;
            power(prefixed(volts, "V").zip(prefixed(coulombs, "C")).map(|(v, q)| v - q))
        }
        Dimension::ThermalResistance => matches!(s, "K/W" | "°C/W" | "degC/W").then_some(Reading::Power(0)),
        Dimension::SlewRate => {
            let (volts, seconds) = s.split_once('/')?;
            power(prefixed(volts, "V").zip(prefixed(seconds, "s")).map(|(v, t)| v - t))
        }
        Dimension::VoltageDensity => power(per_root_hertz(s).and_then(|n| prefixed(n, "V"))),
        Dimension::CurrentDensity => power(per_root_hertz(s).and_then(|n| prefixed(n, "A"))),
        Dimension::VoltageDrift => power(per_kelvin(s).and_then(|n| prefixed(n, "V"))),
        Dimension::FractionDrift => match per_kelvin(s)? {
            "ppm" => Some(Reading::Power(-6)),
            "%" => Some(Reading::Power(-2)),
            "1" => Some(Reading::Power(0)),
            _ => None,
        },
    }
}

/// What a number with this suffix measures, whatever was expected.
#[must_use]
pub fn identify(suffix: &str) -> Option<Dimension> {
    if suffix.is_empty() {
        return None;
    }
    DIMENSIONS.into_iter().find(|&d| reading(suffix, d).is_some())
}

/// Unit and prefix as they should have been written, where only upper and lower case are wrong: all that it could be.
#[must_use]
pub fn by_other_case(suffix: &str, d: Dimension) -> Vec<String> {
    let wanted = lowered(&simplified(suffix));
    let mut found = Vec::new();
    for power in [-18, -15, -12, -9, -6, -3, 0, 3, 6, 9, 12] {
        for symbol in spellings(d) {
            let candidate = format!("{}{symbol}", prefix_symbol(power));
            if lowered(&candidate) == wanted && reading(&candidate, d).is_some() && !found.contains(&candidate) {
                found.push(candidate);
            }
        }
    }
    found
}

/// "a resistance".
#[must_use]
pub const fn noun(d: Dimension) -> &'static str {
    match d {
        Dimension::Number => "a number",
        Dimension::Gain => "a gain",
        Dimension::Level => "a ratio in dB",
        Dimension::Fraction => "a fraction",
        Dimension::Angle => "an angle",
        Dimension::Frequency => "a frequency",
        Dimension::Time => "a time",
        Dimension::Resistance => "a resistance",
        Dimension::Capacitance => "a capacitance",
        Dimension::Voltage => "a voltage",
        Dimension::Current => "a current",
        Dimension::Power => "a power",
        Dimension::Charge => "a charge",
        Dimension::VoltsPerCoulomb => "a gain in volts per coulomb",
        Dimension::Temperature => "a temperature",
        Dimension::TemperatureDifference => "a temperature difference",
        Dimension::ThermalResistance => "a thermal resistance",
        Dimension::SlewRate => "a slew rate",
        Dimension::VoltageDensity => "a voltage noise density",
        Dimension::CurrentDensity => "a current noise density",
        Dimension::VoltageDrift => "a voltage drift",
        Dimension::FractionDrift => "a relative drift",
        Dimension::Bits => "a number of bits",
    }
}

/// What may be written for a dimension, with examples.
#[must_use]
pub const fn allowed(d: Dimension) -> &'static str {
    match d {
        Dimension::Number => "a plain number, as `1.25` or `1e6`",
        Dimension::Gain => "a plain number or dB, as `20.4`, `-10`, `110 dB`, `200 V/mV`",
        Dimension::Level => "dB, or a plain ratio with its unit, as `90 dB`, `2 V/V`",
        Dimension::Fraction => "per cent or ppm, as `0.1 %`, `50 ppm`",
        Dimension::Angle => "degrees or radians, as `50 °`, `50 deg`, `0.87 rad`",
        Dimension::Frequency => "hertz, as `20 kHz`, `1.5 MHz`",
        Dimension::Time => "seconds, as `2 µs`, `15 ms`",
        Dimension::Resistance => "ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`",
        Dimension::Capacitance => "farads, as `3p3`, `100n`, `4.7 µF`",
        Dimension::Voltage => "volts, as `12 V`, `0.4 V`, `20 mV`",
        Dimension::Current => "amperes, as `25 mA`, `3 pA`",
        Dimension::Power => "watts, as `0.25 W`, `125 mW`",
        Dimension::Charge => "coulombs, as `10 pC`",
        Dimension::VoltsPerCoulomb => "volts per coulomb, as `-10 GV/C`, `-10 mV/pC`",
        Dimension::Temperature => "degrees Celsius or kelvins, as `25 °C`, `298.15 K`",
        Dimension::TemperatureDifference => "kelvins, as `10 K`, `10 °C`",
        Dimension::ThermalResistance => "kelvins per watt, as `120 K/W`, `120 °C/W`",
        Dimension::SlewRate => "volts per second, as `20 V/µs`, `0.5 V/us`",
        Dimension::VoltageDensity => "volts per root hertz, as `9 nV/√Hz`, `9 nV/rtHz`",
        Dimension::CurrentDensity => "amperes per root hertz, as `0.4 pA/√Hz`, `2 fA/rtHz`",
        Dimension::VoltageDrift => "volts per kelvin, as `2 µV/K`, `2 uV/°C`",
        Dimension::FractionDrift => "ppm per kelvin, as `50 ppm/K`, `50 ppm/°C`",
        Dimension::Bits => "a number of bits, as `16 bits`",
    }
}

/// The symbol after a prefix, where the dimension takes prefixes.
#[must_use]
pub fn spellings(d: Dimension) -> &'static [&'static str] {
    match d {
        Dimension::Number | Dimension::Gain => &["dB", "V/V", "V/mV"],
        Dimension::Level => &["dB", "V/V"],
        Dimension::Fraction => &["%", "ppm"],
        Dimension::Angle => &["°", "deg", "rad"],
        Dimension::Frequency => &["Hz"],
        Dimension::Time => &["s"],
        Dimension::Resistance => &["Ω", "ohm", "ohms", "R"],
        Dimension::Capacitance => &["F", ""],
        Dimension::Voltage => &["V"],
        Dimension::Current => &["A"],
        Dimension::Power => &["W"],
        Dimension::Charge => &["C"],
        Dimension::VoltsPerCoulomb => &["V/C", "V/pC", "V/nC"],
        Dimension::Temperature => &["°C", "degC", "K"],
        Dimension::TemperatureDifference => &["K", "°C", "degC"],
        Dimension::ThermalResistance => &["K/W", "°C/W"],
        Dimension::SlewRate => &["V/µs", "V/ms", "V/s", "V/ns"],
        Dimension::VoltageDensity => &["V/√Hz", "V/rtHz"],
        Dimension::CurrentDensity => &["A/√Hz", "A/rtHz"],
        Dimension::VoltageDrift => &["V/K", "V/°C"],
        Dimension::FractionDrift => &["ppm/K", "ppm/°C"],
        Dimension::Bits => &["bit", "bits"],
    }
}

/// One spelling for each symbol: no spaces, one micro, one omega, one degree Celsius, ASCII roots as the sign.
fn simplified(suffix: &str) -> Cow<'_, str> {
    let plain = |b: u8| b.is_ascii_alphabetic() || b == b'%' || b == b'/';
    if suffix.bytes().all(plain) && !suffix.contains("/u") && !suffix.contains("/rt") && !suffix.contains("/sq") {
        return Cow::Borrowed(suffix);
    }
    let mut s = String::with_capacity(suffix.len() + 2);
    for c in suffix.chars() {
        match c {
            c if c.is_whitespace() => {}
            'μ' => s.push('µ'),
            '\u{2126}' => s.push('Ω'),
            '℃' => s.push_str("°C"),
            'º' | '˚' => s.push('°'),
            c => s.push(c),
        }
    }
    if let Some(at) = s.find('/') {
        // Behind a stroke, `u` can only be micro: "V/us".
        let tail = s.split_off(at);
        s.push_str(&match tail.as_str() {
            "/us" => "/µs".into(),
            "/uV" => "/µV".into(),
            "/uC" => "/µC".into(),
            "/rtHz" | "/sqrt(Hz)" | "/sqrtHz" | "/Hz^0.5" | "/Hz^½" => "/√Hz".into(),
            _ => tail,
        });
    }
    Cow::Owned(s)
}

fn resistance(s: &str) -> Option<i32> {
    for symbol in ["Ω", "ohms", "ohm", "Ohms", "Ohm"] {
        if let Some(prefix) = s.strip_suffix(symbol) {
            return if prefix == "K" { Some(3) } else { one_prefix(prefix) };
        }
    }
    match s {
        "" | "R" => Some(0),
        "k" | "K" => Some(3),
        "M" => Some(6),
        "G" => Some(9),
        "T" => Some(12),
        _ => None,
    }
}

fn prefixed(s: &str, symbol: &str) -> Option<i32> {
    one_prefix(s.strip_suffix(symbol)?)
}

fn one_prefix(s: &str) -> Option<i32> {
    let mut characters = s.chars();
    match (characters.next(), characters.next()) {
        (None, _) => Some(0),
        (Some(c), None) => prefix_power(c),
        _ => None,
    }
}

fn per_root_hertz(s: &str) -> Option<&str> {
    s.strip_suffix("/√Hz")
}

fn per_kelvin(s: &str) -> Option<&str> {
    ["/K", "/°C", "/degC"].into_iter().find_map(|d| s.strip_suffix(d))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_unit_belongs_to_its_dimension() {
        assert_eq!(reading("V/us", Dimension::SlewRate), Some(Reading::Power(6)));
        assert_eq!(reading("nV/rtHz", Dimension::VoltageDensity), Some(Reading::Power(-9)));
        assert_eq!(reading("kV", Dimension::Resistance), None);
        assert_eq!(identify("kV"), Some(Dimension::Voltage));
        assert_eq!(identify("nV/√Hz"), Some(Dimension::VoltageDensity));
        assert_eq!(identify("furlong"), None);
    }

    #[test]
    fn case_is_never_guessed_where_two_prefixes_fit() {
        assert_eq!(by_other_case("khz", Dimension::Frequency), ["kHz"]);
        assert_eq!(by_other_case("mhz", Dimension::Frequency), ["mHz", "MHz"]);
    }

    #[test]
    fn every_dimension_has_examples_that_read_as_it() {
        for d in DIMENSIONS {
            let examples: Vec<&str> = allowed(d).split('`').skip(1).step_by(2).collect();
            assert!(!examples.is_empty());
            for example in examples {
                assert!(crate::parse(example, d).is_ok(), "{d:?}: {example}");
            }
        }
    }
}
