//! The stages that a command is asked about: of one note, or of every note of some folders.

use std::{
    fs,
    path::{Path, PathBuf},
    sync::Arc,
};

use stageleaf_note::{problem::nearest, slug};

use crate::{
    check::{ExaminedStage, examine},
    fault::Fault,
    team::{Team, Teams},
    walk::{self, show, unreadable},
};

/// A stage with its team.
#[derive(Debug)]
pub struct AskedStage {
    /// The stage, judged as it stands.
    pub stage: ExaminedStage,
    /// Settings and shelf of its note.
    pub team: Arc<Team>,
    /// The note, as messages name it.
    pub file: String,
}

/// What was found, and what could not be read.
#[derive(Debug, Default)]
pub struct Asked {
    /// The stages, in the order of notes and blocks.
    pub stages: Vec<AskedStage>,
    /// What could not be read.
    pub faults: Vec<Fault>,
}

/// Every stage of every note in `paths`, or the one that is called `name`.
#[must_use]
pub fn stages(paths: &[PathBuf], name: Option<&str>, shelf: Option<&Path>) -> Asked {
    let mut teams = Teams::new(shelf.map(Path::to_owned));
    let mut asked = Asked::default();
    let found = walk::notes(paths);
    asked.faults.extend(found.faults);
    for path in found.notes {
        let team = teams.of(&path);
        asked.faults.extend(teams.take_faults());
        if team.settings_lost {
            continue;
        }
        let bytes = match fs::read(&path) {
            Ok(bytes) => bytes,
            Err(error) => {
                asked.faults.push(unreadable(&path, &error));
                continue;
            }
        };
        let file = show(&path);
        let note = examine(&bytes, &file, &team);
        asked.faults.extend(note.faults);
        asked.stages.extend(note.stages.into_iter().map(|stage| AskedStage { stage, team: Arc::clone(&team), file: file.clone() }));
    }
    let place = paths.iter().map(|p| show(p)).collect::<Vec<_>>().join(", ");
    // What is wrong with the blocks has been told.
    if asked.stages.is_empty() && asked.faults.is_empty() {
        asked.faults.push(Fault::path(place, "there is no stage here"));
        return asked;
    }
    if let Some(name) = name {
        let names: Vec<String> = asked.stages.iter().map(|s| s.stage.block.stage.name.clone()).collect();
        asked.stages.retain(|s| s.stage.block.stage.name == name || slug(&s.stage.block.stage.name) == slug(name));
        if asked.stages.is_empty() && !names.is_empty() {
            asked.faults.push(Fault::Path {
                path: place,
                message: format!("no stage here is called “{name}”"),
                allowed: Some(names.iter().map(|n| format!("“{n}”")).collect::<Vec<_>>().join(", ")),
                attempt: nearest(name, names.iter().map(String::as_str)).map(|name| format!("--stage \"{name}\"")),
            });
        }
    }
    asked
}
