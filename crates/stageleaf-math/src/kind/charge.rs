//! Charge stage: a charge into the inverting input becomes a voltage across `Cf`.
//!
//! # Formula
//! In the pass band `Vout = −Q/Cf`; low corner `1/(2π·Rf·Cf)`. For the working and as a check; figures come from the network.
//!
//! # Units
//! `Cf` in F (required); `Rf`, `Rser` in Ω. Gain in V/C for a charge into the stage.
//! `Rng` in Ω and `Cng` in F between the inputs raise the noise gain at high frequencies.
//!
//! # Does not apply
//! Without `Rf` there is no DC path for the bias current, and the output ends at a rail: that is a verdict of its own.
//!
//! # Source
//! Derived here: no current flows into the inputs, and feedback holds them equal. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("charge"), Some(Kind::Charge));
//! ```

use super::*;

/// Between the low corner and the amplifier's own, in the geometric middle.
fn middle(stage: &Stage) -> f64 {
    let cf = nominal(stage, "Cf");
    let sensor = match stage.source(0) {
        Some(crate::stage::Source::Capacitive { capacitance } | crate::stage::Source::Photodiode { capacitance, .. }) => {
            capacitance.nominal
        }
        _ => 0.0,
    };
    let high = gbw(stage) * cf / (cf + sensor);
    let low = stage.component("Rf").map_or(high / 1e6, |rf| 1.0 / (TAU * rf.nominal * cf));
    libm::sqrt(low * high)
}

/// The kind.
pub static SPEC: Spec = Spec {
    id: "charge",
    title: "Charge stage",
    summary: "A charge into the inverting input becomes a voltage across Cf.",
    ideal_formula: "G = −1/Cf",
    components: &[
        ComponentSpec::required("Cf", Dimension::Capacitance, "feedback capacitor"),
        ComponentSpec::optional("Rf", Dimension::Resistance, "feedback resistor: DC path and low corner"),
        ComponentSpec::optional("Rser", Dimension::Resistance, "series resistor at the signal input"),
        BALANCE_R,
        BALANCE_C,
        ISOLATION,
        SNUBBER_R,
        SNUBBER_C,
        NOISE_GAIN_R,
        NOISE_GAIN_C,
    ],
    amplifiers: 1,
    inputs: |_| CHARGE_INPUT,
    drives: Drives::Each,
    switching: None,
    reference: Reference::Frequency(middle),
    gain: Dimension::VoltsPerCoulomb,
    build: |_, network| {
        let terminal = network.input(0);
        let minus = network.behind("Rser", terminal);
        let plus = network.balanced();
        network.feedback(plus, minus, "Rf", "Cf");
    },
    ideal_gain: |stage| -1.0 / nominal(stage, "Cf"),
    noise_gain: |_| 1.0,
    working: |stage| {
        let mut lines = vec![ideal("G = −1/Cf", &["Cf"], stage)];
        if stage.component("Rf").is_some() {
            let value = 1.0 / (TAU * nominal(stage, "Rf") * nominal(stage, "Cf"));
            lines.push(line(Figure::LowCutoff, "f = 1/(2π·Rf·Cf)", numbers(stage, &["Rf", "Cf"]), value, REAL_AMPLIFIER));
        }
        lines
    },
};
