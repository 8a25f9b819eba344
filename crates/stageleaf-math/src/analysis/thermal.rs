//! Heat: supply current, dissipation, junction temperature, power in the resistors.
//!
//! # Formula
//! With pin voltage `V0 + Vp·cos θ` and current `I0 + Ip·cos(θ + φ)`, the positive rail gives the current while it flows out and
//! the negative one while it flows in: `P = V₊·⟨I⁺⟩ − V₋·⟨I⁻⟩ − ⟨V·I⟩`, all means in closed form. The quiescent current's
//! power is added in full. The amplitude is the worst up to the stated one: with a resistive load the peak lies inside, at
//! `2·Vs/π` for a symmetrical supply. Beyond the output current limit, where the part states it, the signal is not delivered: the
//! current then is the limit's, half of the time each way, and none of its power reaches the load.
//!
//! Junction: the least `Tj` that solves `Tj = Ta + θja·(P + Σ 2·Ib(Tj)·(V₊ − V₋))`. Bias currents that double with temperature flow
//! from rail to rail at most, and heat the junction on which they depend. Where no solution lies below [`HOTTEST`], there is no
//! steady temperature: what depends on it has no value either.
//!
//! Amplifiers of one part share packages, the hottest ones together; a part of its own (`[parts]`) stands in a package of its own.
//!
//! # Does not apply
//! Class-AB overlap: counting the quiescent power in full is slightly high. What the DC error makes in the load counts as none.
//!
//! # Source
//! Class-B dissipation: A. Sedra, K. Smith, *Microelectronic Circuits*, output stages, from memory; derived here for any phase
//! and DC part. The junction's equation has a closed form in Lambert's W for one amplifier: `tests/outside/thermal.rs`.

use alloc::vec::Vec;
use core::f64::consts::PI;

use super::{
    dc::DATA_SHEET_TEMPERATURE,
    swing::{Drive, drives, levels},
    switching,
};
use crate::{
    network::{Law, dense::admittance},
    part::PartFigure,
    report::{Need, NoiseOrigin, Outcome},
    solution::{Solution, magnitude},
};

/// No junction works at this temperature, K: 300 °C (common practice, no source).
pub const HOTTEST: f64 = 573.15;

/// Power figures of a build.
#[derive(Clone, Debug)]
pub struct Power {
    /// Quiescent and mean load current from the positive supply, A.
    pub supply_current: Outcome,
    /// Of every amplifier's package.
    pub packages: Vec<Package>,
}

/// The package in which an amplifier stands.
#[derive(Clone, Debug)]
pub struct Package {
    /// Its heat, W.
    pub dissipation: Outcome,
    /// Its junction temperature, K.
    pub junction: Outcome,
}

/// Means of a current's positive and negative parts.
fn halves(i0: f64, ip: f64) -> (f64, f64) {
    if ip <= i0.abs() {
        return (i0.max(0.0), (-i0).max(0.0));
    }
    let angle = libm::acos(-i0 / ip);
    let positive = (i0 * angle + ip * libm::sin(angle)) / PI;
    (positive, positive - i0)
}

/// Heat in the output stage for a drive between two rails, W.
#[must_use]
pub fn output_stage(drive: &Drive, amplitude: f64, high: f64, low: f64) -> f64 {
    let (vp, ip) = (drive.vp * amplitude, drive.ip * amplitude);
    let (sourced, sunk) = halves(drive.i0, ip);
    high * sourced - low * sunk - drive.v0 * drive.i0 - 0.5 * vp * ip * drive.phase.0
}

/// What a drive leaves of itself within an output current limit: a factor on its alternating part, if that has to give way.
fn within(drive: &Drive, limit: Option<f64>) -> Option<(f64, f64)> {
    let limit = limit.filter(|l| drive.i0.abs() + drive.ip > *l)?;
    Some((limit, if drive.ip > 0.0 { ((limit - drive.i0.abs()) / drive.ip).max(0.0) } else { 0.0 }))
}

/// Mean current from the positive rail, A.
fn sourced(drive: &Drive, limit: Option<f64>) -> f64 {
    match within(drive, limit) {
        None => halves(drive.i0, drive.ip).0,
        Some((limit, _)) if drive.i0.abs() >= limit => {
            if drive.i0 > 0.0 {
                limit
            } else {
                0.0
            }
        }
        Some((limit, factor)) => halves(drive.i0, drive.ip * factor).0.max(limit / 2.0),
    }
}

/// The most heat over amplitudes up to the drive's own, within an output current limit.
fn worst_heat(drive: &Drive, high: f64, low: f64, limit: Option<f64>) -> f64 {
    let Some((limit, factor)) = within(drive, limit) else { return worst_delivered(drive, high, low) };
    let mut least = *drive;
    (least.vp, least.ip) = (drive.vp * factor, drive.ip * factor);
    let steady = (limit / drive.i0.abs()).min(1.0);
    (least.v0, least.i0) = (drive.v0 * steady, drive.i0 * steady);
    worst_delivered(&least, high, low).max(if factor > 0.0 { limit * (high - low) / 2.0 } else { 0.0 })
}

/// The most heat over amplitudes up to the drive's own.
fn worst_delivered(drive: &Drive, high: f64, low: f64) -> f64 {
    let heat = |amplitude: f64| output_stage(drive, amplitude, high, low);
    let ends = heat(0.0).max(heat(1.0));
    if drive.i0.abs() <= 0.0 {
        // Without a DC part it is k1·a − k2·a².
        let (k1, k2) = ((high - low) * drive.ip / PI, 0.5 * drive.vp * drive.ip * drive.phase.0);
        let inside = k1 / (2.0 * k2);
        return if inside > 0.0 && inside < 1.0 { ends.max(heat(inside)) } else { ends };
    }
    // Concave in the amplitude: a golden section.
    const RATIO: f64 = 0.618_033_988_749_894_9;
    let (mut a, mut b) = (0.0, 1.0);
    let (mut x, mut y) = (1.0 - RATIO, RATIO);
    let (mut fx, mut fy) = (heat(x), heat(y));
    for _ in 0..26 {
        if fx > fy {
            b = y;
            (y, fy) = (x, fx);
            x = b - RATIO * (b - a);
            fx = heat(x);
        } else {
            a = x;
            (x, fx) = (y, fy);
            y = a + RATIO * (b - a);
            fy = heat(y);
        }
    }
    ends.max(fx).max(fy)
}

/// Power figures.
pub fn power<'s>(solution: &'s Solution<'_>) -> &'s Power {
    solution.power.get_or_init(|| {
        let model = solution.model;
        let count = solution.amplifiers();
        let lacking = |need: Need| Outcome::Undetermined(alloc::vec![need]);
        let alike = |dissipation: Outcome, junction: Outcome| alloc::vec![Package { dissipation, junction }; count];
        let quiescent = |a: usize| solution.part_of(a, PartFigure::SupplyCurrent);
        if (0..count).any(|a| quiescent(a).is_none()) {
            let outcome = lacking(Need::Part(PartFigure::SupplyCurrent));
            return Power { supply_current: outcome.clone(), packages: alike(outcome.clone(), outcome) };
        }
        let limit = |a: usize| solution.part_of(a, PartFigure::CurrentLimit);
        // A comparator's output rests at one of its levels, at one of these ends of its signal.
        let rests;
        let drives = if model.stage.kind.switches() {
            rests = match switching::drives(solution) {
                Ok(rests) => rests,
                Err(outcome) => return Power { supply_current: outcome.clone(), packages: alike(outcome.clone(), outcome) },
            };
            &rests[..]
        } else {
            drives(solution)
        };
        let states = if model.stage.kind.switches() { drives.len() } else { 1 };
        // The drives of an amplifier: of a comparator's only one, all of them, the worst of which counts.
        let worst_of = |a: usize, of: &dyn Fn(&Drive) -> f64| drives[a..a + states].iter().map(of).fold(f64::NEG_INFINITY, f64::max);
        let packages = packages(solution);
        // A package's unused amplifiers draw their quiescent current too.
        #[expect(clippy::cast_precision_loss, reason = "a few amplifiers")]
        let idle = |p: &(Vec<usize>, usize)| quiescent(p.0[0]).unwrap_or(0.0) * p.1.saturating_sub(p.0.len()) as f64;
        let drawn: f64 = (0..count).map(|a| quiescent(a).unwrap_or(0.0) + worst_of(a, &|d| sourced(d, limit(a)))).sum();
        let supply_current = Outcome::Value(drawn + packages.iter().map(idle).sum::<f64>());
        let Some((positive, negative)) = model.parameters.supply() else {
            let outcome = lacking(Need::Supply);
            return Power { supply_current, packages: alike(outcome.clone(), outcome) };
        };
        let (high, low) = (solution.values[positive], solution.values[negative]);
        let heat: Vec<f64> =
            (0..count).map(|a| quiescent(a).unwrap_or(0.0) * (high - low) + worst_of(a, &|d| worst_heat(d, high, low, limit(a)))).collect();
        let mut found = alike(Outcome::Value(0.0), Outcome::Value(0.0));
        for mut package in packages {
            // The hottest ones together, whichever they are.
            if package.0.len() > package.1 {
                package.0.sort_by(|&a, &b| heat[b].total_cmp(&heat[a]));
            }
            let inside = &package.0[..package.0.len().min(package.1)];
            let total = inside.iter().map(|&a| heat[a]).sum::<f64>() + idle(&package) * (high - low);
            let here = Package { dissipation: Outcome::Value(total), junction: junction(solution, inside, total, high - low) };
            for &a in &package.0 {
                found[a].clone_from(&here);
            }
        }
        Power { supply_current, packages: found }
    })
}

/// A figure of one amplifier's package, else the greatest over all; what one lacks, the greatest lacks.
pub fn hottest(solution: &Solution<'_>, amplifier: Option<usize>, of: fn(&Package) -> &Outcome) -> Outcome {
    let packages = &power(solution).packages;
    if let Some(package) = amplifier.and_then(|a| packages.get(a)) {
        return of(package).clone();
    }
    let mut greatest = 0.0_f64;
    for package in packages {
        match of(package) {
            Outcome::Value(here) => greatest = greatest.max(*here),
            other => return other.clone(),
        }
    }
    Outcome::Value(greatest)
}

/// Amplifiers by package, with how many one holds: those of the stage's part together, each with a part of its own alone.
fn packages(solution: &Solution<'_>) -> Vec<(Vec<usize>, usize)> {
    let stage = solution.model.stage;
    let holds = |a: usize| usize::try_from(stage.part_of(a).amplifiers.unwrap_or(1).max(1)).unwrap_or(1);
    let (own, shared): (Vec<usize>, Vec<usize>) =
        (0..solution.amplifiers()).partition(|a| stage.parts.iter().any(|(number, _)| *number == a + 1));
    let mut list: Vec<_> = own.into_iter().map(|a| (alloc::vec![a], holds(a))).collect();
    if let Some(&first) = shared.first() {
        list.push((shared, holds(first)));
    }
    list
}

/// Junction temperature of a package with these amplifiers and this heat without their bias currents'.
///
/// The excess of `Ta + θja·P(T)` over `T` falls and then rises, convex: Newton's steps from the ambient temperature close in on its
/// first zero from below and never pass it. Where it starts to rise first, it has none.
fn junction(solution: &Solution<'_>, inside: &[usize], total: f64, span: f64) -> Outcome {
    let resistance = match solution.part_of(inside[0], PartFigure::JunctionToAmbient) {
        Some(resistance) => resistance,
        None => return Outcome::Undetermined(alloc::vec![Need::Part(PartFigure::JunctionToAmbient)]),
    };
    let Some(slot) = solution.model.parameters.temperature() else { return Outcome::Undetermined(alloc::vec![Need::Ambient]) };
    let base = solution.values[slot] + resistance * total;
    let doubling: Vec<(f64, f64)> = inside
        .iter()
        .filter_map(|&a| {
            let (bias, step) = (solution.part_of(a, PartFigure::BiasCurrent)?, solution.part_of(a, PartFigure::BiasDoubling)?);
            (bias > 0.0).then_some((2.0 * bias * span * resistance, step))
        })
        .collect();
    let mut at = base;
    for _ in 0..STEPS {
        if at.is_nan() || at > HOTTEST {
            return Outcome::NoSteadyTemperature;
        }
        let (mut excess, mut slope) = (base - at, -1.0);
        for &(kelvin, step) in &doubling {
            let rise = kelvin * libm::exp2((at - DATA_SHEET_TEMPERATURE) / step);
            excess += rise;
            slope += rise * core::f64::consts::LN_2 / step;
        }
        if excess <= 1e-14 * at {
            break;
        }
        if slope.is_nan() || slope >= 0.0 {
            return Outcome::NoSteadyTemperature;
        }
        at -= excess / slope;
    }
    Outcome::Value(at)
}

/// Newton's steps at most: some five as a rule, one for each bit where two solutions nearly coincide.
const STEPS: usize = 60;

/// Power in every resistor of the stage: whose it is, W.
pub fn resistors<'s>(solution: &'s Solution<'_>) -> impl Iterator<Item = (NoiseOrigin, f64)> + 's {
    let model = solution.model;
    let crest = model.stage.signal().map_or(1.0, |s| s.crest_factor);
    model.network.elements.iter().filter_map(move |element| {
        let origin = element.noise.filter(|o| matches!(o, NoiseOrigin::Component(_)))?;
        let (mut rms, mut steady, mut series) = (0.0, 0.0, 0.0);
        for level in levels(solution) {
            let across = |w: f64| solution.voltage(level.drive, element.a, w) - solution.voltage(level.drive, element.b, w);
            let volts = magnitude(across(solution.scaled(level.frequency))) * level.peak / crest;
            rms += volts;
            steady += across(0.0).re * level.dc;
            let s = num_complex::Complex64::new(0.0, core::f64::consts::TAU * level.frequency);
            series += volts * magnitude(admittance(element.law, &solution.values, s));
        }
        match element.law {
            Law::Resistance(r) if solution.values[r] > 0.0 => Some((origin, (rms * rms + steady * steady) / solution.values[r])),
            Law::SeriesRc(r, _) => Some((origin, series * series * solution.values[r])),
            _ => None,
        }
    })
}

/// The resistor with the most power.
pub fn hottest_resistor(solution: &Solution<'_>) -> Option<(NoiseOrigin, f64)> {
    resistors(solution).max_by(|a, b| a.1.total_cmp(&b.1))
}
