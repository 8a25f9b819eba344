//! One side of a comparison: the notes of a folder, or of a revision, examined.

use std::{
    fs,
    path::{Path, PathBuf},
    process::Command,
};

use crate::{
    check::{Examined, examine},
    fault::Fault,
    team::Teams,
    walk::{self, show, unreadable},
};

/// The notes of one side.
#[derive(Debug)]
pub struct Side {
    /// As it was given.
    pub name: String,
    /// Its notes.
    pub notes: Vec<Examined>,
    faults: Vec<Fault>,
}

/// Where a side stands.
enum Place {
    Here(PathBuf),
    /// A revision's whole tree, unpacked; removed at the end.
    Revision(tempfile::TempDir),
}

impl Side {
    /// Both sides.
    ///
    /// # Errors
    /// When one is neither a path nor a revision, or cannot be unpacked.
    pub fn both(old: &Path, new: &Path, within: Option<&Path>) -> Result<(Self, Self), Fault> {
        let (old_place, new_place) = (Place::of(old)?, Place::of(new)?);
        // A revision is looked at where the other side is.
        let beside = |other: &Place| match (within, other) {
            (Some(path), _) => Some(path.to_owned()),
            (None, Place::Here(path)) => Some(path.clone()),
            (None, Place::Revision(_)) => None,
        };
        let old_side = Self::examined(show(old), &old_place, beside(&new_place).as_deref())?;
        let new_side = Self::examined(show(new), &new_place, beside(&old_place).as_deref())?;
        Ok((old_side, new_side))
    }

    /// What could not be read.
    pub fn faults(&self) -> impl Iterator<Item = &Fault> {
        self.faults.iter().chain(self.notes.iter().flat_map(|n| &n.faults))
    }

    fn examined(name: String, place: &Place, within: Option<&Path>) -> Result<Self, Fault> {
        let (root, path) = match place {
            Place::Here(path) => (path.clone(), path.clone()),
            Place::Revision(folder) => {
                let root = folder.path().to_owned();
                let path = match within {
                    Some(path) => root.join(inside_repository(path)?),
                    None => root.clone(),
                };
                (root, path)
            }
        };
        let mut side = Self { name, notes: Vec::new(), faults: Vec::new() };
        if !path.exists() {
            // Nothing was there yet: every stage is new.
            return Ok(side);
        }
        let mut teams = Teams::default();
        let found = walk::notes(std::slice::from_ref(&path));
        side.faults.extend(found.faults);
        for note in found.notes {
            let team = teams.of(&note);
            side.faults.extend(teams.take_faults());
            if team.settings_lost {
                continue;
            }
            let file = note.strip_prefix(&root).ok().filter(|p| !p.as_os_str().is_empty()).unwrap_or(&note);
            match fs::read(&note) {
                Ok(bytes) => side.notes.push(examine(&bytes, &show(file), &team)),
                Err(error) => side.faults.push(unreadable(&note, &error)),
            }
        }
        Ok(side)
    }
}

impl Place {
    fn of(given: &Path) -> Result<Self, Fault> {
        if given.exists() {
            return Ok(Self::Here(given.to_owned()));
        }
        let name = given.to_string_lossy();
        let refused = |message: String| {
            Err(Fault::Path {
                path: show(given),
                message,
                allowed: Some("a note, a folder of notes, or a revision that git knows (`HEAD~1`, a tag, a branch)".to_owned()),
                attempt: None,
            })
        };
        // A name that begins with a dash would be read as an option.
        if name.starts_with('-') {
            return refused("this is no file, no folder and no revision".to_owned());
        }
        let commit = match git(&["rev-parse", "--verify", "--quiet", &format!("{name}^{{commit}}")]) {
            Ok(commit) => commit,
            Err(None) => return refused("there is no such file or folder, and git is not there to look for a revision".to_owned()),
            Err(Some(_)) => return refused("there is no such file, folder or revision".to_owned()),
        };
        let root = repository()?;
        let unpacked = || -> Result<tempfile::TempDir, String> {
            let folder = tempfile::tempdir().map_err(|e| e.to_string())?;
            let packed = Command::new("git")
                .arg("-C")
                .arg(&root)
                .args(["archive", "--format=tar", commit.trim()])
                .output()
                .map_err(|e| e.to_string())?;
            if !packed.status.success() {
                return Err(String::from_utf8_lossy(&packed.stderr).trim().to_owned());
            }
            tar::Archive::new(packed.stdout.as_slice()).unpack(folder.path()).map_err(|e| e.to_string())?;
            Ok(folder)
        };
        match unpacked() {
            Ok(folder) => Ok(Self::Revision(folder)),
            Err(why) => refused(format!("the revision cannot be unpacked: {why}")),
        }
    }
}

/// What git says; without a value it could not be started.
fn git(arguments: &[&str]) -> Result<String, Option<String>> {
    let output = Command::new("git").args(arguments).output().map_err(|_| None)?;
    let text = |bytes: &[u8]| String::from_utf8_lossy(bytes).trim().to_owned();
    if output.status.success() { Ok(text(&output.stdout)) } else { Err(Some(text(&output.stderr))) }
}

fn repository() -> Result<PathBuf, Fault> {
    git(&["rev-parse", "--show-toplevel"]).map(PathBuf::from).map_err(|why| Fault::path(".", why.unwrap_or_default()))
}

/// A path from the repository's root, whether or not it is there now.
fn inside_repository(path: &Path) -> Result<PathBuf, Fault> {
    let root = repository()?;
    let absolute = std::path::absolute(path).map_err(|e| unreadable(path, &e))?;
    let real = fs::canonicalize(&absolute).unwrap_or(absolute);
    let real_root = fs::canonicalize(&root).unwrap_or(root);
    real.strip_prefix(&real_root).map(Path::to_owned).map_err(|_| Fault::Path {
        path: show(path),
        message: "this lies outside the repository whose revision was named".to_owned(),
        allowed: Some(format!("a path below {}", show(&real_root))),
        attempt: None,
    })
}
