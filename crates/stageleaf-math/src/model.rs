//! A stage compiled: its network, its expansions, its parameter table. One model serves every build of the stage.

use alloc::{rc::Rc, vec, vec::Vec};
use core::cell::{OnceCell, RefCell};

use crate::{
    analysis::{second_pole, sweep::Lane},
    kept::Kept,
    kind::Drives,
    network::{
        Builder, Drive, Floating, Law, Network, Node, Without,
        expand::{Column, DEGREE, Plan, Powers, Shape, Weight},
    },
    parameters::Parameters,
    part::{PartFigure, Zero},
    stage::Stage,
};

/// An expansion with the branches that it runs over.
#[derive(Clone, Debug)]
pub struct Expansion {
    /// What each column of the plan is.
    columns: Vec<Members>,
    /// Compiled steps, shared by all networks of this topology.
    pub plan: Rc<Plan>,
}

/// Expansions compiled so far, by topology: an edit of a value compiles nothing anew.
#[derive(Clone, Debug, Default)]
pub struct Plans(Rc<RefCell<Kept<Topology, Rc<Plan>>>>);

/// All that a plan depends on.
type Topology = (usize, Vec<(Column, Powers)>, Shape);

/// Topologies kept; a stage needs some ten.
const PLANS_KEPT: usize = 256;

impl Plans {
    fn plan(&self, topology: Topology) -> Rc<Plan> {
        let mut known = self.0.borrow_mut();
        if let Some(plan) = known.get(&topology) {
            return plan.clone();
        }
        if known.len() >= PLANS_KEPT {
            known.clear();
        }
        let plan = Rc::new(Plan::compile(topology.0, &topology.1, topology.2));
        known.insert(topology, plan.clone());
        plan
    }
}

/// What a column of a plan is made of.
#[derive(Clone, Debug)]
enum Members {
    /// Elements in parallel (indices into the network's).
    Elements(Vec<usize>),
    /// An amplifier's output.
    Amplifier(usize),
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
    /// For each input, voltages at all nodes.
    pub forward: Vec<Expansion>,
    /// The determinant with ideal voltage sources at zero, where no held input's own terms give it.
    pub closed: Option<Expansion>,
    /// Voltage at the load for a current into any node.
    pub adjoint: Expansion,
    /// For each amplifier, voltage at the load for a voltage in series with its input (to be multiplied by its gain).
    pub series_input: Vec<Expansion>,
    /// What is judged as signals: each drive's weight on each input.
    pub drives: Vec<Vec<f64>>,
    /// By amplifier: higher poles in Hz, stated or solved from a stated phase margin.
    pub poles: Vec<Option<Vec<f64>>>,
    /// By amplifier: zeros.
    pub zeros: Vec<Vec<Zero>>,
    /// Impedance and angular frequency by which the network is scaled.
    pub scale: (f64, f64),
    /// Whether the parts state all that response and loop depend on, so that stability can be judged.
    pub small_signal: bool,
    /// What no steady current reaches.
    pub floating: Floating,
    /// Room for expansions.
    pub(crate) scratch: RefCell<Vec<[f64; 1]>>,
    /// Room for expansions of several builds at once.
    pub(crate) lanes: RefCell<Vec<Lane>>,
    plans: Plans,
    inside: OnceCell<Vec<Expansion>>,
    input: OnceCell<Probe>,
    output: OnceCell<Probe>,
    sampling: OnceCell<Injected>,
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

/// A network driven by a current at one of its nodes.
#[derive(Clone, Debug)]
pub struct Injected {
    /// The network.
    pub network: Network,
    /// Voltages at all nodes.
    pub driven: Expansion,
    /// The determinant.
    pub closed: Expansion,
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
        Self::compile_with(stage, &Plans::default())
    }

    /// Lays out, and compiles what `plans` does not hold yet.
    #[must_use]
    pub fn compile_with(stage: &'a Stage, plans: &Plans) -> Self {
        let parameters = Parameters::of(stage);
        let network = Builder::lay_out(stage, &parameters, Without::WORKING);
        debug_assert!(network.amplifiers.iter().all(|a| a.minus != a.plus), "the inputs are apart");
        debug_assert!(network.amplifiers.len() == stage.kind.spec().amplifiers, "a kind has as many amplifiers as it says");
        let held = network.held();
        let forward = (0..network.inputs.len())
            .map(|input| {
                let source = network.input_node(input).0;
                Expansion::compile(&network, Shape::Forward { source, held: held & !(1 << source) }, plans)
            })
            .collect();
        let closed = (network.inputs.first() != Some(&Drive::Voltage))
            .then(|| Expansion::compile(&network, Shape::Closed { both: held, row: 0, column: 0 }, plans));
        let adjoint = Expansion::compile(&network, Shape::Adjoint { held, sense: network.load.0 }, plans);
        let series_input = network
            .amplifiers
            .iter()
            .map(|a| Expansion::compile(&network, Shape::Closed { both: held, row: a.pin.0, column: network.load.0 }, plans))
            .collect();
        let scale = scale(&network, &parameters);
        let parts = || (0..network.amplifiers.len()).map(|a| stage.part_of(a));
        let poles: Vec<Option<Vec<f64>>> = parts().map(|p| p.poles.clone().or_else(|| second_pole::solve(p).map(|f| vec![f]))).collect();
        let zeros = parts().map(|p| p.zeros.clone()).collect();
        let stated = |a: usize| SMALL_SIGNAL.iter().all(|&f| parameters.part_slot(a, f).is_some());
        let small_signal = poles.iter().all(Option::is_some) && (0..network.amplifiers.len()).all(stated);
        let inputs = network.inputs.len();
        let drives = match stage.kind.spec().drives {
            Drives::Each => (0..inputs).map(|i| (0..inputs).map(|k| if k == i { 1.0 } else { 0.0 }).collect()).collect(),
            Drives::Differential => vec![vec![-0.5, 0.5], vec![1.0, 1.0]],
        };
        Self {
            stage,
            parameters,
            forward,
            closed,
            adjoint,
            series_input,
            drives,
            poles,
            zeros,
            scale,
            small_signal,
            floating: network.floating(),
            scratch: RefCell::default(),
            lanes: RefCell::default(),
            plans: plans.clone(),
            inside: OnceCell::new(),
            input: OnceCell::new(),
            output: OnceCell::new(),
            sampling: OnceCell::new(),
            network,
        }
    }

    /// For each amplifier, voltages at all nodes for a voltage in series with its input (to be multiplied by its gain).
    pub(crate) fn inside(&self) -> &[Expansion] {
        self.inside.get_or_init(|| {
            let held = self.network.held();
            let shape = |pin: Node| Shape::Forward { source: pin.0, held };
            self.network.amplifiers.iter().map(|a| Expansion::compile(&self.network, shape(a.pin), &self.plans)).collect()
        })
    }

    /// The impedance at the first input's terminal.
    pub fn input_probe(&self) -> &Probe {
        let node = 1 << self.network.input_node(0).0;
        self.input.get_or_init(|| self.probe(Without { source: true, ..Without::WORKING }, |_| node, self.network.held() & !node))
    }

    /// The impedance at the output terminal.
    pub fn output_probe(&self) -> &Probe {
        let without = Without { load: true, ..Without::WORKING };
        self.output.get_or_init(|| self.probe(without, |network| 1 << network.load.0, self.network.held()))
    }

    fn probe(&self, without: Without, terminal: impl Fn(&Network) -> u32, held: u32) -> Probe {
        let network = Builder::lay_out(self.stage, &self.parameters, without);
        let closed = |both| Expansion::compile(&network, Shape::Closed { both, row: 0, column: 0 }, &self.plans);
        let (above, below) = (closed(terminal(&network) | held), closed(held));
        Probe { network, above, below }
    }

    /// The network while the converter's sampling capacitor is connected, driven there by a current.
    pub fn sampling(&self) -> &Injected {
        self.sampling.get_or_init(|| {
            let network = Builder::lay_out(self.stage, &self.parameters, Without { sample: false, ..Without::WORKING });
            let held = network.held();
            let driven = Expansion::compile(&network, Shape::Forward { source: network.hold.0, held }, &self.plans);
            let closed = Expansion::compile(&network, Shape::Closed { both: held, row: 0, column: 0 }, &self.plans);
            Injected { network, driven, closed }
        })
    }

    /// The first drive's transfer to the load at DC, up to its scale, for builds that have the same open-loop gains.
    pub(crate) fn dc_gains<const N: usize>(&self, weights: &[Weight<N>], open_loop: &[f64], scratch: &mut Vec<[f64; N]>) -> [f64; N] {
        let gains = |set: u8| open_loop.iter().enumerate().filter(|(a, _)| set >> a & 1 == 1).map(|(_, g)| g).product::<f64>();
        let add = |sums: &mut [f64; N], plan: &Plan, terms: &[[f64; N]], node: Option<u8>, factor: f64| {
            for outcome in plan.outcomes.iter().filter(|o| node.is_none_or(|n| o.joined >> n & 1 == 1)) {
                let factor = factor * gains(outcome.amplified);
                for (sum, term) in sums.iter_mut().zip(&plan.polynomial(outcome, terms)[0]) {
                    *sum += factor * term;
                }
            }
        };
        let (mut above, mut below) = ([0.0; N], [0.0; N]);
        for (index, (weight, Expansion { plan, .. })) in self.drives[0].iter().zip(&self.forward).enumerate() {
            let whole = index == 0 && self.closed.is_none();
            if weight.abs() > 0.0 || whole {
                plan.evaluate_constants(weights, scratch);
                add(&mut above, plan, plan.ends(scratch), Some(self.network.load.0), *weight);
                if whole {
                    add(&mut below, plan, plan.ends(scratch), Some(self.network.input_node(0).0), 1.0);
                }
            }
        }
        if let Some(Expansion { plan, .. }) = &self.closed {
            plan.evaluate_constants(weights, scratch);
            add(&mut below, plan, plan.ends(scratch), None, 1.0);
        }
        for (above, below) in above.iter_mut().zip(&below) {
            *above /= below;
        }
        above
    }

    /// Whether a slot acts on alternating signals alone: a capacitance, or a gain-bandwidth product.
    #[must_use]
    pub fn reactive(&self, slot: usize) -> bool {
        let gbw = |a| self.parameters.part_slot(a, PartFigure::Gbw) == Some(slot);
        let capacitance = |law: Law| match law {
            Law::Capacitance(c) | Law::SeriesRc(_, c) => c == slot,
            Law::Resistance(_) => false,
        };
        (0..self.network.amplifiers.len()).any(gbw) || self.network.elements.iter().any(|e| capacitance(e.law))
    }

    /// The expansions behind loop and transfers, in the order in which their terms are kept.
    pub(crate) fn forward_expansions(&self) -> impl Iterator<Item = &Expansion> + Clone {
        self.forward.iter().chain(&self.closed)
    }

    /// Those behind the transfers to the load; the second of each pair is the amplifier whose column is struck out.
    pub(crate) fn backward_expansions(&self) -> impl Iterator<Item = (&Expansion, Option<usize>)> + Clone {
        core::iter::once((&self.adjoint, None)).chain(self.series_input.iter().enumerate().map(|(a, e)| (e, Some(a))))
    }

    /// A figure of an amplifier's part in a build.
    #[must_use]
    pub fn part(&self, values: &[f64], amplifier: usize, figure: PartFigure) -> Option<f64> {
        self.parameters.part_slot(amplifier, figure).map(|slot| values[slot])
    }

    /// Each amplifier's output resistance; one that is not stated counts as zero (figures that depend on it are undetermined).
    #[must_use]
    pub fn output_resistances(&self, values: &[f64]) -> Vec<f64> {
        let part = |a| self.part(values, a, PartFigure::OutputResistance).unwrap_or(0.0);
        (0..self.network.amplifiers.len()).map(part).collect()
    }
}

impl Expansion {
    /// Compiles the expansion of `shape` over a network, unless `plans` holds it.
    #[must_use]
    pub fn compile(network: &Network, shape: Shape, plans: &Plans) -> Self {
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
        let mut list: Vec<(u8, u8, Column, Powers, Members)> = pairs
            .into_iter()
            .map(|((a, b), members)| (b.0, a.0, Column::Branch(a.0, b.0), branch_powers(network, &members), Members::Elements(members)))
            .collect();
        for (index, amplifier) in network.amplifiers.iter().enumerate() {
            let column = Column::Amplifier { plus: amplifier.plus.0, minus: amplifier.minus.0, pin: amplifier.pin.0 };
            list.push((amplifier.pin.0, 0, column, Powers { out: (0, 0), taken: (0, 0) }, Members::Amplifier(index)));
        }
        // In the order of the signal's path, so that few nodes are open at a time. The sort is stable: amplifiers keep their order.
        list.sort_by_key(|(b, a, ..)| (*b, *a));
        let order: Vec<usize> = list.iter().filter_map(|l| if let Members::Amplifier(i) = l.4 { Some(i) } else { None }).collect();
        debug_assert!(order.windows(2).all(|w| w[0] < w[1]), "amplifiers' pins rise with their numbers");
        let topology = list.iter().map(|l| (l.2, l.3)).collect();
        Self { plan: plans.plan((network.nodes, topology, shape)), columns: list.into_iter().map(|l| l.4).collect() }
    }

    /// The numeric weights for a build, with output resistances in the amplifiers' columns.
    #[must_use]
    pub fn weights(&self, network: &Network, values: &[f64], resistances: &[f64], scale: (f64, f64)) -> Vec<Weight> {
        (0..self.columns.len()).map(|column| self.weight(column, network, values, resistances, scale)).collect()
    }

    /// The numeric weight of one column.
    #[must_use]
    pub fn weight(&self, column: usize, network: &Network, values: &[f64], resistances: &[f64], scale: (f64, f64)) -> Weight {
        let mut weight = Weight { out: [[0.0]; DEGREE + 1], taken: [[0.0]; DEGREE + 1] };
        match &self.columns[column] {
            Members::Amplifier(index) => {
                weight.out[0] = [resistances[*index] / scale.0];
                weight.taken[0] = [1.0];
            }
            Members::Elements(members) => {
                weight.out[0] = [1.0];
                for &index in members {
                    weight = beside(&weight, network.elements[index].law, values, scale);
                }
            }
        }
        weight
    }

    /// The columns whose weight depends on a slot of the parameter table; those of amplifiers when it is an output resistance.
    pub fn columns_of<'s>(&'s self, slot: usize, network: &'s Network, parameters: &'s Parameters) -> impl Iterator<Item = usize> + 's {
        let within = move |members: &Members| match members {
            Members::Amplifier(index) => parameters.part_slot(*index, PartFigure::OutputResistance) == Some(slot),
            Members::Elements(members) => members.iter().any(|&index| network.elements[index].law.depends_on(slot)),
        };
        self.columns.iter().enumerate().filter(move |(_, members)| within(members)).map(|(column, _)| column)
    }

    /// The weights with an amplifier's column left out: its pin's row is struck out.
    pub(crate) fn struck<const N: usize>(&self, weights: &[Weight<N>], amplifier: usize) -> Vec<Weight<N>> {
        let mut weights = weights.to_vec();
        if let Some(column) = self.amplifier_column(amplifier) {
            weights[column].out[0] = [1.0; N];
        }
        weights
    }

    /// The column of an amplifier.
    #[must_use]
    pub fn amplifier_column(&self, amplifier: usize) -> Option<usize> {
        self.columns.iter().position(|m| matches!(m, Members::Amplifier(i) if *i == amplifier))
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
    let product = |a: &[[f64; 1]; DEGREE + 1], b: &[f64; 2]| {
        let mut p = [[0.0]; DEGREE + 1];
        for (i, [x]) in a.iter().enumerate() {
            for (j, y) in b.iter().enumerate() {
                if i + j <= DEGREE {
                    p[i + j][0] += x * y;
                }
            }
        }
        p
    };
    let (a, b) = (product(&weight.taken, &out), product(&weight.out, &taken));
    let mut sum = a;
    for (s, y) in sum.iter_mut().zip(&b) {
        s[0] += y[0];
    }
    Weight { out: product(&weight.out, &out), taken: sum }
}

fn branch_powers(network: &Network, members: &[usize]) -> Powers {
    let (mut series, mut capacitor, mut resistor) = (0, 0, false);
    for &index in members {
        match network.elements[index].law {
            Law::Resistance(_) => resistor = true,
            Law::Capacitance(_) => capacitor = 1,
            Law::SeriesRc(..) => series += 1,
        }
    }
    assert!(series + capacitor <= DEGREE, "few series pairs share a branch");
    Powers { out: (0, series), taken: (usize::from(!resistor), series + capacitor) }
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
    let gbw = parameters.part_slot(0, PartFigure::Gbw).map_or(1e6, |slot| parameters.entries[slot].nominal);
    let farads = if capacitors > 0.0 { libm::exp2(libm::round(farads / capacitors)) } else { 1.0 / (gbw * ohms) };
    (ohms, libm::exp2(libm::round(libm::log2(1.0 / (ohms * farads)))))
}
