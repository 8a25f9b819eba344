//! Nothing that an outside source offers is forgotten, and nothing is listed that does not exist.

use std::collections::{BTreeMap, BTreeSet};

use serde::Deserialize;
use stageleaf_math::{figure::Figure, kind::Kind};

use crate::{
    circuits, dc, floating, gain, kinds, ledger::Ledger, loops, noise, oracle, oracle_around, oracle_kinds, oracle_switching, rejection,
    swing, switching, thermal, waveform, whose,
};

/// Rows that are not checked here, with the reason.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Later {
    later: Vec<Reason>,
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Reason {
    ids: Vec<String>,
    /// Names within the rows; all of them when left out.
    #[serde(default)]
    names: Vec<String>,
    reason: String,
}

/// Every comparison of the run.
fn everything() -> Ledger {
    let mut ledger = Ledger::default();
    circuits::all(&mut ledger);
    floating::all(&mut ledger);
    gain::all(&mut ledger);
    loops::all(&mut ledger);
    noise::all(&mut ledger);
    dc::all(&mut ledger);
    swing::all(&mut ledger);
    thermal::all(&mut ledger);
    whose::all(&mut ledger);
    rejection::all(&mut ledger);
    kinds::all(&mut ledger);
    oracle::all(&mut ledger);
    oracle_kinds::all(&mut ledger);
    oracle_around::all(&mut ledger);
    oracle_switching::all(&mut ledger);
    switching::all(&mut ledger);
    waveform::all(&mut ledger);
    ledger
}

fn later(listed: &BTreeMap<String, Vec<String>>) -> BTreeSet<(String, String)> {
    let later: Later = toml::from_str(include_str!("later.toml")).unwrap_or_else(|error| panic!("{error}"));
    let mut all = BTreeSet::new();
    for group in &later.later {
        assert!(!group.reason.is_empty() && !group.ids.is_empty(), "{group:?}");
        for id in &group.ids {
            let names = if group.names.is_empty() {
                listed.get(id).unwrap_or_else(|| panic!("later.toml names {id}, which is not listed")).clone()
            } else {
                group.names.clone()
            };
            for name in names {
                assert!(all.insert((id.clone(), name.clone())), "later.toml names {id} {name} twice");
            }
        }
    }
    all
}

#[test]
fn every_listed_value_is_checked_or_stands_in_later() {
    let text = include_str!("listed.toml");
    let listed: BTreeMap<String, Vec<String>> = toml::from_str(text).unwrap_or_else(|error| panic!("{error}"));
    let listed_pairs: BTreeSet<_> = listed.iter().flat_map(|(id, names)| names.iter().map(move |n| (id.clone(), n.clone()))).collect();
    let ledger = everything();
    let checked: BTreeSet<_> = ledger.covered().intersection(&listed_pairs).cloned().collect();
    let later = later(&listed);

    let unknown: Vec<_> = later.difference(&listed_pairs).collect();
    assert!(unknown.is_empty(), "later.toml names what is not listed: {unknown:?}");
    let both: Vec<_> = later.intersection(&checked).collect();
    assert!(both.is_empty(), "checked, and still in later.toml: {both:?}");
    let forgotten: Vec<_> = listed_pairs.iter().filter(|p| !checked.contains(*p) && !later.contains(*p)).collect();
    assert!(forgotten.is_empty(), "neither checked nor in later.toml: {forgotten:?}");
}

#[test]
fn every_row_of_the_tables_is_listed() {
    let listed: BTreeMap<String, Vec<String>> = toml::from_str(include_str!("listed.toml")).unwrap_or_else(|error| panic!("{error}"));
    for text in [gain::TABLE, loops::TABLE, noise::TABLE, dc::TABLE, swing::TABLE, kinds::TABLE, switching::TABLE] {
        let rows = crate::table::Rows::read(text);
        for id in rows.ids() {
            assert!(listed.contains_key(id), "{id} is not in listed.toml");
        }
    }
}

/// Figures that no outside value reaches yet, with the reason.
const UNCHECKED: &[(Figure, &str)] = &[];

#[test]
fn every_figure_is_checked_against_something_outside() {
    let ledger = everything();
    let unchecked: Vec<_> = Figure::ALL.iter().filter(|&&figure| !ledger.has_compared(figure)).collect();
    let excused: Vec<_> = UNCHECKED.iter().map(|(figure, _)| figure).collect();
    assert_eq!(unchecked, excused, "left: without an outside check; right: excused");
}

#[test]
fn every_kind_has_a_circuit_from_outside() {
    let present: BTreeSet<&str> = Kind::ALL.iter().map(|kind| kind.id()).collect();
    let solved: BTreeSet<String> =
        circuits::kinds().into_iter().chain(oracle::kinds()).chain(oracle_kinds::kinds()).chain(oracle_switching::kinds()).collect();
    let without: Vec<_> = present.iter().filter(|kind| !solved.contains(**kind)).collect();
    assert!(without.is_empty(), "kinds without a circuit solved outside: {without:?}");
    let unknown: Vec<_> = solved.iter().filter(|kind| !present.contains(kind.as_str())).collect();
    assert!(unknown.is_empty(), "circuits of kinds that do not exist: {unknown:?}");
}

#[test]
fn worst_use_of_each_budget() {
    everything().close();
}
