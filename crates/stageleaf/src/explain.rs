//! `explain`: what a figure means and in which unit it is told, and what no figure knows about.

use std::fmt::Write as _;

use clap::Args;
use stageleaf_math::{
    NOT_MODELLED,
    dimension::Dimension,
    figure::{Argument, Figure, Group},
    kind::Kind,
};
use stageleaf_note::problem::nearest;

use crate::fault::Fault;

/// What `explain` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// Figure, as `phase_margin`; without one, all are listed
    #[arg(value_name = "FIGURE")]
    pub figure: Option<String>,
}

/// The explanation.
///
/// # Errors
/// When there is no such figure.
pub fn text(options: &Options) -> Result<String, Fault> {
    let Some(given) = &options.figure else { return Ok(list()) };
    // `gain_at 20 kHz`, as limits write it, is asked about as well.
    let id = given.split_whitespace().next().unwrap_or_default();
    let figure = Figure::ALL.iter().find(|f| f.id() == id).ok_or_else(|| unknown(id))?;
    let mut text = format!("{}: {}\n\n{}\n\n", figure.id(), figure.title(), figure.meaning());
    let write = |text: &mut String, label: &str, value: &str| writeln!(text, "  {label:<10}{value}").expect("a string takes all");
    write(&mut text, "unit", unit_words(figure.dimension()));
    for (kinds, dimension) in other_dimensions(*figure) {
        write(&mut text, "", &format!("{} in a stage of kind {kinds}", unit_words(dimension)));
    }
    write(&mut text, "group", group_words(figure.group()));
    match figure.argument() {
        Argument::None => write(&mut text, "limit", &format!("{} = \"…\"", figure.id())),
        Argument::Frequency => write(&mut text, "limit", &format!("\"{} 20 kHz\" = \"…\": it takes a frequency", figure.id())),
    }
    write!(text, "\nNot modelled, for this and every other figure:\n").expect("a string takes all");
    for what in NOT_MODELLED {
        writeln!(text, "  {what}").expect("a string takes all");
    }
    Ok(text)
}

/// Kinds on which the figure measures something else, and what: a gain in Ω.
fn other_dimensions(figure: Figure) -> Vec<(&'static str, Dimension)> {
    Kind::ALL.iter().map(|k| (k.id(), figure.dimension_in(*k))).filter(|(_, d)| *d != figure.dimension()).collect()
}

fn list() -> String {
    let width = Figure::ALL.iter().map(|f| f.id().len()).max().unwrap_or(0);
    let mut text = String::new();
    let mut group = None;
    for figure in Figure::ALL {
        if group != Some(figure.group()) {
            let gap = if group.is_some() { "\n" } else { "" };
            writeln!(text, "{gap}{}", group_words(figure.group())).expect("a string takes all");
            group = Some(figure.group());
        }
        writeln!(text, "  {:<width$}  {}", figure.id(), figure.title()).expect("a string takes all");
    }
    text
}

const fn group_words(group: Group) -> &'static str {
    match group {
        Group::SmallSignal => "small signal",
        Group::Dc => "DC",
        Group::Noise => "noise",
        Group::LargeSignal => "large signal",
        Group::Power => "power",
    }
}

/// In which unit text tells it, and in which JSON does.
const fn unit_words(dimension: Dimension) -> &'static str {
    match dimension {
        Dimension::Number => "a pure number",
        Dimension::Gain => "V/V, a plain signed number; limits may be in dB too",
        Dimension::Level => "dB; V/V in JSON",
        Dimension::Fraction => "% or ppm; a fraction in JSON",
        Dimension::Angle => "degrees; radians in JSON",
        Dimension::Frequency => "Hz",
        Dimension::Time => "s",
        Dimension::Resistance => "Ω",
        Dimension::Capacitance => "F",
        Dimension::Voltage => "V",
        Dimension::Current => "A",
        Dimension::Power => "W",
        Dimension::Charge => "C",
        Dimension::VoltsPerCoulomb => "V/C",
        Dimension::Temperature => "°C; K in JSON",
        Dimension::TemperatureDifference => "K",
        Dimension::ThermalResistance => "K/W",
        Dimension::SlewRate => "V/µs; V/s in JSON",
        Dimension::VoltageDensity => "V/√Hz",
        Dimension::CurrentDensity => "A/√Hz",
        Dimension::VoltageDrift => "V/K",
        Dimension::FractionDrift => "ppm/K; 1/K in JSON",
        Dimension::Bits => "bits",
    }
}

fn unknown(given: &str) -> Fault {
    Fault::Path {
        path: "explain".to_owned(),
        message: format!("no figure is called `{given}`"),
        allowed: Some("a figure id; `stageleaf explain` lists them".to_owned()),
        attempt: nearest(given, Figure::ALL.iter().map(|f| f.id())).map(|id| format!("stageleaf explain {id}")),
    }
}
