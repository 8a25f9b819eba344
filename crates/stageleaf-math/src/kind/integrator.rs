//! Integrator: the current through `Rin` charges `Cf`; `Rf`, where present, limits the gain at DC.
//!
//! # Formula
//! `Vout = −1/(Rin·Cf)·∫Vin dt`, gain 1 at `1/(2π·Rin·Cf)`; with `Rf`, `−Rf/Rin` at DC and a corner at `1/(2π·Rf·Cf)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Rin`, `Rf` in Ω; `Cf` in F. `gain` at DC with `Rf`, else at the unity-gain frequency; in V/V.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! Without `Rf` the output drifts to a rail: `output_offset` is the open loop's.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("integrator"), Some(Kind::Integrator));
//! ```

use super::*;

fn at(stage: &Stage) -> f64 {
    if stage.component("Rf").is_some() { 0.0 } else { 1.0 / (TAU * nominal(stage, "Rin") * nominal(stage, "Cf")) }
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "integrator",
    title: "Integrator",
    summary: "The output is the integral of the input over time.",
    ideal_formula: "G = −1/(jω·Rin·Cf)",
    components: &[
        ComponentSpec::required("Rin", Dimension::Resistance, "input resistor"),
        ComponentSpec::required("Cf", Dimension::Capacitance, "integrating capacitor"),
        ComponentSpec::optional("Rf", Dimension::Resistance, "resistor across `Cf` that limits the gain at DC"),
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
    reference: Reference::Frequency(at),
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let minus = network.node();
        network.component("Rin", signal, minus);
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| if stage.component("Rf").is_some() { -nominal(stage, "Rf") / nominal(stage, "Rin") } else { -1.0 },
    noise_gain: |_| 1.0,
    working: |stage| {
        if stage.component("Rf").is_some() {
            let mut lines = vec![ideal("G = −Rf/Rin, at DC", &["Rf", "Rin"], stage)];
            lines.extend(corner(stage));
            lines
        } else {
            vec![ideal("G = −1, |G| = 1 at f = 1/(2π·Rin·Cf)", &["Rin", "Cf"], stage)]
        }
    },
};
