//! Hostile and clumsy input, given to the built program: a clear error, every other stage judged, never a panic, a hang or a lost byte.
//!
//! A folder of `corpus/` is a case: `check` runs inside it, and its standard error and exit code have to be those of its file
//! `expected`, whole, as a person wrote them. What a repository cannot hold well (odd bytes, large files, links, empty folders)
//! is made here.

mod diff;
mod formats;
mod json;
mod made;
mod measuring;
mod outlets;
mod rewriting;
mod searching;

use std::{
    fs,
    path::{Path, PathBuf},
    process::{Command, Output},
};

/// What a run said.
struct Said {
    code: Option<i32>,
    out: String,
    err: String,
}

/// Runs the program in `folder`.
fn stageleaf(folder: &Path, arguments: &[&str]) -> Said {
    let output: Output = Command::new(env!("CARGO_BIN_EXE_stageleaf"))
        .args(arguments)
        .current_dir(folder)
        .env_remove("NO_COLOR")
        .output()
        .expect("the program starts");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("the program writes UTF-8");
    let said = Said { code: output.status.code(), out: text(output.stdout), err: text(output.stderr) };
    assert!(!said.err.contains("panicked"), "a panic: {}", said.err);
    // The script of a page holds bytes of a program, not words.
    let words = match (said.out.find("<script>"), said.out.rfind("</script>")) {
        (Some(from), Some(to)) if from < to => [&said.out[..from], &said.out[to..]].concat(),
        _ => said.out.clone(),
    };
    assert!(!words.contains("NaN") && !words.contains('\u{1b}'), "NaN or colour off a terminal: {words}");
    said
}

fn corpus() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../../tests/hostile/corpus")
}

/// A folder that is there for one test and holds a copy of the corpus's settings and shelf.
struct Bench(PathBuf);

impl Bench {
    fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("stageleaf-hostile-{}-{name}", std::process::id()));
        fs::create_dir_all(path.join("shelf")).expect("a folder");
        for file in ["stageleaf.toml", "shelf/oak-1.toml"] {
            fs::copy(corpus().join(file), path.join(file)).expect("a copy");
        }
        Self(path)
    }

    fn write(&self, name: &str, content: impl AsRef<[u8]>) {
        let path = self.0.join(name);
        fs::create_dir_all(path.parent().expect("a folder")).expect("a folder");
        fs::write(path, content).expect("a file");
    }

    fn read(&self, name: &str) -> Vec<u8> {
        fs::read(self.0.join(name)).expect("a file")
    }

    fn run(&self, arguments: &[&str]) -> Said {
        stageleaf(&self.0, arguments)
    }
}

impl Drop for Bench {
    fn drop(&mut self) {
        // What is left in the temporary folder harms nobody.
        fs::remove_dir_all(&self.0).unwrap_or_default();
    }
}

/// A block that holds its limits with oak-1; `line` replaces the line of that key.
fn block(name: &str, changes: &[(&str, &str)]) -> String {
    let mut text = format!(
        "stage = \"non-inverting\"\nname = \"{name}\"\npart = \"oak-1\"\n[supply]\npositive = \"12 V\"\nnegative = \"-12 V\"\n\
         [components]\nRf = \"9k\"\nRg = \"1k\"\n[signal]\npeak = \"0.1 V\"\nfrequency = \"1 kHz\"\n[limits]\nbandwidth = \"at least 100 kHz\"\n"
    );
    for (from, to) in changes {
        assert!(text.contains(from), "{from} stands in the block");
        text = text.replace(from, to);
    }
    text
}

fn fenced(block: &str) -> String {
    format!("```stageleaf\n{block}```\n")
}

#[test]
fn every_case_of_the_corpus_says_what_its_file_expects() {
    let mut cases: Vec<PathBuf> =
        fs::read_dir(corpus()).expect("the corpus").map(|e| e.expect("an entry").path()).filter(|p| p.join("expected").is_file()).collect();
    cases.sort();
    assert!(cases.len() >= 14, "the corpus has lost cases: {}", cases.len());
    let mut wrong = Vec::new();
    for case in &cases {
        let expected = fs::read_to_string(case.join("expected")).expect("text");
        let (code, err) = expected.split_once('\n').expect("an exit code, then the text");
        let said = stageleaf(case, &["check", "."]);
        if format!("exit {}", said.code.unwrap_or(-1)) != code || said.err.trim_end() != err.trim_end() {
            wrong.push(format!(
                "{}: exit {:?}\n{}\nwanted: {code}\n{err}\n(standard output)\n{}",
                case.display(),
                said.code,
                said.err,
                said.out
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n======\n"));
}
