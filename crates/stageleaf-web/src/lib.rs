//! The live sheet: a stage sheet that a page already shows, made to follow its values.
//!
//! Events come in, markup goes out: numbers, text and HTML are made by the crates below, the same ones that made the
//! page's static sheet. `element.js` beside this crate defines the custom element, carries its events to [`Live`] and
//! brings the static sheet back when anything here fails.
//!
//! # What is left out
//! Downloads, comparison of variants, and the searches of the command line.

mod controls;
mod data;
mod link;
mod live;
mod model;
mod patch;
mod readout;
mod step;

pub use live::{Live, figures_bits};
