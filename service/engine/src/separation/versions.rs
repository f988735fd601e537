//! Losses of changed versions: of one against the filed day, and which versions exclude each other.
//!
//! A changed version is cut into legs like the filed day. Those from its first changed piece on, or
//! only up to the last one where nothing after it moves in time, are held against the filed legs
//! and those of other changed versions. What it shares with its filed version needs no second
//! look: a loss there is that of the filed version.

use rayon::prelude::*;

use super::index::Index;
use super::known::{is_new, new_losses};
use super::leg::Leg;
use super::minima::Minimum;
use super::moved::sort_losses;
use super::parts::{Parts, owned_by};
use super::scene::{Found, Scene, Version, joined, loss, sort};
use crate::answer::Loss;
use crate::ids::FlightId;

/// A version of a flight: as filed, or one of a list of changed ones.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum VersionRef {
    /// A flight as filed.
    Filed(FlightId),
    /// Position in the list of changed versions.
    Changed(usize),
}

/// Two versions of two flights, that of the smaller flight first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct VersionPair {
    /// The version of the flight with the smaller id.
    pub a: VersionRef,
    /// The other one.
    pub b: VersionRef,
}

/// The losses of one version against all other flights as filed, by other flight and time; in
/// each, the first flight is the one with the smaller id.
#[must_use]
pub fn losses_against_filed(scene: &Scene, version: &Version<'_>) -> Vec<Loss> {
    against_filed(scene, version, Minimum::Plain, scene.legs(version).into_iter())
}

/// The new losses of one changed version against all other flights as filed, decided like
/// [`new_losses`].
#[must_use]
pub fn new_losses_against_filed(scene: &Scene, version: &Version<'_>) -> Vec<Loss> {
    let Some(part) = ChangedPart::of(version) else { return Vec::new() };
    let parts = Parts::of(scene, version);
    let found = against_filed(scene, version, Minimum::Wider, parts.differing());
    let (mut new, mut others) = (Vec::new(), Vec::new());
    for loss in found {
        let other = if loss.first == version.flight { loss.second } else { loss.first };
        if part.cuts(&loss) {
            others.push(other);
        } else if is_new(scene, &loss, version, &scene.filed(other)) {
            new.push(loss);
        }
    }
    // A loss that reaches beyond what was looked at is looked at whole.
    others.dedup();
    for other in others {
        new.retain(|loss| loss.first != other && loss.second != other);
        new.extend(new_losses(scene, version, &scene.filed(other)));
    }
    sort_losses(&mut new);
    new
}

fn against_filed(
    scene: &Scene,
    version: &Version<'_>,
    minimum: Minimum,
    legs: impl Iterator<Item = Leg>,
) -> Vec<Loss> {
    let mut found: Vec<Found<FlightId>> = Vec::new();
    for leg in legs {
        scene.index.near(&leg, (leg.from_s, leg.until_s), |other| {
            let other_id = FlightId(other.owner);
            if other_id == version.flight {
                return;
            }
            let Some(within) = leg.near_time(other) else { return };
            let (first, pieces) = if version.flight < other_id {
                (version.flight, [leg.piece as usize, other.piece as usize])
            } else {
                (other_id, [other.piece as usize, leg.piece as usize])
            };
            let pair = scene.pair(version, &scene.filed(other_id), minimum);
            let second = version.flight.max(other_id);
            let breaches = pair.breaches(within, Some(pieces));
            found.extend(breaches.into_iter().map(|breach| (first, second, breach)));
        });
    }
    sort(&mut found);
    joined(&found).map(|(first, second, breach)| loss(first, second, &breach)).collect()
}

/// The part of a version that is not as filed in place, level and time.
#[derive(Debug, Clone, Copy)]
struct ChangedPart {
    from_s: f64,
    until_s: f64,
}

impl ChangedPart {
    fn of(version: &Version<'_>) -> Option<Self> {
        let change = version.path.change()?;
        let resumed = change.kept + change.knots.len();
        let until_s = if change.shift_s == 0.0 && resumed < version.path.len() {
            version.path.knot(resumed).time_s
        } else {
            f64::INFINITY
        };
        let from_s = version.path.knot(version.path.first_changed()).time_s;
        Some(Self { from_s, until_s })
    }

    /// Whether a loss lies partly in the part and may reach beyond it.
    fn cuts(&self, loss: &Loss) -> bool {
        !self.excludes(loss) && (loss.from_s <= self.from_s || loss.until_s >= self.until_s)
    }

    /// Whether a loss lies wholly outside the part.
    fn excludes(&self, loss: &Loss) -> bool {
        loss.until_s < self.from_s || loss.from_s > self.until_s
    }
}

pub(super) fn flight_of(version: VersionRef, versions: &[Version<'_>]) -> FlightId {
    match version {
        VersionRef::Filed(flight) => flight,
        VersionRef::Changed(index) => versions[index].flight,
    }
}

/// Holds changed versions against the filed day and each other.
pub(super) struct Sweep<'a> {
    pub(super) scene: &'a Scene,
    pub(super) versions: &'a [Version<'a>],
    pub(super) minimum: Minimum,
}

impl<'a> Sweep<'a> {
    /// Breaches of indexed versions, with filed flights that pass a test and among themselves,
    /// sorted.
    pub(super) fn breaches(
        &self,
        index: &Index,
        with_filed: impl Fn(FlightId) -> bool + Sync,
    ) -> Vec<Found<VersionRef>> {
        let (mut found, _) = index.pairs(|one, other, found| {
            let refs = [one, other].map(|leg| VersionRef::Changed(leg.owner as usize));
            self.test([one, other], refs, found);
        });
        let against_filed = (0..self.versions.len()).into_par_iter().flat_map_iter(|i| {
            let mut found = Vec::new();
            for leg in index.legs_of(i as u32) {
                self.scene.index.near(leg, (leg.from_s, leg.until_s), |other| {
                    let flight = FlightId(other.owner);
                    if with_filed(flight) {
                        let refs = [VersionRef::Changed(i), VersionRef::Filed(flight)];
                        self.test([leg, other], refs, &mut found);
                    }
                });
            }
            found
        });
        found.par_extend(against_filed);
        sort(&mut found);
        found
    }

    fn test(&self, legs: [&Leg; 2], refs: [VersionRef; 2], found: &mut Vec<Found<VersionRef>>) {
        let [one, other] = refs.map(|r| self.version(r));
        if one.flight == other.flight {
            return;
        }
        let Some(within) = legs[0].near_time(legs[1]) else { return };
        let mut pieces = legs.map(|leg| leg.piece as usize);
        let mut ordered = refs;
        if one.flight > other.flight {
            pieces.reverse();
            ordered.reverse();
        }
        let breaches = self.scene.pair(&one, &other, self.minimum).breaches(within, Some(pieces));
        found.extend(breaches.into_iter().map(|breach| (ordered[0], ordered[1], breach)));
    }

    pub(super) fn version(&self, version: VersionRef) -> Version<'a> {
        match version {
            VersionRef::Filed(flight) => self.scene.filed(flight),
            VersionRef::Changed(index) => self.versions[index],
        }
    }
}

/// Every pair of versions of two flights, at least one of them changed, that have a new loss, in
/// order. Versions of flights that are not in the list are the filed ones only.
#[must_use]
pub fn clashes(scene: &Scene, versions: &[Version<'_>]) -> Vec<VersionPair> {
    let parts: Vec<Option<ChangedPart>> = versions.iter().map(ChangedPart::of).collect();
    let index = Index::new(versions.len(), scene.rules.widest_m, |i, legs| {
        legs.extend(owned_by(i, Parts::of(scene, &versions[i]).differing()));
    });
    let sweep = Sweep { scene, versions, minimum: Minimum::Wider };
    let found = sweep.breaches(&index, |_| true);
    let found: Vec<Found<VersionRef>> = joined(&found).collect();

    let mut pairs: Vec<&[Found<VersionRef>]> =
        found.chunk_by(|x, y| x.0 == y.0 && x.1 == y.1).collect();
    let judge = Judge { sweep: &sweep, parts: &parts, by_flight: ByFlight::new(versions) };
    let mut clashes: Vec<VersionPair> =
        pairs.par_drain(..).flat_map_iter(|found| judge.clashes(found)).collect();
    clashes.par_sort_unstable();
    clashes.dedup();
    clashes
}

/// The changed versions of each flight.
struct ByFlight {
    /// Flights and versions, sorted.
    sorted: Vec<(FlightId, usize)>,
}

impl ByFlight {
    fn new(versions: &[Version<'_>]) -> Self {
        let mut sorted: Vec<_> = versions.iter().enumerate().map(|(i, v)| (v.flight, i)).collect();
        sorted.sort_unstable();
        Self { sorted }
    }

    fn of(&self, flight: FlightId) -> impl Iterator<Item = usize> + use<'_> {
        let start = self.sorted.partition_point(|(f, _)| *f < flight);
        self.sorted[start..].iter().take_while(move |(f, _)| *f == flight).map(|(_, i)| *i)
    }
}

/// Decides which pairs of versions have a new loss.
struct Judge<'a> {
    sweep: &'a Sweep<'a>,
    parts: &'a [Option<ChangedPart>],
    by_flight: ByFlight,
}

impl Judge<'_> {
    /// The clashes that follow from what was found for one pair of versions: of the pair, and of
    /// the versions that are as their filed one throughout a new loss with it.
    fn clashes(&self, found: &[Found<VersionRef>]) -> Vec<VersionPair> {
        let Some(&(a, b, _)) = found.first() else { return Vec::new() };
        let new = self.new_losses(a, b, found);
        let mut clashes = Vec::new();
        if !new.is_empty() {
            clashes.push(VersionPair { a, b });
        }
        match (a, b) {
            (VersionRef::Changed(_), VersionRef::Filed(flight)) => {
                self.share(found, &new, flight, |i| (a, VersionRef::Changed(i)), &mut clashes);
            }
            (VersionRef::Filed(flight), VersionRef::Changed(_)) => {
                self.share(found, &new, flight, |i| (VersionRef::Changed(i), b), &mut clashes);
            }
            _ => {}
        }
        clashes
    }

    fn new_losses(&self, a: VersionRef, b: VersionRef, found: &[Found<VersionRef>]) -> Vec<Loss> {
        let scene = self.sweep.scene;
        let (one, other) = (self.sweep.version(a), self.sweep.version(b));
        let losses: Vec<Loss> =
            found.iter().map(|(_, _, x)| loss(one.flight, other.flight, x)).collect();
        let cut = |version: VersionRef| {
            self.part(version).is_some_and(|part| losses.iter().any(|loss| part.cuts(loss)))
        };
        if cut(a) || cut(b) {
            return new_losses(scene, &one, &other);
        }
        losses.into_iter().filter(|loss| is_new(scene, loss, &one, &other)).collect()
    }

    fn part(&self, version: VersionRef) -> Option<ChangedPart> {
        match version {
            VersionRef::Filed(_) => None,
            VersionRef::Changed(index) => self.parts[index],
        }
    }

    /// Carries what was found against a filed flight over to the changed versions of that flight.
    fn share(
        &self,
        found: &[Found<VersionRef>],
        new: &[Loss],
        flight: FlightId,
        pair: impl Fn(usize) -> (VersionRef, VersionRef),
        clashes: &mut Vec<VersionPair>,
    ) {
        for i in self.by_flight.of(flight) {
            let Some(part) = self.parts[i] else { continue };
            let (a, b) = pair(i);
            let straddles = || found.iter().any(|(_, _, x)| part.cuts(&loss(flight, flight, x)));
            let clash = new.iter().any(|loss| part.excludes(loss))
                || (straddles()
                    && !new_losses(
                        self.sweep.scene,
                        &self.sweep.version(a),
                        &self.sweep.version(b),
                    )
                    .is_empty());
            if clash {
                clashes.push(VersionPair { a, b });
            }
        }
    }
}
