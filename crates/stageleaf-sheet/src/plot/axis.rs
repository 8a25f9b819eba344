//! Axes: where a value lies, and which values carry a tick.

use stageleaf_math::dimension::Dimension;
use stageleaf_note::format;

/// What an axis shows, and how its numbers read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Unit {
    /// Already in dB.
    Decibel,
    /// Already in degrees.
    Degree,
    /// SI, with a prefix.
    Si(Dimension),
}

impl Unit {
    /// A value as text.
    #[must_use]
    pub fn text(self, value: f64, digits: usize) -> String {
        if !value.is_finite() {
            return "–".into();
        }
        match self {
            Self::Decibel => format!("{} dB", plain(value, 2)),
            Self::Degree => format!("{}°", plain(value, 1)),
            Self::Si(d) => format(value, d, digits),
        }
    }

    /// The unit as a table's head names it.
    #[must_use]
    pub const fn symbol(self) -> &'static str {
        match self {
            Self::Decibel => "dB",
            Self::Degree => "°",
            Self::Si(d) => d.si_unit(),
        }
    }
}

/// A number with at most `decimals` decimals, trailing zeros dropped, the minus sign U+2212.
#[must_use]
pub fn plain(value: f64, decimals: usize) -> String {
    let mut text = format!("{:.*}", decimals, value.abs());
    if text.contains('.') {
        text.truncate(text.trim_end_matches('0').trim_end_matches('.').len());
    }
    if value < 0.0 && text.bytes().any(|b| (b'1'..=b'9').contains(&b)) {
        text.insert(0, '−');
    }
    text
}

/// An axis from `low` to `high`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Axis {
    /// Lower end.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// Distance of the ticks; `None` for decades.
    pub step: Option<f64>,
}

impl Axis {
    /// A logarithmic axis around `values`, its ends on 1-2-5 steps when `loose`.
    #[must_use]
    pub fn decades(values: impl Iterator<Item = f64>, loose: bool) -> Option<Self> {
        let (mut low, mut high) = (f64::INFINITY, 0.0_f64);
        for v in values.filter(|v| v.is_finite() && *v > 0.0) {
            low = low.min(v);
            high = high.max(v);
        }
        if high <= 0.0 {
            return None;
        }
        if loose {
            low = step_below(low);
            high = step_above(high);
        }
        if high / low < 1.5 {
            (low, high) = (low / 2.0, high * 2.0);
        }
        (low > 0.0 && high.is_finite()).then_some(Self { low, high, step: None })
    }

    /// An axis of equal steps around `values`, with ends on ticks; at most `depth` deep below its top.
    #[must_use]
    pub fn linear(values: impl Iterator<Item = f64>, depth: f64, step: Option<f64>) -> Option<Self> {
        let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
        for v in values.filter(|v| v.is_finite() && v.abs() < 1e9) {
            low = low.min(v);
            high = high.max(v);
        }
        if high < low {
            return None;
        }
        low = low.max(high - depth);
        if high - low < 1e-9 * high.abs().max(1.0) {
            (low, high) = (low - 1.0, high + 1.0);
        }
        // A curve never runs along the frame.
        let air = (high - low) * 0.04;
        let step = step.unwrap_or_else(|| tick_step(high - low));
        Some(Self { low: libm::floor((low - air) / step) * step, high: libm::ceil((high + air) / step) * step, step: Some(step) })
    }

    /// Where a value lies, 0 to 1 inside the axis.
    #[must_use]
    pub fn place(&self, value: f64) -> f64 {
        self.ruler().place(value)
    }

    /// The same for many values.
    #[must_use]
    pub fn ruler(&self) -> Ruler {
        match self.step {
            Some(_) => Ruler { start: self.low, scale: 1.0 / (self.high - self.low), logarithmic: false },
            None => Ruler { start: libm::log10(self.low), scale: 1.0 / libm::log10(self.high / self.low), logarithmic: true },
        }
    }

    /// The value at a place.
    #[must_use]
    pub fn value(&self, place: f64) -> f64 {
        if self.step.is_none() { self.low * libm::pow(self.high / self.low, place) } else { self.low + (self.high - self.low) * place }
    }

    /// Values with a labelled tick.
    #[must_use]
    pub fn ticks(&self) -> Vec<f64> {
        let mut ticks = Vec::new();
        let Some(step) = self.step else {
            let span = libm::log10(self.high / self.low);
            let (first, last) = (decade(self.low), decade(self.high));
            // Whole decades where there are enough of them, else 1-2-5.
            let every = if span > 15.0 {
                3
            } else if span > 8.5 {
                2
            } else {
                1
            };
            for d in first..=last {
                let factors: &[f64] = if span < 2.2 { &[1.0, 2.0, 5.0] } else { &[1.0] };
                if d.rem_euclid(every) == 0 {
                    ticks.extend(factors.iter().map(|f| f * power(d)).filter(|v| *v >= self.low * 0.999 && *v <= self.high * 1.001));
                }
            }
            return ticks;
        };
        // Multiples of the step, so that zero is one of them.
        let mut k = libm::ceil(self.low / step - 1e-6);
        while k * step <= self.high + step * 1e-6 && ticks.len() < 40 {
            ticks.push(k * step);
            k += 1.0;
        }
        ticks
    }

    /// Values with a short tick: 2 to 9 times each decade.
    #[must_use]
    pub fn minor_ticks(&self) -> Vec<f64> {
        let mut ticks = Vec::new();
        if self.step.is_none() && libm::log10(self.high / self.low) < 12.0 {
            for d in decade(self.low)..=decade(self.high) {
                let base = power(d);
                ticks.extend((2..10).map(|k| f64::from(k) * base).filter(|v| *v > self.low && *v < self.high));
            }
        }
        ticks
    }
}

/// An axis made ready to place many values.
#[derive(Clone, Copy, Debug)]
pub struct Ruler {
    start: f64,
    scale: f64,
    logarithmic: bool,
}

impl Ruler {
    /// Where a value lies, 0 to 1 inside the axis; far below it where a logarithmic axis has no place for it.
    #[must_use]
    pub fn place(&self, value: f64) -> f64 {
        if !self.logarithmic {
            (value - self.start) * self.scale
        } else if value <= 0.0 {
            f64::NEG_INFINITY
        } else {
            (libm::log10(value) - self.start) * self.scale
        }
    }
}

/// A 1-2-5 step that divides a span into four to ten.
#[must_use]
pub fn tick_step(span: f64) -> f64 {
    let base = power(decade(span / 4.0));
    let ratio = span / 4.0 / base;
    base * if ratio >= 5.0 {
        5.0
    } else if ratio >= 2.0 {
        2.0
    } else {
        1.0
    }
}

fn step_below(value: f64) -> f64 {
    let base = power(decade(value));
    base * if value >= 5.0 * base {
        5.0
    } else if value >= 2.0 * base {
        2.0
    } else {
        1.0
    }
}

fn step_above(value: f64) -> f64 {
    let base = power(decade(value));
    base * if value <= 1.001 * base {
        1.0
    } else if value <= 2.0 * base {
        2.0
    } else if value <= 5.0 * base {
        5.0
    } else {
        10.0
    }
}

/// The decade that a value starts in.
#[expect(clippy::cast_possible_truncation, reason = "the decade of a finite f64 is between −324 and 308")]
fn decade(value: f64) -> i32 {
    if value > 0.0 && value.is_finite() { libm::floor(libm::log10(value) + 1e-9) as i32 } else { 0 }
}

fn power(decade: i32) -> f64 {
    libm::pow(10.0, f64::from(decade))
}

/// A frequency or another number at a tick, short: `100k`; the unit stands in the axis's title.
#[must_use]
pub fn short(value: f64) -> String {
    const PREFIXES: [&str; 13] = ["a", "f", "p", "n", "µ", "m", "", "k", "M", "G", "T", "P", "E"];
    if value <= 0.0 || !value.is_finite() {
        return plain(value, 3);
    }
    let d = decade(value).div_euclid(3).clamp(-6, 6);
    let index = usize::try_from(d + 6).unwrap_or(6);
    format!("{}{}", plain(value / power(3 * d), 2), PREFIXES[index])
}
