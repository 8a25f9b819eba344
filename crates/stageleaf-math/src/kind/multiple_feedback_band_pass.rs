//! Multiple-feedback band-pass: inverting, with a second feedback path from the inner node.
//!
//! # Formula
//! `ω0 = 1/√(R3·(R1 ∥ R2)·C1·C2)`, `Q = ω0·R3·C1·C2/(C1 + C2)`, gain at f0 `−(R3/R1)·C2/(C1 + C2)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `R1` (signal to inner node), `R2` (inner node to ground), `R3` (inverting input to output) in Ω; `C1` (inner node to output), `C2` (inner node to inverting input) in F. Gain where it is largest, in V/V.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! A high Q wants an open-loop gain at f0 far above `2·Q²`.
//!
//! # Source
//! Derived here; as in any filter handbook. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("multiple-feedback-band-pass"), Some(Kind::MultipleFeedbackBandPass));
//! ```

use super::*;
use crate::network::GROUND;

/// The kind.
pub static SPEC: Spec = Spec {
    id: "multiple-feedback-band-pass",
    title: "Multiple-feedback band-pass",
    summary: "Second-order inverting band-pass.",
    ideal_formula: "G = −(R3/R1)·C2/(C1 + C2) at f0",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from the signal to the inner node"),
        ComponentSpec::optional("R2", Dimension::Resistance, "from the inner node to ground"),
        ComponentSpec::required("R3", Dimension::Resistance, "from the inverting input to the output"),
        ComponentSpec::required("C1", Dimension::Capacitance, "from the inner node to the output"),
        ComponentSpec::required("C2", Dimension::Capacitance, "from the inner node to the inverting input"),
        BALANCE_R,
        BALANCE_C,
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
        NOISE_GAIN_R,
        NOISE_GAIN_C,
    ],
    amplifiers: 1,
    inputs: |_| VOLTAGE_INPUT,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Peak,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let inner = network.node();
        network.component("R1", signal, inner);
        network.component("R2", inner, GROUND);
        let minus = network.node();
        network.component("C2", inner, minus);
        let plus = network.balanced();
        let (pin, sense) = network.pin();
        network.component("R3", sense, minus);
        network.component("C1", inner, sense);
        network.series_rc("Rng", "Cng", plus, minus);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: |stage| -nominal(stage, "R3") / nominal(stage, "R1") * nominal(stage, "C2") / (nominal(stage, "C1") + nominal(stage, "C2")),
    noise_gain: |_| 1.0,
    working: |stage| {
        let [r1, r3, c1, c2] = ["R1", "R3", "C1", "C2"].map(|n| nominal(stage, n));
        let parallel = stage.component("R2").map_or(r1, |r2| r1 * r2.nominal / (r1 + r2.nominal));
        let omega = 1.0 / libm::sqrt(r3 * parallel * c1 * c2);
        let mut lines = vec![ideal("G = −(R3/R1)·C2/(C1 + C2)", &["R3", "R1", "C1", "C2"], stage)];
        lines.extend(second_order(
            stage,
            if stage.component("R2").is_some() {
                ["f0 = 1/(2π·√(R3·(R1 ∥ R2)·C1·C2))", "Q = √(R3·C1·C2/(R1 ∥ R2))/(C1 + C2)"]
            } else {
                ["f0 = 1/(2π·√(R3·R1·C1·C2))", "Q = √(R3·C1·C2/R1)/(C1 + C2)"]
            },
            &["R1", "R2", "R3", "C1", "C2"],
            omega / TAU,
            omega * r3 * c1 * c2 / (c1 + c2),
        ));
        lines
    },
};
