//! The search for values against a search by hand, filter tables, and published designs.

use stageleaf_math::{
    figure::Figure,
    kind::Kind,
    part::{Part, PartFigure, Rating},
    search::choose::{Refusal, Response, Stock, Target, choose},
    stage::{Board, Component, Isolation, Load, Source, Stage, Toleranced},
};

/// An amplifier that is nearly ideal below a megahertz.
fn part() -> Part {
    let mut part = Part { poles: Some(Vec::new()), ..Part::default() };
    for (figure, value) in [
        (PartFigure::OpenLoop, 1e9),
        (PartFigure::Gbw, 1e12),
        (PartFigure::OutputResistance, 0.0),
        (PartFigure::DifferentialCapacitance, 0.0),
        (PartFigure::CommonModeCapacitance, 0.0),
    ] {
        part.state(figure, Rating::typical(value));
    }
    part
}

fn stage(kind: Kind, components: &[(&'static str, f64)]) -> Stage {
    Stage {
        name: "Chosen".into(),
        kind,
        components: components.iter().map(|(name, value)| Component { name, value: Toleranced::exact(*value) }).collect(),
        part: part(),
        isolation: Isolation::OutsideLoop,
        supply: None,
        sources: vec![Some(Source::Resistive { resistance: Toleranced::exact(0.0) })],
        signals: vec![],
        converter: stageleaf_math::stage::Converter::default(),
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load::default(),
        board: Board::default(),
        ambient: None,
        band: None,
        limits: vec![],
        measured: vec![],
    }
}

fn aim(figure: Figure, value: f64) -> Target {
    Target { figure, value }
}

/// E96 as IEC 60063 defines it: `10^(i/96)` in three digits.
fn e96(low: f64, high: f64) -> Vec<f64> {
    let mut values = Vec::new();
    for decade in 0..7 {
        for i in 0..96 {
            let digits = libm::round(libm::pow(10.0, f64::from(i) / 96.0) * 100.0);
            values.push(digits * libm::pow(10.0, f64::from(decade)) / 100.0);
        }
    }
    values.retain(|v| (low..=high).contains(v));
    values
}

#[test]
fn no_pair_is_nearer_than_the_one_chosen() {
    let stock = Stock { resistors: e96(1e3, 1e6), capacitors: vec![] };
    for gain in [1.7, 2.5, 5.0, 20.4, 33.0, 101.0] {
        let of = stage(Kind::NonInverting, &[("Rf", 10e3), ("Rg", 1e3)]);
        let best = &choose(&of, &[aim(Figure::Gain, gain)], &[], &stock).expect("a choice")[0];
        let least = stock
            .resistors
            .iter()
            .flat_map(|f| stock.resistors.iter().map(move |g| ((1.0 + f / g) / gain - 1.0).abs()))
            .fold(f64::INFINITY, f64::min);
        let chosen = (1.0 + best.values[0].1 / best.values[1].1) / gain - 1.0;
        assert!((chosen.abs() - least).abs() < 1e-7, "{gain}: {chosen} for {least}");
    }
}

#[test]
fn responses_have_the_poles_of_the_tables() {
    // scipy 1.16: |p| and |p|/(−2·Re p) of buttap(2), besselap(2, norm="mag"), cheb1ap(2, 0.5), cheb1ap(2, 3).
    for (response, natural, q) in [
        (Response::Butterworth, 1.0, 0.707_106_781_186_547_5),
        (Response::Bessel, 1.272_019_649_514_067_9, 0.577_350_269_189_625_7),
        (Response::Chebyshev(0.5), 1.231_341_799_398_498_3, 0.863_720_978_151_799_2),
        (Response::Chebyshev(3.0), 0.841_396_327_615_755_3, 1.304_693_413_798_431_2),
    ] {
        let (f, k) = response.shape();
        assert!((f / natural - 1.0).abs() < 1e-12 && (k / q - 1.0).abs() < 1e-12, "{response:?}: {f} {k}");
    }
}

#[test]
fn published_designs_are_found_among_values_that_hold_them() {
    // Equal resistors, unity gain, Butterworth at 10 kHz: C1 = 2·C2, R = 1/(2π·fc·√(C1·C2)) = 11253.954 Ω
    // (Sallen and Key's equations, from memory).
    let of = stage(Kind::SallenKeyLowPass, &[("R1", 10e3), ("R2", 10e3), ("C1", 1e-9), ("C2", 1e-9)]);
    let stock = Stock { resistors: vec![5e3, 8e3, 11_253.953_951_963_826, 20e3, 40e3], capacitors: vec![1e-9, 2e-9] };
    let (ratio, q) = Response::Butterworth.shape();
    let wanted = [aim(Figure::NaturalFrequency, 10e3 * ratio), aim(Figure::Q, q)];
    let best = &choose(&of, &wanted, &[], &stock).expect("a choice")[0];
    assert_eq!(best.values, [("R1", 11_253.953_951_963_826), ("R2", 11_253.953_951_963_826), ("C1", 2e-9), ("C2", 1e-9)]);
    assert!(best.error < 1e-4, "the whole engine says the same: {}", best.error);

    // Multiple-feedback low-pass, 3.9 kΩ, 8.45 kΩ, 2.7 kΩ, 15 nF, 2.2 nF: gain 2.1667, 5800.33 Hz, Q 0.73366 (exact mathematics).
    let of = stage(Kind::MultipleFeedbackLowPass, &[("R1", 1e4), ("R2", 1e4), ("R3", 1e4), ("C1", 1e-8), ("C2", 1e-9)]);
    let stock = Stock { resistors: e96(1e3, 1e5).into_iter().chain([3.9e3, 2.7e3]).collect(), capacitors: vec![2.2e-9, 4.7e-9, 15e-9] };
    let mut stock = stock;
    stock.resistors.sort_by(f64::total_cmp);
    let wanted = [
        aim(Figure::Gain, 2.166_666_666_666_666_5),
        aim(Figure::NaturalFrequency, 5_800.332_970_722_821),
        aim(Figure::Q, 0.733_661_288_635_483),
    ];
    let best = &choose(&of, &wanted, &[], &stock).expect("a choice")[0];
    for (name, value) in [("R1", 3.9e3), ("R2", 8.45e3), ("R3", 2.7e3), ("C1", 15e-9), ("C2", 2.2e-9)] {
        assert!(best.values.contains(&(name, value)), "{name}: {:?}", best.values);
    }
}

#[test]
fn what_cannot_be_chosen_is_refused() {
    let stock = Stock { resistors: e96(1e3, 1e6), capacitors: vec![1e-9] };
    let of = stage(Kind::ScaleAndShift, &[("R1", 1e4), ("R2", 1e4), ("Rf", 1e4), ("Rg", 1e4)]);
    assert!(matches!(choose(&of, &[aim(Figure::Gain, 2.0)], &[], &stock), Err(Refusal::TooFree { targets: 1, .. })));
    assert!(choose(&of, &[aim(Figure::Gain, 2.0)], &["R1", "R2"], &stock).is_ok());
    let of = stage(Kind::Follower, &[]);
    assert_eq!(choose(&of, &[aim(Figure::Gain, 2.0)], &[], &stock), Err(Refusal::Nothing(Figure::Gain)));
    // A Q of 20 from equal capacitors in a unity-gain section needs Q = √(R1/R2)/(…) beyond ½: there is none.
    let of = stage(Kind::SallenKeyLowPass, &[("R1", 1e4), ("R2", 1e4), ("C1", 1e-9), ("C2", 1e-9)]);
    let wanted = [aim(Figure::NaturalFrequency, 10e3), aim(Figure::Q, 20.0)];
    assert_eq!(choose(&of, &wanted, &[], &stock), Err(Refusal::Impossible));
    assert_eq!(choose(&of, &wanted, &[], &Stock::default()), Err(Refusal::NoValues));
}
