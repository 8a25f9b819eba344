//! The waveform against closed forms.

use stageleaf_math::{
    analysis::waveform::{
        core::Equations,
        figures::{Settling, overshoot, settling_time, slew_clip_distortion},
        run::{Moving, Run},
    },
    kind::Kind,
    model::Model,
    part::{Headroom, Part, PartFigure as P, Rating},
    report::{Need, Outcome},
    solution::Solution,
    stage::{Ambient, Board, Component, Isolation, Load, Signal, Span, Stage, Supply, Toleranced},
};
use std::f64::consts::{PI, TAU};

const UNIT: f64 = 1.0 / 1_073_741_824.0;

/// A follower around an amplifier of one pole, without output resistance or input capacitance.
fn follower() -> Stage {
    let mut part = Part { poles: Some(vec![]), ..Part::default() };
    for (figure, value) in [
        (P::OpenLoop, 1e9),
        (P::Gbw, 1e7),
        (P::OutputResistance, 1.0),
        (P::DifferentialCapacitance, 0.0),
        (P::CommonModeCapacitance, 0.0),
        (P::SlewRise, 1e7),
        (P::SlewFall, 1e7),
        (P::CurrentLimit, 1.0),
    ] {
        part.state(figure, Rating::typical(value));
    }
    let headroom =
        |volts| vec![Headroom { current: 0.0, volts: Rating::typical(volts) }, Headroom { current: 1.0, volts: Rating::typical(volts) }];
    part.headroom_high = headroom(1.0);
    part.headroom_low = headroom(1.0);
    Stage {
        name: "follower".into(),
        kind: Kind::Follower,
        components: vec![],
        part,
        isolation: Isolation::OutsideLoop,
        supply: Some(Supply { positive: Span::exact(12.0), negative: Span::exact(-12.0), ripple: None }),
        sources: vec![],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load::default(),
        board: Board::default(),
        ambient: Some(Ambient { range: Span::exact(298.15), values_at: None }),
        band: None,
        limits: vec![],
        converter: stageleaf_math::stage::Converter::default(),
        measured: vec![],
    }
}

fn signal(peak: f64, frequency: f64, dc: f64) -> Vec<Option<Signal>> {
    vec![Some(Signal { peak, frequency: Some(frequency), dc, crest_factor: std::f64::consts::SQRT_2 })]
}

fn solved<T>(stage: &Stage, ask: impl FnOnce(&Solution<'_>) -> T) -> T {
    let model = Model::compile(stage);
    let solution = Solution::new(&model, model.parameters.nominal(), None);
    ask(&solution)
}

fn close(got: &Outcome, wanted: f64, allowed: f64, what: &str) {
    let got = got.value().unwrap_or_else(|| panic!("{what}: {got:?} is no value"));
    assert!((got - wanted).abs() <= allowed * wanted.abs(), "{what}: got {got}, wanted {wanted}");
}

/// C047 of the collected checks (exact mathematics): `t = ΔV/SR − τ + τ·ln(SR·τ/(ε·ΔV))`.
#[test]
fn a_follower_slews_then_settles_exponentially() {
    let got = solved(&follower(), |s| settling_time(s, Settling { error: 1e-3, step: 5.0 }));
    close(&got, 5.391_591_235_949_58e-7, 2e-6, "5 V at 10 V/µs, 10 MHz, 0.1 %");
    // Below SR·τ the input stage stays linear: τ·ln(1/ε), 6.907755 τ (C038).
    let got = solved(&follower(), |s| settling_time(s, Settling { error: 1e-3, step: 0.1 }));
    close(&got, 6.907_755_278_982_137 / (TAU * 1e7), 2e-6, "0.1 V, linear");
}

/// A sine far beyond the slew rate becomes a triangle: `√(Σ 1/n⁴, odd n ≥ 3)` of the fundamental, `√(π⁴/96 − 1)` (Fourier series of the
/// triangle, exact mathematics).
#[test]
fn a_sine_far_beyond_the_slew_rate_becomes_a_triangle() {
    let mut stage = follower();
    // The triangle's peak is SR/(4f) = 0.5 V of the 10 V asked for.
    stage.signals = signal(10.0, 5e6, 0.0);
    let got = solved(&stage, slew_clip_distortion);
    close(&got, libm::sqrt(PI * PI * PI * PI / 96.0 - 1.0), 2e-3, "triangle");
}

/// A slow sine through symmetric rails: harmonics of the clipped sine `max(−c, min(c, sin θ))`, by the closed Fourier integrals.
#[test]
fn a_slow_sine_through_symmetric_rails_has_the_clipped_sines_harmonics() {
    let mut stage = follower();
    stage.signals = signal(13.0, 10.0, 0.0);
    let got = solved(&stage, slew_clip_distortion);
    // Mean square and fundamental of the clipped sine, α = asin(c): exact mathematics.
    let c: f64 = 11.0 / 13.0;
    let a = libm::asin(c);
    let fundamental = 2.0 / PI * (a - libm::sin(a) * libm::cos(a)) + 4.0 / PI * c * libm::cos(a);
    let square = 2.0 / PI * (a / 2.0 - libm::sin(a) * libm::cos(a) / 2.0 + c * c * (PI / 2.0 - a));
    let wanted = libm::sqrt(2.0 * square / (fundamental * fundamental) - 1.0);
    close(&got, wanted, 1e-5, "clipped sine");
}

#[test]
fn a_sine_within_every_limit_has_no_distortion() {
    let mut stage = follower();
    stage.signals = signal(5.0, 1e5, 0.0);
    assert_eq!(solved(&stage, slew_clip_distortion), Outcome::Value(0.0));
}

/// Two poles of a loop: `ζ = ½·√(ω2/ωu)`, overshoot `exp(−πζ/√(1 − ζ²))` (C032 of the collected checks, textbook relation).
#[test]
fn a_loop_of_two_poles_overshoots_by_its_damping() {
    for (zeta, percent) in [
        (0.1, 72.924_761_428_767_1),
        (0.2, 52.662_059_933_030_31),
        (0.4, 25.382_672_198_010_87),
        (0.6, 9.478_022_484_215_485),
        (0.8, 1.516_461_986_454_656_2),
    ] {
        let mut stage = follower();
        stage.part.poles = Some(vec![1e7 * 4.0 * zeta * zeta]);
        close(&solved(&stage, overshoot), percent / 100.0, 1e-7, "second order");
    }
}

fn run<T>(stage: &Stage, omega: f64, ask: impl FnOnce(&mut Run<'_>) -> T) -> T {
    solved(stage, |s| {
        let equations = Equations::of(s, 0, omega).expect("the stage has equations");
        ask(&mut Run::new(&equations, UNIT, true).expect("it starts"))
    })
}

/// A capacitor on the pin that the current limit charges: `dv/dt = I/C`.
#[test]
fn a_capacitor_beyond_the_current_limit_charges_along_a_line() {
    let mut stage = follower();
    stage.part.state(P::CurrentLimit, Rating::typical(0.02));
    stage.load.capacitance = Some(Toleranced::exact(1e-7));
    stage.load.resistance = None;
    run(&stage, 0.0, |run| {
        run.settle(-2.0).expect("a point");
        run.jump(Moving { value: 2.0, ..Moving::default() }).expect("a jump");
        run.span(2e-6, &mut |_, _| {}).expect("time");
        let before = run.output();
        run.span(10e-6, &mut |_, _| {}).expect("time");
        let slope = (run.output() - before) / 10e-6;
        assert!((slope / 2e5 - 1.0).abs() < 1e-6, "slope {slope}");
        assert!(run.passed.current);
        run.span(1.0, &mut |_, _| {}).expect("time");
        assert!((run.output() - 2.0).abs() < 1e-6, "ends at {}", run.output());
    });
}

#[test]
fn a_step_beyond_the_supply_ends_at_the_rail_less_the_headroom() {
    let mut stage = follower();
    stage.load.resistance = Some(Toleranced::exact(2e3));
    run(&stage, 0.0, |run| {
        run.settle(0.0).expect("a point");
        for (input, wanted) in [(1e3, 11.0), (-1e3, -11.0), (3.0, 3.0)] {
            run.jump(Moving { value: input, ..Moving::default() }).expect("a jump");
            run.span(1e-3, &mut |_, _| {}).expect("time");
            assert!((run.output() - wanted).abs() < 1e-4, "{input} V gives {}", run.output());
        }
    });
}

#[test]
fn an_operating_point_on_a_rail_is_found() {
    let stage = follower();
    run(&stage, 0.0, |run| {
        run.settle(40.0).expect("a point");
        assert!((run.output() - 11.0).abs() < 1e-4, "{}", run.output());
        assert!(run.passed.rail);
    });
}

/// A loop that oscillates grows to a cycle that its slew rate and rails bound, and repeats itself.
#[test]
fn an_oscillating_stage_ends_in_a_limit_cycle() {
    let mut stage = follower();
    stage.part.poles = Some(vec![5e5, 8e5]);
    run(&stage, 0.0, |run| {
        run.settle(0.0).expect("a point");
        run.longest = 2e-8;
        run.jump(Moving { value: 0.1, ..Moving::default() }).expect("a jump");
        run.span(300e-6, &mut |_, _| {}).expect("time");
        let (mut low, mut high) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
        for k in 0..2 {
            run.span(20e-6, &mut |run, _| {
                low[k] = low[k].min(run.output());
                high[k] = high[k].max(run.output());
            })
            .expect("time");
        }
        assert!(high[0] - low[0] > 0.3 && high[0] < 11.001 && low[0] > -11.001, "{low:?} to {high:?}");
        assert!((high[0] - high[1]).abs() < 1e-2 && (low[0] - low[1]).abs() < 1e-2, "{low:?} to {high:?}");
    });
}

/// Ten decades between the fastest and the slowest time constant: a picofarad at the pin, a coupling of hundreds of seconds.
#[test]
fn ten_decades_of_time_constants_keep_the_slow_one() {
    let mut stage = follower();
    stage.kind = Kind::AcNonInverting;
    let component = |name, value| Component { name, value: Toleranced::exact(value) };
    let names: Vec<_> = Kind::AcNonInverting.components().iter().filter(|c| c.required).map(|c| c.name).collect();
    stage.components = names.iter().map(|&n| component(n, if n.starts_with('C') { 1e-3 } else { 1e5 })).collect();
    assert!(!names.is_empty());
    run(&stage, 0.0, |run| {
        run.settle(0.0).expect("a point");
        let still = run.output();
        run.jump(Moving { value: 1e-3, ..Moving::default() }).expect("a jump");
        run.span(3600.0, &mut |_, _| {}).expect("an hour");
        assert!((run.output() - still).abs() < 1e-6, "{} and {still}", run.output());
    });
}

#[test]
fn a_step_that_hits_the_rail_on_its_way_needs_the_overload_recovery() {
    let mut stage = follower();
    stage.part.poles = Some(vec![5e6]);
    stage.part.state(P::SlewRise, Rating::typical(1e9));
    stage.part.state(P::SlewFall, Rating::typical(1e9));
    let asked = Settling { error: 1e-2, step: 21.0 };
    assert_eq!(solved(&stage, |s| settling_time(s, asked)), Outcome::Undetermined(vec![Need::Part(P::OverloadRecovery)]));
    stage.part.state(P::OverloadRecovery, Rating::typical(1e-6));
    let got = solved(&stage, |s| settling_time(s, asked)).value().expect("a value");
    assert!(got > 1e-6, "{got}");
}
