//! Transimpedance stage: a current into the inverting input becomes a voltage across `Rf`.
//!
//! # Formula
//! `Vout = −I·Zf`, `Zf = Rf ∥ Cf`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rf` in Ω (required); `Cf`, `Cp` in F; `Rp` in Ω. Gain in Ω for a current into the stage.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! The source's capacitance sets the noise gain and the loop: a photodiode without one stated is an ideal current.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("transimpedance"), Some(Kind::Transimpedance));
//! ```

use super::*;

/// The kind.
pub static SPEC: Spec = Spec {
    id: "transimpedance",
    title: "Transimpedance stage",
    summary: "A current into the inverting input becomes a voltage across Rf.",
    ideal_formula: "G = −Rf",
    components: &[
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        BALANCE_R,
        BALANCE_C,
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
        NOISE_GAIN_R,
        NOISE_GAIN_C,
    ],
    amplifiers: 1,
    inputs: |_| CURRENT_INPUT,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Dc,
    gain: Dimension::Resistance,
    build: |_, network| {
        let minus = network.input(0);
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| -nominal(stage, "Rf"),
    noise_gain: |_| 1.0,
    working: |stage| {
        let mut lines = vec![ideal("G = −Rf", &["Rf"], stage)];
        lines.extend(corner(stage));
        lines
    },
};
