//! Every figure against something that this project did not make: handbooks, exact mathematics, whole circuits solved by
//! independent programs. Inputs, expected values, tolerances and sources stand in the tables beside this file.
//!
//! `scripts/outside` runs it and shows how much of each budget is used.

mod budget;
mod circuits;
mod coverage;
mod dc;
mod floating;
mod gain;
mod kinds;
mod ledger;
mod loops;
mod noise;
mod oracle;
mod oracle_around;
mod oracle_kinds;
mod oracle_switching;
mod places;
mod rejection;
mod second_pole;
mod setup;
mod swing;
mod switching;
mod table;
mod thermal;
mod waveform;
mod whose;
