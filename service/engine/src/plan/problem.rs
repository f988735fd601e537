//! From a day to the model that the search is given.
//!
//! A *group* is a flight that asks for something, its *candidates* the combinations of its open
//! options (candidate 0: as filed). Two candidates *clash* where separation forbids both; one that
//! it forbids beside a flight that cannot move is ruled out. Every limited window or
//! minute to which some candidate adds is a *row*, every minute at which an overload could come to
//! last an *any-of*.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::apart::Apart;
use super::find::{PlanError, Watch};
use super::operators;
use super::options::{Asking, Combination, Grant, Judged, combine_all, judge_all};
use super::quantum::Quantum;
use crate::change::Change;
use crate::day::HandDecision;
use crate::ids::{FlightId, IdVec, ProposalId};
use crate::load::{Cell, Difference, Which};
use crate::search::{AnyOf, Choice, Clash, Cost, Group, Model, Row, choice};
use crate::traffic::Traffic;

/// A day's proposals as a search problem.
#[derive(Debug)]
pub(super) struct Problem {
    pub(super) judged: IdVec<ProposalId, Vec<Judged>>,
    /// One entry a group.
    pub(super) asking: Vec<Asking>,
    pub(super) group_of: BTreeMap<FlightId, u32>,
    pub(super) model: Model,
    /// What each of the model's rows limits.
    pub(super) limits: Vec<Limit>,
    pub(super) quantum: Quantum,
    /// The decisions by hand that are in force.
    pub(super) by_hand: Vec<HandDecision>,
}

/// What a row of the model limits.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Limit {
    /// The count of a window or minute.
    Cell(Cell),
    /// What a key of the policy says.
    Policy(&'static str),
}

impl Problem {
    pub(super) fn new(traffic: &Traffic, watch: Watch<'_>) -> Result<Self, PlanError> {
        let day = &traffic.day;
        let forbidden = |flight, change: &Change| traffic.forbidden(flight, change);
        let judged = judge_all(day, &traffic.tracks, &forbidden);
        let asking = combine_all(day, &traffic.tracks, &judged, &forbidden)?;
        let group_of: BTreeMap<FlightId, u32> =
            (0u32..).zip(&asking).map(|(group, asking)| (asking.flight, group)).collect();
        let apart = Apart::new(traffic, &asking, &|flight| group_of.get(&flight).copied());
        tracing::debug!(clashes = apart.clashes.len(), "changes held apart");
        watch.wanted()?;
        let total = total_worth(&judged, &asking) + apart.total_cost();
        let quantum = Quantum::for_total(&day.policy, total);
        tracing::debug!(flights = asking.len(), "changes made");
        watch.wanted()?;
        let differences = all_differences(traffic, &asking);
        tracing::debug!("changes counted");
        watch.wanted()?;
        let (mut limits, rows): (Vec<Limit>, Vec<Row>) =
            rows(traffic, &differences).into_iter().unzip();
        let mut model = Model {
            groups: asking.iter().map(|a| group(a, &judged, quantum)).collect(),
            clashes: Vec::new(),
            rows,
            any_ofs: any_ofs(traffic, &differences),
        };
        watch.wanted()?;
        tracing::debug!("rows made");
        add_apart(apart, quantum, &mut model);
        if let Some(most) = day.policy.max_moved_flights {
            let moved = |(g, group): (u32, &Group)| {
                (1..group.candidates.len() as u32).map(move |c| (choice(g, c), 1))
            };
            let terms = (0u32..).zip(&model.groups).flat_map(moved).collect();
            model.rows.push(Row { slack: most.min(1e9) as i64, terms });
            limits.push(Limit::Policy("max_moved_flights"));
        }
        for (key, row) in operators::rows(day, &judged, &asking) {
            model.rows.push(row);
            limits.push(Limit::Policy(key));
        }
        Ok(Self { judged, asking, group_of, model, limits, quantum, by_hand: Vec::new() })
    }

    /// The combination behind a choice; `None`: as filed.
    pub(super) fn combination(&self, choice: Choice) -> Option<&Combination> {
        let position = choice.candidate.checked_sub(1)?;
        self.asking[choice.group as usize].combinations.get(position as usize)
    }

    /// The candidate of a group that is exactly these grants.
    pub(super) fn candidate_of(&self, group: u32, grants: &[Grant]) -> Option<u32> {
        if grants.is_empty() {
            return Some(0);
        }
        let combinations = &self.asking[group as usize].combinations;
        let found = combinations.binary_search_by(|c| c.grants.as_slice().cmp(grants));
        found.ok().map(|position| position as u32 + 1)
    }

    /// Net benefit of an alternative in units, 0 where it is invalid.
    pub(super) fn worth(&self, grant: Grant) -> i64 {
        worth(&self.judged, self.quantum, grant)
    }
}

fn worth(judged: &IdVec<ProposalId, Vec<Judged>>, quantum: Quantum, grant: Grant) -> i64 {
    let judged = &judged[grant.proposal][grant.alternative as usize];
    judged.figures().map_or(0, |figures| quantum.count(figures.net_benefit))
}

/// The absolute worths of all candidates together: the search keeps them all.
fn total_worth(judged: &IdVec<ProposalId, Vec<Judged>>, asking: &[Asking]) -> f64 {
    let worth_of = |grant: &Grant| {
        let judged = &judged[grant.proposal][grant.alternative as usize];
        judged.figures().map_or(0.0, |figures| figures.net_benefit.abs())
    };
    let combinations = asking.iter().flat_map(|asking| &asking.combinations);
    combinations.flat_map(|c| c.grants.iter().map(worth_of)).sum()
}

fn group(asking: &Asking, judged: &IdVec<ProposalId, Vec<Judged>>, quantum: Quantum) -> Group {
    let worth_of = |c: &Combination| c.grants.iter().map(|&g| worth(judged, quantum, g)).sum();
    let values: Vec<i64> =
        std::iter::once(0).chain(asking.combinations.iter().map(worth_of)).collect();
    Group::of(&values)
}

/// The differences that every candidate but the resting one makes to limited counts.
fn all_differences(traffic: &Traffic, asking: &[Asking]) -> Vec<(Choice, Vec<Difference>)> {
    let choices: Vec<(Choice, FlightId, &Combination)> = choices(asking).collect();
    choices
        .into_par_iter()
        .map(|(choice, flight, combination)| {
            let load = traffic.changed_load(flight, &combination.change.changed);
            let filed = &traffic.filed[flight];
            let which = Which::Binding;
            (choice, traffic.loads.differences(&traffic.day, filed, &load, which))
        })
        .collect()
}

fn choices(asking: &[Asking]) -> impl Iterator<Item = (Choice, FlightId, &Combination)> {
    (0u32..).zip(asking).flat_map(|(group, asking)| {
        (1u32..)
            .zip(&asking.combinations)
            .map(move |(candidate, c)| (choice(group, candidate), asking.flight, c))
    })
}

/// Terms by cell, of all cells that some candidate touches.
fn by_cell(differences: &[(Choice, Vec<Difference>)]) -> Vec<(Cell, Choice, i32)> {
    let mut terms: Vec<(Cell, Choice, i32)> = differences
        .iter()
        .flat_map(|(choice, cells)| cells.iter().map(move |&(cell, delta)| (cell, *choice, delta)))
        .collect();
    terms.sort_unstable();
    terms
}

/// One row for every limited cell that some candidate adds to.
fn rows(traffic: &Traffic, differences: &[(Choice, Vec<Difference>)]) -> Vec<(Limit, Row)> {
    let terms = by_cell(differences);
    terms
        .chunk_by(|a, b| a.0 == b.0)
        .filter(|terms| terms.iter().any(|t| t.2 > 0))
        .filter_map(|terms| {
            let cell = terms[0].0;
            let slack = traffic.loads.slack(cell)?;
            let terms = terms.iter().map(|&(_, c, delta)| (c, delta)).collect();
            Some((Limit::Cell(cell), Row { slack, terms }))
        })
        .collect()
}

fn any_ofs(traffic: &Traffic, differences: &[(Choice, Vec<Difference>)]) -> Vec<AnyOf> {
    let terms = by_cell(differences);
    let cells: Vec<&[(Cell, Choice, i32)]> = terms.chunk_by(|a, b| a.0 == b.0).collect();
    let most_added: Vec<(Cell, i64)> = cells
        .iter()
        .map(|terms| {
            // At most one candidate of a group is chosen.
            let groups = terms.chunk_by(|a, b| a.1.group == b.1.group);
            let most = |group: &[(Cell, Choice, i32)]| {
                group.iter().map(|t| i64::from(t.2)).max().unwrap_or(0).max(0)
            };
            (terms[0].0, groups.map(most).sum())
        })
        .collect();
    let row = |cell: Cell, slack: i64| {
        let found = cells.binary_search_by_key(&cell, |terms| terms[0].0);
        let terms = found.map_or(&[][..], |position| cells[position]);
        Row { slack, terms: terms.iter().map(|&(_, c, delta)| (c, delta)).collect() }
    };
    let rules = traffic.loads.lasting_rules_touching(&most_added);
    rules
        .into_iter()
        .map(|rule| AnyOf {
            rows: rule.alternatives.iter().map(|&(cell, slack)| row(cell, slack)).collect(),
        })
        .collect()
}

/// Adds what separation asks to the model.
fn add_apart(apart: Apart, quantum: Quantum, model: &mut Model) {
    let hard = apart.clashes.into_iter().map(|(a, b)| Clash { a, b, cost: Cost::Hard });
    let soft = apart.pair_costs.into_iter().filter_map(|(a, b, cost)| {
        let cost = quantum.count(cost);
        (cost > 0).then_some(Clash { a, b, cost: Cost::Soft(cost) })
    });
    model.clashes = hard.chain(soft).collect();
    for only in apart.ruled_out {
        model.groups[only.group as usize].forbid(only.candidate);
    }
    for (of, cost) in apart.costs {
        let candidates = &mut model.groups[of.group as usize].candidates;
        candidates[of.candidate as usize].value -= quantum.count(cost);
    }
}
