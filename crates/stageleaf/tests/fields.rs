//! Every field of a sheet can be filled: what is put into it is read, and stands where the sheet says.

use std::{collections::BTreeSet, path::Path};

use stageleaf::team::Teams;
use stageleaf_math::{dimension::Dimension, kind::Kind};
use stageleaf_note::{Block, Place, paths, read_block, template::template_for};
use stageleaf_sheet::{Sheet, sections};

/// Two values of each dimension that occurs around a stage, so that one is a change.
fn values(path: &str, dimension: Dimension) -> [&'static str; 2] {
    match (path, dimension) {
        ("supply.negative", _) => ["-1 V", "-2 V"],
        (_, Dimension::Voltage) => ["8 V", "9 V"],
        (_, Dimension::Current) => ["1 µA", "2 µA"],
        (_, Dimension::Charge) => ["1 pC", "2 pC"],
        (_, Dimension::Resistance) => ["1k", "2k 1%"],
        (_, Dimension::Capacitance) => ["1n", "2n2 5%"],
        (_, Dimension::Frequency) => ["15 Hz", "16 Hz"],
        (_, Dimension::Temperature) => ["25 °C", "0 °C to 40 °C"],
        _ => ["2", "3"],
    }
}

fn fields(block: &Block, part: &stageleaf_note::ShelfPart) -> BTreeSet<String> {
    let report = stageleaf_math::analyse(&block.stage).expect("a stage that can be analysed");
    let markup: String = sections(&Sheet { block, report: &report, part, id: "s" }).into_iter().map(|s| s.markup).collect();
    markup.split("data-path=\"").skip(1).filter_map(|piece| piece.split_once('"')).map(|(path, _)| path.to_owned()).collect()
}

#[test]
fn every_field_of_a_sheet_can_be_filled() {
    let mut teams = Teams::new(Some(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/shelf")));
    let team = teams.of(Path::new("."));
    let part = team.shelf.find("alder-10").expect("the demo's part");
    let read = |text: &str| read_block(text, &Place::new("n.md", 1), &team.shelf, &team.settings);
    for kind in Kind::ALL {
        let whole = template_for(*kind, "A", "alder-10");
        // Once with all tables, once with what a stage cannot do without.
        let bare: String = whole
            .split_inclusive("\n\n")
            .filter(|table| !["[supply]", "[source", "[signal", "[load]", "[ambient]", "[band]"].iter().any(|t| table.starts_with(t)))
            .collect();
        for text in [&whole, &bare] {
            let block = read(text).unwrap_or_else(|p| panic!("{}: {}\n{text}", kind.id(), p[0]));
            for path in fields(&block, part) {
                let Some(dimension) = paths::dimension(&path, *kind) else {
                    assert!(path == "part" || path.starts_with("parts."), "{}: {path} measures nothing", kind.id());
                    continue;
                };
                // A table of two begins with one of them.
                let alone = ["supply.", "band."].iter().any(|t| path.starts_with(t))
                    && !block.fields.iter().any(|f| f.path.starts_with(&path[..5]));
                for value in values(&path, dimension) {
                    match read(&block.rewrite(&path, value)) {
                        Ok(now) => assert_eq!(now.field(&path).map(|f| f.text.as_str()), Some(value), "{}: {path}", kind.id()),
                        Err(problems) => assert!(alone, "{}: {path} = {value}: {}", kind.id(), problems[0]),
                    }
                }
            }
        }
    }
}

#[test]
fn a_signal_is_offered_where_none_is_stated() {
    let mut teams = Teams::new(Some(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/shelf")));
    let team = teams.of(Path::new("."));
    let part = team.shelf.find("alder-10").expect("the demo's part");
    let offered = |kind: &str, rest: &str| {
        let text = format!("stage = \"{kind}\"\nname = \"A\"\npart = \"alder-10\"\n{rest}");
        let block = read_block(&text, &Place::new("n.md", 1), &team.shelf, &team.settings).unwrap_or_else(|p| panic!("{}", p[0]));
        fields(&block, part).into_iter().filter(|p| p.starts_with("signal.")).collect::<Vec<_>>()
    };
    assert_eq!(offered("follower", ""), ["signal.peak"]);
    assert_eq!(offered("follower", "[signal]\nrange = \"0 V to 1 V\"\n"), ["signal.frequency", "signal.range"]);
    let three = "[components]\nRin1 = \"1k\"\nRin2 = \"1k\"\nRin3 = \"1k\"\nRf = \"1k\"\n[signal.in2]\npeak = \"1 V\"\n";
    assert_eq!(offered("summing", three), ["signal.in1.peak", "signal.in2.frequency", "signal.in2.peak", "signal.in3.peak"]);
    let four = "[components]\nR1 = \"1k\"\nR2 = \"1k\"\nR3 = \"1k\"\nR4 = \"1k\"\n";
    assert_eq!(offered("difference", four), ["signal.peak"]);
    let four = format!("{four}[signal]\npeak = \"1 V\"\n");
    assert_eq!(offered("difference", &four), ["signal.common_mode", "signal.frequency", "signal.peak"]);
}
