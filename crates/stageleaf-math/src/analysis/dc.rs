//! DC errors at the load, by cause.
//!
//! # Formula
//! Offset and what is referred to the input is multiplied by the transfer from a voltage in series with the amplifier's input
//! (the noise gain, less the loop's finite gain); bias currents by the transfers from a current at each input. Bias current has
//! either sign but the same at both inputs, the offset current half at each, opposite. The total is the sum of magnitudes.
//!
//! # Units
//! V at the load.
//!
//! # Does not apply
//! Drift is counted only over the distance of the temperature from the ambient's nominal: `offset` is taken to hold there.
//!
//! # Source
//! Common practice, no source; the doubling of FET bias current per step of junction temperature too, with the data sheet's value
//! at 25 °C.

use alloc::vec::Vec;

use crate::{
    part::PartFigure,
    report::{DcCause, Need, Outcome},
    solution::Solution,
};

/// Temperature at which data sheets state the bias current: 25 °C (common practice, no source).
pub const DATA_SHEET_TEMPERATURE: f64 = 298.15;

/// The budget.
#[derive(Clone, Debug)]
pub struct Budget {
    /// Magnitudes by cause.
    pub lines: Vec<(DcCause, Outcome)>,
    /// Their sum.
    pub total: Outcome,
    /// Drift of the output with temperature, V/K.
    pub drift: Outcome,
}

/// The DC budget of a build.
pub fn budget<'s>(solution: &'s Solution<'_>) -> &'s Budget {
    solution.dc.get_or_init(|| {
        let model = solution.model;
        let parameters = &model.parameters;
        let looped = solution.looped();
        let below = looped.closed.constant();
        let injection = solution.injection();
        let input = (injection.input.constant() / below).abs();
        let amplifier = model.network.amplifier;
        let ohms = |node: crate::network::Node| injection.current[usize::from(node.0)].constant() / below * model.scale.0;
        let (at_plus, at_minus) = (ohms(amplifier.plus), ohms(amplifier.minus));
        let part = |figure: PartFigure| match solution.part(figure) {
            Some(v) => Outcome::Value(v),
            None => Outcome::Undetermined(alloc::vec![Need::Part(figure)]),
        };
        let times =
            |outcome: Outcome, factor: f64| if factor.abs() <= 0.0 { Outcome::Value(0.0) } else { super::scaled(&outcome, factor.abs()) };

        let mut lines = alloc::vec![(DcCause::Offset, times(part(PartFigure::Offset), input))];
        let away = parameters.temperature().map_or(0.0, |slot| solution.values[slot] - parameters.entries[slot].nominal);
        lines.push((DcCause::OffsetDrift, times(part(PartFigure::OffsetDrift), input * away)));
        let bias = times(bias_current(solution), at_plus + at_minus);
        lines.push((DcCause::BiasCurrent, bias));
        lines.push((DcCause::OffsetCurrent, times(part(PartFigure::OffsetCurrent), (at_plus.abs() + at_minus.abs()) / 2.0)));
        lines.push((DcCause::CommonMode, common_mode(solution, input)));
        if let Some((positive, negative)) = parameters.supply() {
            for (cause, slot, figure) in [
                (DcCause::SupplyPositive, positive, PartFigure::PsrrPositive),
                (DcCause::SupplyNegative, negative, PartFigure::PsrrNegative),
            ] {
                let deviation = solution.values[slot] - parameters.entries[slot].nominal;
                lines.push((cause, rejected(solution, figure, deviation * input)));
            }
        }
        let total = sum(lines.iter().map(|(_, o)| o));
        let mut slopes = alloc::vec![times(part(PartFigure::OffsetDrift), input)];
        if let (Outcome::Value(bias), Some(step)) = (&lines[2].1, solution.part(PartFigure::BiasDoubling)) {
            slopes.push(Outcome::Value(bias * core::f64::consts::LN_2 / step));
        }
        let drift = sum(slopes.iter());
        Budget { lines, total, drift }
    })
}

/// Bias current at the junction temperature, A.
fn bias_current(solution: &Solution<'_>) -> Outcome {
    let Some(bias) = solution.part(PartFigure::BiasCurrent) else {
        return Outcome::Undetermined(alloc::vec![Need::Part(PartFigure::BiasCurrent)]);
    };
    match solution.part(PartFigure::BiasDoubling) {
        None => Outcome::Value(bias),
        Some(step) => match &super::thermal::power(solution).junction {
            Outcome::Value(junction) => Outcome::Value(bias * libm::exp2((junction - DATA_SHEET_TEMPERATURE) / step)),
            other => other.clone(),
        },
    }
}

/// Common-mode voltage of the signal's DC part over the rejection.
fn common_mode(solution: &Solution<'_>, input: f64) -> Outcome {
    let model = solution.model;
    let plus = model.network.amplifier.plus;
    if plus == crate::network::GROUND {
        return Outcome::Value(0.0);
    }
    let dc = model.stage.signal.map_or(0.0, |s| s.dc);
    let looped = solution.looped();
    let volts = dc * looped.forward[usize::from(plus.0)].constant() / looped.closed.constant();
    rejected(solution, PartFigure::Cmrr, volts * input)
}

fn rejected(solution: &Solution<'_>, figure: PartFigure, volts: f64) -> Outcome {
    if volts.abs() <= 0.0 {
        return Outcome::Value(0.0);
    }
    match solution.part(figure) {
        Some(ratio) => Outcome::Value(volts.abs() / ratio),
        None => Outcome::Undetermined(alloc::vec![Need::Part(figure)]),
    }
}

/// The sum of magnitudes, or all that is missing for it.
fn sum<'o>(outcomes: impl Iterator<Item = &'o Outcome>) -> Outcome {
    let mut total = 0.0;
    let mut needs = Vec::new();
    for outcome in outcomes {
        match outcome {
            Outcome::Value(v) => total += v,
            Outcome::Undetermined(missing) => {
                for need in missing {
                    if !needs.contains(need) {
                        needs.push(*need);
                    }
                }
            }
            other => return other.clone(),
        }
    }
    if needs.is_empty() { Outcome::Value(total) } else { Outcome::Undetermined(needs) }
}
