//! `rimeshift why`: why a plan leaves a proposal out, and what it would take to let it in.

use super::session::{LoadedDay, Session};
use crate::exit::{Answered, Failure, Terms};
use crate::plan_folder;
use crate::report::why::WhyReport;
use crate::screen::Form;
use rimeshift_proto::v1::{ExplainRefusalRequest, ExplainRefusalResponse};
use std::path::PathBuf;

/// Options of `why`.
#[derive(Debug, clap::Args)]
pub(crate) struct WhyArgs {
    /// The day folder.
    day: PathBuf,
    /// The plan folder.
    plan: PathBuf,
    /// The proposal.
    #[arg(long)]
    proposal: String,
}

/// Explains a refusal.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &WhyArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let explained = explain(args, session, &day).await;
    session.forget(&day).await;
    let answer = explained?;
    let report = WhyReport { proposal: &args.proposal, answer: &answer };
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(Answered::Plainly)
}

async fn explain(
    args: &WhyArgs,
    session: &Session<'_>,
    day: &LoadedDay,
) -> Result<ExplainRefusalResponse, Failure> {
    let plan = plan_folder::read(&args.plan, &day.day.day_sha256).map_err(Failure::BadInput)?;
    let plan = plan_folder::load(session, day, plan).await?;
    let progress = session.screen.begin("searching the best plan with it");
    let request = ExplainRefusalRequest { plan, proposal: args.proposal.clone() };
    let answer = session.plans().explain_refusal(request).await;
    progress.finish_and_clear();
    let terms = Terms::Options(&[("proposal", "--proposal")]);
    Ok(answer.map_err(|status| Failure::of_status(&status, terms))?.into_inner())
}
