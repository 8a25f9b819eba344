//! The rules of thumb and handbook forms that a practitioner would hold against a figure, with this stage's numbers in place.
//!
//! No figure comes from here: each rule stands beside what the network gives, with the reason why the two differ. A rule that
//! lacks a number, or whose assumptions this stage does not meet, does not appear.
//!
//! # Formula
//! Beside each rule. `NG` is the noise gain at DC of kinds whose noise gain is flat over the band of interest: they say so by
//! stating the closed-loop edge `GBW/NG` among their own closed forms.
//!
//! # Source
//! Beside each rule.

use alloc::{vec, vec::Vec};
use core::f64::consts::{FRAC_PI_2, PI, TAU};

use crate::{
    analysis::{margins, noise, outcome, response, swing},
    dimension::Dimension as D,
    figure::{Figure as F, Query},
    kind::{Kind, Reference},
    part::PartFigure as P,
    report::{Against, FigureRow, Outcome, Working},
    solution::Solution,
    stage::{Isolation, Signal, Source},
};

const COMMON: &str = "common practice, no source";
const POLES: &str = "higher poles, capacitances and load; the rule knows the dominant pole alone";
const TWO_POLES: &str = "capacitances, load and further poles; the rule knows a loop of two poles";
const SECOND_ORDER: &str = "further poles and zeros; the rule is that of a second-order low-pass";
const CLASS_B: &str = "what the feedback network draws, phase between current and voltage, steady parts of the signal";

/// Every closed form for the stage, in the order of the figures.
#[must_use]
pub fn working(solution: &Solution<'_>, rows: &[FigureRow]) -> Vec<Working> {
    let stage = solution.model.stage;
    let mut lines = (stage.kind.spec().working)(stage);
    if !stage.kind.switches() {
        let facts = Facts::of(solution, &lines);
        for row in rows {
            lines.extend(facts.rule(row.query));
        }
    }
    lines.retain(|l| l.handbook.is_finite() && l.numbers.iter().all(|n| n.1.is_finite()));
    for line in &mut lines {
        line.dimension = line.query.figure.dimension_in(stage.kind);
        let row = rows.iter().find(|r| r.query == line.query);
        line.exact = match (line.against, row) {
            (Against::Least, Some(FigureRow { range, .. })) => {
                range.map_or(Outcome::Undetermined(Vec::new()), |(least, _)| Outcome::Value(least))
            }
            (_, Some(row)) => row.nominal.clone(),
            (_, None) => outcome(solution, line.query),
        };
    }
    // Held against a worst case, it waits for one.
    lines.retain(|l| l.against == Against::Nominal || l.exact.value().is_some());
    lines.sort_by_key(|l| rows.iter().position(|r| r.query == l.query));
    lines
}

/// A symbol with its value.
type Number = (&'static str, f64, D);

struct Facts<'s> {
    solution: &'s Solution<'s>,
    kind: Kind,
    /// Noise gain at DC, where it is flat.
    flat: Option<f64>,
    gain: f64,
    signal: Option<Signal>,
}

impl<'s> Facts<'s> {
    fn of(solution: &'s Solution<'_>, own: &[Working]) -> Self {
        let stage = solution.model.stage;
        let flat = own.iter().filter(|l| l.query.figure == F::Bandwidth).find_map(|l| l.numbers.iter().find(|n| n.0 == "NG")).map(|n| n.1);
        let determined = outcome(solution, Query::of(F::Gain)).value();
        Self { solution, kind: stage.kind, flat, gain: determined.map_or(f64::NAN, f64::abs), signal: stage.signal() }
    }

    fn part(&self, figure: P) -> f64 {
        self.solution.part(figure).unwrap_or(f64::NAN)
    }

    fn component(&self, name: &str) -> Option<f64> {
        self.solution.model.stage.component(name).map(|c| c.nominal)
    }

    fn value(&self, figure: F) -> f64 {
        outcome(self.solution, Query::of(figure)).value().unwrap_or(f64::NAN)
    }

    /// Peak of the signal at the output, V, and its frequency.
    fn output(&self) -> Option<(f64, f64)> {
        let signal = self.signal?;
        Some((self.gain * signal.peak, signal.frequency?)).filter(|(peak, f)| *peak > 0.0 && *f > 0.0)
    }

    fn load(&self) -> Option<f64> {
        self.solution.model.stage.load.resistance.map(|r| r.nominal)
    }

    /// Higher poles of the main amplifier.
    fn poles(&self) -> &[f64] {
        self.solution.model.poles.first().and_then(Option::as_deref).unwrap_or(&[])
    }

    /// Noise gain at DC, where it is the one over the band as well: no capacitor in series with the feedback divider.
    fn flat_from_dc(&self) -> Option<f64> {
        self.flat.filter(|_| matches!(self.kind.spec().reference, Reference::Dc))
    }

    /// Resistance behind the inputs for noise: the source's where it drives the + input, and the feedback divider's.
    fn resistance(&self, noise_gain: f64) -> f64 {
        let divider = self.component("Rf").unwrap_or(0.0) / noise_gain;
        let source = match (self.kind, self.solution.model.stage.source(0)) {
            (Kind::Follower | Kind::NonInverting, Some(Source::Resistive { resistance })) => resistance.nominal,
            _ => 0.0,
        };
        divider + source
    }

    fn rule(&self, query: Query) -> Option<Working> {
        // The rules are the whole stage's; one amplifier's or another input's has none.
        if query.of.is_some() {
            return None;
        }
        let line = |formula, numbers: Vec<Number>, handbook, source, difference| {
            Some(Working {
                query,
                dimension: D::Number,
                formula,
                numbers,
                handbook,
                exact: Outcome::Undetermined(Vec::new()),
                against: Against::Nominal,
                source,
                difference,
            })
        };
        // What a definition says, with its numbers in place.
        let defined = |formula, numbers, value| line(formula, numbers, value, "definition", "");
        match query.figure {
            F::StageCmrrAt
            | F::StagePsrrAt
            | F::Gain
            | F::Bandwidth
            | F::LowCutoff
            | F::InputRangeMargin
            | F::ResistorDissipation
            | F::GainMargin
            | F::FullScaleMargin
            | F::RippleOutput
            | F::ThresholdHigh
            | F::ThresholdLow
            | F::Hysteresis
            | F::ResponseTime
            | F::OutputHigh
            | F::OutputLow
            | F::Overshoot
            | F::SettlingTime
            | F::SlewClipDistortion => None,
            F::StartupTime => {
                let (upper, lower, c) = (self.component("Rb1")?, self.component("Rb2")?, self.component("Cb")?);
                let numbers = vec![("Rb1", upper, D::Resistance), ("Rb2", lower, D::Resistance), ("Cb", c, D::Capacitance)];
                line(
                    "t ≈ 4.6·Cb·Rb1·Rb2/(Rb1 + Rb2)",
                    numbers,
                    4.6 * c * upper * lower / (upper + lower),
                    COMMON,
                    "what the other capacitors take: the rule knows the divider's alone",
                )
            }
            F::AcquisitionError => {
                let c = &self.solution.model.stage.converter;
                let (range, sample, t) = (c.full_scale?, c.sample_capacitance?.nominal, c.acquisition_time?);
                let shunt = c.shunt_capacitance.map_or(0.0, |v| v.nominal);
                let ohms = c.series_resistance?.nominal + self.component("Riso").unwrap_or(0.0);
                let full_scale = range[1] - range[0];
                line(
                    "E ≈ FS·Cs/(Cs + Csh)·exp(−t/(R·(Cs + Csh)))",
                    vec![
                        ("FS", full_scale, D::Voltage),
                        ("Cs", sample, D::Capacitance),
                        ("Csh", shunt, D::Capacitance),
                        ("t", t, D::Time),
                        ("R", ohms, D::Resistance),
                    ],
                    full_scale * sample / (sample + shunt) * libm::exp(-t / (ohms * (sample + shunt))),
                    "derived here: the charge is shared, and an ideal amplifier settles it through R",
                    "the amplifier answers the kick too; the resistance of the sampling switch, the load",
                )
            }
            F::Enob => {
                let c = &self.solution.model.stage.converter;
                let (range, bits) = (c.full_scale?, c.bits?);
                let full_scale = range[1] - range[0];
                let (noise, own, step) = (self.value(F::OutputNoise), c.noise.unwrap_or(0.0), full_scale / libm::exp2(bits));
                let numbers =
                    vec![("FS", full_scale, D::Voltage), ("v", noise, D::Voltage), ("v_c", own, D::Voltage), ("LSB", step, D::Voltage)];
                let power = noise * noise + own * own + step * step / 12.0;
                defined("N = log2(FS/√(12·(v² + v_c² + LSB²/12)))", numbers, libm::log2(full_scale / libm::sqrt(12.0 * power)))
            }
            F::GainError => {
                let (ng, open) = (self.flat?, self.part(P::OpenLoop));
                line(
                    "ε ≈ −NG/A0",
                    vec![("NG", ng, D::Number), ("A0", open, D::Number)],
                    -ng / open,
                    COMMON,
                    "source and load resistance; the rule knows the open-loop gain alone",
                )
            }
            F::GainAtSignal | F::GainAt => {
                let frequency = query.at.or_else(|| self.signal?.frequency)?;
                let (edge, ideal) = (self.part(P::Gbw) / self.flat?, (self.kind.spec().ideal_gain)(self.solution.model.stage));
                let ideal = if query.figure == F::GainAt { ideal.abs() } else { ideal };
                let numbers = vec![("G0", ideal, D::Gain), ("f", frequency, D::Frequency), ("f3", edge, D::Frequency)];
                let ratio = frequency / edge;
                line("G ≈ G0/√(1 + (f/f3)²), f3 = GBW/NG", numbers, ideal / libm::sqrt(1.0 + ratio * ratio), COMMON, POLES)
            }
            F::PhaseAt => {
                let (frequency, edge) = (query.at?, self.part(P::Gbw) / self.flat?);
                let (turned, formula) = match (self.kind.spec().ideal_gain)(self.solution.model.stage) < 0.0 {
                    true => (PI, "φ ≈ 180° − arctan(f/f3), f3 = GBW/NG"),
                    false => (0.0, "φ ≈ −arctan(f/f3), f3 = GBW/NG"),
                };
                let numbers = vec![("f", frequency, D::Frequency), ("f3", edge, D::Frequency)];
                line(formula, numbers, turned - libm::atan(frequency / edge), COMMON, POLES)
            }
            F::Peaking => {
                self.flat?;
                let q = self.value(F::Q);
                let numbers = vec![("Q", q, D::Number)];
                if q * q > 0.5 {
                    line("Mp ≈ Q/√(1 − 1/(4·Q²))", numbers, q / libm::sqrt(1.0 - 0.25 / (q * q)), COMMON, SECOND_ORDER)
                } else {
                    line("Mp ≈ 1, Q below 1/√2", numbers, 1.0 + 0.0 * q, COMMON, SECOND_ORDER)
                }
            }
            F::Crossover => {
                let (ng, gbw) = (self.flat?, self.part(P::Gbw));
                line("f_c ≈ GBW/NG", vec![("GBW", gbw, D::Frequency), ("NG", ng, D::Number)], gbw / ng, COMMON, POLES)
            }
            F::PhaseMargin => {
                let crossover = margins::margins(self.solution).crossover?;
                let lag: f64 = self.poles().iter().map(|p| libm::atan(crossover / p)).sum();
                let mut numbers = vec![("f_c", crossover, D::Frequency)];
                numbers.extend(["f2", "f3", "f4"].into_iter().zip(self.poles()).map(|(name, p)| (name, *p, D::Frequency)));
                let formula = *[
                    "PM ≈ 90°, f_c given",
                    "PM ≈ 90° − arctan(f_c/f2)",
                    "PM ≈ 90° − arctan(f_c/f2) − arctan(f_c/f3)",
                    "PM ≈ 90° − arctan(f_c/f2) − arctan(f_c/f3) − arctan(f_c/f4)",
                ]
                .get(self.poles().len())?;
                line(
                    formula,
                    numbers,
                    FRAC_PI_2 - lag,
                    COMMON,
                    "what output resistance, input capacitance and load take, and what a feedback capacitor gives back",
                )
            }
            F::SensitivityPeak => {
                let margin = margins::margins(self.solution).phase?;
                let bound = 1.0 / (2.0 * libm::sin(margin / 2.0));
                line(
                    "Ms ≥ 1/(2·sin(PM/2))",
                    vec![("PM", margin, D::Angle)],
                    bound,
                    "geometry of the Nyquist plane, derived here",
                    "the return ratio passes −1 most closely beside the crossover",
                )
                .filter(|_| margin > 0.0 && bound > 1.0)
            }
            F::NaturalFrequency => {
                let ([second], ng, gbw) = (self.poles(), self.flat?, self.part(P::Gbw)) else { return None };
                let numbers = vec![("GBW", gbw, D::Frequency), ("f2", *second, D::Frequency), ("NG", ng, D::Number)];
                line("f_n ≈ √(GBW·f2/NG)", numbers, libm::sqrt(gbw * second / ng), "derived here for two poles", TWO_POLES)
            }
            F::Q => {
                let ([second], ng, gbw) = (self.poles(), self.flat?, self.part(P::Gbw)) else { return None };
                let numbers = vec![("GBW", gbw, D::Frequency), ("NG", ng, D::Number), ("f2", *second, D::Frequency)];
                line("Q ≈ √(GBW/(NG·f2))", numbers, libm::sqrt(gbw / (ng * second)), "derived here for two poles", TWO_POLES)
            }
            F::InputImpedance => match self.kind {
                Kind::Inverting | Kind::AcInverting | Kind::Integrator => {
                    let r = self.component("Rin")?;
                    line(
                        "|Z| ≈ Rin",
                        vec![("Rin", r, D::Resistance)],
                        r,
                        COMMON,
                        "the inverting input is no perfect ground; capacitors in series",
                    )
                }
                Kind::Follower | Kind::NonInverting if self.component("Rser").is_none() && self.component("Cshunt").is_none() => {
                    let (r, c) = (self.part(P::CommonModeResistance), self.part(P::CommonModeCapacitance));
                    let f = self.signal.and_then(|s| s.frequency).unwrap_or(0.0);
                    let numbers = vec![("R_cm", r, D::Resistance), ("C_cm", c, D::Capacitance), ("f", f, D::Frequency)];
                    let x = TAU * f * r * c;
                    line(
                        "|Z| ≈ R_cm/√(1 + (2π·f·R_cm·C_cm)²)",
                        numbers,
                        r / libm::sqrt(1.0 + x * x),
                        COMMON,
                        "the differential input impedance, raised by the loop gain; board capacitance",
                    )
                }
                _ => None,
            },
            F::OutputImpedance => {
                let (ng, ro) = (self.flat?, self.part(P::OutputResistance));
                let why = "loop gain at that frequency exactly, the feedback network, capacitive load in the loop";
                match (self.component("Riso"), self.signal.and_then(|s| s.frequency)) {
                    (Some(r), _) if self.solution.model.stage.isolation == Isolation::OutsideLoop => {
                        line("|Z| ≈ Riso", vec![("Riso", r, D::Resistance)], r, COMMON, why)
                    }
                    (Some(_), _) => None,
                    (None, Some(f)) if f > 0.0 => {
                        let gbw = self.part(P::Gbw);
                        let numbers =
                            vec![("Ro", ro, D::Resistance), ("NG", ng, D::Number), ("f", f, D::Frequency), ("GBW", gbw, D::Frequency)];
                        line("|Z| ≈ Ro·NG·f/GBW", numbers, ro * ng * f / gbw, COMMON, why)
                    }
                    _ => {
                        let open = self.part(P::OpenLoop);
                        let numbers = vec![("Ro", ro, D::Resistance), ("NG", ng, D::Number), ("A0", open, D::Number)];
                        line("|Z| ≈ Ro·NG/A0", numbers, ro * ng / open, COMMON, why)
                    }
                }
            }
            F::OutputOffset => {
                let (ng, offset) = (self.flat_from_dc()?, self.part(P::Offset));
                let why = "drift from 25 °C, rejection, bias current through the source, finite gain: the DC error budget has them all";
                let mut numbers = vec![("NG", ng, D::Number), ("Vos", offset, D::Voltage)];
                match self.component("Rf") {
                    Some(rf) => {
                        let bias = self.part(P::BiasCurrent);
                        numbers.extend([("Ib", bias, D::Current), ("Rf", rf, D::Resistance)]);
                        line("V ≈ NG·Vos + Ib·Rf", numbers, ng * offset + bias * rf, COMMON, why)
                    }
                    None => line("V ≈ NG·Vos", numbers, ng * offset, COMMON, why),
                }
            }
            F::InputOffset => {
                let output = self.value(F::OutputOffset);
                defined("V_in = V_out/G", vec![("V_out", output, D::Voltage), ("G", self.gain, self.kind.spec().gain)], output / self.gain)
            }
            F::OffsetDrift => {
                let (ng, drift) = (self.flat_from_dc()?, self.part(P::OffsetDrift));
                line(
                    "dV/dT ≈ NG·d",
                    vec![("NG", ng, D::Number), ("d", drift, D::VoltageDrift)],
                    ng * drift,
                    COMMON,
                    "the drift of the bias currents",
                )
            }
            F::GainDrift => {
                let stage = self.solution.model.stage;
                let (upper, lower) = (stage.component("Rf")?, stage.component("Rg").or_else(|| stage.component("Rin"))?);
                let numbers = vec![("TC_f", upper.drift, D::FractionDrift), ("TC_g", lower.drift, D::FractionDrift)];
                let sum = upper.drift + lower.drift;
                match self.kind {
                    Kind::Inverting => line("TC ≈ TC_f + TC_g", numbers, sum, COMMON, "finite loop gain, source resistance"),
                    Kind::NonInverting => {
                        let g = 1.0 + upper.nominal / lower.nominal;
                        let mut numbers = numbers;
                        numbers.insert(0, ("G", g, D::Number));
                        line("TC ≈ (1 − 1/G)·(TC_f + TC_g)", numbers, (1.0 - 1.0 / g) * sum, COMMON, "finite loop gain, source resistance")
                    }
                    _ => None,
                }
            }
            F::StageCmrr => {
                let stage = self.solution.model.stage;
                let worst =
                    |names: [&str; 4]| names.iter().filter_map(|n| stage.component(n)).map(|c| c.plus.max(c.minus)).fold(0.0, f64::max);
                let t = worst(["R1", "R2", "R3", "R4"]);
                if t <= 0.0 || self.kind != Kind::Difference {
                    return None;
                }
                let g = self.component("R2")? / self.component("R1")?;
                line(
                    "CMRR ≥ (1 + G)/(4·t)",
                    vec![("G", g, D::Number), ("t", t, D::Fraction)],
                    (1.0 + g) / (4.0 * t),
                    COMMON,
                    "the amplifier's own rejection, drift of the resistors, higher orders of t",
                )
                .map(|w| Working { against: Against::Least, ..w })
            }
            F::StagePsrr => {
                let (ng, own) = (self.flat_from_dc()?, self.part(P::PsrrPositive).min(self.part(P::PsrrNegative)));
                let numbers = vec![("P", own, D::Level), ("G", self.gain, D::Number), ("NG", ng, D::Number)];
                line("PSRR ≈ P·G/NG", numbers, own * self.gain / ng, COMMON, "finite loop gain; what a supply feeds in by other ways")
            }
            F::OutputNoise | F::NoiseDensityAt => {
                self.noise(query).and_then(|(formula, numbers, value, why)| line(formula, numbers, value, COMMON, why))
            }
            F::InputNoise => {
                let output = self.value(F::OutputNoise);
                defined("v_in = v_out/G", vec![("v_out", output, D::Voltage), ("G", self.gain, self.kind.spec().gain)], output / self.gain)
            }
            F::OutputNoisePeakToPeak => {
                let rms = self.value(F::OutputNoise);
                defined("v_pp = 6.6·v", vec![("v", rms, D::Voltage)], noise::PEAK_TO_PEAK * rms)
            }
            F::NoiseBandwidth => {
                self.flat?;
                let edge = self.value(F::Bandwidth);
                line(
                    "B ≈ (π/2)·f3",
                    vec![("f3", edge, D::Frequency)],
                    FRAC_PI_2 * edge,
                    COMMON,
                    "peaking and further poles; the rule is that of one pole",
                )
            }
            F::Snr => {
                let (signal, rms) = (noise::signal_rms(self.solution), self.value(F::OutputNoise));
                defined("SNR = V/v", vec![("V", signal, D::Voltage), ("v", rms, D::Voltage)], signal / rms)
            }
            F::SnrBits => {
                let decibels = 20.0 * libm::log10(self.value(F::Snr));
                line(
                    "N ≈ (SNR − 1.76)/6.02",
                    vec![("SNR", decibels, D::Number)],
                    (decibels - 1.76) / 6.02,
                    "IEEE Std 1241, from memory",
                    "the constants are rounded; the figure takes log2(ratio/√1.5)",
                )
            }
            F::ClipMargin => {
                let (above, below) = swing::simple_room(self.solution)?;
                let (side, formula) = match above.room <= below.room {
                    true => (above, "room ≈ rail − headroom − V0 − Vpk"),
                    false => (below, "room ≈ V0 − Vpk − headroom − rail"),
                };
                let numbers = vec![
                    ("rail", side.rail, D::Voltage),
                    ("headroom", side.headroom, D::Voltage),
                    ("V0", side.dc, D::Voltage),
                    ("Vpk", side.peak, D::Voltage),
                ];
                line(formula, numbers, side.room, COMMON, "the DC errors; headroom at each moment's own current")
            }
            F::CurrentMargin => {
                let ((peak, _), r, limit) = (self.output()?, self.load()?, self.part(P::CurrentLimit));
                let numbers = vec![("I_lim", limit, D::Current), ("Vpk", peak, D::Voltage), ("R_L", r, D::Resistance)];
                line(
                    "ΔI ≈ I_lim − Vpk/R_L",
                    numbers,
                    limit - peak / r,
                    COMMON,
                    "the feedback network, capacitance of the load, steady parts of the signal",
                )
            }
            F::SlewMargin => {
                let ((peak, f), slew) = (self.output()?, self.part(P::SlewRise).min(self.part(P::SlewFall)));
                let numbers = vec![("SR", slew, D::SlewRate), ("f", f, D::Frequency), ("Vpk", peak, D::Voltage)];
                line(
                    "margin ≈ SR/(2π·f·Vpk)",
                    numbers,
                    slew / (TAU * f * peak),
                    COMMON,
                    "the drop in the output resistance; what the current limit leaves for a capacitive load",
                )
            }
            F::FullPowerBandwidth => {
                let ((peak, _), slew) = (self.output()?, self.part(P::SlewRise).min(self.part(P::SlewFall)));
                let numbers = vec![("SR", slew, D::SlewRate), ("Vpk", peak, D::Voltage)];
                line(
                    "f ≈ SR/(2π·Vpk)",
                    numbers,
                    slew / (TAU * peak),
                    "common practice, no source; the steepest slope of a sine is 2πf·Vpk",
                    "the drop in the output resistance, and the output current where it ends first",
                )
            }
            F::SupplyCurrent => {
                let (quiescent, peak, r) = self.class_b()?;
                let numbers = vec![("I_q", quiescent, D::Current), ("Vpk", peak, D::Voltage), ("R_L", r, D::Resistance)];
                line(
                    "I ≈ I_q + Vpk/(π·R_L)",
                    numbers,
                    quiescent + peak / (PI * r),
                    "class-B output stage: A. Sedra, K. Smith, Microelectronic Circuits, from memory",
                    CLASS_B,
                )
            }
            F::Dissipation => {
                let (quiescent, peak, r) = self.class_b()?;
                let (high, low) = swing::supplies(self.solution)?;
                let span = high - low;
                // The most heat is made at 2/π of the rails, if the signal reaches it.
                let peak = peak.min(span / PI);
                let numbers =
                    vec![("Vs", span, D::Voltage), ("I_q", quiescent, D::Current), ("V", peak, D::Voltage), ("R_L", r, D::Resistance)];
                let heat = span * quiescent + span * peak / (PI * r) - peak * peak / (2.0 * r);
                line(
                    "P ≈ Vs·I_q + Vs·V/(π·R_L) − V²/(2·R_L)",
                    numbers,
                    heat,
                    "class-B output stage: A. Sedra, K. Smith, Microelectronic Circuits, from memory",
                    CLASS_B,
                )
            }
            F::JunctionTemperature => {
                let ambient = self.solution.values[self.solution.model.parameters.temperature()?];
                let (heat, resistance) = (self.value(F::Dissipation), self.part(P::JunctionToAmbient));
                let numbers = vec![("T_a", ambient, D::Temperature), ("θ", resistance, D::ThermalResistance), ("P", heat, D::Power)];
                defined("T_j = T_a + θ·P", numbers, ambient + resistance * heat)
            }
        }
    }

    /// Quiescent current, peak of the output, load resistance of a stage of one amplifier with a balanced signal.
    fn class_b(&self) -> Option<(f64, f64, f64)> {
        let ((peak, _), r) = (self.output()?, self.load()?);
        let balanced = self.solution.amplifiers() == 1 && self.solution.model.stage.part.amplifiers.unwrap_or(1) == 1;
        let steady = swing::drives(self.solution).first().is_none_or(|d| d.v0.abs() > 1e-6 * peak);
        (balanced && !steady).then(|| (self.part(P::SupplyCurrent), peak, r))
    }

    fn noise(&self, query: Query) -> Option<(&'static str, Vec<Number>, f64, &'static str)> {
        let ng = self.flat?;
        let stage = self.solution.model.stage;
        let kelvin = self.solution.values[self.solution.model.parameters.temperature()?];
        let r = self.resistance(ng);
        let (voltage, current) = (self.part(P::NoiseVoltage), self.solution.part(P::NoiseCurrent).unwrap_or(0.0));
        let thermal = libm::sqrt(4.0 * noise::BOLTZMANN * kelvin * r);
        let density = ng * libm::sqrt(voltage * voltage + thermal * thermal + current * current * r * r);
        let mut numbers = vec![
            ("NG", ng, D::Number),
            ("e_n", voltage, D::VoltageDensity),
            ("e_R", thermal, D::VoltageDensity),
            ("i_n", current, D::CurrentDensity),
            ("R", r, D::Resistance),
        ];
        if query.figure == F::NoiseDensityAt {
            let why = "noise below the corners, the roll-off; the rule takes one resistance R = Rf/NG (and the source's) for both inputs";
            return Some(("e ≈ NG·√(e_n² + e_R² + (i_n·R)²), e_R² = 4kTR", numbers, density, why));
        }
        let (band, edge) = (stage.band?, response::edges(self.solution).bandwidth);
        let width = band.to.min(FRAC_PI_2 * edge) - band.from;
        numbers.push(("B", width, D::Frequency));
        let why = "noise below the corners, peaking; the rule takes one resistance R = Rf/NG (and the source's) for both inputs, and B = the band or (π/2)·f3";
        Some(("v ≈ NG·√(e_n² + e_R² + (i_n·R)²)·√B, e_R² = 4kTR", numbers, density * libm::sqrt(width), why)).filter(|_| width > 0.0)
    }
}
