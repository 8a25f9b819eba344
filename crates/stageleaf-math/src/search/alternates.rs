//! Other parts in the same stage, ranked by verdicts, then by the least margin.

use alloc::{string::String, vec::Vec};

use super::{Judge, closeness, limits_at};
use crate::{
    limit::{Limit, Verdict},
    part::Part,
    report::{Caution, Need, Outcome},
    stage::Stage,
};

/// A stage with another part.
#[derive(Clone, Debug, PartialEq)]
pub struct Alternate {
    /// The part, by the shelf's name.
    pub part: String,
    /// Limits that break.
    pub breaks: Vec<Limit>,
    /// Limits that cannot be judged.
    pub undetermined: Vec<Limit>,
    /// What the part's data lack for them.
    pub missing: Vec<Need>,
    /// Limits that hold with little to spare.
    pub thin: usize,
    /// Limits that hold.
    pub holds: usize,
    /// The least margin over all limits, in terms of what counts as thin for each; the limit that it belongs to.
    pub least: Option<(f64, Limit)>,
    /// Cautions by which the stage cannot work as stated.
    pub cautions: Vec<Caution>,
}

impl Alternate {
    /// Whether every limit is kept.
    #[must_use]
    pub fn survives(&self) -> bool {
        self.breaks.is_empty() && self.undetermined.is_empty() && self.cautions.is_empty()
    }
}

/// Whether a caution says that the stage, as stated, cannot work or would be damaged, whatever its limits ask.
#[must_use]
pub const fn forbids(caution: &Caution) -> bool {
    matches!(
        caution,
        Caution::Oscillates
            | Caution::OscillatesWithin
            | Caution::Exceeded { .. }
            | Caution::SupplySpan { .. }
            | Caution::JunctionHot { .. }
            | Caution::ThermalRunaway
            | Caution::ResistorHot { .. }
            | Caution::OffsetBeyondSupply { .. }
            | Caution::DifferentialInput { .. }
    )
}

/// The stage with `part` in the place of its own (of the amplifiers whose part is `replaced`, where it names one).
#[must_use]
pub fn with_part(stage: &Stage, part: &Part, replaced: Option<&str>) -> Stage {
    let mut stage = stage.clone();
    let fits = |now: &Part| replaced.is_none_or(|id| now.id == id);
    if fits(&stage.part) {
        stage.part = part.clone();
    }
    stage.parts.iter_mut().filter(|(_, now)| replaced.is_some() && fits(now)).for_each(|(_, now)| *now = part.clone());
    stage
}

/// Judges the stage with a part. `None` where it cannot be analysed with it.
#[must_use]
pub fn alternate(judge: &mut Judge, stage: &Stage, part: &Part, replaced: Option<&str>) -> Option<Alternate> {
    let variant = with_part(stage, part, replaced);
    let report = judge.report(&variant).ok()?;
    let places = |verdict: Verdict| -> Vec<usize> {
        report.limits.iter().enumerate().filter(|(_, row)| row.verdict == verdict).map(|(i, _)| i).collect()
    };
    let mut missing: Vec<Need> = Vec::new();
    for row in report.limits.iter().filter(|row| row.verdict == Verdict::Undetermined) {
        if let Outcome::Undetermined(needs) = &row.worst {
            for need in needs {
                if !missing.contains(need) {
                    missing.push(*need);
                }
            }
        }
    }
    let judged = report.limits.iter().filter(|row| row.margin.is_some());
    let least = judged.map(|row| (closeness(row), row)).min_by(|a, b| a.0.total_cmp(&b.0)).map(|(margin, row)| (margin, row.limit.clone()));
    Some(Alternate {
        part: part.id.clone(),
        breaks: limits_at(&variant, &places(Verdict::Breaks)),
        undetermined: limits_at(&variant, &places(Verdict::Undetermined)),
        missing,
        thin: places(Verdict::Thin).len(),
        holds: places(Verdict::Holds).len(),
        least,
        cautions: report.cautions.iter().filter(|c| forbids(c)).cloned().collect(),
    })
}

/// Ranks: survivors first, those last with which the stage cannot work at all; then by how many limits are lost, then by the least margin; of equals, by name.
pub fn rank(list: &mut [Alternate]) {
    let lost = |a: &Alternate| (!a.survives(), !a.cautions.is_empty(), a.breaks.len(), a.undetermined.len());
    let margin = |a: &Alternate| a.least.as_ref().map_or(f64::NEG_INFINITY, |l| l.0);
    list.sort_by(|a, b| lost(a).cmp(&lost(b)).then(margin(b).total_cmp(&margin(a))).then(a.part.cmp(&b.part)));
}
