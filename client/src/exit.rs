//! How a command ends: exit codes, and what is said on standard error.
//!
//! | code | meaning |
//! |---|---|
//! | 0 | answered, whatever the answer |
//! | 1 | answered, and the answer holds what `--fail-on` names |
//! | 2 | bad input: the command line, a folder, a file |
//! | 3 | no service, or it failed |
//! | 4 | the audit found something wrong with a plan |

use crate::day_folder::DayFolder;
use crate::screen::Screen;
use crate::tables::findings::{Defect, Defects, Findings, Problem};
use std::fmt;
use std::io;
use std::path::Path;
use std::process::ExitCode;
use tonic::{Code, Status};
use tonic_types::StatusExt;

/// How a command that gave its answer ends.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Answered {
    /// Nothing more to say.
    Plainly,
    /// The answer holds what `--fail-on` names.
    WithWhatFails,
    /// The audit failed.
    AuditFailed,
}

/// In what terms the service's paths of fields are shown.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Terms<'a> {
    /// As files of a day folder name them.
    Folder(&'a DayFolder),
    /// As options of the command line: paths, and the option that each stands for.
    Options(&'a [(&'a str, &'a str)]),
    /// As the options that made a search's decisions by hand, else as files of a day folder.
    Search(&'a DayFolder, &'a [String]),
    /// As they are.
    Fields,
}

impl Terms<'_> {
    fn place(self, path: &str) -> String {
        match self {
            Terms::Folder(folder) => folder.place_of(path),
            Terms::Options(options) => options
                .iter()
                .find(|(field, _)| *field == path)
                .map_or_else(|| path.to_owned(), |(_, option)| (*option).to_owned()),
            Terms::Search(folder, flags) => {
                flag_of(flags, path).map_or_else(|| folder.place_of(path), str::to_owned)
            }
            Terms::Fields => path.to_owned(),
        }
    }

    fn text(self, text: &str) -> String {
        match self {
            Terms::Folder(folder) => folder.in_file_terms(text),
            Terms::Search(_, flags) => with_flags(flags, text),
            Terms::Options(_) | Terms::Fields => text.to_owned(),
        }
    }
}

/// A text in which decisions are named by their options.
fn with_flags(flags: &[String], text: &str) -> String {
    let words = text.split(' ').map(|word| flag_of(flags, word).unwrap_or(word));
    words.collect::<Vec<_>>().join(" ")
}

/// The option behind `decisions[2]`, or a field of it.
fn flag_of<'a>(flags: &'a [String], path: &str) -> Option<&'a str> {
    let (index, rest) = path.strip_prefix("decisions[")?.split_once(']')?;
    let whole = rest.is_empty() || rest.starts_with('.');
    let index: usize = index.parse().ok().filter(|_| whole)?;
    flags.get(index).map(String::as_str)
}

/// Why a command gave no answer.
#[derive(Debug)]
pub(crate) enum Failure {
    /// Something that was given is wrong.
    BadInput(Findings),
    /// There is no service, or it failed.
    NoService(Problem),
    /// The reader of standard output has gone; nothing is wrong.
    OutputClosed,
}

impl Failure {
    /// One thing that is wrong with what was given.
    pub(crate) fn input(place: impl fmt::Display, problem: Problem) -> Failure {
        let mut findings = Findings::default();
        findings.defects.add_problem(place, problem);
        Failure::BadInput(findings)
    }

    /// A file that can't be written.
    pub(crate) fn writing(path: &Path, error: &io::Error) -> Failure {
        Failure::input(path.display(), Problem::new(format!("can't be written: {error}")))
    }

    /// What a status of the service means; paths in it are put in terms of what was given.
    pub(crate) fn of_status(status: &Status, terms: Terms<'_>) -> Failure {
        let text = status.message();
        match status.code() {
            Code::InvalidArgument => {
                let mut findings = Findings::default();
                for defect in violations(status, terms) {
                    match defect.hint {
                        Some(hint) => {
                            findings.defects.add_with_hint(defect.place, defect.problem, hint);
                        }
                        None => findings.defects.add(defect.place, defect.problem),
                    }
                }
                if findings.defects.is_empty() {
                    findings.defects.add("", text);
                }
                Failure::BadInput(findings)
            }
            Code::NotFound
            | Code::AlreadyExists
            | Code::FailedPrecondition
            | Code::OutOfRange
            | Code::ResourceExhausted => Failure::input("", Problem::new(text)),
            Code::Unavailable => Failure::NoService(Problem::with_hint(
                format!("the service can't be reached: {}", reason(status)),
                "is it running at that address? Without --server the program serves itself",
            )),
            Code::Unimplemented => {
                Failure::NoService(Problem::new("the service does not offer this"))
            }
            code => Failure::NoService(Problem::new(format!("the service failed: {code}: {text}"))),
        }
    }
}

/// The deepest cause that a status names, else its message.
fn reason(status: &Status) -> String {
    let mut source = std::error::Error::source(status);
    let mut deepest = status.message().to_owned();
    while let Some(error) = source {
        deepest = error.to_string();
        source = error.source();
    }
    deepest
}

/// The bad fields that a status names.
fn violations(status: &Status, terms: Terms<'_>) -> Vec<Defect> {
    let Some(request) = status.get_details_bad_request() else { return Vec::new() };
    request
        .field_violations
        .into_iter()
        .map(|violation| {
            let (problem, hint) = split_hint(&violation.description);
            Defect {
                place: terms.place(&violation.field),
                problem: terms.text(problem),
                hint: hint.map(|hint| terms.text(hint)),
            }
        })
        .collect()
}

/// Splits "what is wrong (what would be right)".
fn split_hint(description: &str) -> (&str, Option<&str>) {
    let parts = description.strip_suffix(')').and_then(|text| text.split_once(" ("));
    match parts {
        Some((problem, hint)) => (problem, Some(hint)),
        None => (description, None),
    }
}

/// Says on standard error why there is no answer, and gives the exit code.
pub(crate) fn report(outcome: Result<Answered, Failure>, screen: &Screen) -> ExitCode {
    match outcome {
        Ok(Answered::Plainly) | Err(Failure::OutputClosed) => ExitCode::SUCCESS,
        Ok(Answered::WithWhatFails) => ExitCode::from(1),
        Ok(Answered::AuditFailed) => ExitCode::from(4),
        Err(Failure::BadInput(findings)) => {
            for warning in &findings.warnings {
                screen.say(&format!("warning: {warning}"));
            }
            for defect in findings.defects.listed() {
                screen.say(&format!("error: {defect}"));
            }
            let unlisted = findings.defects.count() - findings.defects.listed().len() as u64;
            if unlisted > 0 {
                screen.say(&format!("… and {unlisted} more"));
            }
            ExitCode::from(2)
        }
        Err(Failure::NoService(problem)) => {
            let mut defects = Defects::default();
            defects.add_problem("", problem);
            screen.say(&format!("error: {defects}"));
            ExitCode::from(3)
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decisions_are_named_by_their_options() {
        let flags = ["--grant P1".to_owned(), "--refuse P1".to_owned()];
        assert_eq!(flag_of(&flags, "decisions[1].must"), Some("--refuse P1"));
        assert_eq!(flag_of(&flags, "decisions[2].must"), None);
        assert_eq!(flag_of(&flags, "gap"), None);
        assert_eq!(with_flags(&flags, "contradicts decisions[0]"), "contradicts --grant P1");
        let odd = "decisions[x] or decisions[0";
        assert_eq!(with_flags(&flags, odd), odd);
    }

    #[test]
    fn a_remedy_in_brackets_is_told_apart() {
        assert_eq!(
            split_hint("`x` is no id (letters only)"),
            ("`x` is no id", Some("letters only"))
        );
        assert_eq!(split_hint("has 1 point"), ("has 1 point", None));
        assert_eq!(split_hint("a (b) c"), ("a (b) c", None));
    }
}
