//! The stage kinds. Each has a file of its own: network, ideal closed form with its source, component names and roles.

pub mod follower;
pub mod inverting;
pub mod non_inverting;

use crate::{dimension::Dimension, network::Builder, report::Working, stage::Stage};

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
    pub build: fn(&Stage, &mut Builder),
    /// The ideal gain at the pass-band reference from nominal component values.
    pub ideal_gain: fn(&Stage) -> f64,
    /// The kind's own closed forms beside the exact values (which the caller fills in).
    pub working: fn(&Stage) -> alloc::vec::Vec<Working>,
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
pub const INPUT_SHUNT: ComponentSpec = ComponentSpec::optional("Cshunt", Dimension::Capacitance, "capacitor from the signal input to ground, behind `Rser`");
/// `Riso`: isolation resistor between pin and load.
pub const ISOLATION: ComponentSpec = ComponentSpec::optional("Riso", Dimension::Resistance, "isolation resistor between the output pin and the load");
/// `Rsn`: snubber resistor.
pub const SNUBBER_R: ComponentSpec = ComponentSpec::optional("Rsn", Dimension::Resistance, "snubber resistor from the output, in series with `Csn`").beside("Csn");
/// `Csn`: snubber capacitor.
pub const SNUBBER_C: ComponentSpec = ComponentSpec::optional("Csn", Dimension::Capacitance, "snubber capacitor to ground, in series with `Rsn`").beside("Rsn");
/// `Rng`: noise-gain resistor.
pub const NOISE_GAIN_R: ComponentSpec = ComponentSpec::optional("Rng", Dimension::Resistance, "noise-gain resistor between the inputs, in series with `Cng`").beside("Cng");
/// `Cng`: noise-gain capacitor.
pub const NOISE_GAIN_C: ComponentSpec = ComponentSpec::optional("Cng", Dimension::Capacitance, "noise-gain capacitor between the inputs, in series with `Rng`").beside("Rng");
