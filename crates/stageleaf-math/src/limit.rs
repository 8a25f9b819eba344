//! Limits that a stage must keep, and the verdict on each.

use crate::figure::Query;

/// What a limit asks.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Bound {
    /// Not less than this.
    AtLeast(f64),
    /// Not more than this.
    AtMost(f64),
    /// Within these two, both included.
    Between {
        /// Least allowed.
        low: f64,
        /// Greatest allowed.
        high: f64,
    },
    /// Shown, not judged.
    Report,
}

/// When a limit that holds counts as thin.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Thin {
    /// A fraction of the limit's own scale: half-width of a band, |limit| of a one-sided one.
    Fraction(f64),
    /// The stated distance from the limit, in the figure's unit.
    Distance(f64),
}

/// A limit on a figure.
#[derive(Clone, Debug, PartialEq)]
pub struct Limit {
    /// The figure.
    pub query: Query,
    /// What is asked.
    pub bound: Bound,
    /// When it counts as thin.
    pub thin: Thin,
}

/// The judgement on a limit, at the worst case.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Verdict {
    /// Not kept at the worst case.
    Breaks,
    /// An input is missing.
    Undetermined,
    /// Kept, with less to spare than asked.
    Thin,
    /// Kept.
    Holds,
    /// Shown, not judged.
    Reported,
}

impl Verdict {
    /// The word for it.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Self::Breaks => "breaks",
            Self::Undetermined => "undetermined",
            Self::Thin => "thin",
            Self::Holds => "holds",
            Self::Reported => "reported",
        }
    }
}

/// What kind of data a figure rests on.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Basis {
    /// Every part figure that it is sensitive to is used at a guaranteed bound, or none is involved.
    Guaranteed,
    /// Some are guaranteed, some typical.
    Mixed,
    /// All are typical.
    Typical,
}

impl Basis {
    /// The word for it.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Self::Guaranteed => "guaranteed",
            Self::Mixed => "mixed",
            Self::Typical => "typical",
        }
    }
}
