//! The worst case over tolerances, supply, temperature and part figures.
//!
//! # Formula
//! Each parameter is moved alone to both ends of its range; the sign of what that does to a figure picks the corner at which the
//! figure is least, and the one at which it is greatest. Both corners are solved in full. The range is never narrower than what
//! any solved build showed.
//!
//! # Does not apply
//! A figure whose extreme lies inside the range of several parameters at once, or where parameters act together against their
//! single signs.
//!
//! # Source
//! Vertex analysis by signed sensitivities: R. Spence, R. S. Soin, *Tolerance Design of Electronic Circuits*, Addison-Wesley 1988,
//! from memory.

use alloc::{collections::BTreeMap, rc::Rc, vec::Vec};

use super::{lacking, touched_by, value};
use crate::{
    figure::Query,
    limit::Basis,
    model::Model,
    parameters::{Entry, Grade, touch},
    report::{Coordinate, Outcome, Parameter},
    solution::{Roots, Solution},
};

/// Where a parameter stands in a corner.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum End {
    Nominal,
    Low,
    High,
}

/// A stage's builds: the nominal one, one per moved parameter, and the corners that figures ask for.
#[derive(Debug)]
pub struct Spread<'m> {
    model: &'m Model<'m>,
    /// The nominal build.
    pub nominal: Solution<'m>,
    near: &'m Roots,
    moved: Vec<[Option<Rc<Solution<'m>>>; 2]>,
    probes: Vec<Option<Rc<Solution<'m>>>>,
    corners: BTreeMap<Vec<(usize, bool)>, Rc<Solution<'m>>>,
    known: Vec<(Query, Rc<Extremes>)>,
}

/// A figure at its two worst corners.
#[derive(Clone, Debug)]
pub struct Extremes {
    /// At nominal values.
    pub centre: Outcome,
    /// Where it is least.
    pub low: Extreme,
    /// Where it is greatest.
    pub high: Extreme,
    /// With each parameter at its ends, by slot; `None` where it has no value or was not moved.
    seen: Vec<(usize, [Option<f64>; 2])>,
}

/// One of them.
#[derive(Clone, Debug)]
pub struct Extreme {
    /// The figure there.
    pub outcome: Outcome,
    /// The corner: coordinates off nominal that matter.
    pub corner: Vec<Coordinate>,
    /// What each parameter alone does to the figure on the way there, by slot.
    pub effects: Vec<(usize, f64)>,
    ends: Vec<(usize, bool)>,
}

impl<'m> Spread<'m> {
    /// Starts with the nominal build. `near` are its roots.
    #[must_use]
    pub fn new(model: &'m Model<'m>, near: &'m Roots) -> Self {
        let slots = model.parameters.entries.len();
        Self {
            model,
            nominal: Solution::new(model, model.parameters.nominal(), Some(near)),
            near,
            moved: (0..slots).map(|_| [None, None]).collect(),
            probes: (0..=slots).map(|_| None).collect(),
            corners: BTreeMap::new(),
            known: Vec::new(),
        }
    }

    fn build(&self, changes: &[(usize, f64)]) -> Rc<Solution<'m>> {
        let mut values = self.nominal.values.clone();
        for &(slot, value) in changes {
            values[slot] = value;
        }
        Rc::new(Solution::new(self.model, values, Some(self.near)))
    }

    fn moved(&mut self, slot: usize, high: bool) -> Rc<Solution<'m>> {
        let side = usize::from(high);
        if self.moved[slot][side].is_none() {
            self.moved[slot][side] = Some(self.build(&[(slot, self.end(slot, high))]));
        }
        self.moved[slot][side].clone().expect("just built")
    }

    fn corner(&mut self, ends: &[(usize, bool)]) -> Rc<Solution<'m>> {
        if let Some(found) = self.corners.get(ends) {
            return found.clone();
        }
        let changes: Vec<(usize, f64)> = ends.iter().map(|&(slot, high)| (slot, self.end(slot, high))).collect();
        let solution = if let [(slot, high)] = *ends { self.moved(slot, high) } else { self.build(&changes) };
        self.corners.insert(ends.to_vec(), solution.clone());
        solution
    }

    /// The figure's least and greatest value over the spread.
    pub fn extremes(&mut self, query: Query) -> Rc<Extremes> {
        if let Some((_, known)) = self.known.iter().find(|(q, _)| *q == query) {
            return known.clone();
        }
        let found = Rc::new(self.search(query));
        self.known.push((query, found.clone()));
        found
    }

    fn search(&mut self, query: Query) -> Extremes {
        let centre = lacking(&self.nominal, query).unwrap_or_else(|| value(&self.nominal, query));
        if matches!(centre, Outcome::Undetermined(_) | Outcome::DoesNotApply(_) | Outcome::NoDcPath) {
            let same = Extreme { outcome: centre.clone(), corner: Vec::new(), effects: Vec::new(), ends: Vec::new() };
            return Extremes { centre, low: same.clone(), high: same, seen: Vec::new() };
        }
        let touched = touched_by(query.figure);
        let mut low = Search::new(&centre);
        let mut high = Search::new(&centre);
        let mut all = Vec::new();
        let mut bad: Option<(Outcome, Vec<(usize, bool)>)> = None;
        let slots: Vec<usize> = self
            .model
            .parameters
            .entries
            .iter()
            .enumerate()
            .filter(|(_, e)| e.touches & touched != 0 && e.low < e.high)
            .map(|(slot, _)| slot)
            .collect();
        for slot in slots {
            let Entry { nominal, low: lower, high: upper, .. } = self.model.parameters.entries[slot];
            let mut seen = [None, None];
            for side in [false, true] {
                let end = if side { upper } else { lower };
                if (end - nominal).abs() <= 0.0 {
                    continue;
                }
                let there = value(&self.moved(slot, side), query);
                match there.value() {
                    Some(v) => seen[usize::from(side)] = Some(v),
                    // What does not apply there (no complex poles, say) takes nothing away here.
                    None if matches!(there, Outcome::DoesNotApply(_)) => {}
                    None => bad = bad.or(Some((there, alloc::vec![(slot, side)]))),
                }
            }
            all.push((slot, seen));
            low.consider(slot, seen, |candidate, best| candidate < best);
            high.consider(slot, seen, |candidate, best| candidate > best);
        }
        let mut finish = |search: Search, better: fn(f64, f64) -> bool| -> Extreme {
            let mut result = value(&self.corner(&search.ends), query);
            let mut ends = search.ends;
            // Never narrower than what a single parameter, or none, already showed.
            if let (Some(v), Some((single, at))) = (result.value(), search.best_single)
                && better(single, v)
            {
                result = Outcome::Value(single);
                ends = alloc::vec![at];
            }
            if let (Some(v), Some(centre)) = (result.value(), search.centre)
                && better(centre, v)
            {
                result = Outcome::Value(centre);
                ends.clear();
            }
            if result.value().is_some()
                && let Some((outcome, at)) = &bad
            {
                result = outcome.clone();
                ends.clone_from(at);
            }
            let corner = self.coordinates(&ends, &search.effects);
            Extreme { outcome: result, corner, effects: search.effects, ends }
        };
        let low = finish(low, |a, b| a < b);
        let high = finish(high, |a, b| a > b);
        Extremes { centre, low, high, seen: all }
    }

    /// The stage's kind.
    #[must_use]
    pub fn kind(&self) -> crate::kind::Kind {
        self.model.stage.kind
    }

    /// What the slot holds.
    #[must_use]
    pub fn parameter(&self, slot: usize) -> Parameter {
        self.model.parameters.entries[slot].parameter
    }

    /// Builds with the part's DC figures at their worse ends, at all ends of temperature and supplies.
    pub fn dc_corners(&mut self) -> Vec<Rc<Solution<'m>>> {
        let parameters = &self.model.parameters;
        let mut worse: Vec<(usize, bool)> = Vec::new();
        for (slot, entry) in parameters.entries.iter().enumerate() {
            let figure = match entry.parameter {
                Parameter::Part(figure) | Parameter::PartOf(_, figure) => figure,
                _ => continue,
            };
            if entry.touches & touch::DC != 0 && entry.touches & touch::NETWORK == 0 && entry.low < entry.high {
                worse.push((slot, matches!(figure.worse(), crate::part::Worse::High)));
            }
        }
        let mut free: Vec<usize> = parameters.temperature().into_iter().collect();
        free.extend(parameters.supply().into_iter().flat_map(|(positive, negative)| [positive, negative]));
        free.retain(|&slot| parameters.entries[slot].low < parameters.entries[slot].high);
        (0..1_usize << free.len())
            .map(|choice| {
                let mut ends = worse.clone();
                ends.extend(free.iter().enumerate().map(|(i, &slot)| (slot, choice >> i & 1 == 1)));
                ends.sort_unstable();
                self.corner(&ends)
            })
            .collect()
    }

    /// The coordinates that matter: those that alone do at least a hundredth of what all do together.
    fn coordinates(&self, ends: &[(usize, bool)], effects: &[(usize, f64)]) -> Vec<Coordinate> {
        let total: f64 = effects.iter().map(|(_, e)| e.abs()).filter(|e| e.is_finite()).sum();
        ends.iter()
            .filter(|(slot, _)| effects.iter().find(|(s, _)| s == slot).is_none_or(|(_, e)| e.abs() >= 0.01 * total))
            .map(|&(slot, high)| {
                let entry = &self.model.parameters.entries[slot];
                Coordinate { parameter: entry.parameter, value: self.end(slot, high), nominal: entry.nominal }
            })
            .collect()
    }

    /// What the figure at one of its extremes rests on. A part figure counts when moving it by its spread, or by a fifth where it
    /// has none, changes the figure by more than `tolerance`.
    ///
    /// It is moved from the nominal build; where the figure is flat there (no peaking, an unlimited margin) and not at the extreme,
    /// from the extreme's.
    pub fn basis(&mut self, query: Query, extremes: &Extremes, extreme: &Extreme, tolerance: f64) -> Basis {
        let at_extreme = flat(query, &extremes.centre) && !flat(query, &extreme.outcome);
        let touched = touched_by(query.figure);
        let (mut guaranteed, mut typical) = (false, false);
        for slot in 0..self.model.parameters.entries.len() {
            let entry = self.model.parameters.entries[slot];
            let of_part = matches!(entry.parameter, Parameter::Part(_) | Parameter::PartOf(..) | Parameter::Headroom);
            if !of_part || entry.touches & touched == 0 {
                continue;
            }
            let end = extreme.ends.iter().find(|(s, _)| *s == slot);
            let counts = if at_extreme {
                let moved = if end.is_some() { entry.nominal } else { entry.nominal * 1.2 };
                let there = value(&self.off_corner(&extreme.ends, slot, moved), query);
                changes(&extreme.outcome, &there, tolerance)
            } else if entry.low < entry.high {
                extremes.seen.iter().find(|(s, _)| *s == slot).is_none_or(|(_, ends)| {
                    let moved = |end: usize, at: f64| match ends[end] {
                        Some(v) => changes(&extremes.centre, &Outcome::Value(v), tolerance),
                        None => (at - entry.nominal).abs() > 0.0,
                    };
                    moved(0, entry.low) || moved(1, entry.high)
                })
            } else if matches!(entry.parameter, Parameter::Headroom) {
                matches!(query.figure, crate::figure::Figure::ClipMargin)
            } else {
                let probe = self.probe(slot, entry.nominal * 1.2);
                changes(&extremes.centre, &value(&probe, query), tolerance)
            };
            if counts {
                let end = match end {
                    None => End::Nominal,
                    Some((_, false)) => End::Low,
                    Some((_, true)) => End::High,
                };
                match entry.grade[end as usize] {
                    Grade::Guaranteed => guaranteed = true,
                    Grade::Typical => typical = true,
                    Grade::Stated => {}
                }
            }
        }
        // Higher poles have no guaranteed value on any data sheet.
        if self.model.poles.iter().flatten().any(|p| !p.is_empty()) && touched & ON_POLES != 0 {
            let slot = self.model.parameters.pole_factor();
            let (from, there) = if at_extreme {
                (&extreme.outcome, value(&self.off_corner(&extreme.ends, slot, 1.2), query))
            } else {
                (&extremes.centre, value(&self.probe(slot, 1.2), query))
            };
            typical |= changes(from, &there, tolerance);
        }
        match (guaranteed, typical) {
            (true, true) => Basis::Mixed,
            (false, true) => Basis::Typical,
            _ => Basis::Guaranteed,
        }
    }

    /// A corner with one value changed.
    fn off_corner(&self, ends: &[(usize, bool)], slot: usize, value: f64) -> Rc<Solution<'m>> {
        let mut changes: Vec<(usize, f64)> = ends.iter().map(|&(s, high)| (s, self.end(s, high))).collect();
        changes.push((slot, value));
        self.build(&changes)
    }

    fn end(&self, slot: usize, high: bool) -> f64 {
        let entry = &self.model.parameters.entries[slot];
        if high { entry.high } else { entry.low }
    }

    fn probe(&mut self, slot: usize, value: f64) -> Rc<Solution<'m>> {
        if self.probes[slot].is_none() {
            self.probes[slot] = Some(self.build(&[(slot, value)]));
        }
        self.probes[slot].clone().expect("just built")
    }
}

/// Results that higher poles can change.
const ON_POLES: u8 = touch::NETWORK | touch::NOISE | touch::SWING;

/// Where a figure does not answer to small changes: a bound that is not reached, a peak that is none.
fn flat(query: Query, outcome: &Outcome) -> bool {
    outcome.value().is_some_and(|v| v.is_infinite() || matches!(query.figure, crate::figure::Figure::Peaking) && v <= 1.0)
}

fn changes(centre: &Outcome, there: &Outcome, tolerance: f64) -> bool {
    match (centre.value(), there.value()) {
        (Some(a), Some(b)) if a.is_finite() && b.is_finite() => (a - b).abs() > tolerance,
        (Some(a), Some(b)) => a.is_finite() != b.is_finite(),
        (None, None) => false,
        _ => true,
    }
}

/// Gathers the corner at which a figure is most extreme in one direction.
struct Search {
    centre: Option<f64>,
    ends: Vec<(usize, bool)>,
    effects: Vec<(usize, f64)>,
    best_single: Option<(f64, (usize, bool))>,
}

impl Search {
    fn new(centre: &Outcome) -> Self {
        Self { centre: centre.value(), ends: Vec::new(), effects: Vec::new(), best_single: None }
    }

    fn consider(&mut self, slot: usize, seen: [Option<f64>; 2], better: impl Fn(f64, f64) -> bool) {
        let Some(centre) = self.centre else { return };
        let mut best = centre;
        let mut end = None;
        for (side, value) in [(false, seen[0]), (true, seen[1])] {
            if let Some(v) = value
                && better(v, best)
            {
                best = v;
                end = Some(side);
            }
        }
        if let Some(side) = end {
            self.ends.push((slot, side));
            self.effects.push((slot, best - centre));
            if self.best_single.is_none_or(|(b, _)| better(best, b)) {
                self.best_single = Some((best, (slot, side)));
            }
        }
    }
}
