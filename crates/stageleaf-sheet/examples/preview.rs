//! Writes pages with sheets into a folder, to look at: of made-up stages, and of the stages of a site, if one is named.
//!
//! `cargo run -p stageleaf-sheet --example preview -- FOLDER site`

#[path = "../tests/samples/mod.rs"]
mod samples;

use stageleaf_math::{
    analyse,
    kind::Kind,
    network::Drive,
    stage::{Isolation, Source, Toleranced},
};
use stageleaf_note::{Settings, Shelf, ShelfPart, read_note, read_part, slug};
use stageleaf_sheet::{Sheet, page, render};

/// Name, optional components, place of `Riso`, load resistance and capacitance.
type Case = (&'static str, &'static [&'static str], Isolation, (bool, bool));

/// What drives the inputs of a kind: nothing stated, or each source that makes sense there.
fn sources(drive: Drive) -> Vec<(&'static str, Option<Source>)> {
    let exact = Toleranced::exact;
    let mut all = vec![("ideal", None), ("resistive", Some(Source::Resistive { resistance: exact(600.0) }))];
    if drive != Drive::Voltage {
        let photodiode = |shunt_resistance| Some(Source::Photodiode { capacitance: exact(70e-12), shunt_resistance, dark_current: None });
        all.extend([
            ("capacitive", Some(Source::Capacitive { capacitance: exact(1e-9) })),
            ("photodiode", photodiode(None)),
            ("shunted photodiode", photodiode(Some(exact(1e9)))),
        ]);
    }
    all
}

fn main() -> std::io::Result<()> {
    let folder = std::env::args().nth(1).unwrap_or_else(|| ".".into());
    let every: &[&str] = &["Rf", "Rg", "Cf", "Rp", "Cp", "Rser", "Cshunt", "Riso", "Rsn", "Csn", "Rng", "Cng", "Rin", "R2"];
    let sets: [Case; 6] = [
        ("bare", &[], Isolation::OutsideLoop, (false, false)),
        ("usual", &["Rf", "Rg", "Cf"], Isolation::OutsideLoop, (true, true)),
        ("driver", &["Rf", "Rg", "Cf", "Riso"], Isolation::InsideLoop, (true, true)),
        ("filtered", &["Rser", "Cshunt", "Rp", "Rin"], Isolation::OutsideLoop, (true, false)),
        ("full", every, Isolation::InsideLoop, (true, true)),
        ("outside", every, Isolation::OutsideLoop, (true, true)),
    ];
    let part = samples::part();
    for kind in Kind::ALL {
        let report = samples::report(*kind);
        let mut drawings = String::new();
        let spec = kind.spec();
        for (i, (name, optional, isolation, load)) in sets.into_iter().enumerate() {
            let components: Vec<&str> =
                spec.components.iter().filter(|s| s.required || optional.contains(&s.name)).map(|s| s.name).collect();
            let mut block = samples::block(*kind, &components, isolation, load, false);
            let inputs = (spec.inputs)(&block.stage);
            let sources = sources(inputs[0].drive);
            let (driven, source) = sources[if i + 1 == sets.len() { sources.len() - 1 } else { i % sources.len() }];
            block.stage.sources = vec![source; inputs.len()];
            let id = format!("{}-{name}", kind.id());
            let sheet = Sheet { block: &block, report: &report, part: &part, id: &id };
            let body = format!("<div class=\"stageleaf\"><stageleaf-sheet id=\"{id}\">{}</stageleaf-sheet></div>", render(&sheet));
            if name == "usual" {
                std::fs::write(format!("{folder}/{}.html", kind.id()), page(kind.id(), &body, None))?;
            }
            let drawing = stageleaf_sheet::sections(&sheet).into_iter().find(|s| s.id == "drawing").map_or_else(String::new, |s| s.markup);
            drawings.push_str(&format!(
                "<h2>{id}, {driven} source</h2><div class=\"stageleaf\"><stageleaf-sheet><section data-section=\"drawing\">{drawing}</section></stageleaf-sheet></div>"
            ));
        }
        std::fs::write(format!("{folder}/drawings-{}.html", kind.id()), page(kind.id(), &drawings, None))?;
    }
    std::env::args().nth(2).map_or(Ok(()), |site| notes(&folder, &site))
}

/// One page per note of a site.
fn notes(folder: &str, site: &str) -> std::io::Result<()> {
    let mut shelf = Shelf::default();
    for entry in std::fs::read_dir(format!("{site}/shelf"))? {
        let path = entry?.path();
        let (text, file) = (std::fs::read_to_string(&path)?, path.display().to_string());
        match read_part(&text, &file) {
            Ok(part) => shelf.parts.push(ShelfPart { part, file, text }),
            Err(problems) => problems.iter().for_each(|p| eprintln!("{p}")),
        }
    }
    for entry in std::fs::read_dir(format!("{site}/notes"))? {
        let path = entry?.path();
        let file = path.display().to_string();
        let note = read_note(&std::fs::read(&path)?, &file, &shelf, &Settings::default());
        note.problems.iter().for_each(|p| eprintln!("{p}"));
        let mut body = String::new();
        for block in &note.blocks {
            let (Ok(report), Some(part)) = (analyse(&block.stage), shelf.find(&block.stage.part.id)) else {
                eprintln!("{file}: not analysed");
                continue;
            };
            let id = slug(&block.stage.name);
            let start = std::time::Instant::now();
            let sheet = render(&Sheet { block, report: &report, part, id: &id });
            eprintln!("{id}: {} bytes in {:?}", sheet.len(), start.elapsed());
            body.push_str(&format!("<div class=\"stageleaf\"><stageleaf-sheet id=\"{id}\">{sheet}</stageleaf-sheet></div>"));
        }
        if let (false, Some(stem)) = (body.is_empty(), path.file_stem()) {
            std::fs::write(format!("{folder}/note-{}.html", stem.display()), page(&file, &body, None))?;
        }
    }
    Ok(())
}
