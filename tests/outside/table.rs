//! The tables of handbook rows, as they stand in the files.

use serde::Deserialize;
use stageleaf_math::{figure::Figure, report::Outcome};

use crate::ledger::{Ledger, Wanted};

/// A file of rows.
#[derive(Debug, Deserialize)]
pub struct Rows {
    check: Vec<Row>,
}

impl Rows {
    /// Reads a table that stands beside this file.
    pub fn read(text: &str) -> Self {
        toml::from_str(text).unwrap_or_else(|error| panic!("{error}"))
    }

    /// The row called `id`.
    pub fn row(&self, id: &str) -> &Row {
        self.check.iter().find(|row| row.id == id).unwrap_or_else(|| panic!("no row is called {id}"))
    }

    /// The ids of all rows.
    pub fn ids(&self) -> impl Iterator<Item = &str> {
        self.check.iter().map(|row| row.id.as_str())
    }
}

/// A row: a check with its source.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Row {
    id: String,
    title: String,
    source: String,
    status: String,
    #[serde(default)]
    formula: String,
    #[serde(default)]
    note: String,
    recomputed_by: String,
    inputs: toml::Table,
    expected: Vec<Expected>,
    #[serde(default)]
    published: Vec<Published>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    name: String,
    value: f64,
    unit: String,
    relative: Option<f64>,
    absolute: Option<f64>,
}

/// What the source prints; the exact value stands among the expected ones.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Published {
    name: String,
    printed: f64,
    rounding: f64,
    agrees: bool,
}

impl Row {
    /// An input.
    pub fn input(&self, name: &str) -> f64 {
        self.inputs.get(name).and_then(toml::Value::as_float).unwrap_or_else(|| panic!("{} has no number `{name}`", self.id))
    }

    /// A list of inputs.
    pub fn inputs(&self, name: &str) -> Vec<f64> {
        let list = self.inputs.get(name).and_then(toml::Value::as_array).unwrap_or_else(|| panic!("{} has no list `{name}`", self.id));
        list.iter().map(|v| v.as_float().unwrap_or_else(|| panic!("{}: `{name}` holds something else than numbers", self.id))).collect()
    }

    /// An expected value, in the row's unit.
    pub fn expected(&self, name: &str) -> f64 {
        self.entry(name).value
    }

    fn entry(&self, name: &str) -> &Expected {
        self.expected.iter().find(|e| e.name == name).unwrap_or_else(|| panic!("{} expects no `{name}`", self.id))
    }

    /// Compares a result, given in the row's unit, with the value called `name`; and with what the source prints.
    pub fn check(&self, ledger: &mut Ledger, name: &str, figure: Figure, got: &Outcome) {
        let entry = self.entry(name);
        let allowed = match (entry.relative, entry.absolute) {
            // A relative tolerance about zero allows nothing: there it is one of the unit.
            (Some(fraction), None) if entry.value == 0.0 => fraction,
            (Some(fraction), None) => fraction * entry.value.abs(),
            (None, Some(distance)) => distance,
            _ => panic!("{} `{name}` needs one tolerance", self.id),
        };
        let source = format!("{} [{}] ({})", self.source, self.status, entry.unit);
        let id = &self.id;
        ledger.outcome(&Wanted { id, name, figure, value: entry.value, allowed, source: &source }, got);
        let Some(value) = got.value() else { return };
        for published in self.published.iter().filter(|p| p.name == name) {
            let agrees = (value - published.printed).abs() <= published.rounding;
            let otherwise = format!(
                "{value:e} against {:e} as printed (± {:e}) in {}: agrees = {agrees}, the table says {}; {}",
                published.printed, published.rounding, self.source, published.agrees, self.note
            );
            ledger.fact(id, name, agrees == published.agrees, &otherwise);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_row_names_its_source_and_its_status() {
        for text in [
            crate::gain::TABLE,
            crate::loops::TABLE,
            crate::noise::TABLE,
            crate::dc::TABLE,
            crate::swing::TABLE,
            crate::kinds::TABLE,
            crate::switching::TABLE,
        ] {
            for row in Rows::read(text).check {
                assert!(!row.title.is_empty() && !row.recomputed_by.is_empty(), "{}", row.id);
                assert!(!row.source.is_empty(), "{} names no source", row.id);
                let known = ["looked up", "from memory", "exact mathematics"];
                assert!(known.iter().any(|word| row.status.contains(word)), "{}: status {:?}", row.id, row.status);
                assert!(
                    row.published.iter().all(|p| p.agrees || !row.note.is_empty()),
                    "{}: a source found wrong, without the reason",
                    row.id
                );
                assert!(!row.formula.is_empty() || !row.expected.is_empty(), "{}", row.id);
            }
        }
    }
}
