//! Collects what is wrong with a request, each entry with the path of its field.

use rimeshift_engine::day::{Defect, MOST_DEFECTS};

use crate::error::ServiceError;

/// Defects in the order found, as many as an answer may list; the rest are counted.
#[derive(Debug, Default)]
pub(crate) struct Fields {
    listed: Vec<Defect>,
    unlisted: usize,
}

impl Fields {
    /// Notes a bad field.
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

    /// Whether nothing was found.
    pub(crate) fn is_empty(&self) -> bool {
        self.listed.is_empty()
    }

    /// The defects; where some were left out, a last entry counts them.
    pub(crate) fn into_defects(mut self) -> Vec<Defect> {
        if self.unlisted > 0 {
            self.listed.push(Defect {
                path: String::new(),
                problem: format!("{} more defects are not listed", self.unlisted),
                hint: "mend the listed ones first".to_owned(),
            });
        }
        self.listed
    }

    /// An error if anything was found.
    pub(crate) fn into_result(self) -> Result<(), ServiceError> {
        if self.is_empty() { Ok(()) } else { Err(ServiceError::bad_fields(self.into_defects())) }
    }
}
