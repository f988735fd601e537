//! Why a plan leaves a proposal out: what blocks it when it alone is added, what would have to go
//! for it at the least loss, and which limits, each by one more, would let it in.

use super::find::{FindOptions, PlanError, Watch, problem_of};
use super::options::Grant;
use super::problem::Problem;
use super::refusal::Chosen;
use super::state::PlanState;
use crate::answer::{Constraint, Reason, Stopped, Why};
use crate::ids::ProposalId;
use crate::search::{self, Choice, Search, SolveOptions, choice};
use crate::traffic::Traffic;

/// Explains a proposal's place in a plan, given by its grants: proposals and their options' numbers.
///
/// # Errors
/// As [`find`](super::find()); grants that are none of this day's, or that can't be flown together.
pub fn why(
    traffic: &Traffic,
    grants: &[(ProposalId, u32)],
    proposal: ProposalId,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<Why, PlanError> {
    let (problem, _) = problem_of(traffic, options, watch)?;
    watch.wanted()?;
    let choices = choices_of(traffic, &problem, grants).ok_or(PlanError::NotAPlan)?;
    let changes = (0u32..).zip(&choices).filter_map(|(group, &candidate)| {
        let combination = problem.combination(choice(group, candidate))?;
        Some((problem.asking[group as usize].flight, combination.change.clone()))
    });
    let state = PlanState::new(traffic, changes);
    let chosen = Chosen { traffic, problem: &problem, choices: &choices, state: &state };
    let (group, granted) = chosen.granted(proposal);
    let alternatives = 0..problem.judged[proposal].len() as u32;
    let mut reasons: Vec<Reason> = Vec::new();
    for alternative in alternatives {
        let grant = Grant { proposal, alternative };
        if granted != Some(grant) {
            reasons.extend(chosen.why_not(grant));
        }
    }
    let mut why =
        Why { granted: granted.is_some(), relax: relaxed(&reasons), reasons, ..Why::default() };
    if granted.is_some() {
        return Ok(why);
    }
    let combinations = &problem.asking[group as usize].combinations;
    let with: Vec<Choice> = (1u32..)
        .zip(combinations)
        .filter(|(_, c)| c.grants.iter().any(|g| g.proposal == proposal))
        .map(|(candidate, _)| choice(group, candidate))
        .collect();
    exchange(&problem, &chosen, &with, options, watch, &mut why)?;
    Ok(why)
}

/// The candidates that are exactly these grants.
fn choices_of(
    traffic: &Traffic,
    problem: &Problem,
    grants: &[(ProposalId, u32)],
) -> Option<Vec<u32>> {
    let mut by_group: Vec<Vec<Grant>> = vec![Vec::new(); problem.asking.len()];
    for &(proposal, option) in grants {
        let asked = traffic.day.proposals.get(proposal)?;
        let alternative = asked.alternatives.iter().position(|a| a.option == option)? as u32;
        let group = *problem.group_of.get(&asked.flight)?;
        by_group[group as usize].push(Grant { proposal, alternative });
    }
    let candidate = |(group, mut grants): (u32, Vec<Grant>)| {
        grants.sort_unstable();
        problem.candidate_of(group, &grants)
    };
    (0u32..).zip(by_group).map(candidate).collect()
}

/// Searches the best plan with one of these choices, and tells it from the plan.
fn exchange(
    problem: &Problem,
    chosen: &Chosen<'_>,
    with: &[Choice],
    options: &FindOptions,
    watch: Watch<'_>,
    why: &mut Why,
) -> Result<(), PlanError> {
    let stop = || (watch.stop)().is_some();
    let search_watch = search::Watch { stop: &stop, progress: &|_| () };
    let ask = SolveOptions {
        seed: options.seed,
        work: options.work,
        start: Some(chosen.choices.to_vec()),
        ..SolveOptions::default()
    };
    let mut search = Search::new(&problem.model).map_err(PlanError::Model)?;
    search.solve(&ask, search_watch);
    let mut best: Option<(i64, Vec<u32>)> = None;
    let mut bound: Option<i64> = None;
    for &forced in with {
        let allowed = &problem.model.groups[forced.group as usize].candidates;
        if !allowed[forced.candidate as usize].allowed {
            continue;
        }
        let found = search.solve_forced(forced, &ask, search_watch).map_err(PlanError::Model)?;
        let Some(found_bound) = found.bound else { continue };
        bound = Some(bound.map_or(found_bound, |bound| bound.max(found_bound)));
        if best.as_ref().is_none_or(|(objective, _)| found.objective > *objective) {
            best = Some((found.objective, found.choices));
        }
    }
    let now = problem.model.objective(chosen.choices);
    let amount = |count: i64| problem.quantum.amount(count);
    if let (Some((objective, choices)), Some(bound)) = (best, bound) {
        why.loss = Some(amount(now - objective));
        why.least_loss = Some(amount(now - bound));
        for (group, &candidate) in (0u32..).zip(&choices) {
            let then = problem.combination(choice(group, candidate)).map_or(&[][..], |c| &c.grants);
            let before = chosen.grants(group);
            let names = |of: &[Grant], without: &[Grant]| {
                let gone = of.iter().filter(|g| without.iter().all(|w| w.proposal != g.proposal));
                gone.map(|g| g.proposal).collect::<Vec<_>>()
            };
            why.goes.extend(names(before, then));
            why.comes.extend(names(then, before));
        }
        why.goes.sort_unstable();
        why.comes.sort_unstable();
    }
    if (watch.stop)() == Some(Stopped::Cancelled) {
        return Err(PlanError::Cancelled);
    }
    Ok(())
}

/// The limits that keep the option as asked out, if nothing else does and each lacks at most one.
fn relaxed(reasons: &[Reason]) -> Vec<Constraint> {
    let as_asked = || reasons.iter().filter(|reason| reason.option == 1);
    let by_one = |constraint: &Constraint| match constraint {
        Constraint::Load { count, limit, .. } => *count <= limit.floor() + 1.0,
        Constraint::PlanLimit { key, count, limit } => {
            *key == "max_moved_flights" && *count <= limit.floor() + 1.0
        }
        _ => false,
    };
    if as_asked().all(|reason| by_one(&reason.constraint)) {
        as_asked().map(|reason| reason.constraint.clone()).collect()
    } else {
        Vec::new()
    }
}
