//! What must hold for any stage, whatever its numbers: laws of networks and of judgement.

use stageleaf_math::{
    analyse,
    figure::{Figure, Query},
    kind::Kind,
    limit::{Bound, Limit, Thin, Verdict},
    model::Model,
    part::{Headroom, Part, PartFigure, Rating},
    report::{Need, Outcome, Report},
    solution::Solution,
    stage::{Component, Load, Signal, Stage, Toleranced},
};

#[path = "samples/mod.rs"]
mod samples;

use samples::stage;

fn nominal(report: &Report, figure: Figure) -> Option<f64> {
    report.figures.iter().find(|f| f.query.figure == figure).and_then(|f| f.nominal.value())
}

fn close(kind: Kind, figure: Figure, a: Option<f64>, b: Option<f64>, allowed: f64) {
    match (a, b) {
        (Some(a), Some(b)) if a.is_finite() || b.is_finite() => {
            assert!((a - b).abs() <= allowed * a.abs().max(b.abs()), "{kind:?} {}: {a} and {b}", figure.id());
        }
        (a, b) => assert_eq!(a.is_some(), b.is_some(), "{kind:?} {}", figure.id()),
    }
}

/// Every impedance a thousand times as large, the amplifier's too: ratios, frequencies and margins stay.
#[test]
fn scaling_every_impedance_leaves_ratios_and_frequencies() {
    for &kind in Kind::ALL {
        let (one, other) = (analyse(&stage(kind, 1.0, 1.0)).unwrap(), analyse(&stage(kind, 1e3, 1.0)).unwrap());
        // A current's gain is an impedance, a charge's the reciprocal of a capacitance: both grow with it.
        let grows = if matches!(kind, Kind::Transimpedance | Kind::Charge) { 1e3 } else { 1.0 };
        close(kind, Figure::Gain, nominal(&one, Figure::Gain).map(|g| g * grows), nominal(&other, Figure::Gain), 1e-9);
        for figure in [
            Figure::Bandwidth,
            Figure::LowCutoff,
            Figure::Peaking,
            Figure::Crossover,
            Figure::PhaseMargin,
            Figure::GainMargin,
            Figure::SensitivityPeak,
            Figure::NoiseBandwidth,
        ] {
            close(kind, figure, nominal(&one, figure), nominal(&other, figure), 1e-8);
        }
    }
}

/// Every time constant ten times as long: frequencies fall to a tenth, margins stay.
#[test]
fn scaling_every_time_constant_scales_frequencies_inversely() {
    for &kind in Kind::ALL {
        let (one, other) = (analyse(&stage(kind, 1.0, 1.0)).unwrap(), analyse(&stage(kind, 1.0, 10.0)).unwrap());
        for figure in [Figure::Bandwidth, Figure::LowCutoff, Figure::Crossover, Figure::NaturalFrequency, Figure::NoiseBandwidth] {
            close(kind, figure, nominal(&one, figure).map(|f| f / 10.0), nominal(&other, figure), 1e-8);
        }
        for figure in [Figure::PhaseMargin, Figure::GainMargin, Figure::SensitivityPeak, Figure::Peaking] {
            close(kind, figure, nominal(&one, figure), nominal(&other, figure), 1e-8);
        }
    }
}

/// The shares of the noise are shares of its power.
#[test]
fn noise_shares_add_up_to_the_whole() {
    for kind in Kind::ALL.iter().copied().filter(|k| !k.switches()) {
        let report = analyse(&stage(kind, 1.0, 1.0)).unwrap();
        let total = nominal(&report, Figure::OutputNoise).unwrap_or_else(|| panic!("{kind:?} has no noise"));
        let sum: f64 = report.noise_shares.iter().map(|s| s.share).sum();
        let power: f64 = report.noise_shares.iter().map(|s| s.rms * s.rms).sum();
        assert!((sum - 1.0).abs() < 1e-12, "{kind:?}: {sum}");
        assert!((libm::sqrt(power) / total - 1.0).abs() < 1e-8, "{kind:?}: {} and {total}", libm::sqrt(power));
    }
}

/// SplitMix64 as in `dense.rs`, for builds anywhere inside the ranges.
fn unit(state: &mut u64) -> f64 {
    *state = state.wrapping_add(0x9E37_79B9_7F4A_7C15);
    let mut z = *state;
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^= z >> 31;
    #[expect(clippy::cast_precision_loss, reason = "53 bits")]
    let unit = (z >> 11) as f64 / 9_007_199_254_740_992.0;
    unit
}

/// No build at a random corner of all ranges lies outside the range that the report gives, but for what parameters do together
/// against their single effects: a hundredth of the range here (see "Does not apply" of `analysis::spread`).
#[test]
fn the_worst_case_encloses_random_corners() {
    for &kind in Kind::ALL {
        let stage = stage(kind, 1.0, 1.0);
        let report = analyse(&stage).unwrap();
        let model = Model::compile(&stage);
        let mut state = 7;
        for _ in 0..200 {
            let values: Vec<f64> = model
                .parameters
                .entries
                .iter()
                .map(|e| if unit(&mut state) < 0.5 { e.low } else { e.high })
                .chain(std::iter::once(1.0))
                .collect();
            let build = Solution::new(&model, values, None);
            for figure in [Figure::Gain, Figure::OutputOffset, Figure::OutputNoise, Figure::Crossover] {
                let row = report.figures.iter().find(|f| f.query.figure == figure).unwrap();
                let (Some((low, high)), Some(here)) = (row.range, stageleaf_math::analysis::outcome(&build, Query::of(figure)).value())
                else {
                    continue;
                };
                let slack = 1e-2 * (high - low) + 1e-9 * here.abs();
                assert!(here >= low - slack && here <= high + slack, "{kind:?} {}: {here} outside {low} to {high}", figure.id());
            }
        }
    }
}

/// A tighter limit never gains margin, and never a better verdict.
#[test]
fn a_tighter_limit_never_gains_margin() {
    let order = |v: Verdict| [Verdict::Breaks, Verdict::Undetermined, Verdict::Thin, Verdict::Holds].iter().position(|o| *o == v);
    for &kind in Kind::ALL {
        let mut stage = stage(kind, 1.0, 1.0);
        let limit = |hertz: f64| Limit { query: Query::of(Figure::Crossover), bound: Bound::AtLeast(hertz), thin: Thin::Fraction(0.1) };
        stage.limits = vec![limit(1e3), limit(1e5), limit(1e6), limit(1e8)];
        let report = analyse(&stage).unwrap();
        for pair in report.limits.windows(2) {
            if let (Some(loose), Some(tight)) = (pair[0].margin, pair[1].margin) {
                assert!(tight < loose, "{kind:?}: {loose} then {tight}");
            }
            assert!(order(pair[1].verdict) <= order(pair[0].verdict), "{kind:?}");
        }
    }
}

/// A signal that stands still has swing, range and current, and nothing that an amplitude or a frequency would give.
#[test]
fn a_signal_that_stands_still_leaves_only_what_moves_undetermined() {
    for kind in Kind::ALL.iter().filter(|k| !k.switches()) {
        let mut stage = stage(*kind, 1.0, 1.0);
        for (figure, value) in [
            (PartFigure::SlewRise, 1e6),
            (PartFigure::SlewFall, 1e6),
            (PartFigure::CurrentLimit, 0.02),
            (PartFigure::RangeFromNegative, 1.0),
            (PartFigure::RangeFromPositive, 1.0),
        ] {
            stage.part.state(figure, Rating::typical(value));
        }
        stage.signals = vec![Some(Signal { peak: 0.0, frequency: None, dc: 1e-3, crest_factor: std::f64::consts::SQRT_2 })];
        let report = analyse(&stage).unwrap();
        let outcome = |figure: Figure| report.figures.iter().find(|row| row.query.figure == figure).unwrap().nominal.clone();
        for (figure, need) in [
            (Figure::SlewMargin, Need::SignalAmplitude),
            (Figure::FullPowerBandwidth, Need::SignalAmplitude),
            (Figure::Snr, Need::SignalAmplitude),
            (Figure::SnrBits, Need::SignalAmplitude),
            (Figure::Snr, Need::SignalFrequency),
            (Figure::GainAtSignal, Need::SignalFrequency),
        ] {
            let told = matches!(outcome(figure), Outcome::Undetermined(needs) if needs.contains(&need));
            // What has no DC path has no other figure either.
            assert!(told, "{kind:?}: {figure:?} is {:?}", outcome(figure));
        }
        for figure in [Figure::InputRangeMargin, Figure::CurrentMargin] {
            let outcome = outcome(figure);
            assert!(
                matches!(outcome, Outcome::Value(_) | Outcome::NoDcPath(_) | Outcome::Oscillates),
                "{kind:?}: {figure:?} is {outcome:?}"
            );
        }
    }
}

/// An ideal follower: endless gain and bandwidth, no errors.
fn ideal_follower() -> Stage {
    let mut stage = stage(Kind::Follower, 1.0, 1.0);
    stage.part = Part { poles: Some(vec![]), ..Part::default() };
    for (figure, value) in [
        (PartFigure::OpenLoop, 1e15),
        (PartFigure::Gbw, 1e15),
        (PartFigure::OutputResistance, 0.0),
        (PartFigure::DifferentialCapacitance, 0.0),
        (PartFigure::CommonModeCapacitance, 0.0),
        (PartFigure::Offset, 0.0),
        (PartFigure::OffsetDrift, 0.0),
        (PartFigure::BiasCurrent, 0.0),
        (PartFigure::OffsetCurrent, 0.0),
        (PartFigure::Cmrr, 1e15),
        (PartFigure::PsrrPositive, 1e15),
        (PartFigure::PsrrNegative, 1e15),
    ] {
        stage.part.state(figure, Rating::typical(value));
    }
    stage.sources = vec![];
    stage.load = Load::default();
    stage
}

/// By hand: it holds its output at the signal's 2 V, 12 V − 1 V − 2 V from the limit.
#[test]
fn a_follower_at_a_steady_voltage_clips_by_hand() {
    let mut stage = ideal_follower();
    stage.part.headroom_high = vec![Headroom { current: 1.0, volts: Rating::typical(1.0) }];
    stage.part.headroom_low = stage.part.headroom_high.clone();
    stage.signals = vec![Some(Signal { peak: 0.0, frequency: None, dc: 2.0, crest_factor: std::f64::consts::SQRT_2 })];
    let report = analyse(&stage).unwrap();
    let margin = report.figures.iter().find(|row| row.query.figure == Figure::ClipMargin).unwrap().nominal.value().unwrap();
    assert!((margin - 9.0).abs() < 1e-9, "{margin}");
}

/// By hand: 10 kΩ and 100 nF in front of an ideal follower take ln(100) time constants of 1 ms to the last hundredth, and the part 20 µs.
#[test]
fn a_filter_in_front_of_a_follower_starts_by_hand() {
    let mut stage = ideal_follower();
    stage.components =
        vec![Component { name: "Rser", value: Toleranced::exact(1e4) }, Component { name: "Cshunt", value: Toleranced::exact(1e-7) }];
    stage.signals = vec![Some(Signal { peak: 0.0, frequency: None, dc: 2.0, crest_factor: std::f64::consts::SQRT_2 })];
    stage.part.state(PartFigure::SlewRise, Rating::typical(1e12));
    stage.part.state(PartFigure::SlewFall, Rating::typical(1e12));
    let figure = |stage: &Stage| {
        let report = analyse(stage).unwrap();
        report.figures.iter().find(|row| row.query.figure == Figure::StartupTime).unwrap().nominal.clone()
    };
    let lacks = figure(&stage);
    assert!(matches!(&lacks, Outcome::Undetermined(needs) if needs[..] == [Need::Part(PartFigure::Startup)]), "{lacks:?}");
    stage.part.state(PartFigure::Startup, Rating::typical(20e-6));
    let time = figure(&stage).value().unwrap();
    assert!((time - (1e-3 * libm::log(100.0) + 20e-6)).abs() < 1e-9, "{time}");
    stage.signals[0].as_mut().unwrap().dc = 0.0;
    assert!(matches!(figure(&stage), Outcome::DoesNotApply(_)));
    // 20 V lie beyond the rail at 12 V.
    stage.signals[0].as_mut().unwrap().dc = 20.0;
    assert!(matches!(figure(&stage), Outcome::OutOfReach(_)));
}
