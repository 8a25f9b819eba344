//! What the engine found about a stage: figures, verdicts, curves, budgets, working. Numbers only; text is made elsewhere.

use alloc::{string::String, vec::Vec};

use crate::{
    dimension::Dimension,
    figure::Query,
    limit::{Basis, Limit, Verdict},
    measured::MeasuredRow,
    part::PartFigure,
};

/// Something that a figure needs and that was not stated.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Need {
    /// A scalar figure of the part.
    Part(PartFigure),
    /// The part's higher poles (`gain.poles`, an empty list is a statement) or its phase margin with conditions.
    Poles,
    /// The part's headroom towards the positive rail at this output current.
    HeadroomHigh,
    /// The part's headroom towards the negative rail at this output current.
    HeadroomLow,
    /// The stage's `[supply]`.
    Supply,
    /// The stage's `[supply] ripple`.
    Ripple,
    /// The stage's `[signal]`.
    Signal,
    /// An amplitude under the stage's `[signal]`.
    SignalAmplitude,
    /// The stage's `[signal] frequency`.
    SignalFrequency,
    /// The stage's `[ambient]`.
    Ambient,
    /// The stage's `[band]`.
    Band,
    /// The converter's input range.
    FullScale,
    /// The converter's number of bits.
    Bits,
    /// The converter's sampling capacitor.
    SampleCapacitance,
    /// The converter's acquisition time.
    AcquisitionTime,
}

impl Need {
    /// The key that must be stated: `table.key`, of the part file or of the stage block.
    #[must_use]
    pub const fn key(self) -> &'static str {
        match self {
            Self::Part(figure) => figure.id(),
            Self::Poles => "gain.poles",
            Self::HeadroomHigh => "output.headroom_high",
            Self::HeadroomLow => "output.headroom_low",
            Self::Supply => "supply",
            Self::Ripple => "supply.ripple",
            Self::Signal => "signal",
            Self::SignalAmplitude => "signal.peak",
            Self::SignalFrequency => "signal.frequency",
            Self::Ambient => "ambient",
            Self::Band => "band",
            Self::FullScale => "converter.full_scale",
            Self::Bits => "converter.bits",
            Self::SampleCapacitance => "converter.sample_capacitance",
            Self::AcquisitionTime => "converter.acquisition_time",
        }
    }

    /// Whether the part file, rather than the stage block, has to state it.
    #[must_use]
    pub const fn is_of_part(self) -> bool {
        matches!(self, Self::Part(_) | Self::Poles | Self::HeadroomHigh | Self::HeadroomLow)
    }
}

/// An input of an amplifier.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Terminal {
    /// From 0.
    pub amplifier: u8,
    /// Whether it is the inverting one.
    pub inverting: bool,
}

/// A figure's value, or why there is none.
#[derive(Clone, Debug, PartialEq)]
pub enum Outcome {
    /// The value in SI units. Infinite where a bound is never reached (a gain margin without a −180° crossing).
    Value(f64),
    /// At least this, in SI units: what the model leaves out would add to it, so no limit holds by it.
    AtLeast(f64),
    /// Data are missing.
    Undetermined(Vec<Need>),
    /// The figure means nothing here; why.
    DoesNotApply(&'static str),
    /// A pole lies in the right half plane: the stage oscillates, and the figure has no meaning.
    Oscillates,
    /// No DC path for the bias current at an amplifier's input: the operating point does not exist.
    NoDcPath(Terminal),
    /// No junction temperature up to [`HOTTEST`](crate::analysis::thermal::HOTTEST) is steady: the stage runs away thermally.
    NoSteadyTemperature,
    /// The stage does not get there, or leaves the linear model on the way, so that there is no number; why.
    OutOfReach(&'static str),
}

impl Outcome {
    /// The value, if there is one.
    #[must_use]
    pub const fn value(&self) -> Option<f64> {
        match self {
            Self::Value(v) => Some(*v),
            _ => None,
        }
    }
}

/// What can vary from build to build.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Parameter {
    /// A component, by its name.
    Component(&'static str),
    /// Source resistance or capacitance of an input (from 0).
    SourceImpedance(u8),
    /// Shunt resistance of an input's source.
    SourceShunt(u8),
    /// Dark current of an input's source.
    DarkCurrent(u8),
    /// Common-mode voltage of the inputs.
    CommonMode,
    /// Of a comparator: which way the amplifier's input errors shift the thresholds, −1 to 1; data sheets give magnitudes.
    ErrorSign,
    /// Reference voltage.
    ReferenceVoltage,
    /// Output resistance of the reference.
    ReferenceResistance,
    /// Load resistance.
    LoadResistance,
    /// Load capacitance.
    LoadCapacitance,
    /// Series resistor in front of the converter.
    ConverterSeries,
    /// Capacitor at the converter's input.
    ConverterShunt,
    /// The converter's sampling capacitor.
    SampleCapacitance,
    /// Resistance of the converter's sampling switch.
    SwitchResistance,
    /// Stray at the inverting input.
    StrayInverting,
    /// Stray at the non-inverting input.
    StrayNonInverting,
    /// Stray across the feedback.
    StrayFeedback,
    /// Positive supply.
    SupplyPositive,
    /// Negative supply.
    SupplyNegative,
    /// Ambient temperature.
    Temperature,
    /// A figure of the part.
    Part(PartFigure),
    /// A figure of another amplifier's part (amplifier from 1).
    PartOf(u8, PartFigure),
    /// Sign with which an amplifier (from 0) answers to the common mode: data sheets state the magnitude alone.
    RejectionSign(u8),
    /// Headroom tables between typical and guaranteed (0: typical, 1: guaranteed).
    Headroom,
}

/// One coordinate of a corner.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Coordinate {
    /// What varies.
    pub parameter: Parameter,
    /// Its value there, SI.
    pub value: f64,
    /// Its nominal value, SI.
    pub nominal: f64,
}

/// A figure over the spread.
#[derive(Clone, Debug, PartialEq)]
pub struct FigureRow {
    /// The figure.
    pub query: Query,
    /// What it measures on this kind of stage.
    pub dimension: Dimension,
    /// At nominal values.
    pub nominal: Outcome,
    /// Least and greatest over the spread, where both are values.
    pub range: Option<(f64, f64)>,
    /// What it rests on.
    pub basis: Option<Basis>,
    /// Of a figure that is the worst of several amplifiers: whose it is at nominal values, from 1.
    pub amplifier: Option<u8>,
}

/// A limit with its verdict.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitRow {
    /// The limit.
    pub limit: Limit,
    /// What its figure measures on this kind of stage.
    pub dimension: Dimension,
    /// The figure at nominal values.
    pub nominal: Outcome,
    /// Least and greatest over the spread, where both are values.
    pub range: Option<(f64, f64)>,
    /// The figure at the worst case for this limit (a value, or what it became there: oscillates).
    pub worst: Outcome,
    /// Distance from the limit at the worst case; negative when it breaks. In the figure's unit.
    pub margin: Option<f64>,
    /// The judgement.
    pub verdict: Verdict,
    /// What it rests on.
    pub basis: Option<Basis>,
    /// The corner: only coordinates that differ from nominal and matter.
    pub corner: Vec<Coordinate>,
    /// The parameter that uses most of the margin.
    pub dominant: Option<Parameter>,
    /// Of a figure that is the worst of several amplifiers: whose it is at the worst case, from 1.
    pub amplifier: Option<u8>,
}

/// A point of a comparator's transfer: the output at the load on both branches, V.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TransferPoint {
    /// Signal, V.
    pub input: f64,
    /// While the signal rises.
    pub rising: f64,
    /// While it falls.
    pub falling: f64,
}

/// The transfer from source to load.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ResponsePoint {
    /// Hz.
    pub frequency: f64,
    /// |H|, V/V.
    pub magnitude: f64,
    /// Unwrapped phase in rad.
    pub phase: f64,
}

/// A point of the output envelope: the largest clean output against frequency, peak V at the load, by what bounds it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EnvelopePoint {
    /// Hz.
    pub frequency: f64,
    /// Bound by rails and headroom.
    pub rails: Option<f64>,
    /// Bound by output current.
    pub current: Option<f64>,
    /// Bound by slew rate.
    pub slew: Option<f64>,
}

/// A source of noise.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum NoiseOrigin {
    /// Thermal noise of a component.
    Component(&'static str),
    /// Thermal noise of an input's source resistance (input from 0).
    SourceResistance(u8),
    /// Shot noise of an input's source current (input from 0).
    SourceShot(u8),
    /// Thermal noise of the reference's output resistance.
    ReferenceResistance,
    /// Thermal noise of the load resistance.
    LoadResistance,
    /// Thermal noise of the series resistor in front of the converter.
    ConverterSeries,
    /// An amplifier's voltage noise (amplifier from 0).
    AmplifierVoltage(u8),
    /// Current noise at the non-inverting input.
    CurrentNonInverting(u8),
    /// Current noise at the inverting input.
    CurrentInverting(u8),
}

/// A noise source's part in the total.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NoiseShare {
    /// The source.
    pub origin: NoiseOrigin,
    /// Its rms contribution at the output over the band, V.
    pub rms: f64,
    /// Its share of the total power, 0 to 1.
    pub share: f64,
}

/// Noise density at the output.
#[derive(Clone, Debug, PartialEq)]
pub struct DensityPoint {
    /// Hz.
    pub frequency: f64,
    /// Total, V/√Hz.
    pub total: f64,
    /// By source, in the order of [`Report::noise_shares`] (empty where that is empty), V/√Hz.
    pub by_source: Vec<f64>,
}

/// A cause of DC error.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum DcCause {
    /// Input offset voltage.
    Offset,
    /// Offset drift over the distance of the temperature from the ambient's nominal.
    OffsetDrift,
    /// Bias current through the impedances at the inputs.
    BiasCurrent,
    /// Difference of the two bias currents.
    OffsetCurrent,
    /// Dark current of the source.
    DarkCurrent,
    /// Common-mode voltage over the rejection.
    CommonMode,
    /// Supply deviation over the rejection, positive rail.
    SupplyPositive,
    /// Supply deviation over the rejection, negative rail.
    SupplyNegative,
}

/// A line of the DC error budget.
#[derive(Clone, Debug, PartialEq)]
pub struct DcLine {
    /// The cause.
    pub cause: DcCause,
    /// Magnitude at the output, V, at nominal part figures, or what it needs.
    pub nominal: Outcome,
    /// At guaranteed part figures and the worst temperature and supply.
    pub worst: Outcome,
}

/// Which of a figure's values a closed form is held against.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Against {
    /// The one at nominal values.
    #[default]
    Nominal,
    /// The least of the worst case: the form is for tolerances.
    Least,
}

/// A closed form beside the exact value.
#[derive(Clone, Debug, PartialEq)]
pub struct Working {
    /// The figure.
    pub query: Query,
    /// What it measures on this kind of stage.
    pub dimension: Dimension,
    /// The handbook's formula in the field's notation.
    pub formula: &'static str,
    /// The symbols of the formula with their values, SI, in the order in which they occur.
    pub numbers: Vec<(&'static str, f64, Dimension)>,
    /// What the formula gives.
    pub handbook: f64,
    /// What the network gives.
    pub exact: Outcome,
    /// Which of the network's values that is.
    pub against: Against,
    /// Where the formula comes from.
    pub source: &'static str,
    /// Why the two differ.
    pub difference: &'static str,
}

/// A root of the closed loop's characteristic polynomial or of its numerator.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Root {
    /// Real part, rad/s.
    pub re: f64,
    /// Imaginary part, rad/s.
    pub im: f64,
}

/// Something to be careful about.
#[derive(Clone, Debug, PartialEq)]
pub enum Caution {
    /// Noise gain at crossover below the part's least stable gain.
    BelowStableGain {
        /// Noise gain there.
        noise_gain: f64,
        /// What the part asks.
        needed: f64,
    },
    /// Supply span outside the part's.
    SupplySpan {
        /// Greatest (or least) span of the stage, V.
        span: f64,
        /// The part's bound, V.
        allowed: f64,
    },
    /// Junction hotter than the part allows at the worst case.
    JunctionHot {
        /// Junction temperature, K.
        junction: f64,
        /// Allowed, K.
        allowed: f64,
    },
    /// No junction temperature is steady at the worst case: bias currents that double with temperature, or sheer heat.
    ThermalRunaway,
    /// A resistor beyond its stated rating.
    ResistorHot {
        /// Which.
        component: &'static str,
        /// Its dissipation, W.
        power: f64,
        /// Its rating, W.
        rating: f64,
    },
    /// Supply span above the extra-low-voltage range.
    HighVoltage {
        /// Greatest span, V.
        span: f64,
    },
    /// The part reverses phase when an input leaves its range.
    PhaseReversal,
    /// A part figure that was not stated and was taken as ideal in the small-signal figures.
    TakenAsIdeal(PartFigure),
    /// A closed-loop pole lies in the right half plane.
    Oscillates,
    /// Two amplifiers are coupled, and the margins take each alone: their loop in common mode is not among them.
    PairApart,
    /// Not at nominal values, but in a build that the tolerances allow.
    OscillatesWithin,
    /// At nominal values the stated signal already exceeds what the amplifier can do.
    Exceeded {
        /// `clip_margin`, `input_range_margin`, `current_margin` or `slew_margin`.
        figure: crate::figure::Figure,
        /// Its value.
        margin: f64,
    },
    /// The DC errors alone are greater than the supply: the output rests at a rail.
    OffsetBeyondSupply {
        /// `output_offset`, V.
        offset: f64,
    },
    /// Of a comparator: the inputs come further apart than the part allows.
    DifferentialInput {
        /// Greatest difference at nominal values, V.
        volts: f64,
        /// The part's bound, V.
        allowed: f64,
    },
    /// The least hysteresis is no more than what noise and ripple move the thresholds by: the output chatters.
    Chatter {
        /// Least hysteresis over the spread, V.
        hysteresis: f64,
        /// Noise over the band and ripple of the supplies, peak to peak at the signal, V.
        disturbance: f64,
    },
    /// Components without a tolerance: the worst case takes them as exact.
    TakenAsExact(Vec<&'static str>),
}

/// Everything about a stage.
#[derive(Clone, Debug, PartialEq)]
pub struct Report {
    /// The stage's name.
    pub name: String,
    /// Figures without an argument, and those with one that limits name, in the order of [`crate::figure::Figure::ALL`].
    pub figures: Vec<FigureRow>,
    /// Limits, in the note's order.
    pub limits: Vec<LimitRow>,
    /// Measurements beside their predictions, in the note's order.
    pub measured: Vec<MeasuredRow>,
    /// Transfer from source to load.
    pub response: Vec<ResponsePoint>,
    /// Of a comparator: output against input around the thresholds, at each of which two points stand.
    pub transfer: Vec<TransferPoint>,
    /// Return ratio.
    pub loop_gain: Vec<ResponsePoint>,
    /// Noise density at the output.
    pub density: Vec<DensityPoint>,
    /// Shares of the integrated noise.
    pub noise_shares: Vec<NoiseShare>,
    /// The DC error budget.
    pub dc_budget: Vec<DcLine>,
    /// Largest clean output.
    pub envelope: Vec<EnvelopePoint>,
    /// Closed-loop poles.
    pub poles: Vec<Root>,
    /// Zeros of the transfer.
    pub zeros: Vec<Root>,
    /// Closed forms beside exact values.
    pub working: Vec<Working>,
    /// What to be careful about.
    pub cautions: Vec<Caution>,
}
