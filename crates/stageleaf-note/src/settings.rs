//! The team's settings: `stageleaf.toml` at the notes' root.
//!
//! ```toml
//! shelf = "shelf"                   # folder of the part files, beside this file
//! thin = "10 %"                     # of a limit's own scale
//!
//! [ambient]
//! range = "-20 °C to 50 °C"         # for stages that state none
//!
//! [tolerance]                       # for components that state none
//! resistor = "1 %"
//! capacitor = "5 %"
//!
//! [series]                          # for stepping through values
//! resistor = "E24"
//! capacitor = "E12"
//! ```
//!
//! Without a tolerance here, a component that states none is exact, and its sheet shows that.

use stageleaf_math::{series::Series, stage::Ambient};

/// What `stageleaf.toml` states.
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

#[cfg(feature = "toml")]
mod reading {
    use stageleaf_math::{dimension::Dimension, series::Series};

    use super::Settings;
    use crate::{
        block::Place,
        parse,
        problem::{Problem, quoted},
        quantity::Trouble,
        surroundings::ambient,
        table::{Reader, entries, shown},
    };

    /// Reads `stageleaf.toml`.
    ///
    /// # Errors
    /// Everything that is wrong with it, in the order of the text; at least one problem.
    pub fn read_settings(text: &str, file: &str) -> Result<Settings, Vec<Problem>> {
        const KEYS: &[&str] = &["shelf", "thin", "ambient", "tolerance", "series"];
        let place = Place::new(file, 1);
        let text = text.strip_prefix('\u{feff}').unwrap_or(text);
        let mut reader = Reader::new(text, &place);
        let document = reader.document();
        let mut settings = Settings::default();
        for entry in entries(document.get_ref()) {
            match entry.key {
                "shelf" => settings.shelf = reader.text(&entry, "shelf").map(|t| t.text.into_owned()),
                "thin" => settings.thin = reader.read(&entry, "thin", "takes a fraction", part).unwrap_or(settings.thin),
                "ambient" => settings.ambient = ambient(&mut reader, &entry),
                "tolerance" | "series" => {
                    for key in reader.table(&entry).map(entries).unwrap_or_default() {
                        let path = format!("{}.{}", entry.key, key.key);
                        match (entry.key, key.key) {
                            ("tolerance", "resistor") => settings.resistor_tolerance = reader.read(&key, &path, "takes a fraction", part),
                            ("tolerance", "capacitor") => settings.capacitor_tolerance = reader.read(&key, &path, "takes a fraction", part),
                            (_, "resistor") => {
                                settings.resistor_series =
                                    reader.read(&key, &path, "takes a series", series).unwrap_or(settings.resistor_series);
                            }
                            (_, "capacitor") => {
                                settings.capacitor_series =
                                    reader.read(&key, &path, "takes a series", series).unwrap_or(settings.capacitor_series);
                            }
                            _ => {
                                reader.unknown(&key, format!("[{}] has no key `{}`", entry.key, shown(key.key)), &["resistor", "capacitor"])
                            }
                        }
                    }
                }
                _ => reader.unknown(&entry, format!("the settings have no key `{}`", shown(entry.key)), KEYS),
            }
        }
        let problems = reader.into_problems();
        if problems.is_empty() { Ok(settings) } else { Err(problems) }
    }

    /// A fraction from 0 to below 1.
    fn part(text: &str) -> Result<f64, Trouble> {
        let value = parse(text, Dimension::Fraction)?;
        if (0.0..1.0).contains(&value) {
            return Ok(value);
        }
        Err(Trouble {
            range: 0..text.len(),
            message: format!("{} was given", quoted(text)),
            allowed: "from `0 %` to below `100 %`".into(),
            attempt: None,
        })
    }

    fn series(text: &str) -> Result<Series, Trouble> {
        Series::ALL.iter().copied().find(|s| s.id() == text.trim()).ok_or_else(|| Trouble {
            range: 0..text.len(),
            message: format!("{} was given", quoted(text)),
            allowed: "`E3`, `E6`, `E12`, `E24`, `E48`, `E96`, `E192`".into(),
            attempt: None,
        })
    }
}

#[cfg(feature = "toml")]
pub use reading::read_settings;
