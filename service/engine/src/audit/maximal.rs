//! Whether anything was left out that could be had: each option not taken is tried alone against
//! the finished plan; and whether the reasons given for leaving it out can be true.
//!
//! An option counts as possible only where it is possible for certain: at every borderline the
//! plan's maker may have decided against it.

use rayon::prelude::*;

use super::by_hand::{is_granted, keeps_out};
use super::claim::{ClaimedDecision, ReasonKind};
use super::decisions::{Decided, alone, option_of};
use super::figures::extra_fuel_kg;
use super::report::Finding;
use super::tolerances::{Lean, RELATIVE, TIME_S};
use super::world::{Delays, Grant, World, combine};
use super::worth::{Net, fuel_source, fuel_tolerance_kg, net};
use crate::answer::Verdict;
use crate::day::{Proposal, SeparationRule};
use crate::ids::{FlightId, Id, ProposalId};

/// Tries everything left out; gives findings and how many options were tried.
pub(super) fn judge_maximality(
    world: &World<'_>,
    decided: &Decided<'_, '_>,
) -> (Vec<Finding>, u64) {
    let tried: Vec<(Vec<Finding>, u64)> =
        decided.decisions.par_iter().map(|(&id, decision)| try_all(world, id, decision)).collect();
    let options = tried.iter().map(|(_, n)| n).sum();
    (tried.into_iter().flat_map(|(findings, _)| findings).collect(), options)
}

fn try_all(world: &World<'_>, id: ProposalId, decision: &ClaimedDecision) -> (Vec<Finding>, u64) {
    let proposal = &world.day.proposals[id];
    let flight = proposal.flight;
    let present = world.grants.get(&flight).map_or(&[][..], Vec::as_slice);
    if decision.verdict == Verdict::Invalid
        || (!present.is_empty() && !world.planned.contains_key(&flight))
    {
        return (Vec::new(), 0);
    }
    let taken = present.iter().find(|g| g.proposal == id);
    let others: Vec<Grant<'_>> = present.iter().copied().filter(|g| g.proposal != id).collect();
    let Some(now) = total(world, flight, present) else { return (Vec::new(), 0) };
    let mut findings = Vec::new();
    let mut tried = 0;
    for alternative in &proposal.alternatives {
        if taken.is_some_and(|g| g.alternative.option == alternative.option)
            || keeps_out(world, id, alternative.option)
        {
            continue;
        }
        let mut instead = others.clone();
        instead.push(Grant { proposal: id, alternative });
        instead.sort_by_key(|g| g.proposal);
        tried += 1;
        let Some(gain) = gain_of(world, flight, &instead, now) else { continue };
        if gain <= 0.0 || !keeps_limits(world, flight, &instead, id) {
            continue;
        }
        if could_fly(world, flight, &instead) {
            let option = alternative.option;
            findings.push(match taken {
                None => Finding::CouldAdd { proposal: id, option, gain },
                Some(_) => Finding::CouldSwitch { proposal: id, option, gain },
            });
        }
    }
    if taken.is_some()
        && decision.net_benefit <= 0.0
        && !is_granted(world, id)
        && could_fly(world, flight, &others)
    {
        findings.push(Finding::CouldDrop { proposal: id, net_benefit: decision.net_benefit });
    }
    (findings, tried)
}

/// Net benefit of all grants of a flight, and how exactly it is known.
#[derive(Debug, Clone, Copy)]
struct Total {
    net: Net,
    within: f64,
}

fn total<'d>(world: &World<'d>, flight: FlightId, grants: &[Grant<'d>]) -> Option<Total> {
    let policy = &world.day.policy;
    let mut sum = Total { net: Net { value: 0.0, size: 0.0 }, within: 0.0 };
    for (grant, fuel) in grants.iter().zip(extra_fuel_kg(world, flight, grants)) {
        let kg = fuel?;
        let source = fuel_source(world.day, &world.day.flights[flight], grant.alternative);
        let one = net(policy, grant.alternative, kg);
        let more = net(policy, grant.alternative, kg + fuel_tolerance_kg(source, kg));
        sum.net.value += one.value;
        sum.net.size += one.size;
        sum.within += (more.value - one.value).abs() + one.size * RELATIVE;
    }
    Some(sum)
}

/// What the objective gains for certain, at least, where a flight's grants are replaced.
fn gain_of<'d>(
    world: &World<'d>,
    flight: FlightId,
    instead: &[Grant<'d>],
    now: Total,
) -> Option<f64> {
    let then = total(world, flight, instead)?;
    let gain = then.net.value - now.net.value;
    let within = then.within + now.within + (then.net.size + now.net.size) * RELATIVE;
    (gain > within).then_some(gain)
}

/// Whether the policy and the sender's own limits allow a flight these grants, of which `new` is
/// not in the plan.
fn keeps_limits<'d>(
    world: &World<'d>,
    flight: FlightId,
    grants: &[Grant<'d>],
    new: ProposalId,
) -> bool {
    let policy = &world.day.policy;
    let already = world.grants.contains_key(&flight);
    let moved = world.grants.len() + usize::from(!already);
    let within = |count: usize, limit: Option<f64>| limit.is_none_or(|l| count as f64 <= l);
    if !within(moved, policy.max_moved_flights)
        || !within(grants.len(), policy.max_changes_per_flight)
    {
        return false;
    }
    let Some(grant) = grants.iter().find(|g| g.proposal == new) else { return false };
    let Ok(own) = alone(world, flight, *grant, Lean::AgainstPlan) else { return false };
    let shift_s = own.flown.path.end_s() - world.filed[flight.index()].path.end_s();
    let on_time = policy.max_arrival_shift_s.is_none_or(|limit| shift_s.abs() <= limit - TIME_S);
    on_time && keeps_fuel_limit(world, flight, grants)
}

/// Whether each grant's extra fuel is surely within what its sender accepts.
fn keeps_fuel_limit<'d>(world: &World<'d>, flight: FlightId, grants: &[Grant<'d>]) -> bool {
    grants.iter().zip(extra_fuel_kg(world, flight, grants)).all(|(grant, marginal)| {
        let Some(limit_kg) = grant.alternative.max_extra_fuel_kg else { return true };
        let alone = extra_fuel_kg(world, flight, std::slice::from_ref(grant));
        let source = fuel_source(world.day, &world.day.flights[flight], grant.alternative);
        [marginal, alone.first().copied().flatten()]
            .into_iter()
            .all(|kg| kg.is_some_and(|kg| kg <= limit_kg - fuel_tolerance_kg(source, kg)))
    })
}

/// Whether a flight could fly these grants for certain while all others fly as planned.
fn could_fly<'d>(world: &World<'d>, flight: FlightId, grants: &[Grant<'d>]) -> bool {
    let changed;
    let flown = if grants.is_empty() {
        &world.filed[flight.index()]
    } else {
        let lean = Lean::AgainstPlan;
        let Ok(one) = combine(world.day, world.tracks, flight, grants, lean) else { return false };
        changed = world.fly(flight, one.path);
        if world.forbidden_change(flight, &changed, lean).is_some() {
            return false;
        }
        &changed
    };
    let present = &world.current(flight).traffic;
    if !world.loads.has_room(present, &flown.traffic) {
        return false;
    }
    let is_moved = !grants.is_empty();
    let losses = world.losses(flight, flown, is_moved, Delays::NONE, Lean::AgainstPlan, |_| true);
    losses.new.is_empty()
}

/// Whether reasons are there where they must be, and can be true.
pub(super) fn judge_reasons(world: &World<'_>, decided: &Decided<'_, '_>) -> Vec<Finding> {
    let judged: Vec<Vec<Finding>> = decided
        .decisions
        .par_iter()
        .map(|(&id, decision)| {
            let proposal = &world.day.proposals[id];
            let mut findings = Vec::new();
            if decision.verdict != Verdict::Granted && decision.reasons.is_empty() {
                findings.push(Finding::ReasonMissing { proposal: id });
            }
            for reason in &decision.reasons {
                let option = reason.option.unwrap_or(1);
                if is_false(world, id, proposal, decision, option, reason.kind) {
                    findings.push(Finding::FalseReason { proposal: id, option, kind: reason.kind });
                }
            }
            findings
        })
        .collect();
    judged.into_iter().flatten().collect()
}

/// Whether a reason is surely not true.
fn is_false(
    world: &World<'_>,
    id: ProposalId,
    proposal: &Proposal,
    decision: &ClaimedDecision,
    option: u32,
    kind: ReasonKind,
) -> bool {
    let Some(alternative) = option_of(proposal, option) else { return true };
    let flight = proposal.flight;
    let grant = Grant { proposal: id, alternative };
    let policy = &world.day.policy;
    match kind {
        ReasonKind::Invalid => alone(world, flight, grant, Lean::AgainstPlan).is_ok(),
        // Losses to be expected cost something, too.
        ReasonKind::NotWorthIt if policy.separation == SeparationRule::Priced => false,
        ReasonKind::NotWorthIt => {
            let Some(own) = total(world, flight, &[grant]) else { return false };
            own.net.value > own.within + own.net.size * RELATIVE && !has_others(world, flight, id)
        }
        ReasonKind::FuelLimit => {
            alternative.max_extra_fuel_kg.is_none()
                || (!has_others(world, flight, id) && keeps_fuel_limit(world, flight, &[grant]))
        }
        ReasonKind::OwnChange => !has_others(world, flight, id),
        ReasonKind::BetterOption => decision.option.is_none_or(|taken| taken == option),
        ReasonKind::PlanLimit => {
            policy.max_moved_flights.is_none()
                && policy.max_changes_per_flight.is_none()
                && policy.max_arrival_shift_s.is_none()
                && policy.min_grant_rate_per_operator.is_none()
                && policy.max_share_per_operator.is_none()
        }
        ReasonKind::Load(_) | ReasonKind::Separation | ReasonKind::SeparationRisk => false,
        ReasonKind::ByHand => !keeps_out(world, id, option),
    }
}

/// Whether a flight has grants of other proposals.
fn has_others(world: &World<'_>, flight: FlightId, id: ProposalId) -> bool {
    world.grants.get(&flight).is_some_and(|grants| grants.iter().any(|g| g.proposal != id))
}
