//! What a page gives its sheet: the JSON of the element's `<script type="application/json">`.

use js_sys::{Array, JSON, Reflect};
use stageleaf_note::{Settings, Shelf, ShelfPart, read_part, read_settings};
use wasm_bindgen::JsValue;

/// A text with the name of the file that it comes from.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct FileText {
    /// The file, as messages name it.
    pub file: String,
    /// Its text.
    pub text: String,
}

/// The page's data, read.
#[derive(Clone, Debug, Default)]
pub struct Data {
    /// The block; absent in an empty sheet.
    pub block: Option<String>,
    /// The note.
    pub file: String,
    /// Line of the block's first line in the note.
    pub line: usize,
    /// The parts that the sheet may use.
    pub shelf: Shelf,
    /// The team's settings.
    pub settings: Settings,
}

impl Data {
    /// Reads the element's JSON.
    ///
    /// # Errors
    /// Words for the reader: text that is not JSON, a part file or settings that cannot be read.
    pub fn read(json: &str) -> Result<Self, String> {
        let value = JSON::parse(json).map_err(|_| "the sheet's data are not JSON".to_owned())?;
        let mut parts: Vec<FileText> = Array::from(&key(&value, "shelf").filter(Array::is_array).unwrap_or_else(|| Array::new().into()))
            .iter()
            .filter_map(|part| file_text(&part))
            .collect();
        parts.extend(key(&value, "part").as_ref().and_then(file_text));
        let mut shelf = Shelf::default();
        for FileText { file, text } in parts {
            let part = read_part(&text, &file).map_err(|problems| words(&problems))?;
            shelf.parts.push(ShelfPart { part, file, text });
        }
        let settings = match key(&value, "settings").as_ref().and_then(file_text) {
            Some(FileText { file, text }) => read_settings(&text, &file).map_err(|problems| words(&problems))?,
            None => Settings::default(),
        };
        let line = key(&value, "line").and_then(|line| line.as_f64()).filter(|line| (1.0..1e9).contains(line)).unwrap_or(1.0);
        Ok(Self {
            block: text(&value, "block"),
            file: text(&value, "file").unwrap_or_default(),
            #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "between 1 and 1e9; a fraction is dropped")]
            line: line as usize,
            shelf,
            settings,
        })
    }
}

fn words(problems: &[stageleaf_note::Problem]) -> String {
    problems.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n")
}

fn key(value: &JsValue, name: &str) -> Option<JsValue> {
    Reflect::get(value, &JsValue::from_str(name)).ok().filter(|found| !found.is_undefined() && !found.is_null())
}

fn text(value: &JsValue, name: &str) -> Option<String> {
    key(value, name)?.as_string()
}

fn file_text(value: &JsValue) -> Option<FileText> {
    Some(FileText { file: text(value, "file")?, text: text(value, "text")? })
}
