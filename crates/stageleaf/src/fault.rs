//! What is wrong with the input, or with Stageleaf itself, and how it is told: place, what was given, what is allowed, what to try.

use std::fmt;

use stageleaf_note::Problem;

/// A reason why something could not be read or judged.
#[derive(Clone, Debug)]
pub enum Fault {
    /// A place in a text: note, part file or settings.
    Text(Box<Problem>),
    /// A whole file or folder.
    Path {
        /// As it was given.
        path: String,
        /// What is the matter.
        message: String,
        /// What is allowed.
        allowed: Option<String>,
        /// What to try.
        attempt: Option<String>,
    },
    /// A promise of Stageleaf's own that broke: its fault, not the note's.
    Bug {
        /// The note.
        file: String,
        /// The line of the stage's block.
        line: usize,
        /// The stage's name.
        stage: String,
        /// The promise, and where in the source it was made.
        message: String,
    },
}

impl Fault {
    /// A fault of a whole file or folder.
    #[must_use]
    pub fn path(path: impl Into<String>, message: impl Into<String>) -> Self {
        Self::Path { path: path.into(), message: message.into(), allowed: None, attempt: None }
    }

    /// The file or folder.
    #[must_use]
    pub fn file(&self) -> &str {
        match self {
            Self::Text(problem) => &problem.file,
            Self::Path { path, .. } => path,
            Self::Bug { file, .. } => file,
        }
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Text(problem) => problem.fmt(f),
            Self::Path { path, message, allowed, attempt } => {
                write!(f, "{path}: {message}")?;
                if let Some(allowed) = allowed {
                    write!(f, "\nallowed: {allowed}")?;
                }
                if let Some(attempt) = attempt {
                    write!(f, "\ntry: {attempt}")?;
                }
                Ok(())
            }
            Self::Bug { file, line, stage, message } => {
                write!(
                    f,
                    "{file}:{line}: bug in stageleaf at the stage “{stage}”: {message}\nthe other stages were judged all the same; this one shows a fault of the program, not of the note"
                )
            }
        }
    }
}
