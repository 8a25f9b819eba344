//! Which notes a command looks at: the files that were named, and the `.md` files in the folders that were named.

use std::{
    collections::BTreeSet,
    fs, io,
    path::{Path, PathBuf},
};

use crate::fault::Fault;

/// Folders that hold no notes of the team's own. Names that start with a dot are left out as well.
const LEFT_OUT: [&str; 2] = ["target", "node_modules"];

/// The notes, in an order that depends on the names alone, and what could not be looked at.
#[derive(Debug, Default)]
pub struct Found {
    /// Notes, each once, however many of the paths lead to it.
    pub notes: Vec<PathBuf>,
    /// Paths that are missing or unreadable, files that are no notes, and folders without a note.
    pub faults: Vec<Fault>,
}

/// Looks for notes in `paths`. A link that leads back to a folder already seen is not followed twice.
#[must_use]
pub fn notes(paths: &[PathBuf]) -> Found {
    let mut search = Search::default();
    for path in paths {
        let before = search.seen_notes;
        match fs::metadata(path) {
            Ok(meta) if meta.is_dir() => {
                search.folder(path);
                if search.seen_notes == before {
                    search.found.faults.push(Fault::Path {
                        path: show(path),
                        message: "no notes found in this folder".to_owned(),
                        allowed: Some("a note is a file whose name ends in `.md`; `target`, `node_modules` and names that start with a dot are left out".to_owned()),
                        attempt: None,
                    });
                }
            }
            Ok(meta) if meta.is_file() && !is_note(path) => search.found.faults.push(Fault::Path {
                path: show(path),
                message: "this file is not a note".to_owned(),
                allowed: Some("a note is a file whose name ends in `.md`".to_owned()),
                attempt: None,
            }),
            Ok(_) => search.note(path),
            Err(error) => search.found.faults.push(unreadable(path, &error)),
        }
    }
    search.found
}

#[derive(Default)]
struct Search {
    found: Found,
    folders: BTreeSet<PathBuf>,
    files: BTreeSet<PathBuf>,
    /// Notes met, those already listed included.
    seen_notes: usize,
}

impl Search {
    fn note(&mut self, path: &Path) {
        self.seen_notes += 1;
        match fs::canonicalize(path) {
            Ok(real) => {
                if self.files.insert(real) {
                    self.found.notes.push(path.to_owned());
                }
            }
            Err(error) => self.found.faults.push(unreadable(path, &error)),
        }
    }

    fn folder(&mut self, start: &Path) {
        // A list, not recursion: a folder may lie deeper than the stack.
        let mut waiting = vec![start.to_owned()];
        // A folder named twice on the command line is still not an empty one.
        let mut here = BTreeSet::new();
        while let Some(folder) = waiting.pop() {
            let (entries, real) = match (fs::read_dir(&folder), fs::canonicalize(&folder)) {
                (Ok(entries), Ok(real)) => (entries, real),
                (Err(error), _) | (_, Err(error)) => {
                    self.found.faults.push(unreadable(&folder, &error));
                    continue;
                }
            };
            if !here.insert(real.clone()) {
                continue;
            }
            let known = !self.folders.insert(real);
            let mut inside = Vec::new();
            let mut names: Vec<_> = entries.filter_map(|entry| entry.ok().map(|e| e.file_name())).collect();
            names.sort();
            for name in names {
                let text = name.to_string_lossy();
                if text.starts_with('.') {
                    continue;
                }
                let path = folder.join(&name);
                match fs::metadata(&path) {
                    Ok(meta) if meta.is_dir() => {
                        if !LEFT_OUT.contains(&text.as_ref()) {
                            inside.push(path);
                        }
                    }
                    Ok(meta) if meta.is_file() && is_note(&path) => {
                        if known {
                            self.seen_notes += 1;
                        } else {
                            self.note(&path);
                        }
                    }
                    Ok(_) => {}
                    // A link to nowhere only matters when it claims to be a note.
                    Err(error) if is_note(&path) => self.found.faults.push(unreadable(&path, &error)),
                    Err(_) => {}
                }
            }
            // Files first, then folders by name: the last pushed is taken first.
            waiting.extend(inside.into_iter().rev());
        }
    }
}

fn is_note(path: &Path) -> bool {
    path.extension().is_some_and(|e| e.eq_ignore_ascii_case("md"))
}

/// A path that could not be read, with the reason in plain words.
#[must_use]
pub fn unreadable(path: &Path, error: &io::Error) -> Fault {
    let message = match error.kind() {
        io::ErrorKind::NotFound => "there is no such file or folder".to_owned(),
        io::ErrorKind::PermissionDenied => "it may not be read: permission denied".to_owned(),
        _ => format!("it cannot be read: {error}"),
    };
    Fault::path(show(path), message)
}

/// A path as messages show it: with `/` everywhere, without a leading `./`.
#[must_use]
pub fn show(path: &Path) -> String {
    let text = path.to_string_lossy();
    let text = if cfg!(windows) { text.replace('\\', "/") } else { text.into_owned() };
    // Control characters of a file's name must not reach a terminal.
    let text: String = text.chars().map(|c| if c.is_control() { '\u{FFFD}' } else { c }).collect();
    text.strip_prefix("./").filter(|rest| !rest.is_empty()).map_or(text.clone(), str::to_owned)
}
