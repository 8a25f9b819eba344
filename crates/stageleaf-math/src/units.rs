//! Unit newtypes for the crate's edges. Inside, every number is an SI `f64`.
//!
//! A dimensional-analysis crate was rejected: V/√Hz has a half-integer exponent, and prefixes, dB, degrees and ppm
//! exist only in text, which this crate does not know.

macro_rules! unit {
    ($($(#[$doc:meta])* $name:ident)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
        pub struct $name(pub f64);
    )*};
}

unit! {
    /// Resistance in ohms.
    Ohms
    /// Capacitance in farads.
    Farads
    /// Frequency in hertz.
    Hertz
    /// Potential difference in volts; amplitudes are peak.
    Volts
    /// Temperature in kelvins.
    Kelvin
    /// Rate of change of a voltage in volts per second.
    VoltsPerSecond
    /// One-sided noise density in V/√Hz.
    VoltsPerRootHertz
}
