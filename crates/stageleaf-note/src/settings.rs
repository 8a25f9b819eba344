//! stub
use crate::problem::Problem;
use stageleaf_math::{series::Series, stage::Ambient};
/// What `stageleaf.toml` at the notes' root states.
#[derive(Clone, Debug, PartialEq)]
pub struct Settings {
    /// Folder of the part files, relative to the settings file: `shelf = "shelf"`.
    pub shelf: Option<String>,
    /// Ambient temperature of stages that state none.
    pub ambient: Option<Ambient>,
    /// Tolerance of resistors that state none, as a fraction.
    pub resistor_tolerance: Option<f64>,
    /// Tolerance of capacitors that state none, as a fraction.
    pub capacitor_tolerance: Option<f64>,
    /// Fraction of a limit's own scale below which a margin counts as thin.
    pub thin: f64,
    /// Series through which resistor values step.
    pub resistor_series: Series,
    /// Series through which capacitor values step.
    pub capacitor_series: Series,
}
impl Default for Settings {
    fn default() -> Self {
        Self {
            shelf: None,
            ambient: None,
            resistor_tolerance: None,
            capacitor_tolerance: None,
            thin: 0.1,
            resistor_series: Series::E24,
            capacitor_series: Series::E12,
        }
    }
}
/// Reads `stageleaf.toml`.
#[cfg(feature = "toml")]
pub fn read_settings(_text: &str, _file: &str) -> Result<Settings, Vec<Problem>> {
    Ok(Settings::default())
}
