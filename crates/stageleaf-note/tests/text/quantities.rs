//! Quantities in and out. Where a value comes from a standard, the standard is named beside it.
#![expect(clippy::float_cmp, reason = "decimal text has one nearest double; anything else is a defect")]

use stageleaf_math::dimension::Dimension::{self, *};
use stageleaf_note::{code, format, full, parse, spoken, unit::DIMENSIONS};

fn value(text: &str, d: Dimension) -> f64 {
    parse(text, d).unwrap_or_else(|t| panic!("{text}: {}", t.message))
}

/// The whole text of an error: message, allowed, try.
fn error(text: &str, d: Dimension) -> String {
    let t = parse(text, d).expect_err(text);
    assert!(text.get(t.range.clone()).is_some(), "{text}: {:?}", t.range);
    let attempt = t.attempt.map_or(String::new(), |a| format!(" | {a}"));
    format!("{} | {}{attempt}", t.message, t.allowed)
}

#[test]
fn letter_and_digit_codes_of_iec_60062() {
    // IEC 60062:2016, Marking codes for resistors and capacitors, letter and digit code; from memory.
    let resistors = [
        ("R47", 0.47),
        ("0R1", 0.1),
        ("2R2", 2.2),
        ("10R", 10.0),
        ("59R04", 59.04),
        ("100R", 100.0),
        ("4K7", 4700.0),
        ("47K", 47e3),
        ("332K", 332e3),
        ("M47", 470e3),
        ("1M0", 1e6),
        ("3M32", 3.32e6),
        ("1G0", 1e9),
    ];
    let capacitors = [
        ("p47", 4.7e-13),
        ("3p3", 3.3e-12),
        ("10p", 1e-11),
        ("n47", 4.7e-10),
        ("3n32", 3.32e-9),
        ("100n", 1e-7),
        ("4u7", 4.7e-6),
        ("4µ7", 4.7e-6),
        ("m47", 0.00047),
        ("1m0", 0.001),
    ];
    for (text, expected) in resistors {
        assert_eq!(value(text, Resistance), expected, "{text}");
    }
    for (text, expected) in capacitors {
        assert_eq!(value(text, Capacitance), expected, "{text}");
    }
}

#[test]
fn codes_come_out_as_the_standard_has_them() {
    // The same table, with the common lower-case k and the prefix that keeps one to three digits before the letter.
    for text in ["R47", "R1", "2R2", "10R", "59R04", "100R", "4k7", "47k", "332k", "470k", "1M0", "3M32", "1G0"] {
        assert_eq!(code(value(text, Resistance), Resistance), text);
    }
    for text in ["p47", "3p3", "10p", "470p", "3n32", "100n", "4µ7", "470µ", "1m0"] {
        assert_eq!(code(value(text, Capacitance), Capacitance), text);
    }
    assert_eq!(code(0.0047, Resistance), "R0047");
    assert_eq!(code(12.0, Voltage), "12 V");
}

#[test]
fn numbers_as_people_type_them() {
    for text in [
        "4.7k",
        "4,7k",
        "4k7",
        "4.7 k",
        "4.7 kΩ",
        "4.7 k\u{2126}",
        "4.7kohm",
        "4.7 kohms",
        "4700",
        "4.7e3",
        "4.7E3",
        "4700R",
        "0.0047M",
        "4,7\u{a0}kΩ",
        "4.7\u{2009}kΩ",
        " 4k7 ",
        "+4k7",
        "4k7Ω",
        "4700.0",
        "0,0047 MΩ",
    ] {
        assert_eq!(value(text, Resistance), 4700.0, "{text}");
    }
    for text in ["-12 V", "−12 V", "-12V", "- 12 V", "−12\u{202f}V", "-12000 mV", "-0.012kV"] {
        assert_eq!(value(text, Voltage), -12.0, "{text}");
    }
    for text in ["4.7 µF", "4.7 μF", "4.7uF", "4u7", "4µ7", "4μ7", "4700n", "4,7 u"] {
        assert_eq!(value(text, Capacitance), 4.7e-6, "{text}");
    }
    assert_eq!(value("0,001", Number), 0.001);
    assert_eq!(value(".5 V", Voltage), 0.5);
    assert_eq!(value("5. V", Voltage), 5.0);
    assert_eq!(value("3V3", Voltage), 3.3);
    assert_eq!(value("1e−3 V", Voltage), 1e-3);
    assert_eq!(value("0", Voltage), 0.0);
    assert_eq!(value("10 mΩ", Resistance), 0.01);
}

#[test]
fn every_unit_of_the_trade() {
    assert_eq!(value("9 nV/√Hz", VoltageDensity), 9e-9);
    assert_eq!(value("9 nV/rtHz", VoltageDensity), 9e-9);
    assert_eq!(value("9nV / √Hz", VoltageDensity), 9e-9);
    assert_eq!(value("0.4 pA/√Hz", CurrentDensity), 0.4e-12);
    assert_eq!(value("20 V/µs", SlewRate), 20e6);
    assert_eq!(value("20 V/us", SlewRate), 20e6);
    assert_eq!(value("500 mV/ms", SlewRate), 500.0);
    assert_eq!(value("3 pA", Current), 3e-12);
    assert_eq!(value("10 pC", Charge), 10e-12);
    assert_eq!(value("-2 uC", Charge), -2e-6);
    assert_eq!(value("−10 GV/C", VoltsPerCoulomb), -10e9);
    // By definition of the prefixes: 1 mV/pC is 1e-3 V over 1e-12 C.
    assert_eq!(value("10 mV/pC", VoltsPerCoulomb), 10e9);
    assert_eq!(value("2 V/uC", VoltsPerCoulomb), 2e6);
    assert_eq!(value("2 V/nC", VoltsPerCoulomb), 2e9);
    assert_eq!(value("120 K/W", ThermalResistance), 120.0);
    assert_eq!(value("120 °C/W", ThermalResistance), 120.0);
    assert_eq!(value("50 ppm/K", FractionDrift), 50e-6);
    assert_eq!(value("2 µV/K", VoltageDrift), 2e-6);
    assert_eq!(value("2 uV/°C", VoltageDrift), 2e-6);
    assert_eq!(value("0.1 %", Fraction), 0.001);
    assert_eq!(value("50 ppm", Fraction), 50e-6);
    assert_eq!(value("10 °C", TemperatureDifference), 10.0);
    assert_eq!(value("298.15 K", Temperature), 298.15);
    assert_eq!(value("16 bits", Bits), 16.0);
    assert_eq!(value("200 V/mV", Gain), 200e3);
    // By definition: 20·log10 of a voltage ratio; 40 dB is 100, 20 dB is 10.
    assert!((value("40 dB", Level) - 100.0).abs() < 1e-12);
    assert!((value("-20 dB", Gain) - 0.1).abs() < 1e-16);
    // By definition: 180° is π, 0 °C is 273.15 K (SI Brochure, 9th edition, section 2.3.1; from memory).
    assert_eq!(value("180 °", Angle), std::f64::consts::PI);
    assert_eq!(value("0 °C", Temperature), 273.15);
    assert_eq!(value("−273.15 °C", Temperature), 0.0);
}

#[test]
fn a_wrong_unit_is_named() {
    let ohms = "ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`";
    assert_eq!(error("91k V", Resistance), format!("\"91k V\" is a voltage | {ohms} | 91k"));
    assert_eq!(error("3p3", Resistance), format!("\"3p3\" is a capacitance | {ohms}"));
    assert_eq!(error("100n", Resistance), format!("\"100n\" is a capacitance | {ohms}"));
    assert_eq!(error("4k7", Capacitance), "\"4k7\" is a resistance | farads, as `3p3`, `100n`, `4.7 µF`");
    assert_eq!(error("20 kHz", Voltage), "\"20 kHz\" is a frequency | volts, as `12 V`, `0.4 V`, `20 mV`");
    assert_eq!(error("10 pC", Voltage), "\"10 pC\" is a charge | volts, as `12 V`, `0.4 V`, `20 mV`");
    assert_eq!(error("3 V", Charge), "\"3 V\" is a voltage | coulombs, as `10 pC`");
    assert_eq!(
        error("10 mV/pc", VoltsPerCoulomb),
        "\"10 mV/pc\": \"mV/pc\" could be mV/pC or MV/pC | volts per coulomb, as `-10 GV/C`, `-10 mV/pC`"
    );
    assert_eq!(
        error("10 gV/C", VoltsPerCoulomb),
        "\"10 gV/C\" ends in \"gV/C\", which is no unit; case matters | volts per coulomb, as `-10 GV/C`, `-10 mV/pC` | 10 GV/C"
    );
    assert_eq!(
        error("3 GV/C", Gain),
        "\"3 GV/C\" is a gain in volts per coulomb | a plain number or dB, as `20.4`, `-10`, `110 dB`, `200 V/mV`"
    );
    assert_eq!(error("50 °", Frequency), "\"50 °\" is an angle | hertz, as `20 kHz`, `1.5 MHz`");
    assert_eq!(
        error("4.7 furlongs", Voltage),
        "\"4.7 furlongs\" ends in \"furlongs\", which is no unit known here | volts, as `12 V`, `0.4 V`, `20 mV`"
    );
}

#[test]
fn a_missing_unit_is_not_guessed() {
    assert_eq!(error("12", Voltage), "\"12\" has no unit | volts, as `12 V`, `0.4 V`, `20 mV`");
    assert_eq!(error("25", Temperature), "\"25\" has no unit | degrees Celsius or kelvins, as `25 °C`, `298.15 K`");
    assert_eq!(error("0", Temperature), "\"0\" has no unit | degrees Celsius or kelvins, as `25 °C`, `298.15 K`");
    assert_eq!(error("90", Level), "\"90\" has no unit | dB, or a plain ratio with its unit, as `90 dB`, `2 V/V`");
    assert_eq!(error("0.1", Fraction), "\"0.1\" has no unit | per cent or ppm, as `0.1 %`, `50 ppm`");
    assert_eq!(
        error("100", Capacitance),
        "\"100\" has neither prefix nor unit: pF, nF and µF are all usual | farads, as `3p3`, `100n`, `4.7 µF`"
    );
    assert_eq!(error("20k", Frequency), "\"20k\" has a prefix but no unit | hertz, as `20 kHz`, `1.5 MHz` | 20 kHz");
    assert_eq!(
        error("25 C", Temperature),
        "\"25 C\" has the unit \"C\", which is none of temperature | degrees Celsius or kelvins, as `25 °C`, `298.15 K` | 25 °C"
    );
    assert_eq!(
        error("4k7", Frequency),
        "\"4k7\" has a letter for its decimal point; only components are written so | hertz, as `20 kHz`, `1.5 MHz` | 4.7 kHz"
    );
}

#[test]
fn milli_and_mega_are_never_confused() {
    let farads = "farads, as `3p3`, `100n`, `4.7 µF`";
    assert_eq!(
        error("4M", Capacitance),
        format!("\"4M\": `M` is mega, and no capacitor is that large; `m` is milli, `µ` micro | {farads}")
    );
    assert_eq!(
        error("4M7", Capacitance),
        format!("\"4M7\": `M` is mega, and no capacitor is that large; `m` is milli, `µ` micro | {farads}")
    );
    assert_eq!(
        error("10m", Resistance),
        "\"10m\": `m` is milli, and milliohms are written out; `M` is mega | `10 mΩ` for milliohms, `10M` for megohms"
    );
    assert_eq!(
        error("m47", Resistance),
        "\"m47\": `m` is milli, and milliohms are written out; `M` is mega | `10 mΩ` for milliohms, `10M` for megohms"
    );
    assert_eq!(error("20 mhz", Frequency), "\"20 mhz\": \"mhz\" could be mHz or MHz | hertz, as `20 kHz`, `1.5 MHz`");
    assert_eq!(
        error("20 khz", Frequency),
        "\"20 khz\" ends in \"khz\", which is no unit; case matters | hertz, as `20 kHz`, `1.5 MHz` | 20 kHz"
    );
    assert_eq!(
        error("12 v", Voltage),
        "\"12 v\" ends in \"v\", which is no unit; case matters | volts, as `12 V`, `0.4 V`, `20 mV` | 12 V"
    );
}

#[test]
fn what_could_be_two_numbers_is_an_error() {
    let separators = "has a thousands separator, which could be a decimal mark | digits without separators and one decimal point or comma; ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`";
    for text in ["1,000,000", "1.000,5", "1 000", "1'000", "1_000", "1\u{a0}000 Ω", "1,000.5"] {
        assert_eq!(error(text, Resistance), format!("\"{text}\" {separators}"));
    }
    assert_eq!(error("1,000", Resistance), "\"1,000\" could be 1.000 or 1000 | ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`");
    assert_eq!(error("4.7k7", Resistance), "\"4.7k7\" has two decimal marks | ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`");
    assert_eq!(error("12 V 5 %", Voltage), "\"12 V 5 %\" holds more than one number | volts, as `12 V`, `0.4 V`, `20 mV`");
    assert_eq!(
        error("–12 V", Voltage),
        "\"–12 V\" begins with a dash, which is no minus sign | volts, as `12 V`, `0.4 V`, `20 mV` | -12 V"
    );
}

#[test]
fn what_is_no_usable_number_is_an_error() {
    let volts = "volts, as `12 V`, `0.4 V`, `20 mV`";
    assert_eq!(error("", Voltage), format!("nothing was given | {volts}"));
    assert_eq!(error("NaN", Voltage), format!("\"NaN\" does not begin with a number | {volts}"));
    assert_eq!(error("inf", Voltage), format!("\"inf\" does not begin with a number | {volts}"));
    assert_eq!(error("-", Voltage), format!("\"-\" does not begin with a number | {volts}"));
    assert_eq!(error(".", Voltage), format!("\".\" does not begin with a number | {volts}"));
    assert_eq!(error("1e400 V", Voltage), format!("\"1e400 V\" is too large to work with | {volts}"));
    assert_eq!(error("1e99999999999999999999 V", Voltage), format!("\"1e99999999999999999999 V\" is too large to work with | {volts}"));
    assert_eq!(error("1e-400 V", Voltage), format!("\"1e-400 V\" is too small to work with | {volts}"));
    assert_eq!(error("-300 °C", Temperature), "\"-300 °C\" lies below absolute zero | degrees Celsius or kelvins, as `25 °C`, `298.15 K`");
    assert_eq!(
        error("-2 V/V", Level),
        "\"-2 V/V\" is not above zero, and a ratio must be | dB, or a plain ratio with its unit, as `90 dB`, `2 V/V`"
    );
}

#[test]
fn values_come_out_with_the_prefix_that_fits() {
    let cases = [
        (512e3, Frequency, 3, "512 kHz"),
        (-13.2, Voltage, 3, "−13.2 V"),
        (999.96, Frequency, 3, "1.00 kHz"),
        (999.4e-9, Capacitance, 3, "999 nF"),
        (9e-9, VoltageDensity, 2, "9.0 nV/√Hz"),
        (20e6, SlewRate, 3, "20.0 V/µs"),
        (4.5e5, SlewRate, 2, "450 mV/µs"),
        (91e3, Resistance, 2, "91 kΩ"),
        (-0.0012, Fraction, 2, "−0.12 %"),
        (0.02, Fraction, 2, "2.0 %"),
        (12e-6, Fraction, 2, "12 ppm"),
        (0.0, Voltage, 3, "0 V"),
        (-0.0, Voltage, 3, "0 V"),
        (20.36, Gain, 3, "20.4"),
        (-10.0, Gain, 3, "−10.0"),
        (200e3, Gain, 3, "200000"),
        (50e-6, FractionDrift, 2, "50 ppm/K"),
        (120.0, ThermalResistance, 3, "120 K/W"),
        (16.23, Bits, 3, "16.2 bits"),
        (5120.0, Frequency, 2, "5.1 kHz"),
        (512.0, Frequency, 2, "510 Hz"),
        (1e-21, Voltage, 2, "0.0010 aV"),
        (1e15, Resistance, 3, "1000 TΩ"),
        (1e30, Number, 3, "1.00e30"),
        (1e-9, Number, 2, "1.0e−9"),
        (100e-12, Charge, 3, "100 pC"),
        (-2.5e-6, Charge, 2, "−2.5 µC"),
        (5e-6, Current, 2, "5.0 µA"),
        (-10e9, VoltsPerCoulomb, 3, "−10.0 GV/C"),
        (999.96e6, VoltsPerCoulomb, 3, "1.00 GV/C"),
        (1.5e15, VoltsPerCoulomb, 3, "1500 TV/C"),
        (298.15, Temperature, 3, "25.0 °C"),
        (233.15, Temperature, 3, "−40.0 °C"),
        (273.15, Temperature, 3, "0 °C"),
    ];
    for (value, d, digits, expected) in cases {
        assert_eq!(format(value, d, digits), expected, "{value:e}");
    }
    // 10^5.5 is 110 dB, π/4 is 45°: by definition of both.
    assert_eq!(format(316_227.766_016_837_94, Level, 3), "110 dB");
    assert_eq!(format(1.0, Level, 3), "0 dB");
    assert_eq!(format(std::f64::consts::FRAC_PI_4, Angle, 3), "45.0 °");
}

#[test]
fn what_is_no_number_comes_out_as_a_word() {
    for d in DIMENSIONS {
        assert_eq!(format(f64::INFINITY, d, 3), "unlimited");
        for text in [format(f64::NAN, d, 3), full(f64::NAN, d), code(f64::NAN, d), spoken(f64::NAN, d)] {
            assert_eq!(text, "undetermined");
        }
        assert_eq!(format(f64::NEG_INFINITY, d, 3), "−unlimited");
    }
    assert_eq!(format(0.0, Level, 3), "−unlimited");
}

#[test]
fn values_can_be_heard() {
    assert_eq!(spoken(4700.0, Resistance), "4.7 kilohms");
    assert_eq!(spoken(1e6, Resistance), "1 megohm");
    assert_eq!(spoken(100e-9, Capacitance), "100 nanofarads");
    assert_eq!(spoken(-12.0, Voltage), "minus 12 volts");
    assert_eq!(spoken(20e6, SlewRate), "20 volts per microsecond");
    assert_eq!(spoken(9e-9, VoltageDensity), "9 nanovolts per root hertz");
    assert_eq!(spoken(298.15, Temperature), "25 degrees Celsius");
    assert_eq!(spoken(100e-12, Charge), "100 picocoulombs");
    assert_eq!(spoken(-10e9, VoltsPerCoulomb), "minus 10 gigavolts per coulomb");
    assert_eq!(spoken(20.4, Gain), "20.4");
    assert_eq!(spoken(f64::INFINITY, Level), "unlimited");
}

/// A small generator with a fixed seed (xorshift, Marsaglia 2003): the same cases on every machine.
struct Draw(u64);

impl Draw {
    fn next(&mut self) -> u64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        self.0
    }

    /// Any double between about 1e-15 and 1e15, all bits of its fraction in use.
    fn value(&mut self) -> f64 {
        let exponent = 1023 - 50 + self.next() % 100;
        f64::from_bits((exponent << 52) | (self.next() >> 12))
    }
}

#[test]
fn a_printed_value_reads_back_as_the_same_bits() {
    let mut draw = Draw(0x5eed);
    for i in 0..20_000 {
        let v = draw.value();
        for d in [Resistance, Capacitance] {
            let text = code(v, d);
            assert_eq!(value(&text, d).to_bits(), v.to_bits(), "draw {i}: {text}");
        }
        let d = DIMENSIONS[i % DIMENSIONS.len()];
        let signed = if i % 2 == 0 || matches!(d, Level | Temperature) { v } else { -v };
        let text = full(signed, d);
        assert_eq!(value(&text, d).to_bits(), signed.to_bits(), "draw {i}: {d:?} {text}");
    }
}

#[test]
fn a_rounded_value_reads_back_within_half_of_its_last_digit() {
    let mut draw = Draw(0xbeef);
    for i in 0..20_000 {
        let v = draw.value();
        let d = [Voltage, Frequency, SlewRate, Resistance, VoltageDensity, Gain, ThermalResistance, FractionDrift, Charge, VoltsPerCoulomb]
            [i % 10];
        let text = format(v, d, 4);
        assert!((value(&text, d) / v - 1.0).abs() <= 0.5e-3, "draw {i}: {v:e} {text}");
    }
}

#[test]
fn hostile_text_is_refused_and_nothing_panics() {
    let mut draw = Draw(0xbad);
    let alphabet: Vec<char> = "0123456789.,-+−±eEkKMmµuΩVRF/√Hz°C% '_\u{a0}\u{0}\"€𝟜".chars().collect();
    for _ in 0..4_000 {
        let n = draw.next() % 9;
        let text: String = (0..n).map(|_| alphabet[usize::try_from(draw.next() % 1000).unwrap() % alphabet.len()]).collect();
        for d in DIMENSIONS {
            match parse(&text, d) {
                Ok(v) => assert!(v.is_finite()),
                Err(t) => assert!(text.get(t.range).is_some()),
            }
            let _ = stageleaf_note::parse_span(&text, d);
            let _ = stageleaf_note::parse_toleranced(&text, d);
            let _ = stageleaf_note::parse_limit(&text, d, 0.1);
        }
        let _ = stageleaf_note::parse_query(&text);
    }
    assert!(parse(&"9".repeat(1_000_000), Resistance).is_err());
}
