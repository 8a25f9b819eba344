//! AC-coupled inverting stage on one supply: the + input sits on a divider from the supply, `Cin` blocks DC.
//!
//! # Formula
//! In the pass band `G = −Rf/Rin`; at DC the output stands at the divider's voltage; low corner `1/(2π·Rin·Cin)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rb1`, `Rb2` (divider), `Rin`, `Rf` in Ω; `Cin`, `Cb` (across the divider's lower half), `Cf` in F. Gain in V/V.
//!
//! # Does not apply
//! The supply's ripple enters through the divider with gain 1 at low frequency: `Cb` sets how much.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("ac-inverting"), Some(Kind::AcInverting));
//! ```

use super::*;
use crate::network::GROUND;

const INPUTS: &[InputSpec] =
    &[InputSpec::signal("in", Drive::Voltage), InputSpec { name: "supply", drive: Drive::Voltage, feed: Feed::Supply }];

fn ratio(stage: &Stage) -> f64 {
    nominal(stage, "Rf") / nominal(stage, "Rin")
}

/// Between the coupling corner and the amplifier's own, in the geometric middle.
fn middle(stage: &Stage) -> f64 {
    let low = 1.0 / (TAU * nominal(stage, "Rin") * nominal(stage, "Cin"));
    libm::sqrt(low * gbw(stage) / (1.0 + ratio(stage)))
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "ac-inverting",
    title: "AC-coupled inverting stage",
    summary: "Inverting for alternating signals on a single supply, biased at a fraction of it.",
    ideal_formula: "G = −Rf/Rin",
    components: &[
        ComponentSpec::required("Cin", Dimension::Capacitance, "input coupling capacitor"),
        ComponentSpec::required("Rin", Dimension::Resistance, "input resistor"),
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::required("Rb1", Dimension::Resistance, "divider, from the positive supply"),
        ComponentSpec::required("Rb2", Dimension::Resistance, "divider, to ground"),
        ComponentSpec::optional("Cb", Dimension::Capacitance, "capacitor from the divider to ground"),
        ComponentSpec::optional("Cf", Dimension::Capacitance, "feedback capacitor, across `Rf`"),
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
    ],
    amplifiers: 1,
    inputs: |_| INPUTS,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Frequency(middle),
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.input(0);
        let supply = network.driven(1);
        let plus = network.node();
        network.component("Rb1", supply, plus);
        network.component("Rb2", plus, GROUND);
        network.component("Cb", plus, GROUND);
        let minus = network.node();
        network.series_rc("Rin", "Cin", signal, minus);
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| -ratio(stage),
    noise_gain: |stage| 1.0 + ratio(stage),
    working: |stage| {
        let value = 1.0 / (TAU * nominal(stage, "Rin") * nominal(stage, "Cin"));
        vec![
            ideal("G = −Rf/Rin", &["Rf", "Rin"], stage),
            closed_loop_edge(stage, 1.0 + ratio(stage)),
            line(Figure::LowCutoff, "f = 1/(2π·Rin·Cin)", numbers(stage, &["Rin", "Cin"]), value, "the source's resistance in series"),
        ]
    },
};
