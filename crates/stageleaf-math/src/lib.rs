//! Operational-amplifier stages, from component values and a data sheet to figures and verdicts.
//!
//! The model: `A(s) = A0 · ∏(1 ± s/ωz) / ((1 + s/ωd) · ∏(1 + s/ωk))` with `ωd = 2π·GBW/A0`, behind an output resistance,
//! with input resistances and capacitances, in one nodal network per stage. Every figure comes from that network.
//!
//! # What is not modelled
//! See [`NOT_MODELLED`].
#![no_std]
extern crate alloc;

pub mod analyse;
pub mod analysis;
pub mod dimension;
pub mod error;
pub mod figure;
pub mod kind;
pub mod limit;
pub mod model;
pub mod network;
pub mod parameters;
pub mod part;
pub mod polynomial;
pub mod report;
pub mod series;
pub mod solution;
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

pub use analyse::{Detail, analyse, analyse_in, analyse_with, check};
