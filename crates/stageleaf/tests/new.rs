//! What `new` prints stands in a note and passes `check`, for every kind, with a part of the demo's shelf.

use std::{fs, path::Path};

use stageleaf::{
    check::{ExaminedStage, examine},
    new::{Options, block},
    team::Teams,
};
use stageleaf_math::{kind::Kind, limit::Verdict};

/// The block with the demo's part for its supply: alder-10 for ±12 V, hazel-1 for 5 V.
fn new(kind: Kind, name: Option<&str>) -> String {
    let single = matches!(kind, Kind::ScaleAndShift | Kind::AcNonInverting | Kind::AcInverting) || kind.switches();
    let part = if single { "hazel-1" } else { "alder-10" };
    let options = Options { kind: kind.id().to_owned(), name: name.map(str::to_owned), part: Some(part.to_owned()) };
    block(&options).unwrap_or_else(|fault| panic!("{fault}"))
}

#[test]
fn the_block_of_every_kind_keeps_its_limits() {
    let notes = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/notes");
    let mut teams = Teams::default();
    let team = teams.of(&notes);
    assert!(teams.take_faults().is_empty() && team.shelf.find("alder-10").is_some(), "the demo's shelf");
    for kind in Kind::ALL {
        let note = examine(new(*kind, None).as_bytes(), "note.md", &team);
        assert!(note.faults.is_empty(), "{}: {}", kind.id(), note.faults[0]);
        let [stage] = note.stages.as_slice() else { panic!("{}: one stage", kind.id()) };
        let limits = ExaminedStage::limits(stage);
        assert!(limits.len() >= 5, "{}: a block to start from has limits", kind.id());
        for row in limits {
            assert!(
                matches!(row.verdict, Verdict::Holds | Verdict::Thin | Verdict::Reported),
                "{}: {:?} {:?}",
                kind.id(),
                row.limit,
                row.verdict
            );
        }
    }
}

#[test]
fn every_component_that_is_offered_can_be_taken() {
    let mut teams = Teams::new(Some(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/shelf")));
    let team = teams.of(Path::new("."));
    for kind in Kind::ALL {
        let mut text = new(*kind, None);
        for component in kind.components() {
            text = text.replace(&format!("# {} = ", component.name), &format!("{} = ", component.name));
        }
        let note = examine(text.as_bytes(), "note.md", &team);
        assert!(note.faults.is_empty(), "{}: {}", kind.id(), note.faults[0]);
        assert_eq!(note.stages[0].block.stage.components.len(), kind.components().len(), "{}", kind.id());
    }
}

#[test]
fn a_name_with_quotes_and_backslashes_is_the_name() {
    let mut teams = Teams::new(Some(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/shelf")));
    let team = teams.of(Path::new("."));
    let name = r#"A "quoted" \ name"#;
    let note = examine(new(Kind::Follower, Some(name)).as_bytes(), "note.md", &team);
    assert_eq!(note.stages[0].block.stage.name, name);
}

#[test]
fn the_demo_s_notes_are_without_a_mistake() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/notes");
    let mut teams = Teams::default();
    let mut stages = 0;
    for entry in fs::read_dir(&folder).expect("the demo's notes") {
        let path = entry.expect("an entry").path();
        let team = teams.of(&path);
        let note = examine(&fs::read(&path).expect("a note"), &path.to_string_lossy(), &team);
        assert!(note.faults.is_empty(), "{}", note.faults[0]);
        assert_eq!(note.stale().count(), 0, "stale quotes in {}", path.display());
        for row in note.stages.iter().flat_map(ExaminedStage::limits) {
            assert!(
                !matches!(row.verdict, Verdict::Breaks | Verdict::Undetermined),
                "{}: {:?} {:?}",
                path.display(),
                row.limit,
                row.verdict
            );
        }
        stages += note.stages.len();
    }
    assert!(stages >= 5, "the demo has {stages} stages");
}
