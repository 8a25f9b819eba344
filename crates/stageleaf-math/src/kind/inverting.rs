//! Inverting stage: the signal drives `Rin` into the inverting input, which the feedback through `Rf` holds at the + input's level.
//!
//! # Formula
//! Ideal gain `−Zf/Rin`, `Zf = Rf ∥ Cf`; at DC `−Rf/Rin`. The noise gain is `1 + Rf/Rin`: bandwidth, offset and amplifier noise
//! follow it, not the signal gain. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rin`, `Rf` in Ω (required); `Cf` in F; `Rp`, `Cp` at the + input (optional). Gain in V/V.
//!
//! # Does not apply
//! The ideal form leaves out the source's resistance, which adds to `Rin`, and the real amplifier.
//!
//! # Source
//! Derived here: the current through `Rin` flows on through `Rf`. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("inverting"), Some(Kind::Inverting));
//! ```

use alloc::vec;

use super::{
    BALANCE_C, BALANCE_R, ComponentSpec, Drives, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, Reference, SNUBBER_C,
    SNUBBER_R, Spec, VOLTAGE_INPUT, closed_loop_edge, corner, ideal, nominal,
};
use crate::{dimension::Dimension, network::GROUND, stage::Stage};

fn ratio(stage: &Stage) -> f64 {
    nominal(stage, "Rf") / nominal(stage, "Rin")
}

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
        BALANCE_R,
        BALANCE_C,
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
        let filtered = network.behind("Rser", signal);
        network.component("Cshunt", filtered, GROUND);
        let minus = network.node();
        network.component("Rin", filtered, minus);
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| -ratio(stage),
    noise_gain: |stage| 1.0 + ratio(stage),
    working: |stage| {
        let mut lines = vec![ideal("G = −Rf/Rin", &["Rf", "Rin"], stage), closed_loop_edge(stage, 1.0 + ratio(stage))];
        lines.extend(corner(stage));
        lines
    },
};
