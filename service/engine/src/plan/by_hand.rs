//! Decisions by hand: candidates that a planner has fixed or ruled out beforehand.

use super::find::PlanError;
use super::options::{Combination, Grant};
use super::problem::Problem;
use super::refusal::Chosen;
use super::state::PlanState;
use crate::answer::{Constraint, Reason};
use crate::day::{Day, HandDecision, HandSubject, Must};
use crate::ids::ProposalId;
use crate::search::{self, Model, SolveOptions, choice, solve};
use crate::traffic::Traffic;

/// What to do about decisions that can't be met together with the rules.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Unmet {
    /// Answer with what they break.
    #[default]
    Refuse,
    /// Plan without them, and say which they are.
    PlanAround,
}

/// Whether a decision keeps a grant out.
pub(crate) fn keeps_out(day: &Day, decisions: &[HandDecision], grant: (ProposalId, u32)) -> bool {
    let flight = day.proposals[grant.0].flight;
    decisions.iter().any(|decision| match (decision.about, decision.must) {
        (HandSubject::Flight(kept), Must::Keep) => kept == flight,
        (HandSubject::Proposal(id), Must::Refuse) => id == grant.0,
        (HandSubject::Proposal(id), Must::Grant { option: Some(option) }) => {
            id == grant.0 && option != grant.1
        }
        _ => false,
    })
}

/// Rules out the candidates that decisions leave no room for. Gives the decisions in force and
/// those that can't be met.
///
/// # Errors
/// The first decision that can't be met, unless it is to be planned around.
pub(super) fn fix(
    traffic: &Traffic,
    problem: &mut Problem,
    decisions: &[HandDecision],
    unmet: Unmet,
) -> Result<Vec<HandDecision>, PlanError> {
    let mut left_out = Vec::new();
    // What is not to be flown can always be met; then grants, one after the other.
    let (grants, others): (Vec<HandDecision>, Vec<HandDecision>) =
        decisions.iter().copied().partition(|d| matches!(d.must, Must::Grant { .. }));
    for decision in others {
        apply(traffic, problem, decision);
        problem.by_hand.push(decision);
    }
    if grants.is_empty() {
        return Ok(left_out);
    }
    let before = problem.model.clone();
    for &decision in &grants {
        apply(traffic, problem, decision);
    }
    if is_feasible(&problem.model)? {
        problem.by_hand.extend(grants);
        problem.by_hand.sort_unstable();
        return Ok(left_out);
    }
    // Some can't be met together: each is tried beside those that can.
    problem.model = before;
    for &decision in &grants {
        let without = problem.model.clone();
        apply(traffic, problem, decision);
        if is_feasible(&problem.model)? {
            problem.by_hand.push(decision);
            continue;
        }
        problem.model = without;
        match unmet {
            Unmet::PlanAround => left_out.push(decision),
            Unmet::Refuse => {
                let breaks = what_it_breaks(traffic, problem, decision)?;
                return Err(PlanError::UnmetDecision { decision, breaks });
            }
        }
    }
    problem.by_hand.sort_unstable();
    Ok(left_out)
}

fn apply(traffic: &Traffic, problem: &mut Problem, decision: HandDecision) {
    let flight = match decision.about {
        HandSubject::Flight(flight) => flight,
        HandSubject::Proposal(id) => traffic.day.proposals[id].flight,
    };
    let Some(&group) = problem.group_of.get(&flight) else { return };
    let combinations = &problem.asking[group as usize].combinations;
    let fits = |combination: Option<&Combination>| {
        let grants: &[Grant] = combination.map_or(&[], |c| &c.grants);
        let option_of = |id: ProposalId| {
            let taken = grants.iter().find(|g| g.proposal == id)?;
            let alternatives = &traffic.day.proposals[id].alternatives;
            Some(alternatives[taken.alternative as usize].option)
        };
        match (decision.about, decision.must) {
            (HandSubject::Flight(_), _) => combination.is_none(),
            (HandSubject::Proposal(id), Must::Grant { option: Some(option) }) => {
                option_of(id) == Some(option)
            }
            (HandSubject::Proposal(id), Must::Grant { option: None }) => option_of(id).is_some(),
            (HandSubject::Proposal(id), _) => option_of(id).is_none(),
        }
    };
    let all = std::iter::once(None).chain(combinations.iter().map(Some));
    let forbidden: Vec<u32> =
        (0u32..).zip(all).filter(|(_, c)| !fits(*c)).map(|(candidate, _)| candidate).collect();
    for candidate in forbidden {
        problem.model.groups[group as usize].forbid(candidate);
    }
}

/// Whether any choices satisfy the model.
fn is_feasible(model: &Model) -> Result<bool, PlanError> {
    let allowed = |group: &search::Group| group.candidates.iter().any(|c| c.allowed);
    if !model.groups.iter().all(allowed) {
        return Ok(false);
    }
    // Any plan will do.
    let options = SolveOptions { gap: 1.0, ..SolveOptions::default() };
    let solution = solve(model, &options, search::Watch::unattended()).map_err(PlanError::Model)?;
    Ok(solution.violations.is_empty())
}

/// What a grant breaks beside the decisions met so far; `problem` is without it.
fn what_it_breaks(
    traffic: &Traffic,
    problem: &Problem,
    decision: HandDecision,
) -> Result<Vec<Reason>, PlanError> {
    let HandSubject::Proposal(id) = decision.about else { return Ok(Vec::new()) };
    // Only what was decided is flown, so that nothing else is named as being in the way.
    let mut bare = problem.model.clone();
    for group in &mut bare.groups {
        for candidate in &mut group.candidates {
            candidate.value = 0;
        }
        if group.candidates.first().is_some_and(|rest| rest.allowed) {
            group.fix(0);
        }
    }
    let solution = solve(&bare, &SolveOptions::default(), search::Watch::unattended());
    let choices = match solution {
        Ok(solution) => solution.choices,
        Err(defect) => return Err(PlanError::Model(defect)),
    };
    let changes = (0u32..).zip(&choices).filter_map(|(group, &candidate)| {
        let combination = problem.combination(choice(group, candidate))?;
        Some((problem.asking[group as usize].flight, combination.change.clone()))
    });
    let state = PlanState::new(traffic, changes);
    let chosen = Chosen { traffic, problem, choices: &choices, state: &state };
    let alternatives = &traffic.day.proposals[id].alternatives;
    let asked = match decision.must {
        Must::Grant { option } => option,
        Must::Refuse | Must::Keep => None,
    };
    let mut breaks: Vec<Reason> = (0u32..)
        .zip(alternatives)
        .filter(|(_, a)| asked.is_none_or(|option| a.option == option))
        .flat_map(|(alternative, _)| chosen.obstacles(Grant { proposal: id, alternative }))
        .collect();
    if breaks.is_empty() {
        let option = asked.unwrap_or(1);
        breaks.push(Reason { option, constraint: Constraint::ByHand });
    }
    Ok(breaks)
}
