//! The book's story about a part that is out of stock: every command in it is run, and says what stands in the chapter.

use std::{
    fs,
    path::{Path, PathBuf},
    process::Command,
};

/// A folder as the team has it: notes, shelf, settings; and the revised note beside them.
struct Desk(PathBuf);

impl Desk {
    fn new() -> Self {
        let site = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site");
        let desk = std::env::temp_dir().join(format!("stageleaf-story-{}", std::process::id()));
        for folder in ["notes", "shelf", "revised"] {
            fs::create_dir_all(desk.join(folder)).expect("a folder");
        }
        fs::copy(site.join("stageleaf.toml"), desk.join("stageleaf.toml")).expect("the settings");
        for folder in ["notes", "shelf"] {
            for entry in fs::read_dir(site.join(folder)).expect("the demo") {
                let path = entry.expect("an entry").path();
                fs::copy(&path, desk.join(folder).join(path.file_name().expect("a name"))).expect("a copy");
            }
        }
        let note = fs::read_to_string(site.join("notes/hydrophone-line-amplifier.md")).expect("the note");
        fs::write(desk.join("revised/hydrophone-line-amplifier.md"), note.replace("\"alder-10\"", "\"cedar-45\""))
            .expect("the revised note");
        Self(desk)
    }

    fn run(&self, command: &str) -> String {
        let arguments = command.strip_prefix("stageleaf ").expect("a command of ours").split(' ');
        let output = Command::new(env!("CARGO_BIN_EXE_stageleaf")).current_dir(&self.0).args(arguments).output().expect("it starts");
        assert!(output.stderr.is_empty(), "{command}: {}", String::from_utf8_lossy(&output.stderr));
        String::from_utf8(output.stdout).expect("UTF-8")
    }
}

impl Drop for Desk {
    fn drop(&mut self) {
        fs::remove_dir_all(&self.0).unwrap_or_default();
    }
}

/// The commands of a chapter with the lines that stand below each.
fn commands(chapter: &str) -> Vec<(&str, Vec<&str>)> {
    let mut all: Vec<(&str, Vec<&str>)> = Vec::new();
    let mut inside = false;
    for line in chapter.lines() {
        if line.starts_with("```") {
            inside = line == "```console";
        } else if inside {
            match line.strip_prefix("$ ") {
                Some(command) => all.push((command, Vec::new())),
                None => all.last_mut().expect("a command first").1.push(line),
            }
        }
    }
    all
}

#[test]
fn the_story_says_what_the_commands_say() {
    let chapter = fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("../../site/notes/out-of-stock.md")).expect("the chapter");
    let desk = Desk::new();
    let commands = commands(&chapter);
    assert!(commands.len() >= 4, "the story has commands");
    for (command, shown) in commands {
        let said = desk.run(command);
        let mut lines = said.lines();
        let mut skipping = false;
        assert!(shown.iter().any(|l| *l != "…"), "{command}: something is shown");
        for line in shown {
            if line == "…" {
                skipping = true;
                continue;
            }
            let found = if skipping { lines.any(|l| l == line) } else { lines.next() == Some(line) };
            assert!(found, "{command}: `{line}` is not what it says:\n{said}");
            skipping = false;
        }
        assert!(skipping || lines.next().is_none(), "{command}: more is said than shown:\n{said}");
    }
}
