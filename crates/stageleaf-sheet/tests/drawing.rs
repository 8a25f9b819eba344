//! The drawing, for every kind and every combination of optional parts.

#[expect(dead_code, reason = "the samples serve several tests")]
mod samples;

use stageleaf_math::{
    kind::{ComponentSpec, Feed, Kind},
    network::Drive,
    stage::{Converter, Isolation, Source, Span, Supply, Toleranced},
};
use stageleaf_note::Field;
use stageleaf_sheet::drawing::{
    canvas,
    kit::{Area, Canvas},
};

/// Most groups of optional parts of which every combination is drawn; of more, none, singles, pairs, all but one, and all.
const MOST_GROUPS: usize = 9;

/// Components, place of `Riso`, load resistance and capacitance.
type Case = (Vec<&'static str>, Isolation, (bool, bool));

/// Optional parts that come and go together.
fn groups(kind: Kind) -> Vec<Vec<&'static str>> {
    let optional = || kind.components().iter().filter(|s| !s.required);
    let mutual = |a: &ComponentSpec, b: &ComponentSpec| a.with == Some(b.name) && b.with == Some(a.name);
    let mut groups: Vec<Vec<&'static str>> = Vec::new();
    for spec in optional() {
        if !groups.iter().any(|g| g.contains(&spec.name)) {
            groups.push(optional().filter(|other| other.name == spec.name || mutual(spec, other)).map(|s| s.name).collect());
        }
    }
    groups
}

/// The combinations that the kind allows.
fn combinations(kind: Kind) -> Vec<Case> {
    let mut all = Vec::new();
    let groups = groups(kind);
    for mask in 0_u32..1 << groups.len() {
        let count = mask.count_ones() as usize;
        if groups.len() > MOST_GROUPS && (3..groups.len() - 1).contains(&count) {
            continue;
        }
        let names: Vec<&'static str> =
            groups.iter().enumerate().filter(|(i, _)| mask >> i & 1 == 1).flat_map(|(_, g)| g.iter().copied()).collect();
        let kept: Vec<&ComponentSpec> = kind.components().iter().filter(|s| s.required || names.contains(&s.name)).collect();
        if !kept.iter().all(|s| s.with.is_none_or(|w| kept.iter().any(|k| k.name == w))) {
            continue;
        }
        for more in 0..8 {
            let on = |bit: usize| more >> bit & 1 == 1;
            let isolation = if on(0) { Isolation::InsideLoop } else { Isolation::OutsideLoop };
            all.push((kept.iter().map(|s| s.name).collect(), isolation, (on(1), on(2))));
        }
    }
    all
}

/// What can drive an input, and no source at all.
fn sources(drive: Drive) -> Vec<Option<Source>> {
    let (resistance, capacitance) = (Toleranced::exact(600.0), Toleranced::exact(1e-9));
    let mut all = vec![None, Some(Source::Resistive { resistance }), Some(Source::Capacitive { capacitance })];
    if drive != Drive::Voltage {
        for shunt_resistance in [None, Some(resistance)] {
            all.push(Some(Source::Photodiode { capacitance, shunt_resistance, dark_current: None }));
        }
    }
    all
}

/// The first input's drive, and how many inputs there are.
fn inputs(block: &stageleaf_note::Block) -> (Drive, usize) {
    let inputs = (block.stage.kind.spec().inputs)(&block.stage);
    (inputs[0].drive, inputs.len())
}

#[test]
fn no_label_covers_another_or_a_wire() {
    for kind in Kind::ALL {
        let combinations = combinations(*kind);
        assert!(combinations.len() >= 64, "{kind:?}: only {} combinations", combinations.len());
        for (names, isolation, load) in combinations {
            let mut block = samples::block(*kind, &names, isolation, load, false);
            let some = |on: bool, value: f64| on.then(|| Toleranced::exact(value));
            let (drive, count) = inputs(&block);
            for source in sources(drive) {
                block.stage.sources = vec![source; count];
                // A ground in the negative rail's place, too.
                let grounded = matches!(source, Some(Source::Capacitive { .. }));
                let negative = Span::exact(if grounded { 0.0 } else { -12.0 });
                block.stage.supply = Some(Supply { positive: Span::exact(12.0), negative, ripple: None });
                // A reference of some resistance and an ideal one.
                if let Some(reference) = &mut block.stage.reference {
                    reference.resistance = source.is_some().then_some(Toleranced::exact(10.0));
                }
                for converter in 0..5 {
                    let (bits, series, shunt) = (converter > 0, converter & 1 == 0, converter > 2);
                    block.stage.converter = Converter {
                        bits: bits.then_some(16.0),
                        series_resistance: some(bits && series, 100.0),
                        shunt_capacitance: some(shunt, 1e-9),
                        ..Converter::default()
                    };
                    let converter = block.stage.converter;
                    let case = format!("{kind:?} with {names:?}, {isolation:?}, load {load:?}, source {source:?}, {converter:?}");
                    keeps_clear(&canvas(&block), &case);
                }
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
    // Two amplifiers one behind the other take more; such a drawing scrolls in its own box.
    let most = if case.starts_with("Instrumentation") { 720 } else { 600 } + if case.contains("Some(16.0)") { 190 } else { 0 };
    assert!(frame.x1 - frame.x0 <= most, "{case}: {} wide", frame.x1 - frame.x0);
}

#[test]
fn every_component_of_a_kind_is_drawn() {
    for kind in Kind::ALL {
        let all: Vec<&str> = kind.components().iter().map(|s| s.name).collect();
        let block = samples::block(*kind, &all, Isolation::OutsideLoop, (true, true), true);
        let drawing = canvas(&block);
        for name in all.iter().chain(&["RL", "CL"]) {
            assert!(drawing.words().any(|(_, word)| word == *name), "{kind:?}: `{name}` is not in the drawing");
        }
        // One source is drawn as a source; of several inputs, each is a terminal with its name.
        let signals: Vec<_> = (kind.spec().inputs)(&block.stage).iter().filter(|i| i.feed == Feed::Signal).collect();
        let sources: Vec<(String, &str)> = match (&signals[..], signals[0].drive) {
            ([_], Drive::Voltage) => vec![("Rs".into(), "Vs")],
            ([_], Drive::Current) => vec![("Rs".into(), "Is")],
            ([_], Drive::Charge) => vec![("Rs".into(), "Qs")],
            _ => signals.iter().enumerate().map(|(i, input)| (format!("Rs{}", i + 1), input.name)).collect(),
        };
        for name in sources.iter().flat_map(|(resistance, name)| [resistance.as_str(), name]) {
            assert!(drawing.words().any(|(_, word)| word == name), "{kind:?}: `{name}` is not in the drawing");
        }
        let amplifiers = kind.spec().amplifiers;
        for name in (1..=amplifiers).filter(|_| amplifiers > 1).map(|a| format!("A{a}")) {
            assert!(drawing.words().any(|(_, word)| word == name), "{kind:?}: `{name}` is not in the drawing");
        }
        // Every value is a field, and no field is there twice.
        let html = drawing.finish("s", "circuit").into_string();
        let shown = |path: &str| html.matches(&format!("data-path=\"{path}\"")).count();
        for field in block.fields.iter().filter(|f| ["components.", "source.", "reference.", "load."].iter().any(|t| f.path.starts_with(t)))
        {
            assert_eq!(shown(&field.path), 1, "{kind:?}: fields for {}", field.path);
        }
    }
}

#[test]
fn a_resistance_that_stands_in_both_inputs_has_one_field() {
    for kind in [Kind::Difference, Kind::Instrumentation] {
        let all: Vec<&str> = kind.components().iter().map(|s| s.name).collect();
        let mut block = samples::block(kind, &all, Isolation::OutsideLoop, (true, true), true);
        block.fields.retain(|f| !f.path.starts_with("source."));
        block.fields.push(Field { path: "source.resistance".into(), text: "350".into(), span: 0..0, whole: 0..0, line: 1, column: 1 });
        let drawing = canvas(&block);
        keeps_clear(&drawing, &format!("{kind:?} at a bridge"));
        assert_eq!(drawing.words().filter(|(_, word)| *word == "Rs").count(), 2, "{kind:?}: a resistor in each input");
        let html = drawing.finish("s", "circuit").into_string();
        assert_eq!(html.matches("data-path=\"source.resistance\"").count(), 1, "{kind:?}");
    }
}

#[test]
fn inputs_without_a_source_stay_terminals_beside_those_with_one() {
    let names = ["Rin1", "Rin2", "Rin3", "Rf"];
    for which in 0..3 {
        let mut block = samples::block(Kind::Summing, &names, Isolation::OutsideLoop, (false, false), true);
        block.stage.sources = (0..3).map(|i| (i == which).then(|| Source::Resistive { resistance: Toleranced::exact(600.0) })).collect();
        let drawing = canvas(&block);
        keeps_clear(&drawing, &format!("Summing with one source, at input {which}"));
        for (i, name) in ["in1", "in2", "in3"].iter().enumerate() {
            assert!(drawing.words().any(|(_, word)| word == *name), "`{name}` is not in the drawing");
            assert_eq!(drawing.words().any(|(_, word)| word == format!("Rs{}", i + 1)), i == which);
        }
    }
}

#[test]
fn a_reference_is_drawn_with_its_voltage_and_resistance() {
    let names = ["R1", "R2", "Rf", "Rg"];
    for (resistance, path, fields) in
        [(None, "reference.voltage", 1), (Some(10.0), "reference.resistance", 1), (Some(0.0), "reference.resistance", 0)]
    {
        let mut block = samples::block(Kind::ScaleAndShift, &names, Isolation::OutsideLoop, (false, false), true);
        let reference = block.stage.reference.as_mut().unwrap();
        reference.resistance = resistance.map(Toleranced::exact);
        let html = canvas(&block).finish("s", "circuit").into_string();
        assert_eq!(html.matches(&format!("data-path=\"{path}\"")).count(), fields, "{path} with {resistance:?}");
        block.stage.reference = None;
        let drawing = canvas(&block);
        keeps_clear(&drawing, "ScaleAndShift without a reference");
        assert!(drawing.words().any(|(_, word)| word == "Vref"));
    }
}

#[test]
fn a_divided_supply_is_drawn_at_its_rail() {
    for kind in [Kind::AcNonInverting, Kind::AcInverting] {
        let all: Vec<&str> = kind.components().iter().map(|s| s.name).collect();
        let mut block = samples::block(kind, &all, Isolation::OutsideLoop, (false, false), true);
        block.stage.supply = Some(Supply { positive: Span::exact(5.0), negative: Span::exact(0.0), ripple: None });
        let drawing = canvas(&block);
        // At the amplifier and at the divider.
        assert_eq!(drawing.words().filter(|(_, word)| *word == "+5 V").count(), 2, "{kind:?}");
    }
}

#[test]
fn a_photodiode_is_drawn_with_its_capacitance_and_shunt() {
    for kind in [Kind::Transimpedance, Kind::Charge] {
        for (shunt_resistance, words) in [(None, &["PD", "Cd"][..]), (Some(Toleranced::exact(1e9)), &["PD", "Cd", "Rsh"])] {
            let mut block = samples::block(kind, &["Rf", "Cf"], Isolation::OutsideLoop, (false, false), false);
            block.stage.sources =
                vec![Some(Source::Photodiode { capacitance: Toleranced::exact(70e-12), shunt_resistance, dark_current: None })];
            let drawing = canvas(&block);
            for name in words {
                assert!(drawing.words().any(|(_, word)| word == *name), "{kind:?}: `{name}` is not in the drawing");
            }
            assert_eq!(drawing.words().any(|(_, word)| word == "Rsh"), shunt_resistance.is_some());
            let html = drawing.finish("s", "circuit").into_string();
            assert!(html.contains("data-path=\"source.capacitance\""), "{kind:?}");
            assert_eq!(html.contains("data-path=\"source.shunt_resistance\""), shunt_resistance.is_some(), "{kind:?}");
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
