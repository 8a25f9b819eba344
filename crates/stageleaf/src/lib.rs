//! The command line of Stageleaf, as a library: what `check`, `new`, `page` and `explain` do, the book preprocessor, the site builder.
//!
//! Formulas live in `stageleaf-math`, text in `stageleaf-note`, pages in `stageleaf-sheet`; here are files, folders and terminals.
//! A note is examined by a pure function ([`check::examine`]) of its bytes and its team's shelf and settings.
//!
//! # What is left out
//! Nothing here reaches the network, and nothing is written but what a command was asked to write: `check --rewrite`
//! replaces numbers that the prose quotes, `page --out` writes a page.

pub mod alternates;
pub mod asked;
pub mod check;
pub mod choose;
pub mod cli;
pub mod diff;
pub mod embed;
pub mod explain;
pub mod fault;
pub mod needs;
pub mod new;
pub mod overview;
pub mod page;
#[cfg(feature = "site")]
pub mod site;
pub mod team;
pub mod terminal;
pub mod walk;
