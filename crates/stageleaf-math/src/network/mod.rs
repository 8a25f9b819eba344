//! The nodal network that a stage kind lays out: nodes, branches, amplifiers.
//!
//! Values are not stored here: each element names the slot of the parameter table that holds its value, so one network
//! serves every build of a stage.

pub mod dense;
pub mod expand;

use alloc::vec::Vec;

use crate::{
    parameters::Parameters,
    part::PartFigure,
    report::{NoiseOrigin, Parameter},
    stage::{Source, Stage},
};

/// A node; 0 is ground.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Node(pub u8);

/// The reference node.
pub const GROUND: Node = Node(0);

/// The node that the ideal signal voltage drives: always the first one.
pub const DRIVEN: Node = Node(1);

/// The most nodes a network may have, ground included.
pub const MAX_NODES: usize = 16;

/// What stands between two nodes. The numbers are slots of the parameter table.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Law {
    /// A resistance.
    Resistance(usize),
    /// A capacitance.
    Capacitance(usize),
    /// A resistance and a capacitance in series.
    SeriesRc(usize, usize),
}

/// An element between two nodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Element {
    /// One end.
    pub a: Node,
    /// The other end.
    pub b: Node,
    /// What it is.
    pub law: Law,
    /// Whose thermal noise it makes; the amplifier's own input resistances count as noiseless (their noise is in its ratings).
    pub noise: Option<NoiseOrigin>,
}

/// An amplifier: a controlled source behind the output resistance.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Amplifier {
    /// Non-inverting input.
    pub plus: Node,
    /// Inverting input.
    pub minus: Node,
    /// Output pin.
    pub pin: Node,
}

/// A laid-out network.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Network {
    /// Nodes, ground included.
    pub nodes: usize,
    /// Elements.
    pub elements: Vec<Element>,
    /// The amplifier.
    pub amplifier: Amplifier,
    /// Where the stage's output is taken.
    pub load: Node,
}

/// What to leave out of a network, for the impedances seen from outside.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Without {
    /// Drive the stage's terminal itself: no source impedance.
    pub source: bool,
    /// No load.
    pub load: bool,
}

/// Collects nodes and elements while a kind lays out its network.
#[derive(Debug)]
pub struct Builder<'a> {
    stage: &'a Stage,
    parameters: &'a Parameters,
    without: Without,
    nodes: u8,
    elements: Vec<Element>,
    amplifier: Option<Amplifier>,
    load: Node,
}

impl<'a> Builder<'a> {
    /// Lays out the network of a stage.
    #[must_use]
    pub fn lay_out(stage: &Stage, parameters: &Parameters, without: Without) -> Network {
        let mut builder = Builder { stage, parameters, without, nodes: 2, elements: Vec::new(), amplifier: None, load: GROUND };
        (stage.kind.spec().build)(stage, &mut builder);
        let amplifier = builder.amplifier.expect("every kind places an amplifier");
        Network { nodes: usize::from(builder.nodes), elements: builder.elements, amplifier, load: builder.load }
    }

    /// A new node.
    pub fn node(&mut self) -> Node {
        let node = Node(self.nodes);
        self.nodes += 1;
        assert!(usize::from(self.nodes) <= MAX_NODES, "a kind's network stays below {MAX_NODES} nodes");
        node
    }

    /// The stage's signal terminal: behind the source's impedance where there is one.
    pub fn signal(&mut self) -> Node {
        let (Some(source), false) = (self.stage.source, self.without.source) else { return DRIVEN };
        let slot = self.slot(Parameter::SourceImpedance);
        let terminal = self.node();
        let (law, noise) = match source {
            Source::Resistive { .. } => (Law::Resistance(slot), Some(NoiseOrigin::SourceResistance)),
            Source::Capacitive { .. } => (Law::Capacitance(slot), None),
        };
        self.elements.push(Element { a: DRIVEN, b: terminal, law, noise });
        terminal
    }

    /// The node behind series component `name` from `from`; `from` itself where the stage does not have it.
    pub fn behind(&mut self, name: &'static str, from: Node) -> Node {
        if self.stage.component(name).is_none() {
            return from;
        }
        let to = self.node();
        self.component(name, from, to);
        to
    }

    /// Places component `name` between two nodes, if the stage has it; says whether it does.
    pub fn component(&mut self, name: &'static str, a: Node, b: Node) -> bool {
        let Some(spec) = self.stage.kind.components().iter().find(|c| c.name == name) else { return false };
        if self.stage.component(name).is_none() {
            return false;
        }
        let slot = self.slot(Parameter::Component(spec.name));
        let (law, noise) = if matches!(spec.dimension, crate::dimension::Dimension::Resistance) {
            (Law::Resistance(slot), Some(NoiseOrigin::Component(spec.name)))
        } else {
            (Law::Capacitance(slot), None)
        };
        self.elements.push(Element { a, b, law, noise });
        true
    }

    /// Places a resistor and a capacitor in series, if the stage has both.
    pub fn series_rc(&mut self, resistor: &'static str, capacitor: &'static str, a: Node, b: Node) {
        if self.stage.component(resistor).is_some() && self.stage.component(capacitor).is_some() {
            let law = Law::SeriesRc(self.slot(Parameter::Component(resistor)), self.slot(Parameter::Component(capacitor)));
            self.elements.push(Element { a, b, law, noise: Some(NoiseOrigin::Component(resistor)) });
        }
    }

    /// Places the amplifier with what its data sheet and the board put at its inputs.
    pub fn amplifier(&mut self, plus: Node, minus: Node, pin: Node) {
        self.amplifier = Some(Amplifier { plus, minus, pin });
        for (figure, a, b) in [
            (PartFigure::DifferentialResistance, plus, minus),
            (PartFigure::DifferentialCapacitance, plus, minus),
            (PartFigure::CommonModeResistance, plus, GROUND),
            (PartFigure::CommonModeCapacitance, plus, GROUND),
            (PartFigure::CommonModeResistance, minus, GROUND),
            (PartFigure::CommonModeCapacitance, minus, GROUND),
        ] {
            if let Some(slot) = self.parameters.slot(Parameter::Part(figure)) {
                let law = match figure {
                    PartFigure::DifferentialResistance | PartFigure::CommonModeResistance => Law::Resistance(slot),
                    _ => Law::Capacitance(slot),
                };
                self.elements.push(Element { a, b, law, noise: None });
            }
        }
        for (stray, a, b) in [
            (Parameter::StrayInverting, minus, GROUND),
            (Parameter::StrayNonInverting, plus, GROUND),
            (Parameter::StrayFeedback, pin, minus),
        ] {
            if let Some(slot) = self.parameters.slot(stray) {
                self.elements.push(Element { a, b, law: Law::Capacitance(slot), noise: None });
            }
        }
    }

    /// The output side shared by all kinds: `Riso`, snubber, load. Returns the load node.
    pub fn output(&mut self, pin: Node) -> Node {
        self.series_rc("Rsn", "Csn", pin, GROUND);
        let load = self.behind("Riso", pin);
        self.load = load;
        if !self.without.load {
            if let Some(slot) = self.parameters.slot(Parameter::LoadResistance) {
                self.elements.push(Element { a: load, b: GROUND, law: Law::Resistance(slot), noise: Some(NoiseOrigin::LoadResistance) });
            }
            if let Some(slot) = self.parameters.slot(Parameter::LoadCapacitance) {
                self.elements.push(Element { a: load, b: GROUND, law: Law::Capacitance(slot), noise: None });
            }
        }
        load
    }

    fn slot(&self, parameter: Parameter) -> usize {
        self.parameters.slot(parameter).expect("a placed element has a parameter")
    }
}
