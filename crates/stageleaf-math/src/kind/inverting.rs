//! Inverting stage.

use alloc::vec::Vec;

use super::{ComponentSpec, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, SNUBBER_C, SNUBBER_R, Spec};
use crate::dimension::Dimension;

/// The inverting stage.
pub static SPEC: Spec = Spec {
    id: "inverting",
    title: "Inverting stage",
    summary: "The signal drives Rin into the inverting input, which feedback holds at the + input's level.",
    ideal_formula: "G = −Rf/Rin",
    components: &[
        ComponentSpec::required("Rin", Dimension::Resistance, "input resistor"),
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        ComponentSpec::optional("Rp", Dimension::Resistance, "bias-balancing resistor from the + input to ground"),
        ComponentSpec::optional("Cp", Dimension::Capacitance, "capacitor across `Rp`").beside("Rp"),
        INPUT_SERIES, INPUT_SHUNT, ISOLATION, SNUBBER_R, SNUBBER_C, NOISE_GAIN_R, NOISE_GAIN_C,
    ],
    build: |_, _| {},
    ideal_gain: |_| 1.0,
    working: |_| Vec::new(),
};
