//! `diff`: what a revision did to every figure and every verdict, small enough to be read in a review.

mod compare;
mod side;
mod text;

use std::path::PathBuf;

use clap::Args;

pub use compare::{Change, StageChange, compare};
pub use side::Side;

use crate::{check::Ending, terminal::Terminal};

/// What `diff` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Before: a note, a folder of notes, or a revision that git knows
    #[arg(value_name = "OLD")]
    pub old: PathBuf,
    /// After: the same
    #[arg(value_name = "NEW")]
    pub new: PathBuf,
    /// Where to look in a revision; without it where the other side looks, or everywhere
    #[arg(value_name = "PATH")]
    pub path: Option<PathBuf>,
    /// Show every changed figure: those that no limit judges, and those whose shown digits stay
    #[arg(long)]
    pub all: bool,
}

/// Compares.
///
/// Ends with 1 when a verdict got worse or a limit was let out of sight (loosened, dropped, or its stage removed), 2 when
/// something could not be read.
pub fn run(options: &Options, terminal: &mut Terminal) -> Ending {
    let sides = Side::both(&options.old, &options.new, options.path.as_deref());
    let (old, new) = match sides {
        Ok(sides) => sides,
        Err(fault) => {
            terminal.complain(&fault.to_string());
            return Ending::BadInput;
        }
    };
    let mut ending = Ending::Good;
    for side in [&old, &new] {
        for fault in side.faults() {
            terminal.complain(&format!("{}: {fault}\n", side.name));
            ending = Ending::BadInput;
        }
    }
    let changes = compare(&old, &new);
    terminal.out(&text::report(&changes, options.all, terminal.colour()));
    if changes.iter().any(StageChange::worse) {
        ending = ending.max(Ending::Broken);
    }
    ending
}
