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
//! Data sheets state offset and bias current at 25 °C and with the inputs in the middle between the rails: drift is counted from
//! there, and so is the common-mode voltage. The supplies' deviation is counted from the note's nominal values, at which the stated
//! offset is taken to hold.
//!
//! # Source
//! Common practice, no source; the doubling of FET bias current per step of junction temperature too, with the data sheet's value
//! at 25 °C.

use alloc::vec::Vec;

use crate::{
    part::PartFigure,
    report::{DcCause, Need, Outcome, Parameter},
    solution::Solution,
    stage::Source,
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
        let below = solution.looped().closed.constant();
        let away = parameters.temperature().map(|slot| solution.values[slot] - DATA_SHEET_TEMPERATURE);
        let causes = [DcCause::Offset, DcCause::OffsetDrift, DcCause::BiasCurrent, DcCause::OffsetCurrent, DcCause::CommonMode];
        let mut by_amplifier: Vec<Vec<(DcCause, Outcome)>> = Vec::new();
        let mut slopes = Vec::new();
        for (index, amplifier) in model.network.amplifiers.iter().enumerate() {
            let input = (solution.from_input(index).constant() / below).abs();
            let ohms = |node: crate::network::Node| solution.from_current(node).constant() / below * model.scale.0;
            let (at_plus, at_minus) = (ohms(amplifier.plus), ohms(amplifier.minus));
            let part = |figure: PartFigure| match solution.part_of(index, figure) {
                Some(v) => Outcome::Value(v),
                None => Outcome::Undetermined(alloc::vec![Need::Part(figure)]),
            };
            let bias = times(&bias_current(solution, index), at_plus + at_minus);
            if let (Outcome::Value(bias), Some(step)) = (&bias, solution.part_of(index, PartFigure::BiasDoubling)) {
                slopes.push(Outcome::Value(bias * core::f64::consts::LN_2 / step));
            }
            slopes.push(times(&part(PartFigure::OffsetDrift), input));
            let errors = [
                times(&part(PartFigure::Offset), input),
                match away {
                    Some(away) => times(&part(PartFigure::OffsetDrift), input * away),
                    None => Outcome::Undetermined(alloc::vec![Need::Ambient]),
                },
                bias,
                times(&part(PartFigure::OffsetCurrent), (at_plus.abs() + at_minus.abs()) / 2.0),
                common_mode(solution, index, input),
            ];
            let mut lines: Vec<(DcCause, Outcome)> = causes.into_iter().zip(errors).collect();
            if let Some((positive, negative)) = parameters.supply() {
                for (cause, slot, figure) in [
                    (DcCause::SupplyPositive, positive, PartFigure::PsrrPositive),
                    (DcCause::SupplyNegative, negative, PartFigure::PsrrNegative),
                ] {
                    let deviation = solution.values[slot] - parameters.entries[slot].nominal;
                    lines.push((cause, rejected(solution, index, figure, deviation * input)));
                }
            }
            by_amplifier.push(lines);
        }
        let mut lines = by_amplifier[0].clone();
        for more in &by_amplifier[1..] {
            for (line, other) in lines.iter_mut().zip(more) {
                line.1 = sum([&line.1, &other.1].into_iter());
            }
        }
        for (input, source) in (0u8..).zip(&model.stage.sources) {
            if matches!(source, Some(Source::Photodiode { .. })) {
                let node = model.network.input_node(usize::from(input));
                let ohms = solution.from_current(node).constant() / below * model.scale.0;
                let dark = parameters.slot(Parameter::DarkCurrent(input)).map_or(0.0, |slot| solution.values[slot]);
                lines.push((DcCause::DarkCurrent, Outcome::Value((ohms * dark).abs())));
            }
        }
        let total = sum(lines.iter().map(|(_, o)| o));
        let drift = sum(slopes.iter());
        Budget { lines, total, drift }
    })
}

/// A magnitude scaled; what is multiplied by nothing is not needed.
fn times(outcome: &Outcome, factor: f64) -> Outcome {
    if factor.abs() <= 0.0 { Outcome::Value(0.0) } else { super::scaled(outcome, factor.abs()) }
}

/// Bias current at the junction temperature, A.
pub(super) fn bias_current(solution: &Solution<'_>, amplifier: usize) -> Outcome {
    let Some(bias) = solution.part_of(amplifier, PartFigure::BiasCurrent) else {
        return Outcome::Undetermined(alloc::vec![Need::Part(PartFigure::BiasCurrent)]);
    };
    match solution.part_of(amplifier, PartFigure::BiasDoubling) {
        None => Outcome::Value(bias),
        Some(step) => match &super::thermal::power(solution).packages[amplifier].junction {
            Outcome::Value(junction) => Outcome::Value(bias * libm::exp2((junction - DATA_SHEET_TEMPERATURE) / step)),
            other => other.clone(),
        },
    }
}

/// Common-mode voltage at an amplifier's inputs, counted from the middle between the rails, over the rejection.
fn common_mode(solution: &Solution<'_>, amplifier: usize, input: f64) -> Outcome {
    let plus = solution.model.network.amplifiers[amplifier].plus;
    let Some((positive, negative)) = solution.model.parameters.supply() else {
        return Outcome::Undetermined(alloc::vec![Need::Supply]);
    };
    let middle = f64::midpoint(solution.values[positive], solution.values[negative]);
    rejected(solution, amplifier, PartFigure::Cmrr, (super::swing::steady(solution, plus) - middle) * input)
}

fn rejected(solution: &Solution<'_>, amplifier: usize, figure: PartFigure, volts: f64) -> Outcome {
    if volts.abs() <= 0.0 {
        return Outcome::Value(0.0);
    }
    match solution.part_of(amplifier, figure) {
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
