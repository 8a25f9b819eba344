//! Operational-amplifier stages, from component values and a data sheet to figures and verdicts.
//!
//! The model: `A(s) = A0 · ∏(1 ± s/ωz) / ((1 + s/ωd) · ∏(1 + s/ωk))` with `ωd = 2π·GBW/A0`, behind an output resistance,
//! with input resistances and capacitances, in one nodal network per stage. Every figure comes from that network.
//!
//! [`analyse`] takes a [`stage::Stage`] and gives a [`report::Report`]. In between, [`model::Model`] lays out and compiles the network
//! once, [`solution::Solution`] is one build of it, [`analysis`] turns a build into figures and moves builds to the worst case.
//! [`handbook`] holds the closed forms that engineers know, for the working and as checks.
//!
//! # Units
//! SI throughout: K, rad, fractions for tolerances, V/V for what is read in dB. Text, prefixes and files are other crates' business.
//!
//! # What is not modelled
//! See [`NOT_MODELLED`]; sampled yields are not there yet.
//!
//! # Example
//! A divider of 9 kΩ and 1 kΩ around an amplifier with an open-loop gain of a million: see [`analyse`].
#![no_std]
extern crate alloc;

pub mod analyse;
pub mod analysis;
mod caution;
pub mod definition;
pub mod dimension;
pub mod error;
pub mod figure;
pub mod handbook;
mod kept;
pub mod kind;
pub mod limit;
pub mod measured;
pub mod model;
pub mod network;
pub mod parameters;
pub mod part;
pub mod polynomial;
pub mod report;
mod rules;
pub mod search;
pub mod series;
pub mod solution;
pub mod stage;
mod together;
pub mod units;
mod validate;

pub use analyse::{Detail, analyse, analyse_in, analyse_with};
pub use definition::NOT_MODELLED;
pub use error::Error;
pub use validate::check;
