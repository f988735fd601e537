//! `rimeshift compare`: what differs between two plans of a day.

use super::session::{LoadedDay, Session};
use crate::exit::{Answered, Failure};
use crate::plan_folder::{self, FoundPlan};
use crate::report::compare::CompareReport;
use crate::screen::Form;
use std::path::{Path, PathBuf};

/// Options of `compare`.
#[derive(Debug, clap::Args)]
pub(crate) struct CompareArgs {
    /// The day folder.
    day: PathBuf,
    /// A plan folder.
    one: PathBuf,
    /// Another plan folder of the same day.
    other: PathBuf,
}

/// Compares the best plans of two folders.
///
/// # Errors
/// When one of them can't be read, or is of another day.
pub(crate) async fn run(args: &CompareArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let plans = read(args, &day);
    session.forget(&day).await;
    let (one, other) = plans?;
    let report = CompareReport { day: &day.day, one: &one, other: &other };
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(Answered::Plainly)
}

fn read(args: &CompareArgs, day: &LoadedDay) -> Result<(FoundPlan, FoundPlan), Failure> {
    let read = |folder: &Path| {
        let plan = plan_folder::read(folder, &day.day.day_sha256).map_err(Failure::BadInput)?;
        Ok(plan.into_found())
    };
    Ok((read(&args.one)?, read(&args.other)?))
}
