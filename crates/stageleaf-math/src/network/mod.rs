//! The nodal network that a stage kind lays out: nodes, branches, amplifiers.
//!
//! Values are not stored here: each element names the slot of the parameter table that holds its value, so one network
//! serves every build of a stage.

pub mod dense;
pub mod expand;
pub mod lu;
pub mod steady;

use alloc::vec::Vec;

use crate::{
    parameters::Parameters,
    part::PartFigure,
    report::{NoiseOrigin, Parameter, Terminal},
    stage::{Isolation, Source, Stage},
};

/// A node; 0 is ground.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Node(pub u8);

/// The reference node.
pub const GROUND: Node = Node(0);

/// The node that the first input drives: inputs' nodes come first, in order.
pub const DRIVEN: Node = Node(1);

/// What an input applies to its node.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Drive {
    /// An ideal voltage; the node is held.
    Voltage,
    /// A current into the node.
    Current,
    /// A charge into the node: its rate of change is the current.
    Charge,
}

/// The most nodes a network may have, ground included.
pub const MAX_NODES: usize = 24;

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

impl Law {
    /// Whether it has its value, or one of its values, in this slot.
    #[must_use]
    pub const fn depends_on(self, slot: usize) -> bool {
        match self {
            Self::Resistance(a) | Self::Capacitance(a) => a == slot,
            Self::SeriesRc(a, b) => a == slot || b == slot,
        }
    }
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
    /// Inputs: the first drives node 1, the next node 2, and so on.
    pub inputs: Vec<Drive>,
    /// Amplifiers: A1, A2, …
    pub amplifiers: Vec<Amplifier>,
    /// Where the stage's output is taken: at the converter's input, where there is one.
    pub load: Node,
    /// The converter's sampling capacitor while it is connected; ground where it is not.
    pub hold: Node,
}

impl Network {
    /// The node of an input.
    #[must_use]
    pub fn input_node(&self, input: usize) -> Node {
        Node(u8::try_from(input + 1).unwrap_or(u8::MAX))
    }

    /// What no steady current reaches: neither through resistances from ground, a voltage source or an output pin, nor otherwise.
    #[must_use]
    pub fn floating(&self) -> Floating {
        let bit = |node: Node| 1_u32 << node.0;
        let spread = |mut reached: u32| loop {
            let before = reached;
            for element in self.elements.iter().filter(|e| matches!(e.law, Law::Resistance(_))) {
                let ends = bit(element.a) | bit(element.b);
                if reached & ends != 0 {
                    reached |= ends;
                }
            }
            if reached == before {
                return reached;
            }
        };
        let mut reached = spread(self.amplifiers.iter().fold(1 | self.held(), |bits, a| bits | bit(a.pin)));
        let terminals = (0u8..).zip(&self.amplifiers).flat_map(|(amplifier, a)| {
            [(a.plus, Terminal { amplifier, inverting: false }), (a.minus, Terminal { amplifier, inverting: true })]
        });
        let input = terminals.into_iter().find(|(node, _)| reached & bit(*node) == 0).map(|(_, terminal)| terminal);
        let mut islands = 0;
        for node in (1..self.nodes).map(|n| 1_u32 << n) {
            if reached & node == 0 {
                reached |= spread(node);
                islands += 1;
            }
        }
        Floating { input, islands }
    }

    /// The nodes that ideal voltage sources hold (bit set).
    #[must_use]
    pub fn held(&self) -> u32 {
        self.inputs.iter().enumerate().filter(|(_, d)| **d == Drive::Voltage).fold(0, |bits, (i, _)| bits | 1 << (i + 1))
    }
}

/// What no steady current reaches.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Floating {
    /// The first amplifier input without a DC path: the operating point does not exist.
    pub input: Option<Terminal>,
    /// How many groups of nodes hang on capacitors alone without an amplifier's input in them. Each puts a factor of s into every
    /// determinant, and means nothing: no bias current asks for a way out.
    pub islands: usize,
}

/// What to leave out of a network, for the impedances seen from outside.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Without {
    /// Drive the first input's terminal itself: no source impedance there.
    pub source: bool,
    /// No load, and no converter.
    pub load: bool,
    /// The converter's sampling capacitor, which is connected only while it acquires.
    pub sample: bool,
}

impl Without {
    /// The stage as it works.
    pub const WORKING: Self = Self { source: false, load: false, sample: true };
}

/// Collects nodes and elements while a kind lays out its network.
#[derive(Debug)]
pub struct Builder<'a> {
    stage: &'a Stage,
    parameters: &'a Parameters,
    without: Without,
    nodes: u8,
    inputs: Vec<Drive>,
    elements: Vec<Element>,
    amplifiers: Vec<Amplifier>,
    load: Node,
    hold: Node,
}

impl<'a> Builder<'a> {
    /// Lays out the network of a stage.
    #[must_use]
    pub fn lay_out(stage: &Stage, parameters: &Parameters, without: Without) -> Network {
        let inputs: Vec<Drive> = (stage.kind.spec().inputs)(stage).iter().map(|i| i.drive).collect();
        let nodes = u8::try_from(inputs.len() + 1).unwrap_or(u8::MAX);
        let mut builder =
            Builder { stage, parameters, without, nodes, inputs, elements: Vec::new(), amplifiers: Vec::new(), load: GROUND, hold: GROUND };
        (stage.kind.spec().build)(stage, &mut builder);
        Network {
            nodes: usize::from(builder.nodes),
            elements: builder.elements,
            inputs: builder.inputs,
            amplifiers: builder.amplifiers,
            load: builder.load,
            hold: builder.hold,
        }
    }

    /// A new node.
    pub fn node(&mut self) -> Node {
        let node = Node(self.nodes);
        self.nodes += 1;
        assert!(usize::from(self.nodes) <= MAX_NODES, "a kind's network stays below {MAX_NODES} nodes");
        node
    }

    /// The terminal of the first input: behind the source's impedance where there is one.
    pub fn signal(&mut self) -> Node {
        self.input(0)
    }

    /// The terminal of an input: behind its source's impedance where there is one. A current or charge input's terminal is its node,
    /// with what the source puts across it.
    pub fn input(&mut self, input: usize) -> Node {
        let node = Node(u8::try_from(input + 1).unwrap_or(u8::MAX));
        let left_out = self.without.source && input == 0;
        let (Some(source), false) = (self.stage.source(input), left_out) else { return node };
        let slot = |of: fn(u8) -> Parameter, builder: &Self| builder.slot(of(u8::try_from(input).unwrap_or(u8::MAX)));
        let across =
            |builder: &mut Self, law: Law, noise: Option<NoiseOrigin>| builder.elements.push(Element { a: node, b: GROUND, law, noise });
        match (source, self.inputs[input]) {
            (Source::Resistive { .. }, Drive::Voltage) => {
                let law = Law::Resistance(slot(Parameter::SourceImpedance, self));
                self.behind_input(node, law, Some(NoiseOrigin::SourceResistance(u8::try_from(input).unwrap_or(u8::MAX))))
            }
            (Source::Capacitive { .. }, Drive::Voltage) => {
                let law = Law::Capacitance(slot(Parameter::SourceImpedance, self));
                self.behind_input(node, law, None)
            }
            (Source::Resistive { .. }, _) => {
                let law = Law::Resistance(slot(Parameter::SourceImpedance, self));
                across(self, law, Some(NoiseOrigin::SourceResistance(u8::try_from(input).unwrap_or(u8::MAX))));
                node
            }
            (Source::Capacitive { .. }, _) => {
                let law = Law::Capacitance(slot(Parameter::SourceImpedance, self));
                across(self, law, None);
                node
            }
            (Source::Photodiode { shunt_resistance, .. }, _) => {
                let law = Law::Capacitance(slot(Parameter::SourceImpedance, self));
                across(self, law, None);
                if shunt_resistance.is_some() {
                    let law = Law::Resistance(slot(Parameter::SourceShunt, self));
                    across(self, law, Some(NoiseOrigin::SourceResistance(u8::try_from(input).unwrap_or(u8::MAX))));
                }
                node
            }
        }
    }

    /// The terminal of the reference's input: behind its output resistance where one is stated.
    pub fn reference(&mut self, input: usize) -> Node {
        let node = Node(u8::try_from(input + 1).unwrap_or(u8::MAX));
        match self.parameters.slot(Parameter::ReferenceResistance) {
            Some(slot) => self.behind_input(node, Law::Resistance(slot), Some(NoiseOrigin::ReferenceResistance)),
            None => node,
        }
    }

    /// The node that an input drives.
    #[must_use]
    pub fn driven(&self, input: usize) -> Node {
        Node(u8::try_from(input + 1).unwrap_or(u8::MAX))
    }

    fn behind_input(&mut self, node: Node, law: Law, noise: Option<NoiseOrigin>) -> Node {
        let terminal = self.node();
        self.elements.push(Element { a: node, b: terminal, law, noise });
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

    /// Places the next amplifier with what its data sheet puts at its inputs; with the first one, what the board does.
    pub fn amplifier(&mut self, plus: Node, minus: Node, pin: Node) {
        let index = self.amplifiers.len();
        self.amplifiers.push(Amplifier { plus, minus, pin });
        for (figure, a, b) in [
            (PartFigure::DifferentialResistance, plus, minus),
            (PartFigure::DifferentialCapacitance, plus, minus),
            (PartFigure::CommonModeResistance, plus, GROUND),
            (PartFigure::CommonModeCapacitance, plus, GROUND),
            (PartFigure::CommonModeResistance, minus, GROUND),
            (PartFigure::CommonModeCapacitance, minus, GROUND),
        ] {
            if let Some(slot) = self.parameters.part_slot(index, figure) {
                let law = match figure {
                    PartFigure::DifferentialResistance | PartFigure::CommonModeResistance => Law::Resistance(slot),
                    _ => Law::Capacitance(slot),
                };
                self.elements.push(Element { a, b, law, noise: None });
            }
        }
        if index > 0 {
            return;
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

    /// How many inputs the stage has.
    #[must_use]
    pub fn inputs(&self) -> usize {
        self.inputs.len()
    }

    /// The + input of an inverting kind: ground, or a node behind `Rp` and `Cp`.
    pub fn balanced(&mut self) -> Node {
        if self.stage.component("Rp").is_none() {
            return GROUND;
        }
        let plus = self.node();
        self.component("Rp", plus, GROUND);
        self.component("Cp", plus, GROUND);
        plus
    }

    /// The usual end of a layout: the output pin and what hangs on it, the feedback to the inverting input (the resistor senses the pin,
    /// or the load where `Riso` stands inside the loop; the capacitor always the pin), the noise-gain pair, the amplifier.
    pub fn feedback(&mut self, plus: Node, minus: Node, resistor: &'static str, capacitor: &'static str) {
        let (pin, sense) = self.pin();
        self.component(resistor, sense, minus);
        self.component(capacitor, pin, minus);
        self.series_rc("Rng", "Cng", plus, minus);
        self.amplifier(plus, minus, pin);
    }

    /// The output pin with what hangs on it, and where a feedback resistor senses the output.
    pub fn pin(&mut self) -> (Node, Node) {
        let pin = self.node();
        let load = self.output(pin);
        let sense = match self.stage.isolation {
            Isolation::OutsideLoop => pin,
            Isolation::InsideLoop => load,
        };
        (pin, sense)
    }

    /// The output side shared by all kinds: `Riso`, snubber, load, converter. Returns the node that an inside loop senses.
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
            self.converter(load);
        }
        load
    }

    /// The converter behind the output, and its sampling capacitor while that is connected.
    fn converter(&mut self, output: Node) {
        let between = self.parameters.slot(Parameter::ConverterSeries);
        let input = self.behind_resistance(between, output, Some(NoiseOrigin::ConverterSeries));
        self.load = input;
        let capacitor = |builder: &mut Self, parameter: Parameter, node: Node| {
            let slot = builder.parameters.slot(parameter);
            if let Some(slot) = slot {
                builder.elements.push(Element { a: node, b: GROUND, law: Law::Capacitance(slot), noise: None });
            }
            slot.is_some()
        };
        capacitor(self, Parameter::ConverterShunt, input);
        if !self.without.sample {
            let switch = self.parameters.slot(Parameter::SwitchResistance);
            let hold = self.behind_resistance(switch, input, None);
            if capacitor(self, Parameter::SampleCapacitance, hold) {
                self.hold = hold;
            }
        }
    }

    /// The node behind a resistance; `from` itself where there is none.
    fn behind_resistance(&mut self, slot: Option<usize>, from: Node, noise: Option<NoiseOrigin>) -> Node {
        let Some(slot) = slot else { return from };
        let to = self.node();
        self.elements.push(Element { a: from, b: to, law: Law::Resistance(slot), noise });
        to
    }

    fn slot(&self, parameter: Parameter) -> usize {
        self.parameters.slot(parameter).expect("a placed element has a parameter")
    }
}
