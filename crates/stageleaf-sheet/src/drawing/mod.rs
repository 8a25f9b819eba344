//! The circuit as a drawing whose values are fields: one file per stage kind over the symbols of [`kit`].

pub mod ac_inverting;
pub mod ac_non_inverting;
pub mod charge;
pub mod comparator_inverting;
pub mod comparator_non_inverting;
pub mod difference;
pub mod differentiator;
pub mod follower;
pub mod instrumentation;
pub mod integrator;
pub mod inverting;
pub mod kit;
pub mod multiple_feedback_band_pass;
pub mod multiple_feedback_low_pass;
pub mod non_inverting;
pub mod sallen_key_high_pass;
pub mod sallen_key_low_pass;
pub mod scale_and_shift;
pub mod summing;
mod surroundings;
pub mod transimpedance;

use maud::{Markup, html};
use stageleaf_math::{
    dimension::Dimension,
    kind::{Feed, Kind},
    stage::{Isolation, Source, Stage, Toleranced},
};
use stageleaf_note::{Block, format, print::trimmed, spoken};

use crate::Sheet;
use kit::{Canvas, Label, Symbol};

/// The labels of one stage's components, from its block.
#[derive(Debug)]
pub struct Labels<'a> {
    block: &'a Block,
}

impl<'a> Labels<'a> {
    /// The labels of `block`'s components.
    #[must_use]
    pub const fn of(block: &'a Block) -> Self {
        Self { block }
    }

    /// The stage.
    #[must_use]
    pub const fn stage(&self) -> &'a Stage {
        &self.block.stage
    }

    /// Whether the stage has this component.
    #[must_use]
    pub fn has(&self, name: &str) -> bool {
        self.stage().component(name).is_some()
    }

    /// The label of a component, if the stage has it.
    #[must_use]
    pub fn component(&self, name: &str) -> Option<Label> {
        let value = self.stage().component(name)?;
        let spec = self.stage().kind.components().iter().find(|s| s.name == name)?;
        Some(self.label(name, format!("components.{name}"), &spec.role.replace('`', ""), value, spec.dimension))
    }

    /// The label of the source's impedance; a resistance of zero is drawn as none.
    #[must_use]
    pub fn source_impedance(&self) -> Option<Label> {
        match self.stage().source(0)? {
            Source::Resistive { resistance } => {
                if resistance.nominal <= 0.0 {
                    return None;
                }
                Some(self.label("Rs", "source.resistance".into(), "source resistance", &resistance, Dimension::Resistance))
            }
            Source::Capacitive { capacitance } => {
                Some(self.label("Cs", "source.capacitance".into(), "source capacitance", &capacitance, Dimension::Capacitance))
            }
            Source::Photodiode { capacitance, .. } => {
                Some(self.label("Cd", "source.capacitance".into(), "junction capacitance", &capacitance, Dimension::Capacitance))
            }
        }
    }

    /// The label of a photodiode's shunt resistance, where it is stated.
    #[must_use]
    pub fn shunt_resistance(&self) -> Option<Label> {
        let Source::Photodiode { shunt_resistance: Some(value), .. } = self.stage().source(0)? else { return None };
        Some(self.label("Rsh", "source.shunt_resistance".into(), "shunt resistance", &value, Dimension::Resistance))
    }

    /// Symbol and label of what stands in series with one of several signal inputs; the name alone where another input's label
    /// shows the value of both.
    #[must_use]
    pub fn source_impedance_of(&self, input: usize) -> Option<(Symbol, Result<Label, String>)> {
        let (symbol, key, letter, role, value, dimension) = match self.stage().source(input)? {
            Source::Resistive { resistance } if resistance.nominal <= 0.0 => return None,
            Source::Resistive { resistance } => {
                (Symbol::Resistor, "resistance", 'R', "source resistance", resistance, Dimension::Resistance)
            }
            Source::Capacitive { capacitance } | Source::Photodiode { capacitance, .. } => {
                (Symbol::Capacitor, "capacitance", 'C', "source capacitance", capacitance, Dimension::Capacitance)
            }
        };
        let (shared, own) =
            (format!("source.{key}"), format!("source.{}.{key}", (self.stage().kind.spec().inputs)(self.stage()).get(input)?.name));
        if self.block.field(&own).is_none() && self.block.field(&shared).is_some() {
            let name = format!("{letter}s");
            let label =
                if input == 0 { Ok(self.label(&name, shared, &format!("{role} of each input"), &value, dimension)) } else { Err(name) };
            return Some((symbol, label));
        }
        Some((symbol, Ok(self.label(&format!("{letter}s{}", input + 1), own, role, &value, dimension))))
    }

    /// Whether any input has a source with an impedance.
    #[must_use]
    pub fn has_source_impedance(&self) -> bool {
        (0..self.stage().sources.len()).any(|input| self.source_impedance_of(input).is_some())
    }

    /// The label of the reference's voltage, if the block states it.
    #[must_use]
    pub fn reference_voltage(&self) -> Option<Label> {
        let value = self.stage().reference?.voltage;
        Some(self.label("Vref", "reference.voltage".into(), "reference voltage", &value, Dimension::Voltage))
    }

    /// The label of the reference's resistance; one of zero is drawn as none.
    #[must_use]
    pub fn reference_resistance(&self) -> Option<Label> {
        let value = self.stage().reference?.resistance.filter(|r| r.nominal > 0.0)?;
        Some(self.label("Rref", "reference.resistance".into(), "output resistance of the reference", &value, Dimension::Resistance))
    }

    /// The label of the load resistance, if there is one.
    #[must_use]
    pub fn load_resistance(&self) -> Option<Label> {
        let value = self.stage().load.resistance.as_ref()?;
        Some(self.label("RL", "load.resistance".into(), "load resistance", value, Dimension::Resistance))
    }

    /// The label of the load capacitance, if there is one.
    #[must_use]
    pub fn load_capacitance(&self) -> Option<Label> {
        let value = self.stage().load.capacitance.as_ref()?;
        Some(self.label("CL", "load.capacitance".into(), "load capacitance", value, Dimension::Capacitance))
    }

    /// The label of the resistor in front of the converter, if there is one.
    #[must_use]
    pub fn converter_resistance(&self) -> Option<Label> {
        let value = self.stage().converter.series_resistance.as_ref()?;
        Some(self.label("Radc", "converter.series_resistance".into(), "series resistor of the converter", value, Dimension::Resistance))
    }

    /// The label of the capacitor at the converter's input, if there is one.
    #[must_use]
    pub fn converter_capacitance(&self) -> Option<Label> {
        let value = self.stage().converter.shunt_capacitance.as_ref()?;
        Some(self.label("Cadc", "converter.shunt_capacitance".into(), "capacitor at the converter's input", value, Dimension::Capacitance))
    }

    /// The rails' texts; no negative one where that rail is the ground.
    #[must_use]
    pub fn rails(&self) -> (String, Option<String>) {
        let Some(supply) = self.stage().supply else { return ("V+".into(), Some("V−".into())) };
        let text = |volts: f64| {
            let text = trimmed(volts, Dimension::Voltage, 3);
            if volts > 0.0 { format!("+{text}") } else { text }
        };
        let n = supply.negative;
        let grounded = n.low >= 0.0 && n.high <= 0.0;
        (text(supply.positive.nominal), (!grounded).then(|| text(n.nominal)))
    }

    fn label(&self, name: &str, path: String, role: &str, value: &Toleranced, dimension: Dimension) -> Label {
        let written = self.block.field(&path).map(|f| f.text.clone());
        let spoken = format!("{name}, {role}, {}", spoken(value.nominal, dimension));
        Label { name: name.into(), path, value: written.unwrap_or_else(|| format(value.nominal, dimension, 4)), spoken }
    }
}

/// Lays out the stage's drawing.
#[must_use]
pub fn canvas(block: &Block) -> Canvas {
    let mut canvas = Canvas::default();
    let labels = Labels::of(block);
    match block.stage.kind {
        Kind::Follower => follower::draw(&mut canvas, &labels),
        Kind::NonInverting => non_inverting::draw(&mut canvas, &labels),
        Kind::Inverting => inverting::draw(&mut canvas, &labels),
        Kind::Summing => summing::draw(&mut canvas, &labels),
        Kind::Difference => difference::draw(&mut canvas, &labels),
        Kind::Instrumentation => instrumentation::draw(&mut canvas, &labels),
        Kind::Transimpedance => transimpedance::draw(&mut canvas, &labels),
        Kind::Charge => charge::draw(&mut canvas, &labels),
        Kind::Integrator => integrator::draw(&mut canvas, &labels),
        Kind::Differentiator => differentiator::draw(&mut canvas, &labels),
        Kind::ScaleAndShift => scale_and_shift::draw(&mut canvas, &labels),
        Kind::AcNonInverting => ac_non_inverting::draw(&mut canvas, &labels),
        Kind::AcInverting => ac_inverting::draw(&mut canvas, &labels),
        Kind::SallenKeyLowPass => sallen_key_low_pass::draw(&mut canvas, &labels),
        Kind::SallenKeyHighPass => sallen_key_high_pass::draw(&mut canvas, &labels),
        Kind::MultipleFeedbackLowPass => multiple_feedback_low_pass::draw(&mut canvas, &labels),
        Kind::MultipleFeedbackBandPass => multiple_feedback_band_pass::draw(&mut canvas, &labels),
        Kind::ComparatorInverting => comparator_inverting::draw(&mut canvas, &labels),
        Kind::ComparatorNonInverting => comparator_non_inverting::draw(&mut canvas, &labels),
    }
    canvas
}

/// What leads from the output back to the inverting input: the resistor, and the capacitor across it.
const fn feedback_names(kind: Kind) -> [&'static str; 2] {
    match kind {
        Kind::Difference | Kind::Instrumentation => ["R2", "C2"],
        Kind::ComparatorInverting | Kind::ComparatorNonInverting => ["R2", ""],
        _ => ["Rf", "Cf"],
    }
}

/// The drawing, with a description in words.
#[must_use]
pub fn drawing(sheet: &Sheet) -> Markup {
    let stage = &sheet.block.stage;
    let spec = stage.kind.spec();
    let canvas = canvas(sheet.block);
    let inputs = (spec.inputs)(stage).iter().filter(|i| i.feed == Feed::Signal).count();
    let cut: Vec<&Label> = canvas.cut().collect();
    html! {
        div class="drawing" {
            (canvas.finish(sheet.id, &format!("Circuit: {}, {}", spec.title.to_ascii_lowercase(), spec.ideal_formula)))
            p class="aside" {
                (spec.summary) " "
                @if stage.component("Riso").is_some() {
                    @match stage.isolation {
                        Isolation::InsideLoop => {
                            @let [resistor, capacitor] = feedback_names(stage.kind);
                            "Riso stands inside the loop: " (resistor) " senses the load, " (capacitor) " the pin. "
                        },
                        Isolation::OutsideLoop => "Riso stands outside the loop: the feedback senses the pin. ",
                    }
                }
                // Paper does not scroll.
                @if !cut.is_empty() {
                    "In full: " @for (i, l) in cut.iter().enumerate() { @if i > 0 { ", " } (l.name) " " (l.value) } ". "
                }
                @match (0..inputs).filter(|i| stage.source(*i).is_none()).count() {
                    0 => {},
                    _ if inputs == 1 => "The source is taken as ideal. ",
                    n if n == inputs => "The sources are taken as ideal. ",
                    _ => "A source that is not stated is taken as ideal. ",
                }
            }
        }
    }
}
