//! Non-inverting comparator with hysteresis: the signal through `R1` and the output through `R2` at the non-inverting input, the reference
//! at the other one.
//!
//! # Formula
//! With `Rp = R1 ∥ R2 ∥ R3` the output switches where `Rp·(Vin/R1 + Vout/R2) = Vref`: at the upper threshold
//! `Vref·R1/Rp − V_OL·R1/R2` while the output is low, at the lower one, with `V_OH`, while it is high. `Rser` adds to `R1`. For the
//! working and as a check; figures come from the network (see [`crate::analysis::switching`]).
//!
//! # Units
//! `R1` (signal), `R2` (feedback) in Ω, required; `R3` from the + input to ground, which divides the signal, `Rser` in Ω, `Cshunt` in F.
//! Thresholds in V at the source of the signal.
//!
//! # Does not apply
//! Gains, margins, noise: the feedback is positive, and the output rests at one of its two levels. A pole in the right half plane
//! is what makes it switch. The source of the signal carries the feedback's current: its resistance counts.
//!
//! # Source
//! Derived here: Kirchhoff's current law at the + input. Checked in `tests/outside/`.
//!
//! # Example
//! ```
//! use stageleaf_math::kind::Kind;
//!
//! assert_eq!(Kind::from_id("comparator-non-inverting"), Some(Kind::ComparatorNonInverting));
//! ```

use super::{comparator::*, *};
use crate::network::GROUND;

/// The kind.
pub static SPEC: Spec = Spec {
    id: "comparator-non-inverting",
    title: "Non-inverting comparator with hysteresis",
    summary: "The output goes high when the signal rises through the upper threshold, and low when it falls through the lower one.",
    ideal_formula: "V_hys = (V_OH − V_OL)·R1/R2",
    components: &[
        ComponentSpec::required("R1", Dimension::Resistance, "from the signal to the + input"),
        ComponentSpec::required("R2", Dimension::Resistance, "from the output to the + input: positive feedback"),
        ComponentSpec::optional("R3", Dimension::Resistance, "from the + input to ground: divides the signal"),
        INPUT_SERIES,
        INPUT_SHUNT,
        ISOLATION,
    ],
    amplifiers: 1,
    inputs: |_| INPUTS,
    drives: Drives::Each,
    switching: Some(Sense::NonInverting),
    reference: Reference::Dc,
    gain: Dimension::Gain,
    build: |_, network| {
        let signal = network.signal();
        let minus = network.reference(1);
        let filtered = network.behind("Rser", signal);
        network.component("Cshunt", filtered, GROUND);
        let plus = network.node();
        network.component("R1", filtered, plus);
        network.component("R3", plus, GROUND);
        let (pin, sense) = network.pin();
        network.component("R2", sense, plus);
        network.amplifier(plus, minus, pin);
    },
    ideal_gain: |_| f64::NAN,
    noise_gain: |_| f64::NAN,
    working: |stage| {
        let (high, low, reference) = levels(stage);
        let (series, r1, r2) = (nominal(stage, "Rser"), nominal(stage, "R1"), nominal(stage, "R2"));
        let r1 = r1 + series;
        let parallel = 1.0 / (1.0 / r1 + 1.0 / r2 + siemens(stage, "R3"));
        let at = |level: f64| reference * r1 / parallel - level * r1 / r2;
        let values = [at(low), at(high), (high - low) * r1 / r2];
        if stage.component("Rser").is_some() {
            let formulas = ["V_TH = Vref·Rin/Rp − V_OL·Rin/R2", "V_TL = Vref·Rin/Rp − V_OH·Rin/R2", "V_hys = (V_OH − V_OL)·Rin/R2"];
            let source = "derived here by Kirchhoff's current law: Rin is Rser + R1, Rp is Rin ∥ R2 ∥ R3";
            forms(three(formulas, values), &symbols(stage, ("Rin", r1), parallel), source)
        } else {
            let formulas = ["V_TH = Vref·R1/Rp − V_OL·R1/R2", "V_TL = Vref·R1/Rp − V_OH·R1/R2", "V_hys = (V_OH − V_OL)·R1/R2"];
            let source = "derived here by Kirchhoff's current law: Rp is R1 ∥ R2 ∥ R3";
            forms(three(formulas, values), &symbols(stage, ("R1", r1), parallel), source)
        }
    },
};
