//! Numbers in decimal, rounded once.
//!
//! `{:e}` of the standard library gives the exact binary value's correctly rounded decimal digits without the
//! platform's maths library. Prefixes then only move the point, which is exact: 999.96 becomes "1.00 k", not "1000".

/// A finite number as decimal digits.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Decimal {
    /// Below zero.
    pub negative: bool,
    /// Its digits, without point; the first is not zero unless the number is.
    pub digits: String,
    /// The power of ten of the first digit.
    pub exponent: i32,
}

impl Decimal {
    /// The shortest digits that read back as the same bits; `None` unless finite.
    #[must_use]
    pub fn shortest(value: f64) -> Option<Self> {
        value.is_finite().then(|| Self::read(&format!("{value:e}")))
    }

    /// Rounded to so many significant digits (at least one).
    #[must_use]
    pub fn significant(value: f64, digits: usize) -> Option<Self> {
        let digits = digits.clamp(1, 40);
        value.is_finite().then(|| Self::read(&format!("{value:.*e}", digits - 1)))
    }

    /// Rounded so that the last digit has the weight `10^place`.
    #[must_use]
    pub fn at_place(value: f64, place: i32) -> Option<Self> {
        let exact = Self::shortest(value)?;
        let kept = exact.exponent - place + 1;
        if kept <= 0 || exact.is_zero() {
            // Below the last digit: all of it rounds away, unless it is more than half of that digit.
            let half: f64 = format!("5e{}", place - 1).parse().unwrap_or(0.0);
            let up = kept == 0 && value.abs() > half;
            return Some(Self { negative: up && exact.negative, digits: if up { "1".into() } else { "0".into() }, exponent: place });
        }
        let mut rounded = Self::significant(value, usize::try_from(kept).unwrap_or(1))?;
        // A carry (9.99 to 10.0) leaves the last digit one place too high.
        while rounded.last_place() > place {
            rounded.digits.push('0');
        }
        Some(rounded)
    }

    /// Whether it is zero.
    #[must_use]
    pub fn is_zero(&self) -> bool {
        self.digits.bytes().all(|b| b == b'0')
    }

    /// The power of ten of the last digit.
    #[must_use]
    pub fn last_place(&self) -> i32 {
        self.exponent - i32::try_from(self.digits.len()).unwrap_or(i32::MAX) + 1
    }

    /// Times a power of ten.
    #[must_use]
    pub const fn scaled(mut self, power: i32) -> Self {
        self.exponent += power;
        self
    }

    /// Without zeros at the end that only show precision.
    #[must_use]
    pub fn trimmed(mut self) -> Self {
        let kept = self.digits.trim_end_matches('0').len().max(1);
        self.digits.truncate(kept);
        self
    }

    /// The digits with a decimal point, without sign: "0.047", "4700".
    #[must_use]
    pub fn plain(&self) -> String {
        let n = i32::try_from(self.digits.len()).unwrap_or(i32::MAX);
        if self.exponent < 0 {
            let zeros = usize::try_from(-self.exponent - 1).unwrap_or(0);
            format!("0.{}{}", "0".repeat(zeros), self.digits)
        } else if self.exponent >= n - 1 {
            let zeros = if self.is_zero() { 0 } else { usize::try_from(self.exponent - n + 1).unwrap_or(0) };
            format!("{}{}", self.digits, "0".repeat(zeros))
        } else {
            let (whole, part) = self.digits.split_at(usize::try_from(self.exponent + 1).unwrap_or(0));
            format!("{whole}.{part}")
        }
    }

    fn read(text: &str) -> Self {
        let (negative, text) = text.strip_prefix('-').map_or((false, text), |t| (true, t));
        let (mantissa, exponent) = text.split_once('e').unwrap_or((text, "0"));
        let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
        let zero = digits.bytes().all(|b| b == b'0');
        Self { negative: negative && !zero, digits, exponent: exponent.parse().unwrap_or(0) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_carry_moves_the_point() {
        let carried = Decimal::significant(999.96, 3).unwrap();
        assert_eq!((carried.digits.as_str(), carried.exponent), ("100", 3));
        assert_eq!(Decimal::at_place(9.996, -2).unwrap().plain(), "10.00");
        assert_eq!(Decimal::at_place(0.996, -2).unwrap().plain(), "1.00");
    }

    #[test]
    fn below_the_last_place_is_zero_or_one() {
        assert_eq!(Decimal::at_place(0.4, 0).unwrap().plain(), "0");
        assert_eq!(Decimal::at_place(-0.6, 0).unwrap().plain(), "1");
        assert_eq!(Decimal::at_place(0.004, 0).unwrap().plain(), "0");
        assert!(Decimal::at_place(f64::NAN, 0).is_none());
    }

    #[test]
    fn plain_puts_the_point_where_it_belongs() {
        assert_eq!(Decimal::shortest(0.047).unwrap().plain(), "0.047");
        assert_eq!(Decimal::shortest(4700.0).unwrap().plain(), "4700");
        assert_eq!(Decimal::shortest(4.75).unwrap().plain(), "4.75");
        assert_eq!(Decimal::shortest(-0.0).unwrap().plain(), "0");
    }
}
