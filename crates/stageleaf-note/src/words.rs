//! The one table of words for what the engine reports as data.

use stageleaf_math::{
    dimension::Dimension,
    figure::Figure,
    kind::Kind,
    part::{PartFigure, Rating},
    report::{Caution, Coordinate, DcCause, Need, NoiseOrigin, Outcome, Parameter},
};

use crate::{
    print::{format, trimmed},
    unit,
};

/// A kind in a sentence: "a non-inverting stage", "an integrator", "a Sallen–Key low-pass".
#[must_use]
pub fn kind_text(kind: Kind) -> String {
    let noun = kind_noun(kind);
    let vowel = noun.starts_with(['a', 'e', 'i', 'o', 'u', 'A']);
    format!("{} {noun}", if vowel { "an" } else { "a" })
}

/// The same without its article.
#[must_use]
pub fn kind_noun(kind: Kind) -> String {
    let title = kind.spec().title;
    let mut letters = title.chars();
    let first = letters.next().unwrap_or_default();
    // Initials and names stay: "AC-coupled", "Sallen–Key".
    if letters.clone().next().is_some_and(|c| c.is_ascii_uppercase()) || title.starts_with("Sallen") {
        return title.to_owned();
    }
    [first.to_ascii_lowercase()].into_iter().chain(letters).collect()
}

/// What varies, as a corner or a verdict names it: "Rf", "positive supply", "gain-bandwidth product (gain.gbw)".
#[must_use]
pub fn parameter_text(parameter: Parameter) -> String {
    match parameter {
        Parameter::Component(name) => name.into(),
        Parameter::SourceImpedance(input) => numbered("source impedance", input),
        Parameter::SourceShunt(input) => numbered("source shunt resistance", input),
        Parameter::DarkCurrent(input) => numbered("dark current", input),
        Parameter::CommonMode => "common-mode voltage".into(),
        Parameter::ErrorSign => "sign of the input errors".into(),
        Parameter::ReferenceVoltage => "reference voltage".into(),
        Parameter::ReferenceResistance => "output resistance of the reference".into(),
        Parameter::LoadResistance => "load resistance".into(),
        Parameter::LoadCapacitance => "load capacitance".into(),
        Parameter::ConverterSeries => "converter's series resistance".into(),
        Parameter::ConverterShunt => "converter's shunt capacitance".into(),
        Parameter::SampleCapacitance => "sampling capacitor".into(),
        Parameter::SwitchResistance => "resistance of the sampling switch".into(),
        Parameter::StrayInverting => "stray capacitance at the inverting input".into(),
        Parameter::StrayNonInverting => "stray capacitance at the non-inverting input".into(),
        Parameter::StrayFeedback => "stray capacitance across the feedback".into(),
        Parameter::SupplyPositive => "positive supply".into(),
        Parameter::SupplyNegative => "negative supply".into(),
        Parameter::Temperature => "ambient temperature".into(),
        Parameter::Part(figure) => figure.meaning().into(),
        Parameter::PartOf(amplifier, figure) => format!("{} of A{amplifier}", figure.meaning()),
        Parameter::RejectionSign(amplifier) => of_amplifier("sign of the common-mode error", amplifier),
        Parameter::Headroom => "output headroom".into(),
    }
}

/// "source impedance", of the second input on "source impedance at in2".
fn numbered(what: &str, input: u8) -> String {
    if input == 0 { what.into() } else { format!("{what} at in{}", u32::from(input) + 1) }
}

/// "Amplifier voltage noise", of the second amplifier on with "of A2".
fn of_amplifier(what: &str, amplifier: u8) -> String {
    if amplifier == 0 { what.into() } else { format!("{what}, A{}", u32::from(amplifier) + 1) }
}

/// The value of a coordinate that is no quantity: between typical and guaranteed, or a sign.
#[must_use]
pub fn coordinate_word(coordinate: &Coordinate) -> Option<String> {
    let word = |low: &str, high: &str| if coordinate.value > 0.5 { high.to_owned() } else { low.to_owned() };
    match coordinate.parameter {
        Parameter::Headroom => Some(word("typical", "guaranteed")),
        Parameter::ErrorSign | Parameter::RejectionSign(_) => Some(word("−", "+")),
        _ => None,
    }
}

/// What a parameter measures, for its values in a corner.
///
/// The headroom's coordinate is a plain number from 0 (typical) to 1 (guaranteed); a source may be resistive or
/// capacitive, which the stage tells.
#[must_use]
pub fn parameter_dimension(parameter: Parameter, stage: &stageleaf_math::stage::Stage) -> Dimension {
    use stageleaf_math::stage::Source;
    match parameter {
        Parameter::Component(name) => stage.kind.components().iter().find(|s| s.name == name).map_or(Dimension::Number, |s| s.dimension),
        Parameter::SourceImpedance(input) => match stage.source(usize::from(input)) {
            Some(Source::Capacitive { .. } | Source::Photodiode { .. }) => Dimension::Capacitance,
            _ => Dimension::Resistance,
        },
        Parameter::LoadResistance
        | Parameter::SourceShunt(_)
        | Parameter::ReferenceResistance
        | Parameter::ConverterSeries
        | Parameter::SwitchResistance => Dimension::Resistance,
        Parameter::DarkCurrent(_) => Dimension::Current,
        Parameter::LoadCapacitance
        | Parameter::ConverterShunt
        | Parameter::SampleCapacitance
        | Parameter::StrayInverting
        | Parameter::StrayNonInverting
        | Parameter::StrayFeedback => Dimension::Capacitance,
        Parameter::SupplyPositive | Parameter::SupplyNegative | Parameter::CommonMode | Parameter::ReferenceVoltage => Dimension::Voltage,
        Parameter::Temperature => Dimension::Temperature,
        Parameter::Part(figure) | Parameter::PartOf(_, figure) => figure.dimension(),
        Parameter::RejectionSign(_) | Parameter::ErrorSign | Parameter::Headroom => Dimension::Number,
    }
}

/// What must be stated and where: "`junction_to_ambient` (K/W) under \[thermal\] in site/shelf/alder-10.toml, with its
/// source".
#[must_use]
pub fn need_text(need: Need, part_file: &str) -> String {
    let part = |table: &str, key: &str, what: &str| format!("`{key}` ({what}) under [{table}] in {part_file}, with its source");
    match need {
        Need::Part(figure) => {
            let unit = figure.dimension();
            let (table, key) = figure.id().split_once('.').unwrap_or(("part", figure.id()));
            match figure {
                PartFigure::SupplySpanMin | PartFigure::SupplySpanMax => part("supply", "span", "V"),
                PartFigure::RangeFromNegative => part("input", "range = { from_negative }", "V"),
                PartFigure::RangeFromPositive => part("input", "range = { from_positive }", "V"),
                PartFigure::CmrrCorner => part("input", "cmrr = { corner }", "Hz"),
                PartFigure::PsrrPositiveCorner => part("input", "psrr_positive = { corner }", "Hz"),
                PartFigure::PsrrNegativeCorner => part("input", "psrr_negative = { corner }", "Hz"),
                _ => part(table, key, shown_unit(unit)),
            }
        }
        Need::Poles => format!(
            "`poles` (a list in Hz, `[]` where there are none) or `phase_margin` with its conditions under [gain] in {part_file}, with its source"
        ),
        Need::HeadroomHigh => part("output", "headroom_high", "rows of current against V, up to the current asked"),
        Need::HeadroomLow => part("output", "headroom_low", "rows of current against V, up to the current asked"),
        Need::Ripple => "`ripple` and `ripple_frequency` under [supply] in the stage's block".into(),
        Need::Supply => "[supply] with `positive` and `negative` in the stage's block".into(),
        Need::Signal => "[signal] with its amplitude, or its `dc` alone, in the stage's block".into(),
        Need::SignalAmplitude => "an amplitude under [signal] in the stage's block, as `peak = \"1 V\"`, beside its `dc`".into(),
        Need::SignalFrequency => "`frequency` under [signal] in the stage's block".into(),
        Need::Ambient => "[ambient] with `range` in the stage's block".into(),
        Need::Band => "[band] with `from` and `to` in the stage's block".into(),
        Need::FullScale | Need::Bits | Need::SampleCapacitance | Need::AcquisitionTime => {
            let key = need.key();
            format!("`{}` under [converter] in the stage's block", key.split_once('.').map_or(key, |(_, key)| key))
        }
    }
}

/// A caution in a sentence.
#[must_use]
pub fn caution_text(caution: &Caution) -> String {
    match caution {
        Caution::BelowStableGain { noise_gain, needed } => format!(
            "The noise gain at crossover is {}; the part asks for at least {}.",
            format(*noise_gain, Dimension::Number, 3),
            trimmed(*needed, Dimension::Number, 3)
        ),
        Caution::SupplySpan { span, allowed } => format!(
            "The supply span reaches {}; the part's bound is {}.",
            trimmed(*span, Dimension::Voltage, 3),
            trimmed(*allowed, Dimension::Voltage, 3)
        ),
        Caution::JunctionHot { junction, allowed } => format!(
            "The junction reaches {} at the worst case; the part allows {}, and nothing on its data sheet holds above that.",
            format(*junction, Dimension::Temperature, 3),
            trimmed(*allowed, Dimension::Temperature, 3)
        ),
        Caution::ThermalRunaway => {
            "No junction temperature below 300 °C is steady at the worst case: what depends on it has no value (thermal runaway).".into()
        }
        Caution::ResistorHot { component, power, rating } => format!(
            "{component} turns {} to heat at the worst case; its rating is {}.",
            format(*power, Dimension::Power, 3),
            trimmed(*rating, Dimension::Power, 3)
        ),
        Caution::HighVoltage { span } => format!(
            "The supply span of {} lies above the extra-low-voltage range: local codes and licensed practice decide.",
            trimmed(*span, Dimension::Voltage, 3)
        ),
        Caution::PhaseReversal => "The output reverses when an input leaves its range: keep the input range margin.".into(),
        Caution::TakenAsIdeal(figure) => {
            format!("The part states no {} ({}); the small-signal figures take it as ideal.", figure.meaning(), figure.id())
        }
        Caution::Oscillates => "The stage oscillates: a closed-loop pole lies in the right half plane.".into(),
        Caution::PairApart => "The margins take one amplifier at a time, the others alive. The loop of the input pair in common mode, where each is a follower with its feedback resistor before its input capacitance, is not among them: work its margin out apart.".into(),
        Caution::OscillatesWithin => "The stage oscillates in a build that the tolerances allow.".into(),
        Caution::Exceeded { figure, margin } => match figure {
            Figure::ClipMargin => {
                format!("At nominal values the signal clips: the output lacks {}.", trimmed(-margin, Dimension::Voltage, 3))
            }
            Figure::InputRangeMargin => {
                format!("At nominal values an input leaves its range by {}.", trimmed(-margin, Dimension::Voltage, 3))
            }
            Figure::CurrentMargin => {
                format!("At nominal values the output current exceeds its limit by {}.", trimmed(-margin, Dimension::Current, 3))
            }
            _ => format!(
                "At nominal values the signal is faster than the amplifier slews: {} of what it needs.",
                format(*margin, Dimension::Fraction, 3)
            ),
        },
        Caution::OffsetBeyondSupply { offset } => {
            format!("The DC errors alone come to {} at the output: it rests at a rail.", trimmed(*offset, Dimension::Voltage, 3))
        }
        Caution::DifferentialInput { volts, allowed } => format!(
            "At nominal values the inputs come {} apart; the part allows {}.",
            format(*volts, Dimension::Voltage, 3),
            trimmed(*allowed, Dimension::Voltage, 3)
        ),
        Caution::Chatter { hysteresis, disturbance } => format!(
            "The output may chatter: the hysteresis is {} at the least, and noise and supply ripple move the thresholds by {} peak to peak.",
            format(*hysteresis, Dimension::Voltage, 3),
            format(*disturbance, Dimension::Voltage, 3)
        ),
        Caution::TakenAsExact(names) => format!("Without a tolerance, and exact at the worst case: {}.", names.join(", ")),
    }
}

/// The cause of a DC error.
#[must_use]
pub fn cause_text(cause: DcCause) -> String {
    match cause {
        DcCause::DarkCurrent => "Dark current of the source",
        DcCause::Offset => "Input offset voltage",
        DcCause::OffsetDrift => "Offset drift over temperature",
        DcCause::BiasCurrent => "Bias current",
        DcCause::OffsetCurrent => "Offset current",
        DcCause::CommonMode => "Common-mode voltage",
        DcCause::SupplyPositive => "Deviation of the positive supply",
        DcCause::SupplyNegative => "Deviation of the negative supply",
    }
    .into()
}

/// The source of noise.
#[must_use]
pub fn origin_text(origin: NoiseOrigin) -> String {
    match origin {
        NoiseOrigin::Component(name) => return format!("{name}, thermal"),
        NoiseOrigin::SourceResistance(input) => return numbered("Source resistance, thermal", input),
        NoiseOrigin::SourceShot(input) => return numbered("Shot noise of the source's current", input),
        NoiseOrigin::ReferenceResistance => "Output resistance of the reference, thermal",
        NoiseOrigin::LoadResistance => "Load resistance, thermal",
        NoiseOrigin::ConverterSeries => "Series resistor of the converter, thermal",
        NoiseOrigin::AmplifierVoltage(a) => return of_amplifier("Amplifier voltage noise", a),
        NoiseOrigin::CurrentNonInverting(a) => return of_amplifier("Current noise, non-inverting input", a),
        NoiseOrigin::CurrentInverting(a) => return of_amplifier("Current noise, inverting input", a),
    }
    .into()
}

/// A value with `digits` significant digits, or why there is none, in a few words.
#[must_use]
pub fn outcome_text(outcome: &Outcome, d: Dimension, digits: usize) -> String {
    match outcome {
        Outcome::Value(value) => format(*value, d, digits),
        Outcome::AtLeast(value) => {
            format!("at least {}, a lower bound: it can break a limit but not make it hold", format(*value, d, digits))
        }
        Outcome::Undetermined(needs) => {
            let keys: Vec<String> = needs.iter().map(|n| format!("`{}`", n.key())).collect();
            if keys.is_empty() { "undetermined".into() } else { format!("undetermined: needs {}", keys.join(", ")) }
        }
        Outcome::DoesNotApply(why) => format!("does not apply: {why}"),
        Outcome::Oscillates => "oscillates".into(),
        Outcome::NoDcPath(at) => {
            let input = if at.inverting { "inverting" } else { "+" };
            of_amplifier(&format!("no DC path for the bias current at the {input} input"), at.amplifier)
        }
        Outcome::NoSteadyTemperature => "no steady temperature below 300 °C (thermal runaway)".into(),
        Outcome::OutOfReach(why) => format!("undetermined: {why}"),
    }
}

/// A data-sheet figure as stated: "9 nV/√Hz typical", "0.5 mV typical, 2 mV at most".
#[must_use]
pub fn rating_text(rating: &Rating, d: Dimension) -> String {
    let show = |v: f64| trimmed(v, d, 6);
    let stated = [
        rating.min.map(|v| format!("{} at least", show(v))),
        rating.typ.map(|v| format!("{} typical", show(v))),
        rating.max.map(|v| format!("{} at most", show(v))),
    ];
    let stated: Vec<String> = stated.into_iter().flatten().collect();
    if stated.is_empty() { "not stated".into() } else { stated.join(", ") }
}

/// The unit in which a dimension is usually stated.
fn shown_unit(d: Dimension) -> &'static str {
    match d {
        Dimension::Number => "a number",
        Dimension::Gain => "V/V or dB",
        Dimension::Angle => "°",
        Dimension::SlewRate => "V/µs",
        d => unit::spellings(d).first().copied().unwrap_or(""),
    }
}
