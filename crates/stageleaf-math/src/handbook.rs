//! The closed forms that engineers know, with unit types at their edges: for the working beside the exact values, and as checks.
//!
//! No figure comes from here.

use core::f64::consts::TAU;

use crate::{
    Error,
    analysis::noise::BOLTZMANN,
    units::{Farads, Hertz, Kelvin, Ohms, Volts, VoltsPerRootHertz, VoltsPerSecond},
};

fn positive(what: &'static str, given: f64) -> Result<f64, Error> {
    if given > 0.0 && given.is_finite() { Ok(given) } else { Err(Error::NotPositive { what, given }) }
}

/// The highest frequency at which a sine of peak `amplitude` stays within the slew rate.
///
/// # Formula
/// `f = SR/(2π·Vpk)`: there the steepest slope, `2πf·Vpk`, equals `SR`.
///
/// # Does not apply
/// Small amplitudes, where the bandwidth ends the response first; other waves, whose steepest slope differs.
///
/// # Errors
/// [`Error::NotPositive`] when either is zero, negative or not finite.
///
/// # Source
/// Common practice, no source; derived above.
///
/// # Example
/// ```
/// use stageleaf_math::{handbook::full_power_bandwidth, units::{Volts, VoltsPerSecond}};
///
/// // By hand: 10 V peak at 20 kHz is steepest at 2π · 20 kHz · 10 V = 1.2566 V/µs.
/// let f = full_power_bandwidth(VoltsPerSecond(1.2566e6), Volts(10.0))?;
/// assert!((f.0 - 20e3).abs() < 1.0);
/// # Ok::<(), stageleaf_math::Error>(())
/// ```
pub fn full_power_bandwidth(slew: VoltsPerSecond, amplitude: Volts) -> Result<Hertz, Error> {
    Ok(Hertz(positive("slew", slew.0)? / (TAU * positive("amplitude", amplitude.0)?)))
}

/// The corner of a resistance and a capacitance.
///
/// # Formula
/// `f = 1/(2π·R·C)`.
///
/// # Errors
/// [`Error::NotPositive`] when either is zero, negative or not finite.
///
/// # Source
/// Common practice, no source.
///
/// # Example
/// ```
/// use stageleaf_math::{handbook::corner, units::{Farads, Ohms}};
///
/// // By hand: 1/(2π · 10 kΩ · 1 nF) = 15.9 kHz.
/// assert!((corner(Ohms(1e4), Farads(1e-9))?.0 - 15_915.5).abs() < 0.1);
/// # Ok::<(), stageleaf_math::Error>(())
/// ```
pub fn corner(resistance: Ohms, capacitance: Farads) -> Result<Hertz, Error> {
    Ok(Hertz(1.0 / (TAU * positive("resistance", resistance.0)? * positive("capacitance", capacitance.0)?)))
}

/// The closed loop's edge by the gain-bandwidth product.
///
/// # Formula
/// `f = GBW/NG`.
///
/// # Does not apply
/// Where higher poles, capacitances or a load take phase: the exact edge then differs, near low margins a lot.
///
/// # Errors
/// [`Error::NotPositive`] when either is zero, negative or not finite.
///
/// # Source
/// Common practice, no source.
///
/// # Example
/// ```
/// use stageleaf_math::{handbook::closed_loop_edge, units::Hertz};
///
/// assert_eq!(closed_loop_edge(Hertz(10e6), 20.0)?, Hertz(500e3));
/// # Ok::<(), stageleaf_math::Error>(())
/// ```
pub fn closed_loop_edge(gain_bandwidth: Hertz, noise_gain: f64) -> Result<Hertz, Error> {
    Ok(Hertz(positive("gain_bandwidth", gain_bandwidth.0)? / positive("noise_gain", noise_gain)?))
}

/// The thermal noise of a resistance, one-sided.
///
/// # Formula
/// `√(4kTR)`.
///
/// # Errors
/// [`Error::NotPositive`] when either is zero, negative or not finite.
///
/// # Source
/// H. Nyquist, "Thermal agitation of electric charge in conductors", Phys. Rev. 32 (1928), from memory; k: SI Brochure, 9th edition.
///
/// # Example
/// ```
/// use stageleaf_math::{handbook::thermal_noise, units::{Kelvin, Ohms}};
///
/// // 1 kΩ at 300 K: 4.07 nV/√Hz.
/// assert!((thermal_noise(Ohms(1e3), Kelvin(300.0))?.0 - 4.0704e-9).abs() < 1e-13);
/// # Ok::<(), stageleaf_math::Error>(())
/// ```
pub fn thermal_noise(resistance: Ohms, temperature: Kelvin) -> Result<VoltsPerRootHertz, Error> {
    let (r, t) = (positive("resistance", resistance.0)?, positive("temperature", temperature.0)?);
    Ok(VoltsPerRootHertz(libm::sqrt(4.0 * BOLTZMANN * t * r)))
}
