//! AC-coupled non-inverting stage on one supply: the + input sits on a divider from the supply, `Cin` and `Cg` block DC.
//!
//! # Formula
//! In the pass band `G = 1 + Rf/Rg`; at DC the output stands at the divider's voltage. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rb1`, `Rb2` (divider), `Rb` (divider to + input), `Rf`, `Rg` in Ω; `Cin`, `Cg`, `Cb` (across the divider's lower half), `Cf` in F. Gain in V/V.
//!
//! # Does not apply
//! The supply's ripple enters through the divider: `Cb` sets how much.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("ac-non-inverting"), Some(Kind::AcNonInverting));
//! ```

use super::*;
use crate::network::GROUND;

const INPUTS: &[InputSpec] =
    &[InputSpec::signal("in", Drive::Voltage), InputSpec { name: "supply", drive: Drive::Voltage, feed: Feed::Supply }];

fn gain(stage: &Stage) -> f64 {
    1.0 + nominal(stage, "Rf") / nominal(stage, "Rg")
}

/// Between the highest of the coupling corners and the amplifier's own, in the geometric middle.
fn middle(stage: &Stage, gain: f64) -> f64 {
    let corner = |r: &str, c: &str| 1.0 / (TAU * nominal(stage, r) * nominal(stage, c));
    libm::sqrt(corner("Rb", "Cin").max(corner("Rg", "Cg")) * gbw(stage) / gain)
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "ac-non-inverting",
    title: "AC-coupled non-inverting stage",
    summary: "Non-inverting for alternating signals on a single supply, biased at a fraction of it.",
    ideal_formula: "G = 1 + Rf/Rg",
    components: &[
        ComponentSpec::required("Cin", Dimension::Capacitance, "input coupling capacitor"),
        ComponentSpec::required("Rb1", Dimension::Resistance, "divider, from the positive supply"),
        ComponentSpec::required("Rb2", Dimension::Resistance, "divider, to ground"),
        ComponentSpec::required("Rb", Dimension::Resistance, "from the divider to the + input"),
        ComponentSpec::optional("Cb", Dimension::Capacitance, "capacitor from the divider to ground"),
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::required("Rg", Dimension::Resistance, "resistor from the inverting input towards ground"),
        ComponentSpec::required("Cg", Dimension::Capacitance, "capacitor between `Rg` and ground"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
    ],
    amplifiers: 1,
    inputs: |_| INPUTS,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Frequency(|stage| middle(stage, gain(stage))),
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.input(0);
        let supply = network.driven(1);
        let divider = network.node();
        network.component("Rb1", supply, divider);
        network.component("Rb2", divider, GROUND);
        network.component("Cb", divider, GROUND);
        let plus = network.node();
        network.component("Rb", divider, plus);
        network.component("Cin", signal, plus);
        let minus = network.node();
        network.series_rc("Rg", "Cg", minus, GROUND);
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: gain,
    noise_gain: gain,
    working: |stage| vec![ideal("G = 1 + Rf/Rg", &["Rf", "Rg"], stage), closed_loop_edge(stage, gain(stage))],
};
