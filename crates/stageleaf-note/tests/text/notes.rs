//! Whole notes: fences wherever Markdown allows them, quotes, bad blocks beside good ones, hostile files.

use std::fmt::Write as _;

use stageleaf_math::{dimension::Dimension, figure::Figure};
use stageleaf_note::{Note, Settings, duplicate_names, query_text, quote_agrees, quote_for, read_note};

use crate::common::{BLOCK, shelf, written};

fn read(text: &str) -> Note {
    read_note(text.as_bytes(), "notes/a.md", &shelf(), &Settings::default())
}

fn small(name: &str) -> String {
    format!("stage = \"follower\"\nname = \"{name}\"\npart = \"alder-10\"\n")
}

fn fenced(body: &str) -> String {
    format!("```stageleaf\n{body}```\n")
}

/// Each line with something in front.
fn behind(prefix: &str, text: &str) -> String {
    text.lines().fold(String::new(), |mut all, l| {
        let _ = writeln!(all, "{prefix}{l}");
        all
    })
}

#[test]
fn blocks_and_quotes_are_found_with_their_places() {
    let text = format!(
        "# Note\n\n{}\nThe stage reaches [512 kHz](#hydrophone-line-amplifier.bandwidth) and\n[−20.1](#hydrophone-line-amplifier.gain_at-20-kHz). See [this](#other.part).\n",
        fenced(BLOCK)
    );
    let note = read(&text);
    assert!(note.problems.is_empty(), "{}", written(&note.problems));
    assert_eq!(note.blocks[0].text, BLOCK);
    assert_eq!((note.blocks[0].line, note.block_of_fence[0]), (4, Some(0)));
    assert_eq!(&text[note.fences[0].clone()], fenced(BLOCK).trim_end());
    let quotes: Vec<_> = note.quotes.iter().map(|q| (q.shown.as_str(), query_text(q.query), q.column)).collect();
    assert_eq!(quotes, [("512 kHz", "bandwidth".to_owned(), 20), ("−20.1", "gain_at 20 kHz".to_owned(), 2)]);
    for quote in &note.quotes {
        assert_eq!(&text[quote.range.clone()], quote.shown);
    }
}

#[test]
fn fences_in_lists_quotations_and_tildes() {
    for (text, column, prefix) in [
        (format!("- item\n\n{}", behind("  ", &fenced(&small("A")))), 11, "  "),
        (format!("-\titem\n\n{}", behind("\t", &fenced(&small("A")))), 10, "\t"),
        (format!("> said\n>\n{}", behind("> ", &fenced(&small("A")))), 11, "> "),
        (format!("1. > x\n\n{}", behind("   > ", &fenced(&small("A")))), 14, "   > "),
        (format!("x\n\n~~~~ stageleaf extra\n{}~~~~\n", small("A")), 9, ""),
        (format!("x\n\n```stageleaf\r\n{}```\r\n", small("A").replace('\n', "\r\n")), 9, ""),
        (format!("\u{feff}x\n\n{}", fenced(&small("A"))), 9, ""),
    ] {
        let note = read(&text);
        assert!(note.problems.is_empty(), "{text}\n{}", written(&note.problems));
        assert_eq!(note.blocks.len(), 1, "{text}");
        let name = note.blocks[0].field("name").unwrap();
        assert_eq!((name.line, name.column), (5, column), "{text}");
        let fence = &text[note.fences[0].clone()];
        assert!(fence.starts_with(['`', '~']) && fence.ends_with(['`', '~']), "{fence}");
        // A problem's line is the file's line, prefix and all.
        let broken = read(&text.replace("follower", "folower"));
        let problem = &broken.problems[0];
        assert_eq!((problem.line, problem.line_text.as_str()), (4, format!("{prefix}stage = \"folower\"").as_str()));
    }
}

#[test]
fn what_is_no_block_is_left_alone() {
    for text in [
        "```rust\nstage\n```",
        "````md\n```stageleaf\n```\n````",
        "    ```stageleaf\n    ```",
        "<!--\n```stageleaf\n```\n-->",
        "",
        "\u{feff}",
        "text",
    ] {
        let note = read(text);
        assert!(note.problems.is_empty() && note.fences.is_empty(), "{text}: {}", written(&note.problems));
    }
}

#[test]
fn one_bad_block_hides_nothing() {
    let text = format!("{}\n{}\n{}", fenced(&small("A")), fenced("stage = 5"), fenced(&small("B")));
    let note = read(&text.replace("5```", "5\n```"));
    assert_eq!(note.blocks.iter().map(|b| b.stage.name.as_str()).collect::<Vec<_>>(), ["A", "B"]);
    assert_eq!(note.block_of_fence, [Some(0), None, Some(1)]);
    assert_eq!(note.problems.len(), 3, "{}", written(&note.problems));
}

#[test]
fn an_unclosed_fence() {
    let expected = r"notes/a.md:3:1: the stage block is never closed
  3 | ```stageleaf
    | ^^^^^^^^^^^^
allowed: a closing fence like the opening one, on a line of its own";
    for end in ["", "\n", "``", "x```", "    ```"] {
        let note = read(&format!("x\n\n```stageleaf\n{}{end}", small("A")));
        assert_eq!(written(&note.problems[..1]), expected, "{end:?}");
    }
    assert_eq!(written(&read("x\n\n```stageleaf").problems[..1]), expected);
    let quoted = read(&format!("x\n\n{}\nafter\n", behind("> ", fenced(&small("A")).trim_end().trim_end_matches('`'))));
    assert_eq!(written(&quoted.problems[..1]), expected.replace("3:1", "3:3").replace("| ```", "| > ```").replace("| ^", "|   ^"));
    let empty = read("```stageleaf\n```\n");
    assert!(!written(&empty.problems).contains("never closed"), "{}", written(&empty.problems));
    assert_eq!(empty.problems[0].line, 2);
}

#[test]
fn a_name_that_is_there_already() {
    let text = format!("{}\n{}", fenced(&small("Tide sum")), fenced(&small("tide  sum")));
    assert_eq!(
        written(&read(&text).problems),
        r#"notes/a.md:9:9: a stage called "tide  sum" stands on line 1 already
  9 | name = "tide  sum"
    |         ^^^^^^^^^
allowed: each name once; names differ by their letters and digits"#
    );
    let a = read(&fenced(&small("Tide sum")));
    let mut b = read(&fenced(&small("Tide sum")));
    b.file = "notes/b.md".into();
    assert_eq!(
        written(&duplicate_names(&[a, b])),
        r#"notes/b.md:3:9: a stage called "Tide sum" stands in notes/a.md already, near line 2
  3 | name = "Tide sum"
    |         ^^^^^^^^
allowed: each name once in all notes"#
    );
}

#[test]
fn quotes_that_quote_nothing() {
    let block = fenced(&small("Tide sum"));
    let problems = |line: &str| written(&read(&format!("{line}\n\n{block}")).problems);
    assert_eq!(
        problems("[5 Hz](#tide-sm.bandwidth)"),
        r#"notes/a.md:1:2: no stage of this note is called "tide-sm"
  1 | [5 Hz](#tide-sm.bandwidth)
    |  ^^^^
allowed: a stage's name in small letters and dashes, a dot, a figure
try: #tide-sum.bandwidth"#
    );
    assert_eq!(
        problems("[5 Hz](#tide-sum.bandwith)"),
        r#"notes/a.md:1:2: no figure is called `bandwith`
  1 | [5 Hz](#tide-sum.bandwith)
    |  ^^^^
allowed: a figure id, with its frequency where it takes one (`#name.gain_at-20-kHz`)
try: #tide-sum.bandwidth"#
    );
    assert_eq!(
        problems("[](#tide-sum.bandwidth)"),
        r#"notes/a.md:1:1: the link to `bandwidth` shows no number
  1 | [](#tide-sum.bandwidth)
    | ^
allowed: the number between the brackets, as `[79.7 kHz](#…)`"#
    );
    assert_eq!(problems("[x](#tide-sum) [x](#a.b) [x](other.md#a.bandwidth) [x](#)"), "");
}

#[test]
fn a_language_that_is_nearly_ours() {
    assert_eq!(
        written(&read("x\n```Stageleaf\n```\n").problems),
        r#"notes/a.md:2:1: "Stageleaf" is no stage block: its language is not `stageleaf`
  2 | ```Stageleaf
    | ^^^^^^^^^^^^
allowed: `stageleaf`, in small letters, behind the opening fence"#
    );
}

#[test]
fn bytes_that_are_no_utf_8() {
    let mut bytes = format!("µ x ?\n\n{}\n[1 Hz](#a.bandwidth)\n", fenced(&small("A"))).into_bytes();
    bytes[5] = 0xff;
    let note = read_note(&bytes, "notes/a.md", &shelf(), &Settings::default());
    assert_eq!(
        written(&note.problems),
        "notes/a.md:1:5: a byte here is no UTF-8 (0xFF)
  1 | µ x ?
    |     ^
allowed: UTF-8 text"
    );
    assert_eq!((note.blocks.len(), &bytes[note.quotes[0].range.clone()]), (1, &b"1 Hz"[..]));
}

#[test]
fn shown_digits_agree_when_the_value_rounds_to_them() {
    let hertz = Dimension::Frequency;
    for (shown, value, agrees) in [
        ("512 kHz", 511_600.0, true),
        ("512 kHz", 511_400.0, false),
        ("0.51 MHz", 511_600.0, true),
        ("0,51 MHz", 511_600.0, true),
        ("512.0 kHz", 511_600.0, false),
        ("1.00 MHz", 999_600.0, true),
        ("1.00 MHz", 994_000.0, false),
        ("511600 Hz", 511_600.0, true),
        ("fast", 511_600.0, false),
        ("unlimited", f64::INFINITY, true),
        ("512 kHz", f64::NAN, false),
        ("512 kHz", f64::INFINITY, false),
    ] {
        assert_eq!(quote_agrees(shown, value, hertz), agrees, "{shown} {value}");
    }
    assert!(quote_agrees("−20.1", -20.12, Dimension::Gain) && !quote_agrees("20.1", -20.12, Dimension::Gain));
    assert!(quote_agrees("20 dB", 10.0, Dimension::Gain) && quote_agrees("0.12 %", 0.0012, Dimension::Fraction));
    assert!(quote_agrees("25 °C", 298.4, Dimension::Temperature) && quote_agrees("45 °", std::f64::consts::FRAC_PI_4, Dimension::Angle));
}

#[test]
fn a_rewritten_quote_keeps_its_form_and_agrees() {
    for (shown, value, expected) in [
        ("512 kHz", 498_700.0, "499 kHz"),
        ("512 kHz", 1_234_000.0, "1.23 MHz"),
        ("512,0 kHz", 498_700.0, "498,7 kHz"),
        ("0.51 MHz", 498_700.0, "0.50 MHz"),
        ("5.1 MHz", 498_700.0, "499 kHz"),
        ("512\u{a0}kHz", 498_700.0, "499\u{a0}kHz"),
        ("512 kHz", 999.7, "1.00 kHz"),
        ("512 kHz", f64::INFINITY, "unlimited"),
    ] {
        let new = quote_for(shown, value, Dimension::Frequency);
        assert_eq!(new, expected, "{shown} {value}");
        assert!(quote_agrees(&new, value, Dimension::Frequency), "{shown} {value} {new}");
    }
    let mut seed = 7_u64;
    for figure in Figure::ALL.iter().cycle().take(20_000) {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        let d = figure.dimension();
        let value = f64::from_bits(((1023 - 20 + (seed >> 40) % 40) << 52) | (seed >> 12));
        let shown = stageleaf_note::format(value * 1.37, d, 2 + usize::try_from(seed % 4).unwrap());
        let new = quote_for(&shown, value, d);
        assert!(quote_agrees(&new, value, d), "{}: {value:e} {shown} {new}", figure.id());
    }
}

#[test]
fn a_large_note_is_read_whole() {
    let unit = format!("{}\ntext with [a link](#x.y) and µ\n\n", "word ".repeat(40));
    let mut text = unit.repeat(3000);
    for i in 0..300 {
        let _ = writeln!(text, "{}", fenced(&small(&format!("Stage {i}"))));
    }
    text.push_str(&"[".repeat(5000));
    text.push_str(&"> ".repeat(5000));
    text.push_str("\n\n```stageleaf\n");
    text.push_str(&"x y\n".repeat(5000));
    let note = read(&text);
    assert_eq!(note.blocks.len(), 300);
    // What is too much to list is counted.
    assert!(note.problems.last().unwrap().message.ends_with("more problems are not listed"));
}
