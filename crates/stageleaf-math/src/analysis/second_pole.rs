//! The second pole of an amplifier from a stated phase margin and its conditions.
//!
//! # Formula
//! `T(s) = A(s)/gain · Z_L/(R_o + Z_L)`; the pole is where the phase of `T` at `|T| = 1` leaves the stated margin. The output
//! resistance and the stated load take their share of the phase; the pole answers only for the rest.
//!
//! # Does not apply
//! When output resistance and load alone leave less than the stated margin: then there is no such pole and `None` is the answer.
//!
//! # Source
//! Derived here.

use core::f64::consts::{FRAC_PI_2, TAU};

use num_complex::Complex64;

use crate::part::{Part, PartFigure};

/// The pole in Hz.
#[must_use]
pub fn solve(part: &Part) -> Option<f64> {
    let stated = part.phase_margin.as_ref()?;
    let nominal = |figure: PartFigure| part.rating(figure).nominal(figure.worse());
    let (open_loop, gbw, resistance) = (nominal(PartFigure::OpenLoop)?, nominal(PartFigure::Gbw)?, nominal(PartFigure::OutputResistance)?);
    let load = |s: Complex64| {
        let y = s * stated.load_capacitance.unwrap_or(0.0) + stated.load_resistance.map_or(0.0, |r| 1.0 / r);
        Complex64::new(1.0, 0.0) / (y * resistance + 1.0)
    };
    let loop_gain = |omega: f64, pole: f64| {
        let s = Complex64::new(0.0, omega);
        let a = Complex64::new(open_loop, 0.0) / (s * (open_loop / (TAU * gbw)) + 1.0) / (s / (TAU * pole) + 1.0);
        a * load(s) / stated.gain
    };
    let margin = |pole: f64| {
        let (mut low, mut high) = (libm::log(gbw) - 30.0, libm::log(gbw) + 5.0);
        for _ in 0..80 {
            let middle = f64::midpoint(low, high);
            if loop_gain(TAU * libm::exp(middle), pole).norm_sqr() > 1.0 { low = middle } else { high = middle }
        }
        let t = loop_gain(TAU * libm::exp(low), pole);
        libm::atan2(-t.im, -t.re)
    };
    if stated.margin >= FRAC_PI_2 || margin(gbw * 1e6) < stated.margin || margin(gbw * 1e-3) > stated.margin {
        return None;
    }
    let (mut low, mut high) = (libm::log(gbw * 1e-3), libm::log(gbw * 1e6));
    for _ in 0..80 {
        let middle = f64::midpoint(low, high);
        if margin(libm::exp(middle)) < stated.margin { low = middle } else { high = middle }
    }
    Some(libm::exp(f64::midpoint(low, high)))
}
