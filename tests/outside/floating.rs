//! Capacitive sources on every kind: where an amplifier's input has no DC path that is the verdict, and where a node floats that no
//! bias current needs, the stage is as good as any other.

use stageleaf_math::{
    figure::{Figure, Query},
    kind::{Drives, Kind},
    report::{Outcome, Terminal},
    stage::{Source, Stage, Toleranced},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    setup::{Amplifier, Complete, ask, figure, stage},
};

fn amplifier() -> Amplifier {
    Amplifier {
        higher_poles: Some(vec![2.5e7]),
        output_resistance: 60.0,
        differential_capacitance: 3e-12,
        common_mode_capacitance: 2e-12,
        voltage_noise: 5e-9,
        voltage_corner: 30.0,
        current_noise: 1e-12,
        current_corner: 100.0,
        ..Amplifier::one_pole(1e6, 1e7)
    }
}

fn built(kind: Kind, components: &[(&str, f64)]) -> Stage {
    components.iter().fold(stage(kind, amplifier().part()), |stage, (name, value)| stage.with(name, *value))
}

/// The same, each input behind 4.7 nF.
fn behind_capacitors(kind: Kind, components: &[(&str, f64)]) -> Stage {
    let mut stage = built(kind, components);
    let inputs = (kind.spec().inputs)(&stage).iter().filter(|i| i.name.starts_with("in")).count();
    stage.sources = vec![Some(Source::Capacitive { capacitance: Toleranced::exact(4.7e-9) }); inputs];
    stage.at(300.0)
}

const DIFFERENTIATOR: &[(&str, f64)] = &[("Rf", 9.1e3), ("Cin", 2.2e-8), ("Rin", 360.0), ("Cf", 5.6e-10)];
const AC_NON_INVERTING: &[(&str, f64)] =
    &[("Cin", 1e-8), ("Rb1", 1e5), ("Rb2", 1e5), ("Rb", 1e5), ("Cb", 1e-5), ("Rf", 9e4), ("Rg", 1e4), ("Cg", 1e-5)];
const AC_INVERTING: &[(&str, f64)] = &[("Cin", 1e-8), ("Rin", 1e4), ("Rf", 1e5), ("Rb1", 1e5), ("Rb2", 1e5)];
const HIGH_PASS: &[(&str, f64)] = &[("R1", 1e4), ("R2", 2e4), ("C1", 1e-8), ("C2", 1e-8)];
const BAND_PASS: &[(&str, f64)] = &[("R1", 1e3), ("R3", 1e5), ("C1", 1e-8), ("C2", 1.1e-8)];

/// Compares every circuit with a floating node between two capacitors.
pub fn all(ledger: &mut Ledger) {
    // floating.py: nodal matrices in mpmath, 50 digits.
    for (kind, components, at_1k, at_1m, density) in [
        (Kind::Differentiator, DIFFERENTIATOR, 0.221309783168623, 0.742348776464607, 1.64131980427052e-8),
        (Kind::AcNonInverting, AC_NON_INVERTING, 8.94706014967143, 8.38479110435732, 5.26736245908913e-7),
        (Kind::AcInverting, AC_INVERTING, 1.96993849401788, 6.91708425589342, 1.83606952256136e-7),
        (Kind::SallenKeyHighPass, HIGH_PASS, 0.226126445199514, 0.997679955397282, 3.68215558038699e-8),
        (Kind::MultipleFeedbackBandPass, BAND_PASS, 0.441130091384405, 0.0218504057920122, 3.99763795403746e-8),
    ] {
        let stage = behind_capacitors(kind, components);
        for (query, value) in [
            (Query::at(Figure::GainAt, 1e3), at_1k),
            (Query::at(Figure::GainAt, 1e6), at_1m),
            (Query::at(Figure::NoiseDensityAt, 1e3), density),
        ] {
            let name = format!("{} {}", query.figure.id(), query.at.unwrap_or(0.0));
            let allowed = budget(query.figure).around(value) + 1e-14 * value;
            let wanted = Wanted {
                id: &format!("floating: {}", kind.id()),
                name: &name,
                figure: query.figure,
                value,
                allowed,
                source: "floating.py",
            };
            ledger.outcome(&wanted, &ask(&stage, query));
        }
    }
}

#[test]
fn stages_with_a_floating_node_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}

/// By eye, for amplifiers that state no input resistance: from which input does no resistor lead anywhere?
#[test]
fn an_input_without_a_dc_path_is_named_and_no_other_is() {
    let plus = Some(Terminal { amplifier: 0, inverting: false });
    let minus = Some(Terminal { amplifier: 0, inverting: true });
    let four = [("R1", 1e4), ("R2", 1e4), ("R3", 1e4), ("R4", 1e4)];
    let three = [("Rg", 1e3), ("Rf1", 1e4), ("Rf2", 1e4), ("R1", 1e4), ("R2", 1e4), ("R3", 1e4), ("R4", 1e4)];
    let mut seen = Vec::new();
    for (kind, components, floating) in [
        (Kind::Follower, &[][..], plus),
        (Kind::NonInverting, &[("Rf", 9e3), ("Rg", 1e3)], plus),
        (Kind::Inverting, &[("Rin", 1e3), ("Rf", 1e4)], None),
        (Kind::Summing, &[("Rin1", 1e3), ("Rin2", 1e3), ("Rf", 1e4)], None),
        (Kind::Difference, &four, None),
        (Kind::Instrumentation, &three, plus),
        (Kind::Transimpedance, &[("Rf", 1e6), ("Cf", 1e-12)], None),
        (Kind::Charge, &[("Cf", 1e-9), ("Rf", 1e9)], None),
        (Kind::Charge, &[("Cf", 1e-9)], minus),
        (Kind::Charge, &[("Cf", 1e-9), ("Rser", 1e3)], minus),
        (Kind::Integrator, &[("Rin", 1e4), ("Cf", 1e-8), ("Rf", 1e6)], None),
        (Kind::Integrator, &[("Rin", 1e4), ("Cf", 1e-8)], minus),
        (Kind::Differentiator, DIFFERENTIATOR, None),
        (Kind::Differentiator, &[("Rf", 9.1e3), ("Cin", 2.2e-8)], None),
        (Kind::ScaleAndShift, &[("R1", 1e4), ("R2", 1e4), ("Rf", 1e4), ("Rg", 1e4)], None),
        (Kind::AcNonInverting, AC_NON_INVERTING, None),
        (Kind::AcInverting, AC_INVERTING, None),
        (Kind::SallenKeyLowPass, &[("R1", 1e4), ("R2", 1e4), ("C1", 1e-9), ("C2", 1e-9)], plus),
        (Kind::SallenKeyHighPass, HIGH_PASS, None),
        (Kind::MultipleFeedbackLowPass, &[("R1", 4e3), ("R2", 8e3), ("R3", 3e3), ("C1", 1.5e-8), ("C2", 2.2e-9)], None),
        (Kind::MultipleFeedbackBandPass, &[("R1", 2e4), ("R2", 1e3), ("R3", 8e4), ("C1", 1e-8), ("C2", 1e-8)], None),
        (Kind::MultipleFeedbackBandPass, BAND_PASS, None),
    ] {
        seen.push(kind);
        let stage = behind_capacitors(kind, components);
        let density = ask(&stage, Query::at(Figure::NoiseDensityAt, 1e3));
        match floating {
            Some(at) => assert_eq!(density, Outcome::NoDcPath(at), "{kind:?} {components:?}"),
            None => assert!(density.value().is_some(), "{kind:?} {components:?}: {density:?}"),
        }
        // A source that is none leaves every input its path.
        if !matches!(kind, Kind::Charge | Kind::Integrator) {
            let plain = ask(&built(kind, components).at(300.0), Query::at(Figure::NoiseDensityAt, 1e3));
            assert!(plain.value().is_some(), "{kind:?} {components:?}: {plain:?}");
        }
        // Nor is there any trouble at DC with a node that nobody asks.
        if floating.is_none() && !matches!(kind.spec().drives, Drives::Differential) {
            let stage = stage
                .between(-15.0, 15.0)
                .stating(stageleaf_math::part::PartFigure::Offset, 1e-3)
                .stating(stageleaf_math::part::PartFigure::OffsetDrift, 0.0)
                .stating(stageleaf_math::part::PartFigure::BiasCurrent, 0.0)
                .stating(stageleaf_math::part::PartFigure::OffsetCurrent, 0.0)
                .stating(stageleaf_math::part::PartFigure::Cmrr, 1e6)
                .stating(stageleaf_math::part::PartFigure::PsrrPositive, 1e5)
                .stating(stageleaf_math::part::PartFigure::PsrrNegative, 1e5);
            for asked in [Figure::OutputOffset, Figure::StagePsrr, Figure::GainDrift, Figure::Gain] {
                // A rejection referred to an input that is no voltage does not apply.
                if asked == Figure::StagePsrr && !matches!(kind.spec().gain, stageleaf_math::dimension::Dimension::Gain) {
                    continue;
                }
                let got = figure(&stage, asked);
                assert!(got.value().is_some_and(f64::is_finite), "{kind:?} {components:?}: {asked:?} is {got:?}");
            }
        }
    }
    // Of comparators, whose noise does not apply, `stageleaf-math`'s own tests ask for thresholds.
    let missed: Vec<_> = Kind::ALL.iter().filter(|kind| !kind.switches() && !seen.contains(kind)).collect();
    assert!(missed.is_empty(), "kinds without a capacitive source here: {missed:?}");
}
