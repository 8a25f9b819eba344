//! How exact each figure is, and why.
//!
//! The match names every figure and has no `_` arm: a new figure does not compile until someone decides.

use stageleaf_math::figure::Figure;

/// How far a figure may lie from the exact result of the model.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Exactness {
    /// A fraction of the value.
    Relative(f64),
    /// A distance in the figure's SI unit.
    Absolute(f64),
}

impl Exactness {
    /// The allowed distance from `value`.
    pub const fn around(self, value: f64) -> f64 {
        match self {
            Self::Relative(fraction) => fraction * value.abs(),
            Self::Absolute(distance) => distance,
        }
    }
}

/// The budget of a figure.
pub const fn budget(figure: Figure) -> Exactness {
    use Exactness::{Absolute, Relative};
    match figure {
        // One evaluation of the network: rounding of some hundred operations, more where terms nearly cancel.
        Figure::Gain | Figure::GainAtSignal | Figure::GainAt => Relative(1e-10),
        Figure::PhaseAt => Absolute(1e-10), // rad, the same evaluation
        // A difference from one: it keeps the digits that the subtraction leaves.
        Figure::GainError => Absolute(1e-12),
        // A root search to the last bits on |H|², whose slope at the edge may be small.
        Figure::Bandwidth | Figure::LowCutoff => Relative(1e-10),
        // A flat maximum: its height is exact to the square of its place, and |H(0)| enters.
        Figure::Peaking | Figure::SensitivityPeak => Relative(1e-9),
        Figure::Crossover => Relative(1e-10),                                // root of |T|² = 1
        Figure::PhaseMargin => Absolute(1e-9),                               // rad: the crossover search times the slope of the phase
        Figure::GainMargin => Relative(1e-9),                                // root of Im T = 0, which may be shallow
        Figure::NaturalFrequency | Figure::Q => Relative(1e-9),              // polished roots; Q amplifies the real part's error
        Figure::InputImpedance | Figure::OutputImpedance => Relative(1e-10), // one evaluation of the network
        // Sums of products of stated values with gains from the network.
        Figure::StageCmrr | Figure::StageCmrrAt | Figure::StagePsrr | Figure::StagePsrrAt | Figure::RippleOutput => Relative(1e-9),
        Figure::OutputOffset | Figure::InputOffset | Figure::OffsetDrift => Relative(1e-9),
        // A central difference: exact to the square of its step of 1e-4.
        Figure::GainDrift => Relative(1e-7),
        // The quadrature's own target, with a margin for sources of little weight; the ratios follow it.
        Figure::OutputNoise | Figure::InputNoise | Figure::OutputNoisePeakToPeak | Figure::Snr => Relative(1e-8),
        Figure::NoiseBandwidth => Relative(1e-8), // the same, over all frequencies
        Figure::SnrBits => Absolute(1e-8),        // bit: the logarithm of the same ratio
        Figure::Enob => Absolute(1e-8),           // bit, the same
        // A sum of exponentials over the acquisition time's many time constants: the poles' error times their number.
        Figure::AcquisitionError => Relative(1e-8),
        Figure::NoiseDensityAt => Relative(1e-10), // one evaluation of the network
        // Differences and ratios of stated values and gains.
        Figure::ClipMargin | Figure::FullScaleMargin | Figure::InputRangeMargin => Absolute(1e-9), // V, of rails of some volts
        Figure::CurrentMargin => Absolute(1e-12),                                                  // A, of milliamperes
        Figure::SlewMargin => Relative(1e-9),
        Figure::FullPowerBandwidth => Relative(1e-9), // a closed form, or a root search
        // The last crossing of a sum of exponentials: the poles' error, more where it crosses at a shallow angle.
        Figure::StartupTime => Relative(1e-8),
        // Bisected to 2⁻⁴⁰ of a step, on a waveform of rounding alone; where it is small, the output's own rounding over it counts.
        Figure::Overshoot => Relative(1e-7),
        Figure::SettlingTime => Relative(2e-6), // the last crossing of a band that is a part in a million of the output
        // Quadrature of sixth order over steps of a hundredth of a period, and the finite slew at the clip's corners.
        Figure::SlewClipDistortion => Relative(1e-5),
        Figure::SupplyCurrent | Figure::Dissipation | Figure::ResistorDissipation => Relative(1e-9), // closed forms
        // A linear network and pieces of a straight line; thresholds of some volts may lie near zero.
        Figure::ThresholdHigh | Figure::ThresholdLow | Figure::OutputHigh | Figure::OutputLow => Absolute(1e-10), // V
        Figure::Hysteresis => Absolute(1e-10), // V: the difference of two thresholds
        Figure::ResponseTime => Relative(1e-9),
        Figure::JunctionTemperature => Relative(1e-9), // K; a fixed point where the bias current depends on it
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Stated by the makers of the solved circuits: what a second engine has to meet.
    #[test]
    fn no_budget_is_wider_than_the_solved_circuits_allow() {
        let degree = core::f64::consts::PI / 180.0;
        let decibel = core::f64::consts::LN_10 / 20.0; // relative, per dB
        for (figure, most) in [
            (Figure::GainAt, 1e-6),
            (Figure::PhaseAt, 1e-4 * degree),
            (Figure::Bandwidth, 1e-5),
            (Figure::Peaking, 1e-4 * decibel),
            (Figure::Crossover, 1e-6),
            (Figure::PhaseMargin, 1e-3 * degree),
            (Figure::GainMargin, 1e-3 * decibel),
            (Figure::NoiseDensityAt, 1e-6),
            (Figure::OutputNoise, 1e-4),
        ] {
            assert!(budget(figure).around(1.0) <= most, "`{}` may be wider than asked", figure.id());
        }
    }
}
