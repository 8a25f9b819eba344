//! The worst case over tolerances, supply, temperature and part figures.
//!
//! # Formula
//! Each parameter is moved alone to both ends of its range, and through it where the range is wide (a load capacitance from none to
//! a cable's); what that does to a figure picks the corner at which the figure is least, and the one at which it is greatest. At
//! either corner, parameters that did nothing alone (a drift at the temperature where the offset holds, a rejection without a
//! deviation of the supply), the temperature and the supplies are moved once more. The range is never narrower than what any solved
//! build showed. A comparator's input errors have either sign and are none at nominal values, so that at its corners every parameter is
//! moved again.
//!
//! # Does not apply
//! A figure whose extreme lies inside the ranges of several parameters at once, or where parameters act together against their
//! single effects.
//!
//! # Source
//! Vertex analysis by signed sensitivities: R. Spence, R. S. Soin, *Tolerance Design of Electronic Circuits*, Addison-Wesley 1988,
//! from memory.

use alloc::{rc::Rc, vec::Vec};

use super::{lacking, reaches, touched_by, value};
use crate::{
    dimension::Dimension,
    figure::{Figure, Query},
    kept::Kept,
    limit::Basis,
    model::Model,
    parameters::{Entry, Grade, touch},
    part::PartFigure,
    report::{Coordinate, Outcome, Parameter},
    solution::{Roots, Solution},
    together,
};

/// Where a parameter stands in a corner.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Place {
    /// The lower end of its range.
    Low,
    /// The upper end.
    High,
    /// This many quarters of the way from the lower to the upper end, in proportion.
    Inside(u8),
}

/// How many places there are.
const PLACES: usize = 5;

impl Place {
    /// Its number.
    const fn index(self) -> usize {
        match self {
            Self::Low => 0,
            Self::High => 1,
            Self::Inside(quarters) => 1 + quarters as usize,
        }
    }

    /// The value there.
    fn of(self, entry: &Entry) -> f64 {
        match self {
            Self::Low => entry.low,
            Self::High => entry.high,
            Self::Inside(quarters) => entry.low * libm::pow(entry.high / entry.low, f64::from(quarters) / 4.0),
        }
    }

    /// The grade of that value: inside, that of the nominal one.
    const fn grade(self, entry: &Entry) -> Grade {
        match self {
            Self::Inside(_) => entry.grade[0],
            Self::Low => entry.grade[1],
            Self::High => entry.grade[2],
        }
    }
}

/// A range counts as wide, and is looked through, from this ratio on.
const WIDE: f64 = 1.5;

/// The places to which a parameter is moved.
fn places(entry: &Entry) -> impl Iterator<Item = Place> + use<> {
    // A part's figures act in one direction; what stands around it (a cable's capacitance, say) may not.
    let of_part = matches!(entry.parameter, Parameter::Part(_) | Parameter::PartOf(..) | Parameter::Headroom);
    let wide = !of_part && entry.low > 0.0 && entry.high >= WIDE * entry.low;
    let inside = if wide { 1..4 } else { 0..0 };
    [Place::Low, Place::High].into_iter().chain(inside.map(Place::Inside))
}

/// A parameter's slot and where it stands.
type Move = (usize, Place);

/// A move as one number.
fn code(at: Move) -> u16 {
    u16::try_from(at.0 * PLACES + at.1.index()).unwrap_or(u16::MAX)
}

/// A stage's builds: the nominal one, one per moved parameter, and the corners that figures ask for.
#[derive(Debug)]
pub struct Spread<'m> {
    model: &'m Model<'m>,
    /// The nominal build.
    pub nominal: Rc<Solution<'m>>,
    /// Builds by what the network depends on.
    networks: Kept<Vec<(usize, u64)>, Rc<Solution<'m>>>,
    near: &'m Roots,
    /// By slot and place.
    moved: Vec<[Option<Rc<Solution<'m>>>; PLACES]>,
    probes: Vec<Option<Rc<Solution<'m>>>>,
    corners: Kept<Vec<u16>, Rc<Solution<'m>>>,
    known: Vec<(Query, Rc<Extremes>)>,
    /// Searches whose corners are not looked at yet.
    begun: Vec<(Query, Begun)>,
    /// Whether what the network depends on was moved.
    together: bool,
}

/// A search that knows where to look.
#[derive(Debug)]
struct Begun {
    centre: Outcome,
    low: Search,
    high: Search,
    seen: Vec<(Move, f64)>,
    again: Vec<usize>,
    bad: Option<(Outcome, Vec<Move>)>,
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
    /// With each parameter moved alone, where it has a value there.
    seen: Vec<(Move, f64)>,
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
    ends: Vec<Move>,
}

impl<'m> Spread<'m> {
    /// Starts with the nominal build. `near` are its roots.
    #[must_use]
    pub fn new(model: &'m Model<'m>, near: &'m Roots) -> Self {
        let slots = model.parameters.entries.len();
        Self {
            model,
            nominal: Rc::new(Solution::new(model, model.parameters.nominal(), Some(near))),
            networks: Kept::default(),
            near,
            moved: (0..slots).map(|_| [const { None }; PLACES]).collect(),
            probes: (0..=slots).map(|_| None).collect(),
            corners: Kept::default(),
            known: Vec::new(),
            begun: Vec::new(),
            // A comparator's builds need no expansions.
            together: model.stage.kind.switches(),
        }
    }

    /// Begins the search for several figures, and solves the corners that it leads to side by side.
    pub fn prepare(&mut self, queries: impl Iterator<Item = Query>) {
        let mut corners: Vec<Vec<(usize, f64)>> = Vec::new();
        for query in queries {
            let Ok(begun) = self.begin(query) else { continue };
            for search in [&begun.low, &begun.high] {
                let corner: Vec<(usize, f64)> =
                    search.ends.iter().filter(|at| self.of_network(at.0)).map(|&at| (at.0, self.place(at))).collect();
                if !self.kind().switches() && corner.len() > 1 && !corners.contains(&corner) && self.networks.get(&key(&corner)).is_none() {
                    corners.push(corner);
                }
            }
            self.begun.push((query, begun));
        }
        for (corner, build) in corners.iter().zip(together::solve(&self.nominal, Some(self.near), &corners)) {
            self.networks.insert(key(corner), Rc::new(build));
        }
    }

    /// Whether the network depends on a slot; the factor on the poles stands behind the table.
    fn of_network(&self, slot: usize) -> bool {
        self.model.parameters.entries.get(slot).is_none_or(|e| e.touches & touch::NETWORK != 0)
    }

    /// Moves each parameter that the network depends on, alone, to all its places.
    fn move_all(&mut self) {
        self.together = true;
        let mut moves: Vec<Move> = Vec::new();
        for (slot, entry) in self.model.parameters.entries.iter().enumerate() {
            if entry.touches & touch::NETWORK != 0 && entry.low < entry.high {
                moves.extend(places(entry).filter(|p| (p.of(entry) - entry.nominal).abs() > 0.0).map(|place| (slot, place)));
            }
        }
        let changes: Vec<Vec<(usize, f64)>> = moves.iter().map(|&at| alloc::vec![(at.0, self.place(at))]).collect();
        for ((at, change), build) in moves.iter().zip(&changes).zip(together::solve(&self.nominal, Some(self.near), &changes)) {
            let build = Rc::new(build);
            self.networks.insert(key(change), build.clone());
            self.moved[at.0][at.1.index()] = Some(build);
        }
    }

    /// A build with these values; builds that differ in nothing that the network depends on share its transfers.
    fn build(&mut self, changes: &[(usize, f64)]) -> Rc<Solution<'m>> {
        let alone: Vec<(usize, f64)> = changes.iter().copied().filter(|(slot, _)| self.of_network(*slot)).collect();
        let network = match self.networks.get(&key(&alone)) {
            _ if alone.is_empty() => self.nominal.clone(),
            Some(network) => network.clone(),
            None => {
                let network = Rc::new(self.nominal.moved(Some(self.near), &alone));
                self.networks.insert(key(&alone), network.clone());
                network
            }
        };
        if alone.len() == changes.len() {
            return network;
        }
        let mut values = self.nominal.values.clone();
        for &(slot, value) in changes {
            values[slot] = value;
        }
        Rc::new(Solution::beside(network, values))
    }

    fn moved(&mut self, at: Move) -> Rc<Solution<'m>> {
        if let Some(found) = &self.moved[at.0][at.1.index()] {
            return found.clone();
        }
        if !self.together && self.of_network(at.0) {
            self.move_all();
            return self.moved(at);
        }
        let solution = self.build(&[(at.0, self.place(at))]);
        self.moved[at.0][at.1.index()] = Some(solution.clone());
        solution
    }

    fn corner(&mut self, ends: &[Move]) -> Rc<Solution<'m>> {
        if let [at] = *ends {
            return self.moved(at);
        }
        let places: Vec<u16> = ends.iter().map(|at| code(*at)).collect();
        if let Some(found) = self.corners.get(&places) {
            return found.clone();
        }
        let changes: Vec<(usize, f64)> = ends.iter().map(|&at| (at.0, self.place(at))).collect();
        let solution = self.build(&changes);
        self.corners.insert(places, solution.clone());
        solution
    }

    fn place(&self, at: Move) -> f64 {
        at.1.of(&self.model.parameters.entries[at.0])
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
        let begun = match self.begun.iter().position(|(q, _)| *q == query) {
            Some(at) => Ok(self.begun.swap_remove(at).1),
            None => self.begin(query),
        };
        let Begun { centre, low, high, seen, again, bad } = match begun {
            Ok(begun) => begun,
            Err(centre) => {
                let same = Extreme { outcome: centre.clone(), corner: Vec::new(), effects: Vec::new(), ends: Vec::new() };
                return Extremes { centre, low: same.clone(), high: same, seen: Vec::new() };
            }
        };
        let mut low = self.finish(query, low, &again, &bad, |a, b| a < b);
        if matches!(query.figure, Figure::StageCmrr | Figure::StageCmrrAt) && self.model.drives.len() > 1 {
            self.turn_to_worst_mismatch(query, &mut low);
        }
        let high = self.finish(query, high, &again, &bad, |a, b| a > b);
        Extremes { centre, low, high, seen }
    }

    /// Moves each parameter alone; the nominal outcome where there is nothing to move.
    fn begin(&mut self, query: Query) -> Result<Begun, Outcome> {
        let centre = lacking(&self.nominal, query).unwrap_or_else(|| value(&self.nominal, query));
        if matches!(
            centre,
            Outcome::Undetermined(_)
                | Outcome::DoesNotApply(_)
                | Outcome::NoDcPath(_)
                | Outcome::NoSteadyTemperature
                | Outcome::OutOfReach(_)
        ) {
            return Err(centre);
        }
        let touched = touched_by(query.figure);
        let mut low = Search::new(&centre);
        let mut high = Search::new(&centre);
        let mut all = Vec::new();
        let mut bad: Option<(Outcome, Vec<Move>)> = None;
        let movable = |e: &Entry| e.touches & touched != 0 && e.low < e.high && reaches(self.model, e.parameter, query.figure);
        let slots: Vec<usize> =
            self.model.parameters.entries.iter().enumerate().filter(|(_, e)| movable(e)).map(|(slot, _)| slot).collect();
        let at_dc = super::at_dc(&self.nominal, query.figure);
        for &slot in &slots {
            let entry = self.model.parameters.entries[slot];
            let mut seen = Vec::new();
            for place in places(&entry) {
                if (place.of(&entry) - entry.nominal).abs() <= 0.0 {
                    continue;
                }
                let moved = self.moved((slot, place));
                let there = if at_dc && self.model.reactive(slot) {
                    super::unfit(&moved, query).unwrap_or_else(|| centre.clone())
                } else {
                    value(&moved, query)
                };
                match there.value() {
                    Some(v) => seen.push(((slot, place), v)),
                    // What does not apply there (no complex poles, say) takes nothing away here.
                    None if matches!(there, Outcome::DoesNotApply(_)) => {}
                    None => bad = bad.or(Some((there, alloc::vec![(slot, place)]))),
                }
            }
            low.consider(&seen, |candidate, best| candidate < best);
            high.consider(&seen, |candidate, best| candidate > best);
            all.extend(seen);
        }
        // DC errors are sums of products; swing and heat have them in them. What touches the network or the noise acts alone already.
        let products = touched & (touch::DC | touch::SWING | touch::POWER) != 0;
        let again: Vec<usize> = if self.kind().switches() {
            // At nominal values a comparator has no input errors, and its builds cost little: everything is looked at again, three times.
            slots.iter().cycle().take(3 * slots.len()).copied().collect()
        } else {
            // So does a gain, by the common-mode error: its sign times the rejection, on whatever network the corner has.
            let product = |slot: usize| products || self.model.parameters.entries[slot].touches & touch::NETWORK == 0;
            let reached = |slot: usize| !(at_dc && self.model.reactive(slot));
            let deserves = |slot: usize| product(slot) && reached(slot) && self.deserves_another_look(slot, &centre, &all);
            slots.into_iter().filter(|&slot| deserves(slot)).collect()
        };
        Ok(Begun { centre, low, high, seen: all, again, bad })
    }

    /// The rejection is the magnitude of a mismatch that several resistors make with either sign: alone, each makes it worse both ways,
    /// and only together do they add up. So the corner is sought by the signed common-mode gain, at its least and at its greatest; away
    /// from DC by its two parts.
    fn turn_to_worst_mismatch(&mut self, query: Query, low: &mut Extreme) {
        self.turn_to_mismatch(query, low, |solution, omega| solution.transfer(1, omega).re);
        if query.at.is_some() {
            self.turn_to_mismatch(query, low, |solution, omega| solution.transfer(1, omega).im);
        }
    }

    fn turn_to_mismatch(&mut self, query: Query, low: &mut Extreme, part: fn(&Solution<'_>, f64) -> f64) {
        let omega = self.nominal.scaled(query.at.unwrap_or(0.0));
        let signed = |solution: &Solution<'_>| part(solution, omega);
        let centre = signed(&self.nominal);
        let slots: Vec<usize> = (0..self.model.parameters.entries.len())
            .filter(|&slot| {
                let entry = &self.model.parameters.entries[slot];
                entry.low < entry.high && entry.touches & touch::DC != 0
            })
            .collect();
        for greatest in [false, true] {
            let mut ends: Vec<Move> = low.ends.iter().copied().filter(|(s, _)| !slots.contains(s)).collect();
            let mut effects = Vec::new();
            for &slot in &slots {
                // Less rejection of the amplifier's own makes the whole worse, whatever the resistors do.
                let parameter = self.model.parameters.entries[slot].parameter;
                if matches!(parameter, Parameter::Part(PartFigure::Cmrr) | Parameter::PartOf(_, PartFigure::Cmrr)) {
                    ends.push((slot, Place::Low));
                    continue;
                }
                let mut best = (0.0, None);
                for place in [Place::Low, Place::High] {
                    let effect = signed(&self.moved((slot, place))) - centre;
                    if if greatest { effect > best.0 } else { effect < best.0 } {
                        best = (effect, Some(place));
                    }
                }
                match best {
                    (effect, Some(place)) => {
                        ends.push((slot, place));
                        effects.push((slot, effect));
                    }
                    // What no resistor's mismatch answers to (the amplifier's own rejection) stays where it was worst.
                    (_, None) => ends.extend(low.ends.iter().copied().filter(|(s, _)| *s == slot)),
                }
            }
            ends.sort_unstable();
            let there = value(&self.corner(&ends), query);
            if let (Some(new), Some(old)) = (there.value(), low.outcome.value())
                && new < old
            {
                *low = Extreme { outcome: there, corner: self.coordinates(&ends, &effects), effects, ends };
            }
        }
    }

    /// Whether a parameter may do at a corner what it does not do alone.
    fn deserves_another_look(&self, slot: usize, centre: &Outcome, seen: &[(Move, f64)]) -> bool {
        let entry = &self.model.parameters.entries[slot];
        if matches!(entry.parameter, Parameter::Temperature | Parameter::SupplyPositive | Parameter::SupplyNegative) {
            return true;
        }
        let centre = centre.value().unwrap_or(f64::NAN);
        seen.iter().filter(|((s, _), _)| *s == slot).all(|(_, v)| (v - centre).abs() <= 1e-9 * centre.abs())
    }

    fn finish(
        &mut self,
        query: Query,
        search: Search,
        again: &[usize],
        bad: &Option<(Outcome, Vec<Move>)>,
        better: fn(f64, f64) -> bool,
    ) -> Extreme {
        let Search { centre, mut ends, mut effects, best_single } = search;
        let mut result = value(&self.corner(&ends), query);
        for &slot in again {
            let entry = self.model.parameters.entries[slot];
            let Some(so_far) = result.value() else { break };
            let mut best = so_far;
            for place in [Place::Low, Place::High] {
                let mut moved: Vec<Move> = ends.iter().copied().filter(|(s, _)| *s != slot).collect();
                if (place.of(&entry) - entry.nominal).abs() > 0.0 {
                    moved.push((slot, place));
                    moved.sort_unstable();
                }
                if moved == ends {
                    continue;
                }
                if let Some(there) = value(&self.corner(&moved), query).value()
                    && better(there, best)
                {
                    best = there;
                    ends = moved;
                }
            }
            if better(best, so_far) {
                effects.retain(|(s, _)| *s != slot);
                effects.push((slot, best - so_far));
                result = Outcome::Value(best);
            }
        }
        // Never narrower than what a single parameter, or none, already showed.
        if let (Some(v), Some((single, at))) = (result.value(), best_single)
            && better(single, v)
        {
            result = Outcome::Value(single);
            ends = alloc::vec![at];
        }
        if let (Some(v), Some(centre)) = (result.value(), centre)
            && better(centre, v)
        {
            result = Outcome::Value(centre);
            ends.clear();
        }
        if result.value().is_some()
            && let Some((outcome, at)) = bad
        {
            result = outcome.clone();
            ends.clone_from(at);
        }
        let corner = self.coordinates(&ends, &effects);
        Extreme { outcome: result, corner, effects, ends }
    }

    /// Whether a build that was looked at oscillates.
    #[must_use]
    pub fn oscillated(&self) -> bool {
        let does = |outcome: &Outcome| matches!(outcome, Outcome::Oscillates);
        self.known.iter().any(|(_, extremes)| does(&extremes.low.outcome) || does(&extremes.high.outcome))
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

    /// The build of an extreme.
    pub fn at(&mut self, extreme: &Extreme) -> Rc<Solution<'m>> {
        if extreme.ends.is_empty() { self.nominal.clone() } else { self.corner(&extreme.ends) }
    }

    /// The build at which a figure is greatest, if it has a value there.
    pub fn at_greatest(&mut self, query: Query) -> Option<Rc<Solution<'m>>> {
        let extremes = self.extremes(query);
        extremes.high.outcome.value()?;
        Some(self.corner(&extremes.high.ends))
    }

    /// Builds with the part's DC figures at their worse ends, at all ends of temperature and supplies.
    pub fn dc_corners(&mut self) -> Vec<Rc<Solution<'m>>> {
        let parameters = &self.model.parameters;
        let mut worse: Vec<Move> = Vec::new();
        for (slot, entry) in parameters.entries.iter().enumerate() {
            let figure = match entry.parameter {
                Parameter::Part(figure) | Parameter::PartOf(_, figure) => figure,
                _ => continue,
            };
            if entry.touches & touch::DC != 0 && entry.touches & touch::NETWORK == 0 && entry.low < entry.high {
                let high = matches!(figure.worse(), crate::part::Worse::High);
                worse.push((slot, if high { Place::High } else { Place::Low }));
            }
        }
        let mut free: Vec<usize> = parameters.temperature().into_iter().collect();
        free.extend(parameters.supply().into_iter().flat_map(|(positive, negative)| [positive, negative]));
        free.retain(|&slot| parameters.entries[slot].low < parameters.entries[slot].high);
        (0..1_usize << free.len())
            .map(|choice| {
                let mut ends = worse.clone();
                let end = |i: usize| if choice >> i & 1 == 1 { Place::High } else { Place::Low };
                ends.extend(free.iter().enumerate().map(|(i, &slot)| (slot, end(i))));
                ends.sort_unstable();
                self.corner(&ends)
            })
            .collect()
    }

    /// The coordinates that matter: those that alone do at least a hundredth of what all do together.
    fn coordinates(&self, ends: &[Move], effects: &[(usize, f64)]) -> Vec<Coordinate> {
        let total: f64 = effects.iter().map(|(_, e)| e.abs()).filter(|e| e.is_finite()).sum();
        ends.iter()
            .filter(|(slot, _)| effects.iter().find(|(s, _)| s == slot).is_none_or(|(_, e)| e.abs() >= 0.01 * total))
            .map(|&at| {
                let entry = &self.model.parameters.entries[at.0];
                Coordinate { parameter: entry.parameter, value: self.place(at), nominal: entry.nominal }
            })
            .collect()
    }

    /// What the figure rests on at one of its extremes, or at nominal values. A part figure counts when moving it by its spread, or by a
    /// fifth where it has none, changes the figure by more than a two-hundredth.
    ///
    /// It is moved from the nominal build; from the extreme's where the figure is flat at nominal values (no peaking, an unlimited
    /// margin), and for DC errors, which are products.
    pub fn basis(&mut self, query: Query, extremes: &Extremes, extreme: Option<&Extreme>) -> Basis {
        const COUNTS: f64 = 0.005;
        let nominal = Extreme { outcome: extremes.centre.clone(), corner: Vec::new(), effects: Vec::new(), ends: Vec::new() };
        let extreme = extreme.unwrap_or(&nominal);
        let touched = touched_by(query.figure);
        let turned = touched & touch::DC != 0 || flat(query, &extremes.centre) && !flat(query, &extreme.outcome);
        let measure = |at_extreme: bool| {
            let from = if at_extreme { &extreme.outcome } else { &extremes.centre };
            let scale = match query.figure.dimension() {
                // Bits are a logarithm: what counts is the ratio behind them.
                Dimension::Bits => core::f64::consts::LOG2_E,
                _ => from.value().filter(|v| v.is_finite()).map_or(0.0, f64::abs),
            };
            (from, COUNTS * scale)
        };
        let (mut guaranteed, mut typical) = (false, false);
        // What was seen before costs nothing; builds are solved only for a grade that is not found yet.
        for solve in [false, true] {
            for slot in 0..self.model.parameters.entries.len() {
                let entry = self.model.parameters.entries[slot];
                let of_part = matches!(entry.parameter, Parameter::Part(_) | Parameter::PartOf(..) | Parameter::Headroom);
                if !of_part || entry.touches & touched == 0 || !reaches(self.model, entry.parameter, query.figure) {
                    continue;
                }
                let end = extreme.ends.iter().find(|(s, _)| *s == slot).map(|(_, place)| *place);
                let grade = end.map_or(entry.grade[0], |place| place.grade(&entry));
                let found = match grade {
                    Grade::Guaranteed => &mut guaranteed,
                    Grade::Typical => &mut typical,
                    Grade::Stated => continue,
                };
                if *found {
                    continue;
                }
                // A rejection acts on a gain by its sign, which nominal values leave out.
                let at_extreme = turned || entry.touches & touch::NETWORK == 0 && touched & touch::REJECTION != 0;
                let (from, tolerance) = measure(at_extreme);
                if at_extreme {
                    if solve {
                        let moved = if end.is_some() { entry.nominal } else { entry.nominal * FIFTH };
                        *found = changes(from, &value(&self.off_corner(&extreme.ends, slot, moved), query), tolerance);
                    }
                } else if entry.low < entry.high {
                    let mut seen = extremes.seen.iter().filter(|((s, _), _)| *s == slot).peekable();
                    *found = seen.peek().is_none() || seen.any(|(_, v)| changes(from, &Outcome::Value(*v), tolerance));
                } else if matches!(entry.parameter, Parameter::Headroom) {
                    *found = matches!(query.figure, Figure::ClipMargin);
                } else if solve {
                    *found = changes(from, &value(&self.probe(slot, entry.nominal * FIFTH), query), tolerance);
                }
            }
            // Higher poles have no guaranteed value on any data sheet.
            if solve && !typical && self.model.poles.iter().flatten().any(|p| !p.is_empty()) && touched & ON_POLES != 0 {
                let slot = self.model.parameters.pole_factor();
                let there = if turned { self.off_corner(&extreme.ends, slot, FIFTH) } else { self.probe(slot, FIFTH) };
                let (from, tolerance) = measure(turned);
                typical = changes(from, &value(&there, query), tolerance);
            }
        }
        match (guaranteed, typical) {
            (true, true) => Basis::Mixed,
            (false, true) => Basis::Typical,
            _ => Basis::Guaranteed,
        }
    }

    /// A corner with one value changed.
    fn off_corner(&mut self, ends: &[Move], slot: usize, value: f64) -> Rc<Solution<'m>> {
        let mut changes: Vec<(usize, f64)> = ends.iter().map(|&at| (at.0, self.place(at))).collect();
        changes.push((slot, value));
        self.build(&changes)
    }

    fn probe(&mut self, slot: usize, value: f64) -> Rc<Solution<'m>> {
        if let Some(probe) = &self.probes[slot] {
            return probe.clone();
        }
        if self.of_network(slot) {
            // The first of them brings all that may be asked for.
            let entries = &self.model.parameters.entries;
            let unspread = |e: &Entry| e.touches & touch::NETWORK != 0 && e.low >= e.high;
            let mut changes: Vec<Vec<(usize, f64)>> = Vec::new();
            for (slot, entry) in entries.iter().enumerate() {
                if matches!(entry.parameter, Parameter::Part(_) | Parameter::PartOf(..)) && unspread(entry) {
                    changes.push(alloc::vec![(slot, entry.nominal * FIFTH)]);
                }
            }
            changes.push(alloc::vec![(self.model.parameters.pole_factor(), FIFTH)]);
            for (change, build) in changes.iter().zip(together::solve(&self.nominal, Some(self.near), &changes)) {
                self.probes[change[0].0] = Some(Rc::new(build));
            }
            if let Some(probe) = &self.probes[slot] {
                return probe.clone();
            }
        }
        let build = self.build(&[(slot, value)]);
        self.probes[slot] = Some(build.clone());
        build
    }
}

/// The factor by which a part's figure is moved to ask what rests on it, where it has no spread.
const FIFTH: f64 = 1.2;

/// Results that higher poles can change.
const ON_POLES: u8 = touch::NETWORK | touch::NOISE | touch::SWING;

/// Where a figure does not answer to small changes: a bound that is not reached, a peak that is none.
fn flat(query: Query, outcome: &Outcome) -> bool {
    outcome.value().is_some_and(|v| v.is_infinite() || matches!(query.figure, Figure::Peaking) && v <= 1.0)
}

fn changes(centre: &Outcome, there: &Outcome, tolerance: f64) -> bool {
    match (centre.value(), there.value()) {
        (Some(a), Some(b)) if a.is_finite() && b.is_finite() => (a - b).abs() > tolerance,
        (Some(a), Some(b)) => a.is_finite() != b.is_finite(),
        (None, None) => false,
        _ => true,
    }
}

/// Changed values as a key.
fn key(changes: &[(usize, f64)]) -> Vec<(usize, u64)> {
    changes.iter().map(|&(slot, value)| (slot, value.to_bits())).collect()
}

/// Gathers the corner at which a figure is most extreme in one direction.
#[derive(Debug)]
struct Search {
    centre: Option<f64>,
    ends: Vec<Move>,
    effects: Vec<(usize, f64)>,
    best_single: Option<(f64, Move)>,
}

impl Search {
    fn new(centre: &Outcome) -> Self {
        Self { centre: centre.value(), ends: Vec::new(), effects: Vec::new(), best_single: None }
    }

    /// Takes what one parameter, moved alone, showed.
    fn consider(&mut self, seen: &[(Move, f64)], better: impl Fn(f64, f64) -> bool) {
        let Some(centre) = self.centre else { return };
        let mut best = (centre, None);
        for &(at, v) in seen {
            if better(v, best.0) {
                best = (v, Some(at));
            }
        }
        if let (v, Some(at)) = best {
            self.ends.push(at);
            self.effects.push((at.0, v - centre));
            if self.best_single.is_none_or(|(b, _)| better(v, b)) {
                self.best_single = Some((v, at));
            }
        }
    }
}
