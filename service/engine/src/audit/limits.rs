//! The policy's own limits on a plan, and the senders' limits on fuel.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::decisions::alone;
use super::figures::extra_fuel_kg;
use super::report::Finding;
use super::tolerances::{COUNT, Lean, TIME_S};
use super::world::{Grant, World};
use super::worth::{fuel_source, fuel_tolerance_kg};
use crate::ids::{FlightId, Id};

/// Everything granted beyond a limit.
pub(super) fn judge_limits(world: &World<'_>) -> Vec<Finding> {
    let policy = &world.day.policy;
    let mut findings = Vec::new();
    let moved = world.grants.len() as f64;
    if let Some(limit) = policy.max_moved_flights.filter(|&limit| moved > limit) {
        findings.push(Finding::PolicyLimit {
            key: "max_moved_flights",
            flight: None,
            proposal: None,
            value: moved,
            limit,
        });
    }
    for (&flight, grants) in &world.grants {
        let changes = grants.len() as f64;
        if let Some(limit) = policy.max_changes_per_flight.filter(|&limit| changes > limit) {
            findings.push(Finding::PolicyLimit {
                key: "max_changes_per_flight",
                flight: Some(flight),
                proposal: None,
                value: changes,
                limit,
            });
        }
    }
    let by_flight: Vec<(&FlightId, &Vec<Grant<'_>>)> = world.grants.iter().collect();
    let each: Vec<Vec<Finding>> = by_flight
        .par_iter()
        .map(|&(&flight, grants)| {
            grants.iter().flat_map(|&grant| limits_of_one(world, flight, grant)).collect()
        })
        .collect();
    findings.extend(each.into_iter().flatten());
    findings.extend(operator_shares(world));
    findings
}

fn limits_of_one<'d>(world: &World<'d>, flight: FlightId, grant: Grant<'d>) -> Vec<Finding> {
    let mut findings = Vec::new();
    if let Some(limit) = world.day.policy.max_arrival_shift_s
        && let Ok(own) = alone(world, flight, grant, Lean::ForPlan)
    {
        let shift_s = own.flown.path.end_s() - world.filed[flight.index()].path.end_s();
        if shift_s.abs() > limit + TIME_S {
            findings.push(Finding::PolicyLimit {
                key: "max_arrival_shift_s",
                flight: Some(flight),
                proposal: Some(grant.proposal),
                value: shift_s,
                limit,
            });
        }
    }
    let fuel = extra_fuel_kg(world, flight, &[grant]).into_iter().flatten().next();
    if let Some((limit_kg, extra_fuel_kg)) = grant.alternative.max_extra_fuel_kg.zip(fuel) {
        let source = fuel_source(world.day, &world.day.flights[flight], grant.alternative);
        if extra_fuel_kg > limit_kg + fuel_tolerance_kg(source, extra_fuel_kg) {
            let proposal = grant.proposal;
            findings.push(Finding::FuelLimit { proposal, extra_fuel_kg, limit_kg });
        }
    }
    findings
}

/// Operators with more than their share of all grants; flights without one are nobody's.
fn operator_shares(world: &World<'_>) -> Vec<Finding> {
    let Some(limit) = world.day.policy.max_share_per_operator else { return Vec::new() };
    let all: usize = world.grants.values().map(Vec::len).sum();
    let mut by_operator: BTreeMap<&str, (usize, FlightId)> = BTreeMap::new();
    for (&flight, grants) in &world.grants {
        if let Some(operator) = &world.day.flights[flight].operator {
            by_operator.entry(operator).or_insert((0, flight)).0 += grants.len();
        }
    }
    by_operator
        .into_values()
        .map(|(count, flight)| (count as f64 / all.max(1) as f64, flight))
        .filter(|&(share, _)| share > limit + COUNT)
        .map(|(value, flight)| Finding::PolicyLimit {
            key: "max_share_per_operator",
            flight: Some(flight),
            proposal: None,
            value,
            limit,
        })
        .collect()
}
