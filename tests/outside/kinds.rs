//! Handbook rows about the kinds with several inputs, currents, integrals and slopes, and about the filters.

use core::f64::consts::{FRAC_1_SQRT_2, TAU};

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    part::{PartFigure, Rating},
    report::{NoiseOrigin, Outcome},
    stage::{Source, Span, Stage, Toleranced},
};

use crate::{
    ledger::Ledger,
    setup::{Amplifier, Complete, ask, density_by_source, figure, map, of_source, outcome, report, solved, stage},
    swing::between_rails,
    table::{Row, Rows},
};

/// The rows.
pub const TABLE: &str = include_str!("kinds.toml");

/// Open-loop gain whose dominant pole is so low that the loop is an integrator to nine digits.
const INTEGRATOR: f64 = 1e10;

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    shot_noise(rows.row("C007"), ledger);
    common_mode(&rows, ledger);
    photodiode_noise(rows.row("C066"), ledger);
    feedback_capacitor(rows.row("C068"), ledger);
    integrator(rows.row("C085"), ledger);
    differentiator(rows.row("C087"), ledger);
    bare_differentiator(rows.row("C088"), ledger);
    filters(&rows, ledger);
    inner_clipping(rows.row("C152"), ledger);
}

fn transimpedance(amplifier: &Amplifier, ohms: f64, farads: f64, dark_current: f64) -> Stage {
    let mut stage = stage(Kind::Transimpedance, amplifier.part()).with("Rf", ohms);
    let [capacitance, dark_current] = [farads, dark_current].map(Toleranced::exact);
    stage.sources = vec![Some(Source::Photodiode { capacitance, shunt_resistance: None, dark_current: Some(dark_current) })];
    stage
}

fn shot_noise(row: &Row, ledger: &mut Ledger) {
    let (current, ohms) = (row.input("I_A"), 1e5);
    let stage = transimpedance(&Amplifier::ideal(), ohms, 1e-12, current).at(row.input("T_K"));
    let shares = density_by_source(&stage, 1.0);
    let shot = of_source(&shares, NoiseOrigin::SourceShot(0));
    let thermal = of_source(&shares, NoiseOrigin::Component("Rf"));
    row.check(ledger, "in_shot", Figure::NoiseDensityAt, &Outcome::Value(shot / ohms));
    // Shot over thermal power is I·R/(2kT/q): what the current has to drop for both to be equal.
    let equal = current * ohms * (thermal / shot) * (thermal / shot);
    row.check(ledger, "V_equal", Figure::NoiseDensityAt, &Outcome::Value(equal));
    row.check(ledger, "VT", Figure::NoiseDensityAt, &Outcome::Value(equal / 2.0));
}

/// Difference and common-mode gain of a difference stage.
fn gains(values: [f64; 4]) -> (f64, f64) {
    let names = ["R1", "R2", "R3", "R4"];
    let bare = stage(Kind::Difference, Amplifier::ideal().part());
    let stage = names.iter().zip(values).fold(bare, |stage, (name, value)| stage.with(name, value));
    solved(&stage, |s| (s.dc_gain(0), s.dc_gain(1)))
}

/// Largest common-mode gain and least rejection in dB over the sixteen corners.
fn worst_corner(values: [f64; 4], tolerance: f64) -> (f64, f64) {
    let corners = (0..16u32).map(|corner| {
        let mut moved = values;
        for (bit, value) in moved.iter_mut().enumerate() {
            *value *= if corner >> bit & 1 == 1 { 1.0 + tolerance } else { 1.0 - tolerance };
        }
        let (difference, common) = gains(moved);
        (common.abs(), 20.0 * libm::log10((difference / common).abs()))
    });
    corners.fold((0.0, f64::INFINITY), |(gain, rejection), (g, r)| (f64::max(gain, g), f64::min(rejection, r)))
}

fn common_mode(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C026");
    let values = ["R1_ohm", "R2_ohm", "R3_ohm", "R4_ohm"].map(|name| row.input(name));
    row.check(ledger, "Ad", Figure::Gain, &Outcome::Value(gains(values).0));
    let (gain, rejection) = worst_corner(values, row.input("tol"));
    row.check(ledger, "Acm_worst_exact", Figure::Gain, &Outcome::Value(gain));
    row.check(ledger, "CMRR_worst_exact", Figure::Gain, &Outcome::Value(rejection));
    // The engine's own worst case, with an amplifier whose rejection is beyond all question.
    let mut part = Amplifier::ideal().part();
    part.state(PartFigure::Cmrr, Rating::typical(1e15));
    let names = ["R1", "R2", "R3", "R4"];
    let toleranced = names
        .iter()
        .zip(values)
        .fold(stage(Kind::Difference, part), |stage, (name, value)| stage.with_tolerance(name, value, row.input("tol")));
    let found = report(&toleranced, &[]);
    let range = found.figures.iter().find(|f| f.query.figure == Figure::StageCmrr).and_then(|f| f.range);
    let least = range.map_or(Outcome::DoesNotApply("the rejection has no range"), |(low, _)| Outcome::Value(20.0 * libm::log10(low)));
    row.check(ledger, "CMRR_worst_exact", Figure::StageCmrr, &least);

    let row = rows.row("C078");
    for (tolerance, name) in row.inputs("tol").into_iter().zip(["exact_0.01", "exact_0.001"]) {
        row.check(ledger, name, Figure::Gain, &Outcome::Value(worst_corner([1e4; 4], tolerance).1));
    }
    let (difference, common) = gains([1e4, 1.001e4, 1e4, 1e4]);
    row.check(ledger, "single_resistor_0.1pct", Figure::Gain, &Outcome::Value(20.0 * libm::log10((difference / common).abs())));
}

fn photodiode_noise(row: &Row, ledger: &mut Ledger) {
    let amplifier = Amplifier { voltage_noise: row.input("en"), ..Amplifier::one_pole(INTEGRATOR, row.input("fu_hz")) };
    // From so low to so high that less than 1e-5 of the power is missing.
    let stage = transimpedance(&amplifier, row.input("R2_ohm"), row.input("C1_F"), 0.0)
        .with("Cf", row.expected("C2"))
        .at(row.input("T_K"))
        .over(1e-2, 1e13);
    let report = report(&stage, &[Figure::Bandwidth, Figure::PhaseMargin].map(Query::of));
    row.check(ledger, "f3dB_exact", Figure::Bandwidth, &outcome(&report, Query::of(Figure::Bandwidth)));
    row.check(ledger, "pm_exact", Figure::PhaseMargin, &map(outcome(&report, Query::of(Figure::PhaseMargin)), f64::to_degrees));
    let share = |origin| report.noise_shares.iter().find(|s| s.origin == origin).map_or(0.0, |s| s.rms);
    row.check(ledger, "vn_en_exact", Figure::OutputNoise, &Outcome::Value(share(NoiseOrigin::AmplifierVoltage(0))));
    row.check(ledger, "vn_R2_exact", Figure::OutputNoise, &Outcome::Value(share(NoiseOrigin::Component("Rf"))));
}

/// Where a rising function is zero, by halving; NaN where it does not change sign.
fn zero(mut low: f64, mut high: f64, function: impl Fn(f64) -> f64) -> f64 {
    if function(low) > 0.0 || function(high) < 0.0 {
        return f64::NAN;
    }
    for _ in 0..60 {
        let middle = libm::sqrt(low * high);
        if function(middle) > 0.0 { high = middle } else { low = middle }
    }
    low
}

fn feedback_capacitor(row: &Row, ledger: &mut Ledger) {
    let amplifier = Amplifier::one_pole(INTEGRATOR, row.input("GBW_hz"));
    let with = |farads: f64| transimpedance(&amplifier, row.input("Rf_ohm"), row.input("Cin_F"), 0.0).with("Cf", farads);
    // The capacitor at which the engine's own Q is that of a maximally flat response.
    let flat = zero(1e-12, 2e-11, |farads| FRAC_1_SQRT_2 - figure(&with(farads), Figure::Q).value().unwrap_or(0.0));
    row.check(ledger, "Cf_exact", Figure::Q, &Outcome::Value(flat));
    let exact = with(row.expected("Cf_exact"));
    row.check(ledger, "f3dB_exact", Figure::Bandwidth, &figure(&exact, Figure::Bandwidth));
    row.check(ledger, "PM_exact", Figure::PhaseMargin, &map(figure(&exact, Figure::PhaseMargin), f64::to_degrees));
    let nominal = with(row.expected("Cf_45"));
    row.check(ledger, "PM_with_Cf_45", Figure::PhaseMargin, &map(figure(&nominal, Figure::PhaseMargin), f64::to_degrees));
    let decibels = map(figure(&nominal, Figure::Peaking), |p| 20.0 * libm::log10(p));
    row.check(ledger, "peaking_with_Cf_45", Figure::Peaking, &decibels);
}

fn integrator(row: &Row, ledger: &mut Ledger) {
    let bare = stage(Kind::Integrator, Amplifier::ideal().part()).with("Rin", row.input("R_ohm")).with("Cf", row.input("C_F"));
    let gain_at = |stage: &Stage, hertz: f64| ask(stage, Query::at(Figure::GainAt, hertz)).value().unwrap_or(f64::NAN);
    let unity = zero(1.0, 1e6, |hertz| 1.0 - gain_at(&bare, hertz));
    row.check(ledger, "f0", Figure::GainAt, &Outcome::Value(unity));
    let limited = bare.with("Rf", row.input("Rf_ohm"));
    row.check(ledger, "dc", Figure::Gain, &figure(&limited, Figure::Gain));
    row.check(ledger, "corner", Figure::Bandwidth, &figure(&limited, Figure::Bandwidth));
    row.check(ledger, "mag_100Hz", Figure::GainAt, &ask(&limited, Query::at(Figure::GainAt, 100.0)));
    let phase = ask(&limited, Query::at(Figure::PhaseAt, 100.0));
    row.check(ledger, "phase_100Hz", Figure::PhaseAt, &map(phase, f64::to_degrees));
}

fn differentiator(row: &Row, ledger: &mut Ledger) {
    let bare = stage(Kind::Differentiator, Amplifier::ideal().part()).with("Rf", row.input("Rf_ohm")).with("Cin", row.input("C_F"));
    let limited = bare.with("Rin", row.input("Rs_ohm"));
    row.check(ledger, "hf_gain", Figure::Gain, &map(figure(&limited, Figure::Gain), f64::abs));
    row.check(ledger, "f_limit", Figure::LowCutoff, &figure(&limited, Figure::LowCutoff));
    // |H| = f/f0/√(1 + (f/f_limit)²): at a frequency so low that the root is one to ten digits.
    let low = 1.0;
    let gain = ask(&limited, Query::at(Figure::GainAt, low));
    row.check(ledger, "f0", Figure::GainAt, &map(gain, |g| low / g));
}

fn bare_differentiator(row: &Row, ledger: &mut Ledger) {
    let amplifier = Amplifier::one_pole(INTEGRATOR, row.input("GBW_hz"));
    // The row's margin has the 1 mΩ in series of its check in it.
    let bare = stage(Kind::Differentiator, amplifier.part()).with("Rf", row.input("Rf_ohm")).with("Cin", row.input("C_F"));
    let stage = bare.with("Rin", 1e-3);
    row.check(ledger, "fc", Figure::Crossover, &figure(&stage, Figure::Crossover));
    row.check(ledger, "PM", Figure::PhaseMargin, &map(figure(&stage, Figure::PhaseMargin), f64::to_degrees));
}

/// A unity-gain Sallen–Key low-pass of these values around an ideal amplifier, with equal resistors.
fn second_order(hertz: f64, q: f64) -> Stage {
    let c2 = 1e-9;
    let c1 = 4.0 * q * q * c2;
    let r = 1.0 / (TAU * hertz * libm::sqrt(c1 * c2));
    let stage = stage(Kind::SallenKeyLowPass, Amplifier::ideal().part());
    stage.with("R1", r).with("R2", r).with("C1", c1).with("C2", c2)
}

fn filters(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C100");
    let r = row.expected("R");
    let stage_of = |kind: Kind| stage(kind, Amplifier::ideal().part());
    let flat = stage_of(Kind::SallenKeyLowPass).with("R1", r).with("R2", r).with("C1", row.input("C1_F")).with("C2", row.input("C2_F"));
    row.check(ledger, "f3dB", Figure::Bandwidth, &figure(&flat, Figure::Bandwidth));
    // Maximally flat with this ratio: 4Q² is it.
    row.check(ledger, "ratio", Figure::Q, &map(figure(&flat, Figure::Q), |q| 4.0 * q * q));

    let row = rows.row("C102");
    let names = [("R1", "R1_ohm"), ("R2", "R2_ohm"), ("R3", "R3_ohm"), ("C1", "C1_F"), ("C2", "C2_F")];
    let low_pass = names.iter().fold(stage_of(Kind::MultipleFeedbackLowPass), |stage, (name, input)| stage.with(name, row.input(input)));
    row.check(ledger, "H0", Figure::Gain, &figure(&low_pass, Figure::Gain));
    row.check(ledger, "f0", Figure::NaturalFrequency, &figure(&low_pass, Figure::NaturalFrequency));
    row.check(ledger, "Q", Figure::Q, &figure(&low_pass, Figure::Q));

    // Second order: poles at −sinh a·sin 45° ± j·cosh a·cos 45° of the ripple band's edge, a = asinh(1/ε)/2.
    let row = rows.row("C056");
    for (ripple, name) in [(0.1, "n2_0.1dB"), (0.5, "n2_0.5dB")] {
        let epsilon = libm::sqrt(libm::pow(10.0, ripple / 10.0) - 1.0);
        let a = libm::asinh(1.0 / epsilon) / 2.0;
        let (re, im) = (FRAC_1_SQRT_2 * libm::sinh(a), FRAC_1_SQRT_2 * libm::cosh(a));
        let (edge, size) = (1e4, libm::hypot(re, im));
        let stage = second_order(edge * size, size / (2.0 * re));
        let peaking = figure(&stage, Figure::Peaking).value().unwrap_or(f64::NAN);
        // The row's greatest gain is one; ours refers to the gain at DC.
        let relative = map(figure(&stage, Figure::NoiseBandwidth), |hertz| hertz / edge / (peaking * peaking));
        // ∫|H|²dω over the edge's angular frequency is ∫|H|²df over its frequency.
        row.check(ledger, name, Figure::NoiseBandwidth, &relative);
    }
}

/// The input amplifiers' outputs carry the common mode and half of the amplified difference.
fn inner_clipping(row: &Row, ledger: &mut Ledger) {
    let range = row.inputs("Vout_range");
    let swing = range[1];
    let ratio = row.input("G1") - 1.0;
    let at = |common: f64| {
        let values = [("Rg", 2e3), ("Rf1", ratio * 1e3), ("Rf2", ratio * 1e3), ("R1", 1e4), ("R2", 1e4), ("R3", 1e4), ("R4", 1e4)];
        let bare = between_rails(Kind::Instrumentation, swing + 1.5, 1.5);
        let mut stage = values.iter().fold(bare, |stage, (name, value)| stage.with(name, *value)).driven(row.input("Vd"), 0.0, None, 1.0);
        stage.common_mode = Some(Span::exact(common));
        figure(&stage, Figure::ClipMargin)
    };
    // The output stands at 10 V: near either end the input amplifiers clip first.
    row.check(ledger, "vcm_max", Figure::ClipMargin, &map(at(8.0), |margin| 8.0 + margin));
    row.check(ledger, "vcm_min", Figure::ClipMargin, &map(at(-8.0), |margin| -8.0 - margin));
}

#[test]
fn handbook_rows_of_the_kinds_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
