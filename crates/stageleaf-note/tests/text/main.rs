//! Text in, text out: quantities, stage blocks, part files, whole notes. Every kind of problem is checked with its
//! whole text, written by hand.

mod blocks;
mod common;
mod hostile;
mod kinds;
mod notes;
mod parts;
mod quantities;
mod terms;
