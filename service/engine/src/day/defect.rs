//! What is wrong with a day, as data: where, what, and what would be right.

use std::fmt;

/// Most defects that one answer lists; a day with more says so.
pub const MOST_DEFECTS: usize = 100;

/// One thing that is wrong with the parts of a day.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Defect {
    /// The field, e.g. `flights[12].points[3].level_ft`; indexes count from 0 in input order.
    pub path: String,
    /// What is wrong there, naming the value.
    pub problem: String,
    /// What would be right.
    pub hint: String,
}

impl fmt::Display for Defect {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: {}", self.path, self.problem)?;
        if !self.hint.is_empty() {
            write!(f, " ({})", self.hint)?;
        }
        Ok(())
    }
}

/// Something odd that does not keep a day from being used.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Warning {
    /// The field, as in [`Defect::path`]; empty where the day as a whole is meant.
    pub path: String,
    /// What was seen, and what is done about it.
    pub message: String,
}

/// Collects defects in the order found, up to [`MOST_DEFECTS`], and counts the rest.
#[derive(Debug, Default)]
pub(crate) struct Defects {
    listed: Vec<Defect>,
    unlisted: usize,
}

impl Defects {
    pub(crate) fn push(
        &mut self,
        path: impl FnOnce() -> String,
        problem: impl Into<String>,
        hint: impl Into<String>,
    ) {
        if self.listed.len() < MOST_DEFECTS {
            self.listed.push(Defect { path: path(), problem: problem.into(), hint: hint.into() });
        } else {
            self.unlisted += 1;
        }
    }

    pub(crate) fn is_empty(&self) -> bool {
        self.listed.is_empty()
    }

    /// The defects; where some were left out, the last entry says how many.
    pub(crate) fn into_vec(mut self) -> Vec<Defect> {
        if self.unlisted > 0 {
            self.listed.push(Defect {
                path: String::new(),
                problem: format!("{} more defects are not listed", self.unlisted),
                hint: "mend the listed ones first".to_owned(),
            });
        }
        self.listed
    }
}
