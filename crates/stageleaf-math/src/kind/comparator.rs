//! What both comparators share: inputs, closed forms.

use alloc::{vec, vec::Vec};

use super::{Drive, Feed, InputSpec, line, nominal};
use crate::{
    dimension::Dimension::{self, Number, Resistance, Voltage},
    figure::Figure,
    report::Working,
    stage::Stage,
};

/// A signal and a reference.
pub const INPUTS: &[InputSpec] =
    &[InputSpec::signal("in", Drive::Voltage), InputSpec { name: "reference", drive: Drive::Voltage, feed: Feed::Reference }];

/// What the ideal thresholds leave out.
const DIFFERENCE: &str = "the headroom at the output current, the resistances of signal and reference, the amplifier's input currents, gain and input resistance";

/// A closed form: figure, formula, what it gives.
pub type Form = (Figure, &'static str, f64);

/// Formulas with what they give, in the order of the figures.
pub const fn three(formulas: [&'static str; 3], values: [f64; 3]) -> [Form; 3] {
    [
        (Figure::ThresholdHigh, formulas[0], values[0]),
        (Figure::ThresholdLow, formulas[1], values[1]),
        (Figure::Hysteresis, formulas[2], values[2]),
    ]
}

/// The closed forms of upper threshold, lower threshold and hysteresis.
pub fn forms(forms: [Form; 3], numbers: &[(&'static str, f64, Dimension)], source: &'static str) -> Vec<Working> {
    let of = |(figure, formula, handbook): Form| Working {
        dimension: Voltage,
        source,
        // Only the symbols that the formula has.
        ..line(figure, formula, numbers.iter().filter(|(symbol, ..)| holds(formula, symbol)).copied().collect(), handbook, DIFFERENCE)
    };
    forms.into_iter().map(of).collect()
}

fn holds(formula: &str, symbol: &str) -> bool {
    formula.split(|c: char| !c.is_alphanumeric() && c != '_').any(|token| token == symbol)
}

/// The conductance of a component; 0 where the stage does not have it.
pub fn siemens(stage: &Stage, name: &str) -> f64 {
    stage.component(name).map_or(0.0, |c| 1.0 / c.nominal)
}

/// Nominal supplies and reference, as the ideal output levels and the reference voltage; not numbers where they are not stated.
pub fn levels(stage: &Stage) -> (f64, f64, f64) {
    let (high, low) = stage.supply.map_or((f64::NAN, f64::NAN), |s| (s.positive.nominal, s.negative.nominal));
    (high, low, stage.reference.map_or(f64::NAN, |r| r.voltage.nominal))
}

/// The numbers of the closed forms: the levels, the reference, the resistor beside `R2`, `R2` itself, the three in parallel.
pub fn symbols(stage: &Stage, first: (&'static str, f64), parallel: f64) -> Vec<(&'static str, f64, Dimension)> {
    let (high, low, reference) = levels(stage);
    vec![
        ("Vref", reference, Voltage),
        ("V_OH", high, Voltage),
        ("V_OL", low, Voltage),
        (first.0, first.1, Resistance),
        ("R2", nominal(stage, "R2"), Resistance),
        ("Rp", parallel, Resistance),
        ("k", 1.0 + nominal(stage, "Rser") * siemens(stage, "R4"), Number),
    ]
}
