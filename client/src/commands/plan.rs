//! `rimeshift plan`: the best set of proposals that can be granted together.

use super::by_hand::ByHandArgs;
use super::session::{LoadedDay, Session};
use crate::args::{FailOn, seconds, share};
use crate::exit::{Answered, Failure, Terms};
use crate::plan_folder::{self, Existing, FoundPlan, FoundPlans};
use crate::report::figures::{percent, scientific};
use crate::report::plan::PlanReport;
use crate::screen::Form;
use indicatif::ProgressBar;
use rimeshift_proto::v1::find_plans_response::Content;
use rimeshift_proto::v1::{
    FindPlansRequest, PlanRows, PolicySetting, PolicyValue, SearchProgress, policy_value,
};
use std::path::PathBuf;
use std::time::Duration;
use tonic::Status;

/// Options of `plan`.
#[derive(Debug, clap::Args)]
pub(crate) struct PlanArgs {
    /// The day folder.
    day: PathBuf,
    /// The folder that the plan is to be.
    #[arg(long, value_name = "DIR")]
    out: PathBuf,
    /// Replace a plan that is there already.
    #[arg(long)]
    replace: bool,
    /// A table of proposals that takes the place of the day's.
    #[arg(long, value_name = "FILE")]
    proposals: Option<PathBuf>,
    #[command(flatten)]
    search: SearchArgs,
    #[command(flatten)]
    by_hand: ByHandArgs,
    /// End with exit code 1 if the planned day still holds this.
    #[arg(long, value_name = "WHAT")]
    fail_on: Vec<FailOn>,
}

/// How far a search is to go.
#[derive(Debug, clap::Args)]
pub(crate) struct SearchArgs {
    /// How many plans to find, best first.
    #[arg(long, value_name = "N", default_value_t = 1, value_parser = clap::value_parser!(u32).range(1..=20))]
    plans: u32,
    /// Stop after so many seconds; a plan so stopped may differ from run to run.
    #[arg(long, value_name = "S", value_parser = seconds)]
    seconds: Option<Duration>,
    /// Stop once the plan is proven to be this close to the best, e.g. 0.01.
    #[arg(long, value_name = "G", value_parser = share)]
    gap: Option<f64>,
    /// Seed of the search: the same day, policy, seed and work give the same plan.
    #[arg(long, value_name = "N", default_value_t = 1)]
    seed: u64,
    /// How plans keep flights apart, in place of the day's own choice.
    #[arg(long, value_name = "RULE", value_parser = ["nominal", "buffered", "risk", "priced"])]
    separation: Option<String>,
    /// For how many of the dearest limits to find exactly what one more would gain.
    #[arg(long, value_name = "N", default_value_t = 0, value_parser = clap::value_parser!(u32).range(0..=100))]
    exact_limits: u32,
}

impl SearchArgs {
    /// The keys of the policy that the command line sets.
    fn policy(&self) -> Vec<PolicySetting> {
        let separation = self.separation.iter().map(|rule| PolicySetting {
            key: "separation".to_owned(),
            value: Some(PolicyValue { kind: Some(policy_value::Kind::Text(rule.clone())) }),
        });
        separation.collect()
    }
}

/// Plans a day folder.
///
/// # Errors
/// When there is no answer, or it can't be written.
pub(crate) async fn run(args: &PlanArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let existing = if args.replace { Existing::Replace } else { Existing::Keep };
    plan_folder::check_place(&args.out, existing)?;
    let day = session.load_day(&args.day, args.proposals.as_deref()).await?;
    let planned = find(session, &day, &args.search, &args.by_hand).await;
    session.forget(&day).await;
    let found = planned?;
    plan_folder::write(&args.out, &found, existing)?;
    let report = PlanReport { found: &found, written_to: Some(&args.out) };
    show(session, &report)?;
    let fails = args.fail_on.iter().any(|what| match what {
        FailOn::Overload => report.planned_overloads() > 0,
        FailOn::Loss => report.planned_losses() > 0,
    });
    Ok(if fails { Answered::WithWhatFails } else { Answered::Plainly })
}

/// Writes a report in the form asked for.
///
/// # Errors
/// When standard output takes no more.
pub(super) fn show(session: &Session<'_>, report: &PlanReport<'_>) -> Result<(), Failure> {
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })
}

/// Searches plans for a loaded day, showing how far the search is.
///
/// # Errors
/// When the service has no answer.
pub(super) async fn find(
    session: &Session<'_>,
    day: &LoadedDay,
    search: &SearchArgs,
    by_hand: &ByHandArgs,
) -> Result<FoundPlans, Failure> {
    let (decisions, flags) = by_hand.decisions();
    let request = FindPlansRequest {
        parent: day.day.name.clone(),
        plans: Some(search.plans),
        seed: search.seed,
        gap: search.gap,
        policy: search.policy(),
        exact_limits: search.exact_limits,
        max_time: search.seconds.and_then(|time| prost_types::Duration::try_from(time).ok()),
        decisions,
        around_decisions: by_hand.around_decisions,
        ..FindPlansRequest::default()
    };
    let progress = session.screen.begin("planning");
    let found = collect(session, day, request, &progress).await;
    progress.finish_and_clear();
    found.map_err(|status| Failure::of_status(&status, Terms::Search(&day.folder, &flags)))
}

async fn collect(
    session: &Session<'_>,
    day: &LoadedDay,
    request: FindPlansRequest,
    progress: &ProgressBar,
) -> Result<FoundPlans, Status> {
    let mut found = FoundPlans { day: day.day.clone(), ..FoundPlans::default() };
    let mut answer = session.plans().find_plans(request).await?.into_inner();
    while let Some(message) = answer.message().await? {
        match message.content {
            Some(Content::Progress(state)) => progress.set_message(shown(&state)),
            Some(Content::Origin(origin)) => found.origin = origin,
            Some(Content::Plan(plan)) => {
                found.plans.push(FoundPlan { plan, rows: PlanRows::default() });
            }
            Some(Content::Rows(rows)) => {
                if let Some(last) = found.plans.last_mut() {
                    last.rows.decisions.extend(rows.decisions);
                    last.rows.moved_points.extend(rows.moved_points);
                    last.rows.loads.extend(rows.loads);
                    last.rows.losses.extend(rows.losses);
                }
            }
            Some(Content::LimitPrices(limits)) => found.limit_prices.extend(limits.prices),
            None => {}
        }
    }
    Ok(found)
}

/// How far a search is, in one line.
fn shown(state: &SearchProgress) -> String {
    let gap = state.gap.map_or_else(
        || "no bound yet".to_owned(),
        |gap| format!("within {} of the bound", percent(gap)),
    );
    format!(
        "planning: net benefit {}, {gap}, {} steps of work",
        scientific(state.objective),
        state.work
    )
}
