//! `check --format github`: annotations for the workflow log of a code host, in the form of its workflow commands
//! (`::error file=…,line=…,col=…,title=…::message`).
//!
//! The host shows ten errors and ten warnings of a step: the worst nine stand, the tenth counts the rest.

use std::fmt::Write as _;

use super::{
    Counts,
    findings::{Finding, Weight},
    text,
};

/// How many of each weight the host shows.
const SHOWN: usize = 10;

/// The annotations, the worst first, and the closing line.
#[must_use]
pub fn text(found: &[Finding], counts: &Counts) -> String {
    let mut all = String::new();
    for weight in [Weight::Error, Weight::Warning] {
        let of_weight: Vec<&Finding> = found.iter().filter(|f| f.weight == weight).collect();
        let shown = if of_weight.len() > SHOWN { SHOWN - 1 } else { of_weight.len() };
        for finding in &of_weight[..shown] {
            annotation(&mut all, finding);
        }
        if let Some(next) = of_weight.get(shown) {
            let rest = of_weight.len() - shown;
            let more = Finding {
                title: format!("{rest} more"),
                message: format!("{rest} more like this: `stageleaf check` lists all"),
                ..(*next).clone()
            };
            annotation(&mut all, &more);
        }
    }
    all.push_str(&text::closing(counts, false));
    all
}

fn annotation(all: &mut String, finding: &Finding) {
    let word = match finding.weight {
        Weight::Error => "error",
        Weight::Warning => "warning",
    };
    let place = finding.place.map_or(String::new(), |(line, column)| format!(",line={line},col={column}"));
    let (file, title) = (property(&finding.file), property(&finding.title));
    writeln!(all, "::{word} file={file}{place},title={title}::{}", data(&finding.message)).expect("a string takes all");
}

/// What a message cannot hold as it stands: a line's end would end it, and open another command.
fn data(text: &str) -> String {
    text.replace('%', "%25").replace('\r', "%0D").replace('\n', "%0A")
}

/// The same for a property, which ends at a comma or a colon.
fn property(text: &str) -> String {
    data(text).replace(':', "%3A").replace(',', "%2C")
}
