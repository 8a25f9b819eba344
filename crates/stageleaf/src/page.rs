//! `page`: one self-contained HTML file with a note's sheets, for a web browser without a server or for a wiki's frame.

use std::{
    env, fs,
    path::{Path, PathBuf},
};

use clap::Args;
use stageleaf_note::{Block, problem::nearest, slug};

use crate::{
    check::examine,
    embed::{self, SettingsText},
    fault::Fault,
    team::{Team, Teams},
    walk::{show, unreadable},
};

/// The bundle that makes sheets live, as the site builder names it.
const SCRIPT: &str = "stageleaf.js";

/// What `page` is asked.
#[derive(Args, Clone, Debug)]
pub struct Options {
    /// The note
    #[arg(value_name = "NOTE")]
    pub note: PathBuf,
    /// The stage, by its name or as links write it; without one, every stage of the note
    #[arg(long, value_name = "NAME")]
    pub stage: Option<String>,
    /// Where the page is written; without it, to standard output
    #[arg(long, value_name = "FILE")]
    pub out: Option<PathBuf>,
    /// The script that makes the sheet live; without it, one is looked for beside the program and in target/site
    #[arg(long, value_name = "FILE")]
    pub script: Option<PathBuf>,
    /// Folder of part files, instead of the one that stageleaf.toml names
    #[arg(long, value_name = "DIR")]
    pub shelf: Option<PathBuf>,
}

/// A page, and what could not be put on it.
#[derive(Debug)]
pub struct Page {
    /// The document; `None` where nothing could be put on it.
    pub html: Option<String>,
    /// Whether it has the script.
    pub live: bool,
    /// How many stages it shows.
    pub stages: usize,
    /// What is wrong with the note or its surroundings.
    pub faults: Vec<Fault>,
}

/// Makes the page.
#[must_use]
pub fn make(options: &Options) -> Page {
    let mut teams = Teams::new(options.shelf.clone());
    let mut page = Page { html: None, live: false, stages: 0, faults: Vec::new() };
    let bytes = match fs::read(&options.note) {
        Ok(bytes) => bytes,
        Err(error) => {
            page.faults.push(unreadable(&options.note, &error));
            return page;
        }
    };
    let script = match script(options.script.as_deref()) {
        Ok(script) => script,
        Err(fault) => {
            page.faults.push(fault);
            return page;
        }
    };
    let team = teams.of(&options.note);
    page.faults.extend(teams.take_faults());
    if team.settings_lost {
        return page;
    }
    let file = show(&options.note);
    let note = examine(&bytes, &file, &team);
    page.faults.extend(note.faults);
    let blocks: Vec<&Block> = note.stages.iter().map(|stage| &stage.block).collect();
    let chosen = match chosen(&blocks, options.stage.as_deref(), &file) {
        Ok(chosen) => chosen,
        Err(fault) => {
            page.faults.push(fault);
            return page;
        }
    };
    let settings = SettingsText::of(&options.note);
    let mut body = String::new();
    for block in &chosen {
        match element(block, &team, settings.as_ref()) {
            Ok(element) => {
                body.push_str(&element);
                page.stages += 1;
            }
            Err(fault) => page.faults.push(fault),
        }
    }
    if page.stages > 0 {
        let title = if let [only] = chosen.as_slice() { only.stage.name.clone() } else { file };
        page.live = script.is_some();
        page.html = Some(stageleaf_sheet::page(&title, &body, script.as_deref()));
    }
    page
}

fn element(block: &Block, team: &Team, settings: Option<&SettingsText>) -> Result<String, Fault> {
    let at = |message: String| Fault::path(format!("{}:{}", block.file, block.line), message);
    let part =
        team.shelf.find(&block.stage.part.id).ok_or_else(|| at(format!("the part `{}` is not on the shelf", block.stage.part.id)))?;
    let element = embed::element(block, part, &team.shelf, &slug(&block.stage.name), settings).map_err(|error| at(error.to_string()))?;
    Ok(format!("<div class=\"stageleaf\">{element}</div>\n"))
}

/// The stages of a note that were asked for: all, or the one of that name.
fn chosen<'a>(blocks: &[&'a Block], wanted: Option<&str>, file: &str) -> Result<Vec<&'a Block>, Fault> {
    if blocks.is_empty() {
        return Err(Fault::path(file, "there is no stage in this note that could be shown"));
    }
    let Some(wanted) = wanted else { return Ok(blocks.to_vec()) };
    let found: Vec<&Block> = blocks.iter().filter(|b| b.stage.name == wanted || slug(&b.stage.name) == slug(wanted)).copied().collect();
    if !found.is_empty() {
        return Ok(found);
    }
    let names: Vec<&str> = blocks.iter().map(|b| b.stage.name.as_str()).collect();
    Err(Fault::Path {
        path: file.to_owned(),
        message: format!("no stage of this note is called “{wanted}”"),
        allowed: Some(names.iter().map(|n| format!("“{n}”")).collect::<Vec<_>>().join(", ")),
        attempt: nearest(wanted, names.iter().copied()).map(|name| format!("--stage \"{name}\"")),
    })
}

/// The script's text, where there is one. One that was named has to be there.
fn script(named: Option<&Path>) -> Result<Option<String>, Fault> {
    let path = match named {
        Some(path) => path.to_owned(),
        None => match places().into_iter().find(|path| path.is_file()) {
            Some(path) => path,
            None => return Ok(None),
        },
    };
    let text = fs::read_to_string(&path).map_err(|error| unreadable(&path, &error))?;
    // It will stand inside the page: it must not be able to close its own element.
    let lower = text.to_ascii_lowercase();
    if lower.contains("</script") || lower.contains("<!--") {
        return Err(Fault::Path {
            path: show(&path),
            message: "this script cannot stand inside a page: it holds `</script` or `<!--`".to_owned(),
            allowed: Some(format!("the {SCRIPT} that the site builder writes")),
            attempt: None,
        });
    }
    Ok(Some(text))
}

fn places() -> Vec<PathBuf> {
    let mut places = Vec::new();
    if let Ok(program) = env::current_exe() {
        places.extend(program.parent().map(|folder| folder.join(SCRIPT)));
        // Built by cargo: target/debug/stageleaf, beside target/site.
        places.extend(program.ancestors().nth(2).map(|target| target.join("site").join(SCRIPT)));
    }
    places.push(Path::new("target/site").join(SCRIPT));
    places
}
