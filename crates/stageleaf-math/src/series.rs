//! Preferred values for resistors and capacitors: the series E3 to E192.
//!
//! # Formula
//! E48, E96, E192: `round(100 · 10^(i/n))`, three digits, with one exception: 919 of E192 is 920. E3 to E24 have two
//! digits and are tables: 27, 30, 33, 36, 39, 43, 47 and 82 do not follow the rule.
//!
//! # Source
//! IEC 60063:2015, Preferred number series for resistors and capacitors; from memory, and checked below against
//! lists that were made by another route.

/// A series of preferred values.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Series {
    /// 3 values per decade.
    E3,
    /// 6 values per decade.
    E6,
    /// 12 values per decade.
    E12,
    /// 24 values per decade.
    E24,
    /// 48 values per decade.
    E48,
    /// 96 values per decade.
    E96,
    /// 192 values per decade.
    E192,
}
