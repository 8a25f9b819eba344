//! One build of a stage, solved: transfers as ratios of polynomials, worked out on demand and kept.

use alloc::vec::Vec;
use core::{cell::OnceCell, f64::consts::TAU};

use num_complex::Complex64;

use crate::{
    model::{Expansion, Model},
    network::{Network, Node},
    part::PartFigure,
    polynomial::Polynomial,
};

/// The loop and the transfers from the source, over a common denominator in scaled frequency.
#[derive(Clone, Debug)]
pub struct Loop {
    /// Closed loop: `D = P·X0 + A0·Z·XA`.
    pub closed: Polynomial,
    /// Open loop: `P·X0`, the denominator of the return ratio.
    pub open: Polynomial,
    /// `A0·Z·XA`, the numerator of the return ratio.
    pub returned: Polynomial,
    /// Numerator of the voltage at each node for the source, by node number.
    pub forward: Vec<Polynomial>,
}

/// Numerators of the load's voltage for currents into nodes and for a voltage at the amplifier's input.
#[derive(Clone, Debug)]
pub struct Injection {
    /// For a current into each node, by node number, scaled by the network's impedance.
    pub current: Vec<Polynomial>,
    /// For a voltage in series with the amplifier's input.
    pub input: Polynomial,
}

/// Where the network's features lie, in scaled angular frequency.
#[derive(Clone, Debug)]
pub struct Roots {
    /// Closed-loop poles.
    pub poles: Vec<Complex64>,
    /// Zeros of the transfer to the load.
    pub zeros: Vec<Complex64>,
    /// Zeros of the return ratio.
    pub loop_zeros: Vec<Complex64>,
}

/// A build.
#[derive(Debug)]
pub struct Solution<'m> {
    /// The compiled stage.
    pub model: &'m Model<'m>,
    /// Values by parameter slot.
    pub values: Vec<f64>,
    near: Option<&'m Roots>,
    looped: OnceCell<Loop>,
    injection: OnceCell<Injection>,
    roots: OnceCell<Roots>,
    grid: OnceCell<Vec<f64>>,
    pub(crate) power: OnceCell<crate::analysis::thermal::Power>,
    pub(crate) dc: OnceCell<crate::analysis::dc::Budget>,
    pub(crate) noise: OnceCell<Option<f64>>,
    pub(crate) edges: OnceCell<crate::analysis::response::Edges>,
    pub(crate) margins: OnceCell<crate::analysis::margins::Margins>,
    pub(crate) swing: OnceCell<crate::analysis::swing::Swing>,
}

impl<'m> Solution<'m> {
    /// A build of `model` with these values; `near` gives the roots of a neighbouring build as starting points.
    #[must_use]
    pub fn new(model: &'m Model<'m>, values: Vec<f64>, near: Option<&'m Roots>) -> Self {
        Self {
            model,
            values,
            near,
            looped: OnceCell::new(),
            injection: OnceCell::new(),
            roots: OnceCell::new(),
            grid: OnceCell::new(),
            power: OnceCell::new(),
            dc: OnceCell::new(),
            noise: OnceCell::new(),
            edges: OnceCell::new(),
            margins: OnceCell::new(),
            swing: OnceCell::new(),
        }
    }

    /// A part figure in this build.
    #[must_use]
    pub fn part(&self, figure: PartFigure) -> Option<f64> {
        self.model.part(&self.values, figure)
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

    /// Output resistance in Ω; one that is not stated counts as zero (figures that depend on it are undetermined).
    fn output_resistance(&self) -> f64 {
        self.part(PartFigure::OutputResistance).unwrap_or(0.0)
    }

    /// The amplifier's gain as numerator `A0·Z` and denominator `P` in scaled frequency.
    #[must_use]
    pub fn amplifier(&self) -> (Polynomial, Polynomial) {
        let omega = self.model.scale.1;
        let open_loop = self.part(PartFigure::OpenLoop).unwrap_or(1.0);
        let dominant = self.part(PartFigure::Gbw).map_or(0.0, |gbw| open_loop * omega / (TAU * gbw));
        let mut below = Polynomial(alloc::vec![1.0, dominant]);
        let factor = self.values[self.model.parameters.pole_factor()];
        for pole in self.model.poles.iter().flatten() {
            below = below.times(&[1.0, omega / (TAU * pole * factor)]);
        }
        let mut above = Polynomial(alloc::vec![open_loop]);
        for zero in &self.model.zeros {
            let slope = omega / (TAU * zero.frequency);
            above = above.times(&[1.0, if zero.right_half_plane { -slope } else { slope }]);
        }
        (above, below)
    }

    /// Loop and transfers.
    pub fn looped(&self) -> &Loop {
        self.looped.get_or_init(|| {
            let model = self.model;
            let (plain, amplified) = self.expand(&model.forward, &model.network);
            let (above, below) = self.amplifier();
            let combine = |(a, b): (&Polynomial, &Polynomial)| {
                let mut sum = a.times(&below.0);
                sum.add_scaled(&above.times(&b.0).0, 1.0);
                sum
            };
            let driven = usize::from(crate::network::DRIVEN.0);
            let open = below.times(&plain[driven].0);
            let returned = above.times(&amplified[driven].0);
            let mut closed = open.clone();
            closed.add_scaled(&returned.0, 1.0);
            let forward = plain.iter().zip(&amplified).map(combine).collect();
            Loop { closed, open, returned, forward }
        })
    }

    /// Transfers to the load from currents and from the amplifier's input.
    pub fn injection(&self) -> &Injection {
        self.injection.get_or_init(|| {
            let model = self.model;
            let (plain, amplified) = self.expand(&model.adjoint, &model.network);
            let (above, below) = self.amplifier();
            let current = plain
                .iter()
                .zip(&amplified)
                .map(|(a, b)| {
                    let mut sum = a.times(&below.0);
                    sum.add_scaled(&above.times(&b.0).0, 1.0);
                    sum
                })
                .collect();
            // The amplifier's own column must not take part here: its weight when left out is 1.
            let mut weights = model.series_input.weights(&model.network, &self.values, self.output_resistance(), model.scale);
            weights[0].out[0] = 1.0;
            let mut scratch = Vec::new();
            let plan = &model.series_input.plan;
            plan.evaluate(&weights, &mut scratch);
            let mut input = Polynomial::default();
            for outcome in &plan.outcomes {
                if !outcome.amplified {
                    input.add_scaled(plan.polynomial(outcome, &scratch), 1.0);
                }
            }
            Injection { current, input: above.times(&input.0) }
        })
    }

    /// Poles and zeros.
    pub fn roots(&self) -> &Roots {
        self.roots.get_or_init(|| {
            let looped = self.looped();
            let load = &looped.forward[usize::from(self.model.network.load.0)];
            let near = self.near;
            Roots {
                poles: looped.closed.roots(near.map(|r| &r.poles[..])),
                zeros: load.roots(near.map(|r| &r.zeros[..])),
                loop_zeros: looped.returned.roots(near.map(|r| &r.loop_zeros[..])),
            }
        })
    }

    /// Whether a closed-loop pole lies in the right half plane.
    pub fn oscillates(&self) -> bool {
        self.roots().poles.iter().any(|p| p.re > 1e-13 * magnitude(*p))
    }

    /// Whether the DC operating point does not exist.
    pub fn no_dc_path(&self) -> bool {
        self.looped().closed.constant().abs() <= 0.0
    }

    /// Scaled angular frequencies, rising, close enough together that nothing the network does falls between two.
    pub fn grid(&self) -> &[f64] {
        self.grid.get_or_init(|| {
            let roots = self.roots();
            let features = || roots.poles.iter().chain(&roots.zeros).chain(&roots.loop_zeros).filter(|r| magnitude(**r) > 0.0);
            let low = features().map(|r| magnitude(*r)).fold(f64::INFINITY, f64::min);
            let high = features().map(|r| magnitude(*r)).fold(0.0, f64::max);
            let mut grid = Vec::with_capacity(160);
            if high > 0.0 {
                let (mut at, end) = (low / 1e3, high * 1e3);
                while at < end {
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

    /// Polynomials by node: without and with the amplifier's gain as a factor.
    fn expand(&self, expansion: &Expansion, network: &Network) -> (Vec<Polynomial>, Vec<Polynomial>) {
        let weights = expansion.weights(network, &self.values, self.output_resistance(), self.model.scale);
        let mut scratch = Vec::new();
        expansion.plan.evaluate(&weights, &mut scratch);
        let mut plain = alloc::vec![Polynomial::default(); network.nodes];
        let mut amplified = plain.clone();
        for outcome in &expansion.plan.outcomes {
            let terms = expansion.plan.polynomial(outcome, &scratch);
            let side = if outcome.amplified { &mut amplified } else { &mut plain };
            for (node, polynomial) in side.iter_mut().enumerate() {
                if outcome.joined >> node & 1 == 1 {
                    polynomial.add_scaled(terms, 1.0);
                }
            }
        }
        (plain, amplified)
    }

    /// The determinant of a closed expansion over another network of the same build, amplifier included.
    #[must_use]
    pub fn determinant(&self, expansion: &Expansion, network: &Network) -> Polynomial {
        let weights = expansion.weights(network, &self.values, self.output_resistance(), self.model.scale);
        let mut scratch = Vec::new();
        expansion.plan.evaluate(&weights, &mut scratch);
        let (above, below) = self.amplifier();
        let mut sum = Polynomial::default();
        for outcome in &expansion.plan.outcomes {
            let terms = expansion.plan.polynomial(outcome, &scratch);
            let factor = if outcome.amplified { &above } else { &below };
            sum.add_scaled(&factor.times(terms).0, 1.0);
        }
        sum
    }

    /// Voltage at a node per volt of the source.
    pub fn voltage(&self, node: Node, omega: f64) -> Complex64 {
        if node.0 == 0 {
            return Complex64::new(0.0, 0.0);
        }
        let looped = self.looped();
        looped.forward[usize::from(node.0)].at(omega) / looped.closed.at(omega)
    }

    /// The transfer from the source to the load at a scaled angular frequency.
    pub fn transfer(&self, omega: f64) -> Complex64 {
        self.voltage(self.model.network.load, omega)
    }

    /// The return ratio.
    pub fn return_ratio(&self, omega: f64) -> Complex64 {
        let looped = self.looped();
        looped.returned.at(omega) / looped.open.at(omega)
    }

    /// The transfer's value at DC.
    pub fn dc_gain(&self) -> f64 {
        let looped = self.looped();
        looped.forward[usize::from(self.model.network.load.0)].constant() / looped.closed.constant()
    }
}

/// Ratio of neighbouring grid frequencies: eight to a decade.
const STEP: f64 = 1.333_521_432_163_324;

/// |z| without the risk of overflow in between (the values here are scaled).
#[must_use]
pub fn magnitude(z: Complex64) -> f64 {
    libm::sqrt(z.norm_sqr())
}
