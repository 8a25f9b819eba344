//! Non-inverting stage.

use alloc::vec::Vec;

use super::{ComponentSpec, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, SNUBBER_C, SNUBBER_R, Spec};
use crate::dimension::Dimension;

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
        INPUT_SERIES, INPUT_SHUNT, ISOLATION, SNUBBER_R, SNUBBER_C, NOISE_GAIN_R, NOISE_GAIN_C,
    ],
    build: |_, _| {},
    ideal_gain: |_| 1.0,
    working: |_| Vec::new(),
};
