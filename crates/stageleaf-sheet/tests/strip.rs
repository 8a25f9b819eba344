//! Strips: values under, at and over a limit, and values without bound.

use stageleaf_math::{
    figure::{Figure, Query},
    limit::{Bound, Limit, Thin, Verdict},
    report::{LimitRow, Outcome},
};
use stageleaf_sheet::strip::{Places, places};

fn row(bound: Bound, nominal: f64, range: (f64, f64)) -> LimitRow {
    LimitRow {
        amplifier: None,
        dimension: Figure::Bandwidth.dimension(),
        limit: Limit { query: Query::of(Figure::Bandwidth), bound, thin: Thin::Fraction(0.1) },
        nominal: Outcome::Value(nominal),
        range: Some(range),
        worst: Outcome::Value(range.0),
        margin: None,
        verdict: Verdict::Holds,
        basis: None,
        corner: vec![],
        dominant: None,
    }
}

fn near(a: f64, b: f64) -> bool {
    (a - b).abs() < 1e-6
}

#[test]
fn values_above_at_and_below_a_least_lie_right_on_and_left_of_it() {
    for (nominal, side) in [(120.0, 1.0), (100.0, 0.0), (80.0, -1.0)] {
        let p = places(&row(Bound::AtLeast(100.0), nominal, (nominal, nominal))).unwrap();
        let distance = p.nominal.unwrap() - p.limits[0].0;
        assert!(if side == 0.0_f64 { near(distance, 0.0) } else { distance * side > 1.0 }, "{nominal}: {distance}");
        assert!(near(p.forbidden[0].0, 0.0) && near(p.forbidden[0].1, p.limits[0].0), "forbidden from the left end to the limit");
        assert!(p.forbidden[0].1 > 10.0, "the forbidden side is seen");
        assert!(p.thin[0].1 > p.thin[0].0);
    }
}

#[test]
fn a_band_forbids_both_sides() {
    let p = places(&row(Bound::Between { low: 19.0, high: 21.0 }, 20.0, (19.5, 20.4))).unwrap();
    assert_eq!(p.forbidden.len(), 2);
    // By symmetry: the nominal value lies half-way between the limits.
    assert!(near(p.nominal.unwrap(), f64::midpoint(p.limits[0].0, p.limits[1].0)));
    let thin_width = p.thin[0].1 - p.thin[0].0;
    // A tenth of the half-width, stated by the limit.
    assert!(near(thin_width, (p.limits[1].0 - p.limits[0].0) / 20.0), "{thin_width}");
}

#[test]
fn values_without_bound_reach_the_end_and_have_no_tick() {
    let p = places(&row(Bound::AtLeast(2.0), f64::INFINITY, (8.0, f64::INFINITY))).unwrap();
    assert!(p.unbounded && p.nominal.is_none());
    assert!(p.whiskers.unwrap().1 > p.whiskers.unwrap().0);
}

#[test]
fn nothing_to_place_gives_no_strip() {
    let mut r = row(Bound::Report, f64::NAN, (f64::NAN, f64::NAN));
    r.worst = Outcome::Oscillates;
    assert_eq!(places(&r), None);
}

#[test]
fn every_place_lies_inside_whatever_the_numbers() {
    let odd = [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 0.0, -1.0, 1.0, 1e-300, 1e300, f64::MAX];
    let inside = |p: &Places| {
        let pairs = p.forbidden.iter().chain(&p.thin).chain(&p.whiskers).flat_map(|(a, b)| [*a, *b]);
        pairs.chain(p.limits.iter().map(|l| l.0)).chain(p.nominal).all(|x| (0.0..=240.0).contains(&x))
    };
    for a in odd {
        for b in odd {
            for c in odd {
                for bound in [Bound::AtLeast(c), Bound::AtMost(c), Bound::Between { low: c, high: c + 1.0 }, Bound::Report] {
                    if let Some(p) = places(&row(bound, a, (a.min(b), a.max(b)))) {
                        assert!(inside(&p), "{bound:?}, {a}, {b}: {p:?}");
                    }
                }
            }
        }
    }
}
