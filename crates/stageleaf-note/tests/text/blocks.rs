//! Stage blocks: what is read, what is refused and in which words, what a rewrite keeps.
#![expect(clippy::float_cmp, reason = "a value and its text have one nearest double")]

use crate::common::{self, BLOCK, problems, read};
use stageleaf_math::{
    kind::Kind,
    limit::{Bound, Thin},
    stage::{Isolation, Source},
};
use stageleaf_note::{Settings, limit_text, query_text, read_settings};

#[test]
fn a_whole_block_is_read() {
    let block = read(BLOCK).unwrap_or_else(|p| panic!("{}", common::written(&p)));
    let stage = &block.stage;
    assert_eq!((stage.kind, stage.name.as_str(), stage.part.name.as_str()), (Kind::NonInverting, "Hydrophone line amplifier", "Alder 10"));
    assert_eq!(stage.isolation, Isolation::OutsideLoop);
    let rf = stage.component("Rf").unwrap();
    assert_eq!((rf.nominal, rf.minus, rf.plus, rf.drift), (91e3, 0.01, 0.01, 50e-6));
    assert_eq!(stage.component("Cf").unwrap().nominal, 3.3e-12);
    assert_eq!(stage.component("Riso").unwrap().nominal, 47.0);
    let supply = stage.supply.unwrap();
    assert_eq!((supply.positive.nominal, supply.negative.nominal), (12.0, -12.0));
    assert!((supply.positive.high - 12.6).abs() < 1e-12 && (supply.negative.low + 12.6).abs() < 1e-12);
    assert!(matches!(stage.source(0), Some(Source::Resistive { resistance }) if resistance.nominal == 600.0));
    let signal = stage.signal().unwrap();
    assert_eq!((signal.peak, signal.frequency, signal.dc), (0.4, Some(20e3), 0.0));
    assert_eq!(stage.load.capacitance.unwrap().nominal, 1e-9);
    let ambient = stage.ambient.unwrap().range;
    assert!((ambient.low - 253.15).abs() < 1e-9 && (ambient.nominal - 288.15).abs() < 1e-9);
    assert_eq!(stage.band.unwrap().to, 20e3);
    assert_eq!(stage.board.inverting_node.unwrap().nominal, 2e-12);
    let texts: Vec<String> = stage
        .limits
        .iter()
        .map(|l| format!("{}: {}", query_text(l.query), limit_text(l, l.query.figure.dimension_in(stage.kind))))
        .collect();
    assert_eq!(
        texts,
        [
            "gain_at_signal: between 19.788 and 21.012",
            "bandwidth: at least 300 kHz",
            "phase_margin: at least 50 °",
            "output_noise: at most 120 µV",
            "clip_margin: at least 500 mV, thin below 1 V",
            "gain_at 2 MHz: report",
        ]
    );
    assert_eq!(stage.limits[4].thin, Thin::Distance(0.5));
    assert_eq!(block.measured[0].value.nominal, 20.31);
    assert_eq!((block.measured[0].unit.as_deref(), block.measured[0].temperature), (Some("unit 3"), Some(296.15)));
}

#[test]
fn every_value_knows_its_place() {
    let block = read(BLOCK).unwrap();
    for field in &block.fields {
        assert_eq!(&block.text[field.span.clone()], field.text, "{}", field.path);
    }
    let rf = block.field("components.Rf").unwrap();
    assert_eq!((rf.text.as_str(), rf.line, rf.column), ("91k 1% 50ppm", 20, 7));
    assert!(block.field("limits.gain_at 2 MHz").is_some() && block.field("measured.gain.at.temperature").is_some());
    assert!(block.fields.is_sorted_by_key(|f| f.span.start));
}

#[test]
fn a_rewrite_changes_one_value_and_nothing_else() {
    let block = read(BLOCK).unwrap();
    assert_eq!(block.rewrite("components.Rf", "100k 1%"), BLOCK.replace("91k 1% 50ppm", "100k 1%"));
    assert_eq!(block.rewrite("components.Riso", "51"), BLOCK.replace("Riso = 47", "Riso = \"51\""));
    assert_eq!(block.rewrite("limits.gain_at 2 MHz", "at least 3"), BLOCK.replace("\"report\"", "\"at least 3\""));
    assert_eq!(block.rewrite("part", "a\"b\\\n]"), BLOCK.replace("\"alder-10\"", "\"a\\\"b\\\\\\n]\""));
}

#[test]
fn a_rewrite_adds_what_is_not_there() {
    let block = read(BLOCK).unwrap();
    assert_eq!(block.rewrite("components.Rser", "1k"), BLOCK.replace("Riso = 47\n", "Riso = 47\nRser = \"1k\"\n"));
    assert_eq!(
        block.rewrite("limits.phase_at 1 MHz", "report"),
        BLOCK.replace("= \"report\"\n", "= \"report\"\n\"phase_at 1 MHz\" = \"report\"\n")
    );
    let short = "stage = \"follower\"\nname = \"B\"\npart = \"alder-10\"";
    let block = read(short).unwrap();
    assert_eq!(block.rewrite("isolation", "inside"), format!("{short}\nisolation = \"inside\"\n"));
    assert_eq!(block.rewrite("load.capacitance", "1n"), format!("{short}\n\n[load]\ncapacitance = \"1n\"\n"));
    let inline = format!("{short}\nload = {{ resistance = \"2k\" }} # cable\nsource.resistance = \"50\"\n");
    let block = read(&inline).unwrap();
    assert_eq!(block.rewrite("load.capacitance", "1n"), inline.replace("\"2k\" }", "\"2k\", capacitance = \"1n\" }"));
    assert_eq!(block.rewrite("source.kind", "resistive"), format!("{inline}source.kind = \"resistive\"\n"));
}

#[test]
fn a_value_can_be_taken_out() {
    let block = read(BLOCK).unwrap();
    assert_eq!(block.without("components.Cf"), BLOCK.replace("Cf = \"3p3 5%\"\n", ""));
    assert_eq!(block.without("measured.gain.unit"), BLOCK);
    assert_eq!(block.without("components.Rser"), BLOCK);
}

/// A block that is right, with one line changed.
fn with(old: &str, new: &str) -> String {
    assert_eq!(BLOCK.matches(old).count(), 1, "{old}");
    problems(&BLOCK.replace(old, new))
}

/// The block with a converter of these lines.
fn converter(lines: &str) -> String {
    BLOCK.replace("[ambient]", &format!("[converter]\n{lines}\n\n[ambient]"))
}

#[test]
fn a_converter_is_read() {
    let block = read(&converter(
        "full_scale = \"-2.5 V to 2.5 V\"\nbits = 16\nnoise = \"40 µV\"\nsample_capacitance = \"30p 20%\"\nswitch_resistance = \"150\"\n\
         acquisition_time = \"1.5 µs\"\nseries_resistance = \"100 1%\"\nshunt_capacitance = \"1n 5%\"",
    ));
    let block = block.unwrap_or_else(|p| panic!("{}", common::written(&p)));
    let c = block.stage.converter;
    assert_eq!((c.full_scale, c.bits, c.noise, c.acquisition_time), (Some([-2.5, 2.5]), Some(16.0), Some(40e-6), Some(1.5e-6)));
    let part = |value: Option<stageleaf_math::stage::Toleranced>| value.map(|v| (v.nominal, v.plus)).unwrap();
    assert_eq!((part(c.sample_capacitance), part(c.shunt_capacitance)), ((30e-12, 0.2), (1e-9, 0.05)));
    assert_eq!((part(c.switch_resistance), part(c.series_resistance)), ((150.0, 0.0), (100.0, 0.01)));
    let changed = block.rewrite("converter.shunt_capacitance", "2n2 5%");
    assert_eq!(changed, block.text.replace("shunt_capacitance = \"1n 5%\"", "shunt_capacitance = \"2n2 5%\""));
    assert_eq!(block.without("converter.noise"), block.text.replace("noise = \"40 µV\"\n", ""));
    // Every key may be left out.
    assert_eq!(read(&converter("")).unwrap().stage.converter, stageleaf_math::stage::Converter::default());
}

#[test]
fn a_converter_that_cannot_be() {
    let first = |lines: &str| {
        let text = problems(&converter(lines));
        let lines: Vec<&str> = text.lines().collect();
        format!("{}\n{}", lines[0].split_once(": ").unwrap().1, lines[3..].join("\n"))
    };
    assert_eq!(
        first("full_scale = \"4.096 V\""),
        "`full_scale` takes a voltage; \"4.096 V\" does not say where the input range begins and ends\n\
         allowed: both ends of the input range, as `0 V to 4.096 V`, `-2.5 V to 2.5 V`\n\
         try: full_scale = \"0 V to 4.096 V\""
    );
    assert_eq!(
        first("full_scale = \"1 V to 1 V\""),
        "`full_scale` takes a voltage; \"1 V to 1 V\" is no range\nallowed: both ends of the input range, as `0 V to 4.096 V`, `-2.5 V to 2.5 V`"
    );
    for bits in ["\"12.5\"", "0", "64", "-8"] {
        let shown = bits.trim_matches('"');
        assert_eq!(
            first(&format!("bits = {bits}")),
            format!("`bits` takes a number; \"{shown}\" is no number of bits\nallowed: a whole number from 1 to 32")
        );
    }
    assert_eq!(
        first("sample_capacitance = \"0 F\""),
        "`sample_capacitance` takes a capacitance; \"0 F\" is not above zero\nallowed: farads, as `3p3`, `100n`, `4.7 µF`"
    );
    assert_eq!(
        first("acquisition_time = \"2 V\""),
        "`acquisition_time` takes a time; \"2 V\" is a voltage\nallowed: seconds, as `2 µs`, `15 ms`"
    );
    assert!(first("series_resistence = \"100\"").starts_with("[converter] has no key `series_resistence`\n"));
}

#[test]
fn a_signal_may_stand_still() {
    let still = BLOCK.replace("peak = \"0.4 V\"", "dc = \"-0.2 V\"").replace("frequency = \"20 kHz\"\n", "");
    let signal = read(&still).unwrap_or_else(|p| panic!("{}", common::written(&p))).stage.signal().unwrap();
    assert_eq!((signal.peak, signal.dc, signal.frequency), (0.0, -0.2, None));
    assert_eq!(
        problems(&still.replace("dc = \"-0.2 V\"", "dc = \"-0.2 V\"\nwaveform = \"sine\"")),
        r#"notes/a.md:31:1: `waveform` says nothing of a signal without an amplitude
  31 | waveform = "sine"
     | ^^^^^^^^
allowed: `peak`, `peak_to_peak`, `rms` or `range` beside it"#
    );
}

#[test]
fn ripple_says_what_it_counts() {
    let ripple = |text: &str| {
        let block = BLOCK.replace("[components]", &format!("ripple = \"{text}\"\nripple_frequency = \"100 kHz\"\n\n[components]"));
        read(&block).map(|block| block.stage.supply.unwrap().ripple.unwrap())
    };
    for (text, peak) in [("20 mV peak to peak", 0.01), ("20mV p-p", 0.01), ("10 mV peak", 0.01), ("0 V peak-to-peak", 0.0)] {
        let read = ripple(text).unwrap_or_else(|p| panic!("{}", common::written(&p)));
        assert_eq!((read.peak, read.frequency), (peak, 1e5), "{text}");
    }
    let refused =
        |text: &str| common::written(&ripple(text).expect_err(text)).lines().next().unwrap().split_once(": ").unwrap().1.to_owned();
    assert_eq!(refused("20 mV"), "`ripple` takes a voltage; \"20 mV\" does not say whether it is a peak or peak to peak");
    assert_eq!(refused("20 mΩ peak"), "`ripple` takes a voltage; \"20 mΩ\" is a resistance");
    assert_eq!(refused("-20 mV peak"), "`ripple` takes a voltage; \"-20 mV\" is below zero");
    assert_eq!(refused("peak"), "`ripple` takes a voltage; nothing was given");
}

#[test]
fn ripple_and_its_frequency_stand_together() {
    let with = |line: &str| problems(&BLOCK.replace("[components]", &format!("{line}\n\n[components]")));
    assert_eq!(
        with("ripple = \"20 mV p-p\""),
        "notes/a.md:19:1: `ripple` needs `ripple_frequency`, which is not there\n  19 | ripple = \"20 mV p-p\"\n     | ^^^^^^\nallowed: `ripple_frequency`, as `100 Hz`, `300 kHz`"
    );
    assert_eq!(
        with("ripple_frequency = \"100 Hz\""),
        "notes/a.md:19:1: `ripple_frequency` needs `ripple`, which is not there\n  19 | ripple_frequency = \"100 Hz\"\n     | ^^^^^^^^^^^^^^^^\nallowed: `ripple`, as `20 mV peak to peak`"
    );
    let block = read(&BLOCK.replace("[components]", "ripple = \"20 mV p-p\"\nripple_frequency = \"1 kHz\"\n\n[components]")).unwrap();
    assert_eq!(block.rewrite("supply.ripple", "5 mV peak"), block.text.replace("20 mV p-p", "5 mV peak"));
}

#[test]
fn a_component_with_a_wrong_unit() {
    assert_eq!(
        with("Rf = \"91k 1% 50ppm\"", "Rf = \"91k V\""),
        r#"notes/a.md:20:6: `Rf` takes a resistance; "91k V" is a voltage
  20 | Rf = "91k V"
     |      ^^^^^^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`; then tolerance and drift, as `1% 50ppm`
try: Rf = "91k""#
    );
}

#[test]
fn an_unknown_figure() {
    assert_eq!(
        with("phase_margin ", "phase_margn "),
        r#"notes/a.md:50:1: no figure is called `phase_margn`
  50 | phase_margn   = "at least 50 °"
     | ^^^^^^^^^^^
allowed: a figure id, with its frequency where it takes one (`gain_at 20 kHz`)
try: phase_margin"#
    );
    assert_eq!(
        with("\"gain_at 2 MHz\"", "\"gain_at 2 MHx\""),
        r#"notes/a.md:53:12: `gain_at` takes a frequency; "2 MHx" ends in "MHx", which is no unit known here
  53 | "gain_at 2 MHx" = "report"
     |            ^^^
allowed: hertz, as `20 kHz`, `1.5 MHz`"#
    );
}

#[test]
fn unknown_keys_tables_components_and_kinds() {
    assert_eq!(
        with("[band]", "[bnd]"),
        r#"notes/a.md:40:2: a stage block has no key `bnd`
  40 | [bnd]
     |  ^^^
allowed: `stage`, `name`, `part`, `isolation`, `parts`, `components`, `supply`, `source`, `signal`, `reference`, `load`, `converter`, `ambient`, `band`, `board`, `limits`, `measured`
try: band"#
    );
    assert_eq!(
        with("Cf = ", "Cff = "),
        r#"notes/a.md:22:1: a non-inverting stage has no component `Cff`
  22 | Cff = "3p3 5%"
     | ^^^
allowed: `Rf`, `Rg`, `Cf`, `Rser`, `Cshunt`, `Riso`, `Rsn`, `Csn`, `Rng`, `Cng`
try: Cf"#
    );
    assert_eq!(
        with("resistance = \"600\"", "resistence = \"600\""),
        r#"notes/a.md:25:2: [source] has no `resistance`
  25 | [source]
     |  ^^^^^^
allowed: ohms, as `600`, `2k 5%`; `0` for an ideal source
notes/a.md:27:1: [source] has no key `resistence`
  27 | resistence = "600"
     | ^^^^^^^^^^
allowed: `kind`, `resistance`, `capacitance`
try: resistance"#
    );
    assert_eq!(
        with("\"non-inverting\"", "\"non-invertng\""),
        r#"notes/a.md:10:9: no stage kind is called "non-invertng"
  10 | stage = "non-invertng"
     |         ^^^^^^^^^^^^^^
allowed: `follower`, `non-inverting`, `inverting`, `summing`, `difference`, `instrumentation`, `transimpedance`, `charge`, `integrator`, `differentiator`, `scale-and-shift`, `ac-non-inverting`, `ac-inverting`, `sallen-key-low-pass`, `sallen-key-high-pass`, `multiple-feedback-low-pass`, `multiple-feedback-band-pass`, `comparator-inverting`, `comparator-non-inverting`
try: stage = "non-inverting""#
    );
    assert_eq!(
        with("\"resistive\"", "\"photodiode\""),
        r#"notes/a.md:26:8: `kind` cannot be "photodiode"
  26 | kind = "photodiode"
     |        ^^^^^^^^^^^^
allowed: `resistive`, `capacitive`"#
    );
}

#[test]
fn what_is_missing_is_named() {
    assert_eq!(
        with("Rg = \"4k7 1% 50ppm\"\n", ""),
        r#"notes/a.md:19:2: `Rg` is missing: a non-inverting stage has its resistor from the inverting input to ground
  19 | [components]
     |  ^^^^^^^^^^
allowed: `Rg` under [components], with its value as `91k 1% 50ppm`"#
    );
    assert_eq!(
        with("negative = \"-12 V ± 5 %\"\n", ""),
        r#"notes/a.md:15:2: [supply] has no `negative`
  15 | [supply]
     |  ^^^^^^
allowed: volts against the stage's ground, as `-12 V ± 5 %`; `0 V` for a single supply"#
    );
    assert_eq!(
        with("Riso = 47", "Riso = 47\nRsn = \"47\""),
        r#"notes/a.md:24:1: `Rsn` needs `Csn`, which is not there
  24 | Rsn = "47"
     | ^^^
allowed: `Rsn` (snubber resistor from the output, in series with `Csn`) and `Csn` together"#
    );
    assert_eq!(
        with("Riso = 47\n", ""),
        r#"notes/a.md:13:1: `isolation` says where `Riso` stands, and there is no `Riso`
  13 | isolation = "outside"
     | ^^^^^^^^^
allowed: `Riso` under [components]"#
    );
    assert_eq!(
        problems(""),
        "notes/a.md:10:1: `stage` is missing
  10 | 
     | ^
allowed: `follower`, `non-inverting`, `inverting`, `summing`, `difference`, `instrumentation`, `transimpedance`, `charge`, `integrator`, `differentiator`, `scale-and-shift`, `ac-non-inverting`, `ac-inverting`, `sallen-key-low-pass`, `sallen-key-high-pass`, `multiple-feedback-low-pass`, `multiple-feedback-band-pass`, `comparator-inverting`, `comparator-non-inverting`
notes/a.md:10:1: `name` is missing
  10 | 
     | ^
allowed: a name, once in all notes, as a heading would have it
notes/a.md:10:1: `part` is missing
  10 | 
     | ^
allowed: on the shelf: `alder-10`, `birch-2`"
    );
}

#[test]
fn values_that_a_component_cannot_have() {
    let row = |given: &str, message: &str| {
        let carets = "^".repeat(given.chars().count() + 2);
        format!(
            "notes/a.md:20:6: `Rf` takes a resistance; {message}\n  20 | Rf = \"{given}\"\n     |      {carets}\nallowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`"
        )
    };
    assert_eq!(with("\"91k 1% 50ppm\"", "\"0\""), row("0", "\"0\" is not above zero"));
    assert_eq!(with("\"91k 1% 50ppm\"", "\"-91k\""), row("-91k", "\"-91k\" is not above zero"));
    let then = "; then tolerance and drift, as `1% 50ppm`";
    assert_eq!(with("\"91k 1% 50ppm\"", "\"NaN\""), row("NaN", "\"NaN\" does not begin with a number") + then);
    assert_eq!(with("\"91k 1% 50ppm\"", "\"1e400\""), row("1e400", "\"1e400\" is too large to work with") + then);
    assert_eq!(
        with("\"91k 1% 50ppm\"", "\"91k 100%\""),
        row("91k 100%", "\"91k 100%\" could become zero: its tolerance is 100 % or more") + then
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "nan"),
        "notes/a.md:20:6: `Rf` takes a resistance; \"nan\" does not begin with a number
  20 | Rf = nan
     |      ^^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`; then tolerance and drift, as `1% 50ppm`"
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "\"91k 1\""),
        r#"notes/a.md:20:11: `Rf` takes a resistance; "1" has no unit
  20 | Rf = "91k 1"
     |           ^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`; then tolerance and drift, as `1% 50ppm`"#
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "\"91k 1% 2%\""),
        r#"notes/a.md:20:14: `Rf` takes a resistance; "2%" states something a second time
  20 | Rf = "91k 1% 2%"
     |              ^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`; then tolerance and drift, as `1% 50ppm`"#
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "[1]"),
        "notes/a.md:20:6: `Rf` takes text in quotes; a list was given
  20 | Rf = [1]
     |      ^^^"
    );
}

#[test]
fn a_part_that_is_not_on_the_shelf() {
    assert_eq!(
        with("\"alder-10\"", "\"alder10\""),
        r#"notes/a.md:12:9: no part on the shelf is called "alder10"
  12 | part  = "alder10"
     |         ^^^^^^^^^
allowed: on the shelf: `alder-10`, `birch-2`
try: part = "alder-10""#
    );
}

#[test]
fn surroundings_that_contradict_themselves() {
    assert_eq!(
        with("positive = \"12 V ± 5 %\"  ", "positive = \"-15 V ± 5 %\""),
        r#"notes/a.md:16:12: the supply is reversed: `positive` goes down to −15.75 V, `negative` up to −11.4 V
  16 | positive = "-15 V ± 5 %"        # bench supply
     |            ^^^^^^^^^^^^^
allowed: `positive` above `negative` over their whole ranges"#
    );
    assert_eq!(
        with("peak = \"0.4 V\"", "peak = \"0.4 V\"\nrms = \"0.3 V\""),
        r#"notes/a.md:31:1: the amplitude is stated twice, as `peak` and as `rms`
  31 | rms = "0.3 V"
     | ^^^
allowed: exactly one of `peak`, `peak_to_peak`, `rms`, `range`"#
    );
    assert_eq!(
        with("peak = \"0.4 V\"", "rms = \"0.3 V\""),
        r#"notes/a.md:30:1: `rms` does not say how high the peaks are
  30 | rms = "0.3 V"
     | ^^^
allowed: `waveform`, as `sine`, or `crest_factor`, peak over rms"#
    );
    assert_eq!(
        with("peak = \"0.4 V\"\n", ""),
        r#"notes/a.md:29:2: [signal] states no amplitude
  29 | [signal]
     |  ^^^^^^
allowed: exactly one of `peak`, `peak_to_peak`, `rms`, `range`; or `dc` alone"#
    );
    assert_eq!(
        with("from = \"10 Hz\"", "from = \"30 kHz\""),
        r#"notes/a.md:42:8: the band ends where it begins or below
  42 | to   = "20 kHz"
     |        ^^^^^^^^
allowed: `to` above `from`"#
    );
    assert_eq!(
        with("from = \"10 Hz\"", "from = \"0\""),
        r#"notes/a.md:41:8: `from` takes a frequency; "0" is not above zero
  41 | from = "0"
     |        ^^^
allowed: hertz, as `20 kHz`, `1.5 MHz`"#
    );
    assert_eq!(
        with("\"-20 °C to 50 °C\"", "\"50 °C to -20 °C\""),
        r#"notes/a.md:38:9: `range` takes a temperature; "50 °C to -20 °C" runs downwards: its first end is above its second
  38 | range = "50 °C to -20 °C"
     |         ^^^^^^^^^^^^^^^^^
allowed: degrees Celsius or kelvins, as `25 °C`, `298.15 K`
try: range = "-20 °C to 50 °C""#
    );
    assert_eq!(
        with("kind = \"resistive\"", "kind = \"capacitive\"\ncapacitance = \"3n3\""),
        r#"notes/a.md:28:1: a capacitive source has no `resistance`
  28 | resistance = "600"
     | ^^^^^^^^^^
allowed: `capacitance`"#
    );
}

#[test]
fn limits_that_cannot_be_judged() {
    let limits = "`at least X`, `at most X`, `between A and B`, `X ± Y`, `± Y`, `report`; then `, thin below X`, `, thin above X` or `, thin within X`";
    let row = |given: &str, message: &str, end: &str| {
        let carets = "^".repeat(given.chars().count() + 2);
        format!(
            "notes/a.md:49:18: `bandwidth` is a frequency; {message}\n  49 | bandwidth      = \"{given}\"\n     |                  {carets}\nallowed: {limits}{end}"
        )
    };
    let bandwidth = |given: &str| with("\"at least 300 kHz\"", &format!("\"{given}\""));
    assert_eq!(bandwidth("300 kHz"), row("300 kHz", "\"300 kHz\" does not say which way it limits", ""));
    assert_eq!(bandwidth("≥ 300 kHz"), row("≥ 300 kHz", "\"≥ 300 kHz\" is written with a sign", "\ntry: bandwidth = \"at least 300 kHz\""));
    assert_eq!(
        with("bandwidth      = \"at least 300 kHz\"", "junction_temperature = \"± 5 °C\""),
        format!(
            "notes/a.md:49:24: `junction_temperature` is a temperature; \"± 5 °C\" is no limit\n  49 | junction_temperature = \"± 5 °C\"\n     |                        ^^^^^^^^\nallowed: {limits}"
        )
    );
    assert_eq!(bandwidth("high"), row("high", "\"high\" is no limit", ""));
    assert_eq!(
        bandwidth("between 3 MHz and 2 MHz"),
        row("between 3 MHz and 2 MHz", "\"between 3 MHz and 2 MHz\" leaves no room between its ends", "")
    );
    assert_eq!(
        bandwidth("at least 20 mV"),
        r#"notes/a.md:49:28: `bandwidth` is a frequency; "20 mV" is a voltage
  49 | bandwidth      = "at least 20 mV"
     |                            ^^^^^
allowed: hertz, as `20 kHz`, `1.5 MHz`"#
    );
    assert_eq!(
        bandwidth("at least 300 kHz, thin above 350 kHz"),
        format!(
            r#"notes/a.md:49:37: `bandwidth` is a frequency; "thin above 350 kHz" does not go with `at least`
  49 | bandwidth      = "at least 300 kHz, thin above 350 kHz"
     |                                     ^^^^^^^^^^^^^^^^^^
allowed: {limits}
try: bandwidth = "at least 300 kHz, thin below 350 kHz""#
        )
    );
    let zero = with("\"at least 0.5 V, thin below 1 V\"", "\"at least 0 V\"");
    assert_eq!(
        zero,
        format!(
            r#"notes/a.md:52:18: `clip_margin` is a voltage; "at least 0 V": a limit at zero has no scale of its own and must say when it is thin
  52 | clip_margin    = "at least 0 V"
     |                  ^^^^^^^^^^^^^^
allowed: {limits}
try: clip_margin = "at least 0 V, thin within … V""#
        )
    );
    let decibel = with("clip_margin    = \"at least 0.5 V, thin below 1 V\"", "peaking = \"at most 1 dB\"");
    assert_eq!(
        decibel,
        format!(
            r#"notes/a.md:52:11: `peaking` is a ratio in dB; "at most 1 dB": a limit in dB has no scale of its own and must say when it is thin
  52 | peaking = "at most 1 dB"
     |           ^^^^^^^^^^^^^^
allowed: {limits}
try: peaking = "at most 1 dB, thin within … dB""#
        )
    );
    assert_eq!(
        with("\"gain_at 2 MHz\" =", "\"gain_at_signal\" ="),
        r#"notes/a.md:53:1: `gain_at_signal` is given twice
  53 | "gain_at_signal" = "report"
     | ^^^^^^^^^^^^^^^^
allowed: each key and each table once"#
    );
    assert_eq!(
        with("\"gain_at 2 MHz\" =", "\"gain_at 2000 kHz\" = \"report\"\n\"gain_at 2 MHz\" ="),
        r#"notes/a.md:54:1: `gain_at 2 MHz` has a limit already
  54 | "gain_at 2 MHz" = "report"
     | ^^^^^^^^^^^^^^^
allowed: one limit for each figure"#
    );
}

#[test]
fn limits_and_their_thin_distances() {
    let read = |text: &str| {
        read(&BLOCK.replace("clip_margin    = \"at least 0.5 V, thin below 1 V\"", text))
            .unwrap_or_else(|p| panic!("{}", common::written(&p)))
            .stage
            .limits[4]
            .clone()
    };
    assert_eq!(read("gain_error = \"± 0.1 %\"").bound, Bound::Between { low: -0.001, high: 0.001 });
    assert_eq!(read("clip_margin = \"at least 0,5 V\"").thin, Thin::Fraction(0.1));
    assert_eq!(read("clip_margin = \"at least 0,5 V, thin within 0,5 V\"").thin, Thin::Distance(0.5));
    assert_eq!(read("dissipation = \"at most 200 mW, thin above 150 mW\"").thin, Thin::Distance(0.2 - 0.15));
    assert_eq!(read("gain = \"between -20 and -10\"").bound, Bound::Between { low: -20.0, high: -10.0 });
    assert_eq!(read("junction_temperature = \"at most 125 °C, thin within 15 °C\"").thin, Thin::Distance(15.0));
    // 6 dB below a factor of 10^(12/20) is a factor of 10^(6/20): by definition of the decibel.
    let Thin::Distance(by) = read("gain_margin = \"at least 6 dB, thin below 12 dB\"").thin else { panic!("no distance") };
    assert!((by - (3.981_071_705_5 - 1.995_262_315_0)).abs() < 1e-9);
    assert_eq!(read("gain_margin = \"at least 6 dB, thin within 6 dB\"").thin, Thin::Distance(by));
}

#[test]
fn lines_that_are_no_toml() {
    assert_eq!(
        with("\"91k 1% 50ppm\"", "91k"),
        r#"notes/a.md:20:6: "91k" stands without straight quotes
  20 | Rf = 91k
     |      ^^^
allowed: text in double quotes
try: Rf = "91k""#
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "“91k”"),
        r#"notes/a.md:20:6: "“91k”" stands without straight quotes
  20 | Rf = “91k”
     |      ^^^^^
allowed: text in double quotes
try: Rf = "91k""#
    );
    assert_eq!(
        with("\"gain_at 2 MHz\" =", "gain_at 2 MHz ="),
        r#"notes/a.md:53:1: "gain_at 2 MHz" needs quotes as a key
  53 | gain_at 2 MHz = "report"
     | ^^^^^^^^^^^^^
allowed: letters, digits, `-`, `_`; a key with anything else stands in double quotes
try: "gain_at 2 MHz" = "report""#
    );
    assert_eq!(
        with("\"91k 1% 50ppm\"", "\"91k"),
        r#"notes/a.md:20:10: the text has no closing quote
  20 | Rf = "91k
     |          ^
allowed: text in double quotes, on one line"#
    );
    assert_eq!(
        with("[band]", "[band"),
        r#"notes/a.md:40:6: the table's name has no closing bracket
  40 | [band
     |      ^
allowed: `[table]` on a line of its own"#
    );
    assert_eq!(
        with("[board]", "[band]"),
        r#"notes/a.md:44:2: `band` is given twice
  44 | [band]
     |  ^^^^
allowed: each key and each table once
notes/a.md:45:1: [band] has no key `inverting_node`
  45 | inverting_node = "2p"
     | ^^^^^^^^^^^^^^
allowed: `from`, `to`"#
    );
    assert_eq!(
        with("Rf = \"91k 1% 50ppm\"", "Rf \"91k\""),
        r#"notes/a.md:20:4: there is no `=` behind the key
  20 | Rf "91k"
     |    ^
allowed: `key = "value"`, `[table]`, or `# remark`"#
    );
    assert_eq!(
        with("Rf = \"91k 1% 50ppm\"", "Rf = \"91k\" 1%"),
        r#"notes/a.md:20:12: "1%" stands behind the value
  20 | Rf = "91k" 1%
     |            ^^
allowed: one value, then the end of the line or `# remark`"#
    );
}

#[test]
fn every_problem_of_a_block_is_told_at_once() {
    let text = BLOCK
        .replace("\"91k 1% 50ppm\"", "91k")
        .replace("\"2k\"", "\"2 V\"")
        .replace("phase_margin", "phase_margn")
        .replace("\"20 kHz\"", "\"20 mhz\"");
    let problems = read(&text).unwrap_err();
    assert_eq!(problems.iter().map(|p| p.line).collect::<Vec<_>>(), [20, 31, 34, 42, 50], "{}", common::written(&problems));
}

#[test]
fn settings_supply_what_a_block_leaves_out() {
    let settings = read_settings("shelf = \"shelf\"\nthin = \"20 %\"\n[ambient]\ntemperature = \"25 °C ± 10 K\"\n[tolerance]\nresistor = \"1 %\"\n[series]\nresistor = \"E96\"\n", "stageleaf.toml")
        .unwrap_or_else(|p| panic!("{}", common::written(&p)));
    let text =
        "stage = \"follower\"\nname = \"B\"\npart = \"alder-10\"\n[components]\nRf = \"1k\"\n[limits]\nbandwidth = \"at least 1 MHz\"\n";
    let block = stageleaf_note::read_block(text, &stageleaf_note::Place::new("n.md", 1), &common::shelf(), &settings).unwrap();
    assert_eq!(block.stage.component("Rf").unwrap().plus, 0.01);
    assert_eq!(block.stage.limits[0].thin, Thin::Fraction(0.2));
    assert!((block.stage.ambient.unwrap().range.low - 288.15).abs() < 1e-9);
    // Nothing is assumed where nothing is stated.
    let block = read(text).unwrap();
    assert_eq!((block.stage.component("Rf").unwrap().plus, block.stage.ambient), (0.0, Settings::default().ambient));
    let problems = read_settings("thin = \"100 %\"\n[series]\nresistor = \"E25\"\ncoil = \"E3\"\n", "stageleaf.toml").unwrap_err();
    assert_eq!(
        common::written(&problems),
        r#"stageleaf.toml:1:8: `thin` takes a fraction; "100 %" was given
  1 | thin = "100 %"
    |        ^^^^^^^
allowed: from `0 %` to below `100 %`
stageleaf.toml:3:12: `resistor` takes a series; "E25" was given
  3 | resistor = "E25"
    |            ^^^^^
allowed: `E3`, `E6`, `E12`, `E24`, `E48`, `E96`, `E192`
stageleaf.toml:4:1: [series] has no key `coil`
  4 | coil = "E3"
    | ^^^^
allowed: `resistor`, `capacitor`"#
    );
}
