//! Rejection of common mode and supplies by the stage as a whole, and the ripple that is left.
//!
//! # Formula
//! A common-mode voltage `vcm` at an amplifier's inputs acts as `vcm/CMRR(f)` in series with them, a supply's change as
//! `v/PSRR(f)`; both rejections fall with one corner, `1/CMRR(f) = (1 + jf/fc)/CMRR(0)`. What they make at the output follows the
//! transfer from the amplifier's input. Their signs are unknown, so contributions are added as magnitudes: the worst case.
//! A stage whose bias comes from the supply passes it on through the network too. The stated ripple stands on each rail but one that
//! is the stage's ground.
//!
//! # Units
//! Rejections in V/V; ripple in V, peak.
//!
//! # Does not apply
//! `stage_cmrr` means nothing for a stage with one input. The error's effect on its own cause, of second order, is left out.
//!
//! # Source
//! Common practice, no source; derived here.

use alloc::vec;

use num_complex::Complex64;

use super::response;
use crate::{
    kind::{Drives, Feed},
    part::PartFigure,
    report::{Need, Outcome},
    solution::{Solution, magnitude},
};

/// Gain of the difference over gain of the common mode, at DC.
#[must_use]
pub fn stage_cmrr(solution: &Solution<'_>) -> Outcome {
    let model = solution.model;
    if !matches!(model.stage.kind.spec().drives, Drives::Differential) {
        return Outcome::DoesNotApply("the stage has no difference of two inputs");
    }
    let mut common = solution.dc_gain(1).abs();
    for (index, amplifier) in model.network.amplifiers.iter().enumerate() {
        let volts = solution.voltage(1, amplifier.plus, 0.0).re.abs();
        let through = input(solution, index, 0.0);
        match left(solution, index, PartFigure::Cmrr, PartFigure::CmrrCorner, 0.0) {
            Ok(share) => common += volts * through * share,
            Err(_) if volts * through <= 0.0 => {}
            Err(outcome) => return outcome,
        }
    }
    Outcome::Value(response::reference(solution).gain.abs() / common)
}

/// Change of a supply over the change that it makes, referred to the input, at DC; the worse of the two rails.
#[must_use]
pub fn stage_psrr(solution: &Solution<'_>) -> Outcome {
    let gain = response::reference(solution).gain.abs();
    let mut worst = f64::INFINITY;
    for rail in [Rail::Positive, Rail::Negative] {
        match passed(solution, rail, 0.0) {
            Ok(passed) => worst = worst.min(gain / passed),
            Err(outcome) => return outcome,
        }
    }
    Outcome::Value(worst)
}

/// Peak of what the stated ripple leaves at the output.
#[must_use]
pub fn ripple_output(solution: &Solution<'_>) -> Outcome {
    let stated = solution.model.stage.supply.and_then(|s| Some((s, s.ripple?)));
    let Some((supply, ripple)) = stated else { return Outcome::Undetermined(vec![Need::Ripple]) };
    let grounded = |rail: crate::stage::Span| rail.low >= 0.0 && rail.high <= 0.0;
    let rails = [(Rail::Positive, supply.positive), (Rail::Negative, supply.negative)];
    let mut sum = 0.0;
    for (rail, _) in rails.into_iter().filter(|(_, volts)| !grounded(*volts)) {
        match passed(solution, rail, ripple.frequency) {
            Ok(passed) => sum += passed * ripple.peak,
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

/// Volts at the output per volt of a rail, magnitudes added.
fn passed(solution: &Solution<'_>, rail: Rail, frequency: f64) -> Result<f64, Outcome> {
    let model = solution.model;
    let (ratio, corner) = match rail {
        Rail::Positive => (PartFigure::PsrrPositive, PartFigure::PsrrPositiveCorner),
        Rail::Negative => (PartFigure::PsrrNegative, PartFigure::PsrrNegativeCorner),
    };
    let mut sum = 0.0;
    for index in 0..solution.amplifiers() {
        sum += input(solution, index, frequency) * left(solution, index, ratio, corner, frequency)?;
    }
    if matches!(rail, Rail::Positive) {
        let inputs = (model.stage.kind.spec().inputs)(model.stage);
        for (drive, _) in inputs.iter().enumerate().filter(|(_, i)| i.feed == Feed::Supply) {
            sum += magnitude(solution.transfer(drive, solution.scaled(frequency)));
        }
    }
    Ok(sum)
}

/// Magnitude of the transfer from a voltage in series with an amplifier's input to the load.
fn input(solution: &Solution<'_>, amplifier: usize, frequency: f64) -> f64 {
    let omega = solution.scaled(frequency);
    magnitude(solution.injection().input[amplifier].at(omega) / solution.looped().closed.at(omega))
}

/// What an amplifier's rejection leaves of a volt at a frequency.
fn left(solution: &Solution<'_>, amplifier: usize, ratio: PartFigure, corner: PartFigure, frequency: f64) -> Result<f64, Outcome> {
    let part = |figure| solution.part_of(amplifier, figure).ok_or_else(|| Outcome::Undetermined(vec![Need::Part(figure)]));
    let ratio = part(ratio)?;
    if frequency <= 0.0 {
        return Ok(1.0 / ratio);
    }
    Ok(magnitude(Complex64::new(1.0, frequency / part(corner)?)) / ratio)
}
