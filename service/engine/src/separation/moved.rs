//! Losses of a day in which a plan has moved some flights.

use super::index::Index;
use super::known::is_new;
use super::minima::Minimum;
use super::parts::{Parts, owned_by};
use super::scene::{Found, Scene, Version, joined, loss, sort};
use super::versions::{Sweep, VersionRef, flight_of, new_losses_against_filed};
use crate::answer::Loss;
use crate::ids::FlightId;

/// Where the moved flights of a plan are. It belongs to the list of versions that it was made of,
/// one a flight, and is given beside it.
#[derive(Debug, Clone, Default)]
pub struct MovedIndex {
    index: Index,
    /// Flights and their positions in the list, sorted.
    flights: Vec<(FlightId, usize)>,
}

impl MovedIndex {
    /// Indexes one version each of some flights.
    #[must_use]
    pub fn new(scene: &Scene, moved: &[Version<'_>]) -> Self {
        let index = Index::new(moved.len(), scene.rules.widest_m, |i, legs| {
            legs.extend(owned_by(i, Parts::of(scene, &moved[i]).all()));
        });
        let mut flights: Vec<_> = moved.iter().enumerate().map(|(i, v)| (v.flight, i)).collect();
        flights.sort_unstable();
        Self { index, flights }
    }

    /// Position of a flight in the list; `None` if it is not moved.
    #[must_use]
    pub fn position(&self, flight: FlightId) -> Option<usize> {
        self.flights.binary_search_by_key(&flight, |(f, _)| *f).ok().map(|i| self.flights[i].1)
    }

    pub(super) fn index(&self) -> &Index {
        &self.index
    }
}

/// The losses between flights of which at least one is moved, by first flight, second flight and
/// time. Each moved flight is given in one version; all others are as filed.
#[must_use]
pub fn losses_of_moved(scene: &Scene, moved: &[Version<'_>]) -> Vec<Loss> {
    let index = MovedIndex::new(scene, moved);
    let sweep = Sweep { scene, versions: moved, minimum: Minimum::Plain };
    let found = sweep.breaches(&index.index, |flight| index.position(flight).is_none());
    let flight = |version: VersionRef| flight_of(version, moved);
    let mut losses: Vec<Loss> =
        joined(&found).map(|(a, b, breach)| loss(flight(a), flight(b), &breach)).collect();
    sort_losses(&mut losses);
    losses
}

/// The new losses of one changed version in a day in which other flights are moved, decided like
/// [`new_losses`](super::new_losses). The flight itself may be among the moved ones; that version
/// is then left out.
#[must_use]
pub fn new_losses_in_plan(
    scene: &Scene,
    version: &Version<'_>,
    moved: &[Version<'_>],
    index: &MovedIndex,
) -> Vec<Loss> {
    let mut new = new_losses_against_filed(scene, version);
    new.retain(|loss| {
        let other = if loss.first == version.flight { loss.second } else { loss.first };
        index.position(other).is_none()
    });
    let mut found: Vec<Found<usize>> = Vec::new();
    for leg in scene.legs(version) {
        index.index.near(&leg, (leg.from_s, leg.until_s), |other_leg| {
            let position = other_leg.owner as usize;
            let Some(other) = moved.get(position).filter(|o| o.flight != version.flight) else {
                return;
            };
            let Some(within) = leg.near_time(other_leg) else { return };
            let mut pieces = [leg.piece as usize, other_leg.piece as usize];
            if other.flight < version.flight {
                pieces.reverse();
            }
            let pair = scene.pair(version, other, Minimum::Wider);
            let breaches = pair.breaches(within, Some(pieces));
            found.extend(breaches.into_iter().map(|breach| (position, position, breach)));
        });
    }
    sort(&mut found);
    for (position, _, breach) in joined(&found) {
        let other = &moved[position];
        let (first, second) = (version.flight.min(other.flight), version.flight.max(other.flight));
        let loss = loss(first, second, &breach);
        if is_new(scene, &loss, version, other) {
            new.push(loss);
        }
    }
    sort_losses(&mut new);
    new
}

pub(super) fn sort_losses(losses: &mut [Loss]) {
    losses.sort_by(|x, y| {
        (x.first, x.second).cmp(&(y.first, y.second)).then(x.from_s.total_cmp(&y.from_s))
    });
}
