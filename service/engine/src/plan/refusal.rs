//! Why an option is not in a plan, and what would make room for it.

use super::by_hand::keeps_out;
use super::options::Grant;
use super::problem::Problem;
use super::state::PlanState;
use crate::answer::{Constraint, Exchange, Reason};
use crate::day::SeparationRule;
use crate::ids::ProposalId;
use crate::search::{Blocker, Choice, State, choice};
use crate::traffic::Traffic;

/// A plan's choices, and the day that they make.
pub(super) struct Chosen<'a> {
    pub(super) traffic: &'a Traffic,
    pub(super) problem: &'a Problem,
    pub(super) choices: &'a [u32],
    pub(super) state: &'a PlanState,
}

impl Chosen<'_> {
    /// The grants of a group.
    pub(super) fn grants(&self, group: u32) -> &[Grant] {
        let chosen = choice(group, self.choices[group as usize]);
        self.problem.combination(chosen).map_or(&[], |c| &c.grants)
    }

    /// The group of a proposal, and the grant it got there.
    pub(super) fn granted(&self, proposal: ProposalId) -> (u32, Option<Grant>) {
        let flight = self.traffic.day.proposals[proposal].flight;
        let group = self.problem.group_of[&flight];
        (group, self.grants(group).iter().copied().find(|g| g.proposal == proposal))
    }

    /// Everything that keeps an alternative out when it alone is added, or put in the place of the
    /// one taken.
    pub(super) fn why_not(&self, grant: Grant) -> Vec<Reason> {
        let alternatives = &self.traffic.day.proposals[grant.proposal].alternatives;
        let option = alternatives[grant.alternative as usize].option;
        if keeps_out(&self.traffic.day, &self.problem.by_hand, (grant.proposal, option)) {
            return vec![Reason { option, constraint: Constraint::ByHand }];
        }
        self.obstacles(grant)
    }

    /// The same, whatever was decided by hand.
    pub(super) fn obstacles(&self, grant: Grant) -> Vec<Reason> {
        let alternatives = &self.traffic.day.proposals[grant.proposal].alternatives;
        let option = alternatives[grant.alternative as usize].option;
        let constraints = match self.own_reason(grant) {
            Some(constraint) => vec![constraint],
            None => self.blockers(grant),
        };
        constraints.into_iter().map(|constraint| Reason { option, constraint }).collect()
    }

    /// A reason that needs no other.
    fn own_reason(&self, grant: Grant) -> Option<Constraint> {
        let judged = &self.problem.judged[grant.proposal][grant.alternative as usize];
        match &judged.flown {
            Err(rule) => return Some(Constraint::Invalid(rule.clone())),
            Ok(_) if judged.barred.is_some() => return judged.barred.clone(),
            Ok(_) => {}
        }
        if self.problem.worth(grant) <= 0 {
            return Some(Constraint::NotWorthIt);
        }
        let grants = self.with(grant);
        let most = self.traffic.day.policy.max_changes_per_flight;
        if let Some(limit) = most.filter(|&limit| grants.len() as f64 > limit) {
            let count = grants.len() as f64;
            return Some(Constraint::PlanLimit { key: "max_changes_per_flight", count, limit });
        }
        let (group, _) = self.granted(grant.proposal);
        self.problem.candidate_of(group, &grants).is_none().then_some(Constraint::OwnChange)
    }

    /// The grants of the flight with this one added, in the place of another of its proposal.
    fn with(&self, grant: Grant) -> Vec<Grant> {
        let (group, _) = self.granted(grant.proposal);
        let others = self.grants(group).iter().filter(|g| g.proposal != grant.proposal);
        let mut grants: Vec<Grant> = others.copied().chain([grant]).collect();
        grants.sort_unstable();
        grants
    }

    /// The choice that adds this grant, where its flight can fly it beside its other grants.
    pub(super) fn adding(&self, grant: Grant) -> Option<Choice> {
        let (group, _) = self.granted(grant.proposal);
        Some(choice(group, self.problem.candidate_of(group, &self.with(grant))?))
    }

    fn blockers(&self, grant: Grant) -> Vec<Constraint> {
        let Some(adding) = self.adding(grant) else { return vec![Constraint::OwnChange] };
        let Some(combination) = self.problem.combination(adding) else { return Vec::new() };
        let flight = self.traffic.day.proposals[grant.proposal].flight;
        let changed = &combination.change.changed;
        let differences = self.state.differences(self.traffic, flight, changed);
        let mut found = self.state.blockers(self.traffic, flight, changed, &differences);
        let moved = self.state.moved().len() as f64;
        if let Some(limit) = self.traffic.day.policy.max_moved_flights
            && self.state.moved_flight(flight).is_none()
            && moved + 1.0 > limit
        {
            let key = "max_moved_flights";
            found.push(Constraint::PlanLimit { key, count: moved + 1.0, limit });
        }
        found.extend(self.over_share(grant));
        if found.is_empty()
            && let (_, Some(taken)) = self.granted(grant.proposal)
        {
            let alternatives = &self.traffic.day.proposals[grant.proposal].alternatives;
            let taken = alternatives[taken.alternative as usize].option;
            found.push(Constraint::BetterOption { taken });
        }
        if found.is_empty() && self.traffic.day.policy.separation == SeparationRule::Priced {
            // Nothing forbids it: the losses to be expected cost more than it brings.
            found.push(Constraint::NotWorthIt);
        }
        found
    }

    /// The operator's share of all grants, where this one would take it over the policy's limit.
    fn over_share(&self, grant: Grant) -> Option<Constraint> {
        let day = &self.traffic.day;
        let limit = day.policy.max_share_per_operator?;
        let operator_of = |id: ProposalId| day.flights[day.proposals[id].flight].operator.as_ref();
        let operator = operator_of(grant.proposal)?;
        let groups = 0..self.choices.len() as u32;
        let granted: Vec<ProposalId> =
            groups.flat_map(|group| self.grants(group)).map(|g| g.proposal).collect();
        let is_new = usize::from(!granted.contains(&grant.proposal));
        let own = granted.iter().filter(|&&id| operator_of(id) == Some(operator)).count();
        let share = (own + is_new) as f64 / (granted.len() + is_new) as f64;
        let key = "max_share_per_operator";
        (share > limit + 1e-9).then_some(Constraint::PlanLimit { key, count: share, limit })
    }

    /// Grants that would have to go so that this one could be added: blockers are taken away one
    /// after the other, each time the grant that is worth least. `None` where what blocks it is no
    /// grant. `state` is that of the plan's choices, before and after.
    pub(super) fn exchange(&self, state: &mut State<'_>, grant: Grant) -> Option<Exchange> {
        let target = self.adding(grant)?;
        let mut dropped: Vec<Choice> = Vec::new();
        // Each round takes a grant away, so there are no more rounds than grants.
        let mut blocked = state.blockers(target).first().copied();
        let mut stuck = false;
        while let Some(blocker) = blocked {
            let Some(drop) = self.cheapest_drop(state, &dropped, target, blocker) else {
                stuck = true;
                break;
            };
            state.switch(drop);
            dropped.retain(|d| d.group != drop.group);
            dropped.push(drop);
            blocked = state.blockers(target).first().copied();
        }
        for drop in &dropped {
            state.switch(choice(drop.group, self.choices[drop.group as usize]));
        }
        if stuck {
            return None;
        }
        let mut drops: Vec<Grant> = Vec::new();
        for &drop in &dropped {
            let kept = self.problem.combination(drop).map_or(&[][..], |c| &c.grants);
            drops.extend(self.grants(drop.group).iter().filter(|g| !kept.contains(g)));
        }
        let lost: i64 = drops.iter().map(|&g| self.problem.worth(g)).sum();
        let mut drops: Vec<ProposalId> = drops.iter().map(|g| g.proposal).collect();
        drops.sort_unstable();
        let objective_lost = self.problem.quantum.amount(lost);
        Some(Exchange { drops, objective_lost, proven: false })
    }

    /// The switch to fewer grants of one flight that takes a blocker away, or lessens it, at the
    /// least loss.
    fn cheapest_drop(
        &self,
        state: &State<'_>,
        dropped: &[Choice],
        target: Choice,
        blocker: Blocker,
    ) -> Option<Choice> {
        let model = &self.problem.model;
        let relieving: Vec<Choice> = match blocker {
            Blocker::Forbidden => return None,
            Blocker::Clash { with } => self.fewer_grants(with),
            Blocker::Row { row, .. } => self.drops_from(&model.rows[row].terms, dropped),
            Blocker::AnyOf { any_of } => model.any_ofs[any_of]
                .rows
                .iter()
                .flat_map(|row| self.drops_from(&row.terms, dropped))
                .collect(),
        };
        relieving
            .into_iter()
            .filter(|drop| drop.group != target.group && state.allows(*drop))
            .max_by_key(|drop| (state.gain(*drop), std::cmp::Reverse(*drop)))
    }

    /// For each chosen candidate that adds to a row, the switches that add less. Terms are in the
    /// order of choices.
    fn drops_from(&self, terms: &[(Choice, i32)], dropped: &[Choice]) -> Vec<Choice> {
        let delta = |of: Choice| {
            let found = terms.binary_search_by_key(&of, |term| term.0);
            found.map_or(0, |position| terms[position].1)
        };
        let now = |group: u32| {
            let changed = dropped.iter().find(|d| d.group == group);
            changed.map_or(self.choices[group as usize], |d| d.candidate)
        };
        let chosen = terms.iter().filter(|(c, _)| now(c.group) == c.candidate);
        chosen
            .flat_map(|&(c, _)| {
                let less = move |fewer: &Choice| delta(*fewer) < delta(c);
                self.fewer_grants(c).into_iter().filter(less)
            })
            .collect()
    }

    /// The candidates of a group whose grants are some of those of a candidate, but not all.
    fn fewer_grants(&self, of: Choice) -> Vec<Choice> {
        let Some(combination) = self.problem.combination(of) else { return Vec::new() };
        (0..of.candidate)
            .chain(
                of.candidate + 1
                    ..self.problem.model.groups[of.group as usize].candidates.len() as u32,
            )
            .map(|candidate| choice(of.group, candidate))
            .filter(|&fewer| {
                let grants = self.problem.combination(fewer).map_or(&[][..], |c| &c.grants);
                grants.len() < combination.grants.len()
                    && grants.iter().all(|g| combination.grants.contains(g))
            })
            .collect()
    }
}
