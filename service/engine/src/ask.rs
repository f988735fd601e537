//! "May this flight change level now?" One option, against the filed day or against a plan.

use crate::answer::{AskAnswer, AskVerdict, Constraint, Rule};
use crate::benefit::{Figures, figures};
use crate::change::{Change, change_levels};
use crate::day::Alternative;
use crate::ids::FlightId;
use crate::plan::{PlanState, planned_stretches, sort_by_start};
use crate::traffic::Traffic;

/// One option of one flight.
#[derive(Debug, Clone, PartialEq)]
pub struct Question {
    /// The flight.
    pub flight: FlightId,
    /// The option, with what its sender says of it.
    pub option: Alternative,
}

/// Answers against the day as `state` has it.
#[must_use]
pub fn ask(traffic: &Traffic, state: &PlanState, question: &Question) -> AskAnswer {
    match make(traffic, state, question) {
        Ok((change, figures)) => judge(traffic, state, question, &change, figures),
        Err(Refused::Invalid(rule)) => unmade(traffic, question, AskVerdict::Invalid(rule)),
        Err(Refused::OwnChange) => {
            unmade(traffic, question, AskVerdict::No(vec![Constraint::OwnChange]))
        }
    }
}

enum Refused {
    Invalid(Rule),
    OwnChange,
}

/// The common profile of what the flight flies in the plan and of the option, and the option's
/// figures.
fn make(
    traffic: &Traffic,
    state: &PlanState,
    question: &Question,
) -> Result<(Change, Figures), Refused> {
    let day = &traffic.day;
    let flight = traffic.flight(question.flight);
    let track = &traffic.tracks[question.flight];
    let fly = |stretches: &[_]| {
        let change = change_levels(day, flight, track, stretches)?;
        match traffic.forbidden(question.flight, &change) {
            Some(rule) => Err(rule),
            None => Ok(change),
        }
    };
    let alone = fly(&question.option.stretches).map_err(Refused::Invalid)?;
    let figures = figures(day, flight, &question.option, &alone);
    let Some(moved) = state.moved_flight(question.flight) else { return Ok((alone, figures)) };
    let mut stretches = moved.change.stretches.clone();
    stretches.extend_from_slice(&question.option.stretches);
    sort_by_start(&mut stretches);
    let common = fly(&stretches).map_err(|_| Refused::OwnChange)?;
    Ok((common, figures))
}

fn judge(
    traffic: &Traffic,
    state: &PlanState,
    question: &Question,
    change: &Change,
    figures: Figures,
) -> AskAnswer {
    let changed = &change.changed;
    let differences = state.differences(traffic, question.flight, changed);
    let mut blockers = state.blockers(traffic, question.flight, changed, &differences);
    blockers.extend(own_limits(traffic, state, question, change, figures));
    let minima = traffic.minima(question.flight, changed);
    let version = traffic.version(question.flight, changed, &minima);
    AskAnswer {
        verdict: if blockers.is_empty() { AskVerdict::Yes } else { AskVerdict::No(blockers) },
        net_benefit: figures.net_benefit,
        contrail_km_avoided: figures.contrail_km_avoided,
        extra_fuel_kg: figures.extra_fuel_kg,
        arrival_shift_s: arrival_shift_s(state, question.flight, change),
        expected_new_losses: state.expected_new_losses(traffic, &version),
        least_slack: state.loads().least_slack(&differences),
        stretches: planned_stretches(
            traffic,
            question.flight,
            &question.option.stretches,
            Some(change),
        ),
    }
}

/// By how much the option moves the arrival that the flight has in the plan.
fn arrival_shift_s(state: &PlanState, flight: FlightId, change: &Change) -> f64 {
    let before_s = state.moved_flight(flight).map_or(0.0, |m| m.change.arrival_shift_s());
    change.arrival_shift_s() - before_s
}

/// The limits of the sender and of the policy that a plan would keep too.
fn own_limits(
    traffic: &Traffic,
    state: &PlanState,
    question: &Question,
    change: &Change,
    figures: Figures,
) -> Vec<Constraint> {
    let policy = &traffic.day.policy;
    let mut found = Vec::new();
    let extra_fuel_kg = figures.extra_fuel_kg;
    if let Some(limit_kg) = question.option.max_extra_fuel_kg.filter(|&l| extra_fuel_kg > l) {
        found.push(Constraint::FuelLimit { extra_fuel_kg, limit_kg });
    }
    let shift_s = arrival_shift_s(state, question.flight, change).abs();
    if let Some(limit) = policy.max_arrival_shift_s.filter(|&limit| shift_s > limit) {
        found.push(Constraint::PlanLimit { key: "max_arrival_shift_s", count: shift_s, limit });
    }
    let moved = state.moved().len() as f64 + 1.0;
    if let Some(limit) = policy.max_moved_flights
        && state.moved_flight(question.flight).is_none()
        && moved > limit
    {
        found.push(Constraint::PlanLimit { key: "max_moved_flights", count: moved, limit });
    }
    found
}

/// The answer about an option that cannot be flown.
fn unmade(traffic: &Traffic, question: &Question, verdict: AskVerdict) -> AskAnswer {
    AskAnswer {
        verdict,
        net_benefit: 0.0,
        contrail_km_avoided: 0.0,
        extra_fuel_kg: 0.0,
        arrival_shift_s: 0.0,
        expected_new_losses: 0.0,
        least_slack: None,
        stretches: planned_stretches(traffic, question.flight, &question.option.stretches, None),
    }
}
