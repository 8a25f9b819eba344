//! The readout of a plot: what the curves are at the pointer, or at the point that keys move along.

use stageleaf_sheet::{
    Sheet,
    plot::{Reading, reading, reading_near},
};
use wasm_bindgen::JsCast;
use web_sys::{Element, MouseEvent};

use crate::{controls::set, patch::find};

/// Points that a Page key goes.
const PAGE: usize = 10;

/// Where the readout stands.
#[derive(Clone, Debug, Default)]
pub struct Readout {
    plot: String,
    index: usize,
}

impl Readout {
    /// Follows the pointer over a plot; elsewhere nothing is shown.
    pub fn point(&mut self, sheet: &Sheet, body: &Element, event: &MouseEvent, target: &Element) {
        let Some((figure, plot)) = figure_of(target) else { return self.hide(body) };
        let Some(svg) = find(&figure, "svg") else { return };
        let bounds = svg.get_bounding_client_rect();
        let width = svg.get_attribute("viewBox").and_then(|view| view.split_whitespace().nth(2)?.parse::<u32>().ok());
        let Some(width) = width.map(f64::from).filter(|_| bounds.width() > 0.0) else { return };
        let x = (f64::from(event.client_x()) - bounds.left()) / bounds.width() * width;
        let found = reading_near(sheet, &plot, x);
        self.show(&figure, plot, found);
    }

    /// Moves along a plot's points by key. Returns whether the key meant something here.
    pub fn key(&mut self, sheet: &Sheet, key: &str, target: &Element) -> bool {
        let Some((figure, plot)) = figure_of(target) else { return false };
        let points = figure.get_attribute("data-points").and_then(|count| count.parse::<usize>().ok()).unwrap_or(1);
        let now = if self.plot == plot { self.index } else { 0 };
        let index = match key {
            "ArrowRight" => now + 1,
            "ArrowLeft" => now.saturating_sub(1),
            "PageUp" => now + PAGE,
            "PageDown" => now.saturating_sub(PAGE),
            "Home" => 0,
            "End" => points,
            _ => return false,
        };
        let found = reading(sheet, &plot, index.min(points.saturating_sub(1)));
        self.show(&figure, plot, found);
        true
    }

    /// Shows the point at which the readout stood last when a plot takes the focus.
    pub fn focus(&mut self, sheet: &Sheet, target: &Element) {
        if let Some((figure, plot)) = figure_of(target) {
            let index = if self.plot == plot { self.index } else { 0 };
            let found = reading(sheet, &plot, index);
            self.show(&figure, plot, found);
        }
    }

    /// Takes the readout away.
    pub fn hide(&mut self, body: &Element) {
        if self.plot.is_empty() {
            return;
        }
        let plot = std::mem::take(&mut self.plot);
        if let Some(figure) = find(body, &format!("figure[data-plot='{plot}']")) {
            put(&figure, None);
        }
    }

    fn show(&mut self, figure: &Element, plot: String, found: Option<Reading>) {
        put(figure, found.as_ref());
        self.index = found.map_or(0, |reading| reading.index);
        self.plot = plot;
    }
}

fn put(figure: &Element, reading: Option<&Reading>) {
    if let Some(line) = find(figure, "line.cursor") {
        if let Some(reading) = reading {
            let x = format!("{:.1}", reading.x);
            set(&line, "x1", &x);
            set(&line, "x2", &x);
        }
        set(&line, "visibility", if reading.is_some() { "visible" } else { "hidden" });
    }
    if let Some(output) = find(figure, "output") {
        output.set_text_content(Some(reading.map_or("", |reading| &reading.text)));
    }
}

fn figure_of(target: &Element) -> Option<(Element, String)> {
    // Only the drawing itself: the table behind it has keys of its own.
    target.closest("svg").ok()??;
    let figure = target.closest("figure[data-plot]").ok()??.unchecked_into::<Element>();
    let plot = figure.get_attribute("data-plot")?;
    Some((figure, plot))
}
