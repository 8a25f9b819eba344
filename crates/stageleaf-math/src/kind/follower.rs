//! Follower: the output follows the input with gain 1.
//!
//! # Formula
//! Ideal gain 1. With one open-loop pole the closed loop's edge is `GBW·(1 + 1/A0)`. For the working and as a check;
//! figures come from the network.
//!
//! # Units
//! `Rf`, `Rser`, `Riso`, `Rsn`, `Rng` in Ω; `Cf`, `Cshunt`, `Csn`, `Cng` in F; all optional. Gain in V/V.
//!
//! # Does not apply
//! The whole loop gain is fed back: look at `phase_margin` with the load's capacitance, and at `input_range_margin`, since both
//! inputs follow the signal.
//!
//! # Source
//! Common practice, no source. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("follower"), Some(Kind::Follower));
//! ```

use alloc::vec;

use super::{
    ComponentSpec, Drives, INPUT_SERIES, INPUT_SHUNT, ISOLATION, NOISE_GAIN_C, NOISE_GAIN_R, Reference, SNUBBER_C, SNUBBER_R, Spec,
    VOLTAGE_INPUT, closed_loop_edge,
};
use crate::{dimension::Dimension, network::GROUND};

/// The follower.
pub static SPEC: Spec = Spec {
    id: "follower",
    title: "Follower",
    summary: "The output follows the input: gain 1, high input impedance, low output impedance.",
    ideal_formula: "G = 1",
    components: &[
        ComponentSpec::optional("Rf", Dimension::Resistance, "resistor in the feedback path, against bias-current error"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "capacitor across `Rf`").beside("Rf"),
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
        let (pin, sense) = network.pin();
        let minus = network.behind("Rf", sense);
        network.component("Cf", pin, minus);
        network.series_rc("Rng", "Cng", plus, minus);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: |_| 1.0,
    noise_gain: |_| 1.0,
    working: |stage| vec![closed_loop_edge(stage, 1.0)],
};
