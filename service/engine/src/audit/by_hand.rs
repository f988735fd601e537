//! Whether what was decided by hand became of it.

use super::report::Finding;
use super::world::World;
use crate::day::{HandDecision, HandSubject, Must};
use crate::ids::ProposalId;

/// Decisions that were not kept.
pub(super) fn judge_by_hand(world: &World<'_>) -> Vec<Finding> {
    let kept = |decision: &HandDecision| match (decision.about, decision.must) {
        (HandSubject::Flight(flight), _) => !world.grants.contains_key(&flight),
        (HandSubject::Proposal(id), Must::Grant { option }) => {
            taken(world, id).is_some_and(|t| option.is_none_or(|option| option == t))
        }
        (HandSubject::Proposal(id), Must::Refuse | Must::Keep) => taken(world, id).is_none(),
    };
    let broken = world.by_hand.iter().filter(|decision| !kept(decision));
    broken.map(|&decision| Finding::NotAsDecided { decision }).collect()
}

/// The option of a proposal that the plan takes.
fn taken(world: &World<'_>, id: ProposalId) -> Option<u32> {
    let grants = world.grants.get(&world.day.proposals.get(id)?.flight)?;
    grants.iter().find(|grant| grant.proposal == id).map(|grant| grant.alternative.option)
}

/// Whether a decision keeps an option of a proposal out.
pub(super) fn keeps_out(world: &World<'_>, id: ProposalId, option: u32) -> bool {
    let flight = world.day.proposals[id].flight;
    world.by_hand.iter().any(|decision| match (decision.about, decision.must) {
        (HandSubject::Flight(kept), _) => kept == flight,
        (HandSubject::Proposal(other), _) if other != id => false,
        (_, Must::Grant { option: only }) => only.is_some_and(|only| only != option),
        (_, Must::Refuse | Must::Keep) => true,
    })
}

/// Whether a proposal is granted by hand.
pub(super) fn is_granted(world: &World<'_>, id: ProposalId) -> bool {
    let about = HandSubject::Proposal(id);
    world.by_hand.iter().any(|d| d.about == about && matches!(d.must, Must::Grant { .. }))
}
