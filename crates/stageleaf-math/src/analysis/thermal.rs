//! Heat: supply current, dissipation, junction temperature, power in the resistors.
//!
//! # Formula
//! With pin voltage `V0 + Vp·cos θ` and current `I0 + Ip·cos(θ + φ)`, the positive rail gives the current while it flows out and
//! the negative one while it flows in: `P = V₊·⟨I⁺⟩ − V₋·⟨I⁻⟩ − ⟨V·I⟩`, all means in closed form. The quiescent current's
//! power is added in full. The amplitude is the worst up to the stated one: with a resistive load the peak lies inside, at
//! `2·Vs/π` for a symmetrical supply. Junction: `Tj = Ta + θja·P`.
//!
//! # Does not apply
//! Class-AB overlap: counting the quiescent power in full is slightly high.
//!
//! # Source
//! Class-B dissipation: A. Sedra, K. Smith, *Microelectronic Circuits*, output stages, from memory; derived here for any phase
//! and DC part.

use alloc::vec::Vec;
use core::f64::consts::PI;

use super::swing::{Drive, drives, levels};
use crate::{
    network::{Law, dense::admittance},
    part::PartFigure,
    report::{Need, NoiseOrigin, Outcome},
    solution::{Solution, magnitude},
};

/// Power figures of a build.
#[derive(Clone, Debug)]
pub struct Power {
    /// Quiescent and mean load current from the positive supply, A.
    pub supply_current: Outcome,
    /// W.
    pub dissipation: Outcome,
    /// K.
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

/// The most heat over amplitudes up to the drive's own.
fn worst_heat(drive: &Drive, high: f64, low: f64) -> f64 {
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

/// Power figures: of the hottest package, if the stage's amplifiers do not fit into one.
pub fn power<'s>(solution: &'s Solution<'_>) -> &'s Power {
    solution.power.get_or_init(|| {
        let model = solution.model;
        let lacking = |need: Need| Outcome::Undetermined(alloc::vec![need]);
        let count = solution.amplifiers();
        let quiescent = |a: usize| solution.part_of(a, PartFigure::SupplyCurrent);
        if (0..count).any(|a| quiescent(a).is_none()) {
            let outcome = lacking(Need::Part(PartFigure::SupplyCurrent));
            return Power { supply_current: outcome.clone(), dissipation: outcome.clone(), junction: outcome };
        }
        let drives = drives(solution);
        // A package's unused amplifiers draw their quiescent current too.
        let in_package = |a: usize| usize::try_from(model.stage.part_of(a).amplifiers.unwrap_or(1).max(1)).unwrap_or(1);
        let spare = if model.stage.parts.is_empty() { in_package(0).saturating_sub(count) } else { 0 };
        #[expect(clippy::cast_precision_loss, reason = "a few amplifiers")]
        let idle = quiescent(0).unwrap_or(0.0) * spare as f64;
        let drawn: f64 = (0..count).map(|a| quiescent(a).unwrap_or(0.0) + halves(drives[a].i0, drives[a].ip).0).sum();
        let supply_current = Outcome::Value(drawn + idle);
        let Some((positive, negative)) = model.parameters.supply() else {
            let outcome = lacking(Need::Supply);
            return Power { supply_current, dissipation: outcome.clone(), junction: outcome };
        };
        let (high, low) = (solution.values[positive], solution.values[negative]);
        let mut heat: Vec<f64> =
            (0..count).map(|a| quiescent(a).unwrap_or(0.0) * (high - low) + worst_heat(&drives[a], high, low)).collect();
        heat.sort_by(|a, b| b.total_cmp(a));
        let total = heat.iter().take(in_package(0)).sum::<f64>() + idle * (high - low);
        let junction = match (solution.part(PartFigure::JunctionToAmbient), model.parameters.temperature()) {
            (None, _) => lacking(Need::Part(PartFigure::JunctionToAmbient)),
            (_, None) => lacking(Need::Ambient),
            (Some(resistance), Some(slot)) => Outcome::Value(solution.values[slot] + resistance * total),
        };
        Power { supply_current, dissipation: Outcome::Value(total), junction }
    })
}

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
