//! How many new losses are to be expected when flights do not keep to their times.
//!
//! A day ahead the times of two flights are uncertain by far more than the minutes in which they
//! could meet, so whether their planned times lead to a loss says little. What counts is the
//! probability that a pair loses separation, before and after a change.

use std::collections::BTreeSet;

use rayon::prelude::*;

use super::index::Index;
use super::scene::{Scene, Version};
use super::segment::{SLICE_S, Segment, segments};
use super::shift_set::{ShiftSet, Shifting, shift_set};
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
    let is_moved: BTreeSet<FlightId> = moved.iter().map(|v| v.flight).collect();
    let cut = |version: &Version<'_>, owner: u32| {
        segments(owner, &scene.course(version), &scene.rules, 0, f64::INFINITY)
    };
    let own: Vec<_> = (0..moved.len()).into_par_iter().map(|i| cut(&moved[i], i as u32)).collect();
    let index = Index::new(&own);
    let farthest_s = farthest_shift_s(scene.policy.time_sigma_s);
    let reach = Reach { scene, shifting: Shifting { scene, within_s: (-farthest_s, farthest_s) } };
    let mut risks: Vec<PairRisk> = moved
        .par_iter()
        .zip(&own)
        .flat_map_iter(|(version, segments)| {
            // Of two moved flights the pair is counted with the smaller one.
            let mut planned = reach.shifts(version, segments, &scene.index, |owner| {
                let other = FlightId(owner);
                (!is_moved.contains(&other)).then(|| scene.filed(other))
            });
            planned.extend(reach.shifts(version, segments, &index, |owner| {
                Some(moved[owner as usize]).filter(|other| version.flight < other.flight)
            }));
            let filed = scene.filed(version.flight);
            let before = reach.shifts(&filed, &cut(&filed, 0), &scene.index, |owner| {
                let other = FlightId(owner);
                let counts = !is_moved.contains(&other) || version.flight < other;
                counts.then(|| scene.filed(other))
            });
            risks_of(version.flight, planned, before, scene.policy.time_sigma_s)
        })
        .collect();
    risks.sort_by_key(|risk| (risk.first, risk.second));
    risks
}

/// Expected new losses: the sum of what the moved flights add to the probabilities of pairs.
#[must_use]
pub fn expected_new_losses(scene: &Scene, moved: &[Version<'_>]) -> f64 {
    pair_risks(scene, moved).iter().map(PairRisk::added).sum()
}

/// Finds the shifts of one version against many.
struct Reach<'a> {
    scene: &'a Scene,
    shifting: Shifting<'a>,
}

impl<'a> Reach<'a> {
    /// Every shift at which a version loses separation from the indexed versions that are chosen.
    fn shifts(
        &self,
        version: &Version<'_>,
        own: &[(i64, Segment)],
        index: &Index,
        choose: impl Fn(u32) -> Option<Version<'a>>,
    ) -> Vec<(FlightId, (f64, f64))> {
        let course = self.scene.course(version);
        let slices = (self.shifting.within_s.1 / SLICE_S).ceil() as i64;
        let (mut found, mut shifts) = (Vec::new(), Vec::new());
        for (number, segment) in own {
            for slice in (number - slices - 1..=number + slices + 1).filter_map(|n| index.slice(n))
            {
                slice.near(&segment.bounds, |other_segment| {
                    let Some(other) = choose(other_segment.owner) else { return };
                    if other.flight == version.flight {
                        return;
                    }
                    let other_course = self.scene.course(&other);
                    let (a, b) = ((&course, segment), (&other_course, other_segment));
                    self.shifting.of_segments(a, b, &mut shifts);
                    found.extend(shifts.drain(..).map(|shift| (other.flight, shift)));
                });
            }
        }
        found
    }
}

/// The risks of one flight, from its shifts against others as planned and as filed.
fn risks_of(
    flight: FlightId,
    planned: Vec<(FlightId, (f64, f64))>,
    filed: Vec<(FlightId, (f64, f64))>,
    sigma_s: f64,
) -> Vec<PairRisk> {
    let planned = probabilities(planned, sigma_s);
    let filed = probabilities(filed, sigma_s);
    let others: BTreeSet<FlightId> =
        planned.iter().chain(&filed).map(|(other, _)| *other).collect();
    let of = |list: &[(FlightId, f64)], other: FlightId| {
        list.binary_search_by_key(&other, |(id, _)| *id).map_or(0.0, |i| list[i].1)
    };
    others
        .into_iter()
        .map(|other| PairRisk {
            first: flight.min(other),
            second: flight.max(other),
            filed: of(&filed, other),
            planned: of(&planned, other),
        })
        .collect()
}

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
