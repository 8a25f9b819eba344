//! Stages whose amplifiers answer to their common mode and supplies, solved by `rejection.py` with these sources in the nodal matrix.

use serde::Deserialize;
use stageleaf_math::{
    analyse,
    figure::{Figure, Query},
    kind::{Drives, Feed},
    limit::{Bound, Limit, Thin},
    part::{Part, PartFigure, Rating},
    report::{LimitRow, Outcome},
    stage::{Ripple, Stage},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    oracle_kinds::Circuit,
    setup::ask,
};

const TABLE: &str = include_str!("rejection.json");
const SOURCE: &str = "rejection.py: nodal matrices in mpmath (50 digits), all signs tried";

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    rejections: Vec<Rejections>,
    expected: Expected,
}

/// Ratio at DC and corner in Hz, each.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Rejections {
    cmrr: [f64; 2],
    psrr_positive: [f64; 2],
    psrr_negative: [f64; 2],
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    /// 0 is DC.
    frequencies: Vec<f64>,
    /// Least and greatest over the signs, none included: signed at DC, magnitudes elsewhere.
    gain: Vec<[f64; 2]>,
    /// Without a common-mode error.
    plain: Vec<f64>,
    /// Absent for kinds with one input.
    cmrr: Vec<f64>,
    /// Volts at the output per volt of the rail.
    positive: Vec<f64>,
    negative: Vec<f64>,
}

impl Rejections {
    fn state(&self, part: &mut Part) {
        use PartFigure as P;
        for ([ratio, corner], at_dc, of_corner) in [
            (self.cmrr, P::Cmrr, P::CmrrCorner),
            (self.psrr_positive, P::PsrrPositive, P::PsrrPositiveCorner),
            (self.psrr_negative, P::PsrrNegative, P::PsrrNegativeCorner),
        ] {
            part.state(at_dc, Rating::typical(ratio));
            part.state(of_corner, Rating::typical(corner));
        }
    }
}

fn row(stage: &Stage, query: Query) -> LimitRow {
    let mut stage = stage.clone();
    stage.limits = vec![Limit { query, bound: Bound::Report, thin: Thin::Fraction(0.1) }];
    analyse(&stage).unwrap_or_else(|error| panic!("{error}")).limits.remove(0)
}

/// Compares every stage.
pub fn all(ledger: &mut Ledger) {
    let rows: Vec<Row> = serde_json::from_str(TABLE).unwrap_or_else(|error| panic!("rejection.json: {error}"));
    for Row { circuit, rejections, expected } in &rows {
        let mut stage = circuit.stage();
        rejections[0].state(&mut stage.part);
        for (number, part) in &mut stage.parts {
            rejections[*number - 1].state(part);
        }
        let mut tell = |query: Query, name: &str, value: f64, got: &Outcome| {
            let frequency = query.at.map_or_else(String::new, |f| format!(" {f}"));
            let name = format!("{}{frequency} {name}", query.figure.id());
            let allowed = budget(query.figure).around(value) + 5e-16 * value.abs();
            let wanted =
                Wanted { id: &format!("rejection: {}", circuit.id), name: &name, figure: query.figure, value, allowed, source: SOURCE };
            ledger.outcome(&wanted, got);
        };
        let spec = stage.kind.spec();
        let from_supply = (spec.inputs)(&stage).iter().any(|i| i.feed == Feed::Supply);
        let plain = expected.plain[0];
        for (k, &frequency) in expected.frequencies.iter().enumerate() {
            let at = |dc: Figure, elsewhere: Figure| if frequency > 0.0 { Query::at(elsewhere, frequency) } else { Query::of(dc) };
            let [least, greatest] = expected.gain[k];
            let query = at(Figure::Gain, Figure::GainAt);
            if query.at.is_some() || !from_supply {
                let LimitRow { nominal, range, .. } = row(&stage, query);
                let range = range.unwrap_or_else(|| panic!("{}: no range of {query:?}", circuit.id));
                tell(query, "nominal", expected.plain[k], &nominal);
                tell(query, "least", least, &Outcome::Value(range.0));
                tell(query, "greatest", greatest, &Outcome::Value(range.1));
            }
            if matches!(spec.drives, Drives::Differential) {
                let query = at(Figure::StageCmrr, Figure::StageCmrrAt);
                tell(query, "", expected.cmrr[k], &ask(&stage, query));
            }
            let (positive, negative) = (expected.positive[k], expected.negative[k]);
            if !from_supply {
                let query = at(Figure::StagePsrr, Figure::StagePsrrAt);
                tell(query, "", plain.abs() / positive.max(negative), &ask(&stage, query));
            }
            if frequency > 0.0 {
                stage.supply.as_mut().expect("stands between rails").ripple = Some(Ripple { peak: 0.1, frequency });
                let query = Query::of(Figure::RippleOutput);
                tell(query, &format!("at {frequency}"), 0.1 * (positive + negative), &ask(&stage, query));
            }
        }
        // Against the ideal gain 1, the follower's error is its gain less one.
        if circuit.kind() == "follower" {
            let range = row(&stage, Query::of(Figure::GainError)).range.expect("a range");
            tell(Query::of(Figure::GainError), "least", expected.gain[0][0] - 1.0, &Outcome::Value(range.0));
            tell(Query::of(Figure::GainError), "greatest", expected.gain[0][1] - 1.0, &Outcome::Value(range.1));
        }
    }
}

#[test]
fn stages_with_rejections_inside_the_network_are_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}

/// The corner is not guessed: what a rejection leaves at a frequency needs it.
#[test]
fn a_rejection_at_a_frequency_needs_its_corner() {
    let rows: Vec<Row> = serde_json::from_str(TABLE).unwrap_or_else(|error| panic!("rejection.json: {error}"));
    let row = rows.iter().find(|row| row.circuit.id == "difference").expect("a difference stage");
    let mut stage = row.circuit.stage();
    row.rejections[0].state(&mut stage.part);
    for (figure, corner) in [(Figure::StageCmrrAt, PartFigure::CmrrCorner), (Figure::StagePsrrAt, PartFigure::PsrrNegativeCorner)] {
        let mut stage = stage.clone();
        stage.part.state(corner, Rating::default());
        let needs = Outcome::Undetermined(vec![stageleaf_math::report::Need::Part(corner)]);
        assert_eq!(ask(&stage, Query::at(figure, 1e3)), needs);
        let dc = if figure == Figure::StageCmrrAt { Figure::StageCmrr } else { Figure::StagePsrr };
        assert!(ask(&stage, Query::of(dc)).value().is_some(), "{dc:?} does not");
    }
}
