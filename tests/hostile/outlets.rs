//! What the other commands do with odd requests, and that a note's text cannot become markup.

use crate::{Bench, block, fenced};

#[test]
fn an_unknown_kind_gets_the_list_and_the_nearest() {
    let bench = Bench::new("unknown-kind");
    let said = bench.run(&["new", "folower"]);
    let wanted = "new: no stage kind is called `folower`\nallowed: follower, non-inverting, inverting, summing, difference, instrumentation, \
        transimpedance, charge, integrator, differentiator, scale-and-shift, ac-non-inverting, ac-inverting, sallen-key-low-pass, \
        sallen-key-high-pass, multiple-feedback-low-pass, multiple-feedback-band-pass, \
        comparator-inverting, comparator-non-inverting\ntry: stageleaf new follower\n";
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(2), "", wanted));
}

#[test]
fn an_unknown_figure_gets_the_nearest() {
    let bench = Bench::new("unknown-figure");
    let said = bench.run(&["explain", "phase_margn"]);
    let wanted = "explain: no figure is called `phase_margn`\nallowed: a figure id; `stageleaf explain` lists them\ntry: stageleaf explain phase_margin\n";
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(2), "", wanted));
}

#[test]
fn a_figure_is_explained_with_the_units_that_kinds_give_it() {
    let bench = Bench::new("explain-units");
    let said = bench.run(&["explain", "gain"]);
    assert_eq!(said.code, Some(0), "{}", said.err);
    let wanted = "  unit        V/V, a plain signed number; limits may be in dB too\n              Ω in a stage of kind transimpedance\n              V/C in a stage of kind charge\n";
    assert!(said.out.contains(wanted), "{}", said.out);
    assert!(bench.run(&["explain", "input_noise"]).out.contains("              A in a stage of kind transimpedance\n"));
    assert!(!bench.run(&["explain", "bandwidth"]).out.contains("in a stage of kind"));
}

#[test]
fn a_figure_of_a_stage_is_explained_with_its_numbers() {
    let bench = Bench::new("explain-numbers");
    let resistors = "Rf = \"9k\"\nRg = \"1k\"\n";
    bench.write("note.md", fenced(&format!("stage = \"non-inverting\"\nname = \"A\"\npart = \"oak-1\"\n[components]\n{resistors}")));
    let said = bench.run(&["explain", "gain", "note.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    assert!(said.out.contains("G = 1 + Rf/Rg\n              G = 1 + 9 kΩ/1 kΩ = 10.00\n"), "{}", said.out);
    // What the note does not state is asked for; a frequency may be named, and has to be one.
    assert!(bench.run(&["explain", "output_noise", "note.md"]).out.contains("network     needs "));
    assert!(bench.run(&["explain", "gain_at 20 kHz", "note.md"]).out.contains("figure      gain_at 20 kHz\n"));
    let said = bench.run(&["explain", "gain_at", "note.md"]);
    assert!(said.code == Some(2) && said.err.contains("try: stageleaf explain \"gain_at 20 kHz\" note.md"), "{}", said.err);
    let said = bench.run(&["explain", "gain_at 20 V", "note.md"]);
    assert!(said.code == Some(2) && said.err.starts_with("explain: `gain_at` takes a frequency"), "{}", said.err);
    // No such stage, no such note, nothing that could be read.
    let said = bench.run(&["explain", "gain", "note.md", "--stage", "B"]);
    assert!(said.code == Some(2) && said.err.contains("no stage here is called “B”"), "{}", said.err);
    assert_eq!(bench.run(&["explain", "gain", "none.md"]).code, Some(2));
    bench.write("bad.md", fenced("stage = \"non-inverting\"\nname = \"A\"\npart = \"oak-1\"\n[components]\nRf = \"1 V\"\n"));
    let said = bench.run(&["explain", "gain", "bad.md"]);
    assert!(said.code == Some(2) && said.err.contains("bad.md:6:6: "), "{}", said.err);
}

#[test]
fn the_parts_of_further_amplifiers_go_with_the_page() {
    let bench = Bench::new("further-parts");
    let oak = String::from_utf8(bench.read("shelf/oak-1.toml")).expect("text");
    bench.write("shelf/pine-1.toml", oak.replace("oak-1", "pine-1"));
    let resistors = ["Rg", "Rf1", "Rf2", "R1", "R2", "R3", "R4"].map(|r| format!("{r} = \"1k\"\n")).concat();
    let block = format!(
        "stage = \"instrumentation\"\nname = \"A\"\npart = \"oak-1\"\n[parts]\nA1 = \"oak-1\"\nA3 = \"pine-1\"\n[components]\n{resistors}"
    );
    bench.write("note.md", fenced(&block));
    let said = bench.run(&["page", "note.md"]);
    assert_eq!(said.code, Some(0), "{}", said.err);
    let page = &said.out;
    assert_eq!(page.matches("shelf/pine-1.toml\",\"text\"").count(), 1);
    assert_eq!(page.matches("shelf/oak-1.toml\",\"text\"").count(), 1);
}

#[test]
fn a_further_part_that_cannot_be_read_is_named_where_it_stands() {
    let bench = Bench::new("further-lost");
    bench.write("shelf/pine-1.toml", "[part]\nname = \"pine-1\"\n[gain]\ngbw = \"1 V\"\n");
    let resistors = ["Rg", "Rf1", "Rf2", "R1", "R2", "R3", "R4"].map(|r| format!("{r} = \"1k\"\n")).concat();
    let block = format!("stage = \"instrumentation\"\nname = \"A\"\npart = \"oak-1\"\n[parts]\nA3 = \"pine-1\"\n[components]\n{resistors}");
    bench.write("note.md", fenced(&block));
    let said = bench.run(&["check", "note.md"]);
    let wanted = "note.md:6:7: the stage “A” is not judged: its part could not be read\n  6 | A3 = \"pine-1\"\n    |       ^^^^^^\n\
                  allowed: a part file without mistakes; those of shelf/pine-1.toml are told once";
    assert!(said.code == Some(2) && said.err.contains(wanted), "{}", said.err);
}

#[test]
fn an_unknown_argument_is_bad_input() {
    let bench = Bench::new("unknown-argument");
    assert_eq!(bench.run(&["check"]).code, Some(2));
    assert_eq!(bench.run(&["check", ".", "--format", "poem"]).code, Some(2));
    assert_eq!(bench.run(&["--help"]).code, Some(0));
}

#[test]
fn markup_in_a_name_stays_text_in_the_page() {
    let bench = Bench::new("markup");
    for (n, name) in
        ["<script>alert(1)</script>", "</script><script>alert(1)</script>", "<img src=x onerror=alert(1)>", "a'b&c <!-- <![CDATA["]
            .iter()
            .enumerate()
    {
        let file = format!("note-{n}.md");
        bench.write(&file, fenced(&block(name, &[])));
        assert_eq!(bench.run(&["check", &file]).code, Some(0), "{name}");
        let said = bench.run(&["page", &file]);
        assert_eq!(said.code, Some(0), "{name}: {}", said.err);
        for forbidden in ["<script>alert", "<img src=x", "<!--", "<![CDATA["] {
            assert!(!said.out.contains(forbidden), "{name} became markup: {forbidden}");
        }
    }
}

#[test]
fn a_page_of_a_stage_that_is_not_there_names_those_that_are() {
    let bench = Bench::new("no-such-stage");
    bench.write("note.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["page", "note.md", "--stage", "A stag"]);
    let wanted = "note.md: no stage of this note is called “A stag”\nallowed: “A stage”\ntry: --stage \"A stage\"\n\n";
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(2), "", wanted));
}

#[test]
fn a_script_that_could_close_its_element_is_refused() {
    let bench = Bench::new("bad-script");
    bench.write("note.md", fenced(&block("A stage", &[])));
    bench.write("bad.js", "'</SCRIPT>'");
    let said = bench.run(&["page", "note.md", "--script", "bad.js"]);
    let wanted = "bad.js: this script cannot stand inside a page: it holds `</script` or `<!--`\nallowed: the stageleaf.js that the site builder writes\n\n";
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(2), "", wanted));
}

#[test]
fn an_output_that_cannot_be_written_is_told() {
    let bench = Bench::new("no-output");
    bench.write("note.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["page", "note.md", "--out", "no/such/folder/page.html"]);
    assert_eq!(said.code, Some(2));
    assert!(said.err.starts_with("no/such/folder/page.html: the page could not be written: "), "{}", said.err);
}
