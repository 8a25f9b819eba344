//! Instrumentation stage: two input amplifiers with one gain resistor between them, and a difference stage.
//!
//! # Formula
//! `G = (1 + (Rf1 + Rf2)/Rg)·R2/R1` for balanced `R1 … R4`, for in2 − in1. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rg`, `Rf1`, `Rf2`, `R1` … `R4` in Ω, all required. Gain in V/V of the difference.
//!
//! # Does not apply
//! The input amplifiers clip first: their outputs carry the common mode and half of the amplified difference.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("instrumentation"), Some(Kind::Instrumentation));
//! ```

use super::*;
use crate::network::GROUND;

fn gain(stage: &Stage) -> f64 {
    let [rg, f1, f2, r1, r2, r3, r4] = ["Rg", "Rf1", "Rf2", "R1", "R2", "R3", "R4"].map(|n| nominal(stage, n));
    // The difference splits at the gain resistor: each side's share of it, and what crosses to the other.
    let (first, second) = (-(0.5 + f1 / rg), 0.5 + f2 / rg);
    -first * r2 / r1 + second * (1.0 + r2 / r1) * r4 / (r3 + r4)
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "instrumentation",
    title: "Instrumentation stage",
    summary: "Three amplifiers: the difference of two inputs at high impedance, set by one resistor.",
    ideal_formula: "G = (1 + (Rf1 + Rf2)/Rg)·R2/R1",
    components: &[
        ComponentSpec::required("Rg", Dimension::Resistance, "gain resistor between the inverting inputs of A1 and A2"),
        ComponentSpec::required("Rf1", Dimension::Resistance, "feedback resistor of A1"),
        ComponentSpec::required("Rf2", Dimension::Resistance, "feedback resistor of A2"),
        ComponentSpec::required("R1", Dimension::Resistance, "from A1 to the inverting input of A3"),
        ComponentSpec::required("R2", Dimension::Resistance, "feedback resistor of A3"),
        ComponentSpec::required("R3", Dimension::Resistance, "from A2 to the + input of A3"),
        ComponentSpec::required("R4", Dimension::Resistance, "from the + input of A3 to ground"),
        ComponentSpec::optional("C2", Dimension::Capacitance, "capacitor across `R2`"),
        ComponentSpec::optional("C4", Dimension::Capacitance, "capacitor across `R4`"),
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
    ],
    amplifiers: 3,
    inputs: |_| DIFFERENTIAL_INPUTS,
    drives: Drives::Differential,
    switching: None,
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let (first, second) = (network.input(0), network.input(1));
        let (minus1, minus2) = (network.node(), network.node());
        network.component("Rg", minus1, minus2);
        let (pin1, pin2) = (network.node(), network.node());
        network.component("Rf1", pin1, minus1);
        network.component("Rf2", pin2, minus2);
        network.amplifier(first, minus1, pin1);
        network.amplifier(second, minus2, pin2);
        let (minus3, plus3) = (network.node(), network.node());
        network.component("R1", pin1, minus3);
        network.component("R3", pin2, plus3);
        network.component("R4", plus3, GROUND);
        network.component("C4", plus3, GROUND);
        network.feedback(plus3, minus3, "R2", "C2");
    },
    ideal_gain: gain,
    noise_gain: |stage| 1.0 + (nominal(stage, "Rf1") + nominal(stage, "Rf2")) / nominal(stage, "Rg"),
    working: |stage| {
        vec![ideal("G = (1 + (Rf1 + Rf2)/Rg)·(½·R2/R1 + ½·(1 + R2/R1)·R4/(R3 + R4))", &["Rg", "Rf1", "Rf2", "R1", "R2", "R3", "R4"], stage)]
    },
};
