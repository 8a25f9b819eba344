//! The analyses: one file each. A figure's value in one build comes from [`outcome`].

pub mod converter;
pub mod dc;
pub mod margins;
pub mod modes;
pub mod noise;
pub mod rejection;
pub mod response;
pub mod search;
pub mod second_pole;
pub mod spread;
pub mod startup;
pub mod sweep;
pub mod swing;
pub mod switching;
pub mod thermal;
pub mod waveform;

use alloc::vec::Vec;

use crate::{
    figure::{Figure, Query},
    model::Model,
    parameters::touch,
    part::PartFigure,
    report::{Need, Outcome, Parameter},
    solution::Solution,
    stage::Signal,
};

/// Why a figure of an amplifier or from an input that is not there does not apply.
pub const NO_SUCH_SCOPE: &str = "the stage has no such amplifier or input";

/// Which results a figure belongs to (see [`touch`]).
#[must_use]
pub const fn touched_by(figure: Figure) -> u8 {
    use Figure as F;
    match figure {
        F::Gain | F::GainError | F::GainAtSignal | F::GainAt | F::PhaseAt => touch::NETWORK | touch::REJECTION,
        F::Bandwidth
        | F::LowCutoff
        | F::Peaking
        | F::Crossover
        | F::PhaseMargin
        | F::GainMargin
        | F::SensitivityPeak
        | F::NaturalFrequency
        | F::Q
        | F::InputImpedance
        | F::OutputImpedance
        | F::GainDrift
        | F::NoiseBandwidth => touch::NETWORK,
        F::OutputOffset
        | F::InputOffset
        | F::OffsetDrift
        | F::StageCmrr
        | F::StageCmrrAt
        | F::StagePsrr
        | F::StagePsrrAt
        | F::RippleOutput => touch::DC,
        F::OutputNoise | F::InputNoise | F::OutputNoisePeakToPeak | F::NoiseDensityAt | F::Snr | F::SnrBits | F::Enob => touch::NOISE,
        F::ClipMargin
        | F::FullScaleMargin
        | F::InputRangeMargin
        | F::CurrentMargin
        | F::SlewMargin
        | F::FullPowerBandwidth
        | F::AcquisitionError => touch::SWING,
        F::Overshoot => touch::NETWORK,
        F::SettlingTime | F::SlewClipDistortion => touch::NETWORK | touch::SWING,
        F::SupplyCurrent | F::Dissipation | F::JunctionTemperature | F::ResistorDissipation => touch::POWER,
        F::StartupTime => touch::SWING,
        F::ThresholdHigh | F::ThresholdLow | F::Hysteresis | F::ResponseTime | F::OutputHigh | F::OutputLow => touch::DC | touch::SWING,
    }
}

/// Whether a parameter can change a figure of this stage at all, where [`touched_by`] leaves it open. What it says no to is never
/// moved for that figure.
#[must_use]
pub fn reaches(model: &Model<'_>, parameter: Parameter, figure: Figure) -> bool {
    use Figure as F;
    use PartFigure as P;
    if model.stage.kind.switches() {
        return true;
    }
    // The heat drives a bias current that doubles with temperature.
    let by_heat = |part| {
        matches!(figure, F::OutputOffset | F::InputOffset | F::OffsetDrift | F::ClipMargin | F::FullScaleMargin)
            && (0..model.network.amplifiers.len()).any(|a| model.parameters.part_slot(a, P::BiasDoubling).is_some())
            || matches!(figure, F::JunctionTemperature)
            || part != P::JunctionToAmbient && matches!(figure, F::SupplyCurrent | F::Dissipation)
    };
    let is_waveform = matches!(figure, F::SettlingTime | F::SlewClipDistortion);
    match parameter {
        Parameter::Part(part) | Parameter::PartOf(_, part) => match part {
            P::Offset | P::OffsetCurrent => matches!(figure, F::OutputOffset | F::InputOffset | F::ClipMargin | F::FullScaleMargin),
            P::OffsetDrift | P::BiasCurrent | P::BiasDoubling => {
                matches!(figure, F::OutputOffset | F::InputOffset | F::OffsetDrift | F::ClipMargin | F::FullScaleMargin)
                    || part != P::OffsetDrift && matches!(figure, F::JunctionTemperature)
            }
            P::Cmrr => !matches!(figure, F::OffsetDrift | F::InputRangeMargin | F::CurrentMargin | F::SlewMargin | F::FullPowerBandwidth),
            P::PsrrPositive | P::PsrrNegative => {
                matches!(
                    figure,
                    F::OutputOffset | F::InputOffset | F::StagePsrr | F::StagePsrrAt | F::RippleOutput | F::ClipMargin | F::FullScaleMargin
                )
            }
            P::RangeFromNegative | P::RangeFromPositive => matches!(figure, F::InputRangeMargin),
            P::SlewRise | P::SlewFall => {
                matches!(figure, F::SlewMargin | F::FullPowerBandwidth | F::AcquisitionError | F::StartupTime) || is_waveform
            }
            P::Startup => matches!(figure, F::StartupTime),
            P::CurrentLimit => {
                matches!(figure, F::CurrentMargin | F::SlewMargin | F::FullPowerBandwidth | F::AcquisitionError)
                    || is_waveform
                    || by_heat(part)
            }
            P::SupplyCurrent | P::JunctionToAmbient => by_heat(part),
            P::OpenLoop
            | P::Gbw
            | P::OutputResistance
            | P::DifferentialResistance
            | P::DifferentialCapacitance
            | P::CommonModeResistance
            | P::CommonModeCapacitance
            | P::NoiseVoltage
            | P::NoiseVoltageCorner
            | P::NoiseExponent
            | P::NoiseCurrent
            | P::NoiseCurrentCorner
            | P::CmrrCorner
            | P::PsrrPositiveCorner
            | P::PsrrNegativeCorner
            | P::SupplySpanMin
            | P::SupplySpanMax
            | P::DifferentialMax
            | P::ClampCurrentMax
            | P::StableGainMin
            | P::OverloadRecovery
            | P::JunctionMax => true,
        },
        Parameter::Headroom => matches!(figure, F::ClipMargin) || is_waveform,
        Parameter::Temperature => !matches!(
            figure,
            F::StageCmrr
                | F::StageCmrrAt
                | F::StagePsrr
                | F::StagePsrrAt
                | F::RippleOutput
                | F::InputRangeMargin
                | F::CurrentMargin
                | F::SlewMargin
                | F::FullPowerBandwidth
                | F::AcquisitionError
                | F::StartupTime
                | F::Overshoot
                | F::SettlingTime
                | F::SlewClipDistortion
                | F::SupplyCurrent
                | F::Dissipation
                | F::ResistorDissipation
        ),
        _ => true,
    }
}

/// A figure in one build.
#[must_use]
pub fn outcome(solution: &Solution<'_>, query: Query) -> Outcome {
    lacking(solution, query).unwrap_or_else(|| value(solution, query))
}

/// What a figure lacks, if anything: the same for every build of a stage.
#[must_use]
pub fn lacking(solution: &Solution<'_>, query: Query) -> Option<Outcome> {
    use Figure as F;
    if !query.exists_in(solution.model.stage) {
        return Some(Outcome::DoesNotApply(NO_SUCH_SCOPE));
    }
    if solution.model.stage.kind.switches() {
        return switching::lacking(solution, query.figure);
    }
    let mut missing = Missing::default();
    match query.figure {
        F::Gain | F::GainError | F::GainDrift => missing.part(solution, PartFigure::OpenLoop),
        F::GainAtSignal => {
            missing.small_signal(solution);
            missing.signal_frequency(solution);
        }
        F::InputImpedance => {
            missing.small_signal(solution);
            missing.part(solution, PartFigure::DifferentialResistance);
            missing.part(solution, PartFigure::CommonModeResistance);
        }
        F::GainAt
        | F::PhaseAt
        | F::Bandwidth
        | F::LowCutoff
        | F::Peaking
        | F::Crossover
        | F::PhaseMargin
        | F::GainMargin
        | F::SensitivityPeak
        | F::NaturalFrequency
        | F::Q
        | F::OutputImpedance
        | F::NoiseBandwidth
        | F::StageCmrrAt
        | F::StagePsrrAt => missing.small_signal(solution),
        F::OutputOffset | F::InputOffset | F::OffsetDrift | F::StageCmrr | F::StagePsrr => {
            missing.part(solution, PartFigure::OpenLoop);
        }
        F::RippleOutput => {
            missing.small_signal(solution);
            missing.supply(solution);
            if solution.model.stage.supply.is_some_and(|s| s.ripple.is_none()) {
                missing.need(Need::Ripple);
            }
        }
        F::OutputNoise | F::InputNoise | F::OutputNoisePeakToPeak => missing.integrated_noise(solution),
        F::Snr | F::SnrBits => {
            missing.integrated_noise(solution);
            missing.signal_frequency(solution);
            missing.amplitude(solution.model.stage.signal().into_iter());
        }
        F::Enob => {
            missing.integrated_noise(solution);
            missing.converter(solution, &[Need::FullScale, Need::Bits]);
        }
        F::AcquisitionError => {
            missing.small_signal(solution);
            missing.converter(solution, &[Need::FullScale, Need::SampleCapacitance, Need::AcquisitionTime]);
            for figure in [PartFigure::SlewRise, PartFigure::SlewFall, PartFigure::CurrentLimit] {
                missing.part(solution, figure);
            }
        }
        F::FullScaleMargin => {
            missing.signal_level(solution);
            missing.converter(solution, &[Need::FullScale]);
        }
        F::NoiseDensityAt => missing.noise(solution),
        F::ClipMargin | F::InputRangeMargin => {
            missing.signal_level(solution);
            missing.supply(solution);
        }
        F::CurrentMargin => {
            missing.signal_level(solution);
            missing.part(solution, PartFigure::CurrentLimit);
        }
        F::SlewMargin | F::FullPowerBandwidth => {
            let stage = solution.model.stage;
            let signals = if query.figure == F::SlewMargin { &stage.signals } else { stage.signals.get(..1).unwrap_or_default() };
            missing.amplitude(signals.iter().flatten().copied());
            missing.signal_level(solution);
            missing.part(solution, PartFigure::SlewRise);
            missing.part(solution, PartFigure::SlewFall);
        }
        F::Overshoot => missing.small_signal(solution),
        F::SettlingTime => {
            missing.small_signal(solution);
            missing.limits(solution);
        }
        F::SlewClipDistortion => {
            missing.signal_level(solution);
            missing.amplitude(solution.model.stage.signals.get(..1).unwrap_or_default().iter().flatten().copied());
            missing.limits(solution);
        }
        F::SupplyCurrent => missing.part(solution, PartFigure::SupplyCurrent),
        F::Dissipation | F::JunctionTemperature => {
            missing.supply(solution);
            missing.part(solution, PartFigure::SupplyCurrent);
            missing.signal_level(solution);
            if matches!(query.figure, F::JunctionTemperature) {
                missing.part(solution, PartFigure::JunctionToAmbient);
                missing.ambient(solution);
            }
        }
        F::ResistorDissipation => missing.signal_level(solution),
        F::StartupTime => {
            missing.small_signal(solution);
            missing.supply(solution);
            for figure in [PartFigure::SlewRise, PartFigure::SlewFall, PartFigure::Startup] {
                missing.part(solution, figure);
            }
        }
        F::ThresholdHigh | F::ThresholdLow | F::Hysteresis | F::ResponseTime | F::OutputHigh | F::OutputLow => {
            return Some(Outcome::DoesNotApply(switching::FOLLOWS));
        }
    }
    missing.outcome()
}

/// A figure in one build of a stage that lacks nothing for it (see [`lacking`]).
#[must_use]
pub fn value(solution: &Solution<'_>, query: Query) -> Outcome {
    use Figure as F;
    let stage = solution.model.stage;
    if stage.kind.switches() {
        return switching::value(solution, query.figure);
    }
    if let Some(unfit) = unfit(solution, query) {
        return unfit;
    }
    let (drive, amplifier) = (query.drive(stage).unwrap_or(0), query.amplifier());
    let margins = || amplifier.map_or_else(|| margins::margins(solution), |a| margins::of(solution, a));
    let value = match query.figure {
        F::Gain => rejection::gain(solution, drive),
        F::GainError => match stage.kind.ideal_gain(stage, drive) {
            Some(ideal) => rejection::gain(solution, drive) / ideal - 1.0,
            None => return Outcome::DoesNotApply("no closed form says what the supply should pass on"),
        },
        F::GainAtSignal => {
            let frequency = stage.signal().and_then(|s| s.frequency).unwrap_or(0.0);
            let sign = if rejection::gain(solution, drive) < 0.0 { -1.0 } else { 1.0 };
            sign * crate::solution::magnitude(rejection::transfer(solution, drive, solution.scaled(frequency)))
        }
        F::GainAt => crate::solution::magnitude(rejection::transfer(solution, drive, solution.scaled(query.at.unwrap_or(0.0)))),
        F::PhaseAt => {
            let h = rejection::transfer(solution, drive, solution.scaled(query.at.unwrap_or(0.0)));
            libm::atan2(h.im, h.re)
        }
        F::Bandwidth => response::edges(solution).bandwidth,
        F::LowCutoff => match response::edges(solution).low_cutoff {
            f if f > 0.0 => f,
            _ => return Outcome::DoesNotApply("the response reaches down to DC"),
        },
        F::Peaking => response::edges(solution).peaking,
        F::Crossover => match margins().crossover {
            Some(f) => f,
            None => return Outcome::DoesNotApply("the return ratio stays below one"),
        },
        F::PhaseMargin => match margins().phase {
            Some(m) if solution.oscillates() && m > 0.0 => return Outcome::Oscillates,
            Some(m) => m,
            None => return Outcome::DoesNotApply("the return ratio stays below one"),
        },
        F::GainMargin => {
            let margin = margins().gain;
            if solution.oscillates() && margin > 1.0 {
                return Outcome::Oscillates;
            }
            margin
        }
        F::SensitivityPeak => margins().sensitivity_peak,
        F::NaturalFrequency => match response::own_pair(solution) {
            Some((frequency, _)) => frequency,
            None => return Outcome::DoesNotApply("all poles are real"),
        },
        F::Q => match response::own_pair(solution) {
            Some((_, q)) => q,
            None => return Outcome::DoesNotApply("all poles are real"),
        },
        F::InputImpedance => response::input_impedance(solution),
        F::OutputImpedance => response::output_impedance(solution),
        F::GainDrift => response::gain_drift(solution),
        F::NoiseBandwidth => noise::noise_bandwidth(solution),
        F::OutputOffset => return dc::budget(solution).total.clone(),
        F::InputOffset => return scaled(&dc::budget(solution).total, 1.0 / response::reference(solution).gain.abs()),
        F::OffsetDrift => return dc::budget(solution).drift.clone(),
        F::StageCmrr | F::StageCmrrAt => return rejection::stage_cmrr(solution, query.at.unwrap_or(0.0)),
        F::StagePsrr | F::StagePsrrAt => return rejection::stage_psrr(solution, query.at.unwrap_or(0.0)),
        F::RippleOutput => return rejection::ripple_output(solution),
        F::OutputNoise | F::InputNoise | F::OutputNoisePeakToPeak | F::Snr | F::SnrBits => {
            let Some(rms) = noise::integrated(solution) else { return Outcome::DoesNotApply("the band's edges are the same") };
            match query.figure {
                F::InputNoise => rms / response::reference(solution).gain.abs(),
                F::OutputNoisePeakToPeak => noise::PEAK_TO_PEAK * rms,
                F::Snr => noise::signal_rms(solution) / rms,
                F::SnrBits => noise::bits(noise::signal_rms(solution) / rms),
                _ => rms,
            }
        }
        F::NoiseDensityAt => noise::density(solution, query.at.unwrap_or(0.0)),
        F::Enob => return converter::enob(solution),
        F::AcquisitionError => return converter::acquisition_error(solution),
        F::FullScaleMargin => return converter::full_scale_margin(solution),
        F::ClipMargin => return swing::clip_margin(solution, amplifier),
        F::InputRangeMargin => return swing::input_range_margin(solution, amplifier),
        F::CurrentMargin => return swing::current_margin(solution, amplifier),
        F::SlewMargin => return swing::slew_margin(solution, amplifier),
        F::FullPowerBandwidth => return swing::full_power_bandwidth(solution, amplifier),
        F::Overshoot => return waveform::figures::overshoot(solution),
        F::SettlingTime => {
            let (error, step) = (query.at.unwrap_or(0.0), query.step.unwrap_or(0.0));
            return waveform::figures::settling_time(solution, waveform::figures::Settling { error, step });
        }
        F::SlewClipDistortion => return waveform::figures::slew_clip_distortion(solution),
        F::SupplyCurrent => return thermal::power(solution).supply_current.clone(),
        F::Dissipation => return thermal::hottest(solution, amplifier, |p| &p.dissipation),
        F::JunctionTemperature => return thermal::hottest(solution, amplifier, |p| &p.junction),
        F::StartupTime => return startup::startup_time(solution),
        F::ResistorDissipation => match thermal::hottest_resistor(solution) {
            Some((_, power)) => power,
            None => return Outcome::DoesNotApply("the stage has no resistor"),
        },
        F::ThresholdHigh | F::ThresholdLow | F::Hysteresis | F::ResponseTime | F::OutputHigh | F::OutputLow => {
            return Outcome::DoesNotApply(switching::FOLLOWS);
        }
    };
    if value.is_nan() { Outcome::DoesNotApply("the values leave the range in which it can be computed") } else { Outcome::Value(value) }
}

/// Why a build has no value for a figure that otherwise has one, if it has none: no operating point, or it oscillates.
#[must_use]
pub fn unfit(solution: &Solution<'_>, query: Query) -> Option<Outcome> {
    use Figure as F;
    if let Some(terminal) = solution.no_dc_path() {
        return Some(Outcome::NoDcPath(terminal));
    }
    let judged_by_roots = !matches!(query.figure, F::Crossover | F::PhaseMargin | F::GainMargin);
    (judged_by_roots && solution.model.small_signal && solution.oscillates()).then_some(Outcome::Oscillates)
}

/// Whether a figure follows from the network at DC alone, so that no capacitance and no gain-bandwidth product reaches it. (They do
/// where the heat that a signal makes drives a bias current.)
#[must_use]
pub fn at_dc(solution: &Solution<'_>, figure: Figure) -> bool {
    use Figure as F;
    let stage = solution.model.stage;
    // Where a group of nodes floats, capacitances divide what is steady; a comparator's response is no matter of DC.
    if solution.model.floating.islands > 0 || stage.kind.switches() {
        return false;
    }
    let steady = || response::steady(solution);
    let warmed = || {
        (0..solution.amplifiers()).any(|a| solution.part_of(a, PartFigure::BiasDoubling).is_some())
            && stage.signals.iter().flatten().any(|s| s.peak > 0.0)
    };
    match figure {
        F::Gain | F::GainError | F::GainDrift | F::StageCmrr | F::StagePsrr => steady(),
        F::OutputOffset | F::OffsetDrift => !warmed(),
        F::InputOffset => steady() && !warmed(),
        F::GainAtSignal
        | F::GainAt
        | F::PhaseAt
        | F::Bandwidth
        | F::LowCutoff
        | F::Peaking
        | F::Crossover
        | F::PhaseMargin
        | F::GainMargin
        | F::SensitivityPeak
        | F::NaturalFrequency
        | F::Q
        | F::InputImpedance
        | F::OutputImpedance
        | F::NoiseBandwidth
        | F::StageCmrrAt
        | F::StagePsrrAt
        | F::RippleOutput
        | F::OutputNoise
        | F::InputNoise
        | F::OutputNoisePeakToPeak
        | F::NoiseDensityAt
        | F::Snr
        | F::SnrBits
        | F::Enob
        | F::AcquisitionError
        | F::FullScaleMargin
        | F::ClipMargin
        | F::InputRangeMargin
        | F::CurrentMargin
        | F::SlewMargin
        | F::FullPowerBandwidth
        | F::SupplyCurrent
        | F::Dissipation
        | F::JunctionTemperature
        | F::ResistorDissipation
        | F::StartupTime
        | F::ThresholdHigh
        | F::ThresholdLow
        | F::Hysteresis
        | F::ResponseTime
        | F::OutputHigh
        | F::OutputLow
        | F::Overshoot
        | F::SettlingTime
        | F::SlewClipDistortion => false,
    }
}

/// A value outcome scaled; others pass through.
#[must_use]
pub fn scaled(outcome: &Outcome, factor: f64) -> Outcome {
    match outcome {
        Outcome::Value(v) => Outcome::Value(v * factor),
        other => other.clone(),
    }
}

/// What the small-signal figures lack, if anything.
#[must_use]
pub fn missing_small_signal(solution: &Solution<'_>) -> Option<Outcome> {
    let mut missing = Missing::default();
    missing.small_signal(solution);
    missing.outcome()
}

/// Collects what a figure lacks.
#[derive(Debug, Default)]
pub struct Missing(Vec<Need>);

impl Missing {
    /// Needs this.
    pub fn need(&mut self, need: Need) {
        if !self.0.contains(&need) {
            self.0.push(need);
        }
    }

    /// Needs a figure of every amplifier's part.
    pub fn part(&mut self, solution: &Solution<'_>, figure: PartFigure) {
        if (0..solution.amplifiers()).any(|a| solution.part_of(a, figure).is_none()) {
            self.need(Need::Part(figure));
        }
    }

    /// Needs all that response and loop depend on.
    pub fn small_signal(&mut self, solution: &Solution<'_>) {
        for figure in crate::model::SMALL_SIGNAL {
            self.part(solution, figure);
        }
        if solution.model.poles.iter().any(Option::is_none) {
            self.need(Need::Poles);
        }
    }

    /// Needs all that the noise density depends on.
    pub fn noise(&mut self, solution: &Solution<'_>) {
        self.small_signal(solution);
        self.part(solution, PartFigure::NoiseVoltage);
        self.part(solution, PartFigure::NoiseVoltageCorner);
        if (0..solution.amplifiers()).any(|a| noise::current_noise_counts(solution, a)) {
            self.part(solution, PartFigure::NoiseCurrent);
            self.part(solution, PartFigure::NoiseCurrentCorner);
        }
        self.ambient(solution);
    }

    /// Needs all that integrated noise depends on.
    pub fn integrated_noise(&mut self, solution: &Solution<'_>) {
        self.noise(solution);
        if solution.model.stage.band.is_none() {
            self.need(Need::Band);
        }
    }

    /// Needs the ambient temperature.
    pub fn ambient(&mut self, solution: &Solution<'_>) {
        if solution.model.parameters.temperature().is_none() {
            self.need(Need::Ambient);
        }
    }

    /// Needs the supplies.
    pub fn supply(&mut self, solution: &Solution<'_>) {
        if solution.model.parameters.supply().is_none() {
            self.need(Need::Supply);
        }
    }

    /// Needs all that bounds an output: slew rate, current limit, rails.
    pub fn limits(&mut self, solution: &Solution<'_>) {
        for figure in [PartFigure::SlewRise, PartFigure::SlewFall, PartFigure::CurrentLimit] {
            self.part(solution, figure);
        }
        self.supply(solution);
        for amplifier in 0..solution.amplifiers() {
            let part = solution.model.stage.part_of(amplifier);
            if part.headroom_high.is_empty() {
                self.need(Need::HeadroomHigh);
            }
            if part.headroom_low.is_empty() {
                self.need(Need::HeadroomLow);
            }
        }
    }

    /// Needs the signal's frequency.
    pub fn signal_frequency(&mut self, solution: &Solution<'_>) {
        match solution.model.stage.signal() {
            None => self.need(Need::Signal),
            Some(signal) if signal.frequency.is_none() => self.need(Need::SignalFrequency),
            Some(_) => {}
        }
    }

    /// Needs the signal and all that carries it to the pins.
    pub fn signal_level(&mut self, solution: &Solution<'_>) {
        self.small_signal(solution);
        match solution.model.stage.signal() {
            None => self.need(Need::Signal),
            Some(signal) if signal.peak > 0.0 && signal.frequency.is_none() => self.need(Need::SignalFrequency),
            Some(_) => {}
        }
    }

    /// Needs what the converter's table may leave out.
    pub fn converter(&mut self, solution: &Solution<'_>, needs: &[Need]) {
        let converter = &solution.model.stage.converter;
        for &need in needs {
            let stated = match need {
                Need::FullScale => converter.full_scale.is_some(),
                Need::Bits => converter.bits.is_some(),
                Need::SampleCapacitance => converter.sample_capacitance.is_some(),
                Need::AcquisitionTime => converter.acquisition_time.is_some(),
                _ => true,
            };
            if !stated {
                self.need(need);
            }
        }
    }

    /// Needs an amplitude of one of the signals: what is stated at DC alone has none.
    pub fn amplitude(&mut self, mut signals: impl Iterator<Item = Signal>) {
        if let Some(first) = signals.next()
            && first.peak <= 0.0
            && signals.all(|s| s.peak <= 0.0)
        {
            self.need(Need::SignalAmplitude);
        }
    }

    /// What the needs amount to.
    #[must_use]
    pub fn outcome(self) -> Option<Outcome> {
        (!self.0.is_empty()).then_some(Outcome::Undetermined(self.0))
    }
}
