//! The stage kinds. Each has a file of its own: network, ideal closed form with its source, component names and roles.

pub mod follower;
pub mod inverting;
pub mod non_inverting;

use alloc::{vec, vec::Vec};

use crate::{
    dimension::Dimension,
    figure::{Figure, Query},
    network::Builder,
    part::PartFigure,
    report::{Outcome, Working},
    stage::Stage,
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

/// The ideal gain at DC with the resistors in place.
fn dc_gain(formula: &'static str, names: &[&'static str], stage: &Stage, value: f64) -> Working {
    Working {
        query: Query::of(Figure::Gain),
        formula,
        numbers: names.iter().map(|&n| (n, nominal(stage, n), Dimension::Resistance)).collect(),
        handbook: value,
        exact: Outcome::Undetermined(Vec::new()),
        source: "derived here: the amplifier's inputs are held equal",
        difference: "finite open-loop gain, source and load resistance",
    }
}

/// The handbook's closed-loop edge `GBW/NG`.
fn closed_loop_edge(stage: &Stage, noise_gain: f64) -> Working {
    let gbw = stage.part.rating(PartFigure::Gbw).nominal(PartFigure::Gbw.worse()).unwrap_or(f64::NAN);
    Working {
        query: Query::of(Figure::Bandwidth),
        formula: "f₋₃dB ≈ GBW/NG",
        numbers: vec![("GBW", gbw, Dimension::Frequency), ("NG", noise_gain, Dimension::Number)],
        handbook: gbw / noise_gain,
        exact: Outcome::Undetermined(Vec::new()),
        source: "common practice, no source",
        difference: "higher poles, capacitances and load; the rule leaves out all but the dominant pole",
    }
}

/// The corner of the feedback capacitor.
fn corner(stage: &Stage) -> Option<Working> {
    let (rf, cf) = (stage.component("Rf")?.nominal, stage.component("Cf")?.nominal);
    Some(Working {
        query: Query::of(Figure::Bandwidth),
        formula: "f = 1/(2π·Rf·Cf)",
        numbers: vec![("Rf", rf, Dimension::Resistance), ("Cf", cf, Dimension::Capacitance)],
        handbook: 1.0 / (core::f64::consts::TAU * rf * cf),
        exact: Outcome::Undetermined(Vec::new()),
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
