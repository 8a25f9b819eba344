//! One build of a stage, solved: transfers as ratios of polynomials, worked out on demand and kept.

use alloc::{rc::Rc, vec, vec::Vec};
use core::{cell::OnceCell, f64::consts::TAU};

use num_complex::Complex64;

use crate::{
    model::{Expansion, Injected, Model},
    network::{Drive, Network, Node},
    part::PartFigure,
    polynomial::{Coefficients, Polynomial},
    report::Terminal,
};

/// The loop and the transfers from the inputs, over a common denominator in scaled frequency.
#[derive(Clone, Debug)]
pub struct Loop {
    /// Closed loop: the determinant with every amplifier's gain in it.
    pub closed: Polynomial,
    /// By amplifier: the return ratio's numerator and denominator, the other amplifiers alive; they add up to `closed`.
    pub returned: Vec<Polynomial>,
    /// See `returned`.
    pub open: Vec<Polynomial>,
    /// By input: the terms of the voltage at each node, by node and set of amplifiers.
    terms: Vec<Table>,
    /// By drive and node: the numerators that were asked for.
    numerators: Vec<OnceCell<Polynomial>>,
}

/// An expansion's polynomials by node and by set of amplifiers.
#[derive(Clone, Debug)]
struct Table {
    sets: usize,
    terms: Vec<Polynomial>,
}

impl Table {
    fn of(&self, node: usize) -> &[Polynomial] {
        &self.terms[node * self.sets..(node + 1) * self.sets]
    }
}

/// Numerators of the load's voltage for currents into nodes and for voltages at the amplifiers' inputs.
#[derive(Clone, Debug)]
pub struct Injection {
    /// For a current into each node, by node number, scaled by the network's impedance.
    pub current: Vec<Polynomial>,
    /// By amplifier: for a voltage in series with its input.
    pub input: Vec<Polynomial>,
}

/// Where the network's features lie, in scaled angular frequency.
#[derive(Clone, Debug)]
pub struct Roots {
    /// Closed-loop poles.
    pub poles: Vec<Complex64>,
    /// Zeros of the first drive's transfer to the load.
    pub zeros: Vec<Complex64>,
    /// By amplifier, where there are several: poles with its loop opened.
    pub open: Vec<Vec<Complex64>>,
    /// By amplifier: zeros of the return ratio.
    pub loop_zeros: Vec<Vec<Complex64>>,
}

/// A build.
#[derive(Debug)]
pub struct Solution<'m> {
    /// The compiled stage.
    pub model: &'m Model<'m>,
    /// Values by parameter slot.
    pub values: Vec<f64>,
    near: Option<&'m Roots>,
    /// A build with the same network, whose transfers serve this one too.
    twin: Option<Rc<Solution<'m>>>,
    looped: OnceCell<Loop>,
    injection: OnceCell<Injection>,
    inside: OnceCell<Vec<Table>>,
    inside_at_dc: OnceCell<Vec<Vec<f64>>>,
    roots: OnceCell<Roots>,
    grid: OnceCell<Vec<f64>>,
    products: OnceCell<Vec<Polynomial>>,
    pub(crate) power: OnceCell<crate::analysis::thermal::Power>,
    pub(crate) dc: OnceCell<crate::analysis::dc::Budget>,
    pub(crate) noise: OnceCell<Option<f64>>,
    pub(crate) edges: OnceCell<crate::analysis::response::Edges>,
    pub(crate) margins: OnceCell<crate::analysis::margins::Margins>,
    pub(crate) drives: OnceCell<Vec<crate::analysis::swing::Drive>>,
    pub(crate) clip: OnceCell<crate::report::Outcome>,
    pub(crate) kick: OnceCell<crate::analysis::converter::Kick>,
    pub(crate) reference: OnceCell<crate::analysis::response::ReferencePoint>,
}

impl<'m> Solution<'m> {
    /// A build of `model` with these values; `near` gives the roots of a neighbouring build as starting points.
    #[must_use]
    pub fn new(model: &'m Model<'m>, values: Vec<f64>, near: Option<&'m Roots>) -> Self {
        Self {
            model,
            values,
            near,
            twin: None,
            looped: OnceCell::new(),
            injection: OnceCell::new(),
            inside: OnceCell::new(),
            inside_at_dc: OnceCell::new(),
            roots: OnceCell::new(),
            grid: OnceCell::new(),
            products: OnceCell::new(),
            power: OnceCell::new(),
            dc: OnceCell::new(),
            noise: OnceCell::new(),
            edges: OnceCell::new(),
            margins: OnceCell::new(),
            drives: OnceCell::new(),
            clip: OnceCell::new(),
            kick: OnceCell::new(),
            reference: OnceCell::new(),
        }
    }

    /// The same, where only values differ from `twin` that the network does not depend on.
    #[must_use]
    pub fn beside(twin: Rc<Self>, values: Vec<f64>) -> Self {
        Self { twin: Some(twin.clone()), ..Self::new(twin.model, values, twin.near) }
    }

    /// The build whose transfers this one shares, if it does.
    pub(crate) fn twin(&self) -> Option<&Self> {
        self.twin.as_deref()
    }

    /// The build whose network this one has: itself, or its twin.
    pub(crate) fn network(&self) -> &Self {
        self.twin.as_ref().map_or(self, |twin| twin.network())
    }

    /// A figure of the first amplifier's part in this build.
    #[must_use]
    pub fn part(&self, figure: PartFigure) -> Option<f64> {
        self.part_of(0, figure)
    }

    /// A figure of an amplifier's part in this build.
    #[must_use]
    pub fn part_of(&self, amplifier: usize, figure: PartFigure) -> Option<f64> {
        self.model.part(&self.values, amplifier, figure)
    }

    /// How many amplifiers there are.
    #[must_use]
    pub fn amplifiers(&self) -> usize {
        self.model.network.amplifiers.len()
    }

    /// Scaled angular frequency of `hertz`.
    #[must_use]
    pub fn scaled(&self, hertz: f64) -> f64 {
        TAU * hertz / self.model.scale.1
    }

    /// Hz of a scaled angular frequency.
    #[must_use]
    pub fn hertz(&self, omega: f64) -> f64 {
        omega * self.model.scale.1 / TAU
    }

    /// An amplifier's gain as numerator `A0·Z` and denominator `P` in scaled frequency.
    #[must_use]
    pub fn amplifier(&self, index: usize) -> (Polynomial, Polynomial) {
        let omega = self.model.scale.1;
        let open_loop = self.part_of(index, PartFigure::OpenLoop).unwrap_or(1.0);
        let dominant = self.part_of(index, PartFigure::Gbw).map_or(0.0, |gbw| open_loop * omega / (TAU * gbw));
        let mut below = Polynomial(Coefficients::from_slice(&[1.0, dominant]));
        let factor = self.values[self.model.parameters.pole_factor()];
        for pole in self.model.poles[index].iter().flatten() {
            below = below.times(&[1.0, omega / (TAU * pole * factor)]);
        }
        let mut above = Polynomial(Coefficients::from_slice(&[open_loop]));
        for zero in &self.model.zeros[index] {
            let slope = omega / (TAU * zero.frequency);
            above = above.times(&[1.0, if zero.right_half_plane { -slope } else { slope }]);
        }
        (above, below)
    }

    /// For every set of amplifiers, the product of its members' numerators and the others' denominators.
    fn products(&self) -> &[Polynomial] {
        self.products.get_or_init(|| {
            let mut products = vec![Polynomial(Coefficients::from_slice(&[1.0]))];
            for index in 0..self.amplifiers() {
                let (above, below) = self.amplifier(index);
                let without: Vec<Polynomial> = products.iter().map(|p| p.times(&below.0)).collect();
                let with: Vec<Polynomial> = products.iter().map(|p| p.times(&above.0)).collect();
                products = without;
                products.extend(with);
            }
            products
        })
    }

    /// The sum over sets of amplifiers of their products with an expansion's terms, for the sets that `keep` admits.
    fn combine(&self, terms: &[Polynomial], keep: impl Fn(usize) -> bool) -> Polynomial {
        let mut sum = Polynomial::default();
        for (set, (terms, product)) in terms.iter().zip(self.products()).enumerate() {
            if keep(set) && !terms.0.is_empty() {
                sum.add_scaled(&product.times(&terms.0).0, 1.0);
            }
        }
        self.without_islands(sum)
    }

    /// Without the factors of s that groups of nodes without a DC path make. Of a current into such a group the lowest terms go too: they
    /// cancel against those of the current's return.
    fn without_islands(&self, mut polynomial: Polynomial) -> Polynomial {
        let common = if self.model.floating.input.is_some() { 0 } else { self.model.floating.islands };
        if common > 0 {
            polynomial.0.drain(..common.min(polynomial.0.len()));
        }
        polynomial
    }

    fn run(&self, expansion: &Expansion, network: &Network, struck: Option<usize>) -> Vec<f64> {
        let resistances = self.model.output_resistances(&self.values);
        let mut weights = expansion.weights(network, &self.values, &resistances, self.model.scale);
        if let Some(column) = struck.and_then(|a| expansion.amplifier_column(a)) {
            weights[column].out[0] = 1.0;
        }
        let mut scratch = Vec::new();
        expansion.plan.evaluate(&weights, &mut scratch);
        scratch
    }

    fn expand(&self, expansion: &Expansion, struck: Option<usize>) -> Table {
        self.expand_over(expansion, &self.model.network, struck)
    }

    /// An expansion's polynomials; closed shapes have all in node 0.
    fn expand_over(&self, expansion: &Expansion, network: &Network, struck: Option<usize>) -> Table {
        let nodes = network.nodes;
        let sets = 1 << self.amplifiers();
        let scratch = self.run(expansion, network, struck);
        let mut terms = vec![Polynomial::default(); sets * nodes];
        for outcome in &expansion.plan.outcomes {
            let polynomial = expansion.plan.polynomial(outcome, &scratch);
            let joined = if outcome.joined == 0 { 1 } else { outcome.joined };
            for node in 0..nodes {
                if joined >> node & 1 == 1 {
                    terms[node * sets + usize::from(outcome.amplified)].add_scaled(polynomial, 1.0);
                }
            }
        }
        Table { sets, terms }
    }

    /// Loop and transfers.
    pub fn looped(&self) -> &Loop {
        if let Some(twin) = &self.twin {
            return twin.looped();
        }
        self.looped.get_or_init(|| {
            let model = self.model;
            let terms: Vec<Table> = model.forward.iter().map(|expansion| self.expand(expansion, None)).collect();
            // A node that an ideal voltage holds follows itself: its terms are the determinant's.
            let whole = model.closed.as_ref().map(|expansion| self.expand(expansion, None));
            let whole = whole.as_ref().map_or_else(|| terms[0].of(usize::from(model.network.input_node(0).0)), |table| table.of(0));
            let returned: Vec<Polynomial> = (0..self.amplifiers()).map(|a| self.combine(whole, |set| set >> a & 1 == 1)).collect();
            let open: Vec<Polynomial> = (0..self.amplifiers()).map(|a| self.combine(whole, |set| set >> a & 1 == 0)).collect();
            let mut closed = open[0].clone();
            closed.add_scaled(&returned[0].0, 1.0);
            let numerators = vec![OnceCell::new(); model.drives.len() * model.network.nodes];
            Loop { closed, returned, open, terms, numerators }
        })
    }

    /// Numerator, over the closed loop, of the voltage at a node for a drive.
    pub fn numerator(&self, drive: usize, node: Node) -> &Polynomial {
        if let Some(twin) = &self.twin {
            return twin.numerator(drive, node);
        }
        let (model, looped, node) = (self.model, self.looped(), usize::from(node.0));
        looped.numerators[drive * model.network.nodes + node].get_or_init(|| {
            let mut sum = Polynomial::default();
            for ((weight, table), kind) in model.drives[drive].iter().zip(&looped.terms).zip(&model.network.inputs) {
                if weight.abs() <= 0.0 {
                    continue;
                }
                let numerator = self.combine(table.of(node), |_| true);
                // A current's transfer is an impedance; a charge's current is its rate of change.
                let (ohms, omega) = model.scale;
                match kind {
                    Drive::Voltage => sum.add_scaled(&numerator.0, *weight),
                    Drive::Current => sum.add_scaled(&numerator.0, *weight * ohms),
                    Drive::Charge => sum.add_scaled(&numerator.times(&[0.0, 1.0]).0, *weight * ohms * omega),
                }
            }
            sum
        })
    }

    /// Numerator, over the closed loop, of the first drive's transfer to the load.
    pub fn load_numerator(&self) -> &Polynomial {
        self.numerator(0, self.model.network.load)
    }

    /// Transfers to the load from currents and from the amplifiers' inputs.
    pub fn injection(&self) -> &Injection {
        if let Some(twin) = &self.twin {
            return twin.injection();
        }
        self.injection.get_or_init(|| {
            let model = self.model;
            let table = self.expand(&model.adjoint, None);
            let current = (0..model.network.nodes).map(|node| self.combine(table.of(node), |_| true)).collect();
            let input = model
                .series_input
                .iter()
                .enumerate()
                .map(|(amplifier, expansion)| {
                    // Its own column takes no part: the pin's row is struck out. Its gain multiplies every term.
                    let scratch = self.run(expansion, &model.network, Some(amplifier));
                    let mut by_set = vec![Polynomial::default(); 1 << self.amplifiers()];
                    for outcome in &expansion.plan.outcomes {
                        let set = usize::from(outcome.amplified) | 1 << amplifier;
                        by_set[set].add_scaled(expansion.plan.polynomial(outcome, &scratch), 1.0);
                    }
                    self.combine(&by_set, |_| true)
                })
                .collect();
            Injection { current, input }
        })
    }

    /// Voltage at a node for a voltage in series with an amplifier's input.
    pub(crate) fn inside_to(&self, amplifier: usize, node: Node, omega: f64) -> Complex64 {
        if let Some(twin) = &self.twin {
            return twin.inside_to(amplifier, node, omega);
        }
        if node.0 == 0 {
            return Complex64::new(0.0, 0.0);
        }
        let node = usize::from(node.0);
        let whole = self.model.floating.islands == 0;
        if omega <= 0.0 && whole {
            return Complex64::new(self.inside_at_dc()[amplifier][node] / self.looped().closed.constant(), 0.0);
        }
        let tables = self.inside.get_or_init(|| {
            let expansions = self.model.inside().iter().enumerate();
            expansions.map(|(a, expansion)| self.expand(expansion, Some(a))).collect()
        });
        if !whole {
            let mut by_set = vec![Polynomial::default(); 1 << self.amplifiers()];
            for (set, term) in tables[amplifier].of(node).iter().enumerate() {
                by_set[set | 1 << amplifier].add_scaled(&term.0, 1.0);
            }
            return self.combine(&by_set, |_| true).at(omega) / self.looped().closed.at(omega);
        }
        let terms = tables[amplifier].of(node).iter().enumerate();
        let sum: Complex64 = terms
            .filter(|(_, term)| !term.0.is_empty())
            .map(|(set, term)| self.products()[set | 1 << amplifier].at(omega) * term.at(omega))
            .sum();
        sum / self.looped().closed.at(omega)
    }

    /// The same at DC for every node, over the closed loop's constant, from the constant terms alone.
    fn inside_at_dc(&self) -> &[Vec<f64>] {
        self.inside_at_dc.get_or_init(|| {
            let model = self.model;
            let resistances = model.output_resistances(&self.values);
            let mut scratch = Vec::new();
            let mut of = |(amplifier, expansion): (usize, &Expansion)| {
                let mut weights = expansion.weights(&model.network, &self.values, &resistances, model.scale);
                if let Some(column) = expansion.amplifier_column(amplifier) {
                    weights[column].out[0] = 1.0;
                }
                expansion.plan.evaluate_constants(&weights, &mut scratch);
                let mut volts = vec![0.0; model.network.nodes];
                for outcome in &expansion.plan.outcomes {
                    let set = usize::from(outcome.amplified) | 1 << amplifier;
                    let term = expansion.plan.polynomial(outcome, &scratch)[0] * self.products()[set].constant();
                    for (node, volts) in volts.iter_mut().enumerate() {
                        if outcome.joined >> node & 1 == 1 {
                            *volts += term;
                        }
                    }
                }
                volts
            };
            model.inside().iter().enumerate().map(&mut of).collect()
        })
    }

    /// Of a network of this build driven by a current: the numerator of the voltage at each node, scaled by the network's impedance, and
    /// the denominator of all.
    #[must_use]
    pub fn driven(&self, injected: &Injected) -> (Vec<Polynomial>, Polynomial) {
        let table = self.expand_over(&injected.driven, &injected.network, None);
        let voltage = |node| if node == 0 { Polynomial::default() } else { self.combine(table.of(node), |_| true) };
        let closed = self.expand_over(&injected.closed, &injected.network, None);
        ((0..injected.network.nodes).map(voltage).collect(), self.combine(closed.of(0), |_| true))
    }

    /// Poles and zeros.
    pub fn roots(&self) -> &Roots {
        if let Some(twin) = &self.twin {
            return twin.roots();
        }
        self.roots.get_or_init(|| {
            let looped = self.looped();
            let near = self.near;
            Roots {
                poles: looped.closed.roots(near.map(|r| &r.poles[..])),
                zeros: self.load_numerator().roots(near.map(|r| &r.zeros[..])),
                // With one amplifier the opened loop is passive: its poles are real, and show nothing that the grid could miss.
                open: if looped.open.len() > 1 {
                    looped.open.iter().enumerate().map(|(a, o)| o.roots(near.map(|n| &n.open[a][..]))).collect()
                } else {
                    Vec::new()
                },
                loop_zeros: looped.returned.iter().enumerate().map(|(a, r)| r.roots(near.map(|n| &n.loop_zeros[a][..]))).collect(),
            }
        })
    }

    /// Whether a closed-loop pole lies in the right half plane.
    pub fn oscillates(&self) -> bool {
        self.roots().poles.iter().any(|p| p.re > 1e-13 * magnitude(*p))
    }

    /// The amplifier input at which the DC operating point does not exist, if there is one.
    pub fn no_dc_path(&self) -> Option<Terminal> {
        self.model.floating.input
    }

    /// Scaled angular frequencies, rising, close enough together that nothing the network does falls between two.
    pub fn grid(&self) -> &[f64] {
        if let Some(twin) = &self.twin {
            return twin.grid();
        }
        self.grid.get_or_init(|| {
            let roots = self.roots();
            let features = || {
                roots
                    .poles
                    .iter()
                    .chain(&roots.zeros)
                    .chain(roots.loop_zeros.iter().chain(&roots.open).flatten())
                    .filter(|r| magnitude(**r) > 0.0)
            };
            let low = features().map(|r| magnitude(*r)).fold(f64::INFINITY, f64::min);
            let high = features().map(|r| magnitude(*r)).fold(0.0, f64::max);
            let mut grid = Vec::with_capacity(160);
            if high > 0.0 {
                let (mut at, end) = (low / 1e3, high * 1e3);
                while at < end && grid.len() < 4000 {
                    grid.push(at);
                    at *= STEP;
                }
                grid.push(end);
                for root in features().filter(|r| r.im > 0.0) {
                    let width = root.re.abs();
                    for k in [-4.0, -2.0, -1.0, -0.5, 0.0, 0.5, 1.0, 2.0, 4.0] {
                        let at = root.im + k * width;
                        if at > low / 1e3 && at < end {
                            grid.push(at);
                        }
                    }
                }
                grid.sort_by(f64::total_cmp);
            }
            grid
        })
    }

    /// The determinant of a closed expansion over another network of the same build, amplifiers included.
    #[must_use]
    pub fn determinant(&self, expansion: &Expansion, network: &Network) -> Polynomial {
        let scratch = self.run(expansion, network, None);
        let mut by_set = vec![Polynomial::default(); 1 << self.amplifiers()];
        for outcome in &expansion.plan.outcomes {
            by_set[usize::from(outcome.amplified)].add_scaled(expansion.plan.polynomial(outcome, &scratch), 1.0);
        }
        self.combine(&by_set, |_| true)
    }

    /// Voltage at a node per unit of a drive.
    pub fn voltage(&self, drive: usize, node: Node, omega: f64) -> Complex64 {
        if node.0 == 0 {
            return Complex64::new(0.0, 0.0);
        }
        let looped = self.looped();
        self.numerator(drive, node).at(omega) / looped.closed.at(omega)
    }

    /// The transfer from a drive to the load at a scaled angular frequency.
    pub fn transfer(&self, drive: usize, omega: f64) -> Complex64 {
        self.voltage(drive, self.model.network.load, omega)
    }

    /// The return ratio of an amplifier.
    pub fn return_ratio(&self, amplifier: usize, omega: f64) -> Complex64 {
        let looped = self.looped();
        looped.returned[amplifier].at(omega) / looped.open[amplifier].at(omega)
    }

    /// A transfer's value at DC.
    pub fn dc_gain(&self, drive: usize) -> f64 {
        let looped = self.looped();
        self.numerator(drive, self.model.network.load).constant() / looped.closed.constant()
    }
}

/// Ratio of neighbouring grid frequencies: eight to a decade.
const STEP: f64 = 1.333_521_432_163_324;

/// |z| without the risk of overflow in between (the values here are scaled).
#[must_use]
pub fn magnitude(z: Complex64) -> f64 {
    libm::sqrt(z.norm_sqr())
}
