//! Overshoot, settling time, distortion from slew and clip.
//!
//! # Formula
//! Overshoot: of the linear network's step response, `(max v − v∞)/(v∞ − v0)`. Settling time: from a step of the input, which moves the
//! output by the stated step around the signal's steady value, to the output's last entry into `v∞ ± error·step`; the longer one of
//! both directions. Distortion: `√(Σ|Vₖ|², k ≥ 2)/|V₁|` over the period that repeats itself; the integrals take each step by the values and first two
//! derivatives at its ends.
//!
//! # Source
//! Definitions as in data sheets, common practice, no source. The quadrature: two-point Hermite, of sixth order, derived here.

use alloc::vec::Vec;
use core::f64::consts::TAU;

use super::{
    core::Equations,
    matrix::{Matrix, dot},
    run::{Mark, Moving, Run, Stopped, Watch, at_rest},
};
use crate::{
    part::PartFigure,
    report::{Need, Outcome},
    solution::Solution,
};

/// The ladder's unit, s: a power of two.
const UNIT: f64 = 1.0 / 1_073_741_824.0;
/// Time constants of the slowest pole after which a response is over.
const OVER: f64 = 50.0;
/// Time constants of a resonance within which its highest swing lies.
const HIGHEST: f64 = 8.0;
/// A response that ends at less than this part of its greatest value has no final value to speak of.
const NO_END: f64 = 1e-6;
/// Overshoot below this is rounding.
const NO_OVERSHOOT: f64 = 1e-9;
/// Periods after which a waveform should repeat itself, and rounds of looking for the one that does.
const PERIODS: usize = 8;
const ROUNDS: usize = 30;
/// Steps in a period at least.
const IN_PERIOD: f64 = 96.0;

/// Why there is no value, in an outcome's words.
fn stopped(why: Stopped) -> Outcome {
    Outcome::DoesNotApply(match why {
        Stopped::Bound => "the waveform has more events than are followed",
        Stopped::Loose => "at a limit, nothing holds the voltage of some node",
        Stopped::Unbounded => "the waveform leaves the range of numbers",
    })
}

const NO_EQUATIONS: Outcome =
    Outcome::DoesNotApply("an amplifier has more zeros than higher poles, or a charge enters where no capacitor takes it");
const NO_ROOM: Outcome = Outcome::DoesNotApply("the headrooms exceed the supply");

/// Seconds until the linear response to anything is over.
fn over(solution: &Solution<'_>) -> f64 {
    let slowest = solution.roots().poles.iter().map(|p| p.re.abs()).filter(|r| *r > 0.0).fold(f64::INFINITY, f64::min);
    OVER / (slowest * solution.model.scale.1)
}

/// The closed loop's resonances: the longest step that misses no swing, and how long they ring: so many time constants.
fn rings(solution: &Solution<'_>, constants: f64) -> Vec<(f64, f64)> {
    let second = 1.0 / solution.model.scale.1;
    let roots = solution.roots();
    let resonances = roots.poles.iter().filter(|p| p.im > 2.0 * p.re.abs());
    resonances.map(|p| (0.5 / p.im * second, if p.re < 0.0 { constants / -p.re * second } else { f64::INFINITY })).collect()
}

/// Overshoot of the small-signal step response, as a fraction of the step.
pub fn overshoot(solution: &Solution<'_>) -> Outcome {
    let Some(equations) = Equations::of(solution, 0, 0.0) else { return NO_EQUATIONS };
    let step = || -> Result<Outcome, Stopped> {
        let mut run = Run::new(&equations, UNIT, false)?;
        run.settle(0.0)?;
        run.rings = rings(solution, HIGHEST);
        let start = run.output();
        run.jump(Moving { value: 1.0, ..Moving::default() })?;
        let Some(rest) = run.fixed_point() else { return Ok(Outcome::DoesNotApply("the response has no final value")) };
        let s = equations.states;
        let end = dot(&run.core.output[..s], &rest) + dot(&run.core.output[s..], &run.state[s..]);
        let mut slope = alloc::vec![0.0; equations.width()];
        for (i, share) in run.core.output.iter().enumerate() {
            super::matrix::add(&mut slope, run.core.matrix.row(i), *share);
        }
        let beyond = |state: &[f64], core: &super::core::Core| (dot(&core.output, state) - end) / (end - start);
        let core = run.core.clone();
        let mut most = beyond(&run.state, &core);
        let mut greatest = (run.output() - start).abs();
        let mut before = (run.time, run.state.clone());
        run.span(over(solution), &mut |run, _| {
            greatest = greatest.max((run.output() - start).abs());
            let towards = |state: &[f64]| dot(&slope, state) / (end - start) > 0.0;
            let ends = beyond(&before.1, &core).max(beyond(&run.state, &core));
            // Between two moments a swing of a resonance rises by less than this above them.
            if towards(&before.1) && !towards(&run.state) && ends > 0.8 * most {
                let (mut low, mut high) = (0.0, run.time - before.0);
                for _ in 0..40 {
                    let middle = f64::midpoint(low, high);
                    if towards(&run.later(&before.1, middle)) { low = middle } else { high = middle }
                }
                most = most.max(beyond(&run.later(&before.1, low), &core));
            }
            most = most.max(ends);
            before = (run.time, run.state.clone());
        })?;
        Ok(if (end - start).abs() <= NO_END * greatest {
            Outcome::DoesNotApply("the response to a step returns to where it began")
        } else {
            Outcome::Value(if most > NO_OVERSHOOT { most } else { 0.0 })
        })
    };
    step().unwrap_or_else(stopped)
}

/// What a settling time is asked for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Settling {
    /// Largest error, as a fraction of the step.
    pub error: f64,
    /// Step at the output, V.
    pub step: f64,
}

/// Time from a step of the input until the output stays within the error.
pub fn settling_time(solution: &Solution<'_>, asked: Settling) -> Outcome {
    let both = [1.0, -1.0].map(|direction| settles(solution, asked, direction));
    let [up, down] = both;
    match (up, down) {
        (Outcome::Value(a), Outcome::Value(b)) => Outcome::Value(a.max(b)),
        (Outcome::Value(_), other) | (other, _) => other,
    }
}

fn settles(solution: &Solution<'_>, asked: Settling, direction: f64) -> Outcome {
    let Some(equations) = Equations::of(solution, 0, 0.0) else { return NO_EQUATIONS };
    if !equations.limits.iter().all(super::pieces::Limits::has_room) {
        return NO_ROOM;
    }
    let gain = solution.dc_gain(0);
    let amplitude = asked.step / gain;
    if !(amplitude.is_finite() && gain.abs() > 0.0) {
        return Outcome::DoesNotApply("the stage has no gain at DC");
    }
    let dc = super::super::swing::levels(solution).find(|l| l.drive == 0).map_or(0.0, |l| l.dc);
    let (from, to) = (dc - 0.5 * direction * amplitude, dc + 0.5 * direction * amplitude);
    let step = || -> Result<Outcome, Stopped> {
        let mut ahead = Run::new(&equations, UNIT, true)?;
        ahead.settle(to)?;
        if !at_rest(&ahead.core.pieces) {
            return Ok(Outcome::DoesNotApply("the step ends at a rail or at the current limit"));
        }
        let (end, band) = (ahead.output(), asked.error * asked.step);
        let mut run = Run::new(&equations, UNIT, true)?;
        run.settle(from)?;
        run.rings = rings(solution, OVER);
        run.jump(Moving { value: to, ..Moving::default() })?;
        let s = equations.states;
        for edge in [end - band, end + band] {
            let mut row = run.core.output.clone();
            row[s] -= edge;
            let above = dot(&row, &run.state) > 0.0;
            run.watches.push(Watch { row, above });
        }
        let inside = |run: &Run<'_>| run.watches[0].above && !run.watches[1].above;
        let mut last = if inside(&run) { Some(0.0) } else { None };
        let slews = equations.limits.iter().flat_map(|l| [l.rise, l.fall]).flatten().fold(f64::INFINITY, f64::min);
        let mut left = 4;
        loop {
            run.span(over(solution) + 4.0 * asked.step / slews, &mut |run, mark| {
                if mark != Mark::Point {
                    last = inside(run).then_some(run.time);
                }
            })?;
            left -= 1;
            if last.is_some() && at_rest(&run.core.pieces) || left == 0 {
                break;
            }
        }
        if run.passed.rail {
            let mut needs = Vec::new();
            let lacks = |a: usize| solution.part_of(a, PartFigure::OverloadRecovery).is_none();
            if (0..solution.amplifiers()).any(lacks) {
                needs.push(Need::Part(PartFigure::OverloadRecovery));
            }
            if run.passed.beyond_high {
                needs.push(Need::HeadroomHigh);
            }
            if run.passed.beyond_low {
                needs.push(Need::HeadroomLow);
            }
            if !needs.is_empty() {
                return Ok(Outcome::Undetermined(needs));
            }
        }
        let recovery = (0..solution.amplifiers()).filter_map(|a| solution.part_of(a, PartFigure::OverloadRecovery)).fold(0.0, f64::max);
        Ok(match last {
            Some(time) => Outcome::Value(if run.passed.rail { time + recovery } else { time }),
            None => Outcome::DoesNotApply("the output does not settle to that error"),
        })
    };
    step().unwrap_or_else(stopped)
}

/// A moment of the last period: when, and the output with its first two derivatives.
type Moment = [f64; 4];

/// Distortion of the stated sine by slew, rails and current limit, as a fraction of the fundamental.
pub fn slew_clip_distortion(solution: &Solution<'_>) -> Outcome {
    let Some(level) = super::super::swing::levels(solution).find(|l| l.drive == 0 && l.peak > 0.0 && l.frequency > 0.0) else {
        return Outcome::Undetermined(alloc::vec![Need::SignalAmplitude]);
    };
    let omega = TAU * level.frequency;
    let Some(equations) = Equations::of(solution, 0, omega) else { return NO_EQUATIONS };
    if !equations.limits.iter().all(super::pieces::Limits::has_room) {
        return NO_ROOM;
    }
    let found = || -> Result<Outcome, Stopped> {
        let mut run = Run::new(&equations, UNIT, true)?;
        run.settle(level.dc)?;
        run.rings = rings(solution, OVER);
        run.longest = TAU / omega / IN_PERIOD;
        if at_rest(&run.core.pieces) && stays_linear(&run, level.peak) {
            return Ok(Outcome::Value(0.0));
        }
        run.jump(Moving { value: level.dc, slope: 0.0, sine: 0.0, cosine: level.peak })?;
        let Some(moments) = repeating(&mut run, TAU / omega)? else {
            return Ok(Outcome::DoesNotApply("the waveform does not repeat itself from period to period"));
        };
        // From row to row of a headroom table nothing bends.
        if run.passed.is_linear() {
            return Ok(Outcome::Value(0.0));
        }
        let mut needs = Vec::new();
        if run.passed.beyond_high {
            needs.push(Need::HeadroomHigh);
        }
        if run.passed.beyond_low {
            needs.push(Need::HeadroomLow);
        }
        Ok(if needs.is_empty() { distortion(&moments, omega) } else { Outcome::Undetermined(needs) })
    };
    found().unwrap_or_else(stopped)
}

/// Whether the steady response to a sine of this peak stays within every constraint of the present pieces.
fn stays_linear(run: &Run<'_>, peak: f64) -> bool {
    let (s, core) = (run.equations.states, &run.core);
    // ξ = rest + a·p + b·q with p' = ω·q, q' = −ω·p: A·a + ω·b = −α, A·b − ω·a = 0 on the states.
    let omega = core.matrix.row(s + 3)[s + 4];
    let mut matrix = Matrix::zero(2 * s, 2 * s);
    let mut right = Matrix::zero(2 * s, 1);
    for i in 0..s {
        for j in 0..s {
            *matrix.at(i, j) = core.matrix.row(i)[j];
            *matrix.at(s + i, s + j) = core.matrix.row(i)[j];
        }
        *matrix.at(i, s + i) += omega;
        *matrix.at(s + i, i) -= omega;
        *right.at(i, 0) = -core.matrix.row(i)[s + 3];
    }
    let Some(rest) = run.fixed_point() else { return false };
    if !matrix.solve(&mut right) {
        return false;
    }
    core.constraints.iter().all(|c| {
        let still = dot(&c.row[..s], &rest) + dot(&c.row[s..], &run.state[s..]);
        let (a, b) = (dot(&c.row[..s], &right.values[..s]) + c.row[s + 3], dot(&c.row[..s], &right.values[s..]));
        still - peak * libm::hypot(a, b) >= 0.0
    })
}

/// Runs until a period repeats itself, and gives its moments.
fn repeating(run: &mut Run<'_>, period: f64) -> Result<Option<Vec<Moment>>, Stopped> {
    let s = run.equations.states;
    let quiet = &mut |_: &Run<'_>, _: Mark| {};
    let begin = run.state[s..].to_vec();
    for _ in 0..PERIODS {
        run.state[s..].copy_from_slice(&begin);
        run.span(period, quiet)?;
    }
    for _ in 0..ROUNDS {
        run.state[s..].copy_from_slice(&begin);
        let (before, core) = (run.state.clone(), run.core.clone());
        let mut moments = alloc::vec![moment(run)];
        run.span(period, &mut |run, _| moments.push(moment(run)))?;
        let size = run.state[..s].iter().fold(0.0, |m: f64, v| m.max(v.abs()));
        let moved = |now: &[f64]| -> Vec<f64> { now[..s].iter().zip(&before).map(|(x, y)| x - y).collect() };
        let gap = moved(&run.state);
        if gap.iter().all(|g| g.abs() <= 1e-9 * size) {
            return Ok(Some(moments));
        }
        // Newton's step on the map of a period, its slopes by differences.
        let (after, after_core) = (run.state.clone(), run.core.clone());
        let mut matrix = Matrix::zero(s, s);
        for column in 0..s {
            let nudge = 1e-6 * size.max(1e-9);
            run.state.clone_from(&before);
            run.core = core.clone();
            run.state[column] += nudge;
            run.span(period, quiet)?;
            for (row, (now, then)) in run.state[..s].iter().zip(&after).enumerate() {
                *matrix.at(row, column) = -(now - then) / nudge;
            }
            *matrix.at(column, column) += 1.0;
        }
        let mut right = Matrix { columns: 1, values: gap };
        run.state = after;
        run.core = after_core;
        if matrix.solve(&mut right) && right.values.iter().all(|v| v.is_finite()) {
            // From the period's begin; a step that leads far away is not taken.
            let far = right.values.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
            if far <= 2.0 * size {
                for (i, step) in right.values.iter().enumerate() {
                    run.state[i] = before[i] + step;
                }
                run.find_pieces()?;
            }
        }
    }
    Ok(None)
}

fn moment(run: &Run<'_>) -> Moment {
    let rate = |state: &[f64]| -> Vec<f64> { (0..state.len()).map(|i| dot(run.core.matrix.row(i), state)).collect() };
    let first = rate(&run.state);
    let second = rate(&first);
    let row = &run.core.output;
    [run.time, dot(row, &run.state), dot(row, &first), dot(row, &second)]
}

/// The integral over the period of what `f` makes of time, value and two derivatives: value and two derivatives again.
fn integral(moments: &[Moment], f: impl Fn(&Moment) -> [f64; 3]) -> f64 {
    moments
        .windows(2)
        .map(|pair| {
            let (a, b, h) = (f(&pair[0]), f(&pair[1]), pair[1][0] - pair[0][0]);
            h / 2.0 * (a[0] + b[0]) + h * h / 10.0 * (a[1] - b[1]) + h * h * h / 120.0 * (a[2] + b[2])
        })
        .sum()
}

fn distortion(moments: &[Moment], omega: f64) -> Outcome {
    let (Some(first), Some(last)) = (moments.first(), moments.last()) else { return Outcome::DoesNotApply("the period has no moments") };
    let (begin, period) = (first[0], last[0] - first[0]);
    let turn = |t: f64| (libm::cos(omega * (t - begin)), libm::sin(omega * (t - begin)));
    let product = |m: &Moment, c: [f64; 3]| [m[1] * c[0], m[2] * c[0] + m[1] * c[1], m[3] * c[0] + 2.0 * m[2] * c[1] + m[1] * c[2]];
    let cosine = |t: f64| {
        let (c, s) = turn(t);
        [c, -omega * s, -omega * omega * c]
    };
    let sine = |t: f64| {
        let (c, s) = turn(t);
        [s, omega * c, -omega * omega * s]
    };
    let mean = integral(moments, |m| [m[1], m[2], m[3]]) / period;
    let a = 2.0 / period * integral(moments, |m| product(m, cosine(m[0])));
    let b = 2.0 / period * integral(moments, |m| product(m, sine(m[0])));
    let rest = integral(moments, |m| {
        let (c, s) = (cosine(m[0]), sine(m[0]));
        let r: [f64; 3] = core::array::from_fn(|k| m[k + 1] - a * c[k] - b * s[k] - if k == 0 { mean } else { 0.0 });
        [r[0] * r[0], 2.0 * r[0] * r[1], 2.0 * (r[1] * r[1] + r[0] * r[2])]
    });
    let fundamental = libm::hypot(a, b);
    if fundamental > 0.0 {
        Outcome::Value(libm::sqrt((2.0 * rest / period).max(0.0)) / fundamental)
    } else {
        Outcome::DoesNotApply("the output does not follow the signal")
    }
}
