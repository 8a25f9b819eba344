//! What the script adds above a sheet: actions, messages, text to copy. None of it is part of the static document.

use wasm_bindgen::JsCast;
use web_sys::{Document, Element, HtmlDocument, HtmlSelectElement, HtmlTextAreaElement};

use crate::patch::BY_SCRIPT;

/// An action of the sheet.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Action {
    /// Takes the last change back.
    Undo,
    /// Makes it again.
    Redo,
    /// The note's own values.
    Reset,
    /// The block as text.
    Copy,
    /// An address with the changed values.
    Link,
}

const ACTIONS: [(Action, &str, &str); 5] = [
    (Action::Undo, "undo", "Undo"),
    (Action::Redo, "redo", "Redo"),
    (Action::Reset, "reset", "Back to the note"),
    (Action::Copy, "copy", "Copy as note block"),
    (Action::Link, "link", "Link to these values"),
];

impl Action {
    /// The action of the button at or around `target`.
    pub fn of(target: &Element) -> Option<Self> {
        let button = target.closest("button[data-act]").ok()??;
        // A button that is off stays focusable, and does nothing.
        if button.get_attribute("aria-disabled").as_deref() == Some("true") {
            return None;
        }
        let name = button.get_attribute("data-act")?;
        ACTIONS.iter().find(|(_, id, _)| *id == name).map(|(action, ..)| *action)
    }
}

/// Characters that surely stand beside each other in the box of text to copy, on a phone too.
const COLUMNS: usize = 34;

/// The bar above the sheet.
#[derive(Clone, Debug)]
pub struct Controls {
    document: Document,
    bar: Element,
    said: Element,
    out: Element,
}

impl Controls {
    /// Builds the bar; the caller puts [`Controls::element`] into the page.
    pub fn new(document: &Document, hint: &str) -> Option<Self> {
        let bar = document.create_element("div").ok()?;
        bar.set_class_name("stageleaf-bar");
        set(&bar, BY_SCRIPT, "");
        set(&bar, "role", "group");
        set(&bar, "aria-label", "Try other values");
        let buttons = add(document, &bar, "div", "stageleaf-actions")?;
        for (_, name, words) in ACTIONS {
            let button = add(document, &buttons, "button", "")?;
            set(&button, "type", "button");
            set(&button, "data-act", name);
            button.set_text_content(Some(words));
        }
        add(document, &bar, "p", "stageleaf-hint")?.set_text_content(Some(hint));
        let said = add(document, &bar, "p", "stageleaf-said")?;
        set(&said, "role", "status");
        let out = add(document, &bar, "div", "stageleaf-out")?;
        Some(Self { document: document.clone(), bar, said, out })
    }

    /// The whole bar.
    pub const fn element(&self) -> &Element {
        &self.bar
    }

    /// Says `words` once, to eyes and to a screen reader.
    pub fn say(&self, words: &str) {
        self.said.set_text_content(Some(words));
    }

    /// Says what the sheet starts with, as long as it is that.
    pub fn introduce(&self, words: &str) {
        if let Some(line) = add(&self.document, &self.bar, "p", "stageleaf-start") {
            line.set_text_content(Some(words));
            // First in the bar, which takes elements.
            let _ = self.bar.insert_before(&line, self.bar.first_child().as_ref());
        }
        // No note is there to go back to.
        if let Ok(Some(button)) = self.bar.query_selector("[data-act=reset]") {
            button.set_text_content(Some("Back to the start"));
        }
    }

    /// Adds a choice, for a sheet that is not a note's.
    pub fn choose(&mut self, name: &str, label: &str, choices: &[(&str, &str)]) {
        let Ok(field) = self.document.create_element("label") else { return };
        field.set_text_content(Some(label));
        let Some(select) = add(&self.document, &field, "select", "") else { return };
        set(&select, "name", name);
        for (value, words) in choices {
            if let Some(option) = add(&self.document, &select, "option", "") {
                set(&option, "value", value);
                option.set_text_content(Some(words));
            }
        }
        // Before the hint; a bar takes elements.
        let _ = self.bar.insert_before(&field, self.said.previous_sibling().as_ref());
    }

    /// Shows what is chosen.
    pub fn chosen(&self, values: &[(&str, &str)]) {
        for (name, value) in values {
            let found = self.bar.query_selector(&format!("select[name={name}]")).ok().flatten();
            if let Some(select) = found.and_then(|found| found.dyn_into::<HtmlSelectElement>().ok()) {
                select.set_value(value);
            }
        }
    }

    /// Turns actions on and off.
    pub fn allow(&self, [undo, redo, reset]: [bool; 3]) {
        for (name, on) in [("undo", undo), ("redo", redo), ("reset", reset)] {
            if let Ok(Some(button)) = self.bar.query_selector(&format!("[data-act={name}]")) {
                if on {
                    let _ = button.remove_attribute("aria-disabled");
                } else {
                    set(&button, "aria-disabled", "true");
                }
            }
        }
    }

    /// Shows `text` to be copied, and tries to copy it.
    pub fn offer(&self, label: &str, text: &str) {
        self.out.set_text_content(None);
        let Some(heading) = add(&self.document, &self.out, "label", "") else { return };
        let area = add(&self.document, &heading, "textarea", "").and_then(|area| area.dyn_into::<HtmlTextAreaElement>().ok());
        let Some(area) = area else { return };
        heading.prepend_with_str_1(label).unwrap_or_default();
        area.set_read_only(true);
        area.set_value(text);
        // A long line wraps; on a narrow page it takes more rows than these, and the box can be drawn larger.
        let rows: usize = text.lines().map(|line| line.chars().count().div_ceil(COLUMNS).max(1)).sum();
        area.set_rows(u32::try_from(rows).unwrap_or(1).clamp(1, 20));
        area.select();
        // The clipboard's own interface is refused in sandboxed frames; this older one works there.
        let copied = self.document.dyn_ref::<HtmlDocument>().and_then(|document| document.exec_command("copy").ok()).unwrap_or(false);
        self.say(if copied { "Copied. The text stands below as well." } else { "Select the text below and copy it." });
    }
}

fn add(document: &Document, parent: &Element, name: &str, class: &str) -> Option<Element> {
    let element = document.create_element(name).ok()?;
    if !class.is_empty() {
        element.set_class_name(class);
    }
    parent.append_child(&element).ok()?;
    Some(element)
}

/// Sets an attribute whose name is a plain word: that cannot fail.
pub fn set(element: &Element, name: &str, value: &str) {
    let _ = element.set_attribute(name, value);
}
