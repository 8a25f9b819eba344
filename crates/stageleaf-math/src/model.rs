//! A stage compiled: its network, its expansions, its parameter table. One model serves every build of the stage.

use alloc::{vec, vec::Vec};
use core::cell::OnceCell;

use crate::{
    analysis::second_pole,
    network::{
        Builder, DRIVEN, Law, Network, Node, Without,
        expand::{Column, DEGREE, Plan, Shape, Weight},
    },
    parameters::Parameters,
    part::{PartFigure, Zero},
    stage::Stage,
};

/// An expansion with the branches that it runs over.
#[derive(Clone, Debug)]
pub struct Expansion {
    /// Elements of each branch (indices into the network's), in the plan's column order; empty for the amplifier's column.
    branches: Vec<Vec<usize>>,
    /// Compiled steps.
    pub plan: Plan,
}

/// A compiled stage.
#[derive(Clone, Debug)]
pub struct Model<'a> {
    /// The stage.
    pub stage: &'a Stage,
    /// Everything that can vary.
    pub parameters: Parameters,
    /// The network.
    pub network: Network,
    /// Voltages at all nodes for the source.
    pub forward: Expansion,
    /// Voltage at the load for a current into any node.
    pub adjoint: Expansion,
    /// Voltage at the load for a voltage in series with the amplifier's input (to be multiplied by its gain).
    pub series_input: Expansion,
    /// Higher poles in Hz, stated or solved from a stated phase margin.
    pub poles: Option<Vec<f64>>,
    /// Zeros.
    pub zeros: Vec<Zero>,
    /// Impedance and angular frequency by which the network is scaled.
    pub scale: (f64, f64),
    /// Whether the part states all that response and loop depend on, so that stability can be judged.
    pub small_signal: bool,
    input: OnceCell<Probe>,
    output: OnceCell<Probe>,
}

/// An impedance seen from outside: a network and the determinants whose ratio it is.
#[derive(Clone, Debug)]
pub struct Probe {
    /// The network without what is outside.
    pub network: Network,
    /// With the terminal joined to ground.
    pub above: Expansion,
    /// With it open.
    pub below: Expansion,
}

/// What response and loop depend on, besides the higher poles.
pub const SMALL_SIGNAL: [PartFigure; 5] = [
    PartFigure::OpenLoop,
    PartFigure::Gbw,
    PartFigure::OutputResistance,
    PartFigure::DifferentialCapacitance,
    PartFigure::CommonModeCapacitance,
];

impl<'a> Model<'a> {
    /// Lays out and compiles.
    #[must_use]
    pub fn compile(stage: &'a Stage) -> Self {
        let parameters = Parameters::of(stage);
        let network = Builder::lay_out(stage, &parameters, Without::default());
        let (minus, plus) = (network.amplifier.minus, network.amplifier.plus);
        debug_assert!(minus != plus, "the inputs are apart");
        let source = DRIVEN.0;
        let forward = Expansion::compile(&network, Shape::Forward { source });
        let adjoint = Expansion::compile(&network, Shape::Adjoint { source, sense: network.load.0 });
        let series_input =
            Expansion::compile(&network, Shape::Closed { both: 1 << source, row: network.amplifier.pin.0, column: network.load.0 });
        let scale = scale(&network, &parameters);
        let small_signal = SMALL_SIGNAL.iter().all(|&f| parameters.part_slot(f).is_some());
        let poles = stage.part.poles.clone().or_else(|| second_pole::solve(&stage.part).map(|f| vec![f]));
        let has_poles = poles.is_some();
        Self {
            stage,
            parameters,
            network,
            forward,
            adjoint,
            series_input,
            poles,
            zeros: stage.part.zeros.clone(),
            scale,
            small_signal: small_signal && has_poles,
            input: OnceCell::new(),
            output: OnceCell::new(),
        }
    }

    /// The impedance at the stage's signal terminal.
    pub fn input_probe(&self) -> &Probe {
        self.input.get_or_init(|| self.probe(Without { source: true, load: false }, 1 << DRIVEN.0, 0))
    }

    /// The impedance at the output terminal.
    pub fn output_probe(&self) -> &Probe {
        self.output.get_or_init(|| self.probe(Without { source: false, load: true }, 1 << self.network.load.0, 1 << DRIVEN.0))
    }

    fn probe(&self, without: Without, terminal: u16, held: u16) -> Probe {
        let network = Builder::lay_out(self.stage, &self.parameters, without);
        let closed = |both| Expansion::compile(&network, Shape::Closed { both, row: 0, column: 0 });
        let (above, below) = (closed(terminal | held), closed(held));
        Probe { network, above, below }
    }

    /// The transfer from the source to the load at DC, without solving the rest.
    #[must_use]
    pub fn dc_gain(&self, values: &[f64]) -> f64 {
        let resistance = self.part(values, PartFigure::OutputResistance).unwrap_or(0.0);
        let open_loop = self.part(values, PartFigure::OpenLoop).unwrap_or(1.0);
        let weights = self.forward.weights(&self.network, values, resistance, self.scale);
        let mut scratch = Vec::new();
        self.forward.plan.evaluate_constants(&weights, &mut scratch);
        let constant = |node: Node| -> f64 {
            self.forward
                .plan
                .outcomes
                .iter()
                .filter(|o| o.joined >> node.0 & 1 == 1)
                .map(|o| self.forward.plan.polynomial(o, &scratch)[0] * if o.amplified { open_loop } else { 1.0 })
                .sum()
        };
        constant(self.network.load) / constant(DRIVEN)
    }

    /// A part figure's value in a build.
    #[must_use]
    pub fn part(&self, values: &[f64], figure: PartFigure) -> Option<f64> {
        self.parameters.part_slot(figure).map(|slot| values[slot])
    }
}

impl Expansion {
    /// Compiles the expansion of `shape` over a network.
    #[must_use]
    pub fn compile(network: &Network, shape: Shape) -> Self {
        let mut pairs: Vec<((Node, Node), Vec<usize>)> = Vec::new();
        for (index, element) in network.elements.iter().enumerate() {
            let key = if element.a < element.b { (element.a, element.b) } else { (element.b, element.a) };
            if key.0 == key.1 {
                continue;
            }
            match pairs.iter_mut().find(|(k, _)| *k == key) {
                Some((_, members)) => members.push(index),
                None => pairs.push((key, vec![index])),
            }
        }
        // In the order of the signal's path, so that few nodes are open at a time.
        pairs.sort_by_key(|&((a, b), _)| (b, a));
        let amplifier = network.amplifier;
        let mut columns = Vec::with_capacity(pairs.len() + 1);
        let mut branches = Vec::with_capacity(pairs.len() + 1);
        let mut degrees = Vec::with_capacity(pairs.len() + 1);
        columns.push(Column::Amplifier { plus: amplifier.plus.0, minus: amplifier.minus.0, pin: amplifier.pin.0 });
        branches.push(Vec::new());
        degrees.push(0);
        for ((a, b), members) in pairs {
            columns.push(Column::Branch(a.0, b.0));
            degrees.push(branch_degree(network, &members));
            branches.push(members);
        }
        Self { plan: Plan::compile(network.nodes, &columns, &degrees, shape), branches }
    }

    /// The numeric weights for a build, with the output resistance in the amplifier's column.
    pub fn weights(&self, network: &Network, values: &[f64], output_resistance: f64, scale: (f64, f64)) -> Vec<Weight> {
        self.branches
            .iter()
            .map(|members| {
                let mut weight = Weight { out: [0.0; DEGREE + 1], taken: [0.0; DEGREE + 1] };
                if members.is_empty() {
                    weight.out[0] = output_resistance / scale.0;
                    weight.taken[0] = 1.0;
                } else {
                    weight.out[0] = 1.0;
                    for &index in members {
                        weight = beside(&weight, network.elements[index].law, values, scale);
                    }
                }
                weight
            })
            .collect()
    }
}

/// A further element in parallel.
fn beside(weight: &Weight, law: Law, values: &[f64], (ohms, omega): (f64, f64)) -> Weight {
    let farads = |slot: usize| values[slot] * omega * ohms;
    let (out, taken) = match law {
        Law::Resistance(r) => ([values[r] / ohms, 0.0], [1.0, 0.0]),
        Law::Capacitance(c) => ([1.0, 0.0], [0.0, farads(c)]),
        Law::SeriesRc(r, c) => ([1.0, values[r] / ohms * farads(c)], [0.0, farads(c)]),
    };
    let product = |a: &[f64; DEGREE + 1], b: &[f64; 2]| {
        let mut p = [0.0; DEGREE + 1];
        for (i, x) in a.iter().enumerate() {
            for (j, y) in b.iter().enumerate() {
                if i + j <= DEGREE {
                    p[i + j] += x * y;
                }
            }
        }
        p
    };
    let (a, b) = (product(&weight.taken, &out), product(&weight.out, &taken));
    let mut sum = a;
    for (s, y) in sum.iter_mut().zip(&b) {
        *s += y;
    }
    Weight { out: product(&weight.out, &out), taken: sum }
}

fn branch_degree(network: &Network, members: &[usize]) -> usize {
    let mut series = 0;
    let mut capacitor = 0;
    for &index in members {
        match network.elements[index].law {
            Law::Resistance(_) => {}
            Law::Capacitance(_) => capacitor = 1,
            Law::SeriesRc(..) => series += 1,
        }
    }
    assert!(series + capacitor <= DEGREE, "few series pairs share a branch");
    series + capacitor
}

/// Geometric means, so that scaled coefficients stay near one.
fn scale(network: &Network, parameters: &Parameters) -> (f64, f64) {
    let (mut ohms, mut resistors, mut farads, mut capacitors) = (0.0, 0.0, 0.0, 0.0);
    for element in &network.elements {
        let mut note = |slot: usize, resistance: bool| {
            let value = parameters.entries[slot].nominal;
            if value > 0.0 && value < f64::INFINITY {
                let (sum, count) = if resistance { (&mut ohms, &mut resistors) } else { (&mut farads, &mut capacitors) };
                *sum += libm::log2(value);
                *count += 1.0;
            }
        };
        match element.law {
            Law::Resistance(r) => note(r, true),
            Law::Capacitance(c) => note(c, false),
            Law::SeriesRc(r, c) => {
                note(r, true);
                note(c, false);
            }
        }
    }
    // Powers of two, so that scaling is exact.
    let ohms = if resistors > 0.0 { libm::exp2(libm::round(ohms / resistors)) } else { 1024.0 };
    let gbw = parameters.part_slot(PartFigure::Gbw).map_or(1e6, |slot| parameters.entries[slot].nominal);
    let farads = if capacitors > 0.0 { libm::exp2(libm::round(farads / capacitors)) } else { 1.0 / (gbw * ohms) };
    (ohms, libm::exp2(libm::round(libm::log2(1.0 / (ohms * farads)))))
}
