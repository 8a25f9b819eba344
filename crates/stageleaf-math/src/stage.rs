//! A stage as a note states it: kind, component values, surroundings, signal, limits. SI units throughout.

use alloc::{string::String, vec::Vec};

use crate::{kind::Kind, limit::Limit, measured::Measurement, part::Part};

/// A value with its tolerance and temperature coefficient.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Toleranced {
    /// Nominal value.
    pub nominal: f64,
    /// Tolerance downwards, as a positive fraction of the nominal.
    pub minus: f64,
    /// Tolerance upwards, as a positive fraction of the nominal.
    pub plus: f64,
    /// Temperature coefficient, magnitude, 1/K; its sign is taken as unknown.
    pub drift: f64,
    /// Power rating in W, where stated.
    pub rating: Option<f64>,
}

impl Toleranced {
    /// A value without tolerance or drift.
    #[must_use]
    pub const fn exact(nominal: f64) -> Self {
        Self { nominal, minus: 0.0, plus: 0.0, drift: 0.0, rating: None }
    }
}

/// A component by its reference designator.
#[derive(Clone, Debug, PartialEq)]
pub struct Component {
    /// One of the kind's component names (see [`Kind::components`]).
    pub name: &'static str,
    /// Its value.
    pub value: Toleranced,
}

/// A quantity that varies between two ends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Span {
    /// Lower end.
    pub low: f64,
    /// Nominal value.
    pub nominal: f64,
    /// Upper end.
    pub high: f64,
}

impl Span {
    /// A quantity that does not vary.
    #[must_use]
    pub const fn exact(nominal: f64) -> Self {
        Self { low: nominal, nominal, high: nominal }
    }
}

/// Supply voltages against the stage's ground, in V.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Supply {
    /// Positive rail.
    pub positive: Span,
    /// Negative rail; 0 V for a single supply.
    pub negative: Span,
    /// Ripple on each rail but one that is the stage's ground, where stated.
    pub ripple: Option<Ripple>,
}

/// An alternating voltage on a supply.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ripple {
    /// Peak, V.
    pub peak: f64,
    /// Its frequency, Hz.
    pub frequency: f64,
}

/// What drives the stage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Source {
    /// A voltage behind a resistance (zero allowed).
    Resistive {
        /// Source resistance in Ω.
        resistance: Toleranced,
    },
    /// A voltage behind a capacitance.
    Capacitive {
        /// Source capacitance in F.
        capacitance: Toleranced,
    },
    /// A photodiode: a current with a capacitance across it.
    Photodiode {
        /// Junction capacitance in F, at the bias that it has here.
        capacitance: Toleranced,
        /// Shunt resistance in Ω, where stated.
        shunt_resistance: Option<Toleranced>,
        /// Dark current in A.
        dark_current: Option<Toleranced>,
    },
}

/// The signal at the source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Signal {
    /// Peak amplitude of the alternating part, V; zero where the signal stands still.
    pub peak: f64,
    /// Highest frequency at full amplitude, Hz.
    pub frequency: Option<f64>,
    /// Steady part, V.
    pub dc: f64,
    /// Peak over rms; √2 for a sine.
    pub crest_factor: f64,
}

/// A reference voltage that shifts the output.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ReferenceVoltage {
    /// V.
    pub voltage: Toleranced,
    /// Output resistance in Ω, where stated.
    pub resistance: Option<Toleranced>,
}

/// What the stage drives; both absent: nothing.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Load {
    /// Load resistance to ground, Ω.
    pub resistance: Option<Toleranced>,
    /// Load capacitance to ground, F.
    pub capacitance: Option<Toleranced>,
}

/// A sampling converter at the output, with what stands between: `series_resistance` from the output to its input, `shunt_capacitance`
/// from there to ground. The sampling capacitor is connected only while it acquires.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Converter {
    /// Ends of the input range, V.
    pub full_scale: Option<[f64; 2]>,
    /// Number of bits.
    pub bits: Option<f64>,
    /// Its own noise at its input, V rms, where stated.
    pub noise: Option<f64>,
    /// Sampling capacitor, F.
    pub sample_capacitance: Option<Toleranced>,
    /// Resistance of the sampling switch, Ω; none where it is not stated.
    pub switch_resistance: Option<Toleranced>,
    /// For how long the sampling capacitor is connected before a sample, s.
    pub acquisition_time: Option<f64>,
    /// Series resistor in front of the input, Ω.
    pub series_resistance: Option<Toleranced>,
    /// Capacitor from the input to ground, F.
    pub shunt_capacitance: Option<Toleranced>,
}

/// Stray capacitances of the board to ground, in F.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Board {
    /// At the inverting input.
    pub inverting_node: Option<Toleranced>,
    /// At the non-inverting input.
    pub non_inverting_node: Option<Toleranced>,
    /// Across the feedback.
    pub across_feedback: Option<Toleranced>,
}

/// Ambient temperature in K.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ambient {
    /// Its range.
    pub range: Span,
    /// Temperature at which component values hold; without one, the range's nominal.
    pub values_at: Option<f64>,
}

impl Ambient {
    /// A range at whose nominal component values hold.
    #[must_use]
    pub const fn of(range: Span) -> Self {
        Self { range, values_at: None }
    }

    /// How far the range reaches from where component values hold, K.
    #[must_use]
    pub fn away(&self) -> f64 {
        let reference = self.values_at.unwrap_or(self.range.nominal);
        f64::max((self.range.high - reference).abs(), (reference - self.range.low).abs())
    }
}

/// A band for integrated noise, in Hz.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Band {
    /// Lower edge; above zero, since 1/f noise diverges there.
    pub from: f64,
    /// Upper edge.
    pub to: f64,
}

/// Where an isolation resistor stands.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Isolation {
    /// Between the feedback point and the load.
    #[default]
    OutsideLoop,
    /// Inside: the feedback resistor senses the load, the feedback capacitor the amplifier's pin.
    InsideLoop,
}

/// A stage, whole.
#[derive(Clone, Debug, PartialEq)]
pub struct Stage {
    /// Its name in the note.
    pub name: String,
    /// Its kind.
    pub kind: Kind,
    /// Component values.
    pub components: Vec<Component>,
    /// The amplifier.
    pub part: Part,
    /// Where `Riso` stands, if there is one.
    pub isolation: Isolation,
    /// Supplies.
    pub supply: Option<Supply>,
    /// What drives each input, in the kind's order; a missing one is an ideal source.
    pub sources: Vec<Option<Source>>,
    /// The signal of each drive, in the kind's order; a missing one is none.
    pub signals: Vec<Option<Signal>>,
    /// Common-mode voltage of the inputs of a differential kind, V.
    pub common_mode: Option<Span>,
    /// The reference of a kind that has one.
    pub reference: Option<ReferenceVoltage>,
    /// Parts of further amplifiers where they differ from `part`: amplifier number from 1, part.
    pub parts: Vec<(usize, Part)>,
    /// The load.
    pub load: Load,
    /// The converter behind the load.
    pub converter: Converter,
    /// Board strays.
    pub board: Board,
    /// Ambient temperature.
    pub ambient: Option<Ambient>,
    /// Band for integrated noise.
    pub band: Option<Band>,
    /// Limits, in the note's order.
    pub limits: Vec<Limit>,
    /// What was measured at the bench, in the note's order.
    pub measured: Vec<Measurement>,
}

impl Stage {
    /// What drives an input.
    #[must_use]
    pub fn source(&self, input: usize) -> Option<Source> {
        self.sources.get(input).copied().flatten()
    }

    /// The signal of a drive.
    #[must_use]
    pub fn signal_of(&self, drive: usize) -> Option<Signal> {
        self.signals.get(drive).copied().flatten()
    }

    /// The first drive's signal.
    #[must_use]
    pub fn signal(&self) -> Option<Signal> {
        self.signal_of(0)
    }

    /// The part of an amplifier, numbered from 0.
    #[must_use]
    pub fn part_of(&self, amplifier: usize) -> &Part {
        self.parts.iter().find(|(a, _)| *a == amplifier + 1).map_or(&self.part, |(_, p)| p)
    }

    /// Whether anything stands at the output that draws current; whether a capacitance does.
    #[must_use]
    pub const fn is_loaded(&self) -> (bool, bool) {
        let capacitance = self.load.capacitance.is_some() || self.converter.shunt_capacitance.is_some();
        (self.load.resistance.is_some() || capacitance, capacitance)
    }

    /// The component called `name`, if the stage has it.
    #[must_use]
    pub fn component(&self, name: &str) -> Option<&Toleranced> {
        self.components.iter().find(|c| c.name == name).map(|c| &c.value)
    }
}
