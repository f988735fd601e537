//! Whether each proposal has one decision that fits it, and whether the rules of level changes
//! say the same about its options.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::claim::{ClaimedDecision, ClaimedStretch, PlanUnderAudit};
use super::report::Finding;
use super::tolerances::{LEVEL_FT, Lean, TIME_S};
use super::track::Track;
use super::world::{Broken, Combined, Flown, Grant, World, combine};
use crate::answer::{Rule, Verdict};
use crate::day::{Alternative, Day, Proposal};
use crate::ids::{FlightId, ProposalId};

/// The decisions that fit the day, and what each flight is granted.
#[derive(Debug, Default)]
pub(super) struct Decided<'d, 'p> {
    /// The decision on each proposal that has one.
    pub(super) decisions: BTreeMap<ProposalId, &'p ClaimedDecision>,
    /// Grants by flight, in the order of proposals.
    pub(super) grants: BTreeMap<FlightId, Vec<Grant<'d>>>,
}

/// The option of that number.
pub(super) fn option_of(proposal: &Proposal, option: u32) -> Option<&Alternative> {
    proposal.alternatives.iter().find(|a| a.option == option)
}

/// Matches decisions with proposals.
pub(super) fn match_decisions<'d, 'p>(
    day: &'d Day,
    plan: &'p PlanUnderAudit,
    findings: &mut Vec<Finding>,
) -> Decided<'d, 'p> {
    let mut decided = Decided::default();
    for decision in &plan.decisions {
        let id = decision.proposal;
        if day.proposals.get(id).is_none() {
            findings.push(Finding::UnknownProposal { proposal: id });
        } else if decided.decisions.insert(id, decision).is_some() {
            findings.push(Finding::DecisionRepeated { proposal: id });
        }
    }
    for (id, proposal) in day.proposals.iter_with_id() {
        match decided.decisions.get(&id) {
            None => findings.push(Finding::DecisionMissing { proposal: id }),
            Some(decision) => {
                let taken = taken_option(id, proposal, decision, findings);
                if let Some(alternative) = taken {
                    let grant = Grant { proposal: id, alternative };
                    decided.grants.entry(proposal.flight).or_default().push(grant);
                }
            }
        }
    }
    decided
}

/// The option that a decision takes, if it takes one that exists.
fn taken_option<'d>(
    id: ProposalId,
    proposal: &'d Proposal,
    decision: &ClaimedDecision,
    findings: &mut Vec<Finding>,
) -> Option<&'d Alternative> {
    if decision.flight != proposal.flight {
        findings.push(Finding::WrongFlight {
            proposal: id,
            claimed: decision.flight,
            flight: proposal.flight,
        });
    }
    let fits = match (decision.verdict, decision.option) {
        (Verdict::Granted, option) => option == Some(1),
        (Verdict::Amended, option) => option.is_some_and(|o| o != 1),
        (Verdict::Refused | Verdict::Invalid, option) => option.is_none(),
    };
    if !fits {
        findings.push(Finding::VerdictMismatch {
            proposal: id,
            verdict: decision.verdict,
            option: decision.option,
        });
    }
    let is_taken = matches!(decision.verdict, Verdict::Granted | Verdict::Amended);
    let number = if is_taken { decision.option.unwrap_or(1) } else { 1 };
    let Some(alternative) = option_of(proposal, number) else {
        findings.push(Finding::UnknownOption { proposal: id, option: number });
        return None;
    };
    let same = alternative.stretches.len() == decision.stretches.len()
        && alternative.stretches.iter().zip(&decision.stretches).all(|(stretch, claimed)| {
            (stretch.level_ft - claimed.level_ft).abs() <= LEVEL_FT
                && is_same_time(stretch.from_s, claimed.from_s)
                && is_same_time(stretch.until_s, claimed.until_s)
        });
    if !same {
        findings.push(Finding::StretchesDiffer { proposal: id });
    }
    let has_times = |s: &ClaimedStretch| s.planned_from_s.is_some() || s.planned_until_s.is_some();
    if !is_taken && decision.stretches.iter().any(has_times) {
        findings.push(Finding::StretchesDiffer { proposal: id });
    }
    is_taken.then_some(alternative)
}

fn is_same_time(a: Option<f64>, b: Option<f64>) -> bool {
    match (a, b) {
        (None, None) => true,
        (Some(a), Some(b)) => (a - b).abs() <= TIME_S,
        _ => false,
    }
}

/// The profiles of all moved flights; those whose grants make none are left as filed.
pub(super) fn combined<'d>(
    day: &'d Day,
    tracks: &'d [Track],
    grants: &BTreeMap<FlightId, Vec<Grant<'d>>>,
    findings: &mut Vec<Finding>,
) -> BTreeMap<FlightId, Combined<'d>> {
    let results: Vec<_> = grants
        .par_iter()
        .map(|(&id, grants)| (id, combine(day, tracks, id, grants, Lean::ForPlan)))
        .collect();
    let mut combined = BTreeMap::new();
    for (flight, result) in results {
        match result {
            Ok(one) => {
                combined.insert(flight, one);
            }
            Err(Broken::OwnChange) => findings.push(Finding::OwnChangesOverlap { flight }),
            Err(Broken::Rule(proposal, rule)) => {
                let grant = grants[&flight].iter().find(|g| g.proposal == proposal);
                let option = grant.map_or(1, |g| g.alternative.option);
                findings.push(Finding::BreaksRule { proposal, option, rule });
            }
        }
    }
    combined
}

/// One option by itself.
pub(super) struct Alone<'d> {
    pub(super) flown: Flown<'d>,
}

/// An option's own profile, or the rule that it breaks.
///
/// # Errors
/// The rule.
pub(super) fn alone<'d>(
    world: &World<'d>,
    flight: FlightId,
    grant: Grant<'d>,
    lean: Lean,
) -> Result<Alone<'d>, Rule> {
    let combined =
        combine(world.day, world.tracks, flight, &[grant], lean).map_err(
            |broken| match broken {
                Broken::Rule(_, rule) => rule,
                Broken::OwnChange => Rule::StretchesOverlap,
            },
        )?;
    let flown = world.fly(flight, combined.path);
    match world.forbidden_change(flight, &flown, lean) {
        None => Ok(Alone { flown }),
        Some(rule) => Err(rule),
    }
}

/// Whether `invalid` is said exactly where every option breaks a rule; how many were derived.
pub(super) fn judge_validity(world: &World<'_>, decided: &Decided<'_, '_>) -> (Vec<Finding>, u64) {
    let judged: Vec<(Option<Finding>, u64)> = decided
        .decisions
        .par_iter()
        .map(|(&id, decision)| {
            let proposal = &world.day.proposals[id];
            let mut derived = 0;
            let mut try_option = |alternative, lean| {
                derived += 1;
                let grant = Grant { proposal: id, alternative };
                alone(world, proposal.flight, grant, lean).err()
            };
            let finding = match decision.verdict {
                Verdict::Granted | Verdict::Amended => None,
                Verdict::Invalid => proposal
                    .alternatives
                    .iter()
                    .find(|a| try_option(a, Lean::AgainstPlan).is_none())
                    .map(|a| Finding::NotInvalid { proposal: id, option: a.option }),
                Verdict::Refused => {
                    let mut first = None;
                    let all_broken = proposal.alternatives.iter().all(|a| {
                        let rule = try_option(a, Lean::ForPlan);
                        let is_broken = rule.is_some();
                        first = first.take().or(rule);
                        is_broken
                    });
                    first
                        .filter(|_| all_broken)
                        .map(|rule| Finding::ShouldBeInvalid { proposal: id, rule })
                }
            };
            (finding, derived)
        })
        .collect();
    let derived = judged.iter().map(|(_, n)| n).sum();
    (judged.into_iter().filter_map(|(finding, _)| finding).collect(), derived)
}

/// Moved flights that are off their filed level where no changes are allowed, or inside a
/// restriction.
pub(super) fn judge_forbidden_places(world: &World<'_>, findings: &mut Vec<Finding>) {
    for (&flight, flown) in &world.planned {
        if let Some(rule) = world.forbidden_change(flight, flown, Lean::ForPlan) {
            findings.push(Finding::ChangedWhereForbidden { flight, rule });
        }
    }
}
