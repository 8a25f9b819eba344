//! The circuit of the benchmarks, and the two kernels that sweep it: shared by the native program and by the WebAssembly one.

use stageleaf_math::{
    analysis::sweep,
    kind::Kind,
    model::Model,
    network::lu::Lu,
    part::{Part, PartFigure, Rating},
    solution::Solution,
    stage::{Ambient, Board, Component, Converter, Isolation, Load, Source, Span, Stage, Toleranced},
};

/// The stage from its values by name.
pub fn stage(value: &dyn Fn(&str) -> f64) -> Stage {
    let exact = |name: &str| Some(Toleranced::exact(value(name)));
    let mut part = Part { name: "bench".into(), poles: Some(vec![value("f2")]), ..Part::default() };
    for (figure, name) in [
        (PartFigure::OpenLoop, "Ao"),
        (PartFigure::Gbw, "GBW"),
        (PartFigure::OutputResistance, "Ro"),
        (PartFigure::DifferentialCapacitance, "Cdiff"),
        (PartFigure::CommonModeCapacitance, "Ccm"),
        (PartFigure::NoiseVoltage, "en"),
        (PartFigure::NoiseVoltageCorner, "fcv"),
        (PartFigure::NoiseCurrent, "in"),
        (PartFigure::NoiseCurrentCorner, "fci"),
    ] {
        part.state(figure, Rating::typical(value(name)));
    }
    let components = ["Rf", "Rg", "Cf", "Riso", "Rsn", "Csn"];
    Stage {
        name: "bench".into(),
        kind: Kind::NonInverting,
        components: components.map(|name| Component { name, value: Toleranced::exact(value(name)) }).into(),
        part,
        isolation: Isolation::InsideLoop,
        supply: None,
        sources: vec![Some(Source::Resistive { resistance: Toleranced::exact(value("Rs")) })],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load: Load { resistance: exact("RL"), capacitance: exact("CL") },
        converter: Converter::default(),
        board: Board { inverting_node: exact("Cn"), ..Board::default() },
        ambient: Some(Ambient::of(Span::exact(value("T")))),
        band: None,
        limits: Vec::new(),
        measured: Vec::new(),
    }
}

/// Response and noise at every frequency by the polynomials: the sum of all real parts and of all noise, so that nothing is left out
/// and two targets can be compared by bits.
pub fn polynomials(model: &Model<'_>, frequencies: &[f64]) -> f64 {
    let solution = Solution::new(model, model.parameters.nominal(), None);
    let looped = solution.looped();
    let response = sweep::ratio(&solution, solution.load_numerator(), &looped.closed, frequencies);
    let noise = sweep::noise(&solution, frequencies);
    response.iter().map(|h| h.re).sum::<f64>() + noise.total.iter().sum::<f64>()
}

/// The same by the checking solver.
pub fn checked(lu: &Lu, model: &Model<'_>, frequencies: &[f64]) -> f64 {
    let result = lu.sweep(&Solution::new(model, model.parameters.nominal(), None), frequencies);
    result.response.iter().map(|h| h.re).sum::<f64>() + result.noise.total.iter().sum::<f64>()
}
