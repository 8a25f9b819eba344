//! Handbook rows about noise: densities, integrals, bandwidths, ratios.

use core::f64::consts::{SQRT_2, TAU};

use stageleaf_math::{
    figure::{Figure, Query},
    kind::Kind,
    report::{NoiseOrigin, Outcome},
    stage::Stage,
};

use crate::{
    ledger::Ledger,
    setup::{Amplifier, Complete, ask, density_by_source, figure, map, of_source, outcome, report, stage},
    table::Rows,
};

/// The rows.
pub const TABLE: &str = include_str!("noise.toml");

/// An ideal follower.
fn follower(amplifier: &Amplifier) -> Stage {
    stage(Kind::Follower, amplifier.part())
}

/// Compares every row.
pub fn all(ledger: &mut Ledger) {
    let rows = Rows::read(TABLE);
    resistor(&rows, ledger);
    flicker(&rows, ledger);
    bandwidths(&rows, ledger);
    by_source(&rows, ledger);
    one_pole_total(&rows, ledger);
    signal_to_noise(&rows, ledger);
}

fn resistor(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C003");
    let ohms = row.input("R_ohm");
    let density = |kelvin: f64| {
        let stage = follower(&Amplifier::ideal()).behind_resistance(ohms).at(kelvin);
        ask(&stage, Query::at(Figure::NoiseDensityAt, 1.0))
    };
    row.check(ledger, "en_300K", Figure::NoiseDensityAt, &density(300.0));
    row.check(ledger, "en_298.15K", Figure::NoiseDensityAt, &density(298.15));

    let boltzmann = map(density(300.0), |v| v * v / (4.0 * 300.0 * ohms));
    // The follower's own gain error of 1/A0 = 1e-12 enters twice.
    rows.row("C001").check(ledger, "k", Figure::NoiseDensityAt, &map(boltzmann, |k| k * (1.0 + 2e-12)));
    // Exact; that shot noise has it shows in C007.
    let charge = stageleaf_math::analysis::noise::ELEMENTARY_CHARGE;
    rows.row("C001").check(ledger, "q", Figure::NoiseDensityAt, &Outcome::Value(charge));

    let row = rows.row("C006");
    // From so low to so high that less than 1e-7 of the power is missing.
    let stage = follower(&Amplifier::ideal()).behind_resistance(1e3).with("Cshunt", row.input("C_F")).at(row.input("T_K")).over(1e-3, 1e14);
    row.check(ledger, "vn", Figure::OutputNoise, &figure(&stage, Figure::OutputNoise));
}

fn flicker(rows: &Rows, ledger: &mut Ledger) {
    for id in ["C050", "C052"] {
        let row = rows.row(id);
        let amplifier = Amplifier { voltage_noise: row.input("en"), voltage_corner: row.input("fc_hz"), ..Amplifier::ideal() };
        let stage = follower(&amplifier).at(300.0).over(row.input("fl_hz"), row.input("fh_hz"));
        row.check(ledger, "vn_sum_model", Figure::OutputNoise, &figure(&stage, Figure::OutputNoise));
    }

    let row = rows.row("C053");
    let (low, high) = (row.input("fL_hz"), row.input("fH_hz"));
    for (nanovolts, gain) in row.inputs("enf_nV").into_iter().zip(["0.125", "0.25", "0.5", "1", "2", "4", "8", "16"]) {
        // White noise so small that the density is 1/f alone: en²·fc/f at `low` is the stated density.
        let white = 1e-15;
        let ratio = nanovolts * 1e-9 / white;
        let amplifier = Amplifier { voltage_noise: white, voltage_corner: ratio * ratio * low, ..Amplifier::ideal() };
        let stage = follower(&amplifier).at(300.0).over(low, high);
        // Normalised: the density at 1 Hz.
        let at_one_hertz = map(ask(&stage, Query::at(Figure::NoiseDensityAt, 1.0)), |v| v * 1e9);
        row.check(ledger, &format!("norm_G{gain}"), Figure::NoiseDensityAt, &at_one_hertz);
        let total = map(figure(&stage, Figure::OutputNoise), |v| v * 1e6);
        row.check(ledger, &format!("En_G{gain}"), Figure::OutputNoise, &total);
    }
}

fn bandwidths(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C054");
    let pole = 1e5;
    let (ohms, farads) = (1e3, 1.0 / (TAU * pole * 1e3));
    // One to three equal real poles: the loop, the input's R–C, the isolated load's R–C.
    let one = follower(&Amplifier::one_pole(1e12, pole));
    let two = one.clone().behind_resistance(ohms).with("Cshunt", farads);
    let three = two.clone().with("Riso", ohms).loaded(None, Some(farads));
    for (count, stage) in [("n1", one), ("n2", two), ("n3", three)] {
        let queries = [Figure::NoiseBandwidth, Figure::Bandwidth].map(Query::of);
        let report = report(&stage, &queries);
        let width = outcome(&report, queries[0]);
        row.check(ledger, &format!("{count}_rel_pole"), Figure::NoiseBandwidth, &map(width.clone(), |w| w / pole));
        let edge = outcome(&report, queries[1]);
        let ratio = edge.value().map_or(edge.clone(), |edge| map(width, |w| w / edge));
        row.check(ledger, &format!("{count}_rel_3dB"), Figure::NoiseBandwidth, &ratio);
    }

    let row = rows.row("C058");
    let stage = crate::loops::two_pole_follower(row.input("f0_hz"), 0.5 / row.input("Q"));
    row.check(ledger, "ENBW", Figure::NoiseBandwidth, &figure(&stage, Figure::NoiseBandwidth));
}

fn by_source(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C060");
    let amplifier = Amplifier { voltage_noise: row.input("en_nV") * 1e-9, current_noise: row.input("in_pA") * 1e-12, ..Amplifier::ideal() };
    for ohms in row.inputs("Rs") {
        let stage = follower(&amplifier).behind_resistance(ohms).at(row.input("T_K"));
        let shares = density_by_source(&stage, 1e3);
        for (name, origin) in [
            ("en", NoiseOrigin::AmplifierVoltage(0)),
            ("inR", NoiseOrigin::CurrentNonInverting(0)),
            ("johnson", NoiseOrigin::SourceResistance(0)),
        ] {
            let got = Outcome::Value(of_source(&shares, origin) * 1e9);
            row.check(ledger, &format!("{name}_{ohms}"), Figure::NoiseDensityAt, &got);
        }
        let total = map(ask(&stage, Query::at(Figure::NoiseDensityAt, 1e3)), |v| v * 1e9);
        row.check(ledger, &format!("total_{ohms}"), Figure::NoiseDensityAt, &total);
    }
}

fn one_pole_total(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C063");
    let with_gain = |open_loop: f64| {
        let amplifier = Amplifier {
            voltage_noise: row.input("en"),
            current_noise: row.input("inn"),
            ..Amplifier::one_pole(open_loop, row.input("A0") * row.input("fp1_hz"))
        };
        stage(Kind::NonInverting, amplifier.part())
            .with("Rg", row.input("R1_ohm"))
            .with("Rf", row.input("R2_ohm"))
            .at(row.input("T_K"))
            .over(0.01, 1e11)
    };
    let stage = with_gain(row.input("A0"));
    row.check(ledger, "fcl", Figure::Bandwidth, &figure(&stage, Figure::Bandwidth));
    // The row's density is an ideal amplifier's: its gain is 101, not 101/(1 + 101/A0).
    let ideal = with_gain(1e12);
    row.check(ledger, "density", Figure::NoiseDensityAt, &ask(&ideal, Query::at(Figure::NoiseDensityAt, 1e-4)));
    row.check(ledger, "vn", Figure::OutputNoise, &figure(&stage, Figure::OutputNoise));
}

/// A follower with a noise of 10 µV rms over its band and a signal of `rms` volts.
fn signal_over_ten_microvolts(rms: f64, crest_factor: f64) -> Stage {
    let amplifier = Amplifier { voltage_noise: 1e-7, ..Amplifier::ideal() };
    follower(&amplifier).at(300.0).over(1.0, 1e4 + 1.0).driven(0.0, rms * crest_factor, Some(1e3), crest_factor)
}

fn signal_to_noise(rows: &Rows, ledger: &mut Ledger) {
    let row = rows.row("C069");
    let stage_at = |decibels: f64| signal_over_ten_microvolts(1e-5 * libm::pow(10.0, decibels / 20.0), SQRT_2);
    let bits = figure(&stage_at(row.input("SINAD_dB")), Figure::SnrBits);
    row.check(ledger, "enob70_exact", Figure::SnrBits, &bits);
    // The other way round: a converter's ideal ratio is worth its number of bits, within the row's tolerance.
    for (count, name) in row.inputs("N").into_iter().zip(["snr12", "snr16"]) {
        let stage = stage_at(row.expected(name));
        let ratio = map(figure(&stage, Figure::Snr), |r| 20.0 * libm::log10(r));
        row.check(ledger, name, Figure::Snr, &ratio);
        let bits = figure(&stage, Figure::SnrBits);
        let holds = bits.value().is_some_and(|b| (b - count).abs() < 1e-6);
        ledger.fact("C069", &format!("bits of {name}"), holds, &format!("wanted {count} bits, got {bits:?}"));
    }

    let row = rows.row("C143");
    for (name, crest_factor) in [("sine", SQRT_2), ("triangle", libm::sqrt(3.0)), ("square", 1.0)] {
        let stage = signal_over_ten_microvolts(1.0 / crest_factor, crest_factor); // 1 V peak
        row.check(ledger, name, Figure::Snr, &map(figure(&stage, Figure::Snr), |r| r * 1e-5));
    }
}

/// The input-referred and the peak-to-peak figure follow the total by definition; by hand.
#[test]
fn totals_follow_the_density() {
    let amplifier = Amplifier { voltage_noise: 1e-8, ..Amplifier::ideal() };
    let stage = stage(Kind::NonInverting, amplifier.part()).with("Rg", 1e-3).with("Rf", 9e-3).at(300.0).over(1.0, 10_001.0);
    let mut ledger = Ledger::default();
    // By hand: 10 × 10 nV/√Hz × √(10 kHz) = 10 µV; resistors of milliohms add 1e-7 of it at most.
    for (name, figure_asked, value) in [
        ("total", Figure::OutputNoise, 1e-5),
        ("input", Figure::InputNoise, 1e-6),
        ("peak to peak, 6.6 times the rms", Figure::OutputNoisePeakToPeak, 6.6e-5),
    ] {
        let wanted =
            crate::ledger::Wanted { id: "by hand", name, figure: figure_asked, value, allowed: value * 1e-5, source: "worked by hand" };
        ledger.outcome(&wanted, &figure(&stage, figure_asked));
    }
    ledger.close();
}

#[test]
fn handbook_noise_is_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
