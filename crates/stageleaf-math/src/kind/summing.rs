//! Summing stage: two to eight signals through a resistor each into the inverting input.
//!
//! # Formula
//! `Vout = −Rf·(V1/Rin1 + V2/Rin2 + …)`; noise gain `1 + Rf/(Rin1 ∥ Rin2 ∥ …)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rin1` … `Rin8`, `Rf` in Ω (the first two and `Rf` required); `Cf`, `Cp` in F. `gain` is that of the first input, in V/V.
//!
//! # Does not apply
//! The noise gain grows with every input: bandwidth, offset and amplifier noise follow it, not the gain of one input.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("summing"), Some(Kind::Summing));
//! ```

use super::*;

const NAMES: [&str; 8] = ["Rin1", "Rin2", "Rin3", "Rin4", "Rin5", "Rin6", "Rin7", "Rin8"];

static INPUTS: [InputSpec; 8] = [
    InputSpec::signal("in1", Drive::Voltage),
    InputSpec::signal("in2", Drive::Voltage),
    InputSpec::signal("in3", Drive::Voltage),
    InputSpec::signal("in4", Drive::Voltage),
    InputSpec::signal("in5", Drive::Voltage),
    InputSpec::signal("in6", Drive::Voltage),
    InputSpec::signal("in7", Drive::Voltage),
    InputSpec::signal("in8", Drive::Voltage),
];

fn present(stage: &Stage) -> impl Iterator<Item = &'static str> + '_ {
    NAMES.into_iter().filter(|n| stage.component(n).is_some())
}

fn inputs(stage: &Stage) -> &'static [InputSpec] {
    &INPUTS[..present(stage).count()]
}

/// `−Rf/Rin` of any input.
pub fn ideal_gain(stage: &Stage, input: usize) -> Option<f64> {
    present(stage).nth(input).map(|name| -nominal(stage, "Rf") / nominal(stage, name))
}

fn noise_gain(stage: &Stage) -> f64 {
    1.0 + present(stage).map(|n| nominal(stage, "Rf") / nominal(stage, n)).sum::<f64>()
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "summing",
    title: "Summing stage",
    summary: "Signals through a resistor each into the inverting input are added, inverted and weighted.",
    ideal_formula: "G1 = −Rf/Rin1",
    components: &[
        ComponentSpec::required("Rin1", Dimension::Resistance, "input resistor of in1"),
        ComponentSpec::required("Rin2", Dimension::Resistance, "input resistor of in2"),
        ComponentSpec::optional("Rin3", Dimension::Resistance, "input resistor of in3"),
        ComponentSpec::optional("Rin4", Dimension::Resistance, "input resistor of in4"),
        ComponentSpec::optional("Rin5", Dimension::Resistance, "input resistor of in5"),
        ComponentSpec::optional("Rin6", Dimension::Resistance, "input resistor of in6"),
        ComponentSpec::optional("Rin7", Dimension::Resistance, "input resistor of in7"),
        ComponentSpec::optional("Rin8", Dimension::Resistance, "input resistor of in8"),
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
    inputs,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |stage, network| {
        let count = network.inputs();
        let signals: Vec<_> = (0..count).map(|i| network.input(i)).collect();
        let minus = network.node();
        for (name, signal) in present(stage).zip(signals) {
            network.component(name, signal, minus);
        }
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| -nominal(stage, "Rf") / nominal(stage, "Rin1"),
    noise_gain,
    working: |stage| {
        let mut lines = vec![ideal("G1 = −Rf/Rin1", &["Rf", "Rin1"], stage), closed_loop_edge(stage, noise_gain(stage))];
        lines.extend(corner(stage));
        lines
    },
};
