//! Follower: the output follows the input with gain 1.

use alloc::vec::Vec;

use super::{ComponentSpec, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, SNUBBER_C, SNUBBER_R, Spec};
use crate::dimension::Dimension;

/// The follower.
pub static SPEC: Spec = Spec {
    id: "follower",
    title: "Follower",
    summary: "The output follows the input: gain 1, high input impedance, low output impedance.",
    ideal_formula: "G = 1",
    components: &[
        ComponentSpec::optional("Rf", Dimension::Resistance, "resistor in the feedback path, against bias-current error"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "capacitor across `Rf`").beside("Rf"),
        INPUT_SERIES, INPUT_SHUNT, ISOLATION, SNUBBER_R, SNUBBER_C, NOISE_GAIN_R, NOISE_GAIN_C,
    ],
    build: |_, _| {},
    ideal_gain: |_| 1.0,
    working: |_| Vec::new(),
};
