//! `check` in the forms that other programs read: each is read back here by a reader of that form.

use pulldown_cmark::{Event, Options, Parser, Tag};

use super::{Bench, fenced};

/// A stage named `name` that breaks one limit for each of `gains`, lacks data for one and quotes a stale number.
fn note(name: &str, gains: usize) -> String {
    let limits: String = (0..gains).map(|i| format!("\"gain_at {} Hz\" = \"at least {}\"\n", i + 1, 20 + i)).collect();
    let name = serde_json::to_string(name).expect("JSON's strings are TOML's");
    fenced(&format!(
        "stage = \"non-inverting\"\nname = {name}\npart = \"oak-1\"\n[components]\nRf = \"9k 1%\"\nRg = \"1k 1%\"\n[limits]\n{limits}output_noise = \"at most 1 mV\"\ngain = \"10 ± 3 %\"\n"
    ))
}

const HOSTILE: [&str; 6] = [
    "</testcase><script>alert(1)</script>",
    "a\n::error file=x::y",
    "`*_[x](javascript:alert(1))_*` | <img src=x onerror=alert(1)>",
    "https://example.org @everyone #1 \\ ~~x~~ $x$ ![y](z)",
    "]]>\u{1}\u{202e}&amp;%0A::warning::x",
    "plain",
];

#[test]
fn junit_is_xml_with_a_case_for_each_limit() {
    let bench = Bench::new("junit");
    for name in HOSTILE {
        bench.write("note.md", note(name, 3));
        let said = bench.run(&["check", "note.md", "--format", "junit"]);
        assert_eq!((said.code, said.err.as_str()), (Some(1), ""), "{name}");
        let document = roxmltree::Document::parse(&said.out).unwrap_or_else(|error| panic!("{name}: {error}\n{}", said.out));
        let cases: Vec<_> = document.descendants().filter(|n| n.has_tag_name("testcase")).collect();
        assert_eq!(cases.len(), 6, "{name}: one for the stage, one for each limit");
        let failed = cases.iter().filter(|c| c.children().any(|n| n.has_tag_name("failure"))).count();
        assert_eq!(failed, 4, "{name}: three break, one is undetermined, one holds");
        assert!(cases.iter().all(|c| c.attribute("file") == Some("note.md")), "{name}");
        let lines: Vec<_> = cases.iter().filter_map(|c| c.attribute("line")).collect();
        assert_eq!(lines[1..], ["9", "10", "11", "12", "13"], "{name}: where the limits stand");
        let suite = document.descendants().find(|n| n.has_tag_name("testsuite")).expect("a suite");
        assert_eq!((suite.attribute("tests"), suite.attribute("failures"), suite.attribute("errors")), (Some("6"), Some("4"), Some("0")));
    }
    // What cannot be read is an error, and the others are judged all the same.
    bench.write("note.md", format!("{}\n{}", note("A", 1), fenced("stage = \"folower\"\n")));
    let said = bench.run(&["check", "note.md", "absent.md", "--format", "junit"]);
    assert_eq!((said.code, said.err.as_str()), (Some(2), ""));
    let document = roxmltree::Document::parse(&said.out).expect("XML");
    assert!(document.descendants().filter(|n| n.has_tag_name("error")).count() >= 2, "{}", said.out);
    assert_eq!(document.descendants().filter(|n| n.has_tag_name("failure")).count(), 2);
}

#[test]
fn annotations_are_at_most_ten_and_one_line_each() {
    let bench = Bench::new("github");
    for name in HOSTILE {
        bench.write("note.md", note(name, 24));
        let said = bench.run(&["check", "note.md", "--format", "github"]);
        assert_eq!((said.code, said.err.as_str()), (Some(1), ""), "{name}");
        let lines: Vec<&str> = said.out.lines().collect();
        let (closing, annotations) = lines.split_last().expect("lines");
        assert!(closing.starts_with("1 note, 1 stage, 26 limits: 1 holds, 24 break, 1 undetermined"), "{closing}");
        assert_eq!(annotations.len(), 10, "{name}: {}", said.out);
        for line in annotations {
            assert!(line.starts_with("::error file=note.md,line="), "{line}");
            // Two marks begin it, two end its properties; no property holds another.
            let properties = line.trim_start_matches("::").split("::").next().expect("properties");
            assert_eq!(properties.matches(',').count(), 3, "{properties}");
        }
        // The furthest beyond its limit first: 10 of 43 asked is worse than 10 of 20.
        assert!(annotations[0].contains("gain_at 24 Hz"), "{}", annotations[0]);
        assert!(annotations[9].contains("16 more"), "{}", annotations[9]);
    }
}

#[test]
fn the_summary_is_a_table_of_plain_text() {
    let bench = Bench::new("summary");
    for name in HOSTILE {
        bench.write("note.md", note(name, 30));
        let said = bench.run(&["check", "note.md", "--format", "markdown"]);
        assert_eq!((said.code, said.err.as_str()), (Some(1), ""), "{name}");
        let mut rows = 0;
        for event in Parser::new_ext(&said.out, Options::all()) {
            match event {
                Event::Start(Tag::TableRow) => rows += 1,
                Event::Html(_)
                | Event::InlineHtml(_)
                | Event::Code(_)
                | Event::InlineMath(_)
                | Event::DisplayMath(_)
                | Event::FootnoteReference(_) => {
                    panic!("{name}: {event:?}")
                }
                Event::Start(
                    Tag::Link { .. } | Tag::Image { .. } | Tag::Emphasis | Tag::Strikethrough | Tag::Heading { .. } | Tag::HtmlBlock,
                ) => {
                    panic!("{name}: {event:?}")
                }
                _ => {}
            }
        }
        assert_eq!(rows, 20, "{name}: {}", said.out);
        assert!(said.out.ends_with("\n11 more: \\`stageleaf check\\` lists all.\n"), "{}", said.out);
        assert!(!said.out.contains("@everyone"), "nobody is called");
    }
    bench.write("note.md", fenced("stage = \"follower\"\nname = \"A\"\npart = \"oak-1\"\n"));
    assert_eq!(bench.run(&["check", "note.md", "--format", "markdown"]).out, "**Stages:** 1 note, 1 stage, 0 limits\n");
}
