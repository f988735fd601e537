//! What separation asks of a plan, in each of the policy's four ways.
//!
//! *Nominal*: no new loss at the planned times. *Buffered*: none either with an error in each
//! flight's time of up to the policy's buffer, except of pairs that may lose separation so as filed.
//! *Risk*: no pair's probability of a loss above the policy's, except where it is as large as
//! filed; the planned times themselves say little a day ahead and forbid nothing. *Priced*: what
//! changes add to the probabilities costs so much a loss.

use rayon::prelude::*;

use super::options::Asking;
use crate::day::{Policy, SeparationRule};
use crate::ids::FlightId;
use crate::search::{Choice, choice};
use crate::separation::{
    MovedIndex, PairRisk, ShiftRule, Version, VersionPair, VersionRef, clashes, pair_risks_in_plan,
    shift_clashes,
};
use crate::traffic::{Traffic, VersionMinima};

/// Added probabilities below this are rounding, not risk.
const LEAST_ADDED: f64 = 1e-9;

/// What separation asks of the candidates of all groups.
#[derive(Debug, Default)]
pub(super) struct Apart {
    /// Choices that may not be made together.
    pub(super) clashes: Vec<(Choice, Choice)>,
    /// Choices that may not be made at all.
    pub(super) ruled_out: Vec<Choice>,
    /// What a choice costs whatever else is chosen, in the unit of the objective.
    pub(super) costs: Vec<(Choice, f64)>,
    /// What two choices cost together.
    pub(super) pair_costs: Vec<(Choice, Choice, f64)>,
}

/// The rule for uncertain times, where the policy has one.
pub(super) fn shift_rule(policy: &Policy) -> Option<ShiftRule> {
    match policy.separation {
        SeparationRule::Nominal | SeparationRule::Priced => None,
        SeparationRule::Buffered => Some(ShiftRule::Buffered { buffer_s: policy.buffer_s }),
        SeparationRule::Risk => {
            Some(ShiftRule::Risk { max_probability: policy.max_pair_probability })
        }
    }
}

/// Whether losses at the planned times are forbidden.
pub(super) fn forbids_new_losses(policy: &Policy) -> bool {
    matches!(policy.separation, SeparationRule::Nominal | SeparationRule::Buffered)
}

impl Apart {
    /// Looks at every candidate beside every other and beside all filed flights.
    pub(super) fn new(
        traffic: &Traffic,
        asking: &[Asking],
        group_of: &dyn Fn(FlightId) -> Option<u32>,
    ) -> Self {
        let choices: Vec<(Choice, FlightId, &crate::path::Changed)> = (0u32..)
            .zip(asking)
            .flat_map(|(group, asking)| {
                (1u32..)
                    .zip(&asking.combinations)
                    .map(move |(c, of)| (choice(group, c), asking.flight, &of.change.changed))
            })
            .collect();
        let minima: Vec<VersionMinima> = choices
            .par_iter()
            .map(|(_, flight, changed)| traffic.minima(*flight, changed))
            .collect();
        let versions: Vec<Version<'_>> = choices
            .iter()
            .zip(&minima)
            .map(|((_, flight, changed), minima)| traffic.version(*flight, changed, minima))
            .collect();
        let scene = &traffic.scene;
        let policy = &traffic.day.policy;
        let choice_of = |version: VersionRef| match version {
            VersionRef::Changed(index) => Some(choices[index].0),
            VersionRef::Filed(flight) => group_of(flight).map(|group| choice(group, 0)),
        };
        let mut apart = Self::default();
        let mut pairs: Vec<VersionPair> = Vec::new();
        if forbids_new_losses(policy) {
            pairs = clashes(scene, &versions);
        }
        if let Some(rule) = shift_rule(policy) {
            pairs.extend(shift_clashes(scene, &versions, rule));
            pairs.sort_unstable();
            pairs.dedup();
        }
        for pair in pairs {
            match (choice_of(pair.a), choice_of(pair.b)) {
                (Some(a), Some(b)) => apart.clashes.push((a, b)),
                (Some(only), None) | (None, Some(only)) => apart.ruled_out.push(only),
                (None, None) => {}
            }
        }
        if policy.separation == SeparationRule::Priced {
            let ids: Vec<Choice> = choices.iter().map(|(of, ..)| *of).collect();
            apart.price(traffic, asking, (&ids, &versions), group_of);
        }
        apart
    }

    /// Prices what candidates add to the probabilities of pairs: alone, where the other flight
    /// stays as filed whatever is decided; else by what the other one flies.
    fn price(
        &mut self,
        traffic: &Traffic,
        asking: &[Asking],
        (choices, versions): (&[Choice], &[Version<'_>]),
        group_of: &dyn Fn(FlightId) -> Option<u32>,
    ) {
        let price = traffic.day.policy.loss_price_j;
        let most = asking.iter().map(|asking| asking.combinations.len()).max().unwrap_or(0) as u32;
        // Round k: every other flight flies its candidate k, where it has one.
        for k in 0..=most {
            let (ids, moved): (Vec<Choice>, Vec<Version<'_>>) = choices
                .iter()
                .zip(versions)
                .filter(|(of, _)| of.candidate == k)
                .map(|(of, version)| (*of, *version))
                .unzip();
            let index = MovedIndex::new(&traffic.scene, &moved);
            let found: Vec<Vec<PairRisk>> = versions
                .par_iter()
                .map(|version| pair_risks_in_plan(&traffic.scene, version, &moved, &index))
                .collect();
            for ((&own, version), risks) in choices.iter().zip(versions).zip(&found) {
                for risk in risks.iter().filter(|risk| risk.added() > LEAST_ADDED) {
                    let other = if risk.first == version.flight { risk.second } else { risk.first };
                    let cost = price * risk.added();
                    match (index.position(other), group_of(other)) {
                        (_, None) if k == 0 => self.costs.push((own, cost)),
                        (None, Some(group)) if k == 0 => {
                            self.pair_costs.push((own, choice(group, 0), cost));
                        }
                        // Of two changed flights the pair is noted with the smaller one.
                        (Some(position), Some(_)) if version.flight < other => {
                            self.pair_costs.push((own, ids[position], cost));
                        }
                        _ => {}
                    }
                }
            }
        }
    }

    /// All costs together.
    pub(super) fn total_cost(&self) -> f64 {
        let alone: f64 = self.costs.iter().map(|(_, cost)| cost).sum();
        alone + self.pair_costs.iter().map(|(_, _, cost)| cost).sum::<f64>()
    }
}
