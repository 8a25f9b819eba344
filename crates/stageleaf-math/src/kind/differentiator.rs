//! Differentiator: the current through `Cin` flows through `Rf`; `Rin` and `Cf` end the rise of the gain.
//!
//! # Formula
//! `Vout = −Rf·Cin·dVin/dt`; largest gain `Rf·Cin/(Rin·Cin + Rf·Cf)`, at `1/(2π·√(Rin·Cin·Rf·Cf))`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rf`, `Rin` in Ω; `Cin`, `Cf` in F. `gain` where it is largest, in V/V.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! Without `Rin` or `Cf` the loop has next to no phase margin, and the largest gain is the amplifier's resonance.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("differentiator"), Some(Kind::Differentiator));
//! ```

use super::*;

fn largest(stage: &Stage) -> f64 {
    let [rf, cin, rin, cf] = ["Rf", "Cin", "Rin", "Cf"].map(|n| nominal(stage, n));
    -rf * cin / (rin * cin + rf * cf)
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "differentiator",
    title: "Differentiator",
    summary: "The output follows the slope of the input.",
    ideal_formula: "G = −jω·Rf·Cin",
    components: &[
        ComponentSpec::required("Cin", Dimension::Capacitance, "input capacitor"),
        ComponentSpec::required("Rf", Dimension::Resistance, "feedback resistor"),
        ComponentSpec::optional("Rin", Dimension::Resistance, "resistor in series with `Cin`"),
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
    inputs: |_| VOLTAGE_INPUT,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Peak,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let between = network.behind("Rin", signal);
        let minus = network.node();
        network.component("Cin", between, minus);
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: largest,
    noise_gain: |_| 1.0,
    working: |stage| {
        if largest(stage).is_finite() {
            vec![ideal("G = −Rf·Cin/(Rin·Cin + Rf·Cf)", &["Rf", "Cin", "Rin", "Cf"], stage)]
        } else {
            Vec::new()
        }
    },
};
