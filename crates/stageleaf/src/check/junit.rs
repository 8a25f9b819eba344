//! `check --format junit`: a test suite for each note, a case for each limit, quote and error.

use quick_junit::{NonSuccessKind, Report, TestCase, TestCaseStatus, TestSuite, XmlString};
use stageleaf_math::{limit::Verdict, search::alternates::forbids};
use stageleaf_note::{query_text, words};

use super::{
    examine::{Current, Examined, ExaminedStage},
    findings::{Finding, of_fault, of_note, place_of, sentence},
};
use crate::fault::Fault;

/// The document.
#[derive(Debug)]
pub struct Document(Report);

impl Default for Document {
    fn default() -> Self {
        Self(Report::new("stageleaf check"))
    }
}

impl Document {
    /// Takes a note in.
    pub fn note(&mut self, note: &Examined) {
        let mut suite = TestSuite::new(note.file.as_str());
        for stage in &note.stages {
            suite.add_test_case(case("analysed", stage, TestCaseStatus::success(), stage.block.line, &note.file));
            for (row, limit) in stage.limits_in_words() {
                let message = sentence(row, limit, stage);
                let status = match row.verdict {
                    Verdict::Holds | Verdict::Thin => TestCaseStatus::success(),
                    Verdict::Breaks => failed("breaks", &message),
                    Verdict::Undetermined => failed("undetermined", &message),
                    Verdict::Reported => continue,
                };
                let mut case = case(&query_text(row.limit.query), stage, status, place_of(stage, row).0, &note.file);
                if row.verdict == Verdict::Thin {
                    case.set_system_out(format!("thin: {message}"));
                }
                suite.add_test_case(case);
            }
            for caution in stage.report.cautions.iter().filter(|c| forbids(c)) {
                let status = failed("cannot work as stated", &words::caution_text(caution));
                suite.add_test_case(case("caution", stage, status, stage.block.line, &note.file));
            }
        }
        let stale = of_note(&Examined { faults: Vec::new(), stages: Vec::new(), ..copied(note) });
        let mut stale = stale.iter();
        for state in &note.quotes {
            let name = format!("quote of {} in line {}", query_text(state.quote.query), state.quote.line);
            let status = match state.current {
                Current::Agrees => TestCaseStatus::success(),
                _ => stale.next().map_or_else(TestCaseStatus::success, |f| failed("stale", &f.message)),
            };
            let mut case = TestCase::new(name, status);
            case.set_classname(state.stage.as_str());
            place(&mut case, &note.file, state.quote.line);
            suite.add_test_case(case);
        }
        for fault in &note.faults {
            suite.add_test_case(error(fault));
        }
        self.0.add_test_suite(suite);
    }

    /// Takes a fault of no note in.
    pub fn fault(&mut self, fault: &Fault) {
        let mut suite = TestSuite::new(fault.file());
        suite.add_test_case(error(fault));
        self.0.add_test_suite(suite);
    }

    /// The document as text.
    ///
    /// # Errors
    /// When it cannot be written as XML.
    pub fn text(&self) -> Result<String, quick_junit::SerializeError> {
        self.0.to_string()
    }
}

/// The note's quotes alone.
fn copied(note: &Examined) -> Examined {
    Examined { file: note.file.clone(), stages: Vec::new(), quotes: note.quotes.clone(), faults: Vec::new() }
}

fn case(name: &str, stage: &ExaminedStage, status: TestCaseStatus, line: usize, file: &str) -> TestCase {
    let mut case = TestCase::new(name, status);
    case.set_classname(stage.block.stage.name.as_str());
    place(&mut case, file, line);
    case
}

/// `file` and `line`, as readers of this form expect them.
fn place(case: &mut TestCase, file: &str, line: usize) {
    case.extra.insert(XmlString::new("file"), XmlString::new(file));
    case.extra.insert(XmlString::new("line"), XmlString::new(line.to_string()));
}

fn failed(kind: &str, message: &str) -> TestCaseStatus {
    let mut status = TestCaseStatus::non_success(NonSuccessKind::Failure);
    status.set_type(kind).set_message(message);
    status
}

fn error(fault: &Fault) -> TestCase {
    let Finding { title, message, place: at, .. } = of_fault(fault);
    let mut status = TestCaseStatus::non_success(NonSuccessKind::Error);
    status.set_type(title).set_message(message.as_str()).set_description(fault.to_string());
    let mut case = TestCase::new(message, status);
    place(&mut case, fault.file(), at.map_or(1, |(line, _)| line));
    case
}
