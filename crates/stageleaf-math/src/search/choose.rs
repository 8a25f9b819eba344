//! Component values for a wanted gain, corner, or second-order response, from the values that there are.
//!
//! # Formula
//! The kind's closed forms propose: two free resistors are tried in every pair; with capacitors, every combination of theirs is
//! taken, Newton's method finds the resistors that meet the targets exactly, and each moves to its two neighbours among the values.
//! The whole engine decides: the best proposals are judged at their worst case with all limits of the stage, and ranked by the
//! limits that they lose, by the worst error of the targets, by noise.
//!
//! # Does not apply
//! More free components than the targets determine: hold some. Targets that the kind has no closed form for.

use alloc::{vec, vec::Vec};

use super::{Judge, limits_at};
use crate::{
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin, Verdict},
    report::{Caution, Outcome},
    stage::Stage,
};

/// How many proposals are judged in full.
const JUDGED: usize = 40;
/// Combinations of capacitors that are tried at most.
const COMBINATIONS: usize = 20_000;
/// Proposals that miss a target by this much more than the best one are left out.
const NEAR: f64 = 0.02;
/// A miss that is no choice any more.
const FAR: f64 = 0.1;

/// A figure and the value that it should have.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Target {
    /// `gain`, `bandwidth`, `low_cutoff`, `natural_frequency` or `q`.
    pub figure: Figure,
    /// SI; of a gain the magnitude counts.
    pub value: f64,
}

/// The values that there are, ascending, in SI.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Stock {
    /// Ω.
    pub resistors: Vec<f64>,
    /// F.
    pub capacitors: Vec<f64>,
}

/// Components with their values, SI.
pub type Values = Vec<(&'static str, f64)>;

/// Values, and how far the closed forms miss the targets with them.
type Proposal = (f64, Values);

/// A target and what the whole engine gives.
#[derive(Clone, Debug, PartialEq)]
pub struct Reached {
    /// What was asked.
    pub target: Target,
    /// The nominal value.
    pub nominal: Outcome,
    /// The range at the worst case, where there is one.
    pub range: Option<(f64, f64)>,
}

/// Values, judged.
#[derive(Clone, Debug, PartialEq)]
pub struct Choice {
    /// Component and value.
    pub values: Values,
    /// Each target's nominal value and, where it has one, its range at the worst case.
    pub reached: Vec<Reached>,
    /// The largest error of a target at the worst case, as a fraction; infinite where one has no value.
    pub error: f64,
    /// Rms noise at the output, V, where it is determined.
    pub noise: Option<f64>,
    /// Limits that break or cannot be judged.
    pub lost: Vec<Limit>,
    /// Cautions by which the stage cannot work with these values.
    pub cautions: Vec<Caution>,
}

impl Choice {
    /// Whether every limit is kept, and nothing says that the stage cannot work.
    #[must_use]
    pub fn survives(&self) -> bool {
        self.lost.is_empty() && self.cautions.is_empty()
    }
}

/// Why nothing was chosen.
#[derive(Clone, Debug, PartialEq)]
pub enum Refusal {
    /// The kind has no closed form for the figure with the components that the stage has.
    NoClosedForm(Figure),
    /// No free component moves the figure.
    Nothing(Figure),
    /// More free components than the targets determine.
    TooFree {
        /// The free components.
        free: Vec<&'static str>,
        /// How many targets there are.
        targets: usize,
    },
    /// The list of values is empty for a kind of component that is free.
    NoValues,
    /// More combinations of capacitors than are tried.
    TooMany(usize),
    /// No combination of capacitors has resistors for the targets within the values that there are.
    Impossible,
}

/// A second-order low-pass response by its name.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Response {
    /// Flattest magnitude; the cutoff is the −3 dB edge.
    Butterworth,
    /// Flattest delay; the cutoff is the −3 dB edge.
    Bessel,
    /// Equal ripple in the pass band, in dB; the cutoff is the ripple band's edge.
    Chebyshev(f64),
}

impl Response {
    /// Natural frequency over cutoff, and Q, of the low-pass; a high-pass takes the reciprocal of the first.
    ///
    /// # Formula
    /// Butterworth `1`, `1/√2`. Bessel: `s² + 3s + 3` scaled to its −3 dB edge at `ω² = (√5 − 1)·3/2`: `√3/ω`, `1/√3`.
    /// Chebyshev: poles at `−sinh a·sin 45° ± j·cosh a·cos 45°`, `a = arsinh(1/ε)/2`, `ε² = 10^(ripple/10) − 1`.
    ///
    /// # Source
    /// A. Zverev, *Handbook of Filter Synthesis* (1967), from memory; checked against `scipy.signal.buttap`, `besselap`, `cheb1ap`.
    #[must_use]
    pub fn shape(self) -> (f64, f64) {
        match self {
            Self::Butterworth => (1.0, core::f64::consts::FRAC_1_SQRT_2),
            Self::Bessel => (libm::sqrt(3.0 / (1.5 * (libm::sqrt(5.0) - 1.0))), 1.0 / libm::sqrt(3.0)),
            Self::Chebyshev(ripple) => {
                let epsilon = libm::sqrt(libm::exp10(ripple / 10.0) - 1.0);
                let a = libm::asinh(1.0 / epsilon) / 2.0;
                let (s, c) = (libm::sinh(a), libm::cosh(a));
                let natural = libm::sqrt(0.5 * (s * s + c * c));
                (natural, natural / (core::f64::consts::SQRT_2 * s))
            }
        }
    }
}

/// Chooses. Components in `held` keep their values.
///
/// # Errors
/// Why nothing could be chosen.
pub fn choose(stage: &Stage, targets: &[Target], held: &[&str], stock: &Stock) -> Result<Vec<Choice>, Refusal> {
    let ties = ties(stage);
    let mut plan = Plan::of(stage, targets, held)?;
    if (!plan.resistors.is_empty() && stock.resistors.is_empty()) || (!plan.capacitors.is_empty() && stock.capacitors.is_empty()) {
        return Err(Refusal::NoValues);
    }
    let mut proposals = plan.proposals(stock)?;
    proposals.sort_by(|a, b| a.0.total_cmp(&b.0));
    // What misses the targets by far is no choice, whatever else it keeps.
    let best = proposals.first().map_or(f64::INFINITY, |p| p.0);
    if best > FAR {
        return Err(Refusal::Impossible);
    }
    proposals.retain(|p| p.0 <= best + NEAR);
    proposals.truncate(JUDGED);
    let mut judge = Judge::default();
    let mut choices: Vec<Choice> = proposals.iter().filter_map(|(_, values)| judged(&mut judge, stage, &ties, targets, values)).collect();
    choices.sort_by(|a, b| {
        let noise = |c: &Choice| c.noise.unwrap_or(f64::INFINITY);
        let lost = |c: &Choice| c.lost.len() + c.cautions.len();
        lost(a).cmp(&lost(b)).then(a.error.total_cmp(&b.error)).then(noise(a).total_cmp(&noise(b)))
    });
    Ok(choices)
}

fn judged(
    judge: &mut Judge,
    stage: &Stage,
    ties: &[(&'static str, &'static str)],
    targets: &[Target],
    values: &[(&'static str, f64)],
) -> Option<Choice> {
    let mut variant = stage.clone();
    let mut all: Values = Vec::new();
    for (name, value) in values {
        set(&mut variant, ties, name, *value);
        all.push((*name, *value));
        all.extend(
            ties.iter().filter(|(first, second)| first == name && stage.component(second).is_some()).map(|(_, second)| (*second, *value)),
        );
    }
    let own = variant.limits.len();
    let report_of = |figure: Figure| Limit { query: Query::of(figure), bound: Bound::Report, thin: Thin::Fraction(0.0) };
    variant.limits.extend(targets.iter().map(|t| report_of(t.figure)));
    let report = judge.report(&variant).ok()?;
    let mut error = 0.0_f64;
    let mut reached = Vec::new();
    for target in targets {
        let row = report.figures.iter().find(|r| r.query == Query::of(target.figure))?;
        let off = |v: f64| ((v.abs() - target.value.abs()) / target.value).abs();
        error = match (row.nominal.value(), row.range) {
            (Some(_), Some((low, high))) => error.max(off(low)).max(off(high)),
            (Some(v), None) => error.max(off(v)),
            (None, _) => f64::INFINITY,
        };
        reached.push(Reached { target: *target, nominal: row.nominal.clone(), range: row.range });
    }
    let lost: Vec<usize> = report
        .limits
        .iter()
        .enumerate()
        .take(own)
        .filter(|(_, r)| matches!(r.verdict, Verdict::Breaks | Verdict::Undetermined))
        .map(|(i, _)| i)
        .collect();
    // A build that oscillates, or cannot work, is no choice even where no limit says so.
    let cautions = report.cautions.iter().filter(|c| super::alternates::forbids(c)).cloned().collect();
    let noise = report.figures.iter().find(|r| r.query == Query::of(Figure::OutputNoise)).and_then(|r| r.nominal.value());
    Some(Choice { values: all, reached, error, noise, lost: limits_at(stage, &lost), cautions })
}

/// Components that a kind wants equal: the second follows the first.
const fn ties_of(kind: Kind) -> &'static [(&'static str, &'static str)] {
    match kind {
        Kind::Difference => &[("R1", "R3"), ("R2", "R4"), ("C2", "C4")],
        Kind::Instrumentation => &[("Rf1", "Rf2"), ("R1", "R3"), ("R2", "R4"), ("C2", "C4")],
        _ => &[],
    }
}

/// Components that a gain alone leaves as they are: the difference amplifier behind an instrumentation amplifier's pair.
const fn settled(kind: Kind) -> &'static [&'static str] {
    match kind {
        Kind::Instrumentation => &["R1", "R2"],
        _ => &[],
    }
}

/// The components of the stage that follow another one: a kind's pairs, and the input resistors of a summing stage that are equal.
fn ties(stage: &Stage) -> Vec<(&'static str, &'static str)> {
    let mut all = ties_of(stage.kind).to_vec();
    if let (Kind::Summing, Some(first)) = (stage.kind, stage.component("Rin1")) {
        let equal = |c: &&crate::stage::Component| {
            c.name.starts_with("Rin") && c.name != "Rin1" && c.value.nominal.to_bits() == first.nominal.to_bits()
        };
        all.extend(stage.components.iter().filter(equal).map(|c| ("Rin1", c.name)));
    }
    all
}

fn set(stage: &mut Stage, ties: &[(&'static str, &'static str)], name: &str, value: f64) {
    let follows = |c: &str| ties.iter().any(|(first, second)| *first == name && *second == c);
    for component in stage.components.iter_mut().filter(|c| c.name == name || follows(c.name)) {
        component.value.nominal = value;
    }
}

/// What the kind's closed form gives.
fn closed_form(stage: &Stage, figure: Figure) -> Option<f64> {
    let spec = stage.kind.spec();
    if figure == Figure::Gain {
        return Some((spec.ideal_gain)(stage).abs()).filter(|g| g.is_finite() && *g > 0.0);
    }
    let lines = (spec.working)(stage);
    // The closed loop's edge by the gain-bandwidth product is the amplifier's, not the components'.
    let own = |l: &&crate::report::Working| l.query.figure == figure && l.numbers.iter().all(|n| n.0 != "GBW");
    lines.iter().find(own).map(|l| l.handbook).filter(|v| v.is_finite() && *v > 0.0)
}

struct Plan<'a> {
    stage: Stage,
    ties: Vec<(&'static str, &'static str)>,
    targets: &'a [Target],
    resistors: Vec<&'static str>,
    capacitors: Vec<&'static str>,
}

impl<'a> Plan<'a> {
    fn of(stage: &Stage, targets: &'a [Target], held: &[&str]) -> Result<Self, Refusal> {
        let ties = ties(stage);
        let mut plan = Plan { stage: stage.clone(), ties: ties.clone(), targets, resistors: Vec::new(), capacitors: Vec::new() };
        let follows = |name: &str| ties.iter().any(|(_, second)| *second == name);
        for target in targets {
            let before = closed_form(stage, target.figure).ok_or(Refusal::NoClosedForm(target.figure))?;
            let mut moved = false;
            for component in
                stage.components.iter().filter(|c| !held.contains(&c.name) && !follows(c.name) && !settled(stage.kind).contains(&c.name))
            {
                let mut variant = stage.clone();
                set(&mut variant, &ties, component.name, component.value.nominal * 1.01);
                let after = closed_form(&variant, target.figure).unwrap_or(f64::NAN);
                if (after / before - 1.0).abs() > 1e-9 {
                    moved = true;
                    let capacitor = stage
                        .kind
                        .components()
                        .iter()
                        .any(|c| c.name == component.name && c.dimension == crate::dimension::Dimension::Capacitance);
                    let list = if capacitor { &mut plan.capacitors } else { &mut plan.resistors };
                    if !list.contains(&component.name) {
                        list.push(component.name);
                    }
                }
            }
            if !moved {
                return Err(Refusal::Nothing(target.figure));
            }
        }
        Ok(plan)
    }

    /// The largest relative error of the targets by closed forms.
    fn error(&self) -> f64 {
        self.targets.iter().fold(0.0, |error: f64, t| match closed_form(&self.stage, t.figure) {
            Some(v) => error.max((v / t.value.abs() - 1.0).abs()),
            None => f64::INFINITY,
        })
    }

    fn value(&self, name: &str) -> f64 {
        self.stage.component(name).map_or(0.0, |c| c.nominal)
    }

    fn proposals(&mut self, stock: &Stock) -> Result<Vec<Proposal>, Refusal> {
        let too_free = |plan: &Self| Refusal::TooFree {
            free: plan.resistors.iter().chain(&plan.capacitors).copied().collect(),
            targets: plan.targets.len(),
        };
        if self.capacitors.is_empty() {
            return match self.resistors.len() {
                1 | 2 => Ok(self.pairs(stock)),
                _ => Err(too_free(self)),
            };
        }
        // A gain that two resistors make by themselves comes first: the divider of a second-order section.
        let mut fixed: Values = Vec::new();
        if let [gain] = self.targets.iter().filter(|t| t.figure == Figure::Gain).copied().collect::<Vec<_>>()[..] {
            let alone = [gain];
            let own = Plan::of(&self.stage, &alone, &[])?;
            let others: Vec<Target> = self.targets.iter().filter(|t| t.figure != Figure::Gain).copied().collect();
            let elsewhere = |name: &&'static str| {
                others
                    .iter()
                    .filter(|t| t.figure == Figure::NaturalFrequency)
                    .any(|t| Plan::of(&self.stage, &[*t], &[]).is_ok_and(|p| p.resistors.contains(name)))
            };
            if own.capacitors.is_empty() && own.resistors.len() == 2 && !others.is_empty() && !own.resistors.iter().any(elsewhere) {
                let mut own = own;
                let mut found = own.pairs(stock);
                found.sort_by(|a, b| a.0.total_cmp(&b.0));
                let (_, pair) = found.into_iter().next().ok_or(Refusal::Impossible)?;
                for (name, value) in &pair {
                    set(&mut self.stage, &self.ties, name, *value);
                    self.resistors.retain(|r| r != name);
                }
                fixed = pair;
            }
        }
        let unmet = self.targets.len() - usize::from(!fixed.is_empty());
        if self.resistors.len() > unmet {
            return Err(too_free(self));
        }
        let combinations = stock.capacitors.len().pow(u32::try_from(self.capacitors.len()).unwrap_or(u32::MAX));
        if combinations > COMBINATIONS {
            return Err(Refusal::TooMany(combinations));
        }
        let mut proposals = Vec::new();
        let mut digits = vec![0_usize; self.capacitors.len()];
        for _ in 0..combinations {
            for (i, name) in self.capacitors.clone().into_iter().enumerate() {
                set(&mut self.stage, &self.ties, name, stock.capacitors[digits[i]]);
            }
            if self.resistors.is_empty() || self.newton(&fixed, stock) {
                let (error, mut values) = self.neighbours(stock);
                values.extend(&fixed);
                values.extend(self.capacitors.iter().map(|name| (*name, self.value(name))));
                if error.is_finite() {
                    proposals.push((error, values));
                }
            }
            for digit in &mut digits {
                *digit += 1;
                if *digit < stock.capacitors.len() {
                    break;
                }
                *digit = 0;
            }
        }
        if proposals.is_empty() { Err(Refusal::Impossible) } else { Ok(proposals) }
    }

    /// Every pair (or single value) of resistors; for each first one only the two seconds beside the exact ratio matter, but a
    /// closed form need not be a ratio, so all are tried.
    fn pairs(&mut self, stock: &Stock) -> Vec<Proposal> {
        let mut best: Vec<Proposal> = Vec::new();
        let names = self.resistors.clone();
        let second: &[f64] = if names.len() == 2 { &stock.resistors } else { &[0.0] };
        for &first in &stock.resistors {
            set(&mut self.stage, &self.ties, names[0], first);
            for &other in second {
                if let Some(name) = names.get(1) {
                    set(&mut self.stage, &self.ties, name, other);
                }
                let error = self.error();
                let worst = best.last().map_or(f64::INFINITY, |b| b.0);
                if error.is_finite() && (best.len() < JUDGED || error < worst) {
                    let values: Values = names.iter().map(|n| (*n, self.value(n))).collect();
                    let at = best.partition_point(|b| b.0 <= error);
                    best.insert(at, (error, values));
                    best.truncate(JUDGED);
                }
            }
        }
        best
    }

    /// Resistors that meet the targets exactly, by Newton's method in their logarithms; whether there are any within the stock's range.
    fn newton(&mut self, fixed: &[(&'static str, f64)], stock: &Stock) -> bool {
        let names = self.resistors.clone();
        let aims: Vec<Target> = self.targets.iter().filter(|t| fixed.is_empty() || t.figure != Figure::Gain).copied().collect();
        let (Some(&low), Some(&high)) = (stock.resistors.first(), stock.resistors.last()) else { return false };
        let mut x: Vec<f64> = vec![0.5 * (libm::log(low) + libm::log(high)); names.len()];
        // A start that is not symmetrical: equal values are often where a Jacobian is singular.
        for (i, value) in x.iter_mut().enumerate() {
            #[expect(clippy::cast_precision_loss, reason = "a few resistors")]
            let tilt = i as f64 * 0.7;
            *value += tilt;
        }
        let residual = |plan: &mut Self, x: &[f64]| -> Option<Vec<f64>> {
            for (name, value) in names.iter().zip(x) {
                set(&mut plan.stage, &plan.ties, name, libm::exp(*value));
            }
            aims.iter().map(|t| closed_form(&plan.stage, t.figure).map(|v| libm::log(v / t.value.abs()))).collect()
        };
        let size = |r: &[f64]| r.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
        let Some(mut r) = residual(self, &x) else { return false };
        for _ in 0..40 {
            if size(&r) < 1e-10 {
                break;
            }
            const STEP: f64 = 1e-6;
            let mut matrix = vec![vec![0.0; names.len() + 1]; aims.len()];
            for column in 0..names.len() {
                let mut moved = x.clone();
                moved[column] += STEP;
                let Some(there) = residual(self, &moved) else { return false };
                for (row, (a, b)) in matrix.iter_mut().zip(there.iter().zip(&r)) {
                    row[column] = (a - b) / STEP;
                }
            }
            for (row, value) in matrix.iter_mut().zip(&r) {
                row[names.len()] = -value;
            }
            let Some(step) = solved(matrix) else { return false };
            let longest = size(&step);
            let mut scale = if longest > 2.0 { 2.0 / longest } else { 1.0 };
            loop {
                let next: Vec<f64> = x.iter().zip(&step).map(|(a, b)| a + scale * b).collect();
                match residual(self, &next) {
                    Some(there) if size(&there) < size(&r) => {
                        (x, r) = (next, there);
                        break;
                    }
                    _ if scale < 1e-4 => return false,
                    _ => scale *= 0.5,
                }
            }
        }
        // A value at the last place of the stock may be moved to it, one far outside may not.
        let within = |v: &f64| libm::exp(*v) >= low * 0.95 && libm::exp(*v) <= high * 1.05;
        size(&r) < 1e-6 && residual(self, &x).is_some() && x.iter().all(within)
    }

    /// Each resistor at the value below or above the exact one, whichever combination errs least.
    fn neighbours(&mut self, stock: &Stock) -> Proposal {
        let names = self.resistors.clone();
        let beside: Vec<[f64; 2]> = names
            .iter()
            .map(|name| {
                let exact = self.value(name);
                let at = stock.resistors.partition_point(|v| *v < exact);
                let pick = |i: usize| stock.resistors[i.min(stock.resistors.len() - 1)];
                [pick(at.saturating_sub(1)), pick(at)]
            })
            .collect();
        let mut best = (f64::INFINITY, Vec::new());
        for choice in 0..1_usize << names.len() {
            for (i, name) in names.iter().enumerate() {
                set(&mut self.stage, &self.ties, name, beside[i][choice >> i & 1]);
            }
            let error = self.error();
            if error < best.0 || best.1.is_empty() {
                best = (error, names.iter().map(|n| (*n, self.value(n))).collect());
            }
        }
        best
    }
}

/// Gauss with partial pivoting, for a handful of unknowns; `None` where the system is singular.
fn solved(mut rows: Vec<Vec<f64>>) -> Option<Vec<f64>> {
    let n = rows.len();
    if rows.iter().any(|r| r.len() != n + 1) {
        return None;
    }
    for column in 0..n {
        let pivot = (column..n).max_by(|&a, &b| rows[a][column].abs().total_cmp(&rows[b][column].abs()))?;
        rows.swap(column, pivot);
        if rows[column][column].abs() < 1e-12 {
            return None;
        }
        let (above, below) = rows.split_at_mut(column + 1);
        let pivot = &above[column];
        for row in below {
            let factor = row[column] / pivot[column];
            row.iter_mut().zip(pivot).skip(column).for_each(|(a, b)| *a -= factor * b);
        }
    }
    let mut x = vec![0.0; n];
    for row in (0..n).rev() {
        let rest: f64 = (row + 1..n).map(|k| rows[row][k] * x[k]).sum();
        x[row] = (rows[row][n] - rest) / rows[row][row];
    }
    Some(x)
}
