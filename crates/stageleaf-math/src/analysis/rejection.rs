//! What the amplifiers' rejections of common mode and supplies leave, inside the network: at the output, and of the gain.
//!
//! # Formula
//! In series with each amplifier's input acts `ε = κ·(v₊ + v₋)/2 + Σ v_rail/PSRR`, with `κ = ±1/CMRR`; all rejections fall with one
//! corner, `1/CMRR(f) = (1 + jf/fc)/CMRR(0)`, that of the common mode down to 1 and no further. The voltages at the inputs follow the drives and every `ε`
//! in turn, so the errors of all amplifiers are solved together, with transfers from the nodal network.
//!
//! Signs are unknown. Gains take them as parameters of the spread, 0 at nominal values. The stage's rejections are the worst over
//! all signs of `κ` in every build; what several amplifiers and rails pass adds up as magnitudes. A stage whose bias comes from the
//! supply passes its change on through the network too. The stated ripple stands on each rail but one that is the stage's ground.
//!
//! # Units
//! Rejections in V/V; ripple in V, peak.
//!
//! # Does not apply
//! `stage_cmrr` means nothing for a stage with one input. Loop, poles and edges leave the common-mode error out, and so do gains
//! where a part states no rejection, or no corner of it at a frequency (a caution says so).
//!
//! # Source
//! Common practice, no source; derived here. Checked against dense nodal matrices with the same sources in them:
//! `tests/outside/rejection.py`.

use alloc::{vec, vec::Vec};

use num_complex::Complex64;

use super::response;
use crate::{
    dimension::Dimension,
    kind::{Drives, Feed},
    network::Node,
    part::PartFigure,
    report::{Need, Outcome, Parameter},
    solution::{Solution, magnitude},
};

/// A drive's gain at the kind's reference with the common-mode errors of this build's signs in it.
#[must_use]
pub fn gain(solution: &Solution<'_>, drive: usize) -> f64 {
    let point = response::reference(solution);
    let signs = signs(solution);
    if signs.is_none() && drive == 0 {
        return point.gain;
    }
    let h = signs.map_or_else(|| solution.transfer(drive, point.omega), |s| Errors::new(solution, &s, point.omega).transfer(drive));
    let stage = solution.model.stage;
    let ideal = stage.kind.ideal_gain(stage, drive).unwrap_or(h.re);
    if point.omega <= 0.0 { h.re } else { magnitude(h) * if ideal < 0.0 { -1.0 } else { 1.0 } }
}

/// A drive's transfer to the load with the common-mode errors of this build's signs in it.
#[must_use]
pub fn transfer(solution: &Solution<'_>, drive: usize, omega: f64) -> Complex64 {
    signs(solution).map_or_else(|| solution.transfer(drive, omega), |signs| Errors::new(solution, &signs, omega).transfer(drive))
}

/// The signs of this build by amplifier, unless all are nothing.
fn signs(solution: &Solution<'_>) -> Option<Vec<f64>> {
    let sign = |a| solution.model.parameters.slot(Parameter::RejectionSign(a)).map_or(0.0, |slot| solution.values[slot]);
    let signs: Vec<f64> = (0u8..).take(solution.amplifiers()).map(sign).collect();
    signs.iter().any(|s| s.abs() > 0.0).then_some(signs)
}

/// Gain of the difference over gain of the common mode at a frequency in Hz, 0 for DC.
#[must_use]
pub fn stage_cmrr(solution: &Solution<'_>, frequency: f64) -> Outcome {
    let model = solution.model;
    if !matches!(model.stage.kind.spec().drives, Drives::Differential) {
        return Outcome::DoesNotApply("the stage has no difference of two inputs");
    }
    let omega = solution.scaled(frequency);
    for (index, amplifier) in model.network.amplifiers.iter().enumerate() {
        let common = [amplifier.plus, amplifier.minus].map(|n| magnitude(solution.voltage(1, n, omega)));
        let through = magnitude(solution.inside_to(index, model.network.load, omega));
        if common[0].max(common[1]) * through > 0.0
            && let Err(outcome) = left(solution, index, PartFigure::Cmrr, PartFigure::CmrrCorner, frequency)
        {
            return outcome;
        }
    }
    let worst = worst(solution, omega, |errors| magnitude(errors.transfer(0)) / magnitude(errors.transfer(1)));
    Outcome::Value(worst)
}

/// Change of a supply over the change that it makes, referred to the input, at a frequency in Hz, 0 for DC; the worse of the two rails.
#[must_use]
pub fn stage_psrr(solution: &Solution<'_>, frequency: f64) -> Outcome {
    if !matches!(solution.model.stage.kind.spec().gain, Dimension::Gain) {
        return Outcome::DoesNotApply("the input is no voltage to which a supply's change could be referred: see ripple_output");
    }
    let omega = solution.scaled(frequency);
    // Referred to the input by the gain of the pass band.
    let gain = response::reference(solution).gain.abs();
    let mut least = f64::INFINITY;
    for rail in [Rail::Positive, Rail::Negative] {
        match entering(solution, rail, frequency) {
            Err(outcome) => return outcome,
            Ok(shares) => least = least.min(worst(solution, omega, |errors| gain / errors.passed(rail, &shares))),
        }
    }
    Outcome::Value(least)
}

/// Peak of what the stated ripple leaves at the output.
#[must_use]
pub fn ripple_output(solution: &Solution<'_>) -> Outcome {
    let stated = solution.model.stage.supply.and_then(|s| Some((s, s.ripple?)));
    let Some((supply, ripple)) = stated else { return Outcome::Undetermined(vec![Need::Ripple]) };
    let grounded = |rail: crate::stage::Span| rail.low >= 0.0 && rail.high <= 0.0;
    let rails = [(Rail::Positive, supply.positive), (Rail::Negative, supply.negative)];
    let omega = solution.scaled(ripple.frequency);
    let mut sum = 0.0;
    for (rail, _) in rails.into_iter().filter(|(_, volts)| !grounded(*volts)) {
        match entering(solution, rail, ripple.frequency) {
            Ok(shares) => sum += ripple.peak / worst(solution, omega, |errors| 1.0 / errors.passed(rail, &shares)),
            Err(outcome) => return outcome,
        }
    }
    Outcome::Value(sum)
}

#[derive(Clone, Copy)]
enum Rail {
    Positive,
    Negative,
}

/// What each amplifier's rejection of a rail lets in, V/V at its input.
fn entering(solution: &Solution<'_>, rail: Rail, frequency: f64) -> Result<Vec<f64>, Outcome> {
    let (ratio, corner) = match rail {
        Rail::Positive => (PartFigure::PsrrPositive, PartFigure::PsrrPositiveCorner),
        Rail::Negative => (PartFigure::PsrrNegative, PartFigure::PsrrNegativeCorner),
    };
    (0..solution.amplifiers()).map(|a| left(solution, a, ratio, corner, frequency).map(magnitude)).collect()
}

/// The least of a ratio over all signs of the common-mode errors.
fn worst(solution: &Solution<'_>, omega: f64, of: impl Fn(&Errors<'_, '_>) -> f64) -> f64 {
    let count = solution.amplifiers();
    let signs = |choice: usize| -> Vec<f64> { (0..count).map(|a| if choice >> a & 1 == 1 { 1.0 } else { -1.0 }).collect() };
    (0..1_usize << count).map(|choice| of(&Errors::new(solution, &signs(choice), omega))).fold(f64::INFINITY, f64::min)
}

/// What an amplifier's rejection leaves of a volt at a frequency.
fn left(solution: &Solution<'_>, amplifier: usize, ratio: PartFigure, corner: PartFigure, frequency: f64) -> Result<Complex64, Outcome> {
    let part = |figure| solution.part_of(amplifier, figure).ok_or_else(|| Outcome::Undetermined(vec![Need::Part(figure)]));
    let ratio = part(ratio)?;
    Ok(if frequency > 0.0 { Complex64::new(1.0, frequency / part(corner)?) / ratio } else { Complex64::new(1.0 / ratio, 0.0) })
}

/// The common-mode errors of all amplifiers at a frequency, solved together.
struct Errors<'s, 'm> {
    solution: &'s Solution<'m>,
    omega: f64,
    /// By amplifier: `κ`; nothing where the part does not state it.
    kappa: Vec<Complex64>,
    /// `1 − κ·M`, with `M` from a voltage in series with one amplifier's input to the common mode at another's.
    matrix: Vec<Vec<Complex64>>,
}

impl<'s, 'm> Errors<'s, 'm> {
    fn new(solution: &'s Solution<'m>, signs: &[f64], omega: f64) -> Self {
        let frequency = solution.hertz(omega);
        // An input that answered to the common mode more than to the difference would be no input.
        let left = |a| match left(solution, a, PartFigure::Cmrr, PartFigure::CmrrCorner, frequency) {
            Ok(left) => left / magnitude(left).max(1.0),
            Err(_) => Complex64::new(0.0, 0.0),
        };
        let kappa: Vec<Complex64> = signs.iter().enumerate().map(|(a, sign)| left(a) * sign).collect();
        let one = |a: usize, b: usize| Complex64::new(if a == b { 1.0 } else { 0.0 }, 0.0);
        let element = |a: usize, b: usize| {
            let moved = if kappa[a].norm_sqr() > 0.0 { common(solution, a, |n| solution.inside_to(b, n, omega)) } else { one(0, 1) };
            one(a, b) - kappa[a] * moved
        };
        let matrix = (0..signs.len()).map(|a| (0..signs.len()).map(|b| element(a, b)).collect()).collect();
        Self { solution, omega, kappa, matrix }
    }

    /// A drive's transfer to the load.
    fn transfer(&self, drive: usize) -> Complex64 {
        let at = |node| self.solution.voltage(drive, node, self.omega);
        let raised = |a: usize| common(self.solution, a, at) * self.kappa[a];
        self.solution.transfer(drive, self.omega) + self.at_load(self.solved((0..self.kappa.len()).map(raised).collect()))
    }

    /// Volts at the load per volt of a rail, of which `shares` enter at the amplifiers' inputs; magnitudes added.
    fn passed(&self, rail: Rail, shares: &[f64]) -> f64 {
        let unit = |a: usize| (0..shares.len()).map(|b| Complex64::new(if a == b { 1.0 } else { 0.0 }, 0.0)).collect();
        let mut sum: f64 = shares.iter().enumerate().map(|(a, share)| magnitude(self.at_load(self.solved(unit(a)))) * share).sum();
        if matches!(rail, Rail::Positive) {
            let stage = self.solution.model.stage;
            let fed = (stage.kind.spec().inputs)(stage).iter().enumerate().filter(|(_, i)| i.feed == Feed::Supply);
            sum += fed.map(|(drive, _)| magnitude(self.transfer(drive))).sum::<f64>();
        }
        sum
    }

    fn at_load(&self, errors: Vec<Complex64>) -> Complex64 {
        let load = self.solution.model.network.load;
        errors.iter().enumerate().map(|(a, error)| error * self.solution.inside_to(a, load, self.omega)).sum()
    }

    /// The errors for what raises them, by Gaussian elimination: the diagonal is near one.
    fn solved(&self, mut right: Vec<Complex64>) -> Vec<Complex64> {
        let (mut m, n) = (self.matrix.clone(), right.len());
        for k in 0..n {
            let (pivot, above) = (m[k].clone(), right[k]);
            for (row, right) in m.iter_mut().zip(&mut right).skip(k + 1) {
                let factor = row[k] / pivot[k];
                for (below, above) in row.iter_mut().zip(&pivot) {
                    *below -= factor * above;
                }
                *right -= factor * above;
            }
        }
        for k in (0..n).rev() {
            for column in k + 1..n {
                let known = right[column];
                right[k] -= m[k][column] * known;
            }
            right[k] /= m[k][k];
        }
        right
    }
}

/// The common mode at an amplifier's inputs.
fn common(solution: &Solution<'_>, amplifier: usize, at: impl Fn(Node) -> Complex64) -> Complex64 {
    let amplifier = solution.model.network.amplifiers[amplifier];
    (at(amplifier.plus) + at(amplifier.minus)) / 2.0
}
