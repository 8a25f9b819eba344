//! The command line: what it takes, and what becomes of it.

use std::{ffi::OsString, fs, io, process::ExitCode};

use clap::{Parser, Subcommand};

use crate::{
    alternates,
    check::{self, Ending},
    choose, diff, embed, explain,
    fault::Fault,
    needs, new, overview, page,
    terminal::Terminal,
    walk::show,
};

/// Operational-amplifier stages in design notes: figures, limits, verdicts.
#[derive(Debug, Parser)]
#[command(name = "stageleaf", version, about, arg_required_else_help = true)]
struct Line {
    #[command(subcommand)]
    command: Command,
}

#[derive(Debug, Subcommand)]
enum Command {
    /// Judge every stage of every note, and every number that the prose quotes
    ///
    /// Exit code: 0 all limits hold or are thin; 1 one breaks, is undetermined, or the prose quotes a stale number; 2 something could not be read.
    Check(check::Options),
    /// Print a commented block of a stage kind to start from
    New(new::Options),
    /// Write a note's sheets as one self-contained HTML file
    Page(page::Options),
    /// Say how a figure is computed, with a stage's numbers in place, and what is not modelled
    Explain(explain::Options),
    /// Say what a revision did to every figure and every verdict
    ///
    /// Exit code: 0 no verdict got worse and no limit was loosened or dropped; 1 one was; 2 something could not be read.
    Diff(diff::Options),
    /// Say what a stage needs of its amplifier, and how loose its components may be
    ///
    /// For each amplifier figure the value at which the first limit breaks, all else as it stands, at the worst case.
    Needs(needs::Options),
    /// Judge every part of the shelf in the place of a stage's own
    ///
    /// Exit code: 0 every stage has another part that keeps its limits; 1 one has none; 2 something could not be read.
    Alternates(alternates::Options),
    /// Choose component values for what is wanted, from a series or a stock list
    ///
    /// Every choice is judged in full, with the stage's own limits. Exit code: 0 one keeps them all; 1 none does; 2 bad input.
    Choose(choose::Options),
    /// Print a chapter with every stage, what is nearest to breaking first
    Overview(overview::Options),
    /// Put sheets into a book: mdBook's preprocessor
    Embed {
        /// Nothing, or `supports RENDERER`
        #[arg(value_name = "ARGUMENT", allow_hyphen_values = true, trailing_var_arg = true)]
        arguments: Vec<String>,
    },
    /// Build the script that makes sheets live, and the demo book
    #[cfg(feature = "site")]
    Site {
        /// Nothing, or `--script-only`
        #[arg(value_name = "ARGUMENT", allow_hyphen_values = true, trailing_var_arg = true)]
        arguments: Vec<String>,
    },
}

/// Runs a command line as a process does.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let line = match Line::try_parse_from(arguments) {
        Ok(line) => line,
        Err(error) => {
            // Help and version are not errors. Nobody is left to tell when printing fails.
            error.print().unwrap_or_default();
            return ExitCode::from(u8::from(error.use_stderr()) * 2);
        }
    };
    let mut terminal = Terminal::default();
    let ending = perform(&line.command, &mut terminal);
    if let Some(error) = terminal.take_failure() {
        terminal.complain(&format!("standard output: the results could not be written: {error}"));
        return ExitCode::from(Ending::BadInput as u8);
    }
    ExitCode::from(ending as u8)
}

fn perform(command: &Command, terminal: &mut Terminal) -> Ending {
    match command {
        Command::Check(options) => check::run(options, terminal),
        Command::New(options) => print(new::block(options), terminal),
        Command::Explain(options) => explain::run(options, terminal),
        Command::Diff(options) => diff::run(options, terminal),
        Command::Needs(options) => needs::run(options, terminal),
        Command::Alternates(options) => alternates::run(options, terminal),
        Command::Choose(options) => choose::run(options, terminal),
        Command::Overview(options) => overview::run(options, terminal),
        Command::Page(options) => write_page(options, terminal),
        Command::Embed { arguments } => match embed::command(arguments, io::stdin().lock(), io::stdout().lock(), io::stderr().lock()) {
            Ok(true) => Ending::Good,
            Ok(false) => Ending::Broken,
            Err(message) => refuse(&message, terminal),
        },
        #[cfg(feature = "site")]
        Command::Site { arguments } => match crate::site::run(arguments) {
            Ok(()) => Ending::Good,
            Err(message) => refuse(&message, terminal),
        },
    }
}

fn print(text: Result<String, Fault>, terminal: &mut Terminal) -> Ending {
    match text {
        Ok(text) => {
            terminal.out(&text);
            Ending::Good
        }
        Err(fault) => refuse(&fault.to_string(), terminal),
    }
}

fn refuse(message: &str, terminal: &mut Terminal) -> Ending {
    terminal.complain(message);
    Ending::BadInput
}

fn write_page(options: &page::Options, terminal: &mut Terminal) -> Ending {
    let page = page::make(options);
    for fault in &page.faults {
        terminal.complain(&format!("{fault}\n"));
    }
    let Some(html) = &page.html else { return Ending::BadInput };
    if let Some(path) = &options.out {
        if let Err(error) = fs::write(path, html) {
            return refuse(&format!("{}: the page could not be written: {error}", show(path)), terminal);
        }
        terminal.complain(&format!("{}: {} stage{}", show(path), page.stages, if page.stages == 1 { "" } else { "s" }));
    } else {
        terminal.out(html);
    }
    if !page.live {
        terminal.complain(
            "the page is a static sheet: no stageleaf.js was found beside the program or in target/site (name one with --script)",
        );
    }
    if page.faults.is_empty() { Ending::Good } else { Ending::BadInput }
}
