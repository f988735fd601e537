//! `rimeshift audit`: a plan judged by code that shares none of the search's shortcuts.

use super::session::{LoadedDay, Session};
use crate::exit::{Answered, Failure, Terms};
use crate::plan_folder;
use crate::report::audit::AuditReport;
use crate::screen::Form;
use rimeshift_proto::v1::{AuditPlanRequest, AuditPlanResponse};
use std::path::PathBuf;

/// Options of `audit`.
#[derive(Debug, clap::Args)]
pub(crate) struct AuditArgs {
    /// The day folder.
    day: PathBuf,
    /// The plan folder.
    plan: PathBuf,
}

/// Audits the best plan of a folder.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &AuditArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let audited = audit(args, session, &day).await;
    session.forget(&day).await;
    let report = AuditReport { day: day.day, answer: audited? };
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(if report.holds() { Answered::Plainly } else { Answered::AuditFailed })
}

async fn audit(
    args: &AuditArgs,
    session: &Session<'_>,
    day: &LoadedDay,
) -> Result<AuditPlanResponse, Failure> {
    let plan = plan_folder::read(&args.plan, &day.day.day_sha256).map_err(Failure::BadInput)?;
    let name = plan_folder::load(session, day, plan).await?;
    let progress = session.screen.begin("auditing the plan");
    let answer = session.plans().audit_plan(AuditPlanRequest { name }).await;
    progress.finish_and_clear();
    Ok(answer.map_err(|status| Failure::of_status(&status, Terms::Fields))?.into_inner())
}
