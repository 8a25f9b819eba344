//! `needs` and `alternates` as a person runs them.

use super::{Bench, fenced};

fn note(part: &str, name: &str, rf: &str) -> String {
    fenced(&format!(
        "stage = \"non-inverting\"\nname = \"{name}\"\npart = \"{part}\"\n[components]\nRf = \"{rf}\"\nRg = \"1k\"\n[limits]\nbandwidth = \"at least 200 kHz\"\n"
    ))
}

#[test]
fn the_shopping_list_is_in_data_sheet_units() {
    let bench = Bench::new("needs");
    bench.write("note.md", note("oak-1", "A", "9k"));
    let said = bench.run(&["needs", "note.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    // By hand: GBW/10, less what the output resistance of 50 Ω over 10 kΩ and the inputs' picofarads take: 2 MHz and a little more.
    let row = said.out.lines().find(|l| l.trim_start().starts_with("gain.gbw")).expect("a row");
    assert!(row.contains("at least 2.0") && row.contains("MHz") && row.contains("10 MHz typical") && row.ends_with("bandwidth"), "{row}");
    assert!(said.out.contains("\n  component") && said.out.contains("Rf         50 % and more"), "{}", said.out);
    // Nothing asked, nothing needed; what cannot be judged is told.
    bench.write("note.md", note("oak-1", "A", "9k").replace("bandwidth = \"at least 200 kHz\"\n", ""));
    assert!(bench.run(&["needs", "note.md"]).out.contains("no limits: nothing is needed"));
    bench.write("note.md", note("oak-1", "A", "9k").replace("bandwidth = \"at least 200 kHz\"", "output_noise = \"at most 1 µV\""));
    let said = bench.run(&["needs", "note.md"]);
    assert!(said.code == Some(0) && said.out.contains("not kept or not judged as it stands: output_noise"), "{}", said.out);
    let said = bench.run(&["needs", "absent.md"]);
    assert!(said.code == Some(2) && said.err.starts_with("absent.md: there is no such file"), "{}", said.err);
}

#[test]
fn another_part_is_found_or_it_is_said_that_there_is_none() {
    let bench = Bench::new("alternates");
    let oak = String::from_utf8(bench.read("shelf/oak-1.toml")).expect("text");
    bench.write("shelf/ash-2.toml", oak.replace("oak-1", "ash-2"));
    bench.write("shelf/elm-3.toml", oak.replace("oak-1", "elm-3").replace("gbw = \"10 MHz\"", "gbw = \"1 MHz\""));
    bench.write("shelf/fir-4.toml", oak.replace("oak-1", "fir-4").replace("gbw = \"10 MHz\"\n", ""));
    bench.write("note.md", note("oak-1", "A", "9k"));
    let said = bench.run(&["alternates", "note.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""), "{}", said.out);
    let row = |part: &str| said.out.lines().find(|l| l.split_whitespace().any(|w| w == part) && l.starts_with("  ")).expect("a row");
    assert!(row("ash-2").starts_with("  holds"), "{}", said.out);
    assert!(row("elm-3").starts_with("  breaks") && row("elm-3").contains("breaks bandwidth at least 200 kHz"), "{}", said.out);
    assert!(row("fir-4").starts_with("  undetermined") && row("fir-4").contains("gbw"), "{}", said.out);
    assert!(said.out.ends_with("another part keeps every limit\n"), "{}", said.out);
    // Over several notes; only where the part is used; nobody left.
    bench.write("more.md", note("elm-3", "B", "1k"));
    let said = bench.run(&["alternates", "note.md", "more.md", "--without", "oak-1"]);
    assert!(said.code == Some(0) && !said.out.contains("B  (non-inverting"), "{}", said.out);
    bench.write("note.md", note("oak-1", "A", "999k"));
    let said = bench.run(&["alternates", "note.md", "--all"]);
    assert_eq!(said.code, Some(1), "{}", said.out);
    assert!(said.out.ends_with("no other part of the shelf keeps every limit: A\n"), "{}", said.out);
    let said = bench.run(&["alternates", "note.md", "--without", "oak-2"]);
    assert!(
        said.code == Some(2) && said.err.contains("no stage here uses the part “oak-2”") && said.err.contains("try: oak-1"),
        "{}",
        said.err
    );
}
