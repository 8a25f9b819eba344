//! What was measured at the bench, beside what is predicted for those conditions.

use alloc::vec::Vec;

use crate::{
    Error,
    analyse::{Detail, analyse_with},
    figure::{Figure, Query},
    limit::{Bound, Limit, Thin},
    model::Plans,
    part::Part,
    report::Outcome,
    stage::{Ambient, Span, Stage},
};

/// A figure of one built circuit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Measurement {
    /// The figure.
    pub query: Query,
    /// Its value with the ends of its uncertainty.
    pub value: Span,
    /// Temperature of the circuit in K; without one anywhere in the ambient's range.
    pub temperature: Option<f64>,
}

/// Whether a measurement fits the prediction.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Agreement {
    /// Within its uncertainty it lies in the predicted range.
    Agrees,
    /// It does not: the model, the data, or the circuit is not what the note says.
    Contradicts,
    /// Nothing is predicted.
    Undetermined,
}

impl Agreement {
    /// The word for it.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Self::Agrees => "agrees",
            Self::Contradicts => "contradicts",
            Self::Undetermined => "undetermined",
        }
    }
}

/// A measurement beside its prediction.
#[derive(Clone, Debug, PartialEq)]
pub struct MeasuredRow {
    /// What was measured.
    pub measurement: Measurement,
    /// The prediction at nominal values.
    pub nominal: Outcome,
    /// The range of built circuits at those conditions: tolerances, supplies, part figures from guaranteed to as far on the better
    /// side of typical.
    pub range: Option<(f64, f64)>,
    /// Whether they fit.
    pub agreement: Agreement,
}

/// Every measurement of the stage beside its prediction; one analysis for each temperature.
///
/// # Errors
/// What [`crate::check`] finds.
pub(crate) fn compared(stage: &Stage, plans: &Plans) -> Result<Vec<MeasuredRow>, Error> {
    let mut rows = Vec::with_capacity(stage.measured.len());
    let mut temperatures: Vec<Option<f64>> = Vec::new();
    for measurement in &stage.measured {
        if !temperatures.iter().any(|t| same(*t, measurement.temperature)) {
            temperatures.push(measurement.temperature);
        }
    }
    for temperature in temperatures {
        let mut variant = stage.clone();
        if let Some(kelvin) = temperature {
            // Tolerances were stated elsewhere: from there the drift counts.
            let values_at = stage.ambient.map(|a| a.values_at.unwrap_or(a.range.nominal));
            variant.ambient = Some(Ambient { range: Span::exact(kelvin), values_at });
        }
        let here = |m: &&Measurement| same(m.temperature, temperature);
        let asked = |m: &Measurement| Limit { query: m.query, bound: Bound::Report, thin: Thin::Fraction(0.0) };
        both_ways(&mut variant.part);
        variant.parts.iter_mut().for_each(|(_, part)| both_ways(part));
        variant.measured = Vec::new();
        variant.limits = stage.measured.iter().filter(here).map(asked).collect();
        let report = analyse_with(&variant, Detail::Limits, plans)?;
        for (measurement, predicted) in stage.measured.iter().filter(here).zip(&report.limits) {
            let range = predicted.range.map(|range| one_built(measurement.query.figure, range));
            rows.push(MeasuredRow {
                measurement: *measurement,
                nominal: predicted.nominal.clone(),
                range,
                agreement: agreement(measurement, &predicted.nominal, range),
            });
        }
    }
    // In the note's order.
    rows.sort_by_key(|row| stage.measured.iter().position(|m| *m == row.measurement));
    Ok(rows)
}

/// A part is as often better than typical as it is worse: where a data sheet bounds the worse side alone, the better side is taken
/// as far away, as a ratio.
fn both_ways(part: &mut Part) {
    for rating in &mut part.ratings {
        match (rating.min, rating.typ, rating.max) {
            (None, Some(typ), Some(max)) if max > 0.0 && typ > 0.0 => rating.min = Some(typ * typ / max),
            (Some(min), Some(typ), None) if min > 0.0 && typ > 0.0 => rating.max = Some(typ * typ / min),
            _ => {}
        }
    }
}

/// The range of one built circuit: errors that are summed by magnitude have either sign in it, and may cancel; a rejection is then
/// without bound.
fn one_built(figure: Figure, (low, high): (f64, f64)) -> (f64, f64) {
    match figure {
        Figure::OutputOffset | Figure::InputOffset | Figure::OffsetDrift | Figure::GainDrift => {
            let bound = low.abs().max(high.abs());
            (-bound, bound)
        }
        Figure::RippleOutput => (0.0, high),
        Figure::StageCmrr | Figure::StageCmrrAt | Figure::StagePsrr | Figure::StagePsrrAt => (low, f64::INFINITY),
        _ => (low, high),
    }
}

fn same(a: Option<f64>, b: Option<f64>) -> bool {
    a.map(f64::to_bits) == b.map(f64::to_bits)
}

fn agreement(measurement: &Measurement, nominal: &Outcome, range: Option<(f64, f64)>) -> Agreement {
    let Some(value) = nominal.value() else { return Agreement::Undetermined };
    let (low, high) = range.unwrap_or((value, value));
    if measurement.value.high >= low && measurement.value.low <= high { Agreement::Agrees } else { Agreement::Contradicts }
}
