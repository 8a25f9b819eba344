//! The stage kinds. Each has a file of its own: network, ideal closed form with its source, component names and roles.

pub mod ac_inverting;
pub mod ac_non_inverting;
pub mod charge;
pub mod comparator;
pub mod comparator_inverting;
pub mod comparator_non_inverting;
pub mod difference;
pub mod differentiator;
pub mod follower;
pub mod instrumentation;
pub mod integrator;
pub mod inverting;
pub mod multiple_feedback_band_pass;
pub mod multiple_feedback_low_pass;
pub mod non_inverting;
pub mod sallen_key_high_pass;
pub mod sallen_key_low_pass;
pub mod scale_and_shift;
pub mod summing;
pub mod transimpedance;

use alloc::{vec, vec::Vec};
use core::f64::consts::TAU;

use crate::{
    dimension::Dimension,
    figure::{Figure, Query},
    handbook,
    network::{Builder, Drive},
    part::PartFigure,
    report::{Against, Outcome, Working},
    stage::Stage,
    units::{Farads, Hertz, Ohms},
};

/// A component that a kind can have.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct ComponentSpec {
    /// Reference designator: `Rf`.
    pub name: &'static str,
    /// Resistance or capacitance.
    pub dimension: Dimension,
    /// Whether the kind cannot do without it.
    pub required: bool,
    /// The component that must stand beside it.
    pub with: Option<&'static str>,
    /// Its role: "feedback resistor".
    pub role: &'static str,
}

impl ComponentSpec {
    /// A component that the kind needs.
    #[must_use]
    pub const fn required(name: &'static str, dimension: Dimension, role: &'static str) -> Self {
        Self { name, dimension, required: true, with: None, role }
    }

    /// A component that may be there.
    #[must_use]
    pub const fn optional(name: &'static str, dimension: Dimension, role: &'static str) -> Self {
        Self { name, dimension, required: false, with: None, role }
    }

    /// The same, but only beside another one.
    #[must_use]
    pub const fn beside(mut self, other: &'static str) -> Self {
        self.with = Some(other);
        self
    }
}

/// An input of a kind.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct InputSpec {
    /// As notes name it: `in`, `in1`.
    pub name: &'static str,
    /// What is applied to it.
    pub drive: Drive,
    /// Where its steady value comes from.
    pub feed: Feed,
}

impl InputSpec {
    /// A signal's input.
    #[must_use]
    pub const fn signal(name: &'static str, drive: Drive) -> Self {
        Self { name, drive, feed: Feed::Signal }
    }
}

/// Where an input's steady value comes from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Feed {
    /// The note's `[signal]`.
    Signal,
    /// The note's `[reference]`.
    Reference,
    /// The positive supply.
    Supply,
}

/// The one voltage input of most kinds.
pub const VOLTAGE_INPUT: &[InputSpec] = &[InputSpec::signal("in", Drive::Voltage)];

/// The two inputs of a differential kind: `in1` subtracts.
pub const DIFFERENTIAL_INPUTS: &[InputSpec] = &[InputSpec::signal("in1", Drive::Voltage), InputSpec::signal("in2", Drive::Voltage)];

/// A current's input.
pub const CURRENT_INPUT: &[InputSpec] = &[InputSpec::signal("in", Drive::Current)];

/// A charge's input.
pub const CHARGE_INPUT: &[InputSpec] = &[InputSpec::signal("in", Drive::Charge)];

/// What a stage's signals are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Drives {
    /// One at each input.
    Each,
    /// The difference of two inputs, `−½` and `+½` of it, and a common mode.
    Differential,
}

/// Which way a comparator's output goes when its input rises through the upper threshold.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sense {
    /// Up.
    NonInverting,
    /// Down.
    Inverting,
}

/// Where a kind's pass-band gain is taken.
#[derive(Clone, Copy, Debug)]
pub enum Reference {
    /// At DC.
    Dc,
    /// Where the response is largest.
    Peak,
    /// At a frequency in Hz that the components give.
    Frequency(fn(&Stage) -> f64),
}

/// What a kind is: its file holds one of these.
#[derive(Debug)]
pub struct Spec {
    /// As notes name it: `non-inverting`.
    pub id: &'static str,
    /// As a heading.
    pub title: &'static str,
    /// What it does, in one sentence.
    pub summary: &'static str,
    /// The ideal closed form in the field's notation.
    pub ideal_formula: &'static str,
    /// Its components, in the order of the `new` block.
    pub components: &'static [ComponentSpec],
    /// How many amplifiers it has.
    pub amplifiers: usize,
    /// Its inputs.
    pub inputs: fn(&Stage) -> &'static [InputSpec],
    /// What its signals are.
    pub drives: Drives,
    /// Of a comparator, its sense: the feedback is positive, and the output rests at one of two levels.
    pub switching: Option<Sense>,
    /// Where its gain is taken.
    pub reference: Reference,
    /// What its gain measures.
    pub gain: Dimension,
    /// Lays out the network.
    pub build: fn(&Stage, &mut Builder<'_>),
    /// The ideal gain at the pass-band reference from nominal component values.
    pub ideal_gain: fn(&Stage) -> f64,
    /// The ideal noise gain at DC from nominal component values.
    pub noise_gain: fn(&Stage) -> f64,
    /// The kind's own closed forms beside the exact values (which the caller fills in).
    pub working: fn(&Stage) -> Vec<Working>,
}

/// A component's nominal value; 0 where the stage does not have it ([`crate::check`] refuses a missing required one first).
fn nominal(stage: &Stage, name: &str) -> f64 {
    stage.component(name).map_or(0.0, |c| c.nominal)
}

/// Adds a closed form to the working.
fn line(
    query: Figure,
    formula: &'static str,
    numbers: Vec<(&'static str, f64, Dimension)>,
    handbook: f64,
    difference: &'static str,
) -> Working {
    Working {
        query: Query::of(query),
        dimension: query.dimension(),
        formula,
        numbers,
        handbook,
        exact: Outcome::Undetermined(Vec::new()),
        against: Against::Nominal,
        source: "derived here for an ideal amplifier",
        difference,
    }
}

/// Components that the stage has, with their nominal values, for a line of the working; `K` is the ideal gain.
fn numbers(stage: &Stage, names: &[&'static str]) -> Vec<(&'static str, f64, Dimension)> {
    let dimension = |n: &str| stage.kind.components().iter().find(|c| c.name == n).map_or(Dimension::Number, |c| c.dimension);
    let number = |&n: &&'static str| match n {
        "K" => Some((n, (stage.kind.spec().ideal_gain)(stage), Dimension::Number)),
        _ => stage.component(n).map(|c| (n, c.nominal, dimension(n))),
    };
    names.iter().filter_map(number).collect()
}

/// The gain of a Sallen–Key section's amplifier: a follower's without the divider.
fn amplification(stage: &Stage) -> Working {
    let formula = if stage.component("Rf").is_some() { "K = 1 + Rf/Rg" } else { "K = 1, the amplifier is a follower" };
    ideal(formula, &["Rf", "Rg"], stage)
}

/// What a real amplifier and its surroundings do to an ideal gain.
const REAL_AMPLIFIER: &str = "finite open-loop gain, source and load resistance";

/// The ideal gain at the reference with the components in place.
fn ideal(formula: &'static str, names: &[&'static str], stage: &Stage) -> Working {
    line(Figure::Gain, formula, numbers(stage, names), (stage.kind.spec().ideal_gain)(stage), REAL_AMPLIFIER)
}

/// What a real amplifier does to a filter's frequency and Q.
const FINITE_BANDWIDTH: &str = "the amplifier's finite gain-bandwidth product, output resistance and input capacitance";

/// Frequency and Q of a second-order section.
fn second_order(stage: &Stage, formulas: [&'static str; 2], names: &[&'static str], f0: f64, q: f64) -> [Working; 2] {
    let within = |formula: &str| numbers(stage, names).into_iter().filter(|n| formula.contains(n.0)).collect();
    [
        line(Figure::NaturalFrequency, formulas[0], within(formulas[0]), f0, FINITE_BANDWIDTH),
        line(Figure::Q, formulas[1], within(formulas[1]), q, FINITE_BANDWIDTH),
    ]
}

/// The main part's nominal gain-bandwidth product; not a number where it is not stated.
fn gbw(stage: &Stage) -> f64 {
    stage.part.rating(PartFigure::Gbw).nominal(PartFigure::Gbw.worse()).unwrap_or(f64::NAN)
}

/// The handbook's closed-loop edge `GBW/NG`.
fn closed_loop_edge(stage: &Stage, noise_gain: f64) -> Working {
    let gbw = gbw(stage);
    Working {
        query: Query::of(Figure::Bandwidth),
        dimension: Dimension::Frequency,
        formula: "f₋₃dB ≈ GBW/NG",
        numbers: vec![("GBW", gbw, Dimension::Frequency), ("NG", noise_gain, Dimension::Number)],
        handbook: handbook::closed_loop_edge(Hertz(gbw), noise_gain).map_or(f64::NAN, |f| f.0),
        exact: Outcome::Undetermined(Vec::new()),
        against: Against::Nominal,
        source: "common practice, no source",
        difference: "higher poles, capacitances and load; the rule leaves out all but the dominant pole",
    }
}

/// The corner of the feedback capacitor.
fn corner(stage: &Stage) -> Option<Working> {
    let (rf, cf) = (stage.component("Rf")?.nominal, stage.component("Cf")?.nominal);
    Some(Working {
        query: Query::of(Figure::Bandwidth),
        dimension: Dimension::Frequency,
        formula: "f = 1/(2π·Rf·Cf)",
        numbers: vec![("Rf", rf, Dimension::Resistance), ("Cf", cf, Dimension::Capacitance)],
        handbook: handbook::corner(Ohms(rf), Farads(cf)).map_or(f64::NAN, |f| f.0),
        exact: Outcome::Undetermined(Vec::new()),
        against: Against::Nominal,
        source: "derived here: the corner of Rf ∥ Cf",
        difference: "the amplifier's own bandwidth; a non-inverting gain falls to 1 and not to 0",
    })
}

macro_rules! kinds {
    ($($(#[$doc:meta])* $name:ident $module:ident;)*) => {
        /// A stage kind.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
        pub enum Kind { $($(#[$doc])* $name,)* }

        impl Kind {
            /// Every kind.
            pub const ALL: &'static [Self] = &[$(Self::$name,)*];

            /// What it is.
            #[must_use]
            pub const fn spec(self) -> &'static Spec { match self { $(Self::$name => &$module::SPEC,)* } }
        }
    };
}

kinds! {
    /// The output follows the input.
    Follower follower;
    /// Gain `1 + Rf/Rg`.
    NonInverting non_inverting;
    /// Gain `−Rf/Rin`.
    Inverting inverting;
    /// Gains `−Rf/Rin1`, `−Rf/Rin2`, … added.
    Summing summing;
    /// The difference of two inputs.
    Difference difference;
    /// The difference of two inputs, both at high impedance, with three amplifiers.
    Instrumentation instrumentation;
    /// A current to a voltage.
    Transimpedance transimpedance;
    /// A charge to a voltage.
    Charge charge;
    /// The integral of the input.
    Integrator integrator;
    /// The slope of the input.
    Differentiator differentiator;
    /// Gain and an offset from a reference.
    ScaleAndShift scale_and_shift;
    /// Non-inverting, coupled by capacitors, biased at a fraction of one supply.
    AcNonInverting ac_non_inverting;
    /// Inverting, coupled by capacitors, biased at a fraction of one supply.
    AcInverting ac_inverting;
    /// Second-order low-pass around a follower or a gain.
    SallenKeyLowPass sallen_key_low_pass;
    /// Second-order high-pass around a follower or a gain.
    SallenKeyHighPass sallen_key_high_pass;
    /// Second-order inverting low-pass.
    MultipleFeedbackLowPass multiple_feedback_low_pass;
    /// Second-order inverting band-pass.
    MultipleFeedbackBandPass multiple_feedback_band_pass;
    /// Two thresholds, the output low above them.
    ComparatorInverting comparator_inverting;
    /// Two thresholds, the output high above them.
    ComparatorNonInverting comparator_non_inverting;
}

impl Kind {
    /// The kind that notes call `id`.
    #[must_use]
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.iter().copied().find(|k| k.spec().id == id)
    }

    /// As notes name it.
    #[must_use]
    pub const fn id(self) -> &'static str {
        self.spec().id
    }

    /// The ideal gain of a drive (from 0) at the kind's reference, where a closed form says it.
    #[must_use]
    pub fn ideal_gain(self, stage: &Stage, drive: usize) -> Option<f64> {
        match self {
            _ if drive == 0 => Some((self.spec().ideal_gain)(stage)),
            Self::Summing => summing::ideal_gain(stage, drive),
            Self::ScaleAndShift => Some(scale_and_shift::shift(stage)),
            Self::Follower
            | Self::NonInverting
            | Self::Inverting
            | Self::Difference
            | Self::Instrumentation
            | Self::Transimpedance
            | Self::Charge
            | Self::Integrator
            | Self::Differentiator
            | Self::AcNonInverting
            | Self::AcInverting
            | Self::SallenKeyLowPass
            | Self::SallenKeyHighPass
            | Self::MultipleFeedbackLowPass
            | Self::MultipleFeedbackBandPass
            | Self::ComparatorInverting
            | Self::ComparatorNonInverting => None,
        }
    }

    /// Whether it is a comparator.
    #[must_use]
    pub const fn switches(self) -> bool {
        self.spec().switching.is_some()
    }

    /// Its components.
    #[must_use]
    pub const fn components(self) -> &'static [ComponentSpec] {
        self.spec().components
    }
}

/// `Rser`: series resistor at the signal input.
pub const INPUT_SERIES: ComponentSpec = ComponentSpec::optional("Rser", Dimension::Resistance, "series resistor at the signal input");
/// `Cshunt`: capacitor from the signal input to ground, behind `Rser`.
pub const INPUT_SHUNT: ComponentSpec =
    ComponentSpec::optional("Cshunt", Dimension::Capacitance, "capacitor from the signal input to ground, behind `Rser`");
/// `Rp`: bias-balancing resistor.
pub const BALANCE_R: ComponentSpec =
    ComponentSpec::optional("Rp", Dimension::Resistance, "bias-balancing resistor from the + input to ground");
/// `Cp`: capacitor across `Rp`.
pub const BALANCE_C: ComponentSpec = ComponentSpec::optional("Cp", Dimension::Capacitance, "capacitor across `Rp`").beside("Rp");
/// `Riso`: isolation resistor between pin and load.
pub const ISOLATION: ComponentSpec =
    ComponentSpec::optional("Riso", Dimension::Resistance, "isolation resistor between the output pin and the load");
/// `Rsn`: snubber resistor.
pub const SNUBBER_R: ComponentSpec =
    ComponentSpec::optional("Rsn", Dimension::Resistance, "snubber resistor from the output, in series with `Csn`").beside("Csn");
/// `Csn`: snubber capacitor.
pub const SNUBBER_C: ComponentSpec =
    ComponentSpec::optional("Csn", Dimension::Capacitance, "snubber capacitor to ground, in series with `Rsn`").beside("Rsn");
/// `Rng`: noise-gain resistor.
pub const NOISE_GAIN_R: ComponentSpec =
    ComponentSpec::optional("Rng", Dimension::Resistance, "noise-gain resistor between the inputs, in series with `Cng`").beside("Cng");
/// `Cng`: noise-gain capacitor.
pub const NOISE_GAIN_C: ComponentSpec =
    ComponentSpec::optional("Cng", Dimension::Capacitance, "noise-gain capacitor between the inputs, in series with `Rng`").beside("Rng");
