//! Preferred values for resistors and capacitors: the series E3 to E192.
//!
//! # Formula
//! E48, E96, E192: `round(100 · 10^(i/n))`, three digits, with one exception: 919 of E192 is 920. E3 to E24 have two
//! digits and are tables: 27, 30, 33, 36, 39, 43, 47 and 82 do not follow the rule. All are held as tables here; the
//! rule is among the tests.
//!
//! # Units
//! Any: a series has the same digits in every decade, for ohms as for farads.
//!
//! # Does not apply
//! Values that a maker or a stock room holds beside the series.
//!
//! # Source
//! IEC 60063:2015, Preferred number series for resistors and capacitors; from memory.

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

impl Series {
    /// Every series, the coarsest first.
    pub const ALL: &'static [Self] = &[Self::E3, Self::E6, Self::E12, Self::E24, Self::E48, Self::E96, Self::E192];

    /// As the standard names it: `E24`.
    #[must_use]
    pub const fn id(self) -> &'static str {
        match self {
            Self::E3 => "E3",
            Self::E6 => "E6",
            Self::E12 => "E12",
            Self::E24 => "E24",
            Self::E48 => "E48",
            Self::E96 => "E96",
            Self::E192 => "E192",
        }
    }

    /// The digits of one decade, as whole numbers from 100 (below 1000) in rising order: 4.7 is 470.
    #[must_use]
    pub const fn decade(self) -> &'static [u16] {
        match self {
            Self::E3 => &[100, 220, 470],
            Self::E6 => &[100, 150, 220, 330, 470, 680],
            Self::E12 => &E12,
            Self::E24 => &E24,
            Self::E48 => &E48,
            Self::E96 => &E96,
            Self::E192 => &E192,
        }
    }

    /// The value of the series nearest to `value` by ratio; the lower one where two are equally near.
    ///
    /// # Units
    /// Any; the result has the same. A value that is not finite and above zero comes back unchanged.
    #[must_use]
    pub fn nearest(self, value: f64) -> f64 {
        let Some(position) = self.position(value) else { return value };
        let (below, above) = (self.at(position), self.at(position + 1));
        if value / below <= above / value { below } else { above }
    }

    /// The next value of the series above `value`.
    ///
    /// # Units
    /// As [`Series::nearest`].
    #[must_use]
    pub fn step_up(self, value: f64) -> f64 {
        let Some(position) = self.position(value) else { return value };
        // Beyond the largest double there is no next value.
        let up = self.at(position + 1);
        if up.is_finite() { up } else { value }
    }

    /// The next value of the series below `value`.
    ///
    /// # Units
    /// As [`Series::nearest`].
    #[must_use]
    pub fn step_down(self, value: f64) -> f64 {
        let Some(position) = self.position(value) else { return value };
        let here = self.at(position);
        if here < value { here } else { self.at(position - 1) }
    }

    /// Whether `value` is in the series, to the last bits.
    #[must_use]
    pub fn contains(self, value: f64) -> bool {
        self.position(value).is_some_and(|p| is_same(self.at(p), value))
    }

    /// Place of the greatest value of the series that is not above `value`, counted from 1 in whole decades; a value
    /// within rounding of a member is that member.
    fn position(self, value: f64) -> Option<i32> {
        if !(value.is_finite() && value > 0.0) {
            return None;
        }
        let decade = self.decade();
        let n = length(decade);
        #[expect(clippy::cast_possible_truncation, reason = "the logarithm of a finite double lies between -324 and 309")]
        let guess = libm::floor(libm::log10(value)) as i32 * n;
        // The logarithm may be one off at a decade's edge, so look a decade around it.
        let mut position = guess - n;
        while position < guess + 2 * n && (self.at(position + 1) <= value || is_same(self.at(position + 1), value)) {
            position += 1;
        }
        Some(position)
    }

    /// The value at a place; place 0 is 1.
    fn at(self, position: i32) -> f64 {
        let decade = self.decade();
        let n = length(decade);
        let digits = f64::from(decade[position.rem_euclid(n) as usize]);
        let power = position.div_euclid(n) - 2;
        // Powers of ten up to 22 are exact, so one division or product rounds once: 470 over 10^9 is the double
        // nearest to 4.7e-7, as text gives it.
        if (-22..=22).contains(&power) {
            let ten = POWERS[power.unsigned_abs() as usize];
            if power < 0 { digits / ten } else { digits * ten }
        } else {
            digits * libm::pow(10.0, f64::from(power))
        }
    }
}

/// Powers of ten that a double holds exactly.
const POWERS: [f64; 23] =
    [1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22];

fn length(decade: &[u16]) -> i32 {
    i32::try_from(decade.len()).unwrap_or(i32::MAX)
}

fn is_same(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-12 * b.abs()
}

const E12: [u16; 12] = [100, 120, 150, 180, 220, 270, 330, 390, 470, 560, 680, 820];

const E24: [u16; 24] =
    [100, 110, 120, 130, 150, 160, 180, 200, 220, 240, 270, 300, 330, 360, 390, 430, 470, 510, 560, 620, 680, 750, 820, 910];

const E48: [u16; 48] = every_nth(E192, 4);

const E96: [u16; 96] = every_nth(E192, 2);

const E192: [u16; 192] = [
    100, 101, 102, 104, 105, 106, 107, 109, 110, 111, 113, 114, 115, 117, 118, 120, 121, 123, 124, 126, 127, 129, 130, 132, 133, 135, 137,
    138, 140, 142, 143, 145, 147, 149, 150, 152, 154, 156, 158, 160, 162, 164, 165, 167, 169, 172, 174, 176, 178, 180, 182, 184, 187, 189,
    191, 193, 196, 198, 200, 203, 205, 208, 210, 213, 215, 218, 221, 223, 226, 229, 232, 234, 237, 240, 243, 246, 249, 252, 255, 258, 261,
    264, 267, 271, 274, 277, 280, 284, 287, 291, 294, 298, 301, 305, 309, 312, 316, 320, 324, 328, 332, 336, 340, 344, 348, 352, 357, 361,
    365, 370, 374, 379, 383, 388, 392, 397, 402, 407, 412, 417, 422, 427, 432, 437, 442, 448, 453, 459, 464, 470, 475, 481, 487, 493, 499,
    505, 511, 517, 523, 530, 536, 542, 549, 556, 562, 569, 576, 583, 590, 597, 604, 612, 619, 626, 634, 642, 649, 657, 665, 673, 681, 690,
    698, 706, 715, 723, 732, 741, 750, 759, 768, 777, 787, 796, 806, 816, 825, 835, 845, 856, 866, 876, 887, 898, 909, 920, 931, 942, 953,
    965, 976, 988,
];

/// E48 and E96 are every fourth and second value of E192: the rule's exponents are the same, and 920 is in neither.
const fn every_nth<const N: usize>(all: [u16; 192], step: usize) -> [u16; N] {
    let mut some = [0; N];
    let mut i = 0;
    while i < N {
        some[i] = all[i * step];
        i += 1;
    }
    some
}

#[cfg(test)]
#[expect(clippy::float_cmp, reason = "a preferred value is the double nearest to its text")]
mod tests {
    use super::*;

    #[test]
    fn the_fine_series_follow_the_rule_with_one_exception() {
        // IEC 60063:2015, from memory: round(100 · 10^(i/n)); 919 of E192 is 920.
        for (series, n) in [(Series::E48, 48), (Series::E96, 96), (Series::E192, 192)] {
            assert_eq!(series.decade().len(), n);
            for (i, &digits) in (0_u16..).zip(series.decade()) {
                let exact = 100.0 * libm::pow(10.0, f64::from(i) / f64::from(u16::try_from(n).unwrap()));
                let rule = libm::round(exact);
                assert_eq!(f64::from(digits), if rule == 919.0 { 920.0 } else { rule }, "{} {i}", series.id());
            }
        }
    }

    #[test]
    fn the_coarse_series_follow_the_rule_but_for_eight_values() {
        // IEC 60063, from memory: the pairs of rule and standard value in E24.
        let exceptions = [(26, 27), (29, 30), (32, 33), (35, 36), (38, 39), (42, 43), (46, 47), (83, 82)];
        let mut found = alloc::vec::Vec::new();
        for (i, &digits) in (0_u16..).zip(Series::E24.decade()) {
            let rule = libm::round(10.0 * libm::pow(10.0, f64::from(i) / 24.0));
            if rule * 10.0 != f64::from(digits) {
                found.push((rule, f64::from(digits / 10)));
            }
        }
        assert_eq!(found, exceptions.map(|(r, s)| (f64::from(r), f64::from(s))));
        for (coarse, fine) in [(Series::E3, Series::E6), (Series::E6, Series::E12), (Series::E12, Series::E24)] {
            assert!(coarse.decade().iter().eq(fine.decade().iter().step_by(2)), "every second value of the finer series");
        }
    }

    #[test]
    fn whole_decades_by_list() {
        // IEC 60063:2015, from memory.
        let e96_start = [100, 102, 105, 107, 110, 113, 115, 118, 121, 124, 127, 130];
        assert_eq!(Series::E96.decade()[..12], e96_start);
        assert_eq!(Series::E96.decade()[84..], [750, 768, 787, 806, 825, 845, 866, 887, 909, 931, 953, 976]);
        assert_eq!(Series::E48.decade()[..6], [100, 105, 110, 115, 121, 127]);
        assert_eq!(Series::E12.decade(), [100, 120, 150, 180, 220, 270, 330, 390, 470, 560, 680, 820]);
    }

    #[test]
    fn stepping_walks_the_series_and_comes_back() {
        assert_eq!(Series::E12.step_up(4700.0), 5600.0);
        assert_eq!(Series::E12.step_down(4700.0), 3900.0);
        assert_eq!(Series::E12.step_up(8200.0), 10e3);
        assert_eq!(Series::E12.step_down(1000.0), 820.0);
        assert_eq!(Series::E24.step_up(4800.0), 5100.0);
        assert_eq!(Series::E24.step_down(4800.0), 4700.0);
        assert_eq!(Series::E12.step_up(470e-9), 560e-9);
        for &series in Series::ALL {
            let mut value = 1e-12;
            while value < 1e12 {
                let up = series.step_up(value);
                assert!(up > value && series.contains(up), "{} {value:e} {up:e}", series.id());
                assert_eq!(series.step_down(up), series.nearest(value));
                value = up;
            }
        }
    }

    #[test]
    fn nearest_is_nearest_by_ratio() {
        assert_eq!(Series::E24.nearest(4750.0), 4700.0);
        assert_eq!(Series::E96.nearest(4750.0), 4750.0);
        assert_eq!(Series::E3.nearest(1.49), 2.2); // 1.49 · 1.49 = 2.2201, above 1 · 2.2
        assert_eq!(Series::E3.nearest(1.48), 1.0); // 1.48 · 1.48 = 2.1904, below
        assert_eq!(Series::E24.nearest(9.6), 10.0);
        assert_eq!(Series::E24.nearest(0.0), 0.0);
        assert!(Series::E24.nearest(f64::NAN).is_nan());
    }

    #[test]
    fn edges_of_the_doubles_neither_hang_nor_panic() {
        for value in [f64::MIN_POSITIVE, 5e-324, f64::MAX, f64::INFINITY, -1.0] {
            let _ = (Series::E192.step_up(value), Series::E192.step_down(value), Series::E192.nearest(value));
        }
    }
}
