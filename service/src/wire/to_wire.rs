//! Summaries of days and plans to the wire.

use rimeshift_engine::day::{Date, Day, Policy, Warning};
use rimeshift_engine::plan::Unmet;
use rimeshift_proto::v1;

use super::{answer, by_hand, clock, policy};
use crate::days::LoadedDay;
use crate::plans::{Counts, KeptPlan, PlanRecord};

/// Most warnings that an answer lists.
const MOST_WARNINGS: usize = 1000;

/// A day's summary.
pub(crate) fn day(loaded: &LoadedDay) -> v1::Day {
    let day = loaded.ready.day();
    v1::Day {
        name: loaded.name.to_string(),
        date: Some(date(day.date)),
        region: day.region.clone(),
        day_sha256: loaded.sha256.clone(),
        load_time: Some(clock::system_time(loaded.loaded)),
        counts: Some(counts(day)),
        policy: policy::settings(&day.policy),
        snapped_levels: day.snapped_levels,
    }
}

/// The warnings listed, and how many there are.
pub(crate) fn warnings(warnings: Vec<Warning>) -> (Vec<v1::Warning>, u32) {
    let all = count(warnings.len());
    let listed = warnings
        .into_iter()
        .take(MOST_WARNINGS)
        .map(|w| v1::Warning { path: w.path, message: w.message })
        .collect();
    (listed, all)
}

/// A number of rows; more than the wire can say become its most.
pub(crate) fn count(n: usize) -> u32 {
    u32::try_from(n).unwrap_or(u32::MAX)
}

fn date(date: Date) -> v1::Date {
    v1::Date { year: date.year, month: i32::from(date.month), day: i32::from(date.day) }
}

fn counts(day: &Day) -> v1::DayCounts {
    v1::DayCounts {
        sectors: count(day.sectors.len()),
        capacities: count(day.sectors.iter().map(|s| s.open.len()).sum()),
        airports: count(day.airports.len()),
        airport_capacities: count(day.airports.iter().map(|a| a.periods.len()).sum()),
        aircraft: count(day.classes.len()),
        fuel: count(day.fuel.iter().map(|table| table.rows.len()).sum()),
        flights: count(day.flights.len()),
        points: count(day.flights.iter().map(|f| f.profile.points().len()).sum()),
        proposals: count(day.proposals.len()),
        restrictions: count(day.restrictions.len()),
        background: count(day.background.len()),
        flows: count(day.flows.len()),
        decisions: count(day.decisions.len()),
    }
}

/// A kept plan's summary.
pub(crate) fn kept_plan(plan: &KeptPlan, day: &LoadedDay) -> v1::Plan {
    v1::Plan {
        name: plan.name.to_string(),
        origin: Some(origin(&plan.record, &plan.policy, day)),
        ..plan_summary(&plan.record)
    }
}

/// A plan's summary without name and origin.
pub(crate) fn plan_summary(record: &PlanRecord) -> v1::Plan {
    v1::Plan {
        rank: record.rank,
        objective: record.objective,
        expected_new_losses: record.expected_new_losses,
        counts: Some(plan_counts(record.counts)),
        ..Default::default()
    }
}

/// What all plans of a search share.
pub(crate) fn origin(record: &PlanRecord, by: &Policy, day: &LoadedDay) -> v1::PlanOrigin {
    let by_hand = |decisions| by_hand::to_wire(day.ready.answers(), decisions);
    v1::PlanOrigin {
        day_sha256: day.sha256.clone(),
        program_version: record.program_version.clone(),
        policy: policy::settings(by),
        seed: record.seed,
        stopped: answer::stopped(record.stopped).into(),
        bound: record.bound,
        gap: record.gap,
        decisions: by_hand(&record.by_hand.decisions),
        around_decisions: record.by_hand.unmet_are == Unmet::PlanAround,
        unmet: by_hand(&record.by_hand.unmet),
    }
}

fn plan_counts(counts: Counts) -> v1::PlanCounts {
    v1::PlanCounts {
        granted: count(counts.granted),
        amended: count(counts.amended),
        refused: count(counts.refused),
        invalid: count(counts.invalid),
        moved_flights: count(counts.moved_flights),
        removed_losses: count(counts.removed_losses),
        new_losses: count(counts.new_losses),
    }
}
