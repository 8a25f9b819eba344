//! What each kind takes beyond what all have: inputs, sources, common mode, reference, further parts; and what it refuses.

use crate::common::{problems, read, written};
use stageleaf_math::{
    dimension::Dimension,
    figure::{Figure, Query},
    kind::Kind,
    stage::{Source, Span, Toleranced},
};
use stageleaf_note::{Block, paths, template::template_for};

/// A block from its lines; the first line is line 10 of its file, `body` begins on line 13.
fn text(kind: &str, body: &str) -> String {
    format!("stage = \"{kind}\"\nname = \"A\"\npart = \"alder-10\"\n{body}")
}

fn block(kind: &str, body: &str) -> Block {
    read(&text(kind, body)).unwrap_or_else(|p| panic!("{}", written(&p)))
}

fn refused(kind: &str, body: &str) -> String {
    problems(&text(kind, body))
}

const SUMMING: &str = "[components]\nRin1 = \"10k\"\nRin2 = \"22k\"\nRin3 = \"47k\"\nRf = \"10k\"\n";
const DIFFERENCE: &str = "[components]\nR1 = \"10k\"\nR2 = \"100k\"\nR3 = \"10k\"\nR4 = \"100k\"\n";
const SHIFT: &str = "[components]\nR1 = \"20k\"\nR2 = \"10k\"\nRf = \"10k\"\nRg = \"20k\"\n";

#[test]
fn every_input_of_a_summing_stage_has_its_signal_and_source() {
    let block = block(
        "summing",
        &format!(
            "{SUMMING}[source.in2]\nresistance = \"600\"\n[source.in3]\nkind = \"capacitive\"\ncapacitance = \"1n\"\n[signal.in3]\nrms = \"1 V\"\nwaveform = \"square\"\n[signal.in1]\npeak = \"0.2 V\"\nfrequency = \"1 kHz\"\n"
        ),
    );
    let stage = &block.stage;
    assert_eq!(stage.source(0), None);
    assert_eq!(stage.source(1), Some(Source::Resistive { resistance: Toleranced::exact(600.0) }));
    assert_eq!(stage.source(2), Some(Source::Capacitive { capacitance: Toleranced::exact(1e-9) }));
    assert_eq!(stage.signal_of(0).map(|s| (s.peak, s.frequency)), Some((0.2, Some(1e3))));
    assert_eq!(stage.signal_of(1), None);
    assert_eq!(stage.signal_of(2).map(|s| s.peak), Some(1.0));
    let paths: Vec<&str> = block.fields.iter().map(|f| f.path.as_str()).filter(|p| p.starts_with('s')).collect();
    assert_eq!(
        paths,
        [
            "stage",
            "source.in2.resistance",
            "source.in3.kind",
            "source.in3.capacitance",
            "signal.in3.rms",
            "signal.in3.waveform",
            "signal.in1.peak",
            "signal.in1.frequency"
        ]
    );
}

#[test]
fn a_difference_has_one_signal_and_a_common_mode() {
    let block = block("difference", &format!("{DIFFERENCE}[signal]\npeak = \"50 mV\"\ncommon_mode = \"2 V to 3 V\"\n"));
    assert_eq!(block.stage.signal().map(|s| s.peak), Some(0.05));
    assert_eq!(block.stage.common_mode, Some(Span { low: 2.0, nominal: 2.5, high: 3.0 }));
    assert!(block.stage.sources.is_empty());
}

#[test]
fn a_bridge_stands_in_both_inputs() {
    let both = block("difference", &format!("{DIFFERENCE}[source]\nkind = \"bridge\"\nresistance = \"350 1%\"\n")).stage;
    let one = Source::Resistive { resistance: Toleranced { minus: 0.01, plus: 0.01, ..Toleranced::exact(350.0) } };
    assert_eq!(both.sources, [Some(one), Some(one)]);
    let apart = block("difference", &format!("{DIFFERENCE}[source.in2]\nresistance = \"1k\"\n")).stage;
    assert_eq!(apart.sources, [None, Some(Source::Resistive { resistance: Toleranced::exact(1e3) })]);
}

#[test]
fn a_photodiode_drives_a_transimpedance_stage_with_amperes() {
    let body = "[components]\nRf = \"1M\"\n[source]\nkind = \"photodiode\"\ncapacitance = \"70p\"\nshunt_resistance = \"500M\"\ndark_current = \"2 nA\"\n[signal]\nrange = \"0 µA to 2 µA\"\n[limits]\ngain = \"-1M ± 2 %\"\ninput_noise = \"at most 5 pA\"\n";
    let stage = block("transimpedance", body).stage;
    let exact = Toleranced::exact;
    assert_eq!(
        stage.source(0),
        Some(Source::Photodiode { capacitance: exact(70e-12), shunt_resistance: Some(exact(500e6)), dark_current: Some(exact(2e-9)) })
    );
    assert_eq!(stage.signal().map(|s| (s.peak, s.dc)), Some((1e-6, 1e-6)));
    // The kind follows from what is stated.
    let body = "[components]\nRf = \"1M\"\n[source]\ncapacitance = \"70p\"\nshunt_resistance = \"500M\"\n";
    assert!(matches!(block("transimpedance", body).stage.source(0), Some(Source::Photodiode { dark_current: None, .. })));
    let body = "[components]\nRf = \"1M\"\n[source]\ncapacitance = \"70p\"\n";
    assert!(matches!(block("transimpedance", body).stage.source(0), Some(Source::Capacitive { .. })));
}

#[test]
fn a_charge_stage_is_driven_with_coulombs_and_judged_in_volts_per_coulomb() {
    let body = "[components]\nCf = \"100p\"\nRf = \"100M\"\n[source]\ncapacitance = \"1n\"\n[signal]\npeak = \"100 pC\"\n[limits]\ngain = \"-10 mV/pC ± 2 %\"\n";
    let stage = block("charge", body).stage;
    assert_eq!(stage.signal().map(|s| s.peak), Some(100e-12));
    let text = stageleaf_note::limit_text(&stage.limits[0], stage.limits[0].query.figure.dimension_in(stage.kind));
    assert_eq!(text, "between −10.2 GV/C and −9.8 GV/C");
}

#[test]
fn a_reference_has_a_voltage_of_either_sign() {
    let stage = block("scale-and-shift", &format!("{SHIFT}[reference]\nvoltage = \"2.5 V 0.1% 10ppm\"\nresistance = 1\n")).stage;
    let reference = stage.reference.unwrap();
    assert_eq!(reference.voltage, Toleranced { minus: 0.001, plus: 0.001, drift: 10e-6, ..Toleranced::exact(2.5) });
    assert_eq!(reference.resistance, Some(Toleranced::exact(1.0)));
    let stage = block("scale-and-shift", &format!("{SHIFT}[reference]\nvoltage = \"-2.5 V ± 25 mV\"\n")).stage;
    let voltage = stage.reference.unwrap().voltage;
    assert_eq!((voltage.nominal, voltage.minus, voltage.plus), (-2.5, 0.01, 0.01));
}

#[test]
fn an_amplifier_may_have_a_part_of_its_own() {
    let body = template_for(Kind::Instrumentation, "A", "alder-10")
        .replace("# [parts]", "[parts]")
        .replace("# A3 = \"alder-10\"", "A3 = \"birch-2\"");
    let block = read(&body).unwrap_or_else(|p| panic!("{}", written(&p)));
    assert_eq!(block.stage.parts.iter().map(|(n, p)| (*n, p.id.as_str())).collect::<Vec<_>>(), [(3, "birch-2")]);
    assert_eq!(block.stage.part_of(0).id, "alder-10");
    assert_eq!(block.field("parts.A3").map(|f| f.text.as_str()), Some("birch-2"));
}

#[test]
fn inputs_that_a_stage_has_not() {
    assert_eq!(
        refused("summing", &format!("{SUMMING}[signal.inn2]\npeak = \"1 V\"\n")),
        "notes/a.md:18:9: a summing stage has no input `inn2`
  18 | [signal.inn2]
     |         ^^^^
allowed: `in1`, `in2`, `in3`
try: in2"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}[signal.in4]\npeak = \"1 V\"\n")),
        "notes/a.md:18:9: `in4` has no input resistor: there is no `Rin4`
  18 | [signal.in4]
     |         ^^^
allowed: `Rin4` under [components]; without it, `in1`, `in2`, `in3`"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}[source.in5]\nresistance = \"1k\"\n")),
        "notes/a.md:18:9: `in5` has no input resistor: there is no `Rin5`
  18 | [source.in5]
     |         ^^^
allowed: `Rin5` under [components]; without it, `in1`, `in2`, `in3`"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}[signal]\npeak = \"1 V\"\nfrequency = \"1 kHz\"\n")),
        "notes/a.md:19:1: `peak` does not say at which input of a summing stage
  19 | peak = \"1 V\"
     | ^^^^
allowed: `[signal.in1]`, `[signal.in2]`, `[signal.in3]`"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}[source]\nresistance = \"1k\"\n")),
        "notes/a.md:19:1: `resistance` does not say at which input of a summing stage
  19 | resistance = \"1k\"
     | ^^^^^^^^^^
allowed: `[source.in1]`, `[source.in2]`, `[source.in3]`"
    );
    assert_eq!(
        refused("integrator", "[components]\nRin = \"1k\"\nCf = \"1n\"\n[signal.in1]\npeak = \"1 V\"\n"),
        "notes/a.md:16:9: there is no [signal.in1]: an integrator has one signal
  16 | [signal.in1]
     |         ^^^
allowed: the same keys under `[signal]`"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}[signal]\nin1 = \"1 V\"\n")),
        "notes/a.md:19:7: `in1` is a table; text was given
  19 | in1 = \"1 V\"
     |       ^^^^^
allowed: `[signal.in1]` on a line of its own, its keys below"
    );
}

#[test]
fn tables_and_keys_of_other_kinds() {
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[signal.in1]\npeak = \"1 V\"\n")),
        "notes/a.md:18:9: there is no [signal.in1]: the signal of a difference stage is the difference in2 − in1
  18 | [signal.in1]
     |         ^^^
allowed: the same keys under `[signal]`"
    );
    assert_eq!(
        refused("follower", "[signal]\npeak = \"1 V\"\ncommon_mode = \"2 V\"\n"),
        "notes/a.md:15:1: a follower has no `common_mode` under [signal]
  15 | common_mode = \"2 V\"
     | ^^^^^^^^^^^
allowed: `peak`, `peak_to_peak`, `rms`, `range`, `frequency`, `dc`, `waveform`, `crest_factor`"
    );
    assert_eq!(
        refused("follower", "[source]\nresistance = \"1k\"\ndark_current = \"2 nA\"\n"),
        "notes/a.md:15:1: a follower has no `dark_current` under [source]
  15 | dark_current = \"2 nA\"
     | ^^^^^^^^^^^^
allowed: `kind`, `resistance`, `capacitance`"
    );
    assert_eq!(
        refused("follower", "[source.in1]\nresistance = \"1k\"\n"),
        "notes/a.md:13:9: there is no [source.in1]: a follower has one input
  13 | [source.in1]
     |         ^^^
allowed: the same keys under `[source]`"
    );
    assert_eq!(
        refused(
            "ac-inverting",
            "[components]\nCin = \"1u\"\nRin = \"1k\"\nRf = \"10k\"\nRb1 = \"1k\"\nRb2 = \"1k\"\n[reference]\nvoltage = \"2.5 V\"\n"
        ),
        "notes/a.md:19:2: an AC-coupled inverting stage takes no [reference]
  19 | [reference]
     |  ^^^^^^^^^
allowed: [reference] in a stage of kind `scale-and-shift`, `comparator-inverting`, `comparator-non-inverting`"
    );
    assert_eq!(
        refused("scale-and-shift", SHIFT),
        "notes/a.md:10:1: [reference] is missing: a scale-and-shift stage takes its offset from it
  10 | stage = \"scale-and-shift\"
     | ^^^^^^^^^^^^^^^^^^^^^^^^^
allowed: `voltage`, as `2.5 V 0.1%`; and its output `resistance` where it counts"
    );
    assert_eq!(
        refused("scale-and-shift", &format!("{SHIFT}[reference]\nresistance = 1\nnoise = \"1 µV\"\n")),
        "notes/a.md:18:2: [reference] has no `voltage`
  18 | [reference]
     |  ^^^^^^^^^
allowed: volts, as `2.5 V 0.1%`
notes/a.md:20:1: [reference] has no key `noise`
  20 | noise = \"1 µV\"
     | ^^^^^
allowed: `voltage`, `resistance`"
    );
    assert_eq!(
        refused("follower", "[parts]\nA1 = \"birch-2\"\n"),
        "notes/a.md:13:2: a follower has one amplifier, whose part is `part`
  13 | [parts]
     |  ^^^^^
allowed: `part` above the tables"
    );
}

#[test]
fn figures_of_amplifiers_and_inputs() {
    let limits = |body: &str, limits: &str| format!("{body}[limits]\n{limits}\n");
    let block = block("summing", &limits(SUMMING, "\"gain from in3\" = \"-0.2128 ± 1 %\"\ngain = \"-1 ± 1 %\""));
    assert_eq!(block.stage.limits[0].query, Query::of(Figure::Gain).from_input("in3"));
    assert_eq!(block.stage.limits[1].query, Query::of(Figure::Gain));
    assert_eq!(
        refused("summing", &limits(SUMMING, "\"gain from in4\" = \"report\"")),
        "notes/a.md:19:19: a summing stage has nothing that `gain from in4` could be
  19 | \"gain from in4\" = \"report\"
     |                   ^^^^^^^^
allowed: `from in2`, `from in3`; or the figure alone
try: gain"
    );
    assert_eq!(
        refused("summing", &limits(SUMMING, "\"phase_margin of A2\" = \"report\"")),
        "notes/a.md:19:24: a summing stage has nothing that `phase_margin of A2` could be
  19 | \"phase_margin of A2\" = \"report\"
     |                        ^^^^^^^^
allowed: `of A1`; or the figure alone
try: phase_margin"
    );
    assert_eq!(
        refused("difference", &limits(DIFFERENCE, "\"gain from in2\" = \"report\"")),
        "notes/a.md:19:19: a difference stage has nothing that `gain from in2` could be
  19 | \"gain from in2\" = \"report\"
     |                   ^^^^^^^^
allowed: the figure alone
try: gain"
    );
}

#[test]
fn parts_of_amplifiers_that_are_not_there() {
    let parts = |line: &str| {
        problems(
            &template_for(Kind::Instrumentation, "A", "alder-10").replace("# [parts] ", "[parts]   ").replace("# A3 = \"alder-10\"", line),
        )
    };
    assert_eq!(
        parts("A4 = \"birch-2\""),
        "notes/a.md:17:1: an instrumentation stage has no amplifier `A4`
  17 | A4 = \"birch-2\"
     | ^^
allowed: `A1`, `A2`, `A3`
try: A1"
    );
    assert_eq!(
        parts("A2 = \"brich-2\""),
        "notes/a.md:17:6: no part on the shelf is called \"brich-2\"
  17 | A2 = \"brich-2\"
     |      ^^^^^^^^^
allowed: on the shelf: `alder-10`, `birch-2`
try: A2 = \"birch-2\""
    );
}

#[test]
fn sources_that_do_not_fit() {
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[source]\nkind = \"resistive\"\nresistance = \"1k\"\n")),
        "notes/a.md:19:8: [source] of a difference stage cannot be of kind \"resistive\"
  19 | kind = \"resistive\"
     |        ^^^^^^^^^^^
allowed: `bridge` for both inputs alike; `resistive` or `capacitive` under `[source.in1]`, `[source.in2]`"
    );
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[source]\nresistance = \"1k\"\n")),
        "notes/a.md:19:1: `resistance` does not say at which input of a difference stage
  19 | resistance = \"1k\"
     | ^^^^^^^^^^
allowed: `kind = \"bridge\"` for both inputs alike, or `[source.in1]`, `[source.in2]`"
    );
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[source]\nkind = \"bridge\"\n[source.in1]\nresistance = \"1k\"\n")),
        "notes/a.md:18:2: [source] has no `resistance`
  18 | [source]
     |  ^^^^^^
allowed: ohms, as `350`, `1k 1%`: the bridge as each of both inputs sees it
notes/a.md:20:9: a bridge is the source of both inputs; `in1` has another
  20 | [source.in1]
     |         ^^^
allowed: either `kind = \"bridge\"` or `[source.in1]`, `[source.in2]`"
    );
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[source]\nkind = \"bridge\"\nresistance = \"1k\"\ncapacitance = \"1n\"\n")),
        "notes/a.md:21:1: a bridge has no `capacitance`
  21 | capacitance = \"1n\"
     | ^^^^^^^^^^^
allowed: `kind`, `resistance`"
    );
    assert_eq!(
        refused("difference", &format!("{DIFFERENCE}[source.in1]\nkind = \"bridge\"\nresistance = \"1k\"\n")),
        "notes/a.md:19:8: `kind` cannot be \"bridge\"
  19 | kind = \"bridge\"
     |        ^^^^^^^^
allowed: `resistive`, `capacitive`"
    );
    assert_eq!(
        refused("transimpedance", "[components]\nRf = \"1M\"\n[source]\nkind = \"photodiode\"\nresistance = \"1G\"\n"),
        "notes/a.md:15:2: [source] has no `capacitance`
  15 | [source]
     |  ^^^^^^
allowed: farads, as `70p 10%`: the junction at the bias that it has here
notes/a.md:17:1: a photodiode has no `resistance`
  17 | resistance = \"1G\"
     | ^^^^^^^^^^
allowed: `capacitance`, `shunt_resistance`, `dark_current`"
    );
    assert_eq!(
        refused("transimpedance", "[components]\nRf = \"1M\"\n[source]\nresistance = 0\n"),
        "notes/a.md:16:14: `resistance` takes a resistance; \"0\" is not above zero
  16 | resistance = 0
     |              ^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`"
    );
    assert_eq!(
        refused("transimpedance", "[components]\nRf = \"1M\"\n[source]\nkind = \"resistive\"\n"),
        "notes/a.md:15:2: [source] has no `resistance`
  15 | [source]
     |  ^^^^^^
allowed: ohms, as `10M`: what stands across the source; leave [source] out for an ideal one"
    );
    assert_eq!(
        refused("charge", "[components]\nCf = \"1n\"\n[source]\nkind = \"bridge\"\n"),
        "notes/a.md:16:8: `kind` cannot be \"bridge\"
  16 | kind = \"bridge\"
     |        ^^^^^^^^
allowed: `photodiode`, `resistive`, `capacitive`"
    );
}

#[test]
fn amplitudes_in_another_unit() {
    assert_eq!(
        refused("transimpedance", "[components]\nRf = \"1M\"\n[signal]\npeak = \"1 V\"\n"),
        "notes/a.md:16:8: `peak` takes a current; \"1 V\" is a voltage
  16 | peak = \"1 V\"
     |        ^^^^^
allowed: amperes, as `25 mA`, `3 pA`"
    );
    assert_eq!(
        refused("charge", "[components]\nCf = \"1n\"\n[signal]\npeak = \"1 nA\"\n"),
        "notes/a.md:16:8: `peak` takes a charge; \"1 nA\" is a current
  16 | peak = \"1 nA\"
     |        ^^^^^^
allowed: coulombs, as `10 pC`"
    );
    assert_eq!(
        refused("inverting", "[components]\nRin = \"1k\"\nRf = \"1k\"\n[signal]\npeak = \"10 pC\"\n"),
        "notes/a.md:17:8: `peak` takes a voltage; \"10 pC\" is a charge
  17 | peak = \"10 pC\"
     |        ^^^^^^^
allowed: volts, as `12 V`, `0.4 V`, `20 mV`"
    );
    assert_eq!(
        refused("charge", "[components]\nCf = \"1n\"\n[limits]\ngain = \"at most 20\"\n"),
        "notes/a.md:16:17: `gain` is a gain in volts per coulomb; \"20\" has no unit
  16 | gain = \"at most 20\"
     |                 ^^
allowed: volts per coulomb, as `-10 GV/C`, `-10 mV/pC`"
    );
}

#[test]
fn input_resistors_are_numbered_without_a_gap() {
    assert_eq!(
        refused("summing", "[components]\nRin1 = \"10k\"\nRin2 = \"10k\"\nRin4 = \"10k\"\nRf = \"10k\"\n"),
        "notes/a.md:16:1: `Rin4` needs `Rin3`, which is not there: inputs are numbered without a gap
  16 | Rin4 = \"10k\"
     | ^^^^
allowed: `Rin1`, `Rin2` and so on up to `Rin4`"
    );
    assert_eq!(
        refused("summing", "[components]\nRin1 = \"10k\"\nRf = \"10k\"\n[signal.in2]\npeak = \"1 V\"\n"),
        "notes/a.md:13:2: `Rin2` is missing: a summing stage has its input resistor of in2
  13 | [components]
     |  ^^^^^^^^^^
allowed: `Rin2` under [components], with its value as `91k 1% 50ppm`"
    );
    assert_eq!(
        refused("summing", &format!("{SUMMING}Rin9 = \"1k\"\n")),
        "notes/a.md:18:1: a summing stage has no component `Rin9`
  18 | Rin9 = \"1k\"
     | ^^^^
allowed: `Rin1`, `Rin2`, `Rin3`, `Rin4`, `Rin5`, `Rin6`, `Rin7`, `Rin8`, `Rf`, `Cf`, `Rp`, `Cp`, `Riso`, `Rsn`, `Csn`, `Rng`, `Cng`
try: Rin1"
    );
    // A resistor whose value cannot be read is there all the same.
    assert_eq!(
        refused("summing", &format!("{}[signal.in3]\npeak = \"1 V\"\n", SUMMING.replace("\"47k\"", "\"47n\""))),
        "notes/a.md:16:8: `Rin3` takes a resistance; \"47n\" is a capacitance
  16 | Rin3 = \"47n\"
     |        ^^^^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`; then tolerance and drift, as `1% 50ppm`"
    );
}

#[test]
fn a_rewrite_finds_the_table_of_its_input() {
    let body = format!(
        "{SUMMING}\n[signal.in1]\npeak = \"1 V\"   # buoy\n\n[signal.in2]\npeak = \"2 V\"\n\n# What it keeps.\n[limits]\nbandwidth = \"at least 1 kHz\"\n"
    );
    let block = block("summing", &body);
    let whole = &block.text;
    assert_eq!(block.rewrite("signal.in2.peak", "3 V"), whole.replace("\"2 V\"", "\"3 V\""));
    assert_eq!(block.rewrite("signal.in1.frequency", "1 kHz"), whole.replace("# buoy\n", "# buoy\nfrequency = \"1 kHz\"\n"));
    assert_eq!(block.rewrite("signal.in3.peak", "3 V"), whole.replace("\"2 V\"\n", "\"2 V\"\n\n[signal.in3]\npeak = \"3 V\"\n"));
    assert_eq!(
        block.rewrite("source.in1.resistance", "50"),
        whole.replace("Rf = \"10k\"\n", "Rf = \"10k\"\n\n[source.in1]\nresistance = \"50\"\n")
    );
    // A remark above a table stays with it.
    assert_eq!(block.rewrite("load.resistance", "2k"), whole.replace("\"2 V\"\n", "\"2 V\"\n\n[load]\nresistance = \"2k\"\n"));
    assert_eq!(block.rewrite("signal.in2.dc", "1 V"), whole.replace("\"2 V\"\n", "\"2 V\"\ndc = \"1 V\"\n"));
    assert_eq!(block.rewrite("supply.positive", "5 V"), whole.replace("[components]", "\n[supply]\npositive = \"5 V\"\n\n[components]"));
    assert_eq!(block.rewrite("measured.gain.value", "5"), format!("{whole}\n[measured]\n\"gain.value\" = \"5\"\n"));
}

#[test]
fn a_rewrite_keeps_the_way_in_which_inputs_are_written() {
    let inline = block("summing", &format!("{SUMMING}[signal]\nin1 = {{ peak = \"1 V\" }}\nin2.peak = \"2 V\"\n"));
    let whole = &inline.text;
    assert_eq!(inline.rewrite("signal.in1.dc", "1 V"), whole.replace("\"1 V\" }", "\"1 V\", dc = \"1 V\" }"));
    assert_eq!(inline.rewrite("signal.in2.dc", "1 V"), format!("{whole}in2.dc = \"1 V\"\n"));
    assert_eq!(inline.rewrite("signal.in2.peak", "3 V"), whole.replace("\"2 V\"", "\"3 V\""));
    let shift = block("scale-and-shift", &format!("{SHIFT}[reference]\nvoltage = \"2.5 V\"\n[load]\nresistance = \"2k\"\n"));
    let whole = &shift.text;
    assert_eq!(shift.rewrite("reference.voltage", "2.048 V 0.1%"), whole.replace("2.5 V", "2.048 V 0.1%"));
    assert_eq!(shift.rewrite("reference.resistance", "1"), whole.replace("\"2.5 V\"\n", "\"2.5 V\"\nresistance = \"1\"\n"));
    assert_eq!(shift.rewrite("source.resistance", "50"), whole.replace("[reference]", "\n[source]\nresistance = \"50\"\n\n[reference]"));
}

#[test]
fn whatever_is_added_reads_back() {
    for kind in Kind::ALL {
        let block = read(&template_for(*kind, "A", "alder-10")).unwrap_or_else(|p| panic!("{}", written(&p)));
        let again = |path: &str, value: &str| {
            let text = block.rewrite(path, value);
            let read = read(&text).unwrap_or_else(|p| panic!("{}: {path}: {}", kind.id(), written(&p)));
            assert_eq!(read.field(path).map(|f| f.text.as_str()), Some(value), "{}: {path}", kind.id());
            assert!(block.fields.iter().all(|f| f.path == path || read.field(&f.path).map(|g| &g.text) == Some(&f.text)));
        };
        for field in &block.fields {
            if paths::dimension(&field.path, *kind).is_some() {
                again(&field.path, &field.text);
            }
        }
        for (path, value) in
            [("load.capacitance", "1n"), ("board.inverting_node", "2p"), ("limits.q", "report"), ("supply.positive", "9 V")]
        {
            again(path, value);
        }
    }
}

#[test]
fn paths_and_what_stands_there() {
    use Dimension::{Capacitance, Charge, Current, Resistance, Voltage};
    let cases = [
        (Kind::Summing, "signal.in8.peak", Some(Voltage)),
        (Kind::Summing, "signal.in9.peak", None),
        (Kind::Summing, "signal.peak", None),
        (Kind::Summing, "source.in2.capacitance", Some(Capacitance)),
        (Kind::Summing, "source.resistance", None),
        (Kind::Difference, "signal.peak", Some(Voltage)),
        (Kind::Difference, "signal.in1.peak", None),
        (Kind::Difference, "signal.common_mode", Some(Voltage)),
        (Kind::Difference, "source.resistance", Some(Resistance)),
        (Kind::Difference, "source.in1.resistance", Some(Resistance)),
        (Kind::Transimpedance, "signal.dc", Some(Current)),
        (Kind::Transimpedance, "source.shunt_resistance", Some(Resistance)),
        (Kind::Transimpedance, "source.dark_current", Some(Current)),
        (Kind::Charge, "signal.rms", Some(Charge)),
        (Kind::Charge, "source.in1.resistance", None),
        (Kind::Follower, "source.dark_current", None),
        (Kind::Follower, "signal.common_mode", None),
        (Kind::Follower, "reference.voltage", None),
        (Kind::ScaleAndShift, "reference.voltage", Some(Voltage)),
        (Kind::ComparatorInverting, "reference.resistance", Some(Resistance)),
        (Kind::ComparatorInverting, "components.R4", Some(Resistance)),
        (Kind::ComparatorNonInverting, "components.R4", None),
        (Kind::ScaleAndShift, "source.resistance", Some(Resistance)),
        (Kind::AcInverting, "signal.peak", Some(Voltage)),
        (Kind::Integrator, "components.Cf", Some(Capacitance)),
        (Kind::Integrator, "components.Rg", None),
        (Kind::Integrator, "part", None),
        (Kind::Integrator, "limits.gain", None),
    ];
    for (kind, path, wanted) in cases {
        assert_eq!(paths::dimension(path, kind), wanted, "{}: {path}", kind.id());
    }
}

#[test]
fn what_a_comparator_refuses() {
    let body = "[components]\nR1 = \"10k\"\n";
    assert_eq!(
        refused("comparator-inverting", body),
        "notes/a.md:10:1: [reference] is missing: an inverting comparator with hysteresis takes its thresholds from it
  10 | stage = \"comparator-inverting\"
     | ^^^^^^^^^^^^^^^^^^^^^^^^^^^^^^
allowed: `voltage`, as `2.5 V 0.1%`; and its output `resistance` where it counts
notes/a.md:13:2: `R2` is missing: an inverting comparator with hysteresis has it from the output to the + input: positive feedback
  13 | [components]
     |  ^^^^^^^^^^
allowed: `R2` under [components], with its value as `91k 1% 50ppm`"
    );
    let body = "[components]\nR1 = \"10k\"\nR2 = \"-1M\"\nR4 = \"1k\"\n[reference]\nvoltage = \"2.5 V\"\n";
    assert_eq!(
        refused("comparator-inverting", body),
        "notes/a.md:15:6: `R2` takes a resistance; \"-1M\" is not above zero
  15 | R2 = \"-1M\"
     |      ^^^^^
allowed: ohms, as `91k`, `4k7`, `2R2`, `91 kΩ`
notes/a.md:16:1: `R4` needs `Rser`, which is not there
  16 | R4 = \"1k\"
     | ^^
allowed: `R4` (from the − input to ground: divides the signal, with `Rser`) and `Rser` together"
    );
    let body = "sense = \"inverting\"\n[components]\nR1 = \"10k\"\nR2 = \"1M\"\nRf = \"1k\"\n[reference]\nvoltage = \"2.5 V\"\n";
    let told = refused("comparator-non-inverting", body);
    assert!(told.contains("a stage block has no key `sense`"), "{told}");
    assert!(told.contains("a non-inverting comparator with hysteresis has no component `Rf`"), "{told}");
    assert!(told.contains("allowed: `R1`, `R2`, `R3`, `Rser`, `Cshunt`, `Riso`"), "{told}");
}

#[test]
fn every_kind_in_words() {
    let words: Vec<String> = Kind::ALL.iter().map(|k| stageleaf_note::words::kind_text(*k)).collect();
    assert_eq!(
        words,
        [
            "a follower",
            "a non-inverting stage",
            "an inverting stage",
            "a summing stage",
            "a difference stage",
            "an instrumentation stage",
            "a transimpedance stage",
            "a charge stage",
            "an integrator",
            "a differentiator",
            "a scale-and-shift stage",
            "an AC-coupled non-inverting stage",
            "an AC-coupled inverting stage",
            "a Sallen–Key low-pass",
            "a Sallen–Key high-pass",
            "a multiple-feedback low-pass",
            "a multiple-feedback band-pass",
            "an inverting comparator with hysteresis",
            "a non-inverting comparator with hysteresis",
        ]
    );
}
