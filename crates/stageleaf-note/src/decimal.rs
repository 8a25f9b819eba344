//! Numbers in decimal, rounded once.
//!
//! `{:e}` of the standard library gives the exact binary value's correctly rounded decimal digits without the
//! platform's maths library. Prefixes then only move the point, which is exact: 999.96 becomes "1.00 k", not "1000".

use std::cmp::Ordering;

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
            let half = number("5", i64::from(place) - 1);
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

/// The float nearest to `mantissa · 10^power`, a tie to the even one, as IEEE 754 asks; infinite where it is too large.
/// `mantissa` is digits with at most one point.
///
/// Not `str::parse`, whose table of powers weighs 10 KB in a page as served. Up to 15 digits and 22 places one exact
/// product or quotient is rounded once; all else is divided bit by bit in whole numbers.
#[must_use]
#[expect(clippy::cast_precision_loss, reason = "below 2^53")]
pub fn number(mantissa: &str, power: i64) -> f64 {
    /// No halfway point between two floats has more digits; what follows only breaks ties.
    const DIGITS: usize = 770;
    let places = mantissa.split_once('.').map_or(0, |(_, part)| part.len());
    let written = mantissa.bytes().filter(u8::is_ascii_digit).skip_while(|b| *b == b'0');
    let mut digits: Vec<u8> = written.map(|b| b - b'0').collect();
    let mut power = power - i64::try_from(places).unwrap_or(i64::MAX);
    if digits.len() > DIGITS {
        power += i64::try_from(digits.len() - DIGITS).unwrap_or(i64::MAX);
        let more = digits[DIGITS..].iter().any(|d| *d != 0);
        digits.truncate(DIGITS);
        digits[DIGITS - 1] |= u8::from(more);
    }
    let above = power.saturating_add(i64::try_from(digits.len()).unwrap_or(i64::MAX));
    match (digits.len(), power) {
        (0, _) => 0.0,
        _ if above > 310 => f64::INFINITY,
        _ if above < -324 => 0.0,
        (..=15, -22..=22) => {
            let whole = digits.iter().fold(0, |n, d| n * 10 + u64::from(*d)) as f64;
            let ten = (0..power.unsigned_abs()).fold(1.0, |p, _| p * 10.0);
            if power < 0 { whole / ten } else { whole * ten }
        }
        _ => {
            let mut above = Whole::default();
            digits.iter().for_each(|d| above.times(10, u32::from(*d)));
            let mut below = Whole(vec![1]);
            (0..power.unsigned_abs()).for_each(|_| if power < 0 { below.times(10, 0) } else { above.times(10, 0) });
            above.over(below)
        }
    }
}

/// A whole number of any size, in digits of 32 bits, the lowest first and the highest not zero.
#[derive(Default)]
struct Whole(Vec<u32>);

impl Whole {
    #[expect(clippy::cast_possible_truncation, reason = "the low half, then the high half")]
    fn times(&mut self, factor: u32, add: u32) {
        let mut carry = u64::from(add);
        for digit in &mut self.0 {
            let product = u64::from(*digit) * u64::from(factor) + carry;
            *digit = product as u32;
            carry = product >> 32;
        }
        if carry > 0 {
            self.0.push(carry as u32);
        }
    }

    fn bits(&self) -> i32 {
        let last = self.0.last().map_or(0, |d| 32 - d.leading_zeros());
        i32::try_from(self.0.len() * 32).unwrap_or(i32::MAX) - 32 + i32::try_from(last).unwrap_or(0)
    }

    fn doubled(&mut self, times: i32) {
        (0..times).for_each(|_| self.times(2, 0));
    }

    fn cmp(&self, other: &Self) -> Ordering {
        self.0.len().cmp(&other.0.len()).then_with(|| self.0.iter().rev().cmp(other.0.iter().rev()))
    }

    /// Takes away what is not larger.
    fn less(&mut self, other: &Self) {
        let mut borrow = false;
        for (i, digit) in self.0.iter_mut().enumerate() {
            let (less, one) = digit.overflowing_sub(other.0.get(i).copied().unwrap_or(0));
            let (less, two) = less.overflowing_sub(u32::from(borrow));
            (*digit, borrow) = (less, one || two);
        }
        while self.0.last() == Some(&0) {
            self.0.pop();
        }
    }

    /// The quotient as the nearest float.
    #[expect(clippy::cast_precision_loss, reason = "at most 2^53")]
    fn over(mut self, mut below: Self) -> f64 {
        // Halved or doubled until the quotient lies from 1 to below 2.
        let mut exponent = self.bits() - below.bits();
        self.doubled(-exponent);
        below.doubled(exponent);
        if self.cmp(&below).is_lt() {
            self.doubled(1);
            exponent -= 1;
        }
        // Subnormal numbers have fewer bits.
        let bits = 53.min(exponent + 1075);
        let mut mantissa = 0_u64;
        for _ in 0..bits {
            mantissa *= 2;
            if self.cmp(&below).is_ge() {
                self.less(&below);
                mantissa += 1;
            }
            self.doubled(1);
        }
        let up = match self.cmp(&below) {
            _ if bits < 0 => false,
            Ordering::Less => false,
            Ordering::Equal => mantissa % 2 == 1,
            Ordering::Greater => true,
        };
        libm::scalbn((mantissa + u64::from(up)) as f64, exponent + 1 - bits)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Against the standard library's reader, which is correctly rounded.
    #[test]
    fn numbers_are_read_to_the_nearest_float() {
        let same = |mantissa: &str, power: i64| {
            let wanted: f64 = format!("{mantissa}e{power}").parse().unwrap();
            assert_eq!(number(mantissa, power).to_bits(), wanted.to_bits(), "{mantissa}e{power}");
        };
        for mantissa in [
            "0",
            "0.00",
            "1",
            "4.7",
            "10",
            "0.1",
            "9007199254740993",
            "2.2250738585072014",
            "1.7976931348623157",
            "4.9406564584124654",
            "2.4703282292062327",
            "2.4703282292062328",
            "123456789012345678901234567890.5",
        ] {
            for power in (-400..400).step_by(7).chain([-323, -324, -325, -308, 308, 22, 23, -22, -23, i64::MAX / 2, i64::MIN / 2]) {
                same(mantissa, power);
            }
        }
        // Halfway between two floats, and just beside it.
        same("9007199254740993", 0);
        same("9007199254740992.9999999999999999999", 0);
        same("9007199254740993.0000000000000000001", 0);
        let half = format!("9007199254740993.{}", "0".repeat(900));
        same(&half, 0);
        same(&format!("{half}1"), 0);
        same(&"9".repeat(5000), -4990);
        // All over the floats, and with fewer digits; a multiplicative generator with Knuth's constants, from memory.
        let mut seed = 1_u64;
        for _ in 0..2_000 {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            let value = f64::from_bits(seed >> 1);
            if value.is_finite() {
                for text in [format!("{value:e}"), format!("{value:.2e}"), format!("{value:.25e}")] {
                    let (mantissa, power) = text.split_once('e').unwrap();
                    same(mantissa, power.parse().unwrap());
                }
            }
        }
    }

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
