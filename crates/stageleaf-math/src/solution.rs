//! One build of a stage, solved: transfers as ratios of polynomials, worked out on demand and kept.

use alloc::{rc::Rc, vec, vec::Vec};
use core::{cell::OnceCell, f64::consts::TAU};

use num_complex::Complex64;
use smallvec::SmallVec;

use crate::{
    model::{Expansion, Injected, Model},
    network::{Drive, GROUND, Network, Node, expand::Weight},
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
    /// By drive and node: the numerators that were asked for.
    numerators: Vec<OnceCell<Polynomial>>,
}

/// Numerators of the load's voltage for currents into nodes and for voltages at the amplifiers' inputs, those that were asked for.
#[derive(Debug)]
struct Injection {
    /// By node number.
    current: Vec<OnceCell<Polynomial>>,
    /// By amplifier.
    input: Vec<OnceCell<Polynomial>>,
}

/// Numerators of voltages for voltages in series with the amplifiers' inputs, those that were asked for.
#[derive(Debug)]
struct Inside {
    /// What the expansions came to, one after the other.
    terms: Vec<f64>,
    /// By amplifier and node.
    numerators: Vec<OnceCell<Polynomial>>,
}

/// Where the network's features lie, in scaled angular frequency.
#[derive(Clone, Debug, Default)]
pub struct Roots {
    /// Closed-loop poles.
    pub poles: Vec<Complex64>,
    /// The rest.
    pub features: Features,
}

/// Roots that are no closed-loop poles.
#[derive(Clone, Debug, Default)]
pub struct Features {
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
    pub(crate) weights: OnceCell<Vec<Weight>>,
    /// What the expansions of loop and transfers came to, one after the other.
    pub(crate) forward: OnceCell<Vec<f64>>,
    /// What those of the transfers to the load came to.
    pub(crate) backward: OnceCell<Vec<f64>>,
    looped: OnceCell<Loop>,
    injection: OnceCell<Injection>,
    poles: OnceCell<Vec<Complex64>>,
    features: OnceCell<Features>,
    inside: OnceCell<Inside>,
    inside_at_dc: OnceCell<Vec<Vec<f64>>>,
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
    pub(crate) switch: OnceCell<Result<crate::analysis::switching::Switch, crate::report::Outcome>>,
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
            weights: OnceCell::new(),
            forward: OnceCell::new(),
            backward: OnceCell::new(),
            looped: OnceCell::new(),
            injection: OnceCell::new(),
            poles: OnceCell::new(),
            features: OnceCell::new(),
            inside: OnceCell::new(),
            inside_at_dc: OnceCell::new(),
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
            switch: OnceCell::new(),
            reference: OnceCell::new(),
        }
    }

    /// The build that differs from this one in these slots; its weights are this one's but for the columns that they are in.
    #[must_use]
    pub fn moved(&self, near: Option<&'m Roots>, changes: &[(usize, f64)]) -> Self {
        let model = self.model;
        let mut values = self.values.clone();
        for &(slot, value) in changes {
            values[slot] = value;
        }
        let mut weights = self.weights().to_vec();
        let resistances = model.output_resistances(&values);
        for &(slot, _) in changes {
            for column in model.adjoint.columns_of(slot, &model.network, &model.parameters) {
                weights[column] = model.adjoint.weight(column, &model.network, &values, &resistances, model.scale);
            }
        }
        Self { weights: OnceCell::from(weights), ..Self::new(model, values, near) }
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

    /// The weights of the stage's own network.
    pub(crate) fn weights(&self) -> &[Weight] {
        self.weights.get_or_init(|| self.weights_of(&self.model.adjoint, &self.model.network))
    }

    fn weights_of(&self, expansion: &Expansion, network: &Network) -> Vec<Weight> {
        expansion.weights(network, &self.values, &self.model.output_resistances(&self.values), self.model.scale)
    }

    /// Carries out expansions of the stage's own network.
    fn run<'e>(&self, expansions: impl Iterator<Item = (&'e Expansion, Option<usize>)> + Clone) -> Vec<f64> {
        let scratch = &mut *self.model.scratch.borrow_mut();
        let mut terms = Vec::with_capacity(expansions.clone().map(|(e, _)| e.plan.terms()).sum());
        for (expansion, struck) in expansions {
            match struck {
                None => expansion.plan.evaluate(self.weights(), scratch),
                Some(amplifier) => expansion.plan.evaluate(&expansion.struck(self.weights(), amplifier), scratch),
            }
            terms.extend(expansion.plan.ends(scratch).iter().map(|[term]| term));
        }
        terms
    }

    fn forward(&self) -> &[f64] {
        self.forward.get_or_init(|| self.run(self.model.forward_expansions().map(|e| (e, None))))
    }

    fn backward(&self) -> &[f64] {
        self.backward.get_or_init(|| self.run(self.model.backward_expansions()))
    }

    /// An expansion's polynomials by set of amplifiers, for a node; closed shapes have them for any.
    fn by_set(&self, expansion: &Expansion, terms: &[f64], node: Node) -> SmallVec<[Polynomial; 2]> {
        let mut by_set: SmallVec<[Polynomial; 2]> = SmallVec::new();
        by_set.resize(1 << self.amplifiers(), Polynomial::default());
        for outcome in expansion.plan.outcomes.iter().filter(|o| o.joined == 0 || o.joined >> node.0 & 1 == 1) {
            by_set[usize::from(outcome.amplified)].add_scaled(expansion.plan.polynomial(outcome, terms), 1.0);
        }
        by_set
    }

    /// Loop and transfers.
    pub fn looped(&self) -> &Loop {
        if let Some(twin) = &self.twin {
            return twin.looped();
        }
        self.looped.get_or_init(|| {
            let model = self.model;
            let terms = self.forward();
            // A node that an ideal voltage holds follows itself: its terms are the determinant's.
            let whole = match &model.closed {
                Some(expansion) => self.by_set(expansion, &terms[terms.len() - expansion.plan.terms()..], GROUND),
                None => self.by_set(&model.forward[0], terms, model.network.input_node(0)),
            };
            let whole = &whole[..];
            let returned: Vec<Polynomial> = (0..self.amplifiers()).map(|a| self.combine(whole, |set| set >> a & 1 == 1)).collect();
            let open: Vec<Polynomial> = (0..self.amplifiers()).map(|a| self.combine(whole, |set| set >> a & 1 == 0)).collect();
            let mut closed = open[0].clone();
            closed.add_scaled(&returned[0].0, 1.0);
            let numerators = vec![OnceCell::new(); model.drives.len() * model.network.nodes];
            Loop { closed, returned, open, numerators }
        })
    }

    /// Numerator, over the closed loop, of the voltage at a node for a drive.
    pub fn numerator(&self, drive: usize, node: Node) -> &Polynomial {
        if let Some(twin) = &self.twin {
            return twin.numerator(drive, node);
        }
        let (model, looped) = (self.model, self.looped());
        looped.numerators[drive * model.network.nodes + usize::from(node.0)].get_or_init(|| {
            let mut sum = Polynomial::default();
            let mut rest = self.forward();
            for ((weight, expansion), kind) in model.drives[drive].iter().zip(&model.forward).zip(&model.network.inputs) {
                let terms = rest;
                rest = &rest[expansion.plan.terms()..];
                if weight.abs() <= 0.0 {
                    continue;
                }
                let numerator = self.combine(&self.by_set(expansion, terms, node), |_| true);
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

    fn injection(&self) -> &Injection {
        self.injection.get_or_init(|| Injection {
            current: vec![OnceCell::new(); self.model.network.nodes],
            input: vec![OnceCell::new(); self.amplifiers()],
        })
    }

    /// Numerator, over the closed loop, of the load's voltage for a current into a node, scaled by the network's impedance.
    pub fn from_current(&self, node: Node) -> &Polynomial {
        if let Some(twin) = &self.twin {
            return twin.from_current(node);
        }
        let injection = self.injection();
        injection.current[usize::from(node.0)]
            .get_or_init(|| self.combine(&self.by_set(&self.model.adjoint, self.backward(), node), |_| true))
    }

    /// Numerator, over the closed loop, of the load's voltage for a voltage in series with an amplifier's input.
    pub fn from_input(&self, amplifier: usize) -> &Polynomial {
        if let Some(twin) = &self.twin {
            return twin.from_input(amplifier);
        }
        self.injection().input[amplifier].get_or_init(|| {
            let expansion = &self.model.series_input[amplifier];
            let before = self.model.backward_expansions().take(amplifier + 1).map(|(e, _)| e.plan.terms()).sum();
            let terms = &self.backward()[before..];
            // Its gain multiplies every term.
            let mut by_set = vec![Polynomial::default(); 1 << self.amplifiers()];
            for outcome in &expansion.plan.outcomes {
                let set = usize::from(outcome.amplified) | 1 << amplifier;
                by_set[set].add_scaled(expansion.plan.polynomial(outcome, terms), 1.0);
            }
            self.combine(&by_set, |_| true)
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
        let nodes = self.model.network.nodes;
        let closed = &self.looped().closed;
        if omega <= 0.0 && self.model.floating.islands == 0 {
            return Complex64::new(self.inside_at_dc()[amplifier][usize::from(node.0)] / closed.constant(), 0.0);
        }
        let expansions = || self.model.inside().iter().enumerate().map(|(a, e)| (e, Some(a)));
        let inside = self
            .inside
            .get_or_init(|| Inside { terms: self.run(expansions()), numerators: vec![OnceCell::new(); self.amplifiers() * nodes] });
        let numerator = inside.numerators[amplifier * nodes + usize::from(node.0)].get_or_init(|| {
            let before = expansions().take(amplifier).map(|(e, _)| e.plan.terms()).sum();
            let mut terms = self.by_set(&self.model.inside()[amplifier], &inside.terms[before..], node);
            // Its gain multiplies every term.
            for set in 0..terms.len() {
                if set >> amplifier & 1 == 0 {
                    let mut term = core::mem::take(&mut terms[set]);
                    if term.0.is_empty() {
                        continue;
                    }
                    term.add_scaled(&terms[set | 1 << amplifier].0, 1.0);
                    terms[set | 1 << amplifier] = term;
                }
            }
            self.combine(&terms, |_| true)
        });
        numerator.at(omega) / closed.at(omega)
    }

    /// The same at DC for every node, over the closed loop's constant, from the constant terms alone.
    fn inside_at_dc(&self) -> &[Vec<f64>] {
        self.inside_at_dc.get_or_init(|| {
            let model = self.model;
            let scratch = &mut *model.scratch.borrow_mut();
            let mut of = |(amplifier, expansion): (usize, &Expansion)| {
                expansion.plan.evaluate_constants(&expansion.struck(self.weights(), amplifier), scratch);
                let terms = expansion.plan.ends(scratch);
                let mut volts = vec![0.0; model.network.nodes];
                for outcome in &expansion.plan.outcomes {
                    let set = usize::from(outcome.amplified) | 1 << amplifier;
                    let term = expansion.plan.polynomial(outcome, terms)[0][0] * self.products()[set].constant();
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
        let run = |expansion: &Expansion| -> Vec<f64> {
            let scratch = &mut *self.model.scratch.borrow_mut();
            expansion.plan.evaluate(&self.weights_of(expansion, &injected.network), scratch);
            expansion.plan.ends(scratch).iter().map(|[term]| *term).collect()
        };
        let sum = |expansion: &Expansion, terms: &[f64], node| self.combine(&self.by_set(expansion, terms, node), |_| true);
        let voltages = run(&injected.driven);
        let nodes = (1..u8::try_from(injected.network.nodes).unwrap_or(u8::MAX)).map(Node);
        let numerators = nodes.map(|node| sum(&injected.driven, &voltages, node));
        let numerators = core::iter::once(Polynomial::default()).chain(numerators).collect();
        (numerators, sum(&injected.closed, &run(&injected.closed), GROUND))
    }

    /// Closed-loop poles.
    pub fn poles(&self) -> &[Complex64] {
        if let Some(twin) = &self.twin {
            return twin.poles();
        }
        self.poles.get_or_init(|| self.looped().closed.roots(self.near.map(|r| &r.poles[..])))
    }

    /// What else bends a curve.
    pub fn features(&self) -> &Features {
        if let Some(twin) = &self.twin {
            return twin.features();
        }
        self.features.get_or_init(|| {
            let (looped, near) = (self.looped(), self.near.map(|r| &r.features));
            Features {
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

    /// All of them, for a neighbouring build to start from.
    #[must_use]
    pub fn roots(&self) -> Roots {
        Roots { poles: self.poles().to_vec(), features: self.features().clone() }
    }

    /// Whether a closed-loop pole lies in the right half plane.
    pub fn oscillates(&self) -> bool {
        self.poles().iter().any(|p| p.re > 1e-13 * magnitude(*p))
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
            let (poles, others) = (self.poles(), self.features());
            let features = || {
                poles
                    .iter()
                    .chain(&others.zeros)
                    .chain(others.loop_zeros.iter().chain(&others.open).flatten())
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
        let scratch = &mut *self.model.scratch.borrow_mut();
        expansion.plan.evaluate(&self.weights_of(expansion, network), scratch);
        let terms: Vec<f64> = expansion.plan.ends(scratch).iter().map(|[term]| *term).collect();
        self.combine(&self.by_set(expansion, &terms, GROUND), |_| true)
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
