//! How many new losses are to be expected when flights do not keep to their times.
//!
//! A day ahead the times of two flights are uncertain by far more than the minutes in which they
//! could meet, so whether their planned times lead to a loss says little. What counts is the
//! probability that a pair loses separation, before and after a change.

use std::collections::BTreeSet;

use rayon::prelude::*;

use super::moved::MovedIndex;
use super::scene::{Scene, Version};
use super::segment::segments;
use super::shift_set::{Reach, ShiftSet, shift_set};
use crate::ids::FlightId;

/// Shifts beyond this many deviations of the shift are left out: 2.0e-9 of the probability.
const MOST_DEVIATIONS: f64 = 6.0;

/// Farthest shift that counts, seconds, for a standard deviation of each flight's time.
#[must_use]
pub fn farthest_shift_s(time_sigma_s: f64) -> f64 {
    MOST_DEVIATIONS * std::f64::consts::SQRT_2 * time_sigma_s
}

/// Probability that two versions lose separation under the policy's time errors.
#[must_use]
pub fn pair_probability(scene: &Scene, one: &Version<'_>, other: &Version<'_>) -> f64 {
    let sigma_s = scene.policy.time_sigma_s;
    let farthest_s = farthest_shift_s(sigma_s);
    shift_set(scene, one, other, (-farthest_s, farthest_s)).probability(sigma_s)
}

/// Two flights and the probabilities that they lose separation.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PairRisk {
    /// The flight with the smaller id.
    pub first: FlightId,
    /// The other one.
    pub second: FlightId,
    /// Both as filed.
    pub filed: f64,
    /// As planned.
    pub planned: f64,
}

impl PairRisk {
    /// By how much the change raises the probability; 0 where it lowers it.
    #[must_use]
    pub fn added(&self) -> f64 {
        (self.planned - self.filed).max(0.0)
    }
}

/// The risk of every pair with a moved flight that could meet before or after, by first and second
/// flight. Each moved flight is given in one version; all others are as filed.
#[must_use]
pub fn pair_risks(scene: &Scene, moved: &[Version<'_>]) -> Vec<PairRisk> {
    let index = MovedIndex::new(scene, moved);
    let mut risks: Vec<PairRisk> = moved
        .par_iter()
        .flat_map_iter(|version| {
            // Of two moved flights the pair is counted with the smaller one.
            risks_of(scene, version, (moved, &index), |other| version.flight < other)
        })
        .collect();
    risks.sort_by_key(|risk| (risk.first, risk.second));
    risks
}

/// The risk of every pair of one changed version with another flight that could meet before or
/// after, by other flight: as planned with the moved versions of a plan, of other flights as filed;
/// before, with all flights as filed.
#[must_use]
pub fn pair_risks_in_plan(
    scene: &Scene,
    version: &Version<'_>,
    moved: &[Version<'_>],
    index: &MovedIndex,
) -> Vec<PairRisk> {
    risks_of(scene, version, (moved, index), |_| true)
}

/// Expected new losses: the sum of what the moved flights add to the probabilities of pairs.
#[must_use]
pub fn expected_new_losses(scene: &Scene, moved: &[Version<'_>]) -> f64 {
    pair_risks(scene, moved).iter().map(PairRisk::added).sum()
}

/// The risks of one version, with the flights not moved and the moved ones that count.
fn risks_of(
    scene: &Scene,
    version: &Version<'_>,
    (moved, index): (&[Version<'_>], &MovedIndex),
    counts: impl Fn(FlightId) -> bool,
) -> Vec<PairRisk> {
    let sigma_s = scene.policy.time_sigma_s;
    let farthest_s = farthest_shift_s(sigma_s);
    let reach = Reach { scene, within_s: (-farthest_s, farthest_s) };
    let own = segments(0, &scene.course(version), &scene.rules, 0, f64::INFINITY);
    let mut planned = reach.shifts(version, &own, &scene.index, |owner| {
        let other = FlightId(owner);
        index.position(other).is_none().then(|| scene.filed(other))
    });
    let among_moved = reach.shifts(version, &own, index.index(), |owner| {
        moved.get(owner as usize).filter(|other| counts(other.flight)).copied()
    });
    planned.extend(among_moved);
    let filed = scene.filed(version.flight);
    let own = segments(0, &scene.course(&filed), &scene.rules, 0, f64::INFINITY);
    let before = reach.shifts(&filed, &own, &scene.index, |owner| {
        let other = FlightId(owner);
        (index.position(other).is_none() || counts(other)).then(|| scene.filed(other))
    });
    let planned = probabilities(planned, sigma_s);
    let before = probabilities(before, sigma_s);
    let others: BTreeSet<FlightId> =
        planned.iter().chain(&before).map(|(other, _)| *other).collect();
    let of = |list: &[(FlightId, f64)], other: FlightId| {
        list.binary_search_by_key(&other, |(id, _)| *id).map_or(0.0, |i| list[i].1)
    };
    let risk = |other: FlightId| PairRisk {
        first: version.flight.min(other),
        second: version.flight.max(other),
        filed: of(&before, other),
        planned: of(&planned, other),
    };
    others.into_iter().map(risk).collect()
}

/// Probabilities by other flight, from the shifts at which separation is lost.
fn probabilities(mut shifts: Vec<(FlightId, (f64, f64))>, sigma_s: f64) -> Vec<(FlightId, f64)> {
    shifts.sort_by_key(|(other, _)| *other);
    shifts
        .chunk_by(|x, y| x.0 == y.0)
        .map(|group| {
            let set = ShiftSet::union(group.iter().map(|(_, shift)| *shift).collect());
            (group[0].0, set.probability(sigma_s))
        })
        .collect()
}
