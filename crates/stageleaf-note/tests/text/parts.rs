//! Part files: what is read, what is refused and in which words.

use stageleaf_math::part::{Part, PartFigure, Rating};
use stageleaf_note::read_part;

use crate::common::{ALDER, written};

fn read(text: &str) -> Result<Part, String> {
    read_part(text, "shelf/alder-10.toml").map_err(|p| written(&p))
}

fn with(old: &str, new: &str) -> String {
    assert_eq!(ALDER.matches(old).count(), 1, "{old}");
    read(&ALDER.replace(old, new)).expect_err("the part has a problem")
}

#[test]
fn a_whole_part_is_read() {
    let part = read(ALDER).unwrap_or_else(|p| panic!("{p}"));
    assert_eq!((part.id.as_str(), part.name.as_str(), part.amplifiers), ("alder-10", "Alder 10", Some(1)));
    for figure in PartFigure::ALL {
        assert!(!part.rating(*figure).is_empty(), "{}", figure.id());
    }
    assert_eq!(part.rating(PartFigure::NoiseVoltage), &Rating::typical(4.5e-9));
    assert_eq!((part.rating(PartFigure::SupplySpanMin).max, part.rating(PartFigure::SupplySpanMax).min), (Some(4.5), Some(36.0)));
    assert_eq!((part.rating(PartFigure::Gbw).typ, part.rating(PartFigure::Gbw).min), (Some(10e6), Some(7e6)));
    assert_eq!(part.rating(PartFigure::SupplyCurrent).source.as_deref(), Some("table 6, 25 °C"));
    assert_eq!(part.rating(PartFigure::SlewRise).min, Some(13e6));
    assert_eq!(part.rating(PartFigure::CmrrCorner).typ, Some(2e3));
    assert!((part.rating(PartFigure::OpenLoop).typ.unwrap() - 1e6).abs() < 1e-6);
    assert_eq!(part.poles.as_deref(), Some(&[22e6][..]));
    assert_eq!(part.zeros.iter().map(|z| (z.frequency, z.right_half_plane)).collect::<Vec<_>>(), [(40e6, true), (60e6, false)]);
    let margin = part.phase_margin.unwrap();
    assert_eq!((margin.gain, margin.load_capacitance), (1.0, Some(20e-12)));
    assert_eq!((part.headroom_high.len(), part.headroom_high[1].current, part.headroom_high[1].volts.max), (2, 0.01, Some(1.9)));
    assert_eq!(part.phase_reversal, Some(false));
}

#[test]
fn only_the_name_is_needed_and_an_empty_list_is_a_statement() {
    let part = read("[part]\nname = \"A\"\n[gain]\npoles = []\n").unwrap();
    assert_eq!((part.poles, part.phase_margin.is_none()), (Some(Vec::new()), true));
    assert_eq!(read("\u{feff}[part]\r\nname = \"A\"\r\n").unwrap().poles, None);
    assert_eq!(read("").unwrap_err(), "shelf/alder-10.toml:1:1: the part has no name\n  1 | \n    | ^\nallowed: `[part]` with `name`");
}

#[test]
fn a_wrong_figure_is_named_with_its_place() {
    assert_eq!(
        with("voltage = \"4.5 nV/√Hz\"", "voltage = \"4.5 nV\""),
        r#"shelf/alder-10.toml:49:11: `voltage` takes a voltage noise density; "4.5 nV" is a voltage
  49 | voltage = "4.5 nV"
     |           ^^^^^^^^
allowed: volts per root hertz, as `9 nV/√Hz`, `9 nV/rtHz`"#
    );
    assert_eq!(
        with("min = \"7 MHz\"", "mn = \"7 MHz\""),
        r#"shelf/alder-10.toml:31:25: `gbw` has no key `mn`
  31 | gbw = { typ = "10 MHz", mn = "7 MHz" }
     |                         ^^
allowed: `typ`, `min`, `max`, `source`
try: min"#
    );
    assert_eq!(
        with("min = \"7 MHz\"", "min = \"70 MHz\""),
        r#"shelf/alder-10.toml:31:7: `gbw` is out of order
  31 | gbw = { typ = "10 MHz", min = "70 MHz" }
     |       ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
allowed: `min` not above `typ`, `typ` not above `max`"#
    );
    assert_eq!(
        with("exponent = \"1\"", "exponnt = \"1\""),
        r#"shelf/alder-10.toml:51:1: [noise] has no key `exponnt`
  51 | exponnt = "1"
     | ^^^^^^^
allowed: `current`, `current_corner`, `exponent`, `voltage`, `voltage_corner`
try: exponent"#
    );
    assert_eq!(
        with("[thermal]", "[thrmal]"),
        r#"shelf/alder-10.toml:55:2: a part file has no key `thrmal`
  55 | [thrmal]
     |  ^^^^^^
allowed: `part`, `supply`, `input`, `gain`, `slew`, `output`, `noise`, `thermal`
try: thermal"#
    );
    assert_eq!(
        with("poles = [\"22 MHz\"]", "poles = \"22 MHz\""),
        r#"shelf/alder-10.toml:32:9: `poles` takes frequencies in a list
  32 | poles = "22 MHz"
     |         ^^^^^^^^
allowed: a list of texts, as `["22 MHz"]`; `[]` states that there are none"#
    );
    assert_eq!(
        with("current = \"10 mA\", typ = \"1.4 V\"", "current = \"0 mA\", typ = \"1.4 V\""),
        r#"shelf/alder-10.toml:43:71: the rows of `headroom_high` are out of order
  43 | headroom_high = [ { current = "0 mA", typ = "0.9 V", max = "1.2 V" }, { current = "0 mA", typ = "1.4 V", max = "1.9 V" } ]
     |                                                                       ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
allowed: a list of rows, as `[ { current = "0 mA", typ = "0.9 V" } ]`, by rising current"#
    );
    assert_eq!(
        with("gain = \"1\", ", ""),
        r#"shelf/alder-10.toml:35:1: `phase_margin` has no `gain`
  35 | phase_margin = { value = "62 °", load_resistance = "2k", load_capacitance = "20p" }
     | ^^^^^^^^^^^^
allowed: the noise gain at which it holds, as `1`"#
    );
    assert_eq!(
        with("phase_reversal = false", "phase_reversal = \"no\""),
        r#"shelf/alder-10.toml:27:18: `phase_reversal` takes true or false
  27 | phase_reversal = "no"
     |                  ^^^^
allowed: `true`, `false`, without quotes"#
    );
    assert_eq!(
        with("amplifiers = 1", "amplifiers = 1.5"),
        r#"shelf/alder-10.toml:4:14: `amplifiers` takes a number; "1.5" was given
  4 | amplifiers = 1.5
    |              ^^^
allowed: a whole number from 1 to 16"#
    );
    assert_eq!(
        with("resistance = \"45\"", "resistance = \"-45\""),
        r#"shelf/alder-10.toml:42:14: `resistance` takes a resistance; "-45" is below zero
  42 | resistance = "-45"
     |              ^^^^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`"#
    );
}
