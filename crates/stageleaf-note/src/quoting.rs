//! Quoted numbers against the figures that they quote.

use std::f64::consts::PI;

use stageleaf_math::dimension::Dimension;

use crate::{
    decimal::Decimal,
    print::format,
    quantity::{Quantity, read},
    unit::Reading,
};

/// Whether the shown digits equal the value, rounded to as many digits: "512 kHz" agrees with 511.6 kHz.
///
/// The unit may be any that the figure can be read in; the last digit written is the one to which the value is rounded.
///
/// # Example
/// ```
/// use stageleaf_math::dimension::Dimension;
/// assert!(stageleaf_note::quote_agrees("512 kHz", 511_600.0, Dimension::Frequency));
/// assert!(!stageleaf_note::quote_agrees("512.0 kHz", 511_600.0, Dimension::Frequency));
/// ```
#[must_use]
pub fn quote_agrees(shown: &str, value: f64, d: Dimension) -> bool {
    let Ok(q) = read(shown, d) else { return shown.trim() == format(value, d, 3) };
    let (Some(now), Some(then)) = (in_unit(&q, value), in_unit(&q, q.value)) else { return false };
    let (now, power) = now;
    let place = q.last_place + power;
    match (Decimal::at_place(now, place), Decimal::at_place(then.0, place)) {
        (Some(now), Some(then)) => now.negative == then.negative && now.plain() == then.plain(),
        _ => false,
    }
}

/// The current value with as many digits as shown, in the same unit where it still fits.
#[must_use]
pub fn quote_for(shown: &str, value: f64, d: Dimension) -> String {
    let Ok(q) = read(shown, d) else { return format(value, d, 3) };
    let comma = |text: String| if q.comma { text.replacen('.', ",", 1) } else { text };
    let same_unit = in_unit(&q, value).and_then(|(now, power)| {
        let number = Decimal::significant(now, q.digits)?.scaled(-power);
        // "0.51 MHz" may become "0.49 MHz"; "512 kHz" does not become "0.512 kHz".
        let least = if q.suffix.is_empty() {
            -3
        } else {
            -i32::from(shown[q.number.clone()].trim_start_matches(['-', '−', '+']).starts_with('0'))
        };
        let fits = number.is_zero() || (least..i32::try_from(q.digits).unwrap_or(i32::MAX).max(3)).contains(&number.exponent);
        let code = q.suffix.is_empty() && shown[q.number.clone()].contains(char::is_alphabetic);
        if !fits || code {
            return None;
        }
        let minus = if shown[q.number.clone()].starts_with('-') { "-" } else { "−" };
        let sign = if number.negative { minus } else { "" };
        Some(format!("{}{sign}{}{}", &shown[..q.number.start], comma(number.plain()), &shown[q.number.end..]))
    });
    // Zeros before the point show fewer digits than they stand for ("500 kHz" for two), so more may be needed.
    let others = (q.digits..=17).map(|digits| comma(format(value, d, digits)));
    same_unit.into_iter().chain(others).find(|text| quote_agrees(text, value, d)).unwrap_or_else(|| format(value, d, q.digits))
}

/// A value in the unit of a quote, and the power of ten by which the unit's number is still to be scaled.
fn in_unit(q: &Quantity, value: f64) -> Option<(f64, i32)> {
    let (number, power) = match q.reading {
        Reading::Power(power) => (value, power),
        Reading::Decibel => (20.0 * libm::log10(value.abs()), 0),
        Reading::Degree => (value * (180.0 / PI), 0),
        Reading::Celsius => (value - 273.15, 0),
    };
    number.is_finite().then_some((number, power))
}
