//! What is wrong with a stage, as data. Place and words are added where the text is known.

use core::fmt;

/// A value that a stage cannot have.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Error {
    /// Must be finite and above zero.
    NotPositive {
        /// The component or key.
        what: &'static str,
        /// What was given.
        given: f64,
    },
    /// Must be finite and not below zero.
    Negative {
        /// The component or key.
        what: &'static str,
        /// What was given.
        given: f64,
    },
    /// Finite and above zero, but far outside what circuits are made of.
    BeyondReason {
        /// The component or key.
        what: &'static str,
        /// What was given.
        given: f64,
    },
    /// The kind needs this component.
    MissingComponent {
        /// Its name.
        what: &'static str,
    },
    /// Two components that only make sense together.
    Unpaired {
        /// The one that is there.
        given: &'static str,
        /// The one that is missing.
        missing: &'static str,
    },
    /// The positive supply is not above the negative one.
    SupplyReversed {
        /// Least positive supply, V.
        positive: f64,
        /// Greatest negative supply, V.
        negative: f64,
    },
    /// The lower end is above the upper one.
    RangeReversed {
        /// The key.
        what: &'static str,
        /// Lower end given.
        low: f64,
        /// Upper end given.
        high: f64,
    },
}

impl fmt::Display for Error {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NotPositive { what, given } => write!(f, "`{what}` must be above zero; {given} was given"),
            Self::Negative { what, given } => write!(f, "`{what}` must not be below zero; {given} was given"),
            Self::BeyondReason { what, given } => write!(f, "`{what}` is {given:e} in SI units, far outside what circuits are made of"),
            Self::MissingComponent { what } => write!(f, "`{what}` is missing"),
            Self::Unpaired { given, missing } => write!(f, "`{given}` needs `{missing}`"),
            Self::SupplyReversed { positive, negative } => {
                write!(f, "the positive supply ({positive} V) is not above the negative one ({negative} V)")
            }
            Self::RangeReversed { what, low, high } => {
                write!(f, "`{what}` runs from {low} to {high}: the lower end is above the upper one")
            }
        }
    }
}

impl core::error::Error for Error {}
