//! Input that is made here: odd bytes, large files, links, empty folders, missing paths.

use std::fs;

use crate::{Bench, block, fenced};

/// The line that counts, without the rest.
fn last_line(text: &str) -> &str {
    text.trim_end().lines().last().unwrap_or_default()
}

#[test]
fn windows_line_ends_and_a_byte_order_mark_change_nothing() {
    let bench = Bench::new("crlf");
    let note = format!("# Note\n\n{}", fenced(&block("A stage", &[])));
    bench.write("plain.md", &note);
    let plain = bench.run(&["check", "plain.md", "--format", "json"]);
    assert_eq!(plain.code, Some(0), "{}{}", plain.out, plain.err);
    bench.write("plain.md", note.replace('\n', "\r\n"));
    assert_eq!(bench.run(&["check", "plain.md", "--format", "json"]).out, plain.out);
    bench.write("plain.md", format!("\u{feff}{note}"));
    assert_eq!(bench.run(&["check", "plain.md", "--format", "json"]).out, plain.out);
}

#[test]
fn a_mistake_behind_a_byte_order_mark_and_windows_line_ends_is_placed_in_characters() {
    let bench = Bench::new("crlf-bad");
    let note = format!("# Note\n\n{}", fenced(&block("A stage", &[("\"9k\"", "\"9k V\"")])));
    bench.write("note.md", format!("\u{feff}{}", note.replace('\n', "\r\n")));
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(2));
    assert!(said.err.starts_with("note.md:11:6: "), "{}", said.err);
}

#[test]
fn bytes_that_are_no_text_are_told_with_their_line_and_the_rest_is_judged() {
    let bench = Bench::new("not-utf8");
    let mut bytes = b"# Note\n\nA micro sign of old: \xb5\n\n".to_vec();
    bytes.extend_from_slice(fenced(&block("A stage", &[])).as_bytes());
    bench.write("note.md", bytes);
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(2), "{}{}", said.out, said.err);
    assert!(said.err.starts_with("note.md:3:22: ") && said.err.contains("UTF-8"), "{}", said.err);
}

#[test]
fn a_part_file_that_is_no_text_is_told_and_the_other_parts_stay() {
    let bench = Bench::new("part-not-utf8");
    bench.write("shelf/pine-1.toml", b"[part]\nname = \"\xff\"\n");
    bench.write("note.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["check", "note.md"]);
    assert_eq!((said.code, said.err.trim_end()), (Some(2), "shelf/pine-1.toml:2: the text is not UTF-8\ntry: save the file as UTF-8"));
    assert_eq!(last_line(&said.out), "1 note, 1 stage, 1 limit: 1 holds; 1 error");
}

#[test]
fn a_file_that_is_no_note_is_told() {
    let bench = Bench::new("no-note");
    bench.write("table.json", "{}");
    let said = bench.run(&["check", "table.json"]);
    assert_eq!(said.code, Some(2));
    assert!(said.err.starts_with("table.json: this file is not a note\n") && said.err.contains("ends in `.md`"), "{}", said.err);
}

#[test]
fn an_empty_folder_is_told() {
    let bench = Bench::new("empty");
    fs::create_dir_all(bench.0.join("notes/target")).expect("a folder");
    bench.write("notes/target/left-out.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["check", "notes"]);
    let wanted = "notes: no notes found in this folder\nallowed: a note is a file whose name ends in `.md`; `target`, `node_modules` and names that start with a dot are left out";
    assert_eq!((said.code, said.err.trim_end()), (Some(2), wanted));
}

#[test]
fn a_missing_path_is_told_and_the_others_are_judged() {
    let bench = Bench::new("missing");
    bench.write("note.md", fenced(&block("A stage", &[])));
    let said = bench.run(&["check", "nowhere.md", "note.md"]);
    assert_eq!((said.code, said.err.trim_end()), (Some(2), "nowhere.md: there is no such file or folder"));
    assert_eq!(last_line(&said.out), "1 note, 1 stage, 1 limit: 1 holds; 1 error");
}

#[test]
fn a_file_of_no_bytes_is_a_note_without_stages() {
    let bench = Bench::new("zero");
    bench.write("note.md", "");
    let said = bench.run(&["check", "note.md"]);
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(0), "1 note, 0 stages, 0 limits\n", ""));
}

#[test]
fn a_block_of_no_bytes_is_told() {
    let bench = Bench::new("zero-block");
    bench.write("note.md", "```stageleaf\n```\n");
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(2), "{}", said.out);
    assert!(said.err.contains("`stage`"), "{}", said.err);
}

#[test]
fn a_note_of_ten_megabytes_is_judged() {
    let bench = Bench::new("large");
    let mut note = "The lake was calm, and nothing was measured. *Nothing* at all.\n\n".repeat(160_000);
    assert!(note.len() > 10_000_000);
    note.push_str(&fenced(&block("A stage", &[])));
    bench.write("note.md", note);
    let said = bench.run(&["check", "note.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    assert!(said.out.starts_with("note.md:320002  A stage  "), "{}", said.out);
}

#[test]
fn a_line_of_a_hundred_thousand_characters_is_cut_in_what_is_shown() {
    let bench = Bench::new("long-line");
    let long = format!("\"9k {}\"", "x".repeat(100_000));
    bench.write("note.md", fenced(&block("A stage", &[("\"9k\"", &long)])));
    let said = bench.run(&["check", "note.md"]);
    assert_eq!(said.code, Some(2));
    assert!(said.err.starts_with("note.md:9:") && said.err.len() < 2_000, "{} bytes", said.err.len());
}

#[test]
fn deep_nesting_is_an_error_and_no_overflow() {
    for (name, note) in [
        ("arrays", fenced(&block("A stage", &[("\"9k\"", &format!("{}{}", "[".repeat(50_000), "]".repeat(50_000)))]))),
        ("tables", fenced(&block("A stage", &[("\"9k\"", &format!("{}1{}", "{ a = ".repeat(50_000), " }".repeat(50_000)))]))),
        ("keys", fenced(&format!("{} = 1\n", vec!["a"; 50_000].join(".")))),
    ] {
        let bench = Bench::new(name);
        bench.write("note.md", note);
        let said = bench.run(&["check", "note.md"]);
        assert_eq!(said.code, Some(2), "{name}");
        assert!(said.err.starts_with("note.md:") && said.err.len() < 5_000, "{name}: {} bytes", said.err.len());
    }
}

#[test]
fn deep_quotations_and_lists_around_a_block_are_read() {
    let bench = Bench::new("deep-markdown");
    bench.write("quotation.md", format!("{} deep\n\n{}", "> ".repeat(20_000), fenced(&block("A stage", &[]))));
    bench.write("brackets.md", format!("{}\n\n{}", "[".repeat(50_000), fenced(&block("B stage", &[]))));
    let said = bench.run(&["check", "quotation.md", "brackets.md"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    assert_eq!(last_line(&said.out), "2 notes, 2 stages, 2 limits: 2 hold");
}

#[cfg(unix)]
#[test]
fn links_that_lead_in_a_circle_end_and_a_note_counts_once() {
    use std::os::unix::fs::symlink;
    let bench = Bench::new("links");
    fs::create_dir_all(bench.0.join("notes/deeper")).expect("a folder");
    bench.write("notes/note.md", fenced(&block("A stage", &[])));
    symlink("..", bench.0.join("notes/deeper/up")).expect("a link");
    symlink("note.md", bench.0.join("notes/again.md")).expect("a link");
    let said = bench.run(&["check", "notes", "notes/note.md", "notes"]);
    assert_eq!((said.code, said.err.as_str()), (Some(0), ""));
    assert_eq!(last_line(&said.out), "1 note, 1 stage, 1 limit: 1 holds");
}

#[cfg(unix)]
#[test]
fn a_link_to_nowhere_is_told() {
    let bench = Bench::new("dead-link");
    std::os::unix::fs::symlink("gone.md", bench.0.join("note.md")).expect("a link");
    let said = bench.run(&["check", "."]);
    let wanted = "note.md: there is no such file or folder\n\n.: no notes found in this folder\n";
    assert_eq!(said.code, Some(2));
    assert!(said.err.starts_with(wanted), "{}", said.err);
}

#[test]
fn control_characters_of_a_note_do_not_reach_the_terminal() {
    let bench = Bench::new("control");
    bench.write("note.md", fenced(&block("A \\u001B[31mred\\u0007 stage", &[])));
    bench.write("bad.md", fenced(&block("B stage", &[("\"9k\"", "\"9k \u{1b}[31m\"")])));
    let said = bench.run(&["check", "."]);
    for text in [&said.out, &said.err] {
        assert!(text.chars().all(|c| c == '\n' || !c.is_control()), "{text:?}");
    }
}

#[test]
fn a_pipe_that_closes_early_is_no_fault() {
    use std::process::{Command, Stdio};
    let bench = Bench::new("pipe");
    for n in 0..50 {
        bench.write(&format!("note-{n}.md"), fenced(&block(&format!("Stage {n}"), &[])));
    }
    let mut child = Command::new(env!("CARGO_BIN_EXE_stageleaf"))
        .args(["check", "."])
        .current_dir(&bench.0)
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program starts");
    drop(child.stdout.take());
    let output = child.wait_with_output().expect("it ends");
    assert_eq!((output.status.code(), String::from_utf8_lossy(&output.stderr).as_ref()), (Some(0), ""));
}

#[test]
fn the_same_folder_says_the_same_twice_and_in_the_order_of_names() {
    let bench = Bench::new("order");
    for name in ["c", "a", "b"] {
        bench.write(&format!("{name}.md"), fenced(&block(&format!("Stage {name}"), &[])));
    }
    let first = bench.run(&["check", "."]);
    assert_eq!(bench.run(&["check", "."]).out, first.out);
    let heads: Vec<&str> = first.out.lines().filter(|l| l.contains(".md:")).map(|l| &l[..4]).collect();
    assert_eq!(heads, ["a.md", "b.md", "c.md"]);
}

#[test]
fn a_note_is_told_as_an_aligned_table() {
    let bench = Bench::new("table");
    // By hand: 50 Ω into 9 kΩ + 1 kΩ leave a return ratio of 10⁵/10 · 10/10.05 = 9950.2. The gain error is −1/9951.2 = −100.49 ppm,
    // 99.49 ppm beyond −1 ppm; the gain is 10 · 9950.2/9951.2 = 9.9990, 0.0990 above 9.9.
    bench.write(
        "note.md",
        fenced(&block("A stage", &[("bandwidth = \"at least 100 kHz\"", "gain = \"10 ± 1 %\"\ngain_error = \"at least -1 ppm\"")])),
    );
    let said = bench.run(&["check", "note.md"]);
    let wanted = "\
note.md:2  A stage  (non-inverting, oak-1)
  holds   gain        10 ± 1 %         worst 9.999       margin 0.0990     guaranteed
  breaks  gain_error  at least -1 ppm  worst −0.01005 %  margin −99.5 ppm  typical
  caution: The part states no common-mode rejection at DC (input.cmrr); the small-signal figures take it as ideal.
  caution: Without a tolerance, and exact at the worst case: Rf, Rg.

1 note, 1 stage, 2 limits: 1 holds, 1 breaks
";
    assert_eq!((said.code, said.out.as_str(), said.err.as_str()), (Some(1), wanted, ""));
}
