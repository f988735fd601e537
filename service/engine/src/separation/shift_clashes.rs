//! Which versions exclude each other when times are not certain: with a buffer on each flight's time,
//! or by the probability of a loss.

use rayon::prelude::*;

use super::index::Index;
use super::parts::{Parts, owned_by};
use super::risk::pair_probability;
use super::scene::{Scene, Version};
use super::shift_set::{ShiftSet, shift_set, visit_shifts};
use super::versions::{VersionPair, VersionRef};
use crate::ids::FlightId;

/// Probabilities this close are equal: what rounding leaves of one number computed twice.
const SAME_PROBABILITY: f64 = 1e-9;

/// When a pair of versions is too close for uncertain times.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum ShiftRule {
    /// They may lose separation with an error of up to this in each flight's time, and the filed
    /// versions of the two may not.
    Buffered {
        /// Time error allowed to each flight, seconds.
        buffer_s: f64,
    },
    /// The probability of a loss is larger than this, and than that of their filed versions.
    Risk {
        /// Largest probability allowed.
        max_probability: f64,
    },
}

impl ShiftRule {
    /// Shifts outside of this can't break the rule without shifts inside.
    fn within_s(self, time_sigma_s: f64) -> (f64, f64) {
        let farthest_s = match self {
            Self::Buffered { buffer_s } => 2.0 * buffer_s,
            // Half of the probability allowed lies outside.
            Self::Risk { max_probability } => tail_s(max_probability / 2.0, time_sigma_s),
        };
        (-farthest_s, farthest_s)
    }

    /// Whether two versions break the rule, given their shift set as far as it is within reach.
    fn broken(self, scene: &Scene, versions: [&Version<'_>; 2], set: &ShiftSet) -> bool {
        let [one, other] = versions;
        let [filed_one, filed_other] = versions.map(|v| scene.filed(v.flight));
        let sigma_s = scene.policy.time_sigma_s;
        match self {
            Self::Buffered { .. } => {
                let within_s = self.within_s(sigma_s);
                set.meets(within_s)
                    && !shift_set(scene, &filed_one, &filed_other, within_s).meets(within_s)
            }
            Self::Risk { max_probability } => {
                if set.probability(sigma_s) <= max_probability / 2.0 {
                    return false;
                }
                let planned = pair_probability(scene, one, other);
                planned > max_probability
                    && planned
                        > pair_probability(scene, &filed_one, &filed_other) + SAME_PROBABILITY
            }
        }
    }
}

/// Whether two versions of two flights break a rule for uncertain times.
#[must_use]
pub fn breaks_shift_rule(
    scene: &Scene,
    rule: ShiftRule,
    one: &Version<'_>,
    other: &Version<'_>,
) -> bool {
    let set = shift_set(scene, one, other, rule.within_s(scene.policy.time_sigma_s));
    rule.broken(scene, [one, other], &set)
}

/// The size of shift that is exceeded, on either side, with a probability, seconds; shifts have √2
/// times the deviation of each flight's time.
fn tail_s(probability: f64, time_sigma_s: f64) -> f64 {
    let (mut low, mut high) = (0.0, super::risk::farthest_shift_s(time_sigma_s));
    // P(|shift| > x) = erfc(x / (2σ)) falls with x.
    for _ in 0..60 {
        let middle = f64::midpoint(low, high);
        if libm::erfc(middle / (2.0 * time_sigma_s)) > probability {
            low = middle;
        } else {
            high = middle;
        }
    }
    high
}

/// Every pair of versions of two flights, at least one of them changed, that breaks a rule for
/// uncertain times, in order.
#[must_use]
pub fn shift_clashes(scene: &Scene, versions: &[Version<'_>], rule: ShiftRule) -> Vec<VersionPair> {
    let index = Index::new(versions.len(), scene.rules.widest_m, |i, legs| {
        legs.extend(owned_by(i, Parts::of(scene, &versions[i]).all()));
    });
    let within_s = rule.within_s(scene.policy.time_sigma_s);
    let mut clashes: Vec<VersionPair> = (0..versions.len())
        .into_par_iter()
        .flat_map_iter(|i| {
            let version = &versions[i];
            let mut shifts: Vec<(VersionRef, (f64, f64))> = Vec::new();
            for leg in index.legs_of(i as u32) {
                let others = |owner| FlightId(owner) != version.flight;
                visit_shifts(leg, &scene.index, within_s, others, |owner, shift_s| {
                    shifts.push((VersionRef::Filed(FlightId(owner)), shift_s));
                });
                // Of two changed versions the pair is looked at with the smaller flight.
                let later = |owner: u32| version.flight < versions[owner as usize].flight;
                visit_shifts(leg, &index, within_s, later, |owner, shift_s| {
                    shifts.push((VersionRef::Changed(owner as usize), shift_s));
                });
            }
            shifts.sort_by_key(|(other, _)| *other);
            let mut clashes = Vec::new();
            for group in shifts.chunk_by(|x, y| x.0 == y.0) {
                let other_ref = group[0].0;
                let other = match other_ref {
                    VersionRef::Filed(flight) => scene.filed(flight),
                    VersionRef::Changed(index) => versions[index],
                };
                let set = ShiftSet::union(group.iter().map(|(_, shift)| *shift).collect());
                if rule.broken(scene, [version, &other], &set) {
                    let own_ref = VersionRef::Changed(i);
                    let (a, b) = if version.flight < other.flight {
                        (own_ref, other_ref)
                    } else {
                        (other_ref, own_ref)
                    };
                    clashes.push(VersionPair { a, b });
                }
            }
            clashes
        })
        .collect();
    clashes.par_sort_unstable();
    clashes
}
