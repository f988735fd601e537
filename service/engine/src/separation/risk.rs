//! How many new losses are to be expected when flights do not keep to their times.
//!
//! A day ahead the times of two flights are uncertain by far more than the minutes in which they
//! could meet, so whether their planned times lead to a loss says little. What counts is the
//! probability that a pair loses separation, before and after a change.

use rayon::prelude::*;

use super::leg::Leg;
use super::moved::MovedIndex;
use super::parts::Parts;
use super::scene::{Scene, Version};
use super::shift_set::{ShiftSet, clipped, shift_set, visit_shifts};
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

/// The risk of every pair with a moved flight whose probability the changes may alter, by first and
/// second flight. Each moved flight is given in one version; all others are as filed.
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

/// The risk of every pair of one changed version with another flight whose probability may be
/// another than as filed, by other flight: as planned with the moved versions of a plan, of other
/// flights as filed; before, with all flights as filed.
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
    // One flight alone needs no index of moved ones, and no other threads.
    if let [version] = moved {
        let alone = pair_risks_in_plan(scene, version, &[], &MovedIndex::default());
        return alone.iter().map(PairRisk::added).sum();
    }
    pair_risks(scene, moved).iter().map(PairRisk::added).sum()
}

/// The risks of one version, with the flights not moved and the moved ones that count.
fn risks_of(
    scene: &Scene,
    version: &Version<'_>,
    (moved, index): (&[Version<'_>], &MovedIndex),
    counts: impl Fn(FlightId) -> bool,
) -> Vec<PairRisk> {
    let own = version.flight;
    let moved_flights = moved.iter().map(|v| v.flight).filter(|&f| f != own && counts(f));
    let search = Search {
        scene,
        own,
        within_s: within_s(scene),
        parts: Parts::of(scene, version),
        is_moved: |flight| index.position(flight).is_some(),
    };
    let mut found = search.altered(&counts);
    let mut affected = Marked::new(scene.index.owners());
    found.iter().for_each(|shift| affected.mark(shift.other));
    moved_flights.for_each(|flight| affected.mark(flight));
    search.shared(&affected, &mut found);
    if moved.len() > 1 || moved.first().is_some_and(|v| v.flight != own) {
        search.planned(index, |position| moved[position].flight, &affected, &mut found);
    }
    found.sort_unstable_by(|x, y| x.other.cmp(&y.other).then(x.shift_s.0.total_cmp(&y.shift_s.0)));
    let sigma_s = scene.policy.time_sigma_s;
    let risk = |group: &[Shift]| {
        let probability = |part: fn(&Of) -> bool| {
            let chosen = group.iter().filter(|shift| part(&shift.of));
            ShiftSet::union_of_sorted(chosen.map(|shift| shift.shift_s)).probability(sigma_s)
        };
        let other = group[0].other;
        PairRisk {
            first: own.min(other),
            second: own.max(other),
            filed: probability(|of| *of != Of::Planned),
            planned: probability(|of| *of != Of::Filed),
        }
    };
    found.chunk_by(|x, y| x.other == y.other).map(risk).collect()
}

/// The shifts that count.
fn within_s(scene: &Scene) -> (f64, f64) {
    let farthest_s = farthest_shift_s(scene.policy.time_sigma_s);
    (-farthest_s, farthest_s)
}

/// Shifts at which a version loses separation from another flight.
#[derive(Debug, Clone, Copy)]
struct Shift {
    other: FlightId,
    of: Of,
    shift_s: (f64, f64),
}

/// Whose shifts they are.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Of {
    /// The filed version's.
    Filed,
    /// The planned version's.
    Planned,
    /// Both versions'.
    Both,
}

/// A set of flights.
struct Marked {
    bits: Vec<u64>,
}

impl Marked {
    fn new(flights: usize) -> Self {
        Self { bits: vec![0; flights.div_ceil(64)] }
    }

    fn mark(&mut self, flight: FlightId) {
        if let Some(bits) = self.bits.get_mut(flight.0 as usize / 64) {
            *bits |= 1 << (flight.0 % 64);
        }
    }

    fn holds(&self, flight: FlightId) -> bool {
        let bits = self.bits.get(flight.0 as usize / 64);
        bits.is_some_and(|bits| bits >> (flight.0 % 64) & 1 == 1)
    }
}

/// Looks for the shifts of one version. What is before the change is looked at only for flights
/// that the rest of it meets, and what is only flown later only once.
struct Search<'a, M> {
    scene: &'a Scene,
    own: FlightId,
    within_s: (f64, f64),
    parts: Parts<'a>,
    /// Whether a flight has another version in the plan than the filed one.
    is_moved: M,
}

impl<M: Fn(FlightId) -> bool> Search<'_, M> {
    fn filed(
        &self,
        leg: &Leg,
        within_s: (f64, f64),
        choose: impl Fn(FlightId) -> bool,
        mut tell: impl FnMut(FlightId, (f64, f64)),
    ) {
        let choose = |owner| FlightId(owner) != self.own && choose(FlightId(owner));
        visit_shifts(leg, &self.scene.index, within_s, choose, |owner, shift_s| {
            tell(FlightId(owner), shift_s);
        });
    }

    /// The shifts of what is replaced, of what is flown instead, and of what is flown later.
    fn altered(&self, counts: impl Fn(FlightId) -> bool) -> Vec<Shift> {
        let mut found = Vec::new();
        let chosen = |flight| !(self.is_moved)(flight) || counts(flight);
        for leg in self.parts.replaced {
            self.filed(leg, self.within_s, chosen, |other, shift_s| {
                found.push(Shift { other, of: Of::Filed, shift_s });
            });
        }
        for leg in &self.parts.changed {
            self.filed(
                leg,
                self.within_s,
                |other| !(self.is_moved)(other),
                |other, shift_s| {
                    found.push(Shift { other, of: Of::Planned, shift_s });
                },
            );
        }
        let later_s = self.parts.later_s;
        if later_s != 0.0 {
            let wider = (self.within_s.0 - later_s.abs(), self.within_s.1 + later_s.abs());
            for leg in self.parts.after {
                self.filed(leg, wider, chosen, |other, shift_s| {
                    let later = (shift_s.0 + later_s, shift_s.1 + later_s);
                    for (of, shift_s) in [(Of::Filed, shift_s), (Of::Planned, later)] {
                        let shift_s = clipped(shift_s, self.within_s);
                        let wanted = of == Of::Filed || !(self.is_moved)(other);
                        if wanted && shift_s.0 <= shift_s.1 {
                            found.push(Shift { other, of, shift_s });
                        }
                    }
                });
            }
        }
        found
    }

    /// The shifts of what both versions fly, with some of the flights.
    fn shared(&self, with: &Marked, found: &mut Vec<Shift>) {
        for leg in self.parts.shared() {
            self.filed(
                leg,
                self.within_s,
                |other| with.holds(other),
                |other, shift_s| {
                    let of = if (self.is_moved)(other) { Of::Filed } else { Of::Both };
                    found.push(Shift { other, of, shift_s });
                },
            );
        }
    }

    /// The shifts against the planned versions of some of the flights.
    fn planned(
        &self,
        index: &MovedIndex,
        flight: impl Fn(usize) -> FlightId,
        with: &Marked,
        found: &mut Vec<Shift>,
    ) {
        for leg in self.parts.all() {
            let choose = |position| {
                let other = flight(position as usize);
                other != self.own && with.holds(other)
            };
            visit_shifts(&leg, index.index(), self.within_s, choose, |position, shift_s| {
                let other = flight(position as usize);
                found.push(Shift { other, of: Of::Planned, shift_s });
            });
        }
    }
}
