//! The one place where a figure is compared with what it should be.

use std::{
    collections::{BTreeMap, BTreeSet},
    fmt::Write as _,
};

use stageleaf_math::{figure::Figure, report::Outcome};

/// A wanted value in SI units, and how far a result may lie from it.
#[derive(Clone, Debug)]
pub struct Wanted<'a> {
    /// The row's id: `C021`.
    pub id: &'a str,
    /// The value's name within the row.
    pub name: &'a str,
    /// The figure that it checks.
    pub figure: Figure,
    /// The value, SI.
    pub value: f64,
    /// Allowed distance, SI, not below zero.
    pub allowed: f64,
    /// Where the value comes from.
    pub source: &'a str,
}

/// What the comparisons of a run have shown.
#[derive(Debug, Default)]
pub struct Ledger {
    misses: Vec<String>,
    worst: BTreeMap<Figure, (f64, String)>,
    covered: BTreeSet<(String, String)>,
    comparisons: usize,
}

impl Ledger {
    /// Compares an outcome; one without a value is a miss.
    pub fn outcome(&mut self, wanted: &Wanted<'_>, got: &Outcome) {
        match got {
            Outcome::Value(value) => self.value(wanted, *value),
            other => {
                self.covered.insert((wanted.id.to_owned(), wanted.name.to_owned()));
                self.comparisons += 1;
                self.misses.push(format!(
                    "{} {} (`{}`): wanted {:e}, got {other:?}; source: {}",
                    wanted.id,
                    wanted.name,
                    wanted.figure.id(),
                    wanted.value,
                    wanted.source
                ));
            }
        }
    }

    /// Compares a value: absolute difference, no NaN, the same sign. Two infinities of one sign are equal.
    pub fn value(&mut self, wanted: &Wanted<'_>, got: f64) {
        assert!(wanted.allowed >= 0.0, "{} {}: the allowance must not be below zero", wanted.id, wanted.name);
        self.covered.insert((wanted.id.to_owned(), wanted.name.to_owned()));
        self.comparisons += 1;
        let difference = if is_same(got, wanted.value) { 0.0 } else { (got - wanted.value).abs() };
        // Zero has no sign here: a wanted zero may be met from either side.
        let sign_holds = wanted.value == 0.0 || got == 0.0 || (got > 0.0) == (wanted.value > 0.0);
        let within = difference <= wanted.allowed; // false for NaN
        if !within || !sign_holds {
            self.misses.push(format!(
                "{} {} (`{}`): wanted {:e}, got {got:e}, difference {difference:e}, allowed {:e}{}; source: {}",
                wanted.id,
                wanted.name,
                wanted.figure.id(),
                wanted.value,
                wanted.allowed,
                if sign_holds { "" } else { ", wrong sign" },
                wanted.source
            ));
            return;
        }
        let used = if difference == 0.0 { 0.0 } else { difference / wanted.allowed };
        let place = format!("{} {}", wanted.id, wanted.name);
        let worst = self.worst.entry(wanted.figure).or_insert_with(|| (used, place.clone()));
        if used > worst.0 {
            *worst = (used, place);
        }
    }

    /// A statement that is no number: a miss when it does not hold.
    pub fn fact(&mut self, id: &str, name: &str, holds: bool, otherwise: &str) {
        self.covered.insert((id.to_owned(), name.to_owned()));
        self.comparisons += 1;
        if !holds {
            self.misses.push(format!("{id} {name}: {otherwise}"));
        }
    }

    /// Whether any value of this figure was compared.
    pub fn has_compared(&self, figure: Figure) -> bool {
        self.worst.contains_key(&figure) || self.misses.iter().any(|m| m.contains(&format!("(`{}`)", figure.id())))
    }

    /// The values compared so far, by row and name.
    pub const fn covered(&self) -> &BTreeSet<(String, String)> {
        &self.covered
    }

    /// The worst use of each budget, as a table.
    pub fn usage(&self) -> String {
        let mut text = format!("{} comparisons; worst use of each budget:\n", self.comparisons);
        for (figure, (used, place)) in &self.worst {
            writeln!(text, "  {:<28} {:>8.3} %  {place}", figure.id(), used * 100.0).expect("writing to a string cannot fail");
        }
        text
    }

    /// Fails with every miss, if there is any; prints the worst use of each budget.
    pub fn close(&self) {
        println!("{}", self.usage());
        assert!(self.comparisons > 0, "nothing was compared");
        assert!(self.misses.is_empty(), "{} of {} comparisons miss:\n{}", self.misses.len(), self.comparisons, self.misses.join("\n"));
    }
}

fn is_same(a: f64, b: f64) -> bool {
    a.total_cmp(&b).is_eq()
}

/// Half a unit of the last of `digits` significant digits of a printed value.
pub fn half_unit(value: f64, digits: i32) -> f64 {
    if value == 0.0 {
        return 0.0;
    }
    0.5 * libm::pow(10.0, libm::floor(libm::log10(value.abs())) + 1.0 - f64::from(digits))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ledger_after(value: f64, allowed: f64, got: f64) -> Ledger {
        let mut ledger = Ledger::default();
        ledger.value(&Wanted { id: "row", name: "value", figure: Figure::Gain, value, allowed, source: "by hand" }, got);
        ledger
    }

    #[test]
    fn a_value_far_too_small_misses() {
        assert_eq!(ledger_after(10.0, 0.1, -100.0).misses.len(), 1);
        assert_eq!(ledger_after(10.0, 0.1, 9.8).misses.len(), 1);
        assert!(ledger_after(10.0, 0.1, 9.95).misses.is_empty());
    }

    #[test]
    fn nan_misses_whatever_is_allowed() {
        assert_eq!(ledger_after(10.0, f64::INFINITY, f64::NAN).misses.len(), 1);
    }

    #[test]
    fn the_wrong_sign_misses_within_the_allowance() {
        assert_eq!(ledger_after(1e-9, 1e-3, -1e-9).misses.len(), 1);
    }

    #[test]
    fn an_infinite_bound_is_met_by_the_same_infinity_alone() {
        assert!(ledger_after(f64::INFINITY, 0.0, f64::INFINITY).misses.is_empty());
        assert_eq!(ledger_after(f64::INFINITY, 0.0, 1e300).misses.len(), 1);
        assert_eq!(ledger_after(1.0, 0.1, f64::INFINITY).misses.len(), 1);
    }

    #[test]
    fn half_a_unit_of_the_last_digit() {
        assert!((half_unit(9.999_890_001, 10) - 0.5e-9).abs() < 1e-20);
        assert!((half_unit(180.0, 3) - 0.5).abs() < 1e-12);
    }
}
