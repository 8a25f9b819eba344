//! What a data sheet states about an amplifier. Everything but the name is optional: what is missing is not guessed.

use alloc::{string::String, vec::Vec};

use crate::dimension::Dimension;

macro_rules! part_figures {
    ($($name:ident $id:literal $dimension:ident $worse:ident $meaning:literal;)*) => {
        /// A scalar figure of a data sheet.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub enum PartFigure { $(#[doc = $meaning] $name,)* }

        impl PartFigure {
            /// Every figure, in the order of the part file.
            pub const ALL: &'static [Self] = &[$(Self::$name,)*];

            /// How many there are.
            pub const COUNT: usize = Self::ALL.len();

            /// `table.key` in the part file.
            #[must_use]
            pub const fn id(self) -> &'static str { match self { $(Self::$name => $id,)* } }

            /// What the number measures.
            #[must_use]
            pub const fn dimension(self) -> Dimension { match self { $(Self::$name => Dimension::$dimension,)* } }

            /// Which bound a maker guarantees.
            #[must_use]
            pub const fn worse(self) -> Worse { match self { $(Self::$name => Worse::$worse,)* } }

            /// The meaning in a few words.
            #[must_use]
            pub const fn meaning(self) -> &'static str { match self { $(Self::$name => $meaning,)* } }
        }
    };
}

/// Which direction of a data-sheet figure is the worse one, as makers guarantee it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Worse {
    /// More is worse: guaranteed by a maximum.
    High,
    /// Less is worse: guaranteed by a minimum.
    Low,
}

part_figures! {
    SupplySpanMin "supply.span_min" Voltage High "least supply span";
    SupplySpanMax "supply.span_max" Voltage Low "greatest supply span";
    SupplyCurrent "supply.current" Current High "quiescent supply current per amplifier";
    Startup "supply.startup" Time High "start-up time after the supplies have come on";
    Offset "input.offset" Voltage High "input offset voltage (magnitude)";
    OffsetDrift "input.offset_drift" VoltageDrift High "input offset drift (magnitude)";
    BiasCurrent "input.bias_current" Current High "input bias current (magnitude)";
    BiasDoubling "input.bias_doubling" TemperatureDifference Low "rise of junction temperature that doubles the bias current";
    OffsetCurrent "input.offset_current" Current High "input offset current (magnitude)";
    RangeFromNegative "input.range.from_negative" Voltage High "lowest input, above the negative rail";
    RangeFromPositive "input.range.from_positive" Voltage High "highest input, below the positive rail (negative: beyond the rail)";
    DifferentialMax "input.differential_max" Voltage Low "largest allowed differential input";
    ClampCurrentMax "input.clamp_current_max" Current Low "largest allowed input clamp current";
    DifferentialResistance "input.differential_resistance" Resistance Low "differential input resistance";
    DifferentialCapacitance "input.differential_capacitance" Capacitance High "differential input capacitance";
    CommonModeResistance "input.common_mode_resistance" Resistance Low "common-mode input resistance, each input";
    CommonModeCapacitance "input.common_mode_capacitance" Capacitance High "common-mode input capacitance, each input";
    Cmrr "input.cmrr" Level Low "common-mode rejection at DC";
    CmrrCorner "input.cmrr_corner" Frequency Low "corner of the common-mode rejection";
    PsrrPositive "input.psrr_positive" Level Low "rejection of the positive supply at DC";
    PsrrPositiveCorner "input.psrr_positive_corner" Frequency Low "corner of the positive supply rejection";
    PsrrNegative "input.psrr_negative" Level Low "rejection of the negative supply at DC";
    PsrrNegativeCorner "input.psrr_negative_corner" Frequency Low "corner of the negative supply rejection";
    OpenLoop "gain.open_loop" Gain Low "open-loop gain at DC";
    Gbw "gain.gbw" Frequency Low "gain-bandwidth product";
    StableGainMin "gain.stable_gain_min" Number High "least noise gain at which the amplifier is stable";
    SlewRise "slew.rise" SlewRate Low "slew rate, rising";
    SlewFall "slew.fall" SlewRate Low "slew rate, falling";
    OutputResistance "output.resistance" Resistance High "open-loop output resistance";
    CurrentLimit "output.current_limit" Current Low "output current limit";
    OverloadRecovery "output.overload_recovery" Time High "overload recovery time";
    NoiseVoltage "noise.voltage" VoltageDensity High "white voltage noise density";
    NoiseVoltageCorner "noise.voltage_corner" Frequency High "voltage noise corner";
    NoiseExponent "noise.exponent" Number High "exponent of the voltage noise below its corner";
    NoiseCurrent "noise.current" CurrentDensity High "white current noise density, each input";
    NoiseCurrentCorner "noise.current_corner" Frequency High "current noise corner";
    JunctionToAmbient "thermal.junction_to_ambient" ThermalResistance High "thermal resistance, junction to ambient";
    JunctionMax "thermal.junction_max" Temperature Low "highest allowed junction temperature";
}

/// A data-sheet figure as stated: any of minimum, typical, maximum, in SI units.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Rating {
    /// Guaranteed least value.
    pub min: Option<f64>,
    /// Typical value.
    pub typ: Option<f64>,
    /// Guaranteed greatest value.
    pub max: Option<f64>,
    /// Where in the data sheet, under which conditions.
    pub source: Option<String>,
}

impl Rating {
    /// A typical value alone.
    #[must_use]
    pub const fn typical(value: f64) -> Self {
        Self { min: None, typ: Some(value), max: None, source: None }
    }

    /// Whether nothing is stated.
    #[must_use]
    pub const fn is_empty(&self) -> bool {
        self.min.is_none() && self.typ.is_none() && self.max.is_none()
    }

    /// The value used as nominal: typical, else the guaranteed bound in the worse direction, else the other bound.
    #[must_use]
    pub fn nominal(&self, worse: Worse) -> Option<f64> {
        self.typ.or(match worse {
            Worse::High => self.max.or(self.min),
            Worse::Low => self.min.or(self.max),
        })
    }
}

/// A zero of the open-loop gain.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Zero {
    /// Its frequency in Hz.
    pub frequency: f64,
    /// In the right half plane: it takes phase away, as a pole would.
    pub right_half_plane: bool,
}

/// One row of a headroom table.
#[derive(Clone, Debug, PartialEq)]
pub struct Headroom {
    /// Output current in A, as a magnitude.
    pub current: f64,
    /// Distance of the pin from the rail at that current, in V.
    pub volts: Rating,
}

/// A phase margin with its conditions, from which the second pole follows.
#[derive(Clone, Debug, PartialEq)]
pub struct StatedPhaseMargin {
    /// Phase margin in radians.
    pub margin: f64,
    /// Noise gain at which it was measured.
    pub gain: f64,
    /// Load resistance in Ω, if any.
    pub load_resistance: Option<f64>,
    /// Load capacitance in F, if any.
    pub load_capacitance: Option<f64>,
}

/// An amplifier as its data sheet states it.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Part {
    /// The shelf's name, by which stages choose it.
    pub id: String,
    /// The maker's or team's name.
    pub name: String,
    /// What it is, in a few words.
    pub description: Option<String>,
    /// Amplifiers in the package.
    pub amplifiers: Option<u32>,
    /// The data sheet.
    pub source: Option<String>,
    /// One rating per [`PartFigure`], in the order of [`PartFigure::ALL`]; may be shorter.
    pub ratings: Vec<Rating>,
    /// Higher poles of the open-loop gain in Hz (an empty list is a statement; `None` is not).
    pub poles: Option<Vec<f64>>,
    /// Zeros of the open-loop gain; none stated means none.
    pub zeros: Vec<Zero>,
    /// Phase margin under stated conditions.
    pub phase_margin: Option<StatedPhaseMargin>,
    /// Headroom below the positive rail when sourcing, by rising current.
    pub headroom_high: Vec<Headroom>,
    /// Headroom above the negative rail when sinking, by rising current.
    pub headroom_low: Vec<Headroom>,
    /// Whether the output reverses when an input leaves its range.
    pub phase_reversal: Option<bool>,
}

static NOTHING: Rating = Rating { min: None, typ: None, max: None, source: None };

impl Part {
    /// What is stated for `figure`; an empty rating where nothing is.
    #[must_use]
    pub fn rating(&self, figure: PartFigure) -> &Rating {
        self.ratings.get(figure as usize).unwrap_or(&NOTHING)
    }

    /// States `figure`.
    pub fn state(&mut self, figure: PartFigure, rating: Rating) {
        if self.ratings.len() < PartFigure::COUNT {
            self.ratings.resize(PartFigure::COUNT, Rating::default());
        }
        self.ratings[figure as usize] = rating;
    }
}
