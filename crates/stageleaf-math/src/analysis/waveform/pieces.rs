//! The amplifier in large signal, as pieces in each of which it is linear.
//!
//! # Formula
//! The input stage gives the integrator `x' = r − ωd·x − k·e`: `r = 2π·GBW·vd`, held between `−SR` of the fall and `+SR` of the rise.
//! Higher poles and zeros follow, and the controlled source `E` behind the output resistance. The pin's voltage is
//! `min(E − Ro·I, V₊ − h₊(I))`, not below `V₋ + h₋(−I)`, and its current within the limit. `e = E − Ro·I − V`, nothing while the pin is
//! free, is what the amplifier has beyond the value at which the pin would just be limited. Integrator and higher poles alike are held
//! back by `k·e`, `k = 100·2π·GBW`: nothing winds up by more than a hundredth of the input stage's linear range. **Rejected**: holding
//! the integrator alone by its own distance from that value: what it is ahead of higher poles while slewing is no winding up.
//!
//! # Does not apply
//! Crossover of the output stage, boosted slew, phase reversal; recovery from overload takes longer in amplifiers that saturate.
//!
//! # Source
//! Limited transconductance into an integrator: J. E. Solomon, "The monolithic op amp: a tutorial study", IEEE J. Solid-State
//! Circuits 9 (1974), from memory. The pieces: derived here.

use alloc::{vec, vec::Vec};
use core::f64::consts::TAU;

use crate::{
    part::{Headroom, PartFigure},
    solution::Solution,
};

/// How much faster than the loop an amplifier at a limit is held back.
const HOLD: f64 = 100.0;
/// Least output resistance, Ω, and least resistance of a limit as a share of it: a capacitor on the pin needs some.
const LEAST_OUTPUT: f64 = 1e-3;
const LEAST_LIMIT: f64 = 1e-5;

/// What the input stage does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Slew {
    /// It follows its input.
    Linear,
    /// It gives all it can, upwards.
    Rise,
    /// Downwards.
    Fall,
}

/// What the pin does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Pin {
    /// It follows the source behind the output resistance.
    Free,
    /// It stands at the positive rail less the headroom.
    High,
    /// At the negative rail plus the headroom.
    Low,
    /// It gives all the current it can.
    Source,
    /// It takes all it can.
    Sink,
}

/// The pieces an amplifier is in.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Piece {
    /// Input stage.
    pub slew: Slew,
    /// Output pin.
    pub pin: Pin,
    /// Which straight piece of the headroom tables.
    pub row: usize,
}

/// Where it starts, and where it is meant to be.
pub const AT_REST: Piece = Piece { slew: Slew::Linear, pin: Pin::Free, row: 0 };

/// A straight piece of both rails' limits: `V = at − slope·I`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Row {
    /// Current above which it ends.
    pub until: f64,
    /// Highest pin voltage.
    pub high: (f64, f64),
    /// Lowest pin voltage.
    pub low: (f64, f64),
}

/// An amplifier's numbers in a build.
#[derive(Clone, Debug, PartialEq)]
pub struct Limits {
    /// `2π·GBW`, rad/s.
    pub omega: f64,
    /// The dominant pole, rad/s.
    pub dominant: f64,
    /// How fast it is held back at a limit, 1/s.
    pub hold: f64,
    /// Slew rate upwards, V/s, where stated.
    pub rise: Option<f64>,
    /// Downwards, as a magnitude.
    pub fall: Option<f64>,
    /// Output resistance, Ω.
    pub resistance: f64,
    /// Output current limit, A.
    pub current: Option<f64>,
    /// Both rails' limits by rising current; empty where supply or headroom is not stated.
    pub rows: Vec<Row>,
    /// Currents between which the tables state the headroom.
    pub stated: (f64, f64),
    /// Higher poles, rad/s, with the zero (rad/s, signed) that each has beside it.
    pub poles: Vec<(f64, Option<f64>)>,
}

impl Limits {
    /// The limits of an amplifier; nothing where it has more zeros than higher poles.
    pub fn of(solution: &Solution<'_>, amplifier: usize) -> Option<Self> {
        let part = |figure| solution.part_of(amplifier, figure);
        let omega = TAU * part(PartFigure::Gbw)?;
        let resistance = part(PartFigure::OutputResistance).unwrap_or(0.0).max(LEAST_OUTPUT);
        let factor = solution.values[solution.model.parameters.pole_factor()];
        let zeros = &solution.model.zeros[amplifier];
        let mut poles: Vec<(f64, Option<f64>)> =
            solution.model.poles[amplifier].iter().flatten().map(|p| (TAU * p * factor, None)).collect();
        if zeros.len() > poles.len() {
            return None;
        }
        for (pole, zero) in poles.iter_mut().zip(zeros) {
            pole.1 = Some(if zero.right_half_plane { -TAU * zero.frequency } else { TAU * zero.frequency });
        }
        let stated = solution.model.stage.part_of(amplifier);
        let position = solution.values[solution.model.parameters.headroom()];
        let rails = super::super::swing::supplies(solution).filter(|_| !stated.headroom_high.is_empty() && !stated.headroom_low.is_empty());
        let rows = rails.map_or_else(Vec::new, |rails| rows(rails, &stated.headroom_high, &stated.headroom_low, position, resistance));
        let last = |table: &[Headroom]| table.last().map_or(0.0, |h| h.current);
        Some(Self {
            omega,
            dominant: omega / part(PartFigure::OpenLoop)?,
            hold: HOLD * omega,
            rise: part(PartFigure::SlewRise),
            fall: part(PartFigure::SlewFall),
            resistance,
            current: part(PartFigure::CurrentLimit),
            rows,
            stated: (-last(&stated.headroom_low), last(&stated.headroom_high)),
            poles,
        })
    }

    /// Whether there is an output voltage without current that both rails allow.
    pub fn has_room(&self) -> bool {
        let at_rest = self.rows.iter().find(|r| r.until >= 0.0);
        at_rest.is_none_or(|r| r.high.0 > r.low.0)
    }

    /// The row in which a current lies.
    pub fn row_of(&self, current: f64) -> usize {
        self.rows.iter().position(|r| current <= r.until).unwrap_or(self.rows.len().saturating_sub(1))
    }
}

/// Joins both tables to rows over the signed current.
fn rows(rails: (f64, f64), above: &[Headroom], below: &[Headroom], position: f64, resistance: f64) -> Vec<Row> {
    let mut ends: Vec<f64> = above.iter().map(|h| h.current).chain(below.iter().map(|h| -h.current)).collect();
    ends.sort_by(f64::total_cmp);
    ends.dedup_by(|a, b| (*a - *b).abs() <= 0.0);
    ends.push(f64::INFINITY);
    let line = |headroom: &dyn Fn(f64) -> f64, from: f64, to: f64| -> (f64, f64) {
        // Constant outside the tables.
        let (a, b) = match (from.is_finite(), to.is_finite()) {
            (true, true) => (from, to),
            (true, false) => (from, from + 1.0),
            (false, true) => (to - 1.0, to),
            (false, false) => (0.0, 1.0),
        };
        let slope = (headroom(b) - headroom(a)) / (b - a);
        (headroom(a) - slope * a, slope)
    };
    let least = LEAST_LIMIT * resistance;
    let mut from = f64::NEG_INFINITY;
    let mut rows = vec![];
    for until in ends {
        let up = line(&|i| super::super::swing::headroom(above, position, i).0, from, until);
        let down = line(&|i| super::super::swing::headroom(below, position, -i).0, from, until);
        rows.push(Row { until, high: (rails.0 - up.0, up.1 + least), low: (rails.1 + down.0, least - down.1) });
        from = until;
    }
    rows
}
