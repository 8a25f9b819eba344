//! Where words go: results to standard output, complaints to standard error, progress only to a terminal.

use std::{
    env,
    io::{self, IsTerminal, Write},
    time::{Duration, Instant},
};

/// Colour of a word; the word itself says the same.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ink {
    /// Kept.
    Good,
    /// Kept, barely; or not known.
    Watch,
    /// Not kept.
    Bad,
    /// Less important.
    Quiet,
}

/// Standard output and error of a command. A closed pipe ends the printing, not the command.
#[derive(Debug)]
pub struct Terminal {
    colour: bool,
    progress: bool,
    shown: bool,
    started: Instant,
    closed: bool,
    failed: Option<io::Error>,
}

impl Default for Terminal {
    fn default() -> Self {
        let plain = env::var_os("NO_COLOR").is_some_and(|v| !v.is_empty()) || env::var_os("TERM").is_some_and(|v| v == "dumb");
        Self {
            colour: io::stdout().is_terminal() && !plain,
            progress: io::stderr().is_terminal(),
            shown: false,
            started: Instant::now(),
            closed: false,
            failed: None,
        }
    }
}

impl Terminal {
    /// Whether words are coloured: on a terminal, unless `NO_COLOR` is set.
    #[must_use]
    pub const fn colour(&self) -> bool {
        self.colour
    }

    /// Prints results.
    pub fn out(&mut self, text: &str) {
        self.clear();
        if self.closed {
            return;
        }
        let mut stdout = io::stdout().lock();
        if let Err(error) = stdout.write_all(text.as_bytes()).and_then(|()| stdout.flush()) {
            self.closed = true;
            if error.kind() != io::ErrorKind::BrokenPipe {
                self.failed = Some(error);
            }
        }
    }

    /// Prints a complaint.
    pub fn complain(&mut self, text: &str) {
        self.clear();
        // Nobody is left to tell when this fails.
        writeln!(io::stderr(), "{text}").unwrap_or_default();
    }

    /// Shows how far a long command is.
    pub fn progress(&mut self, text: &str) {
        if self.progress && self.started.elapsed() > Duration::from_secs(1) {
            self.clear();
            let short: String = text.chars().take(76).collect();
            write!(io::stderr(), "{short}").unwrap_or_default();
            self.shown = true;
        }
    }

    /// Takes the progress line away.
    pub fn clear(&mut self) {
        if self.shown {
            write!(io::stderr(), "\r\u{1b}[K").unwrap_or_default();
            self.shown = false;
        }
    }

    /// Why results could not be printed (a full disk), where that was not a closed pipe.
    pub const fn take_failure(&mut self) -> Option<io::Error> {
        self.failed.take()
    }
}

/// `text` in `ink`, if `colour`.
#[must_use]
pub fn paint(text: &str, ink: Ink, colour: bool) -> String {
    if !colour {
        return text.to_owned();
    }
    let code = match ink {
        Ink::Good => "32",
        Ink::Watch => "33",
        Ink::Bad => "1;31",
        Ink::Quiet => "2",
    };
    format!("\u{1b}[{code}m{text}\u{1b}[0m")
}

/// `text` without control characters, which would move a terminal's cursor or change its colours, and without those that
/// reorder or hide what stands beside them (Unicode's bidirectional and invisible format characters, UAX #9).
#[must_use]
pub fn plain(text: &str) -> String {
    let masked = |c: char| {
        (c.is_control() && c != '\n')
            || matches!(c, '\u{061C}' | '\u{200B}'..='\u{200F}' | '\u{2028}'..='\u{202E}' | '\u{2060}'..='\u{206F}' | '\u{FEFF}')
    };
    text.chars().map(|c| if masked(c) { '\u{FFFD}' } else { c }).collect()
}
