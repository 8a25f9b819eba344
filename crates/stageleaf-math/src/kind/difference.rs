//! Difference stage: one amplifier and four resistors; the output follows in2 − in1.
//!
//! # Formula
//! `Vout = V2·(1 + R2/R1)·R4/(R3 + R4) − V1·R2/R1`; balanced when `R2/R1 = R4/R3`, then `G = R2/R1`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `R1` (in1 to the inverting input), `R2` (feedback), `R3` (in2 to the + input), `R4` (+ input to ground) in Ω; `C2`, `C4` in F. Gain in V/V of the difference, each input carrying half of it.
//!
//! # Does not apply
//! The rejection of common mode is the resistors' match first, the amplifier's second: source resistances unbalance it too.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("difference"), Some(Kind::Difference));
//! ```

use super::*;
use crate::network::GROUND;

fn gain(stage: &Stage) -> f64 {
    let [r1, r2, r3, r4] = ["R1", "R2", "R3", "R4"].map(|n| nominal(stage, n));
    0.5 * r2 / r1 + 0.5 * (1.0 + r2 / r1) * r4 / (r3 + r4)
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "difference",
    title: "Difference stage",
    summary: "One amplifier and four resistors: the output follows the difference of two inputs.",
    ideal_formula: "G = R2/R1, for R2/R1 = R4/R3",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from in1 to the inverting input"),
        ComponentSpec::required("R2", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::required("R3", Dimension::Resistance, "from in2 to the + input"),
        ComponentSpec::required("R4", Dimension::Resistance, "from the + input to ground"),
        ComponentSpec::optional("C2", Dimension::Capacitance, "capacitor across `R2`"),
        ComponentSpec::optional("C4", Dimension::Capacitance, "capacitor across `R4`"),
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
        NOISE_GAIN_R,
        NOISE_GAIN_C,
    ],
    amplifiers: 1,
    inputs: |_| DIFFERENTIAL_INPUTS,
    drives: Drives::Differential,
    switching: None,
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let (first, second) = (network.input(0), network.input(1));
        let minus = network.node();
        network.component("R1", first, minus);
        let plus = network.node();
        network.component("R3", second, plus);
        network.component("R4", plus, GROUND);
        network.component("C4", plus, GROUND);
        network.feedback(plus, minus, "R2", "C2");
    },
    ideal_gain: gain,
    noise_gain: |stage| 1.0 + nominal(stage, "R2") / nominal(stage, "R1"),
    working: |stage| {
        vec![
            ideal("G = ½·R2/R1 + ½·(1 + R2/R1)·R4/(R3 + R4)", &["R1", "R2", "R3", "R4"], stage),
            closed_loop_edge(stage, 1.0 + nominal(stage, "R2") / nominal(stage, "R1")),
        ]
    },
};
