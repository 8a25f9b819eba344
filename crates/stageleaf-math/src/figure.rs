//! The figures that a stage is judged by: stable ids, the same in limits, prose, JSON and code.

use crate::{
    dimension::Dimension,
    kind::{Drives, Kind},
    stage::Stage,
};

macro_rules! figures {
    ($($name:ident $id:literal $dimension:ident $argument:ident $group:ident $title:literal, $meaning:literal;)*) => {
        /// A figure of a stage.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub enum Figure { $(#[doc = $meaning] $name,)* }

        impl Figure {
            /// Every figure, in the order in which reports list them.
            pub const ALL: &'static [Self] = &[$(Self::$name,)*];

            /// The stable id: in limits, prose, JSON.
            #[must_use]
            pub const fn id(self) -> &'static str { match self { $(Self::$name => $id,)* } }

            /// What the number measures.
            #[must_use]
            pub const fn dimension(self) -> Dimension { match self { $(Self::$name => Dimension::$dimension,)* } }

            /// What must be stated beside the id.
            #[must_use]
            pub const fn argument(self) -> Argument { match self { $(Self::$name => Argument::$argument,)* } }

            /// The group under which reports list it.
            #[must_use]
            pub const fn group(self) -> Group { match self { $(Self::$name => Group::$group,)* } }

            /// A short title, as an engineer would head a column.
            #[must_use]
            pub const fn title(self) -> &'static str { match self { $(Self::$name => $title,)* } }

            /// The meaning in one sentence.
            #[must_use]
            pub const fn meaning(self) -> &'static str { match self { $(Self::$name => $meaning,)* } }
        }
    };
}

/// What stands beside a figure's id.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Argument {
    /// Nothing: `bandwidth`.
    None,
    /// A frequency: `gain_at 20 kHz`.
    Frequency,
    /// An error and a step: `settling_time to 0.1 % after 1 V`.
    Settling,
}

/// Groups of figures, as reports list them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Group {
    /// Linear response and loop.
    SmallSignal,
    /// Offsets and drifts.
    Dc,
    /// Densities, totals, ratios.
    Noise,
    /// Swing, range, current, slew.
    LargeSignal,
    /// Supply current, dissipation, temperature.
    Power,
    /// What happens after switching on.
    Starting,
    /// Thresholds, levels and times of a comparator.
    Switching,
}

figures! {
    Gain "gain" Gain None SmallSignal "Gain", "Signed transfer from the signal source to the load at the kind's pass-band reference (DC for DC-coupled kinds); of several inputs the first unless another is named.";
    GainError "gain_error" Fraction None SmallSignal "Gain error", "Relative difference of `gain` from the ideal closed form with the nominal components.";
    GainAtSignal "gain_at_signal" Gain None SmallSignal "Gain at the signal frequency", "Magnitude of the transfer at the signal's highest frequency, with the sign of `gain`.";
    GainAt "gain_at" Gain Frequency SmallSignal "Gain at", "Magnitude of the transfer at a stated frequency.";
    PhaseAt "phase_at" Angle Frequency SmallSignal "Phase at", "Phase of the output against the source at a stated frequency, between −π and π.";
    Bandwidth "bandwidth" Frequency None SmallSignal "Bandwidth (−3 dB)", "Lowest frequency at which the transfer has fallen to 1/√2 of `gain`.";
    LowCutoff "low_cutoff" Frequency None SmallSignal "Low cutoff (−3 dB)", "Highest frequency below the pass band at which the transfer has fallen to 1/√2 of `gain`.";
    Peaking "peaking" Level None SmallSignal "Peaking", "Largest magnitude of the transfer over frequency, relative to `gain`.";
    Crossover "crossover" Frequency None SmallSignal "Loop crossover", "Frequency at which the return ratio's magnitude is one; of several, the one with the least phase margin.";
    PhaseMargin "phase_margin" Angle None SmallSignal "Phase margin", "Angle between the return ratio at crossover and −180°; of several crossings the one nearest to −180° in angle.";
    GainMargin "gain_margin" Level None SmallSignal "Gain margin", "Factor by which the return ratio may grow before it reaches −1; least over all −180° crossings.";
    SensitivityPeak "sensitivity_peak" Number None SmallSignal "Sensitivity peak", "Largest |1/(1+T)| over frequency: the reciprocal of the return ratio's distance from −1.";
    NaturalFrequency "natural_frequency" Frequency None SmallSignal "Natural frequency", "Magnitude of the least damped complex pole pair; of a filter, of its own pair.";
    Q "q" Number None SmallSignal "Q", "Quality factor of the least damped complex pole pair; of a filter, of its own pair.";
    InputImpedance "input_impedance" Resistance None SmallSignal "Input impedance at the signal", "Magnitude of the impedance that the source sees behind its own impedance, at the signal frequency or at DC where none is stated.";
    OutputImpedance "output_impedance" Resistance None SmallSignal "Output impedance at the signal", "Magnitude of the impedance at the output terminal with the load removed, at the signal frequency or at DC where none is stated.";
    OutputOffset "output_offset" Voltage None Dc "Output offset", "Worst-case sum of the DC errors at the output with the signal at its DC value.";
    InputOffset "input_offset" Voltage None Dc "Offset referred to the input", "`output_offset` divided by |gain|.";
    OffsetDrift "offset_drift" VoltageDrift None Dc "Output offset drift", "Drift of the output offset with temperature.";
    GainDrift "gain_drift" FractionDrift None Dc "Gain drift", "Largest relative change of gain per kelvin from the components' temperature coefficients.";
    StageCmrr "stage_cmrr" Level None Dc "Common-mode rejection of the stage", "Gain of the difference over gain of the common mode at DC, the amplifiers' own rejection added to the resistors' mismatch.";
    StageCmrrAt "stage_cmrr_at" Level Frequency Dc "Common-mode rejection of the stage at", "The same as `stage_cmrr` at a stated frequency.";
    StagePsrr "stage_psrr" Level None Dc "Supply rejection of the stage", "Change of a supply over the change that it makes at the output referred to the input, at DC; the worse of the two rails.";
    StagePsrrAt "stage_psrr_at" Level Frequency Dc "Supply rejection of the stage at", "The same as `stage_psrr` at a stated frequency, referred to the input by the gain of the pass band.";
    RippleOutput "ripple_output" Voltage None Dc "Supply ripple at the output", "Peak of what the stated ripple of the supplies leaves at the output, both rails added; none on a rail that is the stage's ground.";
    OutputNoise "output_noise" Voltage None Noise "Output noise, rms", "Rms noise at the output integrated over the stated band.";
    InputNoise "input_noise" Voltage None Noise "Noise referred to the input, rms", "`output_noise` divided by |gain|.";
    OutputNoisePeakToPeak "output_noise_peak_to_peak" Voltage None Noise "Output noise, peak to peak (6.6 × rms)", "6.6 × `output_noise`: exceeded 0.1 % of the time by Gaussian noise.";
    NoiseDensityAt "noise_density_at" VoltageDensity Frequency Noise "Output noise density at", "One-sided noise density at the output at a stated frequency.";
    NoiseBandwidth "noise_bandwidth" Frequency None Noise "Noise bandwidth", "Width of the rectangle of height |gain|² with the transfer's area over all frequencies.";
    Snr "snr" Level None Noise "Signal to noise", "Rms of the signal at the output over `output_noise`.";
    SnrBits "snr_bits" Bits None Noise "Signal to noise in bits", "(SNR in dB − 1.76)/6.02, with exact constants.";
    Enob "enob" Bits None Noise "Effective bits", "Bits of an ideal converter with the same error at full scale: noise over the stated band, the converter's own where it is stated, and quantisation.";
    AcquisitionError "acquisition_error" Voltage None Noise "Acquisition error", "Largest error at the converter's sampling capacitor from the end of the acquisition time on, after a kick of the whole input range.";
    ClipMargin "clip_margin" Voltage None LargeSignal "Clip margin", "Room between the output pin's extreme and the limit set by rail and headroom at that output current.";
    FullScaleMargin "full_scale_margin" Voltage None LargeSignal "Full-scale margin", "Room between the extremes of the voltage at the converter's input, output offset included, and the ends of its input range.";
    InputRangeMargin "input_range_margin" Voltage None LargeSignal "Input range margin", "Room between both inputs' extremes and the input range.";
    CurrentMargin "current_margin" Current None LargeSignal "Output current margin", "Current limit less the peak output current.";
    SlewMargin "slew_margin" Number None LargeSignal "Slew margin", "Slew available over slew needed.";
    FullPowerBandwidth "full_power_bandwidth" Frequency None LargeSignal "Full-power bandwidth", "Highest frequency at which the stated output amplitude stays within slew, current and rails.";
    Overshoot "overshoot" Fraction None LargeSignal "Overshoot of a small step", "How far the response to a step goes beyond its final value, over the step; without slew, rails and current limit.";
    SettlingTime "settling_time" Time Settling LargeSignal "Settling time", "Time from a step of the input, which moves the output by the stated step around the signal's steady value, until the output stays within the stated error; the longer one of both directions, slew, rails and current limit included.";
    SlewClipDistortion "slew_clip_distortion" Fraction None LargeSignal "Distortion by slew and clip (lower bound)", "Harmonics that slew rate, rails and current limit add to the stated sine, rms over the fundamental's; a lower bound.";
    SupplyCurrent "supply_current" Current None Power "Supply current", "Quiescent current plus the mean of what the load draws from the positive supply.";
    Dissipation "dissipation" Power None Power "Dissipation", "Power turned to heat in the amplifier's package, at the worst amplitude up to the stated signal and within the output current limit; of several packages the hottest.";
    JunctionTemperature "junction_temperature" Temperature None Power "Junction temperature", "Ambient plus heat times the thermal resistance, the heat of bias currents that double with temperature included; of several packages the hottest.";
    ResistorDissipation "resistor_dissipation" Power None Power "Resistor dissipation", "Largest power in any one resistor of the stage.";
    StartupTime "startup_time" Time None Starting "Start-up time (to 1 %)", "Time from switching on, with empty capacitors, until the output stays within 1 % of its final steady value; the part's own start-up time included.";
    ThresholdHigh "threshold_high" Voltage None Switching "Upper threshold", "Voltage of the signal's source at which the output switches while the signal rises.";
    ThresholdLow "threshold_low" Voltage None Switching "Lower threshold", "Voltage of the signal's source at which the output switches while the signal falls.";
    Hysteresis "hysteresis" Voltage None Switching "Hysteresis", "`threshold_high` less `threshold_low`.";
    ResponseTime "response_time" Time None Switching "Response time", "Overload recovery and the slew of the output from one level to the other, in the slower direction.";
    OutputHigh "output_high" Voltage None Switching "High output level", "Lowest voltage at the load while the output is high, over the signal's range.";
    OutputLow "output_low" Voltage None Switching "Low output level", "Highest voltage at the load while the output is low, over the signal's range.";
}

impl Figure {
    /// What it may be narrowed to.
    #[must_use]
    pub const fn scope(self) -> Scope {
        match self {
            Self::Gain | Self::GainError | Self::GainAtSignal | Self::GainAt | Self::PhaseAt => Scope::Input,
            Self::Crossover
            | Self::PhaseMargin
            | Self::GainMargin
            | Self::SensitivityPeak
            | Self::ClipMargin
            | Self::InputRangeMargin
            | Self::CurrentMargin
            | Self::SlewMargin
            | Self::FullPowerBandwidth
            | Self::Dissipation
            | Self::JunctionTemperature => Scope::Amplifier,
            Self::Bandwidth
            | Self::LowCutoff
            | Self::Peaking
            | Self::NaturalFrequency
            | Self::Q
            | Self::InputImpedance
            | Self::OutputImpedance
            | Self::OutputOffset
            | Self::InputOffset
            | Self::OffsetDrift
            | Self::GainDrift
            | Self::StageCmrr
            | Self::StageCmrrAt
            | Self::StagePsrr
            | Self::StagePsrrAt
            | Self::Overshoot
            | Self::SettlingTime
            | Self::SlewClipDistortion
            | Self::RippleOutput
            | Self::OutputNoise
            | Self::InputNoise
            | Self::OutputNoisePeakToPeak
            | Self::NoiseDensityAt
            | Self::NoiseBandwidth
            | Self::Snr
            | Self::SnrBits
            | Self::SupplyCurrent
            | Self::Enob
            | Self::AcquisitionError
            | Self::FullScaleMargin
            | Self::StartupTime
            | Self::ResistorDissipation
            | Self::ThresholdHigh
            | Self::ThresholdLow
            | Self::Hysteresis
            | Self::ResponseTime
            | Self::OutputHigh
            | Self::OutputLow => Scope::Stage,
        }
    }

    /// What the number measures on a kind of stage: a transimpedance stage's gain is in Ω, and what is referred to its input in A.
    #[must_use]
    pub const fn dimension_in(self, kind: Kind) -> Dimension {
        let gain = kind.spec().gain;
        match (self, gain) {
            (Self::Gain | Self::GainAtSignal | Self::GainAt, _) => gain,
            (Self::InputOffset | Self::InputNoise, Dimension::Resistance) => Dimension::Current,
            (Self::InputOffset | Self::InputNoise, Dimension::VoltsPerCoulomb) => Dimension::Charge,
            _ => self.dimension(),
        }
    }

    /// Whether it is of a converter behind the stage: listed where there is one, or where a limit asks.
    #[must_use]
    pub const fn is_of_converter(self) -> bool {
        matches!(self, Self::Enob | Self::AcquisitionError | Self::FullScaleMargin)
    }
}

/// A figure with its argument, as a limit or a prose quote names it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Query {
    /// The figure.
    pub figure: Figure,
    /// Its argument: a frequency in Hz, or for [`Argument::Settling`] the error as a fraction of the step.
    pub at: Option<f64>,
    /// The step at the output in V, for [`Argument::Settling`].
    pub step: Option<f64>,
    /// Which amplifier's it is, or from which input, where not all of the stage is meant (see [`Figure::scope`]).
    pub of: Option<Of>,
}

/// What a figure can be taken of, within a stage.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Of {
    /// An amplifier, numbered from 1: `phase_margin of A2`.
    Amplifier(u8),
    /// The transfer from an input other than the first, by its name: `gain from in2`, `gain from reference`.
    Input(&'static str),
}

/// What a figure may be narrowed to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Scope {
    /// Nothing: it is the stage's.
    Stage,
    /// One amplifier; without it, the worst of them.
    Amplifier,
    /// One input; without it, the first.
    Input,
}

impl Of {
    /// Every input that a kind may have.
    pub const INPUTS: &'static [&'static str] = &["in1", "in2", "in3", "in4", "in5", "in6", "in7", "in8", "reference", "supply"];
}

impl Query {
    /// A figure without an argument.
    #[must_use]
    pub const fn of(figure: Figure) -> Self {
        Self { figure, at: None, step: None, of: None }
    }

    /// A figure at a frequency in Hz.
    #[must_use]
    pub const fn at(figure: Figure, hertz: f64) -> Self {
        Self { figure, at: Some(hertz), step: None, of: None }
    }

    /// The settling time to an error, as a fraction, after a step of the output in V.
    #[must_use]
    pub const fn settling(error: f64, step: f64) -> Self {
        Self { figure: Figure::SettlingTime, at: Some(error), step: Some(step), of: None }
    }

    /// Whether the value is only a lower bound, since what the model leaves out would add to it: it can break a limit, and never makes
    /// one hold. A settling time is one where the error is below 0.01 %: there dielectric absorption and thermal tails count (common
    /// practice, no source).
    #[must_use]
    pub fn is_lower_bound(self) -> bool {
        match self.figure {
            Figure::SlewClipDistortion => true,
            Figure::SettlingTime => self.at.is_some_and(|error| error < 0.999e-4),
            _ => false,
        }
    }

    /// The same of an amplifier, numbered from 1.
    #[must_use]
    pub const fn of_amplifier(self, number: u8) -> Self {
        Self { of: Some(Of::Amplifier(number)), ..self }
    }

    /// The same from an input.
    #[must_use]
    pub const fn from_input(self, name: &'static str) -> Self {
        Self { of: Some(Of::Input(name)), ..self }
    }

    /// The amplifier that is meant, from 0, if one is.
    #[must_use]
    pub fn amplifier(self) -> Option<usize> {
        match self.of {
            Some(Of::Amplifier(number)) => usize::from(number).checked_sub(1),
            Some(Of::Input(_)) | None => None,
        }
    }

    /// The drive that is meant, from 0; the first where none is named, `None` where the stage has no such input.
    #[must_use]
    pub fn drive(self, stage: &Stage) -> Option<usize> {
        match self.of {
            Some(Of::Input(name)) => (stage.kind.spec().inputs)(stage)
                .iter()
                .position(|input| input.name == name)
                .filter(|_| matches!(stage.kind.spec().drives, Drives::Each)),
            Some(Of::Amplifier(_)) | None => Some(0),
        }
    }

    /// Whether the stage has what is named.
    #[must_use]
    pub fn exists_in(self, stage: &Stage) -> bool {
        match self.of {
            Some(Of::Amplifier(number)) => (1..=stage.kind.spec().amplifiers).contains(&usize::from(number)),
            Some(Of::Input(_)) => self.drive(stage).is_some(),
            None => true,
        }
    }
}
