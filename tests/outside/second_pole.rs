//! The second pole from a stated phase margin with its load, and the caution below the part's least stable gain.

use core::f64::consts::SQRT_2;

use stageleaf_math::{
    analyse,
    analysis::second_pole,
    kind::Kind,
    part::{PartFigure, StatedPhaseMargin},
    report::Caution,
    stage::{Source, Stage, Toleranced},
};

use crate::setup::{Amplifier, Complete, stage};

/// Margins of known second poles, from `second_pole.py`: stated, they give the poles back.
#[test]
fn a_stated_margin_gives_its_second_pole_back() {
    for (name, (open_loop, gbw, resistance), pole, gain, load, margin) in [
        ("plain", (1e6, 1e7, 0.0), 2.5e7, 1.0, (None, None), 1.212_392_363_701_611_2),
        ("loaded", (1e6, 1e7, 50.0), 2.5e7, 1.0, (Some(2e3), Some(1e-10)), 0.964_270_425_547_632_8),
        ("gain of ten", (2e5, 8e7, 30.0), 1.2e7, 10.0, (Some(600.0), None), 1.064_088_839_024_289_3),
        ("cable", (1e5, 5e6, 200.0), 6e6, 2.0, (None, Some(4.7e-10)), 0.508_056_172_634_490_8),
    ] {
        let mut part = Amplifier { output_resistance: resistance, higher_poles: None, ..Amplifier::one_pole(open_loop, gbw) }.part();
        part.phase_margin = Some(StatedPhaseMargin { margin, gain, load_resistance: load.0, load_capacitance: load.1 });
        let found = second_pole::solve(&part).unwrap_or_else(|| panic!("{name}: no pole"));
        assert!((found - pole).abs() <= 1e-9 * pole, "{name}: {found:e} instead of {pole:e}");
    }
}

/// The noise gain at crossover, by hand from each feedback network where the loop gain ends (10 MHz over it): resistors where they are
/// alone, capacitors where they have taken over.
#[test]
fn a_noise_gain_below_the_least_stable_one_is_a_caution_on_every_kind() {
    let diode = Source::Photodiode { capacitance: Toleranced::exact(1e-10), shunt_resistance: None, dark_current: None };
    let ceramic = Source::Capacitive { capacitance: Toleranced::exact(1e-9) };
    let mut seen = Vec::new();
    for (kind, components, source, noise_gain) in [
        (Kind::Follower, &[][..], None, 1.0),
        (Kind::NonInverting, &[("Rf", 9e3), ("Rg", 1e3)], None, 10.0),
        (Kind::Inverting, &[("Rin", 1e3), ("Rf", 4e3)], None, 5.0),
        (Kind::Summing, &[("Rin1", 1e3), ("Rin2", 1e3), ("Rf", 1e3)], None, 3.0),
        (Kind::Difference, &[("R1", 1e3), ("R2", 1e4), ("R3", 1e3), ("R4", 1e4)], None, 11.0),
        // The third amplifier's is the least: 1 + R2/R1; the others' is 1 + Rf/Rg.
        (Kind::Instrumentation, &[("Rg", 1e3), ("Rf1", 9e3), ("Rf2", 9e3), ("R1", 1e3), ("R2", 2e3), ("R3", 1e3), ("R4", 2e3)], None, 3.0),
        // 1 + 100 pF/10 pF, 1 + 1 nF/100 pF.
        (Kind::Transimpedance, &[("Rf", 1e7), ("Cf", 1e-11)], Some(diode), 11.0),
        (Kind::Charge, &[("Rf", 1e9), ("Cf", 1e-10)], Some(ceramic), 11.0),
        (Kind::Integrator, &[("Rin", 1e6), ("Cf", 1e-6)], None, 1.0),
        // 1 + 1 µF/100 nF, far above the corner of Rf and Cf.
        (Kind::Differentiator, &[("Rf", 1e6), ("Cin", 1e-6), ("Cf", 1e-7)], None, 11.0),
        (Kind::ScaleAndShift, &[("R1", 1e3), ("R2", 1e3), ("Rf", 3e3), ("Rg", 1e3)], None, 4.0),
        (
            Kind::AcNonInverting,
            &[("Cin", 1e-3), ("Rb1", 1e5), ("Rb2", 1e5), ("Rb", 1e5), ("Cb", 1e-3), ("Rf", 9e3), ("Rg", 1e3), ("Cg", 1.0)],
            None,
            10.0,
        ),
        (Kind::AcInverting, &[("Cin", 1.0), ("Rin", 1e3), ("Rf", 4e3), ("Rb1", 1e5), ("Rb2", 1e5)], None, 5.0),
        (Kind::SallenKeyLowPass, &[("R1", 1e5), ("R2", 1e5), ("C1", 1e-6), ("C2", 1e-6), ("Rf", 1e3), ("Rg", 1e3)], None, 2.0),
        (Kind::SallenKeyHighPass, &[("R1", 1e5), ("R2", 1e5), ("C1", 1e-6), ("C2", 1e-6), ("Rf", 1e3), ("Rg", 1e3)], None, 2.0),
        (Kind::MultipleFeedbackLowPass, &[("R1", 1e5), ("R2", 1e5), ("R3", 1e5), ("C1", 1e-6), ("C2", 1e-6)], None, 1.0),
        (Kind::MultipleFeedbackBandPass, &[("R1", 1e5), ("R2", 1e5), ("R3", 1e5), ("C1", 1e-6), ("C2", 1e-6)], None, 1.0),
    ] {
        seen.push(kind);
        let warned = |needed: f64| {
            let mut stage: Stage = components.iter().fold(stage(kind, Amplifier::one_pole(1e7, 1e7).part()), |s, (n, v)| s.with(n, *v));
            stage.sources = vec![source];
            let report = analyse(&stage.stating(PartFigure::StableGainMin, needed)).expect("a valid stage");
            report
                .cautions
                .into_iter()
                .find_map(|c| if let Caution::BelowStableGain { noise_gain, .. } = c { Some(noise_gain) } else { None })
        };
        assert_eq!(warned(0.95 * noise_gain), None, "{kind:?}");
        let found = warned(1.05 * noise_gain).unwrap_or_else(|| panic!("{kind:?}: no caution"));
        assert!((found / noise_gain - 1.0).abs() < 0.01, "{kind:?}: {found} instead of {noise_gain}");
    }
    let missed: Vec<_> = Kind::ALL.iter().filter(|kind| !kind.switches() && !seen.contains(kind)).collect();
    assert!(missed.is_empty(), "kinds without a noise gain here: {missed:?}");
}

/// 2 µA of light with 3 µA of signal on it: at the brightest 5 µA, whose shot noise is √(2q·5 µA); through 100 kΩ, at 1 Hz of band.
/// q is exact since 2019 (SI Brochure, 9th edition, from memory).
#[test]
fn shot_noise_counts_the_brightest_light() {
    let mut transimpedance = stage(Kind::Transimpedance, Amplifier::ideal().part()).with("Rf", 1e5).at(300.0);
    transimpedance.sources =
        vec![Some(Source::Photodiode { capacitance: Toleranced::exact(1e-12), shunt_resistance: None, dark_current: None })];
    let shares = crate::setup::density_by_source(&transimpedance.driven(2e-6, 3e-6, Some(1e3), SQRT_2), 1.0);
    let shot = crate::setup::of_source(&shares, stageleaf_math::report::NoiseOrigin::SourceShot(0));
    let wanted = libm::sqrt(2.0 * 1.602_176_634e-19 * 5e-6) * 1e5;
    assert!((shot - wanted).abs() <= 1e-8 * wanted, "{shot:e} instead of {wanted:e}");
}
