//! `check --format json`, version 1: the keys of the design, full precision, no number that JSON does not have.

use serde_json::Value;

use crate::{Bench, block, fenced};

fn document(said: &crate::Said) -> Value {
    serde_json::from_str(&said.out).unwrap_or_else(|error| panic!("{error}: {}", said.out))
}

fn keys(value: &Value) -> Vec<&str> {
    value.as_object().expect("an object").keys().map(String::as_str).collect()
}

#[test]
fn the_document_has_the_keys_of_version_1() {
    let bench = Bench::new("json-keys");
    bench.write("note.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["check", ".", "--format", "json"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    let document = document(&said);
    assert_eq!(document["version"], 1);
    assert_eq!(document["errors"], Value::Array(vec![]));
    let stage = &document["stages"][0];
    for (key, wanted) in [("file", "note.md"), ("name", "A stage"), ("kind", "non-inverting")] {
        assert_eq!(stage[key], wanted);
    }
    assert_eq!(stage["line"], 2);
    let gain = &stage["figures"]["gain"];
    assert_eq!(gain["unit"], "V/V");
    for key in ["value", "low", "high"] {
        assert!((gain[key].as_f64().expect("a number") - 9.999).abs() < 1e-4, "{gain}");
    }
    let limit = &stage["limits"][0];
    for key in ["figure", "limit", "verdict", "basis", "worst", "margin", "corner"] {
        assert!(keys(limit).contains(&key), "{key} of {limit}");
    }
    assert_eq!((&limit["figure"], &limit["limit"], &limit["verdict"]), (&"bandwidth".into(), &"at least 100 kHz".into(), &"holds".into()));
}

#[test]
fn a_gain_has_the_unit_of_its_kind() {
    let bench = Bench::new("json-units");
    let stages = [
        ("transimpedance", "[components]\nRf = \"1M\"\n[limits]\ngain = \"-1M ± 1 %\"\n", "Ω", "A", -1e6),
        ("charge", "[components]\nCf = \"100p\"\nRf = \"100M\"\n[limits]\ngain = \"-10 GV/C ± 1 %\"\n", "V/C", "C", -1e10),
    ];
    let notes = stages.map(|(kind, body, ..)| fenced(&format!("stage = \"{kind}\"\nname = \"{kind}\"\npart = \"oak-1\"\n{body}"))).concat();
    bench.write("note.md", notes);
    let said = bench.run(&["check", "note.md", "--format", "json"]);
    assert_eq!(said.code, Some(0), "{}", said.out);
    let document = document(&said);
    for (i, (_, _, gain, input, value)) in stages.iter().enumerate() {
        let stage = &document["stages"][i];
        assert_eq!(stage["figures"]["gain"]["unit"], *gain);
        assert_eq!(stage["limits"][0]["unit"], *gain);
        // By hand: −Rf and −1/Cf; an open-loop gain of 100 dB leaves 0.01 per mille.
        let got = stage["figures"]["gain"]["value"].as_f64().expect("a number");
        assert!((got / value - 1.0).abs() < 1e-3, "{got}");
        let offset = &stage["figures"]["input_offset"];
        assert!(offset.get("undetermined").is_some() || offset["unit"] == *input, "{offset}");
    }
    let said = bench.run(&["check", "note.md"]);
    assert!(said.out.contains("worst −10.00 GV/C") && said.out.contains("worst −1.000 MΩ"), "{}", said.out);
}

#[test]
fn a_figure_without_a_bound_is_null_and_unlimited() {
    let bench = Bench::new("json-unlimited");
    // One pole behind a resistor that drives resistors never turns by 180°, whatever the input capacitance does below −90°.
    bench.write("note.md", fenced(&block("A stage", &[("part = \"oak-1\"", "part = \"one-pole\"")])));
    let part = String::from_utf8(bench.read("shelf/oak-1.toml")).expect("text").replace("\"2 pF\"", "\"0 F\"");
    bench.write("shelf/one-pole.toml", part);
    let document = document(&bench.run(&["check", ".", "--format", "json"]));
    let margin = &document["stages"][0]["figures"]["gain_margin"];
    assert_eq!((&margin["value"], &margin["unlimited"]), (&Value::Null, &Value::Bool(true)), "{margin}");
}

#[test]
fn a_figure_that_needs_data_says_which() {
    let bench = Bench::new("json-needs");
    bench.write(
        "note.md",
        fenced(&block("A stage", &[("bandwidth = \"at least 100 kHz\"", "junction_temperature = \"at most 80 °C, thin within 5 K\"")])),
    );
    let said = bench.run(&["check", "note.md", "--format", "json"]);
    assert_eq!(said.code, Some(1));
    let document = document(&said);
    let why = document["stages"][0]["limits"][0]["worst"]["undetermined"].as_str().expect("a reason");
    assert!(why.contains("`junction_to_ambient` (K/W) under [thermal] in shelf/oak-1.toml"), "{why}");
    assert_eq!(document["stages"][0]["limits"][0]["verdict"], "undetermined");
    assert_eq!(document["stages"][0]["limits"][0]["margin"], Value::Null);
}

#[test]
fn errors_and_stale_quotes_have_their_place() {
    let bench = Bench::new("json-errors");
    bench.write("bad.md", fenced(&block("Bad", &[("\"9k\"", "\"9k V\"")])));
    bench.write("stale.md", format!("It is [12.0](#stale.gain).\n\n{}", fenced(&block("Stale", &[]))));
    let said = bench.run(&["check", "bad.md", "stale.md", "missing.md", "--format", "json"]);
    assert_eq!((said.code, said.err.as_str()), (Some(2), ""));
    let document = document(&said);
    let errors = document["errors"].as_array().expect("a list");
    let places: Vec<(&str, Option<u64>, Option<u64>, &str)> = errors
        .iter()
        .map(|e| (e["file"].as_str().unwrap_or(""), e["line"].as_u64(), e["column"].as_u64(), e["message"].as_str().unwrap_or("")))
        .collect();
    let wanted = [
        ("missing.md", None, None, "there is no such file or folder"),
        ("bad.md", Some(9), Some(6), "`Rf` takes a resistance; \"9k V\" is a voltage"),
        ("stale.md", Some(1), Some(8), "the prose says “12.0”; `gain` of “Stale” is 10.0 now"),
    ];
    assert_eq!(places, wanted);
}

#[test]
fn a_stage_that_cannot_work_as_stated_is_no_success_whatever_its_limits_say() {
    let bench = Bench::new("json-cautions");
    // By hand: a peak of 0.1 V leaves 0.9 V at Rf, (0.9 V)²/(2·9 kΩ) = 45 µW, beyond a rating of 1 µW.
    bench.write("note.md", fenced(&block("Hot \u{202E}tub", &[("Rf = \"9k\"", "Rf = \"9k 0.000001W\"")])));
    let said = bench.run(&["check", "note.md", "--format", "json"]);
    assert_eq!(said.code, Some(1), "{}", said.out);
    let document = document(&said);
    let stage = &document["stages"][0];
    assert_eq!(stage["limits"][0]["verdict"], "holds");
    let cautions = stage["cautions"].as_array().expect("a list");
    let hot = cautions.iter().find(|c| c["kind"] == "resistor_hot").unwrap_or_else(|| panic!("{cautions:?}"));
    let words = hot["text"].as_str().expect("words");
    assert!(words.starts_with("Rf "), "{words}");
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(1), "{}", said.out);
    assert!(said.out.contains(words) && said.out.contains("; 1 stage cannot work as stated"), "{}", said.out);
    assert!(said.out.contains("Hot \u{FFFD}tub") && !said.out.contains('\u{202E}'), "{}", said.out);
}

#[test]
fn a_name_in_two_notes_is_told_with_both_places_and_a_reported_figure_has_no_worst() {
    let bench = Bench::new("json-names");
    let text = fenced(&block("Same", &[("\"at least 100 kHz\"", "\"report\""), ("\"9k\"", "\"9k 1%\"")]));
    bench.write("a.md", text.clone());
    bench.write("b.md", text);
    let said = bench.run(&["check", "a.md", "b.md"]);
    assert_eq!(said.code, Some(2), "{}", said.out);
    assert!(said.err.starts_with("b.md:3:9: a stage called “Same” stands in a.md:2 already\n"), "{}", said.err);
    let row = said.out.lines().find(|l| l.contains("bandwidth")).expect("a row");
    assert!(row.contains("now ") && row.contains(" to ") && !row.contains("worst"), "{row}");
}
