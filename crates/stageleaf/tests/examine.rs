//! A note is examined by a pure function, and a fault of the program in one stage ends nothing.

use std::path::Path;

use stageleaf::{
    check::{Current, examine, examine_with},
    fault::Fault,
    team::{Team, Teams},
};

const NOTE: &str = "\
The first has [10.0](#first.gain), the second [10.0](#second.gain) and at 2 kHz [10.0](#first.gain_at-2-kHz).

```stageleaf
stage = \"non-inverting\"
name = \"First\"
part = \"alder-10\"
[components]
Rf = \"9k\"
Rg = \"1k\"
```

```stageleaf
stage = \"non-inverting\"
name = \"Second\"
part = \"alder-10\"
[components]
Rf = \"9k\"
Rg = \"1k\"
```
";

fn team() -> std::sync::Arc<Team> {
    Teams::new(Some(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/shelf"))).of(Path::new("."))
}

#[test]
fn a_panic_in_one_stage_is_told_as_a_bug_of_that_stage_and_the_other_is_judged() {
    let note = examine_with(NOTE.as_bytes(), "note.md", &team(), &|stage| {
        assert_ne!(stage.name, "First", "a promise that broke");
        stageleaf_math::analyse(stage)
    });
    assert_eq!(note.stages.len(), 1);
    assert_eq!(note.stages[0].block.stage.name, "Second");
    let [Fault::Bug { file, line, stage, message }] = note.faults.as_slice() else { panic!("one bug: {:?}", note.faults) };
    assert_eq!((file.as_str(), *line, stage.as_str()), ("note.md", 4, "First"));
    assert!(message.contains("a promise that broke") && message.contains("tests/examine.rs:"), "{message}");
    // What is quoted of the lost stage is no second fault.
    assert_eq!(note.quotes.len(), 1);
    assert_eq!(note.quotes[0].stage, "Second");
}

#[test]
fn a_figure_at_a_frequency_that_only_the_prose_names_is_computed_and_judges_nothing() {
    let note = examine(NOTE.as_bytes(), "note.md", &team());
    assert!(note.faults.is_empty(), "{}", note.faults[0]);
    assert_eq!(note.quotes.len(), 3);
    assert!(note.quotes.iter().all(|q| q.current == Current::Agrees), "{:?}", note.quotes);
    assert!(note.stages.iter().all(|s| s.limits().is_empty()));
}

#[test]
fn the_same_bytes_give_the_same_result() {
    let (first, second) = (examine(NOTE.as_bytes(), "note.md", &team()), examine(NOTE.as_bytes(), "note.md", &team()));
    assert_eq!(format!("{first:?}"), format!("{second:?}"));
}

#[test]
fn the_numbers_of_the_json_form_have_the_bits_of_the_engine() {
    let notes = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/notes");
    let path = notes.join("hydrophone-line-amplifier.md");
    let bytes = std::fs::read(&path).expect("a note of the demo");
    let note = examine(&bytes, "note.md", &Teams::default().of(&path));
    let wanted: Vec<u64> = note.stages[0].figures().iter().filter_map(|f| f.nominal.value()).map(f64::to_bits).collect();
    let run = std::process::Command::new(env!("CARGO_BIN_EXE_stageleaf")).args(["check", "--format", "json"]).arg(&path).output();
    let text = String::from_utf8(run.expect("the program runs").stdout).expect("text");
    let (figures, _) = text.split_once("\"limits\"").expect("limits behind the figures");
    // Read by the standard library, which rounds correctly: the JSON library's reader need not.
    let got = figures
        .lines()
        .filter_map(|l| l.trim().strip_prefix("\"value\": "))
        .map(|n| n.trim_end_matches(',').parse::<f64>().expect("a number"));
    assert!(wanted.len() > 30);
    assert_eq!(got.map(f64::to_bits).collect::<Vec<_>>(), wanted);
}
