//! Sallen–Key high-pass: two capacitors to the + input, one resistor from between them to the output, one to ground.
//!
//! # Formula
//! `f0 = 1/(2π·√(R1·R2·C1·C2))`, `Q = √(R1·R2·C1·C2)/(R1·(C1 + C2) + R2·C2·(1 − K))`, `K = 1 + Rf/Rg`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `R1` (to the output), `R2` (to ground), `Rf`, `Rg` in Ω; `C1`, `C2` in F. Gain `K` in the pass band, in V/V.
//!
//! # Does not apply
//! The pass band ends at the amplifier's own bandwidth.
//!
//! # Source
//! R. P. Sallen, E. L. Key, "A practical method of designing RC active filters", IRE Trans. Circuit Theory 2 (1955), from memory. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("sallen-key-high-pass"), Some(Kind::SallenKeyHighPass));
//! ```

use super::*;
use crate::network::GROUND;

fn gain(stage: &Stage) -> f64 {
    if stage.component("Rg").is_some() { 1.0 + nominal(stage, "Rf") / nominal(stage, "Rg") } else { 1.0 }
}

/// Between f0 and the amplifier's own bandwidth, in the geometric middle.
fn middle(stage: &Stage) -> f64 {
    let [r1, r2, c1, c2] = ["R1", "R2", "C1", "C2"].map(|n| nominal(stage, n));
    libm::sqrt(gbw(stage) / (gain(stage) * TAU * libm::sqrt(r1 * r2 * c1 * c2)))
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "sallen-key-high-pass",
    title: "Sallen–Key high-pass",
    summary: "Second-order high-pass around a follower or a gain.",
    ideal_formula: "G = K·s²/ω0²/(1 + s/(Q·ω0) + s²/ω0²)",
    components: &[
        ComponentSpec::required("C1", Dimension::Capacitance, "from the signal to the inner node"),
        ComponentSpec::required("C2", Dimension::Capacitance, "from the inner node to the + input"),
        ComponentSpec::required("R1", Dimension::Resistance, "from the inner node to the output"),
        ComponentSpec::required("R2", Dimension::Resistance, "from the + input to ground"),
        ComponentSpec::optional("Rf", Dimension::Resistance, "resistor that sets the gain, with `Rg`").beside("Rg"),
        ComponentSpec::optional("Rg", Dimension::Resistance, "resistor from the inverting input to ground, with `Rf`").beside("Rf"),
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
    ],
    amplifiers: 1,
    inputs: |_| VOLTAGE_INPUT,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Frequency(middle),
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let inner = network.node();
        network.component("C1", signal, inner);
        let plus = network.node();
        network.component("C2", inner, plus);
        network.component("R2", plus, GROUND);
        let (pin, sense) = network.pin();
        let minus = network.behind("Rf", sense);
        network.component("Rg", minus, GROUND);
        network.component("R1", inner, sense);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: gain,
    noise_gain: gain,
    working: |stage| {
        let [r1, r2, c1, c2] = ["R1", "R2", "C1", "C2"].map(|n| nominal(stage, n));
        let root = libm::sqrt(r1 * r2 * c1 * c2);
        let mut lines = vec![amplification(stage)];
        lines.extend(second_order(
            stage,
            ["f0 = 1/(2π·√(R1·R2·C1·C2))", "Q = √(R1·R2·C1·C2)/(R1·(C1 + C2) + R2·C2·(1 − K))"],
            &["R1", "R2", "C1", "C2", "K"],
            1.0 / (TAU * root),
            root / (r1 * (c1 + c2) + r2 * c2 * (1.0 - gain(stage))),
        ));
        lines
    },
};
