//! Whether a stage's values can be analysed at all.

use core::ops::RangeInclusive;

use crate::{
    Error,
    dimension::Dimension,
    figure::Argument,
    part::PartFigure,
    stage::{Source, Stage},
};

/// Whether the stage's values can be analysed at all.
///
/// # Errors
/// The first [`Error`] found: a missing component, a value that is zero, negative or not finite, reversed supplies or ranges.
pub fn check(stage: &Stage) -> Result<(), Error> {
    for spec in stage.kind.components() {
        match stage.component(spec.name) {
            None if spec.required => return Err(Error::MissingComponent { what: spec.name }),
            None => {}
            Some(value) => {
                component_value(spec.name, spec.dimension, value.nominal)?;
                tolerance(spec.name, value)?;
                if let Some(other) = spec.with
                    && stage.component(other).is_none()
                {
                    return Err(Error::Unpaired { given: spec.name, missing: other });
                }
            }
        }
    }
    for source in stage.sources.iter().flatten() {
        match source {
            Source::Resistive { resistance } => {
                if resistance.nominal < 0.0 || !resistance.nominal.is_finite() {
                    return Err(Error::Negative { what: "source.resistance", given: resistance.nominal });
                }
                tolerance("source.resistance", resistance)?;
            }
            Source::Capacitive { capacitance } => {
                positive("source.capacitance", capacitance.nominal)?;
                tolerance("source.capacitance", capacitance)?;
            }
            Source::Photodiode { capacitance, shunt_resistance, dark_current } => {
                positive("source.capacitance", capacitance.nominal)?;
                tolerance("source.capacitance", capacitance)?;
                if let Some(shunt) = shunt_resistance {
                    positive("source.shunt_resistance", shunt.nominal)?;
                    tolerance("source.shunt_resistance", shunt)?;
                }
                if let Some(dark) = dark_current {
                    if dark.nominal < 0.0 || !dark.nominal.is_finite() {
                        return Err(Error::Negative { what: "source.dark_current", given: dark.nominal });
                    }
                    tolerance("source.dark_current", dark)?;
                }
            }
        }
    }
    for (what, value) in [
        ("load.resistance", &stage.load.resistance),
        ("load.capacitance", &stage.load.capacitance),
        ("converter.sample_capacitance", &stage.converter.sample_capacitance),
        ("converter.switch_resistance", &stage.converter.switch_resistance),
        ("converter.series_resistance", &stage.converter.series_resistance),
        ("converter.shunt_capacitance", &stage.converter.shunt_capacitance),
        ("board.inverting_node", &stage.board.inverting_node),
        ("board.non_inverting_node", &stage.board.non_inverting_node),
        ("board.across_feedback", &stage.board.across_feedback),
    ] {
        if let Some(value) = value {
            positive(what, value.nominal)?;
            tolerance(what, value)?;
        }
    }
    if let Some(supply) = stage.supply {
        span("supply.positive", supply.positive.low, supply.positive.high)?;
        span("supply.negative", supply.negative.low, supply.negative.high)?;
        if supply.positive.low <= supply.negative.high {
            return Err(Error::SupplyReversed { positive: supply.positive.low, negative: supply.negative.high });
        }
    }
    if let Some([low, high]) = stage.converter.full_scale {
        span("converter.full_scale", low, high)?;
        positive("converter.full_scale", high - low)?;
    }
    for (what, value) in [("converter.bits", stage.converter.bits), ("converter.acquisition_time", stage.converter.acquisition_time)] {
        value.map_or(Ok(()), |value| positive(what, value))?;
    }
    if let Some(noise) = stage.converter.noise.filter(|noise| !noise.is_finite() || *noise < 0.0) {
        return Err(Error::Negative { what: "converter.noise", given: noise });
    }
    if let Some(ripple) = stage.supply.and_then(|s| s.ripple) {
        if ripple.peak < 0.0 || !ripple.peak.is_finite() {
            return Err(Error::Negative { what: "supply.ripple", given: ripple.peak });
        }
        positive("supply.ripple_frequency", ripple.frequency)?;
    }
    if let Some(ambient) = stage.ambient {
        span("ambient.range", ambient.range.low, ambient.range.high)?;
        positive("ambient.range", ambient.range.low)?;
        if let Some(kelvin) = ambient.values_at {
            positive("ambient.values_at", kelvin)?;
        }
    }
    if let Some(band) = stage.band {
        positive("band.from", band.from)?;
        positive("band.to", band.to)?;
        span("band", band.from, band.to)?;
    }
    for signal in stage.signals.iter().flatten() {
        if signal.peak < 0.0 || !signal.peak.is_finite() {
            return Err(Error::Negative { what: "signal.peak", given: signal.peak });
        }
        if let Some(frequency) = signal.frequency {
            positive("signal.frequency", frequency)?;
        }
        positive("signal.crest_factor", signal.crest_factor)?;
    }
    if let Some(common) = stage.common_mode {
        span("signal.common_mode", common.low, common.high)?;
    }
    for limit in &stage.limits {
        match limit.query.figure.argument() {
            Argument::None => {}
            Argument::Frequency => positive(limit.query.figure.id(), limit.query.at.unwrap_or(0.0))?,
            Argument::Settling => {
                positive(limit.query.figure.id(), limit.query.at.unwrap_or(0.0))?;
                positive(limit.query.figure.id(), limit.query.step.unwrap_or(0.0))?;
            }
        }
    }
    for amplifier in 0..stage.kind.spec().amplifiers {
        part(stage.part_of(amplifier))?;
    }
    Ok(())
}

/// What no amplifier has: a figure that is zero, negative or not finite where the model divides by it.
fn part(part: &crate::part::Part) -> Result<(), Error> {
    for &figure in PartFigure::ALL {
        let rating = part.rating(figure);
        let may_be_zero = matches!(
            figure,
            PartFigure::OutputResistance
                | PartFigure::DifferentialCapacitance
                | PartFigure::CommonModeCapacitance
                | PartFigure::Offset
                | PartFigure::OffsetDrift
                | PartFigure::BiasCurrent
                | PartFigure::OffsetCurrent
                | PartFigure::SupplyCurrent
                | PartFigure::SupplySpanMin
                | PartFigure::NoiseVoltage
                | PartFigure::NoiseVoltageCorner
                | PartFigure::NoiseCurrent
                | PartFigure::NoiseCurrentCorner
                | PartFigure::JunctionToAmbient
                | PartFigure::OverloadRecovery
                | PartFigure::Startup
        );
        let signed = matches!(figure, PartFigure::RangeFromNegative | PartFigure::RangeFromPositive);
        for value in [rating.min, rating.typ, rating.max].into_iter().flatten() {
            if !value.is_finite() || !signed && !may_be_zero && value <= 0.0 {
                return Err(Error::NotPositive { what: figure.id(), given: value });
            }
            if value.abs() > GREATEST || value != 0.0 && value.abs() < SMALLEST {
                return Err(Error::BeyondReason { what: figure.id(), given: value });
            }
            if may_be_zero && value < 0.0 {
                return Err(Error::Negative { what: figure.id(), given: value });
            }
        }
    }
    for &pole in part.poles.iter().flatten() {
        positive("gain.poles", pole)?;
    }
    for zero in &part.zeros {
        positive("gain.zeros", zero.frequency)?;
    }
    Ok(())
}

/// What no value of a circuit leaves, in SI units: beyond it sums of products lose their meaning before they lose their digits.
const SMALLEST: f64 = 1e-30;
/// See [`SMALLEST`].
const GREATEST: f64 = 1e30;

fn positive(what: &'static str, given: f64) -> Result<(), Error> {
    if !(given > 0.0 && given.is_finite()) {
        return Err(Error::NotPositive { what, given });
    }
    if (SMALLEST..=GREATEST).contains(&given) { Ok(()) } else { Err(Error::BeyondReason { what, given }) }
}

/// A component's value: what can be bought or built, with room to spare.
fn component_value(what: &'static str, dimension: Dimension, given: f64) -> Result<(), Error> {
    positive(what, given)?;
    let sane: RangeInclusive<f64> = if matches!(dimension, Dimension::Resistance) { 1e-6..=1e15 } else { 1e-18..=1e3 };
    if sane.contains(&given) { Ok(()) } else { Err(Error::BeyondReason { what, given }) }
}

fn tolerance(what: &'static str, value: &crate::stage::Toleranced) -> Result<(), Error> {
    let sane = |v: f64| v >= 0.0 && v.is_finite();
    if !sane(value.plus) || !sane(value.drift) || !sane(value.minus) {
        return Err(Error::Negative { what, given: value.minus.min(value.plus).min(value.drift) });
    }
    if value.minus >= 1.0 && value.nominal > 0.0 {
        return Err(Error::NotPositive { what, given: value.nominal * (1.0 - value.minus) });
    }
    Ok(())
}

fn span(what: &'static str, low: f64, high: f64) -> Result<(), Error> {
    if low <= high && low.is_finite() && high.is_finite() { Ok(()) } else { Err(Error::RangeReversed { what, low, high }) }
}
