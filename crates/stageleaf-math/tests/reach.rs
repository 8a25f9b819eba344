//! What is said not to reach a figure does not change it: the worst case leaves such parameters out.

#[path = "samples/mod.rs"]
mod samples;

use samples::stage;
use stageleaf_math::{
    analysis::{at_dc, outcome, reaches, touched_by},
    figure::{Argument, Figure, Query},
    kind::Kind,
    model::Model,
    parameters::touch,
    part::{PartFigure, Rating},
    report::{Outcome, Parameter},
    solution::Solution,
};

/// A part whose bias current doubles with the heat, so that all paths are there.
fn warmed(kind: Kind) -> stageleaf_math::stage::Stage {
    let mut stage = stage(kind, 1.0, 1.0);
    for (figure, value) in [
        (PartFigure::BiasDoubling, 10.0),
        (PartFigure::SupplyCurrent, 1e-3),
        (PartFigure::JunctionToAmbient, 150.0),
        (PartFigure::CurrentLimit, 0.03),
        (PartFigure::SlewRise, 1e7),
        (PartFigure::SlewFall, 1e7),
        (PartFigure::RangeFromNegative, 1.0),
        (PartFigure::RangeFromPositive, 1.0),
        (PartFigure::CmrrCorner, 1e3),
        (PartFigure::PsrrPositiveCorner, 1e3),
        (PartFigure::PsrrNegativeCorner, 1e3),
    ] {
        stage.part.state(figure, Rating::typical(value));
    }
    let row = |current, typ, max| stageleaf_math::part::Headroom {
        current,
        volts: Rating { min: None, typ: Some(typ), max: Some(max), source: None },
    };
    stage.converter.full_scale = Some([-5.0, 5.0]);
    stage.converter.bits = Some(16.0);
    stage.converter.acquisition_time = Some(1e-4);
    stage.converter.sample_capacitance = Some(stageleaf_math::stage::Toleranced::exact(1e-11));
    stage.part.headroom_high = vec![row(0.0, 1.0, 1.5), row(0.03, 2.0, 3.0)];
    stage.part.headroom_low = stage.part.headroom_high.clone();
    stage
}

fn bits(outcome: &Outcome) -> Option<u64> {
    outcome.value().map(f64::to_bits)
}

#[test]
fn what_does_not_reach_a_figure_does_not_change_it() {
    let (mut left_out, mut steady) = (0, 0);
    for &kind in Kind::ALL {
        for stage in [warmed(kind), stage(kind, 1.0, 1.0)] {
            let model = Model::compile(&stage);
            let nominal = Solution::new(&model, model.parameters.nominal(), None);
            for (slot, entry) in model.parameters.entries.iter().enumerate() {
                // Away from nominal values, where nothing is nothing by chance.
                let mut values = model.parameters.nominal();
                for (value, entry) in values.iter_mut().zip(&model.parameters.entries) {
                    *value = if matches!(entry.parameter, Parameter::Headroom | Parameter::RejectionSign(_)) { 0.5 } else { *value * 1.01 };
                }
                let base = Solution::new(&model, values.clone(), None);
                values[slot] = if entry.nominal == 0.0 { 0.7 } else { values[slot] * 1.1 };
                let moved = Solution::new(&model, values, None);
                for &figure in Figure::ALL {
                    let query = if matches!(figure.argument(), Argument::None) { Query::of(figure) } else { Query::at(figure, 3e3) };
                    let touched = touched_by(figure) & entry.touches != 0;
                    let out = touched && !reaches(&model, entry.parameter, figure);
                    let still = touched && entry.touches & touch::NETWORK != 0 && model.reactive(slot) && at_dc(&nominal, figure);
                    if out || still {
                        left_out += usize::from(out);
                        steady += usize::from(still);
                        let (before, after) = (outcome(&base, query), outcome(&moved, query));
                        assert_eq!(
                            bits(&before),
                            bits(&after),
                            "{kind:?}: {:?} changes {figure:?} from {before:?} to {after:?}",
                            entry.parameter
                        );
                    }
                }
            }
        }
    }
    assert!(left_out > 1000 && steady > 100, "{left_out} and {steady} were tried");
}
