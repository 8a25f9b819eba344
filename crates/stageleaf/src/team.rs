//! A team's settings and shelf: `stageleaf.toml` is looked for in a note's folder and upward, and names the folder of part files.

use std::{
    collections::BTreeMap,
    fs,
    path::{Path, PathBuf},
    sync::Arc,
};

use stageleaf_note::{Problem, Settings, Shelf, ShelfPart, read_part, read_settings};

use crate::{
    fault::Fault,
    walk::{show, unreadable},
};

/// The file that marks the root of a team's notes.
pub const SETTINGS_FILE: &str = "stageleaf.toml";

/// What all notes below one `stageleaf.toml` share.
#[derive(Debug, Default)]
pub struct Team {
    /// Defaults and rules.
    pub settings: Settings,
    /// The parts.
    pub shelf: Shelf,
    /// Part files of the shelf that could not be read: the part's id and the file.
    pub lost_parts: Vec<(String, String)>,
    /// There are settings, and they could not be read: what they would have said is not known, so nothing is judged by defaults.
    pub settings_lost: bool,
}

/// Teams that were looked up, each read once.
#[derive(Debug, Default)]
pub struct Teams {
    /// The folder that the command line names instead of the settings' one.
    shelf: Option<PathBuf>,
    known: BTreeMap<Option<PathBuf>, Arc<Team>>,
    faults: Vec<Fault>,
}

impl Teams {
    /// `shelf`, where given, replaces the folder that `stageleaf.toml` names.
    #[must_use]
    pub fn new(shelf: Option<PathBuf>) -> Self {
        Self { shelf, ..Self::default() }
    }

    /// The team of `note`. What is wrong with its files is told by [`Teams::take_faults`], once.
    pub fn of(&mut self, note: &Path) -> Arc<Team> {
        let root = root_of(note);
        if let Some(team) = self.known.get(&root) {
            return Arc::clone(team);
        }
        let team = Arc::new(self.read(root.as_deref()));
        self.known.insert(root, Arc::clone(&team));
        team
    }

    /// What was wrong with settings and part files read since the last time.
    pub fn take_faults(&mut self) -> Vec<Fault> {
        std::mem::take(&mut self.faults)
    }

    fn read(&mut self, root: Option<&Path>) -> Team {
        let read = root.map_or_else(|| Some(Settings::default()), |root| self.settings(root));
        let settings_lost = read.is_none();
        let settings = read.unwrap_or_default();
        let named = root.and_then(|root| settings.shelf.as_ref().map(|shelf| root.join(shelf)));
        let folder = self.shelf.clone().or(named);
        let (shelf, lost_parts) = folder.map_or_else(Default::default, |folder| self.shelf(&folder));
        Team { settings, shelf, lost_parts, settings_lost }
    }

    fn settings(&mut self, root: &Path) -> Option<Settings> {
        let path = root.join(SETTINGS_FILE);
        let text = self.text(&path)?;
        read_settings(&text, &show(&path)).map_err(|problems| self.problems(problems)).ok()
    }

    fn shelf(&mut self, folder: &Path) -> (Shelf, Vec<(String, String)>) {
        let (mut shelf, mut lost) = (Shelf::default(), Vec::new());
        let entries = match fs::read_dir(folder) {
            Ok(entries) => entries,
            Err(error) => {
                let fault = Fault::Path {
                    path: show(folder),
                    message: format!("the shelf cannot be read: {}", reason(&error)),
                    allowed: Some(format!("a folder of part files, named by `shelf` in {SETTINGS_FILE} or by --shelf")),
                    attempt: None,
                };
                self.faults.push(fault);
                return (shelf, lost);
            }
        };
        let mut files: Vec<PathBuf> = entries.filter_map(|entry| entry.ok().map(|e| e.path())).filter(|path| is_part(path)).collect();
        files.sort();
        for path in files {
            let file = show(&path);
            let text = self.text(&path);
            match text.map(|text| (read_part(&text, &file), text)) {
                Some((Ok(part), text)) => shelf.parts.push(ShelfPart { part, file, text }),
                unread => {
                    if let Some((Err(problems), _)) = unread {
                        self.problems(problems);
                    }
                    lost.push((path.file_stem().map(|s| s.to_string_lossy().into_owned()).unwrap_or_default(), file));
                }
            }
        }
        (shelf, lost)
    }

    fn text(&mut self, path: &Path) -> Option<String> {
        match fs::read(path).map(String::from_utf8) {
            Ok(Ok(text)) => Some(text),
            Ok(Err(error)) => {
                let before = &error.as_bytes()[..error.utf8_error().valid_up_to()];
                let line = before.iter().filter(|b| **b == b'\n').count() + 1;
                self.faults.push(Fault::Path {
                    path: format!("{}:{line}", show(path)),
                    message: "the text is not UTF-8".to_owned(),
                    allowed: None,
                    attempt: Some("save the file as UTF-8".to_owned()),
                });
                None
            }
            Err(error) => {
                self.faults.push(unreadable(path, &error));
                None
            }
        }
    }

    fn problems(&mut self, problems: Vec<Problem>) {
        self.faults.extend(problems.into_iter().map(|p| Fault::Text(Box::new(p))));
    }
}

fn is_part(path: &Path) -> bool {
    let name = path.file_name().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
    !name.starts_with('.') && path.extension().is_some_and(|e| e == "toml") && path.is_file()
}

/// The nearest folder at or above `note` that holds the settings.
fn root_of(note: &Path) -> Option<PathBuf> {
    // Links are followed first: `a/link/..` is not `a`.
    let real = fs::canonicalize(note).ok()?;
    let root = real.ancestors().skip(usize::from(!real.is_dir())).find(|folder| folder.join(SETTINGS_FILE).is_file())?;
    Some(as_given(note, &real, root))
}

/// `root` as the user would write it, from the path that they gave: messages then name files as they know them.
fn as_given(note: &Path, real: &Path, root: &Path) -> PathBuf {
    let steps = real.components().count() - root.components().count();
    let given = note.ancestors().nth(steps).map(|given| if given.as_os_str().is_empty() { Path::new(".") } else { given });
    if let Some(given) = given.filter(|given| fs::canonicalize(given).is_ok_and(|there| there == root)) {
        return given.to_owned();
    }
    // Above the folder in which the command was started.
    let up = fs::canonicalize(".").ok().and_then(|here| Some(here.strip_prefix(root).ok()?.components().count()));
    up.map_or_else(|| root.to_owned(), |up| std::iter::repeat_n("..", up).collect())
}

fn reason(error: &std::io::Error) -> String {
    match error.kind() {
        std::io::ErrorKind::NotFound => "there is no such folder".to_owned(),
        std::io::ErrorKind::PermissionDenied => "permission denied".to_owned(),
        _ => error.to_string(),
    }
}
