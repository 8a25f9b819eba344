//! Files damaged at random: nothing panics, every place lies in its file, every problem can be shown.

use stageleaf_math::kind::Kind;
use stageleaf_note::{Place, Settings, read_block, read_note, read_part, read_settings, template::template_for};

use crate::common::{ALDER, BLOCK, shelf};

/// A small generator with a fixed seed: the same damage on every machine.
struct Draw(u64);

impl Draw {
    fn below(&mut self, n: usize) -> usize {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        usize::try_from(self.0 >> 33).unwrap_or(0) % n.max(1)
    }
}

const PIECES: [&str; 24] = [
    "\"", "'", "[", "]", "{", "}", "=", ",", ".", "\n", "\r\n", "\r", "```", "~~~", "> ", "#", "\u{0}", "µ", "\u{202e}", "\"\"\"", "±",
    "1e999", "\\u", "\t",
];

/// The text with a few pieces put in, taken out or doubled.
fn damaged(text: &str, draw: &mut Draw) -> String {
    let mut text: Vec<char> = text.chars().collect();
    for _ in 0..=draw.below(5) {
        let at = draw.below(text.len());
        match draw.below(3) {
            0 => drop(text.splice(at..at, PIECES[draw.below(PIECES.len())].chars())),
            1 => drop(text.drain(at..(at + draw.below(20)).min(text.len()))),
            _ => {
                let end = (at + draw.below(40)).min(text.len());
                let piece = text[at..end].to_vec();
                drop(text.splice(at..at, piece));
            }
        }
    }
    text.into_iter().collect()
}

#[test]
fn damaged_blocks_parts_and_settings() {
    let (shelf, settings, mut draw) = (shelf(), Settings::default(), Draw(1));
    let place = Place { prefixes: vec!["> ".into()], ..Place::new("n.md", 7) };
    let templates: Vec<String> = Kind::ALL.iter().map(|k| template_for(*k, "A", "alder-10").replace("\n# [parts]", "\n[parts]")).collect();
    for i in 0..4000 {
        // Every second time the block of some kind, with its own names.
        let text = if i % 2 == 0 { damaged(BLOCK, &mut draw) } else { damaged(&templates[i / 2 % templates.len()], &mut draw) };
        match read_block(&text, &place, &shelf, &settings) {
            Ok(block) => {
                for field in &block.fields {
                    let again = block.rewrite(&field.path, "x \" \\ \n ] é");
                    assert!(again.starts_with(&text[..field.whole.start]) && again.ends_with(&text[field.whole.end..]), "{i}");
                }
                for path in [
                    "components.Rser",
                    "load.resistance",
                    "isolation",
                    "limits.phase_at 1 kHz",
                    "band.from",
                    "signal.in2.dc",
                    "source.in1.resistance",
                    "reference.voltage",
                    "parts.A2",
                ] {
                    let _ = (block.rewrite(path, "1"), block.without(path));
                }
            }
            Err(problems) => {
                assert!(!problems.is_empty(), "{i}");
                for p in &problems {
                    assert!(p.line >= 7 && p.column >= 1 && p.length >= 1, "{i}: {p}");
                    assert!(p.to_string().lines().count() >= 3);
                }
            }
        }
        let _ = read_part(&damaged(ALDER, &mut draw), "a.toml").map_err(|p| assert!(!p.is_empty()));
        let _ = read_settings(
            &damaged("shelf = \"s\"\n[ambient]\nrange = \"1 °C to 2 °C\"\n[series]\nresistor = \"E24\"\n", &mut draw),
            "s.toml",
        );
    }
}

#[test]
fn damaged_notes() {
    let (shelf, settings, mut draw) = (shelf(), Settings::default(), Draw(2));
    let note = format!(
        "# N\n\n- x\n\n  ```stageleaf\n{BLOCK}  ```\n\n[1 Hz](#hydrophone-line-amplifier.bandwidth) [**2**](#a.gain_at-2-Hz)\n\n```stageleaf\n{BLOCK}```\n"
    );
    for i in 0..1500 {
        let mut bytes = damaged(&note, &mut draw).into_bytes();
        if i % 3 == 0 {
            let at = draw.below(bytes.len());
            bytes[at] = 0xc3;
        }
        let read = read_note(&bytes, "n.md", &shelf, &settings);
        assert_eq!(read.fences.len(), read.block_of_fence.len());
        for range in read.fences.iter().chain(read.quotes.iter().map(|q| &q.range)) {
            assert!(range.start <= range.end && range.end <= bytes.len(), "{i}");
        }
        let lines = bytes.iter().filter(|b| matches!(b, b'\n' | b'\r')).count() + 1;
        for p in &read.problems {
            assert!((1..=lines).contains(&p.line), "{i}: {p}");
        }
    }
}
