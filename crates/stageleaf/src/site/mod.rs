//! The site builder: the one script that makes sheets live, and the demo book with it.
//!
//! `cargo run -p stageleaf --features site -- site` writes `target/book`; with `--script-only` it stops after
//! `target/site/stageleaf.js` and `target/site/stageleaf.css`. Both are made by libraries: nothing is installed.

mod book;
mod script;
mod shelf_page;
mod streams;

use std::{
    fs,
    path::{Path, PathBuf},
    time::Instant,
};

/// What went wrong, in words for the person who builds.
pub type Failure = String;

/// Builds what `args` ask for.
///
/// # Errors
/// An argument that is not known; a step that failed, with the tool's own words.
pub fn run(args: &[String]) -> Result<(), Failure> {
    let script_only = match args {
        [] => false,
        [only] if only == "--script-only" => true,
        _ => return Err(format!("site: {} is not known\n  allowed: no argument, or --script-only", args.join(" "))),
    };
    let root = workspace();
    let out = root.join("target/site");
    let started = Instant::now();
    script::build(&root, &out)?;
    println!("site: {} ({} s)", out.join("stageleaf.js").display(), started.elapsed().as_secs());
    if !script_only {
        let started = Instant::now();
        let book = book::build(&root, &out)?;
        println!("site: {} ({} s)", book.join("index.html").display(), started.elapsed().as_secs());
    }
    Ok(())
}

/// The folder of the workspace's `Cargo.toml`: the builder is only ever run from its own source tree.
fn workspace() -> PathBuf {
    let here = Path::new(env!("CARGO_MANIFEST_DIR"));
    here.ancestors().nth(2).unwrap_or(here).to_owned()
}

fn read(path: &Path) -> Result<String, Failure> {
    fs::read_to_string(path).map_err(|error| format!("{}: {error}", path.display()))
}

fn write(path: &Path, content: impl AsRef<[u8]>) -> Result<(), Failure> {
    if let Some(folder) = path.parent() {
        fs::create_dir_all(folder).map_err(|error| format!("{}: {error}", folder.display()))?;
    }
    fs::write(path, content).map_err(|error| format!("{}: {error}", path.display()))
}
