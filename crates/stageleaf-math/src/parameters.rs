//! The table of everything that can vary from build to build: one slot per value, with its range and its grade.

use alloc::vec::Vec;

use crate::{
    part::{PartFigure, Rating, Worse},
    report::Parameter,
    stage::{Source, Stage, Toleranced},
};

/// How good a bound is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Grade {
    /// Stated by the note (a tolerance, a supply range): no question of the part's data.
    Stated,
    /// Guaranteed by the part's data sheet.
    Guaranteed,
    /// Typical.
    Typical,
}

/// Groups of results, to skip work that a value cannot change.
pub mod touch {
    /// Response and loop.
    pub const NETWORK: u8 = 1;
    /// Noise.
    pub const NOISE: u8 = 2;
    /// DC errors.
    pub const DC: u8 = 4;
    /// Swing, range, current, slew.
    pub const SWING: u8 = 8;
    /// Dissipation and temperature.
    pub const POWER: u8 = 16;
    /// What an amplifier's common-mode rejection leaves of a gain.
    pub const REJECTION: u8 = 32;
    /// All of them.
    pub const ALL: u8 = 63;
}

/// One slot.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Entry {
    /// What it is.
    pub parameter: Parameter,
    /// Nominal value.
    pub nominal: f64,
    /// Least value over the spread.
    pub low: f64,
    /// Greatest value over the spread.
    pub high: f64,
    /// Grades of nominal, low and high.
    pub grade: [Grade; 3],
    /// Temperature coefficient's magnitude, 1/K (components only).
    pub drift: f64,
    /// Which results it can change.
    pub touches: u8,
}

/// The table.
#[derive(Clone, Debug, PartialEq)]
pub struct Parameters {
    /// Slots, in a fixed order: components, source, load, strays, supplies, temperature, part figures, headroom.
    pub entries: Vec<Entry>,
    /// By amplifier: slot of each part figure. Amplifiers of one part share its slots.
    parts: Vec<[u8; PartFigure::COUNT]>,
    supply: Option<(usize, usize)>,
    temperature: Option<usize>,
    headroom: usize,
}

const ABSENT: u8 = u8::MAX;

impl Parameters {
    /// The table of a stage.
    #[must_use]
    pub fn of(stage: &Stage) -> Self {
        let mut entries = Vec::new();
        let away = stage.ambient.map_or(0.0, |a| a.away());
        let mut passive = |parameter: Parameter, value: &Toleranced| {
            let drift = value.drift * away;
            // A reference may be below zero.
            let ends = [value.nominal * (1.0 - value.minus) * (1.0 - drift), value.nominal * (1.0 + value.plus) * (1.0 + drift)];
            entries.push(Entry {
                parameter,
                nominal: value.nominal,
                low: ends[0].min(ends[1]),
                high: ends[0].max(ends[1]),
                grade: [Grade::Stated; 3],
                drift: value.drift,
                touches: touch::ALL,
            });
        };
        for component in &stage.components {
            passive(Parameter::Component(component.name), &component.value);
        }
        for (input, source) in (0u8..).zip(&stage.sources) {
            match source {
                Some(Source::Resistive { resistance: value } | Source::Capacitive { capacitance: value }) => {
                    passive(Parameter::SourceImpedance(input), value);
                }
                Some(Source::Photodiode { capacitance, shunt_resistance, dark_current }) => {
                    passive(Parameter::SourceImpedance(input), capacitance);
                    if let Some(value) = shunt_resistance {
                        passive(Parameter::SourceShunt(input), value);
                    }
                    if let Some(value) = dark_current {
                        passive(Parameter::DarkCurrent(input), value);
                    }
                }
                None => {}
            }
        }
        if let Some(reference) = &stage.reference {
            passive(Parameter::ReferenceVoltage, &reference.voltage);
            if let Some(value) = &reference.resistance {
                passive(Parameter::ReferenceResistance, value);
            }
        }
        for (parameter, value) in [
            (Parameter::LoadResistance, &stage.load.resistance),
            (Parameter::LoadCapacitance, &stage.load.capacitance),
            (Parameter::ConverterSeries, &stage.converter.series_resistance),
            (Parameter::ConverterShunt, &stage.converter.shunt_capacitance),
            (Parameter::SampleCapacitance, &stage.converter.sample_capacitance),
            (Parameter::SwitchResistance, &stage.converter.switch_resistance),
            (Parameter::StrayInverting, &stage.board.inverting_node),
            (Parameter::StrayNonInverting, &stage.board.non_inverting_node),
            (Parameter::StrayFeedback, &stage.board.across_feedback),
        ] {
            if let Some(value) = value {
                passive(parameter, value);
            }
        }
        let mut stated = |parameter: Parameter, span: crate::stage::Span, touches: u8| {
            entries.push(Entry {
                parameter,
                nominal: span.nominal,
                low: span.low,
                high: span.high,
                grade: [Grade::Stated; 3],
                drift: 0.0,
                touches,
            });
            entries.len() - 1
        };
        let supply = stage.supply.map(|s| {
            let touches = touch::DC | touch::SWING | touch::POWER;
            (stated(Parameter::SupplyPositive, s.positive, touches), stated(Parameter::SupplyNegative, s.negative, touches))
        });
        let temperature =
            stage.ambient.map(|a| stated(Parameter::Temperature, a.range, touch::NOISE | touch::DC | touch::SWING | touch::POWER));
        if let Some(span) = stage.common_mode {
            stated(Parameter::CommonMode, span, touch::DC | touch::SWING);
        }
        if stage.kind.switches() {
            // Ahead of the part's figures: with a sign, these are seen to matter.
            stated(Parameter::ErrorSign, crate::stage::Span { low: -1.0, nominal: 0.0, high: 1.0 }, touch::DC | touch::SWING);
        }
        let mut parts = Vec::new();
        let mut main = [ABSENT; PartFigure::COUNT];
        for &figure in PartFigure::ALL {
            if let Some(entry) = part_entry(Parameter::Part(figure), figure, stage.part.rating(figure)) {
                main[figure as usize] = u8::try_from(entries.len()).unwrap_or(ABSENT);
                entries.push(entry);
            }
        }
        for amplifier in 0..(stage.kind.spec().amplifiers) {
            let mut slots = main;
            if let Some((number, part)) = stage.parts.iter().find(|(a, _)| *a == amplifier + 1) {
                slots = [ABSENT; PartFigure::COUNT];
                for &figure in PartFigure::ALL {
                    let parameter = Parameter::PartOf(u8::try_from(*number).unwrap_or(u8::MAX), figure);
                    if let Some(entry) = part_entry(parameter, figure, part.rating(figure)) {
                        slots[figure as usize] = u8::try_from(entries.len()).unwrap_or(ABSENT);
                        entries.push(entry);
                    }
                }
            }
            parts.push(slots);
        }
        // A data sheet states no sign: nothing at nominal values, either in the spread.
        for (amplifier, slots) in (0u8..).zip(&parts) {
            if slots[PartFigure::Cmrr as usize] != ABSENT {
                entries.push(Entry {
                    parameter: Parameter::RejectionSign(amplifier),
                    nominal: 0.0,
                    low: -1.0,
                    high: 1.0,
                    grade: [Grade::Stated; 3],
                    drift: 0.0,
                    touches: if stage.kind.switches() { touch::REJECTION | touch::DC | touch::SWING } else { touch::REJECTION },
                });
            }
        }
        let headroom = entries.len();
        entries.push(headroom_entry(stage));
        Self { entries, parts, supply, temperature, headroom }
    }

    /// The slot of a parameter, if the stage has it.
    #[must_use]
    pub fn slot(&self, parameter: Parameter) -> Option<usize> {
        match parameter {
            Parameter::Part(figure) => self.part_slot(0, figure),
            other => self.entries.iter().position(|e| e.parameter == other),
        }
    }

    /// The slot of a figure of an amplifier's part, if the part states it.
    #[must_use]
    pub fn part_slot(&self, amplifier: usize, figure: PartFigure) -> Option<usize> {
        let slot = self.parts.get(amplifier)?[figure as usize];
        (slot != ABSENT).then_some(usize::from(slot))
    }

    /// Slots of positive and negative supply.
    #[must_use]
    pub const fn supply(&self) -> Option<(usize, usize)> {
        self.supply
    }

    /// Slot of the ambient temperature.
    #[must_use]
    pub const fn temperature(&self) -> Option<usize> {
        self.temperature
    }

    /// Slot of the headroom tables' position between typical (0) and guaranteed (1).
    #[must_use]
    pub const fn headroom(&self) -> usize {
        self.headroom
    }

    /// Every nominal value, by slot; behind them, at [`Parameters::pole_factor`], the factor on the part's higher poles.
    #[must_use]
    pub fn nominal(&self) -> Vec<f64> {
        self.entries.iter().map(|e| e.nominal).chain(core::iter::once(1.0)).collect()
    }

    /// Index of the factor on the part's higher poles, which no data sheet states a spread for: moved only to ask what rests on them.
    #[must_use]
    pub fn pole_factor(&self) -> usize {
        self.entries.len()
    }
}

fn part_entry(parameter: Parameter, figure: PartFigure, rating: &Rating) -> Option<Entry> {
    let nominal = rating.nominal(figure.worse())?;
    let nominal_grade = match (rating.typ, figure.worse(), rating.min, rating.max) {
        (Some(_), ..) => Grade::Typical,
        (None, Worse::High, _, Some(_)) | (None, Worse::Low, Some(_), _) => Grade::Guaranteed,
        _ => Grade::Typical,
    };
    let bound = |stated: Option<f64>, pick: fn(f64, f64) -> f64| match stated {
        Some(v) => (pick(v, nominal), Grade::Guaranteed),
        None => (nominal, nominal_grade),
    };
    let (low, low_grade) = bound(rating.min, f64::min);
    let (high, high_grade) = bound(rating.max, f64::max);
    Some(Entry { parameter, nominal, low, high, grade: [nominal_grade, low_grade, high_grade], drift: 0.0, touches: part_touches(figure) })
}

const fn part_touches(figure: PartFigure) -> u8 {
    use PartFigure as P;
    match figure {
        P::OpenLoop
        | P::Gbw
        | P::OutputResistance
        | P::DifferentialResistance
        | P::DifferentialCapacitance
        | P::CommonModeResistance
        | P::CommonModeCapacitance => touch::ALL,
        P::NoiseVoltage | P::NoiseVoltageCorner | P::NoiseExponent | P::NoiseCurrent | P::NoiseCurrentCorner => touch::NOISE,
        P::Offset | P::OffsetDrift | P::OffsetCurrent | P::PsrrPositive | P::PsrrNegative => touch::DC | touch::SWING,
        P::Startup | P::RangeFromNegative | P::RangeFromPositive | P::SlewRise | P::SlewFall => touch::SWING,
        P::BiasCurrent | P::BiasDoubling | P::CurrentLimit | P::SupplyCurrent | P::JunctionToAmbient => {
            touch::DC | touch::SWING | touch::POWER
        }
        P::OverloadRecovery => touch::SWING,
        P::SupplySpanMin | P::SupplySpanMax | P::DifferentialMax | P::ClampCurrentMax | P::StableGainMin | P::JunctionMax => 0,
        P::Cmrr => touch::DC | touch::SWING | touch::REJECTION,
        P::CmrrCorner => touch::DC | touch::REJECTION,
        P::PsrrPositiveCorner | P::PsrrNegativeCorner => touch::DC,
    }
}

fn headroom_entry(stage: &Stage) -> Entry {
    let rows = || stage.part.headroom_high.iter().chain(&stage.part.headroom_low);
    let any_typical = rows().any(|h| h.volts.typ.is_some());
    let all_guaranteed = !stage.part.headroom_high.is_empty() && rows().all(|h| h.volts.max.is_some());
    let nominal = if any_typical { 0.0 } else { 1.0 };
    let high_grade = if all_guaranteed { Grade::Guaranteed } else { Grade::Typical };
    let low_grade = if any_typical { Grade::Typical } else { high_grade };
    Entry {
        parameter: Parameter::Headroom,
        nominal,
        low: nominal,
        high: 1.0,
        grade: [low_grade, low_grade, high_grade],
        drift: 0.0,
        // A comparator's output rests at its headroom, and heats by it.
        touches: if stage.kind.switches() { touch::SWING | touch::POWER } else { touch::SWING },
    }
}
