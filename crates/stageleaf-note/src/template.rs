//! A block to start from, for every kind: complete, commented, and read back without a problem.

use std::fmt::Write as _;

use stageleaf_math::{
    dimension::Dimension,
    kind::{ComponentSpec, Kind},
};

use crate::words::kind_noun;

/// The part that a new block names until the author puts one of the shelf's in.
pub const PLACEHOLDER_PART: &str = "my-part";

/// A block of this kind with a name and a part to be replaced.
#[must_use]
pub fn template(kind: Kind) -> String {
    template_for(kind, &format!("New {}", kind_noun(kind)), PLACEHOLDER_PART)
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
    if spec.amplifiers > 1 {
        line("", "");
        line("# [parts]", "amplifiers whose part is another");
        line(&format!("# A{} = {}", spec.amplifiers, toml_string(part)), "");
    }
    for (text, comment) in if is_on_one_supply(kind) { ONE_SUPPLY } else { TWO_SUPPLIES } {
        line(text, comment);
    }
    line("", "");
    line("[components]", "value, tolerance, drift, rating: \"10k 1% 50ppm 0.25W\"");
    for component in spec.components {
        let value = starting_value(kind, component);
        let mark = if stands(kind, component) { "" } else { "# " };
        let with = component.with.map(|with| format!("; needs {with}")).unwrap_or_default();
        line(&format!("{mark}{} = \"{value}\"", component.name), &format!("{}{with}", component.role));
    }
    let (exact, room) = match (kind.switches(), is_on_one_supply(kind)) {
        (true, _) => (NOTHING, ROOM_TO_SWITCH),
        (false, true) => (EXACT, ROOM_ON_ONE_SUPPLY),
        (false, false) => (EXACT, ROOM),
    };
    for (text, comment) in drive(kind).iter().chain(AROUND).chain(exact).chain(limits(kind)).chain(room) {
        line(text, comment);
    }
    out
}

/// Lines with their remarks.
type Lines = &'static [(&'static str, &'static str)];

const TWO_SUPPLIES: Lines = &[
    ("", ""),
    ("[supply]", ""),
    ("positive = \"12 V ± 5 %\"", "or \"3.0 V to 4.2 V, 3.7 V nominal\""),
    ("negative = \"-12 V ± 5 %\"", "\"0 V\" for a single supply"),
    ("# ripple = \"20 mV peak to peak\"", "or \"10 mV peak\"; on each rail"),
    ("# ripple_frequency = \"100 kHz\"", ""),
];

const ONE_SUPPLY: Lines = &[
    ("", ""),
    ("[supply]", ""),
    ("positive = \"5 V ± 4 %\"", "or \"3.0 V to 4.2 V, 3.7 V nominal\""),
    ("negative = \"0 V\"", "the stage's ground"),
    ("# ripple = \"20 mV peak to peak\"", "or \"10 mV peak\"; on each rail"),
    ("# ripple_frequency = \"100 kHz\"", ""),
];

/// Kinds that exist because there is no second supply.
const fn is_on_one_supply(kind: Kind) -> bool {
    matches!(kind, Kind::ScaleAndShift | Kind::AcNonInverting | Kind::AcInverting) || kind.switches()
}

/// What every block has behind what drives it.
const AROUND: Lines = &[
    ("", ""),
    ("[load]", "leave the table out where nothing is driven"),
    ("resistance = \"10k 5%\"", ""),
    ("# capacitance = \"100p 20%\"", "cable, or the next stage's input"),
    ("", ""),
    ("# [converter]", "behind the output"),
    ("# full_scale = \"0 V to 4.096 V\"", "both ends of its input range"),
    ("# bits = 16", ""),
    ("# sample_capacitance = \"30p 20%\"", "connected while it acquires"),
    ("# acquisition_time = \"1 µs\"", ""),
    ("# series_resistance = \"100 1%\"", "between the output and its input"),
    ("# shunt_capacitance = \"1n 5%\"", "from its input to ground"),
    ("", ""),
    ("[ambient]", ""),
    ("range = \"0 °C to 50 °C\"", ""),
    ("", ""),
    ("[band]", "over which noise is integrated"),
    ("from = \"10 Hz\"", ""),
    ("to = \"20 kHz\"", ""),
    ("", ""),
    ("[limits]", "what the stage has to keep, at the worst case"),
];

const NOTHING: Lines = &[];

const EXACT: Lines = &[("gain_error = \"between -5 % and 5 %\"", "")];

const ROOM_TO_SWITCH: Lines = &[
    ("hysteresis = \"at least 0.35 V\"", "more than noise and ripple: the output must not chatter"),
    ("response_time = \"at most 100 µs\"", "overload recovery and slew"),
    ("input_range_margin = \"at least 0.3 V\"", ""),
    ("output_high = \"at least 4.5 V\"", "at the load, for what reads it"),
    ("output_low = \"at most 0.1 V\"", ""),
];

const ROOM: Lines = &[
    ("phase_margin = \"at least 45 °\"", ""),
    ("clip_margin = \"at least 1 V\"", ""),
    ("input_range_margin = \"at least 1 V\"", ""),
    ("slew_margin = \"at least 2\"", "slew available over slew needed"),
    ("output_noise = \"report\"", "shown, not judged"),
];

const ROOM_ON_ONE_SUPPLY: Lines = &[
    ("phase_margin = \"at least 45 °\"", ""),
    ("clip_margin = \"at least 0.5 V\"", ""),
    ("input_range_margin = \"at least 0.3 V\"", ""),
    ("slew_margin = \"at least 2\"", "slew available over slew needed"),
    ("output_noise = \"report\"", "shown, not judged"),
];

/// Source, signal and reference.
const fn drive(kind: Kind) -> Lines {
    match kind {
        Kind::Summing => &[
            ("", ""),
            ("[source.in1]", "one table for each input"),
            ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[source.in2]", ""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal.in1]", ""),
            ("peak = \"1 V\"", "or peak_to_peak or rms, at the source"),
            ("frequency = \"10 kHz\"", "the highest at full amplitude"),
            ("", ""),
            ("[signal.in2]", ""),
            ("peak = \"0.5 V\"", ""),
            ("frequency = \"10 kHz\"", ""),
        ],
        Kind::Difference => &[
            ("", ""),
            ("[source.in1]", "or, for both alike, [source] with kind = \"bridge\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[source.in2]", ""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", "the difference, in2 - in1"),
            ("peak = \"0.2 V\"", "or peak_to_peak or rms"),
            ("frequency = \"10 kHz\"", "the highest at full amplitude"),
            ("common_mode = \"2 V ± 1 V\"", "of both inputs against the stage's ground"),
        ],
        Kind::Instrumentation => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"bridge\"", "or [source.in1] and [source.in2], each as it is"),
            ("resistance = \"350 1%\"", "the bridge as each input sees it"),
            ("", ""),
            ("[signal]", "the difference, in2 - in1"),
            ("peak = \"50 mV\"", "or peak_to_peak or rms"),
            ("frequency = \"1 kHz\"", "the highest at full amplitude"),
            ("common_mode = \"2.5 V ± 0.1 V\"", "of both inputs against the stage's ground"),
        ],
        Kind::Transimpedance => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"photodiode\"", "or \"resistive\" or \"capacitive\": what stands across the current"),
            ("capacitance = \"70p 10%\"", "the junction at the bias that it has here"),
            ("shunt_resistance = \"500M 20%\"", ""),
            ("dark_current = \"1 nA\"", ""),
            ("", ""),
            ("[signal]", "a current into the stage"),
            ("range = \"0 µA to 20 µA\"", "or peak with dc, peak_to_peak, rms"),
            ("frequency = \"1 kHz\"", "the highest at full amplitude"),
        ],
        Kind::Charge => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"capacitive\"", "the sensor with its cable"),
            ("capacitance = \"1n 10%\"", ""),
            ("", ""),
            ("[signal]", "a charge into the stage"),
            ("peak = \"100 pC\"", "or peak_to_peak or rms"),
            ("frequency = \"10 kHz\"", "the highest at full amplitude"),
        ],
        Kind::ScaleAndShift => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", ""),
            ("range = \"-2 V to 2 V\"", "or peak with dc, peak_to_peak, rms; at the source"),
            ("frequency = \"1 kHz\"", "the highest at full amplitude"),
            ("", ""),
            ("[reference]", "what shifts the output"),
            ("voltage = \"2.5 V 0.2% 25ppm\"", ""),
            ("resistance = \"1 50%\"", "its output resistance"),
        ],
        Kind::ComparatorInverting | Kind::ComparatorNonInverting => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"resistive\"", ""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", ""),
            ("range = \"0.5 V to 4.5 V\"", "where the thresholds must lie; or peak with dc"),
            ("", ""),
            ("[reference]", "what the signal is compared with"),
            ("voltage = \"2.5 V 0.2% 25ppm\"", ""),
            ("resistance = \"1 50%\"", "its output resistance"),
        ],
        Kind::AcNonInverting | Kind::AcInverting | Kind::Integrator | Kind::Differentiator | Kind::MultipleFeedbackBandPass => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", ""),
            ("peak = \"0.1 V\"", "or peak_to_peak or rms, at the source"),
            ("frequency = \"1 kHz\"", "the highest at full amplitude"),
        ],
        Kind::SallenKeyLowPass | Kind::MultipleFeedbackLowPass => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", ""),
            ("peak = \"1 V\"", "or peak_to_peak or rms, at the source"),
            ("frequency = \"5 kHz\"", "the highest at full amplitude"),
        ],
        Kind::Follower | Kind::NonInverting | Kind::Inverting | Kind::SallenKeyHighPass => &[
            ("", ""),
            ("[source]", ""),
            ("kind = \"resistive\"", "or \"capacitive\" with capacitance = \"1n 5%\""),
            ("resistance = \"50 1%\"", ""),
            ("", ""),
            ("[signal]", ""),
            ("peak = \"0.2 V\"", "or peak_to_peak or rms, at the source"),
            ("frequency = \"10 kHz\"", "the highest at full amplitude"),
        ],
    }
}

/// The limits on what a kind is built for.
const fn limits(kind: Kind) -> Lines {
    match kind {
        Kind::Follower | Kind::NonInverting | Kind::Inverting | Kind::Summing => &[("bandwidth = \"at least 100 kHz\"", "")],
        Kind::Difference => &[("output_offset = \"at most 50 mV\"", ""), ("bandwidth = \"at least 100 kHz\"", "")],
        Kind::Instrumentation => &[("output_offset = \"at most 100 mV\"", ""), ("bandwidth = \"at least 100 kHz\"", "")],
        Kind::Transimpedance => &[("bandwidth = \"at least 50 kHz\"", ""), ("output_offset = \"at most 10 mV\"", "dark current included")],
        Kind::Charge => &[("low_cutoff = \"at most 25 Hz\"", ""), ("bandwidth = \"at least 100 kHz\"", "")],
        Kind::Integrator => &[("gain_at_signal = \"-1.59 ± 5 %\"", ""), ("output_offset = \"at most 0.3 V\"", "")],
        Kind::Differentiator => &[("gain_at_signal = \"-0.63 ± 5 %\"", ""), ("bandwidth = \"at least 20 kHz\"", "where the slope ends")],
        Kind::ScaleAndShift => &[("gain = \"0.5 ± 3 %\"", ""), ("bandwidth = \"at least 20 kHz\"", "")],
        Kind::AcNonInverting => &[("low_cutoff = \"at most 10 Hz\"", ""), ("bandwidth = \"at least 10 kHz\"", "")],
        Kind::AcInverting => &[("low_cutoff = \"at most 25 Hz\"", ""), ("bandwidth = \"at least 10 kHz\"", "")],
        Kind::SallenKeyLowPass | Kind::MultipleFeedbackLowPass => {
            &[("bandwidth = \"10 kHz ± 10 %\"", ""), ("peaking = \"at most 0.5 dB, thin above 0.3 dB\"", "0 dB: the flattest response")]
        }
        Kind::SallenKeyHighPass => {
            &[("low_cutoff = \"1 kHz ± 10 %\"", ""), ("peaking = \"at most 0.5 dB, thin above 0.3 dB\"", "0 dB: the flattest response")]
        }
        Kind::ComparatorInverting => &[("threshold_high = \"2.73 V ± 3 %\"", ""), ("threshold_low = \"2.27 V ± 3 %\"", "")],
        Kind::ComparatorNonInverting => &[("threshold_high = \"2.75 V ± 3 %\"", ""), ("threshold_low = \"2.25 V ± 3 %\"", "")],
        Kind::MultipleFeedbackBandPass => &[("natural_frequency = \"1 kHz ± 6 %\"", ""), ("q = \"between 4.5 and 5.5\"", "")],
    }
}

/// Whether a component stands in the block from the start: what is required, and what the kind is seldom built without.
fn stands(kind: Kind, component: &ComponentSpec) -> bool {
    component.required
        || matches!(
            (kind, component.name),
            (Kind::Transimpedance, "Cf")
                | (Kind::Charge | Kind::Integrator, "Rf")
                | (Kind::Instrumentation, "C2" | "C4")
                | (Kind::Differentiator, "Rin" | "Cf")
                | (Kind::AcNonInverting | Kind::AcInverting, "Cb")
                | (Kind::MultipleFeedbackBandPass, "R2")
        )
}

/// A value that makes a stage of modest gain out of parts that every stock room holds.
fn starting_value(kind: Kind, component: &ComponentSpec) -> &'static str {
    match (kind, component.name) {
        (Kind::Follower, "Rf") => "1k 1% 50ppm",
        (Kind::NonInverting, "Rf") => "9k1 1% 50ppm",
        (Kind::NonInverting, "Rg") => "1k 1% 50ppm",
        (Kind::Inverting, "Rin") => "4k7 1% 50ppm",
        (Kind::Inverting, "Rf") => "47k 1% 50ppm",
        (Kind::Inverting, "Rp") => "4k3 1% 50ppm",
        (Kind::Summing, "Rp") => "3k3 1% 50ppm",
        // Gain 10.
        (Kind::Difference, "R1" | "R3") => "10k 0.1% 25ppm",
        (Kind::Difference, "R2" | "R4") => "100k 0.1% 25ppm",
        // Gain 21.
        (Kind::Instrumentation, "Rg") => "200 0.1% 25ppm",
        (Kind::Instrumentation, "Rf1" | "Rf2") => "2k 0.1% 25ppm",
        (Kind::Instrumentation, "R1" | "R2" | "R3" | "R4") => "5k1 0.1% 25ppm",
        (Kind::Difference | Kind::Instrumentation, "C2" | "C4") => "10p 2%",
        (Kind::Transimpedance, "Rf" | "Rp") => "100k 1% 50ppm",
        (Kind::Transimpedance, "Cf") => "15p 5%",
        // 10 mV/pC; low corner 16 Hz.
        (Kind::Charge, "Cf") => "100p 1%",
        (Kind::Charge, "Rf" | "Rp") => "100M 5%",
        // |G| = 1 at 1.6 kHz, flat below 16 Hz.
        (Kind::Integrator, "Cf") => "10n 1%",
        (Kind::Integrator, "Rf") => "1M 1% 50ppm",
        // Slope 100 µs, up to 16 kHz.
        (Kind::Differentiator, "Cin") => "10n 1%",
        (Kind::Differentiator, "Rin") => "1k 1% 50ppm",
        (Kind::Differentiator, "Cf") => "1n 1%",
        // 0.5·Vin + 2.5 V from a reference of 2.5 V.
        (Kind::ScaleAndShift, "R1" | "Rg") => "20k 0.1% 25ppm",
        (Kind::ScaleAndShift, "R2" | "Rf") => "10k 0.1% 25ppm",
        (Kind::AcNonInverting | Kind::AcInverting, "Rb1" | "Rb2" | "Rb" | "Rf") => "100k 1% 50ppm",
        (Kind::AcNonInverting, "Cin") => "1u 10%",
        (Kind::AcNonInverting, "Cg") => "10u 10%",
        (Kind::AcInverting, "Cin") => "2u2 10%",
        (Kind::AcNonInverting | Kind::AcInverting, "Cb") => "10u 20%",
        // 10 kHz, Q 0.71.
        (Kind::SallenKeyLowPass, "C1") => "2n2 1%",
        (Kind::SallenKeyLowPass, "C2") => "1n1 1%",
        (Kind::MultipleFeedbackLowPass, "C1") => "3n3 1%",
        (Kind::MultipleFeedbackLowPass, "C2") => "750p 1%",
        // 1 kHz, Q 0.71.
        (Kind::SallenKeyHighPass, "R1") => "11k 1% 50ppm",
        (Kind::SallenKeyHighPass, "R2") => "22k 1% 50ppm",
        (Kind::SallenKeyHighPass, "C1" | "C2") => "10n 1%",
        (Kind::SallenKeyLowPass | Kind::SallenKeyHighPass, "Rf") => "1k 1% 50ppm",
        // 1 kHz, Q 5, gain −5.
        (Kind::MultipleFeedbackBandPass, "R1") => "16k 1% 50ppm",
        (Kind::MultipleFeedbackBandPass, "R2") => "1k8 1% 50ppm",
        (Kind::MultipleFeedbackBandPass, "R3") => "160k 1% 50ppm",
        (Kind::MultipleFeedbackBandPass, "C1" | "C2") => "10n 1%",
        // Thresholds half a volt apart around a reference of 2.5 V.
        (Kind::ComparatorInverting | Kind::ComparatorNonInverting, "R2" | "R3") => "100k 1% 50ppm",
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
                let standing = format!("\n{} = ", component.name);
                let optional = format!("\n# {} = ", component.name);
                assert!(text.contains(if stands(*kind, component) { &standing } else { &optional }), "{}: {}", kind.id(), component.name);
            }
        }
    }
}
