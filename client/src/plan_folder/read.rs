//! Reads a plan folder back, and gives it to the service.

use super::document::PlanDocument;
use super::hand::HandDocument;
use super::tables::{read_loads, read_losses};
use super::{DOCUMENT, FoundPlan, points_name};
use crate::commands::session::{LoadedDay, Session};
use crate::day_folder::{midnight, read_profiles};
use crate::exit::{Failure, Terms};
use crate::tables::findings::Findings;
use crate::tables::findings::shown;
use crate::tables::table_file::TableFile;
use crate::tables::whole_file::read_text;
use jiff::civil::Date;
use prost::Message;
use rimeshift_proto::v1::load_plan_request::Content;
use rimeshift_proto::v1::{LoadPlanHeader, LoadPlanRequest, Plan, PlanOrigin, PlanRows};
use std::path::Path;

/// The size at which a message is sent, bytes; at most 4 MiB are taken.
const FULL: usize = 1 << 20;

/// The id under which a plan that was read is kept for the length of a command.
const PLAN_ID: &str = "read-back";

/// The best plan of a folder.
#[derive(Debug)]
pub(crate) struct ReadPlan(pub(super) FoundPlan);

impl ReadPlan {
    /// The plan and its rows.
    pub(crate) fn into_found(self) -> FoundPlan {
        self.0
    }
}

/// Reads the best plan of a folder, made for the day of that hash.
///
/// # Errors
/// Everything that is wrong with the folder; a plan for another day.
pub(crate) fn read(folder: &Path, day_sha256: &str) -> Result<ReadPlan, Findings> {
    let mut findings = Findings::default();
    let shown_folder = folder.display();
    let place = format!("{shown_folder}/{DOCUMENT}");
    let Some(text) = read_text(&folder.join(DOCUMENT), &place, &mut findings.defects) else {
        return Err(findings);
    };
    let document: PlanDocument = match serde_json::from_str(&text) {
        Ok(document) => document,
        Err(error) => {
            findings.defects.add_with_hint(
                &place,
                format!("is no plan: {error}"),
                "give a folder that `rimeshift plan` wrote",
            );
            return Err(findings);
        }
    };
    if document.day_sha256 != day_sha256 {
        findings.defects.add_with_hint(
            &place,
            format!(
                "is a plan for another day: it was made for {} {} with day_sha256 {}, and the day \
                 given has {day_sha256}",
                shown(&document.region),
                document.date,
                document.day_sha256
            ),
            "give the day that the plan was made for; any change of its tables or policy makes it \
             another day",
        );
        return Err(findings);
    }
    let plan = best_plan(&document, &place, &mut findings);
    let rows = plan.map(|(plan, decisions)| {
        let table = |name: &str| {
            let shown = format!("{shown_folder}/{name}");
            TableFile::at(&folder.join(name), &shown)
        };
        let mut rows = PlanRows { decisions, ..PlanRows::default() };
        let date = document.date.parse().unwrap_or(Date::ZERO);
        if let Ok(file) = table(&points_name(1)) {
            rows.moved_points = read_profiles(&file, midnight(date), &mut findings);
        }
        if let Ok(file) = table("loads.csv") {
            rows.loads = read_loads(file, &mut findings);
        }
        if let Ok(file) = table("losses.csv") {
            rows.losses = read_losses(file, &mut findings);
        }
        FoundPlan { plan, rows }
    });
    match rows {
        Some(found) if findings.defects.is_empty() => Ok(ReadPlan(found)),
        _ => Err(findings),
    }
}

fn best_plan(
    document: &PlanDocument,
    place: &str,
    findings: &mut Findings,
) -> Option<(Plan, Vec<rimeshift_proto::v1::Decision>)> {
    let Some(best) = document.plans.first() else {
        findings.defects.add(place, "holds no plan");
        return None;
    };
    let mut decisions = Vec::with_capacity(best.decisions.len());
    for decision in &best.decisions {
        match decision.decision() {
            Ok(decision) => decisions.push(decision),
            Err(problem) => findings
                .defects
                .add(format_args!("{place}: proposal {}", shown(&decision.proposal)), problem),
        }
    }
    let policy = document.policy_settings().unwrap_or_else(|key| {
        findings.defects.add(format_args!("{place}: policy.{key}"), "is no value of a policy");
        Vec::new()
    });
    let mut by_hand = |key: &str, documents: &[HandDocument]| {
        let mut decisions = Vec::with_capacity(documents.len());
        for (index, document) in documents.iter().enumerate() {
            match document.decision() {
                Ok(decision) => decisions.push(decision),
                Err(problem) => {
                    findings.defects.add_problem(format_args!("{place}: {key}[{index}]"), problem)
                }
            }
        }
        decisions
    };
    let origin = PlanOrigin {
        day_sha256: document.day_sha256.clone(),
        program_version: document.program_version.clone(),
        policy,
        seed: document.seed,
        stopped: document.stopped_value(),
        bound: document.bound,
        gap: document.gap,
        decisions: by_hand("by_hand", &document.by_hand),
        around_decisions: document.around_decisions,
        unmet: by_hand("unmet", &document.unmet),
    };
    let plan = Plan {
        name: String::new(),
        origin: Some(origin),
        rank: best.rank,
        objective: best.objective,
        expected_new_losses: document.expected_new_losses,
        counts: None,
    };
    Some((plan, decisions))
}

/// Gives a plan to the service, beside its day.
///
/// # Errors
/// When the service does not take it.
pub(crate) async fn load(
    session: &Session<'_>,
    day: &LoadedDay,
    plan: ReadPlan,
) -> Result<String, Failure> {
    let header = LoadPlanHeader {
        parent: day.day.name.clone(),
        plan_id: PLAN_ID.to_owned(),
        allow_replace: true,
        plan: Some(plan.0.plan),
    };
    let mut requests = vec![LoadPlanRequest { content: Some(Content::Header(header)) }];
    requests.extend(messages(plan.0.rows));
    let response = session.plans().load_plan(tokio_stream::iter(requests)).await;
    // Paths of this request name parts of the plan, not rows of the day folder.
    let loaded =
        response.map_err(|status| Failure::of_status(&status, Terms::Fields))?.into_inner();
    Ok(loaded.plan.unwrap_or_default().name)
}

/// Rows in messages of about a megabyte.
fn messages(rows: PlanRows) -> Vec<LoadPlanRequest> {
    let mut packed = Packed::default();
    for decision in rows.decisions {
        packed.add(decision.encoded_len(), |rows| rows.decisions.push(decision));
    }
    for flight in rows.moved_points {
        packed.add(flight.encoded_len(), |rows| rows.moved_points.push(flight));
    }
    for load in rows.loads {
        packed.add(load.encoded_len(), |rows| rows.loads.push(load));
    }
    for loss in rows.losses {
        packed.add(loss.encoded_len(), |rows| rows.losses.push(loss));
    }
    packed.finish()
}

#[derive(Default)]
struct Packed {
    full: Vec<LoadPlanRequest>,
    rows: PlanRows,
    size: usize,
}

impl Packed {
    fn add(&mut self, size: usize, push: impl FnOnce(&mut PlanRows)) {
        push(&mut self.rows);
        self.size += size;
        if self.size >= FULL {
            self.close();
        }
    }

    fn close(&mut self) {
        let rows = std::mem::take(&mut self.rows);
        self.full.push(LoadPlanRequest { content: Some(Content::Rows(rows)) });
        self.size = 0;
    }

    fn finish(mut self) -> Vec<LoadPlanRequest> {
        if self.size > 0 {
            self.close();
        }
        self.full
    }
}
