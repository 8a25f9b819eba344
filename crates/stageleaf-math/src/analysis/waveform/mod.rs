//! The waveform at the output, slew, rails and current limit included.
//!
//! # Formula
//! The stage's one network as state equations ([`equations`]), each amplifier as straight pieces ([`pieces`]); while none changes its
//! piece, the whole is linear and is stepped exactly ([`core`]), from event to event ([`run`]). [`figures`] holds what is asked.
//!
//! # Units
//! s, V at the load.
//!
//! # Does not apply
//! DC errors, and what [`crate::NOT_MODELLED`] lists for large signals; recovery from overload beyond what the part states.
//!
//! # Source
//! Beside each file. Checked against an adaptive solver and closed forms in `tests/outside/waveform.rs`.

pub mod core;
pub mod equations;
pub mod figures;
pub mod matrix;
pub mod pieces;
pub mod run;
