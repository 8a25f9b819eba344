//! Searches with the verdicts as oracle: which amplifier and which tolerances a stage could do with, and which other parts would do.
//!
//! Every answer is a stage that was judged in full at its worst case; no closed form decides anything.

pub mod alternates;
pub mod choose;
pub mod needs;

use alloc::vec::Vec;

use crate::{
    Error,
    analyse::{Detail, analyse_with, thin_below},
    limit::{Limit, Verdict},
    model::Plans,
    report::{LimitRow, Report},
    stage::Stage,
};

/// Judges variants of one stage; what is compiled for the first serves all.
#[derive(Debug, Default)]
pub struct Judge {
    plans: Plans,
    /// How many variants were judged.
    pub judged: usize,
}

impl Judge {
    /// The limits of a stage with their verdicts.
    ///
    /// # Errors
    /// What [`crate::check`] finds.
    pub fn report(&mut self, stage: &Stage) -> Result<Report, Error> {
        self.judged += 1;
        analyse_with(stage, Detail::Limits, &self.plans)
    }

    /// Which limits are not kept, by their place in the stage's list. A stage that cannot be analysed keeps none.
    fn lost(&mut self, stage: &Stage) -> Vec<usize> {
        match self.report(stage) {
            Ok(report) => {
                let lost = |row: &&(usize, &LimitRow)| matches!(row.1.verdict, Verdict::Breaks | Verdict::Undetermined);
                report.limits.iter().enumerate().collect::<Vec<_>>().iter().filter(lost).map(|(i, _)| *i).collect()
            }
            Err(_) => (0..stage.limits.len()).collect(),
        }
    }
}

/// A margin in terms of what counts as thin for its limit: below 1 thin, below 0 broken; comparable between limits.
#[must_use]
pub fn closeness(row: &LimitRow) -> f64 {
    let Some(margin) = row.margin else { return f64::NEG_INFINITY };
    let scale = thin_below(&row.limit);
    if scale > 0.0 { margin / scale } else { margin }
}

fn limits_at(stage: &Stage, places: &[usize]) -> Vec<Limit> {
    places.iter().filter_map(|&i| stage.limits.get(i).cloned()).collect()
}
