//! A sheet that follows its values: the page's side of it.

use stageleaf_math::{Detail, kind::Kind, limit::Verdict};
use stageleaf_note::{Problem, template::template_for};
use stageleaf_sheet::{Section, Sheet, problems_markup, render, sections, sections_where};
use wasm_bindgen::{JsCast, JsError, JsValue, prelude::wasm_bindgen};
use web_sys::{Document, Element, Event, HtmlElement, HtmlInputElement, HtmlSelectElement, KeyboardEvent, MouseEvent};

use crate::{
    controls::{Action, Controls, set},
    data::Data,
    link,
    model::{Model, announcement},
    patch::{self, find},
    readout::Readout,
    step::{Step, step},
};

const PROBLEMS: &str = "problems";
/// The panel that shows every figure's range.
const FIGURES: &str = "figures";
const BODY: &str = ":scope > .stageleaf-body";
/// What an empty sheet starts with.
const FIRST_KIND: Kind = Kind::NonInverting;
const NEW_NAME: &str = "New stage";
const HINT: &str =
    "Change a value in the sheet: Enter takes it, Escape restores what stood before, ↑ and ↓ step it, Page keys by a decade.";

/// A typed value that could not be taken.
#[derive(Clone, Debug)]
struct Trouble {
    path: String,
    typed: String,
    problems: Vec<Problem>,
}

/// What the next frame has to do.
#[derive(Clone, Debug)]
enum Work {
    /// A value typed or stepped.
    Edit { path: String, value: String },
    /// The block as it stood when a field took the focus.
    Restore(String),
    /// The whole sheet again.
    Show,
}

/// One live sheet. `element.js` owns it, and drops it when anything fails.
#[wasm_bindgen]
#[derive(Debug)]
pub struct Live {
    document: Document,
    host: HtmlElement,
    body: Element,
    controls: Controls,
    model: Model,
    shown: Vec<Section>,
    /// In the order of their paths.
    troubles: Vec<Trouble>,
    notices: Vec<Problem>,
    work: Option<Work>,
    readout: Readout,
    entered: Option<Entered>,
    /// Whether the sheet is no note's.
    empty: bool,
}

/// A field as it stood when it took the focus, or when its value was last taken by Enter.
#[derive(Clone, Debug)]
struct Entered {
    path: String,
    /// The field's text.
    text: String,
    /// The block's.
    block: String,
}

#[wasm_bindgen]
impl Live {
    /// Makes the sheet in `host` live. `fragment` is the page's address after `#`.
    #[wasm_bindgen(constructor)]
    pub fn new(host: HtmlElement, fragment: &str) -> Result<Live, JsError> {
        let document = host.owner_document().ok_or_else(|| JsError::new("the sheet is in no document"))?;
        let json = find(&host, ":scope > script[type='application/json']").and_then(|script| script.text_content()).unwrap_or_default();
        let data = Data::read(&json).map_err(|words| JsError::new(&words))?;
        let empty = data.block.is_none();
        let start = data.shelf.parts.first().map(|first| template_for(FIRST_KIND, NEW_NAME, &first.part.id)).unwrap_or_default();
        let model = Model::new(data, &start).map_err(|problems| refusal(&problems))?;
        let refused = || JsError::new("the page takes no elements");
        let body = if empty {
            empty_body(&document, &host, &model).ok_or_else(refused)?
        } else {
            find(&host, BODY).ok_or_else(|| JsError::new("the sheet has no static body"))?
        };
        let mut controls = Controls::new(&document, HINT).ok_or_else(refused)?;
        if empty {
            let kinds: Vec<(&str, &str)> = Kind::ALL.iter().map(|kind| (kind.id(), kind.spec().title)).collect();
            let parts: Vec<(&str, &str)> =
                model.shelf().parts.iter().map(|entry| (entry.part.id.as_str(), entry.part.name.as_str())).collect();
            controls.introduce("A made-up stage to start from: put your own values in place of these.");
            controls.choose("kind", "Stage kind", &kinds);
            controls.choose("part", "Part", &parts);
        }
        let shown = rendered(&model, &name_of(&host));
        let mut live = Self {
            document,
            host,
            body,
            controls,
            model,
            shown,
            troubles: Vec::new(),
            notices: Vec::new(),
            work: None,
            readout: Readout::default(),
            entered: None,
            empty,
        };
        live.verify();
        live.host.prepend_with_node_1(live.controls.element()).map_err(|_| refused())?;
        live.follow(fragment);
        set(&live.host, "data-live", "");
        live.settle();
        Ok(live)
    }

    /// Takes an event that reached the host. Returns whether a frame is wanted.
    pub fn on(&mut self, event: &Event) -> bool {
        let Some(target) = event.target().and_then(|target| target.dyn_into::<Element>().ok()) else { return false };
        match event.type_().as_str() {
            "keydown" => {
                if let Some(key) = event.dyn_ref::<KeyboardEvent>() {
                    self.key(key, &target);
                }
            }
            "change" => {
                if let Some(input) = value_input(&target) {
                    self.typed(&input);
                } else if let Some(choice) = target.dyn_ref::<HtmlSelectElement>() {
                    self.choose(choice);
                }
            }
            "pointermove" => {
                if let Some(pointer) = event.dyn_ref::<MouseEvent>() {
                    let Self { readout, body, model, host, .. } = self;
                    with_sheet(model, &name_of(host), |sheet| readout.point(sheet, body, pointer, &target));
                }
            }
            "pointerleave" => self.readout.hide(&self.body),
            "focusin" => {
                let Self { readout, model, host, .. } = self;
                with_sheet(model, &name_of(host), |sheet| readout.focus(sheet, &target));
                self.entered = value_input(&target).map(|input| self.entered(&input));
            }
            // A panel that opens before its time gets its content at once.
            "toggle" => self.complete(),
            "click" => {
                if let Some(action) = Action::of(&target) {
                    self.act(action);
                }
            }
            _ => {}
        }
        self.work.is_some()
    }

    /// Does what events asked for since the last frame: the drawing, the limits and the panels that are open.
    pub fn draw(&mut self) {
        let before = self.model.verdicts();
        match self.work.take() {
            None => return,
            Some(work) => self.work(work),
        }
        self.show(&before);
    }

    /// Whether something is left for [`Live::complete`].
    pub fn behind(&self) -> bool {
        self.model.is_behind()
    }

    /// Does what the last frame left: closed panels, and the ranges of figures that no limit judges.
    pub fn complete(&mut self) {
        if self.model.is_behind() {
            self.model.complete(Detail::Full);
            self.patch(|_, _| true);
        }
    }

    /// Follows the page's address when it changes.
    pub fn follow(&mut self, fragment: &str) {
        let before = self.model.verdicts();
        let found = link::read(fragment, &name_of(&self.host));
        if found != link::Found::Nothing {
            self.notices = self.model.follow(found);
            self.troubles.clear();
            self.entered = None;
            self.show(&before);
        }
    }
}

impl Live {
    fn key(&mut self, event: &KeyboardEvent, target: &Element) {
        let plain = !(event.ctrl_key() || event.meta_key() || event.alt_key());
        let key = event.key();
        if plain && key != "Escape" {
            // Books turn pages and open searches at single keys.
            event.stop_propagation();
        }
        if !plain && !event.alt_key() {
            let way = match (key.to_ascii_lowercase().as_str(), event.shift_key()) {
                ("z", false) => Action::Undo,
                ("z", true) | ("y", _) => Action::Redo,
                _ => return,
            };
            // Inside a half-typed value the browser's own undo is meant.
            if value_input(target).is_none_or(|input| self.accepted(&input).is_some_and(|text| text == input.value())) {
                event.prevent_default();
                self.act(way);
            }
            return;
        }
        if !plain {
            return;
        }
        let Some(input) = value_input(target) else {
            let Self { readout, model, host, .. } = self;
            if with_sheet(model, &name_of(host), |sheet| readout.key(sheet, &key, target)) == Some(true) {
                event.prevent_default();
            }
            return;
        };
        let way = match key.as_str() {
            "Enter" => {
                event.prevent_default();
                self.typed(&input);
                // What Enter took stands; a later Escape goes back to it.
                self.entered = None;
                return;
            }
            "Escape" => return self.restore(&input, event),
            "ArrowUp" => Step::Up,
            "ArrowDown" => Step::Down,
            "PageUp" => Step::DecadeUp,
            "PageDown" => Step::DecadeDown,
            _ => return,
        };
        let path = path_of(&input);
        let next = step(&path, &input.value(), way, self.model.block().stage.kind, self.model.settings());
        if let Some(next) = next {
            event.prevent_default();
            if self.entered.as_ref().is_none_or(|entered| entered.path != path) {
                self.entered = Some(self.entered(&input));
            }
            input.set_value(&next);
            self.ask(path, next);
        }
    }

    /// Another kind or part, where the sheet is not a note's.
    fn choose(&mut self, choice: &HtmlSelectElement) {
        let value = choice.value();
        let part = self.model.block().stage.part.id.clone();
        let before = self.model.verdicts();
        let result = match choice.name().as_str() {
            "kind" => Kind::from_id(&value).map_or(Ok(()), |kind| self.model.replace(&template_for(kind, NEW_NAME, &part))),
            "part" => self.model.edit("part", &value),
            _ => return,
        };
        self.troubles.clear();
        self.entered = None;
        self.notices = result.err().unwrap_or_default();
        self.show(&before);
    }

    /// The text that the sheet has for an input.
    fn accepted(&self, input: &HtmlInputElement) -> Option<String> {
        input.get_attribute("value").or_else(|| self.model.block().field(&path_of(input)).map(|field| field.text.clone()))
    }

    /// What Escape in `input` goes back to from now on.
    fn entered(&self, input: &HtmlInputElement) -> Entered {
        Entered { path: path_of(input), text: self.accepted(input).unwrap_or_default(), block: self.model.block().text.clone() }
    }

    fn restore(&mut self, input: &HtmlInputElement, event: &KeyboardEvent) {
        let path = path_of(input);
        let Entered { text, block, .. } = self.entered.take().filter(|entered| entered.path == path).unwrap_or_else(|| self.entered(input));
        let pending = matches!(&self.work, Some(Work::Edit { path: other, .. }) if *other == path);
        let stepped = block != self.model.block().text;
        if text != input.value() || self.trouble(&path).is_some() || pending || stepped {
            event.stop_propagation();
            input.set_value(&text);
            self.forget(&path);
            self.work = Some(Work::Restore(block));
        }
    }

    fn typed(&mut self, input: &HtmlInputElement) {
        let (path, value) = (path_of(input), input.value());
        if self.accepted(input).as_deref() == Some(value.as_str()) && self.trouble(&path).is_none() {
            return;
        }
        self.ask(path, value);
    }

    /// Leaves an edit for the next frame; one of another value that still waits is done first.
    fn ask(&mut self, path: String, value: String) {
        match self.work.take() {
            Some(Work::Edit { path: other, .. }) if other == path => {}
            Some(work) => self.work(work),
            None => {}
        }
        self.work = Some(Work::Edit { path, value });
    }

    fn work(&mut self, work: Work) {
        match work {
            Work::Show => {}
            Work::Edit { path, value } => self.edit(path, value),
            // The text was in use before, so it can be read.
            Work::Restore(text) => self.notices = self.model.replace(&text).err().unwrap_or_default(),
        }
    }

    fn edit(&mut self, path: String, value: String) {
        match self.model.edit(&path, value.trim()) {
            Ok(()) => self.forget(&path),
            Err(problems) => {
                self.forget(&path);
                let at = self.troubles.partition_point(|trouble| trouble.path < path);
                self.troubles.insert(at, Trouble { path, typed: value, problems });
            }
        }
    }

    fn trouble(&self, path: &str) -> Option<&Trouble> {
        self.troubles.iter().find(|trouble| trouble.path == path)
    }

    fn forget(&mut self, path: &str) {
        self.troubles.retain(|trouble| trouble.path != path);
    }

    fn act(&mut self, action: Action) {
        if self.work.is_some() {
            self.draw();
        }
        let way = match action {
            Action::Undo => self.model.undo(),
            Action::Redo => self.model.redo(),
            Action::Reset => self.model.reset(),
            Action::Copy => {
                let block = self.model.block().text.trim_end();
                return self.controls.offer("The block as it is now, for the note", &format!("```stageleaf\n{block}\n```"));
            }
            Action::Link => return self.link(),
        };
        self.troubles.clear();
        self.entered = None;
        self.notices = way.err().unwrap_or_default();
        self.work = Some(Work::Show);
    }

    /// Puts the changed values into the address, by whichever way the page allows, and shows the address.
    fn link(&self) {
        let Some(window) = web_sys::window() else { return };
        let location = window.location();
        let now = location.hash().unwrap_or_default();
        let fragment = format!("#{}", link::write(now.trim_start_matches('#'), &name_of(&self.host), &self.model.changes()));
        let replaced = window.history().and_then(|history| history.replace_state_with_url(&JsValue::NULL, "", Some(&fragment)));
        if replaced.is_err() {
            // In a frame whose page is inline only this way is allowed; where neither is, the text is still there to copy.
            let _ = location.set_hash(&fragment);
        }
        let href = location.href().unwrap_or_default();
        let base = href.split('#').next().unwrap_or_default();
        self.controls.offer("Address of the sheet with these values", &format!("{base}{fragment}"));
    }

    /// Renders what can be seen, patches what differs, tells what changed.
    fn show(&mut self, before: &[(String, Verdict)]) {
        if self.model.is_behind() {
            let open = self.open_panels();
            if !open.is_empty() {
                self.model.complete(Detail::Judged);
            }
            if open.iter().any(|id| id == FIGURES) {
                self.model.complete(Detail::Full);
            }
            self.patch(|id, panel| !panel || open.iter().any(|o| o == id));
        } else {
            self.patch(|_, _| true);
        }
        if let Some(words) = announcement(before, &self.model.verdicts()) {
            self.controls.say(&words);
        } else if !self.troubles.is_empty() {
            self.controls.say("The value was not taken; the sheet still shows the last good one.");
        } else {
            self.controls.say("");
        }
        self.settle();
    }

    /// Renders the sections that `wanted` admits and patches those whose markup differs from what is shown.
    fn patch(&mut self, wanted: impl Fn(&str, bool) -> bool) {
        let fresh = with_sheet(&self.model, &name_of(&self.host), |sheet| sections_where(sheet, wanted)).unwrap_or_default();
        for section in fresh {
            let Some(shown) = self.shown.iter().position(|shown| shown.id == section.id) else { continue };
            // What is wrong with typed text is shown there by `settle`; the renderer leaves it empty.
            if section.id == PROBLEMS || self.shown[shown] == section {
                continue;
            }
            if let (Some(new), Some(old)) = (patch::parse(&self.document, &section.markup), self.section(section.id)) {
                patch::children(&old, &new);
                show_unless(&old, section.markup.is_empty());
            }
            self.shown[shown] = section;
        }
    }

    /// The panels that the reader has opened.
    fn open_panels(&self) -> Vec<String> {
        let Ok(open) = self.body.query_selector_all(":scope > details[open]") else { return Vec::new() };
        (0..open.length()).filter_map(|index| open.item(index)?.dyn_into::<Element>().ok()?.get_attribute("data-section")).collect()
    }

    fn section(&self, id: &str) -> Option<Element> {
        find(&self.body, &format!(":scope > [data-section='{id}']"))
    }

    /// Inputs, marks and buttons as the model has them.
    fn settle(&self) {
        let Ok(inputs) = self.body.query_selector_all("input[data-path]") else { return };
        for input in (0..inputs.length()).filter_map(|index| inputs.item(index)?.dyn_into::<HtmlInputElement>().ok()) {
            if let Some(trouble) = self.trouble(&path_of(&input)) {
                set(&input, "aria-invalid", "true");
                set(&input, "aria-errormessage", &self.problems_id());
                if input.value() != trouble.typed {
                    input.set_value(&trouble.typed);
                }
            } else {
                let _ = input.remove_attribute("aria-invalid");
                let _ = input.remove_attribute("aria-errormessage");
                let text = input.get_attribute("value").unwrap_or_default();
                if input.value() != text {
                    input.set_value(&text);
                }
            }
        }
        self.explain();
        self.controls.allow(self.model.ways());
        let stage = &self.model.block().stage;
        // The verdicts of values that nobody chose are no news.
        if self.empty && self.model.block().text == template_for(stage.kind, NEW_NAME, &stage.part.id) {
            set(&self.host, "data-start", "");
        } else {
            let _ = self.host.remove_attribute("data-start");
        }
        self.controls.chosen(&[("kind", stage.kind.id()), ("part", &stage.part.id)]);
    }

    /// The section of problems: what typed values and links were refused, and why.
    fn explain(&self) {
        let Some(section) = self.section(PROBLEMS) else { return };
        let problems: Vec<Problem> = self.troubles.iter().flat_map(|trouble| &trouble.problems).chain(&self.notices).cloned().collect();
        section.set_inner_html(&problems_markup(&problems));
        if let Some(list) = section.first_element_child() {
            list.set_id(&self.problems_id());
        }
        show_unless(&section, problems.is_empty());
    }

    fn problems_id(&self) -> String {
        format!("{}.problems", name_of(&self.host))
    }

    /// The page's static sheet is left as it is where it is the document that this crate renders, and mended where not.
    fn verify(&self) {
        for section in &self.shown {
            let (Some(new), Some(old)) = (patch::parse(&self.document, &section.markup), self.section(section.id)) else { continue };
            if patch::same(&old, &new) {
                continue;
            }
            patch::tidy(&old);
            if !patch::same(&old, &new) {
                set(&self.host, "data-mended", section.id);
                patch::children(&old, &new);
            }
        }
    }
}

fn rendered(model: &Model, id: &str) -> Vec<Section> {
    with_sheet(model, id, sections).unwrap_or_default()
}

/// What the renderer takes. The block was read with this shelf, so its part is on it.
fn with_sheet<T>(model: &Model, id: &str, work: impl FnOnce(&Sheet) -> T) -> Option<T> {
    let block = model.block();
    let part = model.shelf().find(&block.stage.part.id)?;
    Some(work(&Sheet { block, report: model.report(), part, id }))
}

/// The place of a sheet that no note brought.
fn empty_body(document: &Document, host: &HtmlElement, model: &Model) -> Option<Element> {
    let whole = with_sheet(model, &name_of(host), render)?;
    host.set_text_content(None);
    host.append_child(&*patch::parse(document, &whole)?).ok()?;
    find(host, BODY)
}

/// An open section without content is hidden; a panel says why it is empty.
fn show_unless(section: &Element, empty: bool) {
    if empty {
        set(section, "hidden", "");
    } else {
        // Removing what is not there is no failure.
        let _ = section.remove_attribute("hidden");
    }
}

fn refusal(problems: &[Problem]) -> JsError {
    JsError::new(&problems.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n"))
}

/// The sheet's name, with which every id in it starts. The host itself has none: a note's heading often has that one.
fn name_of(host: &HtmlElement) -> String {
    host.get_attribute("data-sheet").unwrap_or_default()
}

fn value_input(target: &Element) -> Option<HtmlInputElement> {
    target.dyn_ref::<HtmlInputElement>().filter(|input| input.has_attribute("data-path")).cloned()
}

fn path_of(input: &HtmlInputElement) -> String {
    input.get_attribute("data-path").unwrap_or_default()
}

/// Every figure of a sheet's data as `id value low high`, numbers as the hexadecimal bits of an IEEE 754 double, one
/// figure a line: what the browser computed, for comparison with the native result bit by bit.
#[wasm_bindgen]
pub fn figures_bits(json: &str) -> Result<String, JsError> {
    let data = Data::read(json).map_err(|words| JsError::new(&words))?;
    let model = Model::new(data, "").map_err(|problems| refusal(&problems))?;
    let bits = |value: f64| format!("{:016x}", value.to_bits());
    let line = |row: &stageleaf_math::report::FigureRow| {
        let value = row.nominal.value().map_or_else(|| "-".to_owned(), bits);
        let (low, high) = row.range.map_or_else(|| ("-".to_owned(), "-".to_owned()), |(low, high)| (bits(low), bits(high)));
        format!("{}\t{value}\t{low}\t{high}", stageleaf_note::query_text(row.query))
    };
    Ok(model.report().figures.iter().map(line).collect::<Vec<_>>().join("\n"))
}
