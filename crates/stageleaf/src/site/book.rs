//! The demo book: notes from `site/notes`, a chapter about the shelf, and the page with the empty sheet.
//!
//! mdBook copies a book's files from below its own root only, so the root is put together in `target/site/root`.

use std::{
    fs,
    path::{Path, PathBuf},
    sync::Arc,
};

use mdbook_driver::{MDBook, config::HtmlConfig};
use mdbook_preprocessor::{Preprocessor, PreprocessorContext, book::Book, errors::Error};

use super::{Failure, read, shelf_page, write};
use crate::{
    asked,
    embed::{self, SettingsText, Surroundings},
    overview,
    team::{Team, Teams},
};

/// Where the hand-written page takes the shelf.
const SHELF_SLOT: &str = "<script type=\"application/json\"></script>";

/// Builds the book and says where it stands.
pub fn build(root: &Path, site: &Path) -> Result<PathBuf, Failure> {
    let source = root.join("site");
    let book_root = site.join("root");
    let output = root.join("target/book");
    if book_root.exists() {
        fs::remove_dir_all(&book_root).map_err(|error| format!("{}: {error}", book_root.display()))?;
    }
    copy(&source.join("notes"), &book_root.join("notes"))?;
    write(&book_root.join("book.toml"), read(&source.join("book.toml"))?)?;
    for name in ["stageleaf.js", "stageleaf.css"] {
        write(&book_root.join(name), read(&site.join(name))?)?;
    }
    let teams = &mut Teams::new(None);
    // As seen from the root: sheets and messages name files so, whoever built the book.
    std::env::set_current_dir(root).map_err(|error| format!("{}: {error}", root.display()))?;
    let notes = Path::new("site/notes");
    let team = teams.of(notes);
    let faults = teams.take_faults();
    if !faults.is_empty() {
        return Err(faults.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n"));
    }
    let asked = asked::stages(&[notes.to_owned()], None, None);
    if !asked.faults.is_empty() {
        return Err(asked.faults.iter().map(ToString::to_string).collect::<Vec<_>>().join("\n"));
    }
    write(&book_root.join("notes/shelf.md"), shelf_page::chapter(&team.shelf, &asked.stages))?;
    write(&book_root.join("notes/overview.md"), overview::chapter(&asked.stages, Some(notes)))?;

    let say = |error: Error| format!("book: {error:#}");
    let mut book = MDBook::load(&book_root).map_err(say)?;
    let mut html: HtmlConfig = book.config.html_config().unwrap_or_default();
    html.additional_js = vec![PathBuf::from("stageleaf.js")];
    html.additional_css = vec![PathBuf::from("stageleaf.css")];
    // The empty sheet's page names the script too.
    html.hash_files = false;
    book.config.set("output.html", html).map_err(say)?;
    book.config.set("build.build-dir", &output).map_err(say)?;
    let settings = SettingsText::of(notes);
    book.with_preprocessor(Sheets { team: Arc::clone(&team), settings: settings.clone() });
    book.build().map_err(say)?;
    empty_sheet(&source, &output, &team, settings.as_ref())?;
    Ok(output)
}

/// Copies the hand-written page and puts the shelf into it.
fn empty_sheet(source: &Path, output: &Path, team: &Team, settings: Option<&SettingsText>) -> Result<(), Failure> {
    let page = read(&source.join("sheet.html"))?;
    if page.matches(SHELF_SLOT).count() != 1 {
        return Err(format!("site/sheet.html must hold `{SHELF_SLOT}` once: the shelf goes there"));
    }
    let data = embed::empty_data(team, settings);
    write(&output.join("sheet.html"), page.replace(SHELF_SLOT, &data))?;
    write(&output.join("sheet.css"), read(&source.join("sheet.css"))?)
}

fn copy(from: &Path, to: &Path) -> Result<(), Failure> {
    let say = |error: std::io::Error| format!("{}: {error}", from.display());
    for entry in fs::read_dir(from).map_err(say)? {
        let path = entry.map_err(say)?.path();
        let Some(name) = path.file_name() else { continue };
        if path.is_dir() {
            copy(&path, &to.join(name))?;
        } else {
            let bytes = fs::read(&path).map_err(say)?;
            write(&to.join(name), bytes)?;
        }
    }
    Ok(())
}

/// The preprocessor as mdBook's library takes it; the work is [`embed::book`], as for an outside book.
struct Sheets {
    team: Arc<Team>,
    settings: Option<SettingsText>,
}

impl Preprocessor for Sheets {
    fn name(&self) -> &'static str {
        "stageleaf"
    }

    fn run(&self, _: &PreprocessorContext, book: Book) -> Result<Book, Error> {
        let mut value = serde_json::to_value(book)?;
        let problems = embed::book(&mut value, &mut |chapter| Surroundings {
            file: format!("site/notes/{chapter}"),
            team: Arc::clone(&self.team),
            settings: self.settings.clone(),
        });
        for problem in problems {
            eprintln!("{problem}");
        }
        Ok(serde_json::from_value(value)?)
    }
}
