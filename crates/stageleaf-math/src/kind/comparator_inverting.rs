//! Inverting comparator with hysteresis: the signal at the inverting input, against a reference that the output shifts through `R2`.
//!
//! # Formula
//! With `Rp = R1 ∥ R2 ∥ R3` the + input stands at `Rp·(Vref/R1 + Vout/R2)`: the upper threshold while the output is high, the lower one
//! while it is low; a divider `Rser`, `R4` at the signal multiplies both by `1 + Rser/R4`. For the working and as a check; figures come
//! from the network (see [`crate::analysis::switching`]).
//!
//! # Units
//! `R1` (reference), `R2` (feedback) in Ω, required; `R3` from the + input to ground, `R4` from the − input to ground, `Rser` in Ω,
//! `Cshunt` in F. Thresholds in V at the source of the signal.
//!
//! # Does not apply
//! Gains, margins, noise: the feedback is positive, and the output rests at one of its two levels. A pole in the right half plane
//! is what makes it switch.
//!
//! # Source
//! Derived here: Kirchhoff's current law at the + input. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("comparator-inverting"), Some(Kind::ComparatorInverting));
//! ```

use super::{comparator::*, *};
use crate::network::GROUND;

/// The kind.
pub static SPEC: Spec = Spec {
    id: "comparator-inverting",
    title: "Inverting comparator with hysteresis",
    summary: "The output goes low when the signal rises through the upper threshold, and high when it falls through the lower one.",
    ideal_formula: "V_hys = (V_OH − V_OL)·Rp/R2, Rp = R1 ∥ R2 ∥ R3",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from the reference to the + input"),
        ComponentSpec::required("R2", Dimension::Resistance, "from the output to the + input: positive feedback"),
        ComponentSpec::optional("R3", Dimension::Resistance, "from the + input to ground"),
        INPUT_SERIES,
        ComponentSpec::optional("R4", Dimension::Resistance, "from the − input to ground: divides the signal, with `Rser`").beside("Rser"),
        INPUT_SHUNT,
        ISOLATION,
    ],
    amplifiers: 1,
    inputs: |_| INPUTS,
    drives: Drives::Each,
    switching: Some(Sense::Inverting),
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let reference = network.reference(1);
        let minus = network.behind("Rser", signal);
        network.component("R4", minus, GROUND);
        network.component("Cshunt", minus, GROUND);
        let plus = network.node();
        network.component("R1", reference, plus);
        network.component("R3", plus, GROUND);
        let (pin, sense) = network.pin();
        network.component("R2", sense, plus);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: |_| f64::NAN,
    noise_gain: |_| f64::NAN,
    working: |stage| {
        let (high, low, reference) = levels(stage);
        let (r1, r2) = (nominal(stage, "R1"), nominal(stage, "R2"));
        let parallel = 1.0 / (1.0 / r1 + 1.0 / r2 + siemens(stage, "R3"));
        let k = 1.0 + nominal(stage, "Rser") * siemens(stage, "R4");
        let at = |level: f64| k * parallel * (reference / r1 + level / r2);
        let hysteresis = k * parallel * (high - low) / r2;
        let numbers = symbols(stage, ("R1", r1), parallel);
        if stage.component("R4").is_some() {
            let source = "derived here by Kirchhoff's current law: Rp is R1 ∥ R2 ∥ R3, k is 1 + Rser/R4";
            let formulas = ["V_TH = k·Rp·(Vref/R1 + V_OH/R2)", "V_TL = k·Rp·(Vref/R1 + V_OL/R2)", "V_hys = k·(V_OH − V_OL)·Rp/R2"];
            forms(three(formulas, [at(high), at(low), hysteresis]), &numbers, source)
        } else {
            let source = "derived here by Kirchhoff's current law: Rp is R1 ∥ R2 ∥ R3";
            let formulas = ["V_TH = Rp·(Vref/R1 + V_OH/R2)", "V_TL = Rp·(Vref/R1 + V_OL/R2)", "V_hys = (V_OH − V_OL)·Rp/R2"];
            forms(three(formulas, [at(high), at(low), hysteresis]), &numbers, source)
        }
    },
};
