//! Plans searched for: progress while the search runs, then its plans in pieces.

use std::sync::Arc;
use std::time::{Duration, Instant};

use rimeshift_engine::answer::{Plan, Plans};
use rimeshift_engine::audit::PlanUnderAudit;
use rimeshift_engine::day::Policy;
use rimeshift_engine::plan::{FindOptions, PlanError, Progress, Unmet, Watch, find};
use rimeshift_proto::v1;
use rimeshift_proto::v1::find_plans_response::Content;
use tokio::sync::{mpsc, watch};
use tonic::Status;

use super::Api;
use crate::compute::{StopSign, Work};
use crate::days::{LoadedDay, Ready};
use crate::error::ServiceError;
use crate::names::{DayName, ResourceId};
use crate::plans::{ByHand, Counts, KeptPlan, PlanRecord};
use crate::shelf::Replace;
use crate::wire::answer::Answers;
use crate::wire::chunks::chunks;
use crate::wire::fields::Fields;
use crate::wire::{by_hand, policy, to_wire};

/// Most plans of one search.
const MOST_PLANS: u32 = 20;
/// Most limits whose price is found by searching again.
const MOST_EXACT_LIMITS: u32 = 100;
/// Least time between two messages of progress.
const PROGRESS_STEP: Duration = Duration::from_millis(100);
/// Keys that are applied when a day is loaded, and can't be changed after.
pub(super) const LOADING_KEYS: &[(&str, &str)] = &[
    ("cruise_floor_fl", "it is applied when a day is loaded; load the day with it"),
    ("level_snap_ft", "it is applied when a day is loaded; load the day with it"),
];

pub(super) type Sender = mpsc::Sender<Result<v1::FindPlansResponse, Status>>;

/// A search that was asked for and understood.
#[derive(Debug)]
pub(super) struct Search {
    day: Arc<LoadedDay>,
    policy: Policy,
    options: FindOptions,
    deadline: Option<Instant>,
    keep: Option<(ResourceId, Replace)>,
}

impl Api {
    /// Reads a request; `deadline` is the call's own.
    pub(super) fn search_of(
        &self,
        request: v1::FindPlansRequest,
        deadline: Option<Instant>,
    ) -> Result<Search, ServiceError> {
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let mut fields = Fields::default();
        let mut options = options(&request, &mut fields);
        options.decisions =
            by_hand::resolve(day.ready.day(), "decisions", request.decisions, &mut fields);
        let time = max_time(request.max_time, &mut fields);
        let mut policy = day.ready.day().policy.clone();
        policy::apply(request.policy, &mut policy, LOADING_KEYS, &mut fields);
        policy::contradictions(&policy, &mut fields);
        fields.into_result()?;
        let keep = match request.plan_id.as_str() {
            "" => None,
            id => {
                let id = ResourceId::parse_rankable("plan_id", id)?;
                let replace = Replace::from(request.allow_replace);
                // Early, so that nobody searches in vain.
                let names: Vec<_> =
                    (1..=options.plans).map(|rank| day.name.plan(id.ranked(rank))).collect();
                day.plans.check_room(&names, replace)?;
                Some((id, replace))
            }
        };
        let limit = time.and_then(|time| Instant::now().checked_add(time));
        let deadline = crate::deadline::earlier(deadline, limit);
        Ok(Search { day, policy, options, deadline, keep })
    }

    /// Searches and sends everything. Ends early if nobody listens any more.
    pub(super) async fn search(&self, search: Search, sender: &Sender) -> Result<(), ServiceError> {
        let ready = search.day.under(&search.policy, &self.compute).await?;
        let plans = self.find_reporting(&search, &ready, sender).await?;
        let records = records(&plans, &search, ready.day().policy.same_loss_s);
        let kept = self.keep(&search, &plans, &records);
        tracing::info!(
            day = %search.day.name,
            stopped = ?plans.stopped,
            plans = plans.plans.len(),
            "plans found"
        );
        // Plans that could not be kept are sent all the same, before the error that says so.
        let names = kept.as_deref().unwrap_or_default();
        send_plans(&search, ready.answers(), &plans, &records, names, sender).await;
        kept.map(drop)
    }

    async fn find_reporting(
        &self,
        search: &Search,
        ready: &Arc<Ready>,
        sender: &Sender,
    ) -> Result<Plans, ServiceError> {
        let (news, mut latest) = watch::channel(None);
        let (ready, options) = (Arc::clone(ready), search.options.clone());
        let work = self
            .compute
            .run(Work::Job, search.deadline, move |sign| run(&ready, &options, sign, &news));
        let reporting = async {
            while latest.changed().await.is_ok() {
                let progress = *latest.borrow_and_update();
                if let Some(progress) = progress {
                    let content = Content::Progress(progress_to_wire(progress));
                    let _ = sender.send(Ok(message(content))).await;
                }
                tokio::time::sleep(PROGRESS_STEP).await;
            }
            std::future::pending().await
        };
        tokio::select! {
            found = work => found?,
            never = reporting => never,
        }
    }

    /// Keeps the plans if that was asked for; says under which names.
    fn keep(
        &self,
        search: &Search,
        plans: &Plans,
        records: &[PlanRecord],
    ) -> Result<Vec<String>, ServiceError> {
        let Some((id, replace)) = &search.keep else { return Ok(Vec::new()) };
        let kept: Vec<_> = (1..)
            .zip(plans.plans.iter().zip(records))
            .map(|(rank, (plan, record))| {
                let name = search.day.name.plan(id.ranked(rank));
                let mut claim = PlanUnderAudit::of(plan, plans.bound);
                claim.by_hand = Some(record.by_hand.in_force(search.day.ready.day()));
                let plan =
                    KeptPlan::new(name.clone(), search.policy.clone(), record.clone(), claim);
                (name, Arc::new(plan))
            })
            .collect();
        let names = kept.iter().map(|(name, _)| name.to_string()).collect();
        self.still_held(&search.day)?;
        search.day.plans.put(kept, *replace)?;
        Ok(names)
    }
}

fn options(request: &v1::FindPlansRequest, fields: &mut Fields) -> FindOptions {
    let default = FindOptions::default();
    let plans = request.plans.unwrap_or(1);
    if !(1..=MOST_PLANS).contains(&plans) {
        let hint = format!("1 to {MOST_PLANS}");
        fields.push(|| "plans".to_owned(), format!("`{plans}` is out of range"), hint);
    }
    let work = request.work.unwrap_or(default.work);
    if work == 0 {
        fields.push(|| "work".to_owned(), "is 0", "at least 1, or absent");
    }
    let gap = request.gap.unwrap_or(0.0);
    if !(0.0..=1.0).contains(&gap) {
        fields.push(|| "gap".to_owned(), format!("`{gap}` is out of range"), "0 to 1");
    }
    if request.exact_limits > MOST_EXACT_LIMITS {
        let problem = format!("`{}` is out of range", request.exact_limits);
        fields.push(|| "exact_limits".to_owned(), problem, format!("0 to {MOST_EXACT_LIMITS}"));
    }
    let exact_limits = request.exact_limits.min(MOST_EXACT_LIMITS) as usize;
    let unmet = if request.around_decisions { Unmet::PlanAround } else { Unmet::Refuse };
    FindOptions {
        plans: plans as usize,
        seed: request.seed,
        work,
        gap,
        exact_limits,
        unmet,
        ..default
    }
}

fn max_time(time: Option<prost_types::Duration>, fields: &mut Fields) -> Option<Duration> {
    let time = time?;
    let good = Duration::try_from(time).ok().filter(|time| !time.is_zero());
    if good.is_none() {
        let problem = format!("{} s and {} ns is no time to wait", time.seconds, time.nanos);
        fields.push(|| "max_time".to_owned(), problem, "above 0");
    }
    good
}

fn run(
    ready: &Ready,
    options: &FindOptions,
    sign: &StopSign,
    news: &watch::Sender<Option<Progress>>,
) -> Result<Plans, ServiceError> {
    let progress = |progress| {
        news.send_replace(Some(progress));
    };
    let watch = Watch { stop: &|| sign.reason(), progress: &progress };
    find(&ready.traffic, options, watch).map_err(|error| failure(ready, error))
}

/// What it means that there is no plan.
pub(super) fn failure(ready: &Ready, error: PlanError) -> ServiceError {
    match error {
        PlanError::TooManyCombinations(error) => {
            let flight = ready.answers().flight(error.flight);
            ServiceError::Precondition {
                subject: format!("flight `{flight}`"),
                problem: format!(
                    "its options combine in more than {} ways; give it fewer, or raise \
                     max_combinations",
                    error.limit
                ),
            }
        }
        PlanError::UnmetDecision { decision, breaks } => ServiceError::Precondition {
            subject: ready.answers().hand_decision(&decision),
            problem: format!(
                "can't be met: {}",
                breaks
                    .iter()
                    .map(|reason| ready.answers().in_words(reason))
                    .collect::<Vec<_>>()
                    .join("; ")
            ),
        },
        PlanError::GrantRate => ServiceError::Precondition {
            subject: "policy key `min_grant_rate_per_operator`".to_owned(),
            problem: "no plan was found that grants every operator so much; lower it, or give the \
                      search more time"
                .to_owned(),
        },
        PlanError::NotAPlan => ServiceError::Precondition {
            subject: "the plan".to_owned(),
            problem: "its grants are none of this day's options, or can't be flown together"
                .to_owned(),
        },
        PlanError::Cancelled => ServiceError::Cancelled,
        defect @ (PlanError::FailedAudit(_) | PlanError::Model(_)) => {
            tracing::error!(?defect, "the search failed");
            ServiceError::Internal
        }
    }
}

fn progress_to_wire(progress: Progress) -> v1::SearchProgress {
    let bound = Some(progress.bound).filter(|bound| bound.is_finite());
    let gap = bound.map(|b| (b - progress.objective).max(0.0) / b.abs().max(1e-9));
    v1::SearchProgress { objective: progress.objective, bound, gap, work: progress.work }
}

fn records(plans: &Plans, search: &Search, same_loss_s: f64) -> Vec<PlanRecord> {
    let record = |(rank, plan): (u32, &Plan)| {
        let claim = PlanUnderAudit::of(plan, None);
        PlanRecord {
            program_version: env!("CARGO_PKG_VERSION").to_owned(),
            seed: search.options.seed,
            stopped: plans.stopped,
            bound: plans.bound,
            gap: plans.gap(),
            rank,
            objective: plan.objective,
            expected_new_losses: plan.expected_new_losses,
            counts: Counts::of_plan(plan, &claim.decisions, same_loss_s),
            by_hand: ByHand {
                decisions: search.options.decisions.clone(),
                unmet_are: search.options.unmet,
                unmet: plans.unmet.clone(),
            },
        }
    };
    (1..).zip(&plans.plans).map(record).collect()
}

fn message(content: Content) -> v1::FindPlansResponse {
    v1::FindPlansResponse { content: Some(content) }
}

/// Sends origin and plans, each message made when the one before has gone; stops when nobody
/// listens.
async fn send_plans(
    search: &Search,
    answers: Answers<'_>,
    plans: &Plans,
    records: &[PlanRecord],
    kept: &[String],
    sender: &Sender,
) {
    let Some(best) = records.first() else { return };
    let origin = to_wire::origin(best, &search.policy, &search.day);
    let summaries = records.iter().enumerate().map(|(i, record)| v1::Plan {
        name: kept.get(i).cloned().unwrap_or_default(),
        ..to_wire::plan_summary(record)
    });
    let prices = (!plans.limit_prices.is_empty())
        .then(|| Content::LimitPrices(answers.limit_prices(&plans.limit_prices)));
    let plans = plans.plans.iter().zip(summaries).flat_map(|(plan, summary)| {
        std::iter::once(Content::Plan(summary)).chain(rows(answers, plan).map(Content::Rows))
    });
    for content in std::iter::once(Content::Origin(origin)).chain(prices).chain(plans) {
        if sender.send(Ok(message(content))).await.is_err() {
            return;
        }
    }
}

fn rows<'a>(
    answers: Answers<'a>,
    plan: &'a Plan,
) -> impl Iterator<Item = v1::PlanRows> + Send + 'a {
    let decisions = chunks(plan.decisions.iter().map(move |d| answers.decision(d)));
    let points = plan.moved.iter().flat_map(move |moved| answers.moved_points(moved));
    let loads = chunks(plan.loads.iter().map(move |l| answers.load_count(l)));
    let losses = chunks(plan.losses.iter().map(move |l| answers.plan_loss(l)));
    let decisions = decisions.map(|decisions| v1::PlanRows { decisions, ..Default::default() });
    let points =
        chunks(points).map(|moved_points| v1::PlanRows { moved_points, ..Default::default() });
    let loads = loads.map(|loads| v1::PlanRows { loads, ..Default::default() });
    let losses = losses.map(|losses| v1::PlanRows { losses, ..Default::default() });
    decisions.chain(points).chain(loads).chain(losses)
}
