//! `check --rewrite`: the numbers that the prose quotes are brought up to date; every other byte of the note stays.

use std::{
    fs::{self, File, OpenOptions},
    io::{self, Write},
    path::{Path, PathBuf},
    process,
};

use super::examine::{Current, Examined};
use crate::{fault::Fault, walk::show};

/// Rewrites the stale quotes of `note` that have a current value, and marks them as agreeing. Returns how many.
///
/// # Errors
/// When the file cannot be replaced; it is then as it was.
pub fn rewrite(path: &Path, bytes: &[u8], note: &mut Examined) -> Result<usize, Fault> {
    let (text, done) = rewritten(bytes, note)?;
    if done.is_empty() {
        return Ok(0);
    }
    replace(path, bytes, &text)
        .map_err(|error| Fault::path(show(path), format!("the quotes could not be rewritten, and the note is as it was: {error}")))?;
    for index in &done {
        note.quotes[*index].current = Current::Agrees;
    }
    Ok(done.len())
}

/// The note's bytes with its stale quotes brought up to date, and which quotes those are.
fn rewritten(bytes: &[u8], note: &Examined) -> Result<(Vec<u8>, Vec<usize>), Fault> {
    let mut order: Vec<usize> = (0..note.quotes.len()).collect();
    order.sort_by_key(|i| note.quotes[*i].quote.range.start);
    let (mut text, mut done, mut at) = (Vec::with_capacity(bytes.len()), Vec::new(), 0);
    for index in order {
        let state = &note.quotes[index];
        let Current::Is { text: now } = &state.current else { continue };
        let range = state.quote.range.clone();
        // What stands there must be what was read: a number written with an escape is left alone and told.
        if range.start < at || bytes.get(range.clone()) != Some(state.quote.shown.as_bytes()) {
            let quote = &state.quote;
            return Err(Fault::Path {
                path: format!("{}:{}:{}", note.file, quote.line, quote.column),
                message: format!("“{}” cannot be rewritten in place, so nothing in this note was", quote.shown),
                allowed: Some("plain text between the brackets of the link, without emphasis, escapes or entities".to_owned()),
                attempt: Some(now.clone()),
            });
        }
        text.extend_from_slice(&bytes[at..range.start]);
        text.extend_from_slice(now.as_bytes());
        at = range.end;
        done.push(index);
    }
    text.extend_from_slice(&bytes[at..]);
    Ok((text, done))
}

/// Puts `text` in the place of `before`, whole or not at all: a file beside it is written and renamed.
fn replace(path: &Path, before: &[u8], text: &[u8]) -> io::Result<()> {
    // Through a link, the file that it leads to.
    let real = fs::canonicalize(path)?;
    let meta = fs::metadata(&real)?;
    if meta.permissions().readonly() {
        return Err(io::Error::new(io::ErrorKind::PermissionDenied, "it is read-only"));
    }
    if fs::read(&real)? != before {
        return Err(io::Error::other("it was changed by someone else meanwhile; run the command again"));
    }
    let (beside, mut file) = beside(&real)?;
    let written = file.write_all(text).and_then(|()| file.set_permissions(meta.permissions())).and_then(|()| file.sync_all());
    drop(file);
    let renamed = written.and_then(|()| fs::rename(&beside, &real));
    if renamed.is_err() {
        // Best effort: the first error is the one to tell.
        fs::remove_file(&beside).unwrap_or_default();
    }
    renamed
}

fn beside(real: &Path) -> io::Result<(PathBuf, File)> {
    let name = real.file_name().map(|n| n.to_string_lossy().into_owned()).unwrap_or_default();
    let mut attempt = 0_u32;
    loop {
        let path = real.with_file_name(format!(".{name}.{}.{attempt}.part", process::id()));
        match OpenOptions::new().write(true).create_new(true).open(&path) {
            Ok(file) => return Ok((path, file)),
            Err(error) if error.kind() == io::ErrorKind::AlreadyExists && attempt < 100 => attempt += 1,
            Err(error) => return Err(error),
        }
    }
}
