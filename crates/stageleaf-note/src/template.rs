//! A block to start from, for every kind: complete, commented, and read back without a problem.

use std::fmt::Write as _;

use stageleaf_math::{
    dimension::Dimension,
    kind::{ComponentSpec, Kind},
};

/// The part that a new block names until the author puts one of the shelf's in.
pub const PLACEHOLDER_PART: &str = "my-part";

/// A block of this kind with a name and a part to be replaced.
#[must_use]
pub fn template(kind: Kind) -> String {
    template_for(kind, &format!("New {}", kind.spec().title.to_lowercase()), PLACEHOLDER_PART)
}

/// A block of this kind, named and with its part.
#[must_use]
pub fn template_for(kind: Kind, name: &str, part: &str) -> String {
    let spec = kind.spec();
    let mut out = String::new();
    let mut line = |text: &str, comment: &str| {
        let gap = " ".repeat(34_usize.saturating_sub(text.chars().count()).max(2));
        if comment.is_empty() { writeln!(out, "{text}") } else { writeln!(out, "{text}{gap}# {comment}") }.expect("a string takes all");
    };
    line(&format!("# {}: {}", spec.title, spec.ideal_formula), "");
    line(&format!("# {}", spec.summary), "");
    line(&format!("stage = \"{}\"", spec.id), "");
    line(&format!("name  = {}", toml_string(name)), "unique in the note; prose links to it");
    line(&format!("part  = {}", toml_string(part)), "a part file of the shelf, without `.toml`");
    line("", "");
    line("[supply]", "");
    line("positive = \"12 V ± 5 %\"", "or \"3.0 V to 4.2 V, 3.7 V nominal\"");
    line("negative = \"-12 V ± 5 %\"", "\"0 V\" for a single supply");
    line("", "");
    line("[components]", "value, tolerance, drift, rating: \"10k 1% 50ppm 0.25W\"");
    for component in spec.components {
        let value = starting_value(kind, component);
        let mark = if component.required { "" } else { "# " };
        let with = component.with.map(|with| format!("; needs {with}")).unwrap_or_default();
        line(&format!("{mark}{} = \"{value}\"", component.name), &format!("{}{with}", component.role));
    }
    for (text, comment) in REST {
        line(text, comment);
    }
    out
}

/// What every block has behind its components.
const REST: &[(&str, &str)] = &[
    ("", ""),
    ("[source]", ""),
    ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
    ("resistance = \"50 1%\"", ""),
    ("", ""),
    ("[signal]", ""),
    ("peak = \"0.2 V\"", "or peak_to_peak or rms, at the source"),
    ("frequency = \"10 kHz\"", "the highest at full amplitude"),
    ("", ""),
    ("[load]", "leave the table out where nothing is driven"),
    ("resistance = \"10k 5%\"", ""),
    ("# capacitance = \"100p 20%\"", "cable, or the next stage's input"),
    ("", ""),
    ("[ambient]", ""),
    ("range = \"0 °C to 50 °C\"", ""),
    ("", ""),
    ("[band]", "over which noise is integrated"),
    ("from = \"10 Hz\"", ""),
    ("to = \"20 kHz\"", ""),
    ("", ""),
    ("[limits]", "what the stage has to keep, at the worst case"),
    ("gain_error = \"between -5 % and 5 %\"", ""),
    ("bandwidth = \"at least 100 kHz\"", ""),
    ("phase_margin = \"at least 45 °\"", ""),
    ("clip_margin = \"at least 1 V\"", ""),
    ("input_range_margin = \"at least 1 V\"", ""),
    ("slew_margin = \"at least 2\"", "slew available over slew needed"),
    ("output_noise = \"report\"", "shown, not judged"),
];

/// A value that makes a stage of modest gain out of parts that every stock room holds.
fn starting_value(kind: Kind, component: &ComponentSpec) -> &'static str {
    match (kind, component.name) {
        (Kind::Follower, "Rf") => "1k 1% 50ppm",
        (Kind::NonInverting, "Rf") => "9k1 1% 50ppm",
        (Kind::NonInverting, "Rg") => "1k 1% 50ppm",
        (Kind::Inverting, "Rin") => "4k7 1% 50ppm",
        (Kind::Inverting, "Rf") => "47k 1% 50ppm",
        (Kind::Inverting, "Rp") => "4k3 1% 50ppm",
        (_, "Cf") => "10p 5%",
        (_, "Cp") => "100n 10%",
        (_, "Rser") => "100 1%",
        (_, "Cshunt") => "100p 5%",
        (_, "Riso") => "47 1%",
        (_, "Rsn") => "100 1%",
        (_, "Csn") => "1n 10%",
        (_, "Rng") => "1k 1%",
        (_, "Cng") => "1n 10%",
        _ => match component.dimension {
            Dimension::Capacitance => "100p 5%",
            _ => "10k 1% 50ppm",
        },
    }
}

/// `text` as a TOML basic string.
fn toml_string(text: &str) -> String {
    let mut out = String::from("\"");
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            '\t' => out.push_str("\\t"),
            c if c.is_control() => write!(out, "\\u{:04X}", u32::from(c)).expect("a string takes all"),
            c => out.push(c),
        }
    }
    out.push('"');
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_name_cannot_leave_its_string() {
        assert_eq!(toml_string("a\"b\\c\nd\u{1b}"), r#""a\"b\\c\nd\u001B""#);
    }

    #[test]
    fn every_component_of_every_kind_stands_in_its_block() {
        for kind in Kind::ALL {
            let text = template(*kind);
            for component in kind.components() {
                let required = format!("\n{} = ", component.name);
                let optional = format!("\n# {} = ", component.name);
                assert!(text.contains(if component.required { &required } else { &optional }), "{}: {}", kind.id(), component.name);
            }
        }
    }
}
