//! Arrow keys on a value: the next text up or down.
//!
//! Resistances and capacitances go through the team's series, temperatures by a degree; other quantities change in
//! their second digit. Only the nominal value moves: tolerance, drift and rating stay as typed. All steps are made on decimal digits, so that no
//! rounding creeps in.

use stageleaf_math::{dimension::Dimension, kind::Kind, series::Series};
use stageleaf_note::{Settings, code, decimal::number, full, parse, paths, print::trimmed};

/// How far to go.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Step {
    /// To the next value above.
    Up,
    /// To the next value below.
    Down,
    /// A decade up.
    DecadeUp,
    /// A decade down.
    DecadeDown,
}

/// The text after a step from `text` at `path`, where that value has steps.
pub fn step(path: &str, text: &str, step: Step, kind: Kind, settings: &Settings) -> Option<String> {
    let dimension = paths::dimension(path, kind)?;
    let (nominal, rest) = split(text, dimension)?;
    if rest.contains(" to ") {
        return None;
    }
    if dimension == Dimension::Temperature {
        return Some(format!("{}{rest}", by_degree(parse(nominal, dimension).ok()?, step)?));
    }
    let value = parse(nominal, dimension).ok().filter(|value| value.is_finite() && *value != 0.0)?;
    let series = match dimension {
        Dimension::Resistance => Some(settings.resistor_series),
        Dimension::Capacitance => Some(settings.capacitor_series),
        _ => None,
    };
    let next = match (step, series) {
        (Step::DecadeUp, _) => shifted(value, 1),
        (Step::DecadeDown, _) => shifted(value, -1),
        (Step::Up, Some(series)) => in_series(series, value, true),
        (Step::Down, Some(series)) => in_series(series, value, false),
        (Step::Up, None) => by_digit(value, true),
        (Step::Down, None) => by_digit(value, false),
    };
    // Nothing that a board holds lies outside of this.
    let next = next.filter(|next| (1e-18..=1e15).contains(&next.abs()))?;
    let shown = if series.is_some() && !nominal.contains(char::is_whitespace) { code(next, dimension) } else { full(next, dimension) };
    Some(format!("{shown}{rest}"))
}

/// The longest beginning of `text` that is one quantity, and the rest.
fn split(text: &str, dimension: Dimension) -> Option<(&str, &str)> {
    let ends = text.char_indices().filter(|(_, c)| c.is_whitespace()).map(|(at, _)| at).chain([text.len()]);
    let end = ends.filter(|end| parse(&text[..*end], dimension).is_ok()).max()?;
    Some(text.split_at(end))
}

fn shifted(value: f64, decades: i32) -> Option<f64> {
    let text = format!("{value:e}");
    let (digits, exponent) = text.split_once('e')?;
    let (digits, negative) = digits.strip_prefix('-').map_or((digits, false), |digits| (digits, true));
    let size = number(digits, i64::from(exponent.parse::<i32>().ok()? + decades));
    Some(if negative { -size } else { size })
}

fn by_digit(value: f64, up: bool) -> Option<f64> {
    let text = format!("{:.1e}", value.abs());
    let (digits, exponent) = text.split_once('e')?;
    let digits: i64 = digits.replace('.', "").parse().ok()?;
    let exponent: i32 = exponent.parse().ok()?;
    let grows = up == (value > 0.0);
    let (next, exponent) = match (digits, grows) {
        (_, true) => (digits + 1, exponent - 1),
        // Below 1.0 the second digit is the next decade's first.
        (10, false) => (99, exponent - 2),
        (_, false) => (digits - 1, exponent - 1),
    };
    let size = number(&next.to_string(), i64::from(exponent));
    Some(if value > 0.0 { size } else { -size })
}

/// Temperatures have no decades: an arrow goes by one degree Celsius, a Page key by ten.
fn by_degree(kelvins: f64, step: Step) -> Option<String> {
    let by = match step {
        Step::Up => 1.0,
        Step::Down => -1.0,
        Step::DecadeUp => 10.0,
        Step::DecadeDown => -10.0,
    };
    let next = Some(kelvins + by).filter(|next| (0.0..=1e3).contains(next))?;
    Some(trimmed(next, Dimension::Temperature, 6))
}

fn in_series(series: Series, value: f64, up: bool) -> Option<f64> {
    if value <= 0.0 {
        return None;
    }
    Some(if up { series.step_up(value) } else { series.step_down(value) })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn after(path: &str, text: &str, way: Step) -> Option<String> {
        step(path, text, way, Kind::NonInverting, &Settings::default())
    }

    #[test]
    fn a_resistor_steps_through_its_series_and_keeps_its_tolerance() {
        // IEC 60063, E24: 4.7, 5.1; 9.1, 10.
        assert_eq!(after("components.Rf", "4k7 1% 50ppm", Step::Up).as_deref(), Some("5k1 1% 50ppm"));
        assert_eq!(after("components.Rf", "91k", Step::Up).as_deref(), Some("100k"));
        assert_eq!(after("components.Rf", "100k", Step::Down).as_deref(), Some("91k"));
        assert_eq!(after("components.Rf", "4k7 1%", Step::DecadeUp).as_deref(), Some("47k 1%"));
    }

    #[test]
    fn a_voltage_changes_in_its_second_digit() {
        assert_eq!(after("signal.peak", "0.4 V", Step::Up).as_deref(), Some("410 mV"));
        assert_eq!(after("signal.peak", "1 V", Step::Down).as_deref(), Some("990 mV"));
        assert_eq!(after("supply.positive", "12 V ± 5 %", Step::Up).as_deref(), Some("13 V ± 5 %"));
        assert_eq!(after("supply.negative", "-12 V", Step::Up).as_deref(), Some("−11 V"));
    }

    #[test]
    fn every_value_of_a_stage_has_steps() {
        let of = |kind, path, text| step(path, text, Step::Up, kind, &Settings::default());
        assert_eq!(of(Kind::Summing, "signal.in2.peak", "1 V").as_deref(), Some("1.1 V"));
        assert_eq!(of(Kind::Summing, "source.in1.resistance", "50 Ω").as_deref(), Some("51 Ω"));
        assert_eq!(of(Kind::Transimpedance, "signal.peak", "1 µA").as_deref(), Some("1.1 µA"));
        assert_eq!(of(Kind::Transimpedance, "source.dark_current", "20 pA").as_deref(), Some("21 pA"));
        assert_eq!(of(Kind::Charge, "signal.peak", "10 pC").as_deref(), Some("11 pC"));
        assert_eq!(of(Kind::Difference, "signal.common_mode", "5 V").as_deref(), Some("5.1 V"));
        assert_eq!(of(Kind::ScaleAndShift, "reference.voltage", "2.5 V 0.1%").as_deref(), Some("2.6 V 0.1%"));
        assert_eq!(of(Kind::NonInverting, "signal.crest_factor", "3").as_deref(), Some("3.1"));
        assert_eq!(of(Kind::NonInverting, "ambient.range", "25 °C").as_deref(), Some("26 °C"));
        assert_eq!(of(Kind::NonInverting, "ambient.range", "−1 °C").as_deref(), Some("0 °C"));
        assert_eq!(step("ambient.temperature", "25 °C", Step::DecadeDown, Kind::Inverting, &Settings::default()).as_deref(), Some("15 °C"));
    }

    #[test]
    fn what_has_no_steps_stays() {
        assert_eq!(after("part", "alder-10", Step::Up), None);
        assert_eq!(after("supply.positive", "3.0 V to 4.2 V", Step::Up), None);
        assert_eq!(after("signal.dc", "0 V", Step::Up), None);
        assert_eq!(after("components.Rf", "many", Step::Up), None);
    }
}
