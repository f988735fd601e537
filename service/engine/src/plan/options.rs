//! Every alternative of every proposal, judged by itself; and the combinations that one flight can
//! fly together.

use rayon::prelude::*;

use crate::answer::{Constraint, Rule};
use crate::benefit::{Figures, figures};
use crate::change::{Change, change_levels};
use crate::day::{Alternative, Day, Stretch};
use crate::ids::{FlightId, IdVec, ProposalId};
use crate::path::Track;

/// An alternative judged by itself.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Judged {
    /// How it would be flown alone, and what it is worth; or the rule that it breaks.
    pub(super) flown: Result<(Change, Figures), Rule>,
    /// What keeps it out of every plan although it is valid: its fuel, its arrival shift.
    pub(super) barred: Option<Constraint>,
}

impl Judged {
    /// Whether it may be part of a plan.
    pub(super) fn is_open(&self) -> bool {
        self.flown.is_ok() && self.barred.is_none()
    }

    /// Its figures, if it is valid.
    pub(super) fn figures(&self) -> Option<Figures> {
        self.flown.as_ref().ok().map(|(_, figures)| *figures)
    }
}

/// Judges the alternatives of all proposals, each by itself.
pub(super) fn judge_all(
    day: &Day,
    tracks: &IdVec<FlightId, Track>,
    forbidden: &(dyn Fn(FlightId, &Change) -> Option<Rule> + Sync),
) -> IdVec<ProposalId, Vec<Judged>> {
    let judged: Vec<Vec<Judged>> = day
        .proposals
        .as_slice()
        .par_iter()
        .map(|proposal| {
            let judge = |a| judge(day, tracks, proposal.flight, a, forbidden);
            proposal.alternatives.iter().map(judge).collect()
        })
        .collect();
    judged.into()
}

fn judge(
    day: &Day,
    tracks: &IdVec<FlightId, Track>,
    flight_id: FlightId,
    alternative: &Alternative,
    forbidden: &(dyn Fn(FlightId, &Change) -> Option<Rule> + Sync),
) -> Judged {
    let flight = &day.flights[flight_id];
    let change = change_levels(day, flight, &tracks[flight_id], &alternative.stretches);
    let change = change.and_then(|change| match forbidden(flight_id, &change) {
        Some(rule) => Err(rule),
        None => Ok(change),
    });
    let flown = change.map(|change| {
        let figures = figures(day, flight, alternative, &change);
        (change, figures)
    });
    let barred = flown.as_ref().ok().and_then(|(change, figures)| {
        if let Some(limit_kg) = alternative.max_extra_fuel_kg
            && figures.extra_fuel_kg > limit_kg
        {
            return Some(Constraint::FuelLimit { extra_fuel_kg: figures.extra_fuel_kg, limit_kg });
        }
        let limit = day.policy.max_arrival_shift_s?;
        let shift_s = change.arrival_shift_s();
        (shift_s.abs() > limit).then_some(Constraint::PlanLimit {
            key: "max_arrival_shift_s",
            count: shift_s.abs(),
            limit,
        })
    });
    Judged { flown, barred }
}

/// One grant: a proposal and the position of the alternative taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Grant {
    pub(super) proposal: ProposalId,
    pub(super) alternative: u32,
}

/// Alternatives of one flight that can be flown together.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Combination {
    /// By proposal; at least one.
    pub(super) grants: Vec<Grant>,
    /// The common profile.
    pub(super) change: Change,
}

/// The flights that ask for something, each with its open combinations.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Asking {
    pub(super) flight: FlightId,
    /// Its proposals, by id.
    pub(super) proposals: Vec<ProposalId>,
    pub(super) combinations: Vec<Combination>,
}

/// A flight whose options combine in more ways than the policy allows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("the options of one flight combine in more than {limit} ways")]
pub struct TooManyCombinations {
    /// The flight.
    pub flight: FlightId,
    /// The policy's `max_combinations`.
    pub limit: u32,
}

/// Finds the combinations of every flight that has proposals, in the order of flights.
pub(super) fn combine_all(
    day: &Day,
    tracks: &IdVec<FlightId, Track>,
    judged: &IdVec<ProposalId, Vec<Judged>>,
    forbidden: &(dyn Fn(FlightId, &Change) -> Option<Rule> + Sync),
) -> Result<Vec<Asking>, TooManyCombinations> {
    let mut by_flight: Vec<(FlightId, ProposalId)> =
        day.proposals.iter_with_id().map(|(id, p)| (p.flight, id)).collect();
    by_flight.sort_unstable();
    let flights: Vec<&[(FlightId, ProposalId)]> = by_flight.chunk_by(|a, b| a.0 == b.0).collect();
    flights
        .into_par_iter()
        .map(|entries| {
            let proposals: Vec<ProposalId> = entries.iter().map(|e| e.1).collect();
            let flight = entries[0].0;
            let mut search = Combining {
                day,
                track: &tracks[flight],
                flight,
                proposals: &proposals,
                judged,
                forbidden,
                limit: day.policy.max_combinations as usize,
                found: Vec::new(),
            };
            search.extend(0, &mut Vec::new(), None)?;
            let mut combinations = search.found;
            combinations.sort_by(|a, b| a.grants.cmp(&b.grants));
            Ok(Asking { flight, proposals, combinations })
        })
        .collect()
}

/// Depth-first over the proposals of one flight: each is left out or taken with one alternative.
/// What can't be flown together stays so whatever is added, so a clash ends the branch.
struct Combining<'a> {
    day: &'a Day,
    track: &'a Track,
    flight: FlightId,
    proposals: &'a [ProposalId],
    judged: &'a IdVec<ProposalId, Vec<Judged>>,
    forbidden: &'a (dyn Fn(FlightId, &Change) -> Option<Rule> + Sync),
    limit: usize,
    found: Vec<Combination>,
}

impl Combining<'_> {
    fn extend(
        &mut self,
        next: usize,
        grants: &mut Vec<Grant>,
        change: Option<&Change>,
    ) -> Result<(), TooManyCombinations> {
        let Some(&proposal) = self.proposals.get(next) else {
            if let Some(change) = change {
                if self.found.len() == self.limit {
                    let limit = self.limit as u32;
                    return Err(TooManyCombinations { flight: self.flight, limit });
                }
                self.found.push(Combination { grants: grants.clone(), change: change.clone() });
            }
            return Ok(());
        };
        self.extend(next + 1, grants, change)?;
        let most = self.day.policy.max_changes_per_flight.unwrap_or(f64::INFINITY);
        if grants.len() as f64 >= most {
            return Ok(());
        }
        for (alternative, judged) in self.judged[proposal].iter().enumerate() {
            let Ok((alone, _)) = &judged.flown else { continue };
            if !judged.is_open() {
                continue;
            }
            grants.push(Grant { proposal, alternative: alternative as u32 });
            if grants.len() == 1 {
                self.extend(next + 1, grants, Some(alone))?;
            } else if let Some(common) = self.fly(grants) {
                self.extend(next + 1, grants, Some(&common))?;
            }
            grants.pop();
        }
        Ok(())
    }

    fn fly(&self, grants: &[Grant]) -> Option<Change> {
        let stretches = stretches_of(self.day, grants);
        let flight = &self.day.flights[self.flight];
        let change = change_levels(self.day, flight, self.track, &stretches).ok()?;
        if (self.forbidden)(self.flight, &change).is_some() {
            return None;
        }
        Some(change)
    }
}

/// The stretches of several grants of one flight, by their start.
pub(super) fn stretches_of(day: &Day, grants: &[Grant]) -> Vec<Stretch> {
    let mut stretches: Vec<Stretch> = grants
        .iter()
        .flat_map(|g| {
            let proposal = &day.proposals[g.proposal];
            proposal.alternatives[g.alternative as usize].stretches.iter().copied()
        })
        .collect();
    sort_by_start(&mut stretches);
    stretches
}

/// Sorts stretches by their start, from the climb first.
pub(crate) fn sort_by_start(stretches: &mut [Stretch]) {
    let start = |s: &Stretch| s.from_s.unwrap_or(f64::NEG_INFINITY);
    stretches.sort_by(|a, b| start(a).total_cmp(&start(b)));
}
