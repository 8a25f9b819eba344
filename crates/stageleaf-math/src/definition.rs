//! How each figure is computed from the network, in the field's notation, with the source; and what no figure knows about.

use crate::figure::{Figure, Group};

/// How a figure is computed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Definition {
    /// The formula that the network is asked, in the field's notation.
    pub formula: &'static str,
    /// Where it comes from.
    pub source: &'static str,
}

const NODAL: &str = "modified nodal analysis: C.-W. Ho, A. Ruehli, P. Brennan, IEEE Trans. Circuits and Systems 22 (1975), from memory";
const STATE: &str = "state equations from a tree of capacitors: E. S. Kuh, R. A. Rohrer, Proc. IEEE 53 (1965), from memory; stepped by the matrix exponential";
const RATIO: &str = "return ratio: H. W. Bode, Network Analysis and Feedback Amplifier Design (1945), from memory";
const NOISE: &str = "adjoint network: R. Rohrer, L. Nagel, R. Meyer, L. Weber, IEEE J. Solid-State Circuits 6 (1971), from memory";
const KIRCHHOFF: &str = "Kirchhoff's laws for the network at rest, derived here";
const COMMON: &str = "common practice, no source";
const MEAN: &str = "class-B output stage: A. Sedra, K. Smith, Microelectronic Circuits, output stages, from memory";
const CONVERTER: &str = "the relation of a full-scale sine to an ideal converter's quantisation, as in IEEE Std 1241, from memory";

impl Figure {
    /// How it is computed. `H` is the transfer from the signal source to the load, `T` the return ratio, `S` a density.
    #[must_use]
    pub const fn definition(self) -> Definition {
        let (formula, source) = match self {
            Self::Gain => ("G = Re H(j2πf_ref), DC unless the kind says otherwise", NODAL),
            Self::GainError => ("ε = G/G_ideal − 1", "definition"),
            Self::GainAtSignal => ("G = sign(G_ref)·|H(j2πf_signal)|", NODAL),
            Self::GainAt => ("G = |H(j2πf)|", NODAL),
            Self::PhaseAt => ("φ = ∠H(j2πf)", NODAL),
            Self::Bandwidth => ("|H(j2πf)| = |G|/√2, least f above the reference", NODAL),
            Self::LowCutoff => ("|H(j2πf)| = |G|/√2, greatest f below the reference", NODAL),
            Self::Peaking => ("Mp = max |H(j2πf)|/|G|", NODAL),
            Self::Crossover => ("|T(j2πf_c)| = 1", RATIO),
            Self::PhaseMargin => ("PM = 180° + ∠T(j2πf_c)", RATIO),
            Self::GainMargin => ("GM = 1/|T(j2πf)| where ∠T = −180°", RATIO),
            Self::SensitivityPeak => ("Ms = max |1/(1 + T(j2πf))|", RATIO),
            Self::NaturalFrequency => ("f_n = |p|/2π of the pole pair p", NODAL),
            Self::Q => ("Q = |p|/(−2·Re p) of the pole pair p", NODAL),
            Self::InputImpedance => ("|Z| = |V/I| at the input, behind the source's impedance", NODAL),
            Self::OutputImpedance => ("|Z| = |V/I| at the load's node, the load removed, the source quiet", NODAL),
            Self::OutputOffset => ("V = Σ |∂V_out/∂e|·|e| over all DC errors e", NODAL),
            Self::InputOffset => ("V_in = V_out/|G|", "definition"),
            Self::OffsetDrift => ("dV/dT = Σ |∂V_out/∂e|·|de/dT| over all DC errors e", NODAL),
            Self::GainDrift => ("TC = Σ |∂ln G/∂ln x|·|TC_x| over all components x", NODAL),
            Self::StageCmrr => ("CMRR = |G|/|G_cm| at DC", NODAL),
            Self::StageCmrrAt => ("CMRR = |H(j2πf)|/|H_cm(j2πf)|", NODAL),
            Self::StagePsrrAt => ("PSRR = |H(j2πf)|/|H_s(j2πf)|, the worse rail s", NODAL),
            Self::StagePsrr => ("PSRR = |ΔV_s·G/ΔV_out| at DC, the worse rail", NODAL),
            Self::RippleOutput => ("V = Σ |H_s(j2πf)|·V_ripple over both rails s", NODAL),
            Self::OutputNoise => ("v = √∫S(f)df over the band", NOISE),
            Self::InputNoise => ("v_in = v_out/|G|", "definition"),
            Self::OutputNoisePeakToPeak => ("v_pp = 6.6·v, exceeded 0.1 % of the time", COMMON),
            Self::NoiseDensityAt => ("e = √S(f), S = Σ |H_k(j2πf)|²·S_k over all sources k", NOISE),
            Self::NoiseBandwidth => ("B = ∫|H(j2πf)|²df/|G|²", NOISE),
            Self::Snr => ("SNR = V_rms/v over the band", "definition"),
            Self::SnrBits => ("N = (SNR − 1.76 dB)/6.02 dB", CONVERTER),
            Self::Enob => ("N = log2(FS/√(12·(v² + v_converter² + LSB²/12)))", CONVERTER),
            Self::AcquisitionError => ("E = max |e(t)| from the acquisition time on, e = FS·Cs·L⁻¹{Z(s)} with Cs in the network", NODAL),
            Self::FullScaleMargin => ("room = end of the range − V at the converter's input − offset, least over the period", NODAL),
            Self::ClipMargin => ("room = rail − headroom(I) − V at the pin, least over the period and both rails", NODAL),
            Self::InputRangeMargin => ("room = bound − V at both inputs, least over the period", NODAL),
            Self::CurrentMargin => ("ΔI = I_limit − |I| at the pin, I = V·(Y_load + Y_feedback)", NODAL),
            Self::SlewMargin => ("SR_available/max |dV/dt| at the pin", COMMON),
            Self::FullPowerBandwidth => ("f at which slew, current or a rail first bounds the stated amplitude", COMMON),
            Self::Overshoot => ("(max v − v∞)/(v∞ − v0) of the linear step response", STATE),
            Self::SettlingTime => ("t after which |v − v∞| ≤ ε·step, slew, rails and current limit in v(t)", STATE),
            Self::SlewClipDistortion => {
                ("THD = √(Σ V_k², k ≥ 2)/V_1 of the period that repeats itself, slew, rails and current limit in v(t)", STATE)
            }
            Self::SupplyCurrent => ("I = I_q + ⟨I⁺⟩ from the positive rail", MEAN),
            Self::Dissipation => ("P = (V₊ − V₋)·I_q + V₊·⟨I⁺⟩ − V₋·⟨I⁻⟩ − ⟨V·I⟩, worst amplitude", MEAN),
            Self::JunctionTemperature => ("T_j = T_a + θ·P", "JEDEC JESD51-2, the definition of θ, from memory"),
            Self::StartupTime => ("t = t_part + t_slew + last t at which |v(t) − v(∞)| = |v(∞)|/100, v(t) = v(∞) + Σ a·exp(p·t)", NODAL),
            Self::ThresholdHigh => ("V_in at which V_e + V⁺ − V⁻ = (V_o + I·R_o − V_m)/A0, the signal rising", KIRCHHOFF),
            Self::ThresholdLow => ("V_in at which V_e + V⁺ − V⁻ = (V_o + I·R_o − V_m)/A0, the signal falling", KIRCHHOFF),
            Self::Hysteresis => ("V_hys = V_TH − V_TL", "definition"),
            Self::ResponseTime => ("t = t_recovery + |ΔV_o|/min(SR, (I_limit − |I|)/C_L), the slower way", COMMON),
            Self::OutputHigh => ("V_o = V₊ − headroom(I) at the pin, carried to the load, the least", KIRCHHOFF),
            Self::OutputLow => ("V_o = V₋ + headroom(−I) at the pin, carried to the load, the greatest", KIRCHHOFF),
            Self::ResistorDissipation => ("P = (V_rms² + V_dc²)/R, the greatest", "definition"),
        };
        Definition { formula, source }
    }
}

/// Something that the model leaves out, and the groups of figures that it could move.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Omission {
    /// In the field's words.
    pub what: &'static str,
    /// Groups of figures.
    pub moves: &'static [Group],
}

use Group as G;

/// What no figure knows about, as the README, the sheet and `explain` say it.
pub const NOT_MODELLED: &[Omission] = &[
    Omission { what: "RF rectification", moves: &[G::Dc, G::Switching] },
    Omission { what: "layout coupling", moves: &[G::SmallSignal, G::Noise, G::Switching] },
    Omission { what: "thermal gradients", moves: &[G::Dc, G::Power, G::Switching] },
    Omission { what: "long lines", moves: &[G::SmallSignal, G::LargeSignal] },
    Omission { what: "output-stage crossover distortion", moves: &[G::LargeSignal] },
    Omission { what: "boosted slew", moves: &[G::LargeSignal, G::Switching] },
    Omission { what: "capacitor voltage coefficient", moves: &[G::SmallSignal, G::LargeSignal] },
    Omission { what: "dielectric absorption", moves: &[G::Dc, G::LargeSignal, G::Starting] },
    Omission { what: "crosstalk within a package", moves: &[G::SmallSignal, G::Noise] },
    Omission { what: "nonlinearity and aliasing of a converter", moves: &[G::Noise] },
    Omission { what: "phase reversal (a caution only)", moves: &[G::LargeSignal, G::Switching] },
    Omission { what: "ageing", moves: &[G::SmallSignal, G::Dc, G::Switching] },
    Omission { what: "radiation", moves: &[G::SmallSignal, G::Dc, G::Noise, G::Power, G::Switching] },
    Omission { what: "latch-up", moves: &[G::LargeSignal, G::Power, G::Starting] },
];

/// What could move a figure of this group and is not modelled.
pub fn not_modelled_for(group: Group) -> impl Iterator<Item = &'static str> {
    NOT_MODELLED.iter().filter(move |o| o.moves.contains(&group)).map(|o| o.what)
}
