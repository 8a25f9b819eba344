//! `check` and the numbers that the prose quotes; `check --rewrite` changes them and nothing else.

use crate::{Bench, block, fenced};

/// `Rf` and `Rg` without tolerance make the gain of an ideal amplifier 10 exactly; with 100 dB of open-loop gain it is 9.999.
fn note(shown: &str) -> String {
    format!(
        "# Note\n\nThe gain is [{shown}](#a-stage.gain), *more or less*.\n\n{}\nNo limit of [10 kHz](other.md) is a quote.\n",
        fenced(&block("A stage", &[]))
    )
}

#[test]
fn a_quote_agrees_to_the_digits_that_it_shows() {
    let bench = Bench::new("agrees");
    for shown in ["10", "10.0", "10.00"] {
        bench.write("note.md", note(shown));
        let said = bench.run(&["check", "note.md"]);
        assert_eq!((said.code, said.err.as_str()), (Some(0), ""), "{shown}: {}", said.out);
    }
}

#[test]
fn a_stale_quote_is_shown_beside_the_figure_and_rewritten_in_place() {
    let bench = Bench::new("stale");
    let before = note("12.0").replace('\n', "\r\n");
    bench.write("note.md", &before);
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(1), "{}", said.err);
    assert!(said.out.contains("note.md:3:14  stale quote  gain of “A stage”: shown 12.0, now 10.0\n"), "{}", said.out);
    assert_eq!(bench.read("note.md"), before.as_bytes(), "check alone writes nothing");

    let said = bench.run(&["check", "note.md", "--rewrite"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    assert!(said.out.ends_with("1 quote, 1 rewritten\n"), "{}", said.out);
    assert_eq!(bench.read("note.md"), before.replace("[12.0]", "[10.0]").as_bytes(), "one number changes, the line ends stay");
    let left: Vec<_> = std::fs::read_dir(&bench.0).expect("a folder").map(|e| e.expect("an entry").file_name()).collect();
    assert_eq!(left.len(), 3, "nothing is left beside the note: {left:?}");
}

#[test]
fn a_rewrite_keeps_limits_and_a_byte_order_mark() {
    let bench = Bench::new("limits-stay");
    let text = format!("\u{feff}{}", note("12")).replace("at least 100 kHz", "at least 900 MHz");
    bench.write("note.md", &text);
    let said = bench.run(&["check", "note.md", "--rewrite"]);
    assert_eq!(said.code, Some(1), "the limit still breaks: {}", said.out);
    assert_eq!(bench.read("note.md"), text.replace("[12]", "[10]").as_bytes());
}

#[cfg(unix)]
#[test]
fn a_rewrite_goes_through_a_link_and_keeps_the_permissions() {
    use std::os::unix::fs::{PermissionsExt, symlink};
    let bench = Bench::new("rewrite-link");
    bench.write("real.md", note("12.0"));
    std::fs::set_permissions(bench.0.join("real.md"), std::fs::Permissions::from_mode(0o640)).expect("permissions");
    symlink("real.md", bench.0.join("link.md")).expect("a link");
    assert_eq!(bench.run(&["check", "link.md", "--rewrite"]).code, Some(0));
    assert!(std::fs::symlink_metadata(bench.0.join("link.md")).expect("it is there").is_symlink());
    assert_eq!(bench.read("real.md"), note("10.0").as_bytes());
    assert_eq!(std::fs::metadata(bench.0.join("real.md")).expect("it is there").permissions().mode() & 0o777, 0o640);
}

#[test]
fn a_quote_without_a_value_is_stale_and_stays() {
    let bench = Bench::new("no-value");
    // oak-1 states no headroom.
    let text = format!("The margin is [3 V](#a-stage.clip_margin).\n\n{}", fenced(&block("A stage", &[])));
    bench.write("note.md", &text);
    let said = bench.run(&["check", "note.md", "--rewrite"]);
    assert_eq!(said.code, Some(1));
    assert!(said.out.contains("clip_margin of “A stage”: shown 3 V, now without a value: needs "), "{}", said.out);
    assert_eq!(bench.read("note.md"), text.as_bytes());
}

#[test]
fn a_number_that_does_not_stand_there_as_it_is_shown_is_left_alone_and_told() {
    let bench = Bench::new("entity");
    let text = format!("It is [12&#46;0](#a-stage.gain), and [12.0](#a-stage.gain).\n\n{}", fenced(&block("A stage", &[])));
    bench.write("note.md", &text);
    let said = bench.run(&["check", "note.md", "--rewrite"]);
    let wanted = "note.md:1:8: “12.0” cannot be rewritten in place, so nothing in this note was\n\
                  allowed: plain text between the brackets of the link, without emphasis, escapes or entities\ntry: 10.0\n\n";
    assert_eq!((said.code, said.err.as_str()), (Some(2), wanted));
    assert_eq!(bench.read("note.md"), text.as_bytes());
}
