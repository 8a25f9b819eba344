//! Writes pages with sheets of made-up stages into a folder, to look at: `cargo run -p stageleaf-sheet --example preview -- FOLDER`.

#[path = "../tests/samples/mod.rs"]
mod samples;

use stageleaf_math::{kind::Kind, stage::Isolation};
use stageleaf_sheet::{Sheet, page, render};

const ALL: [&str; 13] = ["Rf", "Rg", "Rin", "Cf", "Rp", "Cp", "Rser", "Cshunt", "Riso", "Rsn", "Csn", "Rng", "Cng"];

/// Name, components, place of `Riso`, load resistance and capacitance, source resistance.
type Case = (&'static str, &'static [&'static str], Isolation, (bool, bool), bool);

fn main() -> std::io::Result<()> {
    let folder = std::env::args().nth(1).unwrap_or_else(|| ".".into());
    let sets: [Case; 6] = [
        ("bare", &["Rf", "Rg", "Rin"], Isolation::OutsideLoop, (false, false), false),
        ("usual", &["Rf", "Rg", "Rin", "Cf"], Isolation::OutsideLoop, (true, true), true),
        ("driver", &["Rf", "Rg", "Rin", "Cf", "Riso"], Isolation::InsideLoop, (true, true), true),
        ("filtered", &["Rf", "Rg", "Rin", "Rser", "Cshunt", "Rp"], Isolation::OutsideLoop, (true, false), true),
        ("full", &ALL, Isolation::InsideLoop, (true, true), true),
        ("outside", &ALL, Isolation::OutsideLoop, (true, true), true),
    ];
    let part = samples::part();
    let mut drawings = String::new();
    for kind in Kind::ALL {
        let report = samples::report(*kind);
        for (name, components, isolation, load, source) in sets {
            let block = samples::block(*kind, components, isolation, load, source);
            let id = format!("{}-{name}", kind.id());
            let sheet = Sheet { block: &block, report: &report, part: &part, id: &id };
            let body = format!("<div class=\"stageleaf\"><stageleaf-sheet id=\"{id}\">{}</stageleaf-sheet></div>", render(&sheet));
            if name == "usual" {
                std::fs::write(format!("{folder}/{}.html", kind.id()), page(kind.id(), &body, None))?;
            }
            let drawing = stageleaf_sheet::sections(&sheet).into_iter().find(|s| s.id == "drawing").map_or_else(String::new, |s| s.markup);
            drawings.push_str(&format!(
                "<h2>{id}</h2><div class=\"stageleaf\"><stageleaf-sheet><section data-section=\"drawing\">{drawing}</section></stageleaf-sheet></div>"
            ));
        }
    }
    std::fs::write(format!("{folder}/drawings.html"), page("Drawings", &drawings, None))
}
