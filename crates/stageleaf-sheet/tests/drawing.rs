//! The drawing, for every kind and every combination of optional parts.

#[expect(dead_code, reason = "the samples serve several tests")]
mod samples;

use stageleaf_math::{
    kind::Kind,
    stage::{Isolation, Source, Span, Supply, Toleranced},
};
use stageleaf_sheet::drawing::{
    canvas,
    kit::{Area, Canvas},
};

/// Parts that come and go together.
const GROUPS: [&[&str]; 9] = [&["Rf"], &["Cf"], &["Rser"], &["Cshunt"], &["Riso"], &["Rsn", "Csn"], &["Rng", "Cng"], &["Rp"], &["Cp"]];

/// Components, place of `Riso`, load resistance and capacitance, source resistance.
type Case = (Vec<&'static str>, Isolation, (bool, bool), bool);

/// Every combination that the kind allows.
fn combinations(kind: Kind) -> Vec<Case> {
    let mut all = Vec::new();
    for mask in 0_u32..1 << (GROUPS.len() + 4) {
        let on = |bit: usize| mask >> bit & 1 == 1;
        let mut names: Vec<&'static str> = vec!["Rg", "Rin"];
        names.extend(GROUPS.iter().enumerate().filter(|(i, _)| on(*i)).flat_map(|(_, g)| g.iter().copied()));
        let kept: Vec<&'static str> = kind.components().iter().map(|s| s.name).filter(|n| names.contains(n)).collect();
        let complete = kind
            .components()
            .iter()
            .all(|s| (!s.required || kept.contains(&s.name)) && (!kept.contains(&s.name) || s.with.is_none_or(|w| kept.contains(&w))));
        // A mask that names parts which the kind has not is the same as one without them.
        let asked = GROUPS.iter().enumerate().filter(|(i, _)| on(*i)).all(|(_, g)| g.iter().all(|n| kept.contains(n)));
        if complete && asked {
            let isolation = if on(GROUPS.len()) { Isolation::InsideLoop } else { Isolation::OutsideLoop };
            all.push((kept, isolation, (on(GROUPS.len() + 1), on(GROUPS.len() + 2)), on(GROUPS.len() + 3)));
        }
    }
    all
}

#[test]
fn no_label_covers_another_or_a_wire() {
    for kind in Kind::ALL {
        let combinations = combinations(*kind);
        assert!(combinations.len() > 500, "{kind:?}: only {} combinations", combinations.len());
        for (names, isolation, load, source) in combinations {
            let mut block = samples::block(*kind, &names, isolation, load, source);
            // The other symbols that the same places can hold: a capacitive source, a ground in the negative rail's place.
            for other in [false, true] {
                if other && source {
                    block.stage.sources = vec![Some(Source::Capacitive { capacitance: Toleranced::exact(1e-9) })];
                    block.stage.supply = Some(Supply { positive: Span::exact(5.0), negative: Span::exact(0.0), ripple: None });
                }
                let case = || format!("{kind:?} with {names:?}, {isolation:?}, load {load:?}, source {source}, other symbols {other}");
                keeps_clear(&canvas(&block), &case());
            }
        }
    }
}

fn keeps_clear(drawing: &Canvas, case: &str) {
    let words: Vec<(Area, &str)> = drawing.words().collect();
    for (i, (a, name)) in words.iter().enumerate() {
        for (b, other) in &words[i + 1..] {
            assert!(!a.covers(b), "{case}: `{name}` at {a:?} covers `{other}` at {b:?}");
        }
        for ink in drawing.ink() {
            assert!(!a.covers(ink), "{case}: `{name}` at {a:?} covers ink at {ink:?}");
        }
    }
    let frame = drawing.frame(0);
    assert!(frame.x1 - frame.x0 <= 600, "{case}: {} wide", frame.x1 - frame.x0);
}

#[test]
fn every_component_of_a_kind_is_drawn() {
    for kind in Kind::ALL {
        let all: Vec<&str> = kind.components().iter().map(|s| s.name).collect();
        let block = samples::block(*kind, &all, Isolation::OutsideLoop, (true, true), true);
        let drawing = canvas(&block);
        for name in all.iter().chain(&["Rs", "RL", "CL", "Vs"]) {
            assert!(drawing.words().any(|(_, word)| word == *name), "{kind:?}: `{name}` is not in the drawing");
        }
    }
}

#[test]
fn every_kind_has_a_drawing_file_and_no_file_is_an_orphan() {
    let folder = concat!(env!("CARGO_MANIFEST_DIR"), "/src/drawing");
    let mut files: Vec<String> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path().file_stem().unwrap().to_string_lossy().into_owned())
        .filter(|name| !["mod", "kit", "surroundings"].contains(&name.as_str()))
        .collect();
    let mut kinds: Vec<String> = Kind::ALL.iter().map(|k| k.id().replace('-', "_")).collect();
    files.sort();
    kinds.sort();
    assert_eq!(files, kinds);
}

#[test]
fn covering_is_seen_when_it_happens() {
    let a = Area { x0: 0, y0: 0, x1: 10, y1: 10 };
    assert!(a.covers(&Area { x0: 9, y0: 9, x1: 20, y1: 20 }));
    assert!(!a.covers(&Area { x0: 10, y0: 0, x1: 20, y1: 10 }));
}
