//! The book preprocessor: each `stageleaf` fence of a chapter becomes a static sheet, which the script then makes live.
//!
//! One function, [`book`], serves both ways in: the demo's builder, which drives mdBook as a library, and
//! `stageleaf embed`, which a book of your own names as its preprocessor:
//!
//! ```toml
//! [preprocessor.stageleaf]
//! command = "stageleaf embed"
//! after = ["links"]
//! ```
//!
//! A sheet is one line inside a `<div>`: only such a line is an HTML block wherever it stands, and without a blank
//! line inside nothing of it is read as Markdown (a tag with a dash alone is not enough: smart punctuation then turns
//! the quotes of its data curly).

use std::{
    collections::BTreeSet,
    fs,
    io::{Read, Write},
    ops::Range,
    path::{Path, PathBuf},
    sync::Arc,
};

use serde_json::{Value, json};
use stageleaf_note::{Block, Problem, Shelf, ShelfPart, read_note, slug};
use stageleaf_sheet::Sheet;

use crate::team::{SETTINGS_FILE, Team, Teams};

/// What a chapter is read with.
#[derive(Clone, Debug)]
pub struct Surroundings {
    /// The note's path, as messages and the sheet name it.
    pub file: String,
    /// Its settings and shelf.
    pub team: Arc<Team>,
    /// The settings file itself, which the page reads again.
    pub settings: Option<SettingsText>,
}

/// A settings file as the page takes it along.
#[derive(Clone, Debug)]
pub struct SettingsText {
    /// Its path, as messages name it.
    pub file: String,
    /// Its text.
    pub text: String,
}

impl SettingsText {
    /// The settings that hold for `note`: the nearest at or above its folder.
    #[must_use]
    pub fn of(note: &Path) -> Option<Self> {
        let real = fs::canonicalize(note).ok()?;
        let path = real.ancestors().map(|folder| folder.join(SETTINGS_FILE)).find(|path| path.is_file())?;
        Some(Self { file: SETTINGS_FILE.to_owned(), text: fs::read_to_string(path).ok()? })
    }
}

/// Runs as mdBook's preprocessor: `supports RENDERER` answers by its result, else a book is read, changed and written.
///
/// # Errors
/// Input that is not what mdBook sends; reading or writing that failed.
pub fn command(args: &[String], mut input: impl Read, mut output: impl Write, mut words: impl Write) -> Result<bool, String> {
    if let [verb, renderer] = args
        && verb == "supports"
    {
        return Ok(renderer == "html");
    }
    if !args.is_empty() {
        return Err(format!(
            "embed: {} is not known\n  allowed: nothing (a book on standard input), or `supports RENDERER`",
            args.join(" ")
        ));
    }
    let mut text = String::new();
    input.read_to_string(&mut text).map_err(|error| format!("embed: standard input: {error}"))?;
    let sent: Value = serde_json::from_str(&text).map_err(|error| format!("embed: standard input is not what mdBook sends: {error}"))?;
    let Value::Array(mut pair) = sent else {
        return Err("embed: standard input is not what mdBook sends: a list of context and book".to_owned());
    };
    let (Some(mut changed), Some(context)) = (pair.pop(), pair.pop()) else {
        return Err("embed: standard input is not what mdBook sends: a list of context and book".to_owned());
    };
    // Files are named as seen from the book's root, not by where it stands on this machine.
    let root = PathBuf::from(context["root"].as_str().unwrap_or("."));
    std::env::set_current_dir(&root).map_err(|error| format!("embed: {}: {error}", root.display()))?;
    let source = context["config"]["book"]["src"].as_str().unwrap_or("src").to_owned();
    let mut teams = Teams::new(None);
    let problems = book(&mut changed, &mut |chapter| {
        let note = Path::new(&source).join(chapter);
        // A chapter that another preprocessor made has no file: its folder still has a team.
        let near = note.ancestors().find(|path| path.exists()).unwrap_or(Path::new("."));
        Surroundings { file: format!("{source}/{chapter}"), team: teams.of(near), settings: SettingsText::of(near) }
    });
    for fault in teams.take_faults() {
        writeln!(words, "{fault}").map_err(|error| error.to_string())?;
    }
    for problem in problems {
        writeln!(words, "{problem}").map_err(|error| error.to_string())?;
    }
    serde_json::to_writer(&mut output, &changed).map_err(|error| format!("embed: standard output: {error}"))?;
    Ok(true)
}

/// Changes every chapter of a book as mdBook hands it over (`items`; `sections` in older versions) and tells what was wrong.
pub fn book(book: &mut Value, surroundings: &mut dyn FnMut(&str) -> Surroundings) -> Vec<Problem> {
    let mut ids = BTreeSet::new();
    let mut problems = Vec::new();
    let key = if book["items"].is_array() { "items" } else { "sections" };
    items(&mut book[key], surroundings, &mut ids, &mut problems);
    problems
}

fn items(list: &mut Value, surroundings: &mut dyn FnMut(&str) -> Surroundings, ids: &mut BTreeSet<String>, problems: &mut Vec<Problem>) {
    for item in list.as_array_mut().into_iter().flatten() {
        let Some(entry) = item.get_mut("Chapter") else { continue };
        let path = entry["source_path"].as_str().or_else(|| entry["path"].as_str()).map(|path| path.replace('\\', "/"));
        // A draft has no path and no text.
        if let (Some(path), Some(text)) = (path, entry["content"].as_str())
            && text.contains("stageleaf")
        {
            let (changed, found) = chapter(text, &surroundings(&path), ids);
            entry["content"] = Value::String(changed);
            problems.extend(found);
        }
        items(&mut entry["sub_items"], surroundings, ids, problems);
    }
}

/// A chapter's text with sheets in place of its blocks, and the problems found. `ids` holds those already given in the book.
pub fn chapter(text: &str, surroundings: &Surroundings, ids: &mut BTreeSet<String>) -> (String, Vec<Problem>) {
    let Surroundings { file, team, settings } = surroundings;
    let note = read_note(text.as_bytes(), file, &team.shelf, &team.settings);
    let mut changed = String::with_capacity(text.len() * 4);
    let mut done = 0;
    let mut problems = Vec::new();
    for fence in &note.fences {
        let lines = lines_of(text, fence);
        let markup = match note.blocks.iter().find(|block| lines.contains(&block.line)) {
            Some(block) => sheet(block, team, settings.as_ref(), ids),
            None => {
                let here: Vec<Problem> = note.problems.iter().filter(|problem| lines.contains(&problem.line)).cloned().collect();
                let words = here.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n\n");
                problems.extend(here);
                trouble(&words)
            }
        };
        changed.push_str(&text[done..fence.start]);
        changed.push_str(&markup.replace('\n', "&#10;"));
        // The HTML block ends at a blank line, which inside a quotation still has its marks.
        changed.push('\n');
        changed.push_str(continuation(text, fence.start).trim_end());
        done = fence.end;
    }
    changed.push_str(&text[done..]);
    (changed, problems)
}

fn sheet(block: &Block, team: &Team, settings: Option<&SettingsText>, ids: &mut BTreeSet<String>) -> String {
    let Some(part) = team.shelf.find(&block.stage.part.id) else {
        return trouble(&format!("{}:{}: the part `{}` is not on the shelf", block.file, block.line, block.stage.part.id));
    };
    let base = slug(&block.stage.name);
    let mut id = base.clone();
    let mut count = 1;
    while !ids.insert(id.clone()) {
        count += 1;
        id = format!("{base}-{count}");
    }
    match element(block, part, &team.shelf, &id, settings) {
        Ok(markup) => format!("<div class=\"stageleaf\">{markup}</div>"),
        Err(error) => trouble(&format!("{}:{}: {error}", block.file, block.line)),
    }
}

/// The element with its static sheet and the data that the script needs: one line of HTML. The shelf gives the parts of further
/// amplifiers.
///
/// # Errors
/// What makes the stage one that cannot be analysed.
pub fn element(
    block: &Block,
    part: &ShelfPart,
    shelf: &Shelf,
    id: &str,
    settings: Option<&SettingsText>,
) -> Result<String, stageleaf_math::Error> {
    let report = stageleaf_math::analyse(&block.stage)?;
    let body = stageleaf_sheet::render(&Sheet { block, report: &report, part, id });
    let mut data = json!({
        "block": block.text,
        "file": block.file,
        "line": block.line,
        "part": { "file": part.file, "text": part.text },
        "settings": settings.map(|s| json!({ "file": s.file, "text": s.text })),
    });
    let mut further: Vec<&str> = block.stage.parts.iter().map(|(_, p)| p.id.as_str()).filter(|id| *id != part.part.id).collect();
    further.sort_unstable();
    further.dedup();
    if !further.is_empty() {
        let parts = further.iter().filter_map(|id| shelf.find(id)).map(|p| json!({ "file": p.file, "text": p.text }));
        data["shelf"] = Value::Array(parts.collect());
    }
    Ok(format!("<stageleaf-sheet data-sheet=\"{}\">{body}{}</stageleaf-sheet>", escape(id), data_script(&data)))
}

/// The data of an empty sheet: every part of the shelf, the settings.
#[must_use]
pub fn empty_data(team: &Team, settings: Option<&SettingsText>) -> String {
    let parts: Vec<Value> = team.shelf.parts.iter().map(|part| json!({ "file": part.file, "text": part.text })).collect();
    data_script(&json!({ "shelf": parts, "settings": settings.map(|s| json!({ "file": s.file, "text": s.text })) }))
}

/// JSON that may stand inside a page: no `<` closes the element or opens a comment.
fn data_script(data: &Value) -> String {
    format!("<script type=\"application/json\">{}</script>", data.to_string().replace('<', "\\u003c"))
}

/// The box in place of a block that cannot be read.
fn trouble(words: &str) -> String {
    format!("<div class=\"stageleaf-trouble\"><p>This stage block cannot be read:</p><pre>{}</pre></div>", escape(words))
}

/// Text made safe for HTML text and quoted attributes.
#[must_use]
pub fn escape(text: &str) -> String {
    let mut safe = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => safe.push_str("&amp;"),
            '<' => safe.push_str("&lt;"),
            '>' => safe.push_str("&gt;"),
            '"' => safe.push_str("&quot;"),
            '\'' => safe.push_str("&#39;"),
            _ => safe.push(c),
        }
    }
    safe
}

/// The lines, counted from 1, that `range` of `text` covers.
fn lines_of(text: &str, range: &Range<usize>) -> std::ops::RangeInclusive<usize> {
    let first = text[..range.start].matches('\n').count() + 1;
    first..=first + text[range.clone()].matches('\n').count()
}

/// What an empty line below `at` starts with, so that it still belongs to the quotation or list item there.
fn continuation(text: &str, at: usize) -> String {
    let line = text[..at].rfind('\n').map_or(0, |newline| newline + 1);
    text[line..at].chars().map(|c| if c == '>' { '>' } else { ' ' }).collect()
}

#[cfg(test)]
mod tests {
    use stageleaf_note::{Shelf, read_part};

    use super::*;

    const PART: &str = "[part]\nname = \"elm-1\"\n\n[gain]\nopen_loop = \"100 dB\"\ngbw = \"10 MHz\"\npoles = []\n";
    const BLOCK: &str = "stage = \"follower\"\nname = \"Tide buffer\"\npart = \"elm-1\"\n\n[limits]\nbandwidth = \"at least 1 MHz\"\n";

    fn surroundings() -> Surroundings {
        let part = read_part(PART, "shelf/elm-1.toml").expect("the part can be read");
        let shelf = Shelf { parts: vec![ShelfPart { part, file: "shelf/elm-1.toml".to_owned(), text: PART.to_owned() }] };
        Surroundings { file: "notes/tide.md".to_owned(), team: Arc::new(Team { shelf, ..Team::default() }), settings: None }
    }

    fn embedded(text: &str) -> (String, Vec<Problem>) {
        chapter(text, &surroundings(), &mut BTreeSet::new())
    }

    #[test]
    fn only_the_fence_is_replaced_and_by_one_line() {
        let (changed, problems) = embedded(&format!("before\n\n```stageleaf\n{BLOCK}```\nafter\n"));
        assert!(problems.is_empty(), "{problems:?}");
        let lines: Vec<&str> = changed.lines().collect();
        assert_eq!((lines[0], lines[1], lines[3], lines[4]), ("before", "", "", "after"));
        assert!(lines[2].starts_with("<div class=\"stageleaf\"><stageleaf-sheet data-sheet=\"tide-buffer\">"), "{}", lines[2]);
        assert!(lines[2].ends_with("</script></stageleaf-sheet></div>"));
    }

    #[test]
    fn a_quotation_stays_one_around_its_sheet() {
        let quoted: String = format!("```stageleaf\n{BLOCK}```").lines().map(|line| format!("> {line}\n")).collect();
        let (changed, _) = embedded(&format!("> words\n{quoted}> more\n"));
        let lines: Vec<&str> = changed.lines().collect();
        assert!(lines[1].starts_with("> <div class"), "{}", lines[1]);
        assert_eq!((lines[2], lines[3]), (">", "> more"));
    }

    #[test]
    fn a_block_that_cannot_be_read_becomes_a_box_and_hides_no_other() {
        let text = format!("```stageleaf\nstage = \"<script>\"\n```\n\n```stageleaf\n{BLOCK}```\n");
        let (changed, problems) = embedded(&text);
        assert!(!problems.is_empty());
        assert!(changed.starts_with("<div class=\"stageleaf-trouble\">"));
        assert!(changed.contains("&lt;script&gt;") && !changed.contains("<script>"));
        assert!(changed.contains("<stageleaf-sheet data-sheet=\"tide-buffer\">"));
        assert_eq!(changed.lines().filter(|line| line.is_empty()).count(), 3, "no empty line inside a box");
    }

    #[test]
    fn data_cannot_close_their_script() {
        let block = BLOCK.replace("Tide buffer", "a</script><!--b");
        let (changed, _) = embedded(&format!("```stageleaf\n{block}```\n"));
        let data = changed.split("<script type=\"application/json\">").nth(1).expect("there are data");
        assert_eq!(data.split("</script>").count(), 2, "the element ends once, by its own end");
        assert!(data.contains("\\u003c/script>"));
    }

    #[test]
    fn a_name_that_occurs_twice_gives_two_names() {
        let text = format!("```stageleaf\n{BLOCK}```\n");
        let mut names = BTreeSet::new();
        let (first, _) = chapter(&text, &surroundings(), &mut names);
        let (second, _) = chapter(&text, &surroundings(), &mut names);
        assert!(first.contains("data-sheet=\"tide-buffer\"") && second.contains("data-sheet=\"tide-buffer-2\""));
    }

    #[test]
    fn a_book_of_either_age_is_walked_with_its_drafts() {
        for key in ["items", "sections"] {
            let chapter = |text: &str, path: Value| json!({ "Chapter": { "content": text, "path": path, "sub_items": [] } });
            let text = format!("```stageleaf\n{BLOCK}```\n");
            let mut sent = json!({ key: [chapter(&text, json!("tide.md")), "Separator", { "PartTitle": "stageleaf" }, chapter("stageleaf", Value::Null)] });
            let problems = book(&mut sent, &mut |_| surroundings());
            assert!(problems.is_empty(), "{problems:?}");
            assert!(sent[key][0]["Chapter"]["content"].as_str().expect("text").contains("<stageleaf-sheet"));
            assert_eq!(sent[key][3]["Chapter"]["content"], "stageleaf");
        }
    }

    #[test]
    fn only_html_is_supported_and_nonsense_is_refused() {
        let run = |args: &[&str], input: &str| {
            let args: Vec<String> = args.iter().map(|arg| (*arg).to_owned()).collect();
            command(&args, input.as_bytes(), Vec::new(), Vec::new())
        };
        assert_eq!(run(&["supports", "html"], ""), Ok(true));
        assert_eq!(run(&["supports", "epub"], ""), Ok(false));
        for input in ["", "{}", "[]", "[1]", "nonsense"] {
            assert!(run(&[], input).is_err(), "{input}");
        }
        assert!(run(&["sing"], "").is_err());
    }
}
