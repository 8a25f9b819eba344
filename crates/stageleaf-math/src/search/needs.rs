//! For each amplifier figure, the value at which the first limit breaks with all else as it is; for each component, the loosest
//! tolerance that still holds.
//!
//! # Formula
//! The figure is set to one value, guaranteed, and moved from the part's own by half decades (volts of input range: by doubling
//! steps) until a limit is lost; then the edge is bracketed to a few thousandths and rounded to three digits on the side that
//! holds, which is judged again.
//!
//! # Does not apply
//! A verdict that is lost and found again within one and a half decades and nowhere else is not seen, nor one within half a decade. Figures move one at a time: two of them at their
//! edges together may break a limit.

use alloc::vec::Vec;

use super::{Judge, limits_at};
use crate::{
    dimension::Dimension,
    limit::Limit,
    part::{Part, PartFigure, Rating, Worse},
    stage::Stage,
};

/// How far a figure is moved: half decades either way.
const HALF_DECADES: usize = 9;
/// First step of a voltage, V.
const FIRST: f64 = 0.01;
/// Steps of a bisection: half a decade to a few thousandths.
const BISECTIONS: usize = 9;
/// Steps of a bisection between a tolerance and the loosest one.
const TOLERANCE_STEPS: usize = 14;
/// Loosest tolerance looked at.
const LOOSEST: f64 = 0.5;

/// Where a figure may lie.
#[derive(Clone, Debug, PartialEq)]
pub enum Room {
    /// No limit asks for it: any value within the range searched holds.
    Any,
    /// All limits hold between these two; an end that nothing bounds is absent.
    Between {
        /// Least value that holds, and the limits lost below it.
        least: Option<Edge>,
        /// Greatest value that holds, and the limits lost above it.
        greatest: Option<Edge>,
    },
    /// At every value some limit is lost that another value mends; here the fewest are lost.
    None(Vec<Limit>),
}

/// The last value that holds, and what is lost beyond it.
#[derive(Clone, Debug, PartialEq)]
pub struct Edge {
    /// SI.
    pub value: f64,
    /// Lost first.
    pub lost: Vec<Limit>,
}

/// What a stage needs of an amplifier figure.
#[derive(Clone, Debug, PartialEq)]
pub struct PartNeed {
    /// The figure.
    pub figure: PartFigure,
    /// What the present part states.
    pub stated: Rating,
    /// Where it may lie.
    pub room: Room,
}

/// What a stage needs of a component.
#[derive(Clone, Debug, PartialEq)]
pub struct ToleranceNeed {
    /// Its name.
    pub name: &'static str,
    /// Its tolerance now, the larger side.
    pub stated: f64,
    /// The loosest that holds, with what is lost beyond it; `None` if limits are lost even without tolerance.
    pub loosest: Option<Edge>,
}

/// Everything that a stage needs.
#[derive(Clone, Debug, PartialEq)]
pub struct Needs {
    /// By amplifier figure, those that no limit asks for left out.
    pub part: Vec<PartNeed>,
    /// By component.
    pub tolerances: Vec<ToleranceNeed>,
    /// Limits that are lost, or cannot be judged, with the part as it is.
    pub lost_now: Vec<Limit>,
}

/// Limits that are lost, or cannot be judged, with the part as it is.
#[must_use]
pub fn lost_now(stage: &Stage) -> Vec<Limit> {
    limits_at(stage, &Judge::default().lost(stage))
}

/// What the stage needs of one figure; `None` where no limit asks for it.
#[must_use]
pub fn part_need(stage: &Stage, figure: PartFigure) -> Option<PartNeed> {
    let stated = stage.part.rating(figure).clone();
    let room = room(&mut Judge::default(), stage, figure, &stated);
    (room != Room::Any).then_some(PartNeed { figure, stated, room })
}

/// How loose one component may be, by its place in the stage's list.
#[must_use]
pub fn tolerance_need(stage: &Stage, index: usize) -> ToleranceNeed {
    let component = &stage.components[index];
    let stated = component.value.plus.max(component.value.minus);
    ToleranceNeed { name: component.name, stated, loosest: loosest(&mut Judge::default(), stage, index, stated) }
}

/// Works the list out. `progress` is told how many figures and components are done, of how many, and stops the search by `false`.
///
/// Returns `None` where it was stopped.
#[must_use]
pub fn needs(stage: &Stage, mut progress: impl FnMut(usize, usize) -> bool) -> Option<Needs> {
    let all = PartFigure::ALL.len() + stage.components.len();
    let mut needs = Needs { part: Vec::new(), tolerances: Vec::new(), lost_now: lost_now(stage) };
    for (done, &figure) in PartFigure::ALL.iter().enumerate() {
        if !progress(done, all) {
            return None;
        }
        needs.part.extend(part_need(stage, figure));
    }
    for index in 0..stage.components.len() {
        if !progress(PartFigure::ALL.len() + index, all) {
            return None;
        }
        needs.tolerances.push(tolerance_need(stage, index));
    }
    progress(all, all).then_some(needs)
}

/// The stage with the figure at one guaranteed value, in every amplifier of that part.
fn with(stage: &Stage, figure: PartFigure, value: f64) -> Stage {
    let mut stage = stage.clone();
    let rating = Rating { min: Some(value), typ: Some(value), max: Some(value), source: None };
    let set = |part: &mut Part| part.state(figure, rating.clone());
    let id = stage.part.id.clone();
    set(&mut stage.part);
    stage.parts.iter_mut().filter(|(_, part)| part.id == id).for_each(|(_, part)| set(part));
    stage
}

/// The value that counts at the worst case.
fn worst(stated: &Rating, worse: Worse) -> Option<f64> {
    match worse {
        Worse::High => stated.max.or(stated.typ).or(stated.min),
        Worse::Low => stated.min.or(stated.typ).or(stated.max),
    }
}

/// A scale on which a figure moves: decades, or volts about where it stands.
#[derive(Clone, Copy)]
enum Scale {
    Decades(f64),
    Volts(f64),
}

impl Scale {
    /// The value `steps` away upwards.
    fn at(self, steps: f64) -> f64 {
        match self {
            Self::Decades(start) => start * libm::pow(10.0, 0.5 * steps),
            Self::Volts(start) => start + FIRST * if steps < 0.0 { 1.0 - libm::exp2(-steps) } else { libm::exp2(steps) - 1.0 },
        }
    }

    /// How many steps away a value lies.
    fn steps(self, value: f64) -> f64 {
        match self {
            Self::Decades(start) => 2.0 * libm::log10(value / start),
            Self::Volts(start) => {
                let away = (value - start) / FIRST;
                if away < 0.0 { -libm::log2(1.0 - away) } else { libm::log2(1.0 + away) }
            }
        }
    }
}

fn room(judge: &mut Judge, stage: &Stage, figure: PartFigure, stated: &Rating) -> Room {
    let worse = figure.worse();
    let start = worst(stated, worse).filter(|v| v.is_finite());
    let scale = match (figure, start) {
        (PartFigure::RangeFromNegative | PartFigure::RangeFromPositive, start) => Scale::Volts(start.unwrap_or(0.0)),
        (_, Some(v)) if v > 0.0 => Scale::Decades(v),
        _ => Scale::Decades(usual(figure.dimension())),
    };
    let mut lost = |steps: f64| judge.lost(&with(stage, figure, scale.at(steps)));
    #[expect(clippy::cast_precision_loss, reason = "a few steps")]
    let grid: Vec<f64> = (0..=2 * HALF_DECADES).map(|i| i as f64 - HALF_DECADES as f64).collect();
    // A figure that changes nothing from end to end is not asked for; looked at coarsely first, since most are not.
    const COARSE: usize = 3;
    let coarse: Vec<Vec<usize>> = grid.iter().step_by(COARSE).map(|steps| lost(*steps)).collect();
    if coarse.iter().all(|there| *there == coarse[0]) {
        return Room::Any;
    }
    let fine = grid.iter().enumerate().map(|(i, steps)| if i % COARSE == 0 { coarse[i / COARSE].clone() } else { lost(*steps) });
    let mut seen: Vec<Vec<usize>> = fine.collect();
    // What is lost wherever the figure lies is not the figure's to mend; it is told once for the stage.
    let elsewhere: Vec<usize> = seen[0].iter().copied().filter(|l| seen.iter().all(|there| there.contains(l))).collect();
    seen.iter_mut().for_each(|there| there.retain(|l| !elsewhere.contains(l)));
    if seen.iter().all(Vec::is_empty) {
        return Room::Any;
    }
    // Where everything else holds, nearest to where the figure lies, the better side first.
    let toward_better = if worse == Worse::High { -1.0 } else { 1.0 };
    let nearness = |i: usize| (grid[i].abs(), grid[i] * toward_better < 0.0);
    let held = (0..grid.len()).filter(|&i| seen[i].is_empty());
    let Some(inside) = held.min_by(|&a, &b| nearness(a).partial_cmp(&nearness(b)).unwrap_or(core::cmp::Ordering::Equal)) else {
        let fewest = seen.iter().min_by_key(|there| there.len()).cloned().unwrap_or_default();
        return Room::None(limits_at(stage, &fewest));
    };
    let mut lost = |steps: f64| {
        let mut there = lost(steps);
        there.retain(|l| !elsewhere.contains(l));
        there
    };
    let mut edge = |up: bool| {
        let beyond =
            if up { (inside + 1..grid.len()).find(|&i| !seen[i].is_empty()) } else { (0..inside).rev().find(|&i| !seen[i].is_empty()) }?;
        let mut bad = grid[beyond];
        let mut good = if up { bad - 1.0 } else { bad + 1.0 };
        for _ in 0..BISECTIONS {
            let middle = 0.5 * (good + bad);
            if lost(middle).is_empty() { good = middle } else { bad = middle }
        }
        let first = lost(bad);
        // Rounded on the side that holds, and judged there.
        let (value, neat) = (scale.at(good), rounded(scale.at(good), !up));
        let value = if scale.steps(neat).is_finite() && lost(scale.steps(neat)).is_empty() { neat } else { value };
        Some(Edge { value, lost: limits_at(stage, &first) })
    };
    let (least, greatest) = (edge(false), edge(true));
    Room::Between { least, greatest }
}

/// Three digits, upwards or downwards.
fn rounded(value: f64, up: bool) -> f64 {
    if value.abs() <= 0.0 || !value.is_finite() {
        return value;
    }
    let unit = libm::pow(10.0, libm::floor(libm::log10(value.abs())) - 2.0);
    let (digits, exact) = (value / unit, libm::round(value / unit));
    let whole = if (digits - exact).abs() < 1e-9 {
        exact
    } else if up {
        libm::ceil(digits)
    } else {
        libm::floor(digits)
    };
    whole * unit
}

/// Where to begin with a figure that the part does not state.
const fn usual(dimension: Dimension) -> f64 {
    match dimension {
        Dimension::Voltage => 1e-3,
        Dimension::VoltageDrift => 1e-6,
        Dimension::Current => 1e-6,
        Dimension::Resistance => 1e6,
        Dimension::Capacitance => 1e-12,
        Dimension::Frequency => 1e6,
        Dimension::SlewRate => 1e6,
        Dimension::VoltageDensity => 1e-8,
        Dimension::CurrentDensity => 1e-13,
        Dimension::Level | Dimension::Gain => 1e5,
        Dimension::ThermalResistance => 100.0,
        Dimension::Temperature => 400.0,
        Dimension::TemperatureDifference => 10.0,
        Dimension::Time => 1e-6,
        _ => 1.0,
    }
}

fn loosest(judge: &mut Judge, stage: &Stage, index: usize, stated: f64) -> Option<Edge> {
    let with = |tolerance: f64| {
        let mut stage = stage.clone();
        let value = &mut stage.components[index].value;
        (value.minus, value.plus) = (tolerance, tolerance);
        stage
    };
    let mut lost = |tolerance: f64| judge.lost(&with(tolerance));
    let (mut good, mut bad) = if lost(stated).is_empty() {
        let beyond = lost(LOOSEST);
        if beyond.is_empty() {
            return Some(Edge { value: LOOSEST, lost: Vec::new() });
        }
        (stated, LOOSEST)
    } else if lost(0.0).is_empty() {
        (0.0, stated)
    } else {
        return None;
    };
    for _ in 0..TOLERANCE_STEPS {
        let middle = 0.5 * (good + bad);
        if lost(middle).is_empty() { good = middle } else { bad = middle }
    }
    let beyond = lost(bad);
    let value = rounded(good, false);
    Some(Edge { value: if lost(value).is_empty() { value } else { good }, lost: limits_at(stage, &beyond) })
}
