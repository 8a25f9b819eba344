//! What a number measures. Text (prefixes, dB, degrees, ppm) is made from this elsewhere.

/// The dimension of a quantity, with the SI unit in which this crate holds it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Dimension {
    /// Pure number.
    Number,
    /// Voltage ratio held as V/V, signed, read as a plain number ("20.4") or in dB.
    Gain,
    /// Positive voltage ratio held as V/V and read in dB (peaking, gain margin, CMRR).
    Level,
    /// Relative error, held as a fraction, read in % or ppm.
    Fraction,
    /// Angle in radians, read in degrees.
    Angle,
    /// Hz.
    Frequency,
    /// s.
    Time,
    /// Ω.
    Resistance,
    /// F.
    Capacitance,
    /// V.
    Voltage,
    /// A.
    Current,
    /// C.
    Charge,
    /// V/C, the gain of a charge stage.
    VoltsPerCoulomb,
    /// W.
    Power,
    /// K, an absolute temperature, read in °C.
    Temperature,
    /// K, a difference of temperatures.
    TemperatureDifference,
    /// K/W.
    ThermalResistance,
    /// V/s.
    SlewRate,
    /// V/√Hz.
    VoltageDensity,
    /// A/√Hz.
    CurrentDensity,
    /// V/K.
    VoltageDrift,
    /// 1/K, read in ppm/K.
    FractionDrift,
    /// Number of bits.
    Bits,
}

impl Dimension {
    /// The SI unit in which a number of this dimension is held, as JSON gives it; `1` for pure numbers.
    #[must_use]
    pub const fn si_unit(self) -> &'static str {
        match self {
            Self::Number | Self::Fraction => "1",
            Self::Gain | Self::Level => "V/V",
            Self::Angle => "rad",
            Self::Frequency => "Hz",
            Self::Time => "s",
            Self::Resistance => "Ω",
            Self::Capacitance => "F",
            Self::Voltage => "V",
            Self::Current => "A",
            Self::Charge => "C",
            Self::VoltsPerCoulomb => "V/C",
            Self::Power => "W",
            Self::Temperature | Self::TemperatureDifference => "K",
            Self::ThermalResistance => "K/W",
            Self::SlewRate => "V/s",
            Self::VoltageDensity => "V/√Hz",
            Self::CurrentDensity => "A/√Hz",
            Self::VoltageDrift => "V/K",
            Self::FractionDrift => "1/K",
            Self::Bits => "bit",
        }
    }
}
