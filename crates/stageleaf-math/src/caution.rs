//! What a reader of the report should be careful about.

use alloc::vec::Vec;

use crate::{
    analysis::{self, margins, outcome, spread::Spread, switching, thermal},
    figure::{Figure, Query},
    kind::Kind,
    network::GROUND,
    part::PartFigure,
    report::{Caution, NoiseOrigin, Outcome},
};

/// The extra-low-voltage limit for direct current: 60 V in dry locations (IEC 61140, from memory).
const EXTRA_LOW_VOLTAGE: f64 = 60.0;

/// The cautions of a stage.
pub(crate) fn cautions(spread: &mut Spread<'_>) -> Vec<Caution> {
    let solution = &spread.nominal;
    let model = solution.model;
    let stage = model.stage;
    let mut list = Vec::new();
    for figure in [PartFigure::DifferentialResistance, PartFigure::CommonModeResistance] {
        if solution.part(figure).is_none() {
            list.push(Caution::TakenAsIdeal(figure));
        }
    }
    let switches = stage.kind.switches();
    // An input that stands at ground takes no common mode to speak of; a comparator's thresholds are undetermined without it.
    if !switches
        && model.network.amplifiers.iter().any(|a| a.plus != GROUND)
        && let Some(figure) = [PartFigure::Cmrr, PartFigure::CmrrCorner].into_iter().find(|&f| solution.part(f).is_none())
    {
        list.push(Caution::TakenAsIdeal(figure));
    }
    let judged = if !switches && analysis::missing_small_signal(solution).is_none() { solution.amplifiers() } else { 0 };
    for amplifier in 0..judged {
        if let Some(needed) = solution.part_of(amplifier, PartFigure::StableGainMin)
            && let Some(crossover) = margins::of(solution, amplifier).last
        {
            let (above, below) = solution.amplifier(amplifier);
            let omega = solution.scaled(crossover);
            // Where the loop's gain ends |A·β| = 1, so the noise gain there is |A|.
            let noise_gain = crate::solution::magnitude(above.at(omega) / below.at(omega));
            if noise_gain < needed {
                list.push(Caution::BelowStableGain { noise_gain, needed });
                break;
            }
        }
    }
    if stage.kind == Kind::Instrumentation && judged > 0 {
        list.push(Caution::PairApart);
    }
    if stage.part.phase_reversal == Some(true) {
        list.push(Caution::PhaseReversal);
    }
    if let Some(supply) = stage.supply {
        let (least, greatest) = (supply.positive.low - supply.negative.high, supply.positive.high - supply.negative.low);
        let allowed = |figure: PartFigure| solution.part(figure);
        if let Some(allowed) = allowed(PartFigure::SupplySpanMax)
            && greatest > allowed
        {
            list.push(Caution::SupplySpan { span: greatest, allowed });
        }
        if let Some(allowed) = allowed(PartFigure::SupplySpanMin)
            && least < allowed
        {
            list.push(Caution::SupplySpan { span: least, allowed });
        }
        if greatest > EXTRA_LOW_VOLTAGE {
            list.push(Caution::HighVoltage { span: greatest });
        }
    }
    let works = switches || analysis::missing_small_signal(solution).is_none() && solution.no_dc_path().is_none();
    if works && (switches || !solution.oscillates()) {
        let resistors = if switches { switching::resistors(solution) } else { thermal::resistors(solution).collect() };
        for (origin, power) in resistors {
            if let NoiseOrigin::Component(component) = origin
                && let Some(rating) = stage.component(component).and_then(|c| c.rating)
                && power > rating
            {
                list.push(Caution::ResistorHot { component, power, rating });
            }
        }
    }
    if works {
        if !switches && solution.oscillates() {
            list.push(Caution::Oscillates);
        } else {
            for (figure, edge) in
                [(Figure::ClipMargin, 0.0), (Figure::InputRangeMargin, 0.0), (Figure::CurrentMargin, 0.0), (Figure::SlewMargin, 1.0)]
            {
                if let Some(margin) = outcome(solution, Query::of(figure)).value()
                    && margin < edge
                {
                    list.push(Caution::Exceeded { figure, margin });
                }
            }
            if let (Some(offset), Some(supply)) = (outcome(solution, Query::of(Figure::OutputOffset)).value(), stage.supply)
                && offset > supply.positive.nominal - supply.negative.nominal
            {
                list.push(Caution::OffsetBeyondSupply { offset });
            }
        }
    }
    if switches {
        if let (Some(volts), Some(allowed)) = (switching::differential(solution), solution.part(PartFigure::DifferentialMax))
            && volts > allowed
        {
            list.push(Caution::DifferentialInput { volts, allowed });
        }
        let disturbance = switching::disturbance(solution);
        if let Some(hysteresis) = spread.extremes(Query::of(Figure::Hysteresis)).low.outcome.value()
            && hysteresis <= disturbance
        {
            list.push(Caution::Chatter { hysteresis, disturbance });
        }
    }
    if !switches && !list.contains(&Caution::Oscillates) && spread.oscillated() {
        list.push(Caution::OscillatesWithin);
    }
    let solution = &spread.nominal;
    let exact: Vec<_> = stage.components.iter().filter(|c| c.value.minus + c.value.plus <= 0.0).map(|c| c.name).collect();
    if !exact.is_empty() {
        list.push(Caution::TakenAsExact(exact));
    }
    let junction_max = solution.part(PartFigure::JunctionMax);
    match (junction_max, &spread.extremes(Query::of(Figure::JunctionTemperature)).high.outcome) {
        (_, Outcome::NoSteadyTemperature) => list.push(Caution::ThermalRunaway),
        (Some(allowed), Outcome::Value(junction)) if *junction > allowed => {
            list.push(Caution::JunctionHot { junction: *junction, allowed });
        }
        _ => {}
    }
    list
}
