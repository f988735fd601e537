//! `rimeshift policy`: every key of the policy.

use super::session::Session;
use crate::exit::{Answered, Failure};
use crate::report::policy::PolicyReport;
use crate::screen::Form;
use std::path::PathBuf;

/// Options of `policy`.
#[derive(Debug, clap::Args)]
pub(crate) struct PolicyArgs {
    /// The day folder whose values are to be shown; left out: the defaults.
    day: Option<PathBuf>,
}

/// Shows the policy of a day, or the defaults.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &PolicyArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let keys = match &args.day {
        None => session.policy_keys("").await?,
        Some(folder) => {
            let day = session.load_day(folder, None).await?;
            let keys = session.policy_keys(&day.day.name).await;
            session.forget(&day).await;
            keys?
        }
    };
    let report = PolicyReport { of_day: args.day.is_some(), keys };
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(Answered::Plainly)
}
