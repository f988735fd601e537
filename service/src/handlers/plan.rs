//! Level changes: the calls that are answered from a day, a plan, or both.

use std::sync::Arc;

use rimeshift_engine::audit::audit;
use rimeshift_engine::day::Policy;
use rimeshift_engine::plan::Unmet;
use rimeshift_proto::v1;
use rimeshift_proto::v1::load_plan_request::Content;
use rimeshift_proto::v1::plan_service_server::PlanService;
use tokio::sync::mpsc;
use tokio_stream::wrappers::ReceiverStream;
use tonic::{Request, Response, Status, Streaming};
use tracing::Instrument;

use super::export::pieces;
use super::find::LOADING_KEYS;
use super::{Api, paging};
use crate::compute::Work;
use crate::days::LoadedDay;
use crate::deadline;
use crate::error::ServiceError;
use crate::names::{DayName, PlanName, ResourceId};
use crate::plans::{ByHand, Counts, KeptPlan, PlanRecord};
use crate::shelf::Replace;
use crate::stream::RowStream;
use crate::wire::fields::Fields;
use crate::wire::plan_rows::{ReceivingPlan, brought, stopped};
use crate::wire::{by_hand, finding, policy, to_wire};

/// Messages that wait for a slow reader.
const QUEUE: usize = 4;

#[tonic::async_trait]
impl PlanService for Api {
    type AskChangesStream = ReceiverStream<Result<v1::AskChangesResponse, Status>>;
    type ExportModelStream = ReceiverStream<Result<v1::ExportModelResponse, Status>>;
    type FindPlansStream = ReceiverStream<Result<v1::FindPlansResponse, Status>>;

    async fn ask_change(
        &self,
        request: Request<v1::AskChangeRequest>,
    ) -> Result<Response<v1::AskChangeResponse>, Status> {
        let v1::AskChangeRequest { day, plan, change } = request.into_inner();
        let answer = self.answer(&day, &plan, change).await?;
        Ok(Response::new(v1::AskChangeResponse { answer: Some(answer) }))
    }

    async fn ask_changes(
        &self,
        request: Request<Streaming<v1::AskChangesRequest>>,
    ) -> Result<Response<Self::AskChangesStream>, Status> {
        let (sender, receiver) = mpsc::channel(QUEUE);
        let (api, questions) = (self.clone(), request.into_inner());
        tokio::spawn(async move {
            let gone = sender.clone();
            tokio::select! {
                () = api.answer_all(questions, sender) => {}
                () = gone.closed() => {}
            }
        });
        Ok(Response::new(ReceiverStream::new(receiver)))
    }

    async fn find_plans(
        &self,
        request: Request<v1::FindPlansRequest>,
    ) -> Result<Response<Self::FindPlansStream>, Status> {
        let deadline = deadline::of_call(request.metadata());
        let search = self.search_of(request.into_inner(), deadline)?;
        let (sender, receiver) = mpsc::channel(QUEUE);
        let api = self.clone();
        let searching = async move {
            // Dropping the search when nobody listens any more stops its work.
            tokio::select! {
                done = api.search(search, &sender) => {
                    if let Err(error) = done {
                        let _ = sender.send(Err(error.into())).await;
                    }
                }
                () = sender.closed() => {}
            }
        };
        tokio::spawn(searching.instrument(tracing::info_span!("find_plans")));
        Ok(Response::new(ReceiverStream::new(receiver)))
    }

    #[tracing::instrument(skip_all)]
    async fn trace_trade_off(
        &self,
        request: Request<v1::TraceTradeOffRequest>,
    ) -> Result<Response<v1::TraceTradeOffResponse>, Status> {
        let deadline = deadline::of_call(request.metadata());
        Ok(Response::new(self.traced(request.into_inner(), deadline).await?))
    }

    #[tracing::instrument(skip_all)]
    async fn export_model(
        &self,
        request: Request<v1::ExportModelRequest>,
    ) -> Result<Response<Self::ExportModelStream>, Status> {
        let deadline = deadline::of_call(request.metadata());
        let text = self.exported(request.into_inner(), deadline).await?;
        let (sender, receiver) = mpsc::channel(QUEUE);
        tokio::spawn(async move {
            for piece in pieces(&text) {
                let message = v1::ExportModelResponse { text: piece.to_owned() };
                if sender.send(Ok(message)).await.is_err() {
                    break;
                }
            }
        });
        Ok(Response::new(ReceiverStream::new(receiver)))
    }

    #[tracing::instrument(skip_all)]
    async fn load_plan(
        &self,
        request: Request<Streaming<v1::LoadPlanRequest>>,
    ) -> Result<Response<v1::LoadPlanResponse>, Status> {
        let mut stream = RowStream::new(request.into_inner(), self)?;
        let header = match stream.next().await?.and_then(|message| message.content) {
            Some(Content::Header(header)) => header,
            _ => {
                let hint = "send the header in the first message";
                return Err(ServiceError::bad_field("header", "is missing", hint).into());
            }
        };
        let day = self.days.get(&DayName::parse("header.parent", &header.parent)?)?;
        let id = ResourceId::parse("header.plan_id", &header.plan_id)?;
        let name = day.name.plan(id);
        let replace = Replace::from(header.allow_replace);
        day.plans.check_room(std::slice::from_ref(&name), replace)?;
        let mut fields = Fields::default();
        let (mut record, policy) = record(&day, header.plan, &mut fields)?;
        let mut receiving = ReceivingPlan::new(day.ready.day(), day.ready.clock, fields);
        while let Some(message) = stream.next().await? {
            match message.content {
                Some(Content::Rows(rows)) => {
                    stream.count(brought(&rows))?;
                    receiving.add(rows);
                }
                Some(Content::Header(_)) => {
                    let hint = "only the first message holds a header";
                    return Err(ServiceError::bad_field("header", "is sent twice", hint).into());
                }
                None => {}
            }
        }
        // The gap of a search is that of its best plan.
        let gap = record.gap.filter(|_| record.rank == 1);
        let mut claim = receiving
            .finish(record.objective, record.bound, gap)
            .map_err(ServiceError::bad_fields)?;
        claim.by_hand = Some(record.by_hand.in_force(day.ready.day()));
        record.counts = Counts::of_decisions(&claim.decisions);
        let plan = Arc::new(KeptPlan::new(name.clone(), policy, record, claim));
        self.still_held(&day)?;
        day.plans.put(vec![(name, Arc::clone(&plan))], replace)?;
        let plan = to_wire::kept_plan(&plan, &day);
        Ok(Response::new(v1::LoadPlanResponse { plan: Some(plan) }))
    }

    #[tracing::instrument(skip_all)]
    async fn audit_plan(
        &self,
        request: Request<v1::AuditPlanRequest>,
    ) -> Result<Response<v1::AuditPlanResponse>, Status> {
        let (day, plan) = self.plan(&request.into_inner().name)?;
        let ready = day.under(&plan.policy, &self.compute).await?;
        let audited = move |_: &_| {
            let report = audit(ready.day(), &plan.claim);
            finding::report(ready.answers(), &report)
        };
        Ok(Response::new(self.compute.run(Work::Job, None, audited).await?))
    }

    #[tracing::instrument(skip_all)]
    async fn explain_refusal(
        &self,
        request: Request<v1::ExplainRefusalRequest>,
    ) -> Result<Response<v1::ExplainRefusalResponse>, Status> {
        let deadline = deadline::of_call(request.metadata());
        let answer = self.explained(request.into_inner(), deadline).await?;
        Ok(Response::new(answer))
    }

    async fn get_plan(
        &self,
        request: Request<v1::GetPlanRequest>,
    ) -> Result<Response<v1::GetPlanResponse>, Status> {
        let (day, plan) = self.plan(&request.into_inner().name)?;
        let plan = Some(to_wire::kept_plan(&plan, &day));
        Ok(Response::new(v1::GetPlanResponse { plan }))
    }

    async fn list_plans(
        &self,
        request: Request<v1::ListPlansRequest>,
    ) -> Result<Response<v1::ListPlansResponse>, Status> {
        let request = request.into_inner();
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let size = paging::page_size(request.page_size, 100, 1000)?;
        let after = match request.page_token.as_str() {
            "" => None,
            token => Some(PlanName::parse("page_token", token)?),
        };
        let plans = day.plans.page(after.as_ref(), size + 1);
        let (plans, next_page_token) = paging::cut(plans, size, |plan| plan.name.to_string());
        let plans = plans.iter().map(|plan| to_wire::kept_plan(plan, &day)).collect();
        Ok(Response::new(v1::ListPlansResponse { plans, next_page_token }))
    }

    async fn delete_plan(
        &self,
        request: Request<v1::DeletePlanRequest>,
    ) -> Result<Response<v1::DeletePlanResponse>, Status> {
        let name = PlanName::parse("name", &request.into_inner().name)?;
        self.days.get(&name.day)?.plans.delete(&name)?;
        Ok(Response::new(v1::DeletePlanResponse {}))
    }
}

impl Api {
    /// A kept plan and its day.
    pub(super) fn plan(&self, name: &str) -> Result<(Arc<LoadedDay>, Arc<KeptPlan>), ServiceError> {
        let name = PlanName::parse("name", name)?;
        let day = self.days.get(&name.day)?;
        let plan = day.plans.get(&name)?;
        Ok((day, plan))
    }
}

/// What a plan that is sent says of itself, and the policy by which it is judged.
fn record(
    day: &LoadedDay,
    plan: Option<v1::Plan>,
    fields: &mut Fields,
) -> Result<(PlanRecord, Policy), ServiceError> {
    let plan = plan.unwrap_or_default();
    let Some(origin) = plan.origin else {
        let hint = "say from which day the plan is, and by which policy";
        return Err(ServiceError::bad_field("header.plan.origin", "is missing", hint));
    };
    if origin.day_sha256 != day.sha256 {
        return Err(ServiceError::Precondition {
            subject: day.name.to_string(),
            problem: format!(
                "the plan is of the day with SHA-256 {}, and this day's is {}",
                origin.day_sha256, day.sha256
            ),
        });
    }
    for (field, value) in [
        ("objective", Some(plan.objective)),
        ("expected_new_losses", Some(plan.expected_new_losses)),
        ("origin.bound", origin.bound),
        ("origin.gap", origin.gap),
    ] {
        if value.is_some_and(|v| !v.is_finite()) {
            let path = || format!("header.plan.{field}");
            fields.push(path, "is no finite number", "a finite number");
        }
    }
    let stop = stopped(origin.stopped());
    if stop.is_none() {
        let path = || "header.plan.origin.stopped".to_owned();
        fields.push(path, "is missing or unknown", "why the search stopped");
    }
    let Some(stop) = stop else {
        return Err(ServiceError::bad_fields(std::mem::take(fields).into_defects()));
    };
    let own = &day.ready.day().policy;
    let mut policy = own.clone();
    policy::apply(origin.policy, &mut policy, &[], fields);
    policy::contradictions(&policy, fields);
    for (key, why) in LOADING_KEYS {
        if policy::differs(key, own, &policy) {
            fields.push(|| format!("policy.{key}"), "is not the day's", *why);
        }
    }
    let own_day = day.ready.day();
    let decisions =
        by_hand::resolve(own_day, "header.plan.origin.decisions", origin.decisions, fields);
    let unmet = by_hand::find(own_day, "header.plan.origin.unmet", origin.unmet, fields);
    let unmet_are = if origin.around_decisions { Unmet::PlanAround } else { Unmet::Refuse };
    let record = PlanRecord {
        program_version: origin.program_version,
        seed: origin.seed,
        stopped: stop,
        bound: origin.bound,
        gap: origin.gap,
        rank: plan.rank.max(1),
        objective: plan.objective,
        expected_new_losses: plan.expected_new_losses,
        counts: Counts::default(),
        by_hand: ByHand { decisions, unmet_are, unmet },
    };
    Ok((record, policy))
}
