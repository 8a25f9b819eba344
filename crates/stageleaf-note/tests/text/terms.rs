//! Tolerances, ranges, limits as text, and words for what the engine reports.

use stageleaf_math::{
    dimension::Dimension::{self, Capacitance, Frequency, Gain, Level, Resistance, Temperature, Voltage},
    figure::{Figure, Query},
    limit::Limit,
    part::{PartFigure, Rating},
    report::{Caution, DcCause, Need, NoiseOrigin, Outcome, Parameter},
    stage::{Span, Toleranced},
};
use stageleaf_note::{limit_text, parse_limit, parse_span, parse_toleranced, words};

fn toleranced(text: &str, d: Dimension) -> (f64, f64, f64, f64, Option<f64>) {
    let Toleranced { nominal, minus, plus, drift, rating } = parse_toleranced(text, d).unwrap_or_else(|t| panic!("{text}: {}", t.message));
    (nominal, minus, plus, drift, rating)
}

fn near(span: Span, low: f64, nominal: f64, high: f64) {
    for (got, wanted) in [(span.low, low), (span.nominal, nominal), (span.high, high)] {
        assert!((got - wanted).abs() <= 1e-9 * wanted.abs().max(1e-3), "{span:?}, wanted {wanted}");
    }
}

fn span(text: &str, d: Dimension) -> Span {
    parse_span(text, d).unwrap_or_else(|t| panic!("{text}: {}", t.message))
}

fn refused(text: &str, d: Dimension) -> String {
    let t = parse_span(text, d).expect_err(text);
    format!("{} {}", &text[t.range], t.message)
}

#[test]
fn tolerance_drift_and_rating_in_any_order() {
    assert_eq!(toleranced("91k", Resistance), (91e3, 0.0, 0.0, 0.0, None));
    assert_eq!(toleranced("91k 1% 50ppm", Resistance), (91e3, 0.01, 0.01, 50e-6, None));
    assert_eq!(toleranced("91 kΩ ± 1 % 50 ppm/K 0.25W", Resistance), (91e3, 0.01, 0.01, 50e-6, Some(0.25)));
    assert_eq!(toleranced("4,7 kΩ 0,1% 25ppm/°C", Resistance), (4700.0, 0.001, 0.001, 25e-6, None));
    assert_eq!(toleranced("100n +20% -10%", Capacitance), (100e-9, 0.1, 0.2, 0.0, None));
    assert_eq!(toleranced("100n −10% +20%", Capacitance), (100e-9, 0.1, 0.2, 0.0, None));
    assert_eq!(toleranced("100n+20%-10%", Capacitance), (100e-9, 0.1, 0.2, 0.0, None));
    assert_eq!(toleranced("600 100ppm", Resistance), (600.0, 0.0, 0.0, 100e-6, None));
    assert_eq!(toleranced("600 1% 500mW", Resistance), (600.0, 0.01, 0.01, 0.0, Some(0.5)));
    let (nominal, minus, plus, ..) = toleranced("3p3 ± 0.25 pF", Capacitance);
    assert!(nominal > 3.2e-12 && (minus - 0.25 / 3.3).abs() < 1e-12 && (plus - minus).abs() < 1e-15);
}

#[test]
fn quantities_that_vary() {
    near(span("5 V", Voltage), 5.0, 5.0, 5.0);
    near(span("12 V ± 5 %", Voltage), 11.4, 12.0, 12.6);
    near(span("-12 V ± 5 %", Voltage), -12.6, -12.0, -11.4);
    near(span("12V±5%", Voltage), 11.4, 12.0, 12.6);
    near(span("12 V +/- 0.5 V", Voltage), 11.5, 12.0, 12.5);
    near(span("12 ± 0.5 V", Voltage), 11.5, 12.0, 12.5);
    near(span("12 V +10 % -5 %", Voltage), 11.4, 12.0, 13.2);
    near(span("3.0 V to 4.2 V, 3.7 V nominal", Voltage), 3.0, 3.7, 4.2);
    near(span("3,0 V to 4,2 V, nominal 3,7 V", Voltage), 3.0, 3.7, 4.2);
    near(span("3.0 to 4.2 V", Voltage), 3.0, 3.6, 4.2);
    near(span("-20 °C to 50 °C", Temperature), 253.15, 288.15, 323.15);
    near(span("−20 to 50 °C, 25 °C nominal", Temperature), 253.15, 298.15, 323.15);
    near(span("25 °C ± 10 K", Temperature), 288.15, 298.15, 308.15);
    near(span("20.31 ± 0.02", Gain), 20.29, 20.31, 20.33);
    // By definition of the decibel: 20 dB is 10, 6 dB more or less is a factor of 1.99526.
    near(span("20 dB ± 6 dB", Level), 10.0 / 1.995_262_315, 10.0, 19.952_623_15);
}

#[test]
fn ranges_that_cannot_be() {
    assert_eq!(refused("300 to 500 kHz", Frequency), "300 \"300\" has no unit");
    assert_eq!(refused("4.2 V to 3.0 V", Voltage), "4.2 V to 3.0 V \"4.2 V to 3.0 V\" runs downwards: its first end is above its second");
    assert_eq!(
        refused("3 V to 4 V, 5 V nominal", Voltage),
        "5 V nominal the nominal of \"3 V to 4 V, 5 V nominal\" lies outside its range"
    );
    assert_eq!(refused("12 V 5 %", Voltage), "12 V 5 % \"12 V 5 %\" holds more than one number");
    assert_eq!(refused("25 °C ± 5 %", Temperature), "5 % \"5 %\" of a temperature has no meaning");
    assert_eq!(
        refused("0.1 % ± 10 %", Dimension::Fraction),
        "10 % \"10 %\" could mean a part of the value or be added to it; write both ends with `between`"
    );
    assert_eq!(refused("12 V ± 20 mA", Voltage), "20 mA \"20 mA\" is a current");
    assert_eq!(refused("1e308 V ± 1e308 V", Voltage), "1e308 V ± 1e308 V \"1e308 V ± 1e308 V\" is too large to work with");
}

#[test]
fn a_limit_reads_back_as_it_was_written() {
    for (figure, text) in [
        (Figure::Bandwidth, "at least 300 kHz"),
        (Figure::OutputNoise, "at most 120 µV"),
        (Figure::Gain, "between −21.2 and −19.8"),
        (Figure::ClipMargin, "at least 500 mV, thin below 1 V"),
        (Figure::Peaking, "at most 1 dB, thin above 0.5 dB"),
        (Figure::JunctionTemperature, "at most 125 °C, thin above 110 °C"),
        (Figure::PhaseMargin, "at least 50 °"),
        (Figure::GainError, "between −0.1 % and 0.1 %"),
        (Figure::Gain, "between 19 and 21, thin within 0.25"),
        (Figure::Q, "report"),
    ] {
        let (bound, thin) = parse_limit(text, figure.dimension(), 0.1).unwrap_or_else(|t| panic!("{text}: {}", t.message));
        assert_eq!(limit_text(&Limit { query: Query::of(figure), bound, thin }, figure.dimension()), text);
    }
}

#[test]
fn the_engine_in_words() {
    assert_eq!(words::parameter_text(Parameter::Component("Rf")), "Rf");
    assert_eq!(words::parameter_text(Parameter::Part(PartFigure::Gbw)), "gain-bandwidth product");
    assert_eq!(words::parameter_text(Parameter::SupplyPositive), "positive supply");
    assert_eq!(
        words::need_text(Need::Part(PartFigure::JunctionToAmbient), "site/shelf/alder-10.toml"),
        "`junction_to_ambient` (K/W) under [thermal] in site/shelf/alder-10.toml, with its source"
    );
    assert_eq!(words::need_text(Need::Part(PartFigure::SupplySpanMax), "a.toml"), "`span` (V) under [supply] in a.toml, with its source");
    assert_eq!(words::need_text(Need::Band, "a.toml"), "[band] with `from` and `to` in the stage's block");
    assert_eq!(
        words::need_text(Need::Poles, "a.toml"),
        "`poles` (a list in Hz, `[]` where there are none) or `phase_margin` with its conditions under [gain] in a.toml, with its source"
    );
    assert_eq!(
        words::caution_text(&Caution::BelowStableGain { noise_gain: 1.02, needed: 5.0 }),
        "The noise gain at crossover is 1.02; the part asks for at least 5."
    );
    assert_eq!(
        words::caution_text(&Caution::JunctionHot { junction: 433.15, allowed: 423.15 }),
        "The junction reaches 160 °C at the worst case; the part allows 150 °C, and nothing on its data sheet holds above that."
    );
    assert_eq!(
        words::caution_text(&Caution::HighVoltage { span: 150.0 }),
        "The supply span of 150 V lies above the extra-low-voltage range: local codes and licensed practice decide."
    );
    assert_eq!(words::cause_text(DcCause::BiasCurrent), "Bias current");
    assert_eq!(words::origin_text(NoiseOrigin::Component("Rg")), "Rg, thermal");
    assert_eq!(words::outcome_text(&Outcome::Value(511.6e3), Frequency, 3), "512 kHz");
    assert_eq!(words::outcome_text(&Outcome::Value(f64::NAN), Frequency, 3), "undetermined");
    assert_eq!(
        words::outcome_text(&Outcome::Undetermined(vec![Need::Band, Need::Part(PartFigure::NoiseVoltage)]), Voltage, 3),
        "undetermined: needs `band`, `noise.voltage`"
    );
    assert_eq!(words::outcome_text(&Outcome::Oscillates, Frequency, 3), "oscillates");
    let rating = Rating { typ: Some(0.5e-3), max: Some(2e-3), ..Rating::default() };
    assert_eq!(words::rating_text(&rating, Voltage), "500 µV typical, 2 mV at most");
    for figure in PartFigure::ALL {
        let text = words::need_text(Need::Part(*figure), "a.toml");
        assert!(text.contains("under [") && !text.contains("()"), "{text}");
    }
}
