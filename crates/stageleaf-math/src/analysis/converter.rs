//! A sampling converter at the output: what is left of its kick, the bits that remain, the room in its input range.
//!
//! # Formula
//! At the start of acquisition the sampling capacitor `Cs` is connected while it still holds another voltage; at the worst the two
//! are the whole input range apart. That is the charge `FS·Cs`, put at once into the network with `Cs` (and the switch's resistance)
//! in it: `e(t) = FS·Cs·L⁻¹{Z(s)}`, `Z` the impedance at the sampling capacitor. With an ideal amplifier and without switch resistance
//! the charge is shared with the shunt capacitor, and `e = FS·Cs/(Cs + Csh)·e^(−t/τ)`, `τ = R·(Cs + Csh)`. The acquisition error is the
//! largest `|e|` from the end of the acquisition time on, so that a zero crossing of a ringing stage makes none small.
//!
//! Effective bits: `log2(FS/(√12·σ))` with `σ² = noise² + converter noise² + LSB²/12`: an ideal converter keeps its own bits.
//!
//! # Units
//! V; bits.
//!
//! # Does not apply
//! The settling is linear. Where the kick, on top of the signal, asks an amplifier for more than its slew rate or its current limit,
//! the error is not judged. What the signal itself changes during the acquisition is not in it. Effective bits leave out the
//! converter's nonlinearity and aliasing beyond the stated band; the acquisition error, being proportional to the step between two
//! samples, is no noise and is judged by itself.
//!
//! # Source
//! The kick: derived here. Effective bits: IEEE Std 1241 and 1057, `SINAD = 6.02 dB·N + 1.76 dB` for a full-scale sine, from memory;
//! quantisation noise: W. R. Bennett, "Spectra of quantized signals", Bell System Technical Journal 27 (1948), from memory. Checked in
//! `tests/outside/`.

use alloc::vec::Vec;

use num_complex::Complex64;

use super::{
    dc,
    modes::{Modes, at_pin},
    noise, swing,
};
use crate::{
    part::PartFigure,
    report::{Outcome, Parameter},
    solution::{Solution, magnitude},
};

/// What a kick of one volt does.
#[derive(Clone, Debug)]
pub struct Kick {
    /// At the sampling capacitor.
    error: Modes,
    /// By amplifier: the steepest slope of its controlled source, V/s, and the largest current out of its pin, A.
    amplifiers: Vec<(f64, f64)>,
    /// Whether the network with the sampling capacitor in it oscillates.
    oscillates: bool,
}

/// What a kick of one volt does in this build's network.
pub fn kick<'s>(solution: &'s Solution<'_>) -> &'s Kick {
    let solution = solution.network();
    solution.kick.get_or_init(|| {
        let sampling = solution.model.sampling();
        let network = &sampling.network;
        let (voltages, closed) = solution.driven(sampling);
        let (ohms, omega) = solution.model.scale;
        let charge = solution.model.parameters.slot(Parameter::SampleCapacitance).map_or(0.0, |slot| solution.values[slot]);
        let (poles, mut residues) = Modes::of(&voltages.iter().collect::<Vec<_>>(), &closed, closed.roots(None), omega);
        for residue in residues.iter_mut().flatten() {
            *residue *= ohms * charge;
        }
        let sum = |terms: &[Complex64]| Modes(poles.iter().copied().zip(terms.iter().copied()).collect());
        let at = |node: crate::network::Node, i: usize| residues[usize::from(node.0)][i];
        let oscillates = poles.iter().any(|p| p.re > 1e-13 * magnitude(*p));
        let amplifiers = if oscillates { &[][..] } else { &network.amplifiers };
        let amplifiers = amplifiers
            .iter()
            .enumerate()
            .map(|(index, _)| {
                let (behind, currents) = at_pin(solution, network, index, &poles, at);
                (sum(&behind).slope().largest_from(0.0), sum(&currents).largest_from(0.0))
            })
            .collect();
        Kick { error: sum(&residues[usize::from(network.hold.0)]), amplifiers, oscillates }
    })
}

/// The largest error at the sampling capacitor from the end of the acquisition time on.
pub fn acquisition_error(solution: &Solution<'_>) -> Outcome {
    let converter = &solution.model.stage.converter;
    let (Some(range), Some(time)) = (converter.full_scale, converter.acquisition_time) else { return Outcome::Undetermined(Vec::new()) };
    let kick = kick(solution);
    if kick.oscillates {
        return Outcome::Oscillates;
    }
    let full_scale = range[1] - range[0];
    for (amplifier, (slope, current)) in kick.amplifiers.iter().enumerate() {
        let drive = &swing::drives(solution)[amplifier];
        if slope * full_scale + swing::slope(solution, amplifier) > swing::slew_rate(solution, amplifier) {
            return Outcome::OutOfReach("the sampling kick is faster than the amplifier slews");
        }
        let limit = solution.part_of(amplifier, PartFigure::CurrentLimit).unwrap_or(f64::INFINITY);
        if current * full_scale + drive.i0.abs() + drive.ip > limit {
            return Outcome::OutOfReach("the sampling kick reaches the output current limit");
        }
    }
    Outcome::Value(full_scale * kick.error.largest_from(time))
}

/// Effective number of bits.
pub fn enob(solution: &Solution<'_>) -> Outcome {
    let converter = &solution.model.stage.converter;
    let (Some(range), Some(bits), Some(rms)) = (converter.full_scale, converter.bits, noise::integrated(solution)) else {
        return Outcome::DoesNotApply("the band's edges are the same");
    };
    let full_scale = range[1] - range[0];
    let step = full_scale / libm::exp2(bits);
    let own = converter.noise.unwrap_or(0.0);
    let power = rms * rms + own * own + step * step / 12.0;
    Outcome::Value(libm::log2(full_scale / libm::sqrt(12.0 * power)))
}

/// Room between the voltage at the converter's input, offset included, and the ends of its input range.
pub fn full_scale_margin(solution: &Solution<'_>) -> Outcome {
    let Some(range) = solution.model.stage.converter.full_scale else { return Outcome::Undetermined(Vec::new()) };
    let offset = match &dc::budget(solution).total {
        Outcome::Value(v) => *v,
        other => return other.clone(),
    };
    let load = solution.model.network.load;
    let middle = swing::steady(solution, load);
    let moving: f64 = swing::levels(solution)
        .filter(|l| l.peak > 0.0)
        .map(|l| magnitude(solution.voltage(l.drive, load, solution.scaled(l.frequency))) * l.peak)
        .sum();
    Outcome::Value((range[1] - middle).min(middle - range[0]) - moving - offset)
}
