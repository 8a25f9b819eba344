//! What an element of a solved circuit is in a stage of ours, by the nodes that it joins; its name says nothing.

use stageleaf_math::{kind::Kind, report::NoiseOrigin};

/// An element's place in a stage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Role {
    Component(&'static str),
    SourceResistance,
    /// A photodiode's own, across the input.
    JunctionCapacitance,
    ShuntResistance,
    LoadResistance,
    LoadCapacitance,
    StrayInverting,
}

impl Role {
    pub fn origin(self) -> NoiseOrigin {
        match self {
            Self::Component(name) => NoiseOrigin::Component(name),
            Self::SourceResistance | Self::ShuntResistance => NoiseOrigin::SourceResistance(0),
            Self::LoadResistance => NoiseOrigin::LoadResistance,
            Self::JunctionCapacitance | Self::LoadCapacitance | Self::StrayInverting => panic!("a capacitor makes no noise"),
        }
    }
}

/// Resistor or capacitor, the labels of its nodes, its place. Labels: "0" ground, "in…" an input, "out" the load, "+" and "-" the
/// amplifier's inputs, "inner" any other node; of several amplifiers "+3", "-1", "pin1" and so on.
type Place = (&'static str, &'static str, &'static str, Role);

const fn component(sort: &'static str, a: &'static str, b: &'static str, name: &'static str) -> Place {
    (sort, a, b, Role::Component(name))
}

const SUMMING: &[Place] = &[
    component("R", "in1", "-", "Rin1"),
    component("R", "in2", "-", "Rin2"),
    component("R", "in3", "-", "Rin3"),
    component("R", "-", "out", "Rf"),
    component("C", "-", "out", "Cf"),
];

const DIFFERENCE: &[Place] =
    &[component("R", "in1", "-", "R1"), component("R", "-", "out", "R2"), component("R", "in2", "+", "R3"), component("R", "+", "0", "R4")];

const INSTRUMENTATION: &[Place] = &[
    component("R", "-1", "-2", "Rg"),
    component("R", "-1", "pin1", "Rf1"),
    component("R", "-2", "pin2", "Rf2"),
    component("R", "pin1", "-3", "R1"),
    component("R", "-3", "out", "R2"),
    component("R", "pin2", "+3", "R3"),
    component("R", "+3", "0", "R4"),
];

const TRANSIMPEDANCE: &[Place] = &[
    component("R", "-", "out", "Rf"),
    component("C", "-", "out", "Cf"),
    ("C", "-", "0", Role::JunctionCapacitance),
    ("R", "-", "0", Role::ShuntResistance),
];

const INTEGRATOR: &[Place] = &[component("R", "in", "-", "Rin"), component("R", "-", "out", "Rf"), component("C", "-", "out", "Cf")];

const DIFFERENTIATOR: &[Place] = &[
    component("R", "in", "inner", "Rin"),
    component("C", "inner", "-", "Cin"),
    component("R", "-", "out", "Rf"),
    component("C", "-", "out", "Cf"),
];

const SALLEN_KEY_LOW_PASS: &[Place] = &[
    component("R", "in", "inner", "R1"),
    component("R", "inner", "+", "R2"),
    component("C", "inner", "out", "C1"),
    component("C", "+", "0", "C2"),
];

const MULTIPLE_FEEDBACK_LOW_PASS: &[Place] = &[
    component("R", "in", "inner", "R1"),
    component("R", "inner", "out", "R2"),
    component("R", "inner", "-", "R3"),
    component("C", "inner", "0", "C1"),
    component("C", "-", "out", "C2"),
];

/// The place of an element between two labelled nodes.
pub fn place(kind: Kind, sort: &str, a: &str, b: &str) -> Option<Role> {
    let places = match kind {
        Kind::Summing => SUMMING,
        Kind::Difference => DIFFERENCE,
        Kind::Instrumentation => INSTRUMENTATION,
        Kind::Transimpedance => TRANSIMPEDANCE,
        Kind::Integrator => INTEGRATOR,
        Kind::Differentiator => DIFFERENTIATOR,
        Kind::SallenKeyLowPass => SALLEN_KEY_LOW_PASS,
        Kind::MultipleFeedbackLowPass => MULTIPLE_FEEDBACK_LOW_PASS,
        _ => return None,
    };
    places.iter().find(|p| p.0 == sort && (p.1 == a && p.2 == b || p.1 == b && p.2 == a)).map(|p| p.3)
}
