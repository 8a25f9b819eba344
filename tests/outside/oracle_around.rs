//! What stands around random stages of every kind (ripple on the supplies), solved by `oracle_around.py` in mpmath by another route
//! than ours.
//!
//! `STAGELEAF_ORACLE_AROUND` may name another table of the same program (see `scripts/oracle`).

use serde::Deserialize;
use stageleaf_math::{
    figure::Figure,
    part::{PartFigure, Rating},
    stage::{Ripple, Span, Stage, Supply},
};

use crate::{
    budget::budget,
    ledger::{Ledger, Wanted},
    oracle_kinds::Circuit,
    setup::figure,
};

const TABLE: &str = include_str!("oracle_around.json");
const SOURCE: &str = "oracle_around.py: nodal matrices in mpmath (50 digits)";
/// What the table's 13 digits leave, relative.
const PRINTED: f64 = 5e-13;

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Row {
    circuit: Circuit,
    expected: Expected,
}

/// What stands around a circuit.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Around {
    /// Positive and negative rail, V.
    supply: [f64; 2],
    /// Rejection of the positive rail and its corner, of the negative rail and its corner.
    psrr: [f64; 4],
    /// Peak and frequency.
    ripple: [f64; 2],
}

#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    ripple_output: f64,
}

impl Around {
    fn stand(&self, stage: &mut Stage) {
        let [peak, frequency] = self.ripple;
        let [positive, negative] = self.supply.map(Span::exact);
        stage.supply = Some(Supply { positive, negative, ripple: Some(Ripple { peak, frequency }) });
        let figures = [PartFigure::PsrrPositive, PartFigure::PsrrPositiveCorner, PartFigure::PsrrNegative, PartFigure::PsrrNegativeCorner];
        let parts = core::iter::once(&mut stage.part).chain(stage.parts.iter_mut().map(|(_, part)| part));
        for part in parts {
            for (figure, value) in figures.into_iter().zip(self.psrr) {
                part.state(figure, Rating::typical(value));
            }
        }
    }
}

/// Compares every circuit.
pub fn all(ledger: &mut Ledger) {
    let other =
        std::env::var("STAGELEAF_ORACLE_AROUND").ok().map(|path| std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}")));
    let rows: Vec<Row> =
        serde_json::from_str(other.as_deref().unwrap_or(TABLE)).unwrap_or_else(|error| panic!("oracle_around.json: {error}"));
    for Row { circuit, expected } in &rows {
        let mut stage = circuit.stage();
        circuit.around.as_ref().expect("something stands around every circuit").stand(&mut stage);
        let mut compare = |of: Figure, value: f64| {
            let allowed = budget(of).around(value) + PRINTED * value.abs();
            let wanted = Wanted { id: &circuit.id, name: of.id(), figure: of, value, allowed, source: SOURCE };
            ledger.outcome(&wanted, &figure(&stage, of));
        };
        compare(Figure::RippleOutput, expected.ripple_output);
    }
}

#[test]
fn what_stands_around_random_circuits_is_met() {
    let mut ledger = Ledger::default();
    all(&mut ledger);
    ledger.close();
}
