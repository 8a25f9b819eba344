//! Scale-and-shift stage: gain, and an offset from a reference, on one supply.
//!
//! # Formula
//! `Vout = (1 + Rf/Rg)·(Vin·R2 + Vref·R1)/(R1 + R2)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `R1` (signal), `R2` (reference), `Rf`, `Rg` in Ω, all required; `Cf` in F. Gain of the signal in V/V.
//!
//! # Does not apply
//! Signal and reference load each other through `R1` and `R2`: their sources' resistances count.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("scale-and-shift"), Some(Kind::ScaleAndShift));
//! ```

use super::*;
use crate::network::GROUND;

const INPUTS: &[InputSpec] =
    &[InputSpec::signal("in", Drive::Voltage), InputSpec { name: "reference", drive: Drive::Voltage, feed: Feed::Reference }];

/// The ideal gain of the reference.
pub fn shift(stage: &Stage) -> f64 {
    (1.0 + nominal(stage, "Rf") / nominal(stage, "Rg")) * nominal(stage, "R1") / (nominal(stage, "R1") + nominal(stage, "R2"))
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "scale-and-shift",
    title: "Scale-and-shift stage",
    summary: "Scales the signal and adds an offset taken from a reference.",
    ideal_formula: "G = (1 + Rf/Rg)·R2/(R1 + R2)",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from the signal to the + input"),
        ComponentSpec::required("R2", Dimension::Resistance, "from the reference to the + input"),
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::required("Rg", Dimension::Resistance, "resistor from the inverting input to ground"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        INPUT_SHUNT,
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
        NOISE_GAIN_R,
        NOISE_GAIN_C,
    ],
    amplifiers: 1,
    inputs: |_| INPUTS,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.input(0);
        let reference = network.reference(1);
        let plus = network.node();
        network.component("R1", signal, plus);
        network.component("R2", reference, plus);
        network.component("Cshunt", plus, GROUND);
        let minus = network.node();
        network.component("Rg", minus, GROUND);
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| {
        (1.0 + nominal(stage, "Rf") / nominal(stage, "Rg")) * nominal(stage, "R2") / (nominal(stage, "R1") + nominal(stage, "R2"))
    },
    noise_gain: |stage| 1.0 + nominal(stage, "Rf") / nominal(stage, "Rg"),
    working: |stage| {
        vec![
            ideal("G = (1 + Rf/Rg)·R2/(R1 + R2)", &["R1", "R2", "Rf", "Rg"], stage),
            closed_loop_edge(stage, 1.0 + nominal(stage, "Rf") / nominal(stage, "Rg")),
        ]
    },
};
