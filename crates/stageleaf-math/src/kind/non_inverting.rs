//! Non-inverting stage: the signal drives the + input; `Rf` and `Rg` return part of the output to the other.
//!
//! # Formula
//! Ideal gain `1 + Zf/Rg`, `Zf = Rf ∥ Cf`; at DC `1 + Rf/Rg`, never below 1. For the working and as a check; figures come
//! from the network.
//!
//! # Units
//! `Rf`, `Rg` in Ω (required); `Cf` in F (optional; rolls the gain off to 1, not to 0). Gain in V/V.
//!
//! # Does not apply
//! The ideal form leaves out source resistance and the real amplifier (`gain_error` says how much that is).
//! Both inputs follow the signal: look at `input_range_margin` first.
//!
//! # Source
//! Derived here: the two resistors are a divider. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("non-inverting"), Some(Kind::NonInverting));
//! ```

use alloc::vec;

use super::{
    ComponentSpec, Drives, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, Reference, SNUBBER_C, SNUBBER_R, Spec,
    VOLTAGE_INPUT, closed_loop_edge, corner, ideal, nominal,
};
use crate::{dimension::Dimension, network::GROUND, stage::Stage};

fn gain(stage: &Stage) -> f64 {
    1.0 + nominal(stage, "Rf") / nominal(stage, "Rg")
}

/// The non-inverting stage.
pub static SPEC: Spec = Spec {
    id: "non-inverting",
    title: "Non-inverting stage",
    summary: "The signal drives the + input; Rf and Rg return part of the output to the other.",
    ideal_formula: "G = 1 + Rf/Rg",
    components: &[
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::required("Rg", Dimension::Resistance, "resistor from the inverting input to ground"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        INPUT_SERIES,
        INPUT_SHUNT,
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
        let plus = network.behind("Rser", signal);
        network.component("Cshunt", plus, GROUND);
        let minus = network.node();
        network.component("Rg", minus, GROUND);
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: gain,
    noise_gain: gain,
    working: |stage| {
        let mut lines = vec![ideal("G = 1 + Rf/Rg", &["Rf", "Rg"], stage), closed_loop_edge(stage, gain(stage))];
        lines.extend(corner(stage));
        lines
    },
};
