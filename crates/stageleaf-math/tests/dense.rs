//! The expansion against the dense nodal solution of the same network: random stages of every kind, well and badly scaled.
//!
//! The dense solution cancels where the open-loop gain is high; Kirchhoff's law holds to thirteen digits.
//! The two share the network's layout and nothing else. What both could get wrong together (the layout itself) is checked
//! against an independent program in `tests/outside/`.

use num_complex::Complex64;
use stageleaf_math::{
    kind::{Drives, Kind},
    model::Model,
    network::{
        DRIVEN, Drive as Input, GROUND, Node,
        dense::{Drive, solve},
    },
    part::{Part, PartFigure, Rating, Zero},
    solution::Solution,
    stage::{Board, Component, Converter, Isolation, Load, Source, Stage, Toleranced},
};

/// SplitMix64, so that a failure's seed reproduces it.
struct Draw(u64);

impl Draw {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^= z >> 31;
        #[expect(clippy::cast_precision_loss, reason = "53 bits")]
        let unit = (z >> 11) as f64 / 9_007_199_254_740_992.0;
        unit
    }

    fn log(&mut self, low: f64, high: f64) -> f64 {
        low * libm::pow(high / low, self.next())
    }

    fn chance(&mut self) -> bool {
        self.next() < 0.5
    }
}

fn random_stage(draw: &mut Draw, kind: Kind, ohms: (f64, f64), farads: (f64, f64)) -> Stage {
    let mut components = Vec::new();
    let skip: Vec<bool> = kind.components().iter().map(|_| draw.chance()).collect();
    for (spec, skip) in kind.components().iter().zip(skip) {
        if !spec.required && skip {
            continue;
        }
        let (low, high) = if spec.name.starts_with('R') { ohms } else { farads };
        components.push(Component { name: spec.name, value: Toleranced::exact(draw.log(low, high)) });
    }
    let names: Vec<&str> = components.iter().map(|c| c.name).collect();
    let alone: Vec<&str> = kind.components().iter().filter(|s| s.with.is_some_and(|w| !names.contains(&w))).map(|s| s.name).collect();
    components.retain(|c| !alone.contains(&c.name));
    let mut part = Part::default();
    part.state(PartFigure::OpenLoop, Rating::typical(draw.log(1e2, 1e8)));
    part.state(PartFigure::Gbw, Rating::typical(draw.log(1e4, 1e9)));
    part.state(PartFigure::OutputResistance, Rating::typical(if draw.chance() { 0.0 } else { draw.log(1.0, 1e3) }));
    part.state(PartFigure::DifferentialCapacitance, Rating::typical(draw.log(1e-13, 1e-11)));
    part.state(PartFigure::CommonModeCapacitance, Rating::typical(draw.log(1e-13, 1e-11)));
    if draw.chance() {
        part.state(PartFigure::DifferentialResistance, Rating::typical(draw.log(1e5, 1e13)));
        part.state(PartFigure::CommonModeResistance, Rating::typical(draw.log(1e6, 1e14)));
    }
    part.poles = Some(if draw.chance() { vec![] } else { vec![draw.log(1e6, 1e9), draw.log(1e7, 1e10)] });
    if draw.chance() {
        part.zeros = vec![Zero { frequency: draw.log(1e6, 1e9), right_half_plane: draw.chance() }];
    }
    let exact = |draw: &mut Draw, (low, high): (f64, f64)| draw.chance().then(|| Toleranced::exact(draw.log(low, high)));
    let load = Load { resistance: exact(draw, ohms), capacitance: exact(draw, farads) };
    let board = Board {
        inverting_node: exact(draw, (1e-13, 1e-11)),
        non_inverting_node: exact(draw, (1e-13, 1e-11)),
        across_feedback: exact(draw, (1e-14, 1e-12)),
    };
    let source = match (draw.chance(), draw.chance()) {
        (true, true) => Some(Source::Resistive { resistance: Toleranced::exact(draw.log(ohms.0, ohms.1)) }),
        (true, false) => Some(Source::Capacitive { capacitance: Toleranced::exact(draw.log(farads.0, farads.1)) }),
        _ => None,
    };
    Stage {
        name: "random".into(),
        kind,
        components,
        part,
        isolation: if draw.chance() { Isolation::InsideLoop } else { Isolation::OutsideLoop },
        supply: None,
        sources: vec![source],
        signals: vec![],
        common_mode: None,
        reference: None,
        parts: vec![],
        load,
        converter: Converter { series_resistance: exact(draw, ohms), shunt_capacitance: exact(draw, farads), ..Converter::default() },
        board,
        ambient: None,
        band: None,
        limits: vec![],
        measured: vec![],
    }
}

/// `floor`: what the dense solution cannot resolve below (a virtual ground, against the volts around it).
fn compare(seed: u64, what: &str, ours: Complex64, dense: Complex64, allowed: f64, floor: f64) {
    let (difference, size) = ((ours - dense).norm(), dense.norm().max(ours.norm()).max(floor));
    assert!(ours.re.is_finite() && ours.im.is_finite(), "seed {seed}: {what} is {ours}");
    assert!(difference <= allowed * size + 1e-290, "seed {seed}: {what}: expansion {ours}, dense {dense}, off by {:e}", difference / size);
}

/// Each amplifier's gain and output resistance.
fn amplifiers(solution: &Solution<'_>, omega: f64) -> Vec<(Complex64, f64)> {
    (0..solution.amplifiers())
        .map(|index| {
            let (above, below) = solution.amplifier(index);
            (above.at(omega) / below.at(omega), solution.part_of(index, PartFigure::OutputResistance).unwrap_or(0.0))
        })
        .collect()
}

/// The dense solution forms the amplifier's input as the difference of two nearly equal voltages, so what it may be off by grows
/// with the open-loop gain.
fn check(seed: u64, kind: Kind, ohms: (f64, f64), farads: (f64, f64)) {
    let mut draw = Draw(seed);
    let stage = random_stage(&mut draw, kind, ohms, farads);
    let model = Model::compile(&stage);
    let solution = Solution::new(&model, model.parameters.nominal(), None);
    let network = &model.network;
    let held = network.held();
    for _ in 0..6 {
        let frequency = draw.log(1.0, 1e9);
        let omega = solution.scaled(frequency);
        let s = Complex64::new(0.0, std::f64::consts::TAU * frequency);
        let amplifiers = amplifiers(&solution, omega);
        let condition = 1e-9 + 1e-9 * amplifiers.iter().map(|(gain, _)| gain.norm()).fold(0.0, f64::max);
        let solved = |drive| solve(network, &solution.values, &amplifiers, s, drive);
        for (drive, weights) in model.drives.iter().enumerate() {
            let mut dense = vec![Complex64::new(0.0, 0.0); network.nodes];
            for (input, weight) in weights.iter().enumerate().filter(|(_, w)| w.abs() > 0.0) {
                let Some(voltages) = solved(Drive::Input(input)) else { return };
                // A charge's current is its rate of change.
                let rate = if network.inputs[input] == Input::Charge { s } else { Complex64::new(1.0, 0.0) };
                for (sum, v) in dense.iter_mut().zip(&voltages) {
                    *sum += v * rate * *weight;
                }
            }
            let largest = dense.iter().map(|v| v.norm()).fold(0.0, f64::max);
            for (node, &dense) in (0u8..).zip(&dense).skip(1) {
                let ours = solution.voltage(drive, Node(node), omega);
                compare(seed, &format!("{kind:?} v({node}) of drive {drive} at {frequency:e}"), ours, dense, condition, 1e-6 * largest);
            }
        }
        let load = usize::from(network.load.0);
        let closed = solution.looped().closed.at(omega);
        for index in 0..network.amplifiers.len() {
            let Some(voltages) = solved(Drive::AmplifierInput(index)) else { continue };
            let ours = solution.from_input(index).at(omega) / closed;
            compare(seed, &format!("{kind:?} series input {index}"), ours, voltages[load], condition, 0.0);
            // The return ratio: one volt behind the output resistance in the controlled source's place, T = −A·(vp − vn).
            let amplifier = network.amplifiers[index];
            let mut unit = network.clone();
            unit.amplifiers[index].plus = GROUND;
            unit.amplifiers[index].minus = GROUND;
            let mut others = amplifiers.clone();
            others[index].0 = Complex64::new(1.0, 0.0);
            if let Some(voltages) = solve(&unit, &solution.values, &others, s, Drive::AmplifierInput(index)) {
                let at = |n: Node| voltages[usize::from(n.0)];
                let ratio = -amplifiers[index].0 * (at(amplifier.plus) - at(amplifier.minus));
                compare(seed, &format!("{kind:?} return ratio {index}"), solution.return_ratio(index, omega), ratio, condition, 0.0);
            }
        }
        // A pin without output resistance stays where it is, whatever current flows into it.
        let stiff = |node: usize| network.amplifiers.iter().zip(&amplifiers).any(|(a, (_, r))| usize::from(a.pin.0) == node && *r <= 0.0);
        for node in (1..network.nodes).filter(|n| held >> n & 1 == 0 && !stiff(*n)) {
            let to = Node(u8::try_from(node).expect("few"));
            let Some(voltages) = solved(Drive::Current { from: GROUND, to }) else { continue };
            let ours = solution.from_current(Node(u8::try_from(node).expect("few"))).at(omega) / closed * model.scale.0;
            compare(seed, &format!("{kind:?} transimpedance from {node} at {frequency:e}"), ours, voltages[load], condition, 0.0);
        }
    }
    assert!(model.network.nodes > usize::from(DRIVEN.0));
}

#[test]
fn well_scaled_stages_agree_with_the_dense_solution() {
    for &kind in Kind::ALL {
        for seed in 0..400 {
            check(seed, kind, (10.0, 1e6), (1e-12, 1e-7));
        }
    }
}

/// Kirchhoff's current law at every node but the driven one and the pin, and the amplifier's own equation, with the expansion's
/// voltages put in: each sum must vanish against the largest of its terms. No solution of ours or of a library's is involved, so
/// this holds where a dense solution has lost its digits.
#[test]
fn badly_scaled_stages_satisfy_kirchhoff() {
    use stageleaf_math::network::dense::admittance;

    for &kind in Kind::ALL {
        // A difference is put together from the transfers of two inputs, which may nearly cancel at a node.
        let kept = if kind.spec().drives == Drives::Differential { 1e-9 } else { 1e-13 };
        for seed in 0..2000 {
            let mut draw = Draw(seed);
            let stage = random_stage(&mut draw, kind, (1e-2, 1e12), (1e-15, 1.0));
            let model = Model::compile(&stage);
            let solution = Solution::new(&model, model.parameters.nominal(), None);
            let network = &model.network;
            for _ in 0..4 {
                let frequency = draw.log(1e-2, 1e10);
                let omega = solution.scaled(frequency);
                let s = Complex64::new(0.0, std::f64::consts::TAU * frequency);
                let volts: Vec<Complex64> =
                    (0..network.nodes).map(|n| solution.voltage(0, Node(u8::try_from(n).expect("few")), omega)).collect();
                let at = |n: Node| volts[usize::from(n.0)];
                let mut sums = vec![(Complex64::new(0.0, 0.0), 0.0f64); network.nodes];
                for element in &network.elements {
                    let y = admittance(element.law, &solution.values, s);
                    let current = (at(element.a) - at(element.b)) * y;
                    // What rounding of the two voltages may leave behind.
                    let size = y.norm() * (at(element.a).norm() + at(element.b).norm());
                    for (node, sign) in [(element.a, 1.0), (element.b, -1.0)] {
                        let sum = &mut sums[usize::from(node.0)];
                        sum.0 += current * sign;
                        sum.1 += size;
                    }
                }
                let held = network.held();
                let is_pin = |node: usize| network.amplifiers.iter().any(|a| usize::from(a.pin.0) == node);
                for (node, (sum, size)) in sums.iter().enumerate().skip(1) {
                    if held >> node & 1 == 1 || is_pin(node) {
                        continue;
                    }
                    // What the first drive puts into the node itself.
                    let given = match network.inputs.get(node - 1) {
                        Some(Input::Current) => Complex64::new(1.0, 0.0),
                        Some(Input::Charge) => s,
                        _ => Complex64::new(0.0, 0.0),
                    };
                    let left = sum - given;
                    assert!(
                        left.norm() <= kept * (size + given.norm()) + 1e-300,
                        "seed {seed} {kind:?}: {left} of {size:e} left at node {node}"
                    );
                }
                for (amplifier, (gain, resistance)) in network.amplifiers.iter().zip(amplifiers(&solution, omega)) {
                    let out = sums[usize::from(amplifier.pin.0)];
                    let left = gain * (at(amplifier.plus) - at(amplifier.minus)) - at(amplifier.pin) - out.0 * resistance;
                    let size = gain.norm() * (at(amplifier.plus).norm() + at(amplifier.minus).norm())
                        + at(amplifier.pin).norm()
                        + out.1 * resistance;
                    assert!(
                        left.norm() <= kept * size + 1e-300,
                        "seed {seed} {kind:?}: the amplifier's equation leaves {left} of {size:e}"
                    );
                }
            }
        }
    }
}

#[test]
fn a_sweep_has_the_bits_of_single_points() {
    for seed in 0..50 {
        let stage = random_stage(&mut Draw(seed), Kind::NonInverting, (10.0, 1e6), (1e-12, 1e-7));
        let model = Model::compile(&stage);
        let solution = Solution::new(&model, model.parameters.nominal(), None);
        let frequencies: Vec<f64> = stageleaf_math::analysis::response::frequencies(1.0, 1e8, 37).collect();
        let looped = solution.looped();
        let load = solution.load_numerator();
        let swept = stageleaf_math::analysis::sweep::ratio(&solution, load, &looped.closed, &frequencies);
        for (frequency, value) in frequencies.iter().zip(swept) {
            let single = solution.transfer(0, solution.scaled(*frequency));
            assert_eq!((value.re.to_bits(), value.im.to_bits()), (single.re.to_bits(), single.im.to_bits()), "seed {seed}");
        }
    }
}

/// Response and noise by polynomials and by sparse LU, at sixteen frequencies of random stages. They share the layout and the sources'
/// spectra; where LU's own bound on its error (see `Swept::doubt`) is below a tenth of what is allowed, both must agree. The bound is
/// the response's; a noise current between two nodes whose transfers nearly cancel has a condition of its own, which badly scaled stages
/// do not keep: there `noise` is left out.
fn kernels(ohms: (f64, f64), farads: (f64, f64), share: f64, with_noise: bool) {
    use stageleaf_math::{
        analysis::sweep,
        network::lu::Lu,
        stage::{Ambient, Span},
    };

    const ALLOWED: f64 = 1e-9;
    let (mut sound, mut all) = (0u32, 0u32);
    for &kind in Kind::ALL {
        for seed in 0..60 {
            let mut stage = random_stage(&mut Draw(seed), kind, ohms, farads);
            for (figure, value) in [
                (PartFigure::NoiseVoltage, 5e-9),
                (PartFigure::NoiseVoltageCorner, 30.0),
                (PartFigure::NoiseCurrent, 1e-12),
                (PartFigure::NoiseCurrentCorner, 100.0),
            ] {
                stage.part.state(figure, Rating::typical(value));
            }
            stage.ambient = Some(Ambient { range: Span::exact(300.0), values_at: None });
            let model = Model::compile(&stage);
            if model.floating.islands > 0 {
                continue;
            }
            let solution = Solution::new(&model, model.parameters.nominal(), None);
            let frequencies: Vec<f64> = stageleaf_math::analysis::response::frequencies(1.0, 1e9, 16).collect();
            let Some(lu) = Lu::compile(&solution, 1.0, 1e9) else { continue };
            let swept = lu.sweep(&solution, &frequencies);
            let response = sweep::ratio(&solution, solution.load_numerator(), &solution.looped().closed, &frequencies);
            let noise = sweep::noise(&solution, &frequencies);
            assert_eq!(noise.origins, swept.noise.origins);
            for (i, frequency) in frequencies.iter().enumerate() {
                all += 1;
                if swept.doubt[i] <= ALLOWED / 10.0 {
                    sound += 1;
                    let what = format!("{kind:?} at {frequency:e}");
                    compare(seed, &what, response[i], swept.response[i], ALLOWED, 0.0);
                    let (ours, other) = (noise.total[i], swept.noise.total[i]);
                    assert!(!with_noise || (ours - other).abs() <= ALLOWED * ours, "seed {seed}: noise of {what}: {ours:e} and {other:e}");
                }
            }
        }
    }
    assert!(f64::from(sound) >= share * f64::from(all) && all > 5000, "{sound} of {all} points were well conditioned");
}

#[test]
fn kernels_agree_on_well_scaled_stages() {
    kernels((10.0, 1e6), (1e-12, 1e-7), 0.9, true);
}

#[test]
fn kernels_agree_on_badly_scaled_stages() {
    kernels((1e-2, 1e12), (1e-15, 1.0), 0.3, false);
}
