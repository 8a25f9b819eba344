//! Panels with plots: response, loop, noise, output envelope.

use maud::{Markup, html};
use stageleaf_math::{dimension::Dimension, figure::Figure};
use stageleaf_note::words;

use super::{briefs, round, scroll, value};
use crate::{Sheet, plot};

fn plots(sheet: &Sheet, start: &str, empty: &str) -> Markup {
    let charts = plot::charts(sheet, start);
    html! {
        @if charts.is_empty() { p class="aside" { (empty) } }
        @for chart in &charts { (plot::svg(chart)) }
        (plot::table(&charts))
    }
}

/// Of a comparator: output against signal.
pub fn transfer(sheet: &Sheet) -> Markup {
    html! {
        summary { "Transfer" }
        (briefs(sheet, &[Figure::ThresholdHigh, Figure::ThresholdLow, Figure::Hysteresis]))
        (plots(sheet, "transfer", "No threshold could be computed."))
    }
}

/// Transfer from source to load.
pub fn response(sheet: &Sheet) -> Markup {
    // Most kinds work down to DC, and have no lower edge to speak of.
    let low = plot::charts::nominal(sheet.report, Figure::LowCutoff).is_some();
    let figures = [Figure::Gain, Figure::LowCutoff, Figure::Bandwidth, Figure::Peaking];
    let shown: Vec<Figure> = figures.into_iter().filter(|f| low || *f != Figure::LowCutoff).collect();
    html! {
        summary { "Response" }
        (briefs(sheet, &shown))
        (plots(sheet, "response", "No response could be computed."))
    }
}

/// Return ratio with crossover and margins.
pub fn loop_gain(sheet: &Sheet) -> Markup {
    html! {
        summary { "Loop" }
        (briefs(sheet, &[Figure::Crossover, Figure::PhaseMargin, Figure::GainMargin, Figure::SensitivityPeak]))
        (plots(sheet, "loop", "The part states too little for the loop: its gain-bandwidth product is missing."))
    }
}

/// Density at the output, and what each source adds.
pub fn noise(sheet: &Sheet) -> Markup {
    let mut shares: Vec<_> = sheet.report.noise_shares.iter().collect();
    shares.sort_by(|a, b| b.share.total_cmp(&a.share));
    html! {
        summary { "Noise" }
        (briefs(sheet, &[Figure::OutputNoise, Figure::InputNoise, Figure::NoiseBandwidth, Figure::Snr]))
        (plots(sheet, "noise", "No noise density could be computed."))
        @if shares.len() > plot::charts::MOST_SOURCES { p class="aside" { "The plot shows the total and the four largest sources; all are in this table." } }
        @if shares.is_empty() { p class="aside" { "Shares need the band over which the noise is integrated." } }
        @else {
            (scroll("Noise by source", &html! { table class="shares" {
                caption { "At the output, over the band" @if let Some(b) = sheet.block.stage.band { " " (round(b.from, Dimension::Frequency)) " to " (round(b.to, Dimension::Frequency)) } }
                thead { tr { th scope="col" { "source" } th scope="col" { "rms" } th scope="col" { "share of the power" } td {} } }
                tbody { @for s in shares { tr {
                    th scope="row" { (words::origin_text(s.origin)) }
                    td { (value(s.rms, Dimension::Voltage)) }
                    td { (percent(s.share)) }
                    td { (bar(s.share)) }
                } } }
            } }))
        }
    }
}

/// Largest clean output against frequency.
pub fn envelope(sheet: &Sheet) -> Markup {
    html! {
        summary { "Output envelope" }
        (briefs(sheet, &[Figure::ClipMargin, Figure::CurrentMargin, Figure::SlewMargin, Figure::FullPowerBandwidth]))
        (plots(sheet, "envelope", "The envelope needs the supply, and headroom, current limit or slew rate of the part."))
    }
}

/// A share as a percentage with one decimal.
pub fn percent(share: f64) -> String {
    let percent = share * 100.0;
    if percent > 0.0 && percent < 0.05 {
        return "< 0.1 %".into();
    }
    if percent.abs() < 1e6 { format!("{percent:.1} %") } else { "–".into() }
}

/// A share as a bar.
pub fn bar(share: f64) -> Markup {
    let width = crate::sheet::whole(if share.is_finite() { share.clamp(0.0, 1.0) * 100.0 } else { 0.0 });
    html! { svg class="bar" viewBox="0 0 100 8" preserveAspectRatio="none" aria-hidden="true" { rect width=(width) height="8" {} } }
}
