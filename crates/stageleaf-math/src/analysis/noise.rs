//! Noise at the load: density by source, integrated over a band, noise bandwidth.
//!
//! # Formula
//! One adjoint expansion gives the transfer from a current at any node; then `S = Σ |N_k/D|²·S_k(f)` with `4kT/R` for resistors,
//! `en²·(1 + (fc/f)^α)` in series with the amplifier's input, `in²·(1 + fc/f)` at each input. Integrals by Gauss–Kronrod
//! quadrature in ln f over panels that end at the network's features, halved until they agree.
//!
//! # Units
//! Densities one-sided, V/√Hz; totals rms, V.
//!
//! # Does not apply
//! Correlation between the two inputs' current noise is taken as none.
//!
//! # Source
//! R. Rohrer, L. Nagel, R. Meyer, L. Weber, "Computationally efficient electronic-circuit noise calculations", IEEE JSSC 6
//! (1971), from memory; k: SI Brochure, 9th edition. Nodes and weights: QUADPACK's 15-point rule, R. Piessens et al., 1983,
//! from memory, checked against scipy. Checked in `tests/outside/`.

use alloc::vec::Vec;
use core::f64::consts::TAU;

use crate::{
    network::{GROUND, Law, Node},
    part::PartFigure,
    polynomial::Polynomial,
    report::{DensityPoint, NoiseOrigin, NoiseShare, Parameter},
    solution::{Solution, magnitude},
    stage::Source,
};

/// Boltzmann's constant, J/K (exact, SI Brochure, 9th edition).
pub const BOLTZMANN: f64 = 1.380_649e-23;

/// Elementary charge, C (exact, SI Brochure, 9th edition).
pub const ELEMENTARY_CHARGE: f64 = 1.602_176_634e-19;

/// Peak-to-peak over rms: Gaussian noise exceeds ±3.3 σ for 0.1 % of the time (common practice, no source).
pub const PEAK_TO_PEAK: f64 = 6.6;

/// A noise source with its transfer's numerator.
#[derive(Debug)]
pub(super) struct Generator {
    pub(super) origin: NoiseOrigin,
    pub(super) numerator: Polynomial,
    pub(super) spectrum: Spectrum,
}

#[derive(Clone, Copy, Debug)]
pub(crate) enum Spectrum {
    /// Constant, V² or A² per Hz (scaled by the network's impedance for currents).
    White(f64),
    /// Thermal current of a series R–C: `4kTR·(ωC)²/(1 + (ωRC)²)`; `(4kTR·C², RC)`.
    Series(f64, f64),
    /// White, corner and exponent.
    Flicker(f64, f64, f64),
}

impl Spectrum {
    fn at(self, frequency: f64) -> f64 {
        match self {
            Self::White(level) => level,
            Self::Series(level, tau) => {
                let omega = TAU * frequency;
                level * omega * omega / (1.0 + omega * omega * tau * tau)
            }
            Self::Flicker(level, corner, exponent) => {
                let ratio = corner / frequency;
                let flicker = if (exponent - 1.0).abs() <= 0.0 { ratio } else { libm::pow(ratio, exponent) };
                level * (1.0 + flicker)
            }
        }
    }

    pub(crate) fn at_lanes(self, frequencies: &super::sweep::Lane) -> super::sweep::Lane {
        match self {
            Self::White(level) => [level; super::sweep::LANES],
            Self::Flicker(level, corner, exponent) if (exponent - 1.0).abs() <= 0.0 => frequencies.map(|f| level * (1.0 + corner / f)),
            other => frequencies.map(|f| other.at(f)),
        }
    }
}

/// Whether an amplifier's current noise reaches the output at all.
#[must_use]
pub fn current_noise_counts(solution: &Solution<'_>, amplifier: usize) -> bool {
    let amplifier = solution.model.network.amplifiers[amplifier];
    [amplifier.plus, amplifier.minus].iter().any(|n| !solution.from_current(*n).is_zero())
}

/// Where a source acts.
#[derive(Clone, Copy, Debug)]
pub(crate) enum From {
    /// A current from the second node to the first.
    Between(Node, Node),
    /// A current into a node.
    Into(Node),
    /// A voltage in series with an amplifier's input.
    Input(usize),
}

/// Every source that reaches the load, with its spectrum.
pub(crate) fn sources(solution: &Solution<'_>) -> Vec<(NoiseOrigin, From, Spectrum)> {
    let model = solution.model;
    let scale = model.scale.0;
    let temperature = model.parameters.temperature().map_or(0.0, |slot| solution.values[slot]);
    let thermal = 4.0 * BOLTZMANN * temperature * scale * scale;
    let mut list = Vec::new();
    for element in &model.network.elements {
        let Some(origin) = element.noise else { continue };
        let spectrum = match element.law {
            Law::Resistance(r) if solution.values[r] > 0.0 => Spectrum::White(thermal / solution.values[r]),
            Law::SeriesRc(r, c) => {
                let (r, c) = (solution.values[r], solution.values[c]);
                Spectrum::Series(thermal * r * c * c, r * c)
            }
            _ => continue,
        };
        list.push((origin, From::Between(element.a, element.b), spectrum));
    }
    shot(solution, &mut list);
    for (index, amplifier) in (0u8..).zip(&model.network.amplifiers) {
        let part = |figure| solution.part_of(usize::from(index), figure);
        if let (Some(level), Some(corner)) = (part(PartFigure::NoiseVoltage), part(PartFigure::NoiseVoltageCorner)) {
            let exponent = part(PartFigure::NoiseExponent).unwrap_or(1.0);
            let spectrum = Spectrum::Flicker(level * level, corner, exponent);
            list.push((NoiseOrigin::AmplifierVoltage(index), From::Input(usize::from(index)), spectrum));
        }
        if let (Some(level), Some(corner)) = (part(PartFigure::NoiseCurrent), part(PartFigure::NoiseCurrentCorner)) {
            for (node, origin) in
                [(amplifier.plus, NoiseOrigin::CurrentNonInverting(index)), (amplifier.minus, NoiseOrigin::CurrentInverting(index))]
            {
                if node != GROUND && !solution.from_current(node).is_zero() {
                    list.push((origin, From::Into(node), Spectrum::Flicker(level * level * scale * scale, corner, 1.0)));
                }
            }
        }
    }
    list
}

/// Shot noise `2qI` of photodiodes, at the most light that the signal brings: dark current, the signal's steady part and its peak.
fn shot(solution: &Solution<'_>, list: &mut Vec<(NoiseOrigin, From, Spectrum)>) {
    let model = solution.model;
    let scale = model.scale.0;
    for (input, source) in (0u8..).zip(&model.stage.sources) {
        let Some(Source::Photodiode { .. }) = source else { continue };
        let dark = model.parameters.slot(Parameter::DarkCurrent(input)).map_or(0.0, |slot| solution.values[slot]);
        let light = model.stage.signal_of(usize::from(input)).map_or(0.0, |s| s.dc.abs() + s.peak);
        let node = model.network.input_node(usize::from(input));
        let spectrum = Spectrum::White(2.0 * ELEMENTARY_CHARGE * (dark + light) * scale * scale);
        list.push((NoiseOrigin::SourceShot(input), From::Into(node), spectrum));
    }
}

/// The sources with their transfers' numerators.
pub(super) fn generators(solution: &Solution<'_>) -> Vec<Generator> {
    let numerator = |from| match from {
        From::Between(a, b) => {
            let mut numerator = solution.from_current(a).clone();
            numerator.add_scaled(&solution.from_current(b).0, -1.0);
            numerator
        }
        From::Into(node) => solution.from_current(node).clone(),
        From::Input(amplifier) => solution.from_input(amplifier).clone(),
    };
    let list = sources(solution).into_iter();
    list.map(|(origin, from, spectrum)| Generator { origin, numerator: numerator(from), spectrum }).collect()
}

fn power(solution: &Solution<'_>, generator: &Generator, frequency: f64, below: f64) -> f64 {
    generator.numerator.at(solution.scaled(frequency)).norm_sqr() / below * generator.spectrum.at(frequency)
}

/// All generators together: those with a white or 1/f spectrum summed into polynomials in ω², once for all frequencies.
#[derive(Debug)]
struct Total {
    white: Polynomial,
    flicker: Polynomial,
    others: Vec<Generator>,
}

impl Total {
    fn of(solution: &Solution<'_>) -> Self {
        let mut total = Self { white: Polynomial::default(), flicker: Polynomial::default(), others: Vec::new() };
        for generator in generators(solution) {
            match generator.spectrum {
                Spectrum::White(level) => total.white.add_scaled(&generator.numerator.squared_magnitude(), level),
                Spectrum::Flicker(level, corner, exponent) if (exponent - 1.0).abs() <= 0.0 => {
                    let square = generator.numerator.squared_magnitude();
                    total.white.add_scaled(&square, level);
                    total.flicker.add_scaled(&square, level * corner);
                }
                _ => total.others.push(generator),
            }
        }
        total
    }

    fn at(&self, solution: &Solution<'_>, frequency: f64) -> f64 {
        let omega = solution.scaled(frequency);
        let below = solution.looped().closed.at(omega).norm_sqr();
        let x = omega * omega;
        let sum = self.white.horner(x) + self.flicker.horner(x) / frequency;
        let others: f64 = self.others.iter().map(|g| g.numerator.at(omega).norm_sqr() * g.spectrum.at(frequency)).sum();
        (sum + others) / below
    }
}

/// Density at the load at `frequency`, V/√Hz.
pub fn density(solution: &Solution<'_>, frequency: f64) -> f64 {
    libm::sqrt(Total::of(solution).at(solution, frequency))
}

/// Rms at the load over the stage's band, V; `None` without a band.
pub fn integrated(solution: &Solution<'_>) -> Option<f64> {
    *solution.noise.get_or_init(|| {
        let band = solution.model.stage.band?;
        let total = Total::of(solution);
        Some(libm::sqrt(integrate(solution, band.from, band.to, |f| total.at(solution, f))))
    })
}

/// Shares of the integrated noise by source, largest first.
pub fn shares(solution: &Solution<'_>) -> Vec<NoiseShare> {
    let Some(band) = solution.model.stage.band else { return Vec::new() };
    let list = generators(solution);
    let closed = &solution.looped().closed;
    let mut powers: Vec<(NoiseOrigin, f64)> = Vec::new();
    for generator in &list {
        let rms2 = integrate(solution, band.from, band.to, |f| power(solution, generator, f, closed.at(solution.scaled(f)).norm_sqr()));
        match powers.iter_mut().find(|(o, _)| *o == generator.origin) {
            Some((_, p)) => *p += rms2,
            None => powers.push((generator.origin, rms2)),
        }
    }
    let sum: f64 = powers.iter().map(|(_, p)| p).sum();
    let mut shares: Vec<NoiseShare> =
        powers.iter().map(|&(origin, p)| NoiseShare { origin, rms: libm::sqrt(p), share: if sum > 0.0 { p / sum } else { 0.0 } }).collect();
    shares.sort_by(|a, b| b.share.total_cmp(&a.share));
    shares
}

/// The density's curve, by source in the order of `shares`.
pub fn curve(solution: &Solution<'_>, from: f64, to: f64, points: usize, shares: &[NoiseShare]) -> Vec<DensityPoint> {
    let frequencies: Vec<f64> = super::response::frequencies(from, to, points).collect();
    let sweep = super::sweep::noise(solution, &frequencies);
    let places: Vec<Option<usize>> = sweep.origins.iter().map(|o| shares.iter().position(|s| s.origin == *o)).collect();
    frequencies
        .iter()
        .enumerate()
        .map(|(i, &frequency)| {
            let mut by_source = alloc::vec![0.0; shares.len()];
            for (row, place) in sweep.rows.iter().zip(&places) {
                if let Some(place) = place {
                    by_source[*place] += row[i];
                }
            }
            for p in &mut by_source {
                *p = libm::sqrt(*p);
            }
            DensityPoint { frequency, total: libm::sqrt(sweep.total[i]), by_source }
        })
        .collect()
}

/// `∫ |H|² df / |H(ref)|²` over all frequencies, Hz; infinite where the response does not fall off.
pub fn noise_bandwidth(solution: &Solution<'_>) -> f64 {
    let looped = solution.looped();
    let numerator = solution.load_numerator();
    let degree = |p: &Polynomial| p.0.iter().rposition(|c| c.abs() > 0.0).unwrap_or(0);
    let (n, d) = (degree(numerator), degree(&looped.closed));
    if n >= d {
        return f64::INFINITY;
    }
    let grid = solution.grid();
    let (Some(&low), Some(&high)) = (grid.first(), grid.last()) else { return f64::INFINITY };
    // A zero far out stretches the grid until powers overflow: what the response leaves there is nothing.
    let h = |omega: f64| {
        let power = (numerator.at(omega) / looped.closed.at(omega)).norm_sqr();
        if power.is_finite() { power } else { 0.0 }
    };
    // Below the grid the response is flat; above it, falls with the difference of the degrees.
    #[expect(clippy::cast_precision_loss, reason = "degrees are small")]
    let tail = 1.0 / (2.0 * (d - n) as f64 - 1.0);
    let gain = super::response::reference(solution).gain;
    let reference = gain * gain;
    let (f_low, f_high) = (solution.hertz(low), solution.hertz(high));
    let middle = integrate(solution, f_low, f_high, |f| h(solution.scaled(f)));
    (middle + f_low * h(low) + f_high * h(high) * tail) / reference
}

/// Rms of the signal at the load at its highest frequency, V.
pub fn signal_rms(solution: &Solution<'_>) -> f64 {
    let Some(signal) = solution.model.stage.signal() else { return 0.0 };
    let frequency = signal.frequency.unwrap_or(0.0);
    magnitude(solution.transfer(0, solution.scaled(frequency))) * signal.peak / signal.crest_factor
}

/// A ratio of rms signal to rms noise in bits of an ideal converter.
///
/// # Formula
/// `log2(ratio/√1.5)`: an ideal N-bit converter with a full-scale sine has a ratio of `2^N·√1.5`.
///
/// # Source
/// W. R. Bennett, "Spectra of quantized signals", Bell System Technical Journal 27 (1948), from memory.
#[must_use]
pub fn bits(ratio: f64) -> f64 {
    libm::log2(ratio / libm::sqrt(1.5))
}

/// `∫ f df` between two frequencies, by panels in ln f that end at the network's features.
fn integrate(solution: &Solution<'_>, from: f64, to: f64, mut f: impl FnMut(f64) -> f64) -> f64 {
    if from >= to {
        return 0.0;
    }
    let (low, high) = (libm::log(from), libm::log(to));
    let mut edges: Vec<f64> = alloc::vec![low, high];
    for root in solution.poles() {
        let size = magnitude(*root);
        if size > 0.0 {
            let middle = libm::log(solution.hertz(size));
            // A resonance is as narrow as its damping; a real pole bends the curve over about a decade.
            let width = if root.im == 0.0 { 1.2 } else { (root.re.abs() / size).max(1e-6) };
            let offsets: &[f64] = if root.im == 0.0 { &[0.0] } else { &[-2.0, 0.0, 2.0] };
            for k in offsets {
                let edge = middle + k * width;
                if edge > low && edge < high {
                    edges.push(edge);
                }
            }
        }
    }
    edges.sort_by(f64::total_cmp);
    let mut in_log = |x: f64| {
        let frequency = libm::exp(x);
        f(frequency) * frequency
    };
    let mut stack: Vec<(f64, f64, u32, f64, f64)> = Vec::with_capacity(edges.len() + 8);
    let mut scale = 0.0;
    for e in edges.windows(2).filter(|e| e[1] > e[0]) {
        let (value, error) = kronrod(e[0], e[1], &mut in_log);
        scale += value.abs();
        stack.push((e[0], e[1], 0, value, error));
    }
    let mut sum = 0.0;
    // Bounded work: a smooth integrand needs some tens of panels.
    let mut panels = 0;
    while let Some((a, b, depth, value, error)) = stack.pop() {
        panels += 1;
        if !value.is_finite() {
            return f64::NAN;
        }
        if error <= 1e-10 * scale || depth >= 24 || panels > 20_000 {
            sum += value;
        } else {
            let middle = f64::midpoint(a, b);
            for (a, b) in [(a, middle), (middle, b)] {
                let (value, error) = kronrod(a, b, &mut in_log);
                stack.push((a, b, depth + 1, value, error));
            }
        }
    }
    sum
}

const NODES: [f64; 8] = [
    0.991_455_371_120_812_6,
    0.949_107_912_342_758_5,
    0.864_864_423_359_769_1,
    0.741_531_185_599_394_4,
    0.586_087_235_467_691_1,
    0.405_845_151_377_397_2,
    0.207_784_955_007_898_47,
    0.0,
];
const KRONROD: [f64; 8] = [
    0.022_935_322_010_529_224,
    0.063_092_092_629_978_55,
    0.104_790_010_322_250_18,
    0.140_653_259_715_525_92,
    0.169_004_726_639_267_9,
    0.190_350_578_064_785_4,
    0.204_432_940_075_298_9,
    0.209_482_141_084_727_82,
];
const GAUSS: [f64; 4] = [0.129_484_966_168_869_7, 0.279_705_391_489_276_64, 0.381_830_050_505_118_9, 0.417_959_183_673_469_4];

/// 15-point value and its distance from the 7-point one.
fn kronrod(a: f64, b: f64, f: &mut impl FnMut(f64) -> f64) -> (f64, f64) {
    let (center, half) = (f64::midpoint(a, b), (b - a) / 2.0);
    let (mut fine, mut coarse) = (0.0, 0.0);
    for (i, (&node, &weight)) in NODES.iter().zip(&KRONROD).enumerate() {
        let value = if i == 7 { f(center) } else { f(center - half * node) + f(center + half * node) };
        fine += weight * value;
        if i % 2 == 1 {
            coarse += GAUSS[i / 2] * value;
        }
    }
    (fine * half, ((fine - coarse) * half).abs())
}
