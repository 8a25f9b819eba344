//! What the working shows: every formula, with the numbers that stand beside it, gives the value that stands beside it. The formulas
//! are read and evaluated here by themselves, from their text; nothing of the engine computes them.

#![expect(clippy::disallowed_methods, reason = "an evaluation of its own, by the platform's functions")]

use std::{collections::BTreeSet, f64::consts::PI, fs, path::Path};

use stageleaf::{
    check::{ExaminedStage, examine},
    new::{Options, block},
    team::Teams,
};
use stageleaf_math::{figure::Figure, kind::Kind, report::Working};
use stageleaf_note::worked::in_place;

fn notes() -> std::path::PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/notes")
}

/// The demo's stages, and what `new` makes of every kind.
fn stages() -> Vec<ExaminedStage> {
    let mut teams = Teams::default();
    let team = teams.of(&notes());
    let mut texts: Vec<Vec<u8>> = Vec::new();
    for entry in fs::read_dir(notes()).expect("the demo's notes") {
        let path = entry.expect("an entry").path();
        if path.extension().is_some_and(|e| e == "md") {
            texts.push(fs::read(path).expect("a note"));
        }
    }
    for kind in Kind::ALL {
        for part in ["alder-10", "hazel-1"] {
            let options = Options { kind: kind.id().to_owned(), name: None, part: Some(part.to_owned()) };
            texts.push(block(&options).expect("a block").into_bytes());
        }
    }
    let stages: Vec<ExaminedStage> = texts.iter().flat_map(|text| examine(text, "note.md", &team).stages).collect();
    assert!(stages.len() > Kind::ALL.len() + 9, "{} stages", stages.len());
    stages
}

/// Evaluates a formula's right side. Operators: `+ − · / ∥`, `√`, `²`, `°`, `arctan`, `sin`, juxtaposed `2π`.
struct Reader<'a> {
    rest: &'a str,
    working: &'a Working,
}

impl Reader<'_> {
    fn value(working: &Working) -> Result<f64, String> {
        let formula = working.formula.split(", ").next().expect("a first piece");
        let body = formula.rsplit(['=', '≈', '≥']).next().expect("a last piece");
        let mut reader = Reader { rest: body, working };
        let value = reader.sum()?;
        let left = reader.rest.trim();
        if left.is_empty() { Ok(value) } else { Err(format!("{formula}: `{left}` is left over")) }
    }

    fn take(&mut self, sign: &str) -> bool {
        let rest = self.rest.trim_start();
        let Some(rest) = rest.strip_prefix(sign) else { return false };
        self.rest = rest;
        true
    }

    fn sum(&mut self) -> Result<f64, String> {
        let mut value = if self.take("−") { -self.product()? } else { self.product()? };
        loop {
            if self.take("+") {
                value += self.product()?;
            } else if self.take("−") {
                value -= self.product()?;
            } else {
                return Ok(value);
            }
        }
    }

    fn product(&mut self) -> Result<f64, String> {
        let mut value = self.factor()?;
        loop {
            if self.take("·") {
                value *= self.factor()?;
            } else if self.take("/") {
                value /= self.factor()?;
            } else if self.take("∥") {
                let other = self.factor()?;
                value = value * other / (value + other);
            } else {
                return Ok(value);
            }
        }
    }

    fn factor(&mut self) -> Result<f64, String> {
        if self.take("√") {
            return Ok(self.factor()?.sqrt());
        }
        let mut value = if self.take("(") {
            let inner = self.sum()?;
            if !self.take(")") {
                return Err(format!("`)` is missing before `{}`", self.rest));
            }
            inner
        } else if self.take("½") {
            0.5
        } else {
            self.symbol()?
        };
        if self.take("²") {
            value *= value;
        }
        if self.take("°") {
            value *= PI / 180.0;
        }
        Ok(value)
    }

    fn symbol(&mut self) -> Result<f64, String> {
        let rest = self.rest.trim_start();
        let word = |c: char| c.is_alphabetic() || c.is_ascii_digit() || c == '_' || c == '.';
        let (name, after) = rest.split_at(rest.find(|c| !word(c)).unwrap_or(rest.len()));
        self.rest = after;
        if let Some((_, value, _)) = self.working.numbers.iter().find(|(symbol, ..)| *symbol == name) {
            return Ok(*value);
        }
        match name {
            "arctan" => Ok(self.factor()?.atan()),
            "sin" => Ok(self.factor()?.sin()),
            "exp" => Ok(self.factor()?.exp()),
            "log2" => Ok(self.factor()?.log2()),
            "π" => Ok(PI),
            "2π" => Ok(2.0 * PI),
            number => number.parse().map_err(|_| format!("`{number}` has no value")),
        }
    }
}

#[test]
fn every_formula_gives_the_value_beside_it() {
    let mut seen: BTreeSet<Figure> = BTreeSet::new();
    let mut wrong = BTreeSet::new();
    for stage in stages() {
        for working in &stage.report.working {
            let kind = stage.block.stage.kind.id();
            match Reader::value(working) {
                Err(why) => {
                    wrong.insert(format!("{kind}: {}: {why}", working.formula));
                }
                Ok(value) if (value - working.handbook).abs() > 1e-12 * value.abs() => {
                    wrong.insert(format!("{kind}: {}: {value} beside {}", working.formula, working.handbook));
                }
                Ok(_) => {
                    seen.insert(working.query.figure);
                }
            }
            for (symbol, ..) in &working.numbers {
                let words = working.formula.split(|c: char| !(c.is_alphabetic() || c.is_ascii_digit() || c == '_'));
                if !words.into_iter().any(|w| w == *symbol) {
                    wrong.insert(format!("{kind}: {}: {symbol} does not stand in it", working.formula));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.into_iter().collect::<Vec<_>>().join("\n"));
    assert!(seen.len() >= 30, "closed forms stand beside {} figures", seen.len());
}

#[test]
fn numbers_stand_in_place_of_symbols() {
    let stages = stages();
    let line = |name: &str, formula: &str| {
        let stage = stages.iter().find(|s| s.block.stage.name == name).expect("the stage");
        in_place(stage.report.working.iter().find(|w| w.formula.starts_with(formula)).expect("the line"))
    };
    // 9.1 kΩ and 470 Ω as the note states them; a negative number behind a sign and a power say what they hold.
    assert_eq!(line("Hydrophone line amplifier", "G = 1 + Rf/Rg"), "G = 1 + 9.1 kΩ/470 Ω");
    assert!(line("Hydrophone line amplifier", "room").ends_with("− (−12 V)"));
    assert!(line("Hydrophone line amplifier", "v ≈").contains("(9 nV/√Hz)²"));
}
