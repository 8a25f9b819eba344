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

#[test]
fn values_are_chosen_and_keep_the_limits_that_they_are_judged_by() {
    let bench = Bench::new("choose");
    bench.write("note.md", note("oak-1", "A", "9k 1% 50ppm"));
    let said = bench.run(&["choose", "note.md", "gain=20.4", "--resistors", "E96"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""), "{}", said.out);
    // Pasted into the note, it passes `check` with the gain asked for: 0.44 % off at nominal values, found by hand in all pairs.
    let value = |name: &str| {
        said.out.lines().rev().find_map(|l| l.trim().strip_prefix(&format!("{name} = \""))?.strip_suffix('"')).expect("a line").to_owned()
    };
    let pasted = note("oak-1", "A", &value("Rf")).replace("Rg = \"1k\"", &format!("Rg = \"{}\"", value("Rg")));
    assert!(value("Rf").ends_with(" 1% 50ppm"), "the tolerance stays");
    bench.write("note.md", pasted.replace("[limits]\n", "[limits]\ngain = \"20.4 ± 3.2 %\"\n"));
    let checked = bench.run(&["check", "note.md"]);
    assert_eq!(checked.code, Some(0), "{}", checked.out);
    // A stock list instead of a series; nothing that keeps the limits.
    bench.write("stock.txt", "# bench drawer\n1k\n2k2\n\n4k7 # a reel\n10k\n4n7\n");
    let said = bench.run(&["choose", "note.md", "gain=5.7", "--stock", "stock.txt"]);
    assert!(said.out.contains("Rf 4k7 1% 50ppm  Rg 1k"), "{} {}", said.out, said.err);
    let said = bench.run(&["choose", "note.md", "gain=900"]);
    assert!(said.code == Some(1) && said.out.contains("not kept: "), "{}", said.out);
}

#[test]
fn a_choice_that_cannot_be_made_says_why() {
    let bench = Bench::new("choose-refused");
    bench.write("note.md", note("oak-1", "A", "9k"));
    for (arguments, words) in [
        (&["gain"][..], "a wanted figure needs its value"),
        (&["gian=3"], "try: gain=3"),
        (&["gain=3 V"], "gain=3 V: "),
        (&["gain=0"], "has to be above zero"),
        (&["q=0.7"], "has no closed form for `q`"),
        (&["gain=3", "--hold", "Rf,Rg"], "no component that is free moves `gain`"),
        (&["gain=3", "--hold", "Rx"], "the stage has no component `Rx`"),
        (&["gain=3", "--resistors", "E7"], "no series is called `E7`"),
        (&["gain=3", "--ohms", "1k"], "is no range"),
        (&["gain=3", "--ohms", "1..1T"], "at most seven decades"),
        (&["gain=3", "--stock", "absent.txt"], "absent.txt: there is no such file"),
        (&["cutoff=1 kHz"], "a cutoff needs its response"),
        (&["gain=3", "--response", "bessel"], "a response needs its cutoff"),
        (&["cutoff=1 kHz", "--response", "flat"], "no response is called `flat`"),
    ] {
        let said = bench.run(&[&["choose", "note.md"], arguments].concat());
        assert!(said.code == Some(2) && said.out.is_empty() && said.err.contains(words), "{arguments:?}: {} {}", said.out, said.err);
    }
    bench.write("stock.txt", "1k\nplenty\n");
    let said = bench.run(&["choose", "note.md", "gain=3", "--stock", "stock.txt"]);
    assert!(said.code == Some(2) && said.err.starts_with("stock.txt:2: `plenty` is neither"), "{}", said.err);
    bench.write("note.md", format!("{}\n{}", note("oak-1", "A", "9k"), note("oak-1", "B", "9k")));
    let said = bench.run(&["choose", "note.md", "gain=3"]);
    assert!(said.code == Some(2) && said.err.contains("allowed: “A”, “B”"), "{}", said.err);
}

#[test]
fn the_overview_has_the_worst_first_and_no_markup_of_a_note() {
    let bench = Bench::new("overview");
    bench.write("notes/fine.md", note("oak-1", "Fine", "9k"));
    bench.write("notes/deep/lost.md", note("oak-1", "<script>alert(1)</script> | `x`", "999k"));
    bench.write("notes/near.md", note("oak-1", "Near", "9k").replace("at least 200 kHz", "at least 960 kHz"));
    let said = bench.run(&["overview", "notes", "--from", "notes"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    let at = |words: &str| said.out.find(words).unwrap_or_else(|| panic!("{words}: {}", said.out));
    assert!(at("1 break</strong>") < at(">Near<") && at(">Near<") < at(">Fine<"), "{}", said.out);
    assert!(!said.out.contains("<script>") && said.out.contains("&lt;script&gt;"), "{}", said.out);
    assert!(said.out.contains("href=\"deep/lost.md#script-alert-1-script-x\""), "{}", said.out);
    assert!(bench.run(&["overview", "notes", "--from", "."]).out.contains("href=\"notes/near.md#near.bandwidth\""));
}
