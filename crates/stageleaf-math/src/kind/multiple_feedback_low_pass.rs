//! Multiple-feedback low-pass: inverting, with a second feedback path from the inner node.
//!
//! # Formula
//! `G = −R2/R1`, `f0 = 1/(2π·√(R2·R3·C1·C2))`, `1/Q = ω0·C2·(R2 + R3 + R2·R3/R1)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `R1` (signal to inner node), `R2` (inner node to output), `R3` (inner node to inverting input) in Ω; `C1` (inner node to ground), `C2` (inverting input to output) in F. Gain at DC in V/V.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! Noise gain and DC errors follow `1 + R2/R1`.
//!
//! # Source
//! Derived here; as in any filter handbook. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("multiple-feedback-low-pass"), Some(Kind::MultipleFeedbackLowPass));
//! ```

use super::*;
use crate::network::GROUND;

/// The kind.
pub static SPEC: Spec = Spec {
    id: "multiple-feedback-low-pass",
    title: "Multiple-feedback low-pass",
    summary: "Second-order inverting low-pass.",
    ideal_formula: "G = −R2/R1/(1 + s/(Q·ω0) + s²/ω0²)",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from the signal to the inner node"),
        ComponentSpec::required("R2", Dimension::Resistance, "from the inner node to the output"),
        ComponentSpec::required("R3", Dimension::Resistance, "from the inner node to the inverting input"),
        ComponentSpec::required("C1", Dimension::Capacitance, "from the inner node to ground"),
        ComponentSpec::required("C2", Dimension::Capacitance, "from the inverting input to the output"),
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
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let inner = network.node();
        network.component("R1", signal, inner);
        network.component("C1", inner, GROUND);
        let minus = network.node();
        network.component("R3", inner, minus);
        let plus = network.balanced();
        let (pin, sense) = network.pin();
        network.component("R2", inner, sense);
        network.component("C2", pin, minus);
        network.series_rc("Rng", "Cng", plus, minus);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: |stage| -nominal(stage, "R2") / nominal(stage, "R1"),
    noise_gain: |stage| 1.0 + nominal(stage, "R2") / nominal(stage, "R1"),
    working: |stage| {
        let [r1, r2, r3, c1, c2] = ["R1", "R2", "R3", "C1", "C2"].map(|n| nominal(stage, n));
        let omega = 1.0 / libm::sqrt(r2 * r3 * c1 * c2);
        let mut lines = vec![ideal("G = −R2/R1", &["R2", "R1"], stage)];
        lines.extend(second_order(
            stage,
            ["f0 = 1/(2π·√(R2·R3·C1·C2))", "Q = √(R2·R3·C1/C2)/(R2 + R3 + R2·R3/R1)"],
            &["R1", "R2", "R3", "C1", "C2"],
            omega / TAU,
            1.0 / (omega * c2 * (r2 + r3 + r2 * r3 / r1)),
        ));
        lines
    },
};
