//! The filed day as separation sees it, and the versions of its flights.

use std::sync::Arc;

use rayon::prelude::*;

use super::index::Index;
use super::leg::{Leg, push_legs};
use super::minima::{HorizontalMinimum, Minimum, Rules};
use super::pair::{Breach, Course, Pair};
use super::parts::Parts;
use crate::answer::Loss;
use crate::day::{Day, Policy};
use crate::ids::{FlightId, Id, IdVec};
use crate::path::{Path, Track};

/// One version of a flight, and the horizontal minima of the sectors on its way.
#[derive(Debug, Clone, Copy)]
pub struct Version<'a> {
    /// The flight.
    pub flight: FlightId,
    /// Where it is and when.
    pub path: Path<'a>,
    /// Periods in which its horizontal minimum is not the policy's, without overlap.
    pub minima: &'a [HorizontalMinimum],
}

/// All filed flights, an index of where they are, and the losses between them.
#[derive(Debug, Clone)]
pub struct Scene {
    tracks: Arc<IdVec<FlightId, Track>>,
    minima: IdVec<FlightId, Vec<HorizontalMinimum>>,
    rvsm: IdVec<FlightId, bool>,
    pub(super) rules: Rules,
    pub(super) policy: Policy,
    pub(super) index: Index,
    losses: Vec<Loss>,
}

impl Scene {
    /// Indexes the filed tracks of a day and finds their losses.
    ///
    /// `minima` gives, for each flight, the periods in which the sector where it is sets a minimum
    /// of its own; flights beyond its end have none.
    #[must_use]
    pub fn new(
        day: &Day,
        tracks: Arc<IdVec<FlightId, Track>>,
        minima: IdVec<FlightId, Vec<HorizontalMinimum>>,
    ) -> Self {
        let own_nm = day.sectors.iter().filter_map(|sector| sector.horizontal_nm);
        let own_nm = own_nm.chain(minima.iter().flatten().map(|m| m.horizontal_nm));
        let rules = Rules::new(&day.policy, own_nm);
        let mut scene = Self {
            tracks,
            minima,
            rvsm: day.flights.iter().map(|f| f.rvsm).collect(),
            rules,
            policy: day.policy.clone(),
            index: Index::default(),
            losses: Vec::new(),
        };
        scene.index = Index::new(scene.tracks.len(), rules.widest_m, |owner, legs| {
            let id = FlightId::from_index(owner);
            let course = scene.course(&scene.filed(id));
            push_legs(id.0, &course, &rules, 0..course.path.len() - 1, legs);
        });
        scene.losses = filed_losses(&scene);
        scene
    }

    /// A flight as filed.
    #[must_use]
    pub fn filed(&self, flight: FlightId) -> Version<'_> {
        let minima = self.minima.get(flight).map_or(&[][..], Vec::as_slice);
        Version { flight, path: Path::filed(&self.tracks[flight]), minima }
    }

    /// Every loss of the filed day, by first flight, second flight and time; sectors not filled in.
    #[must_use]
    pub fn losses(&self) -> &[Loss] {
        &self.losses
    }

    /// The filed losses of two flights, in time order.
    #[must_use]
    pub fn losses_of(&self, one: FlightId, other: FlightId) -> &[Loss] {
        let pair = (one.min(other), one.max(other));
        let start = self.losses.partition_point(|l| (l.first, l.second) < pair);
        let count = self.losses[start..].partition_point(|l| (l.first, l.second) == pair);
        &self.losses[start..start + count]
    }

    pub(super) fn course<'a>(&self, version: &Version<'a>) -> Course<'a> {
        Course {
            path: version.path,
            minima: version.minima,
            rvsm: self.rvsm.get(version.flight).copied().unwrap_or(true),
        }
    }

    /// The legs of a version.
    pub(super) fn legs(&self, version: &Version<'_>) -> Vec<Leg> {
        Parts::of(self, version).all().collect()
    }

    /// The pair of two versions, the one of the smaller flight first.
    pub(super) fn pair<'a>(
        &'a self,
        one: &Version<'a>,
        other: &Version<'a>,
        minimum: Minimum,
    ) -> Pair<'a> {
        let (a, b) = if one.flight <= other.flight { (one, other) } else { (other, one) };
        Pair { a: self.course(a), b: self.course(b), rules: &self.rules, minimum }
    }
}

/// Names the flights of a breach.
pub(super) fn loss(first: FlightId, second: FlightId, breach: &Breach) -> Loss {
    Loss {
        first,
        second,
        from_s: breach.from_s,
        until_s: breach.until_s,
        closest_s: breach.closest_s,
        horizontal_m: breach.horizontal_m,
        vertical_ft: breach.vertical_ft,
        sector: None,
    }
}

/// Losses between the filed versions of all flights, by first flight, second flight and time;
/// [`Scene::losses`] holds them.
#[must_use]
pub fn filed_losses(scene: &Scene) -> Vec<Loss> {
    let (mut found, _) = scene.index.pairs(|one, other, found: &mut Vec<Found<FlightId>>| {
        let [one, other] = if one.owner < other.owner { [one, other] } else { [other, one] };
        let Some(within) = one.near_time(other) else { return };
        let [first, second] = [one, other].map(|leg| FlightId(leg.owner));
        let pair = scene.pair(&scene.filed(first), &scene.filed(second), Minimum::Plain);
        let breaches = pair.breaches(within, Some([one, other].map(|leg| leg.piece as usize)));
        found.extend(breaches.into_iter().map(|breach| (first, second, breach)));
    });
    sort(&mut found);
    joined(&found).map(|(first, second, breach)| loss(first, second, &breach)).collect()
}

/// How many pairs of legs are left after each filter in the search for the filed day's losses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Survivors {
    /// Legs: parts of flights.
    pub legs: u64,
    /// Pairs of legs.
    pub pairs: u64,
    /// Pairs that meet in time in a cell and slot of the index.
    pub lists_meet: u64,
    /// Pairs whose balls and levels meet.
    pub bounds_meet: u64,
    /// Pairs whose motions come near enough.
    pub motions_meet: u64,
    /// Pairs that lose separation.
    pub lose: u64,
}

/// Counts the pairs that each filter leaves over.
#[must_use]
pub fn survivors(scene: &Scene) -> Survivors {
    let (found, lists_meet) = scene.index.pairs(|one, other, found: &mut Vec<(bool, bool)>| {
        let Some(within) = one.near_time(other) else { return found.push((false, false)) };
        let [a, b] = [one, other].map(|leg| scene.filed(FlightId(leg.owner)));
        let pair = scene.pair(&a, &b, Minimum::Plain);
        found.push((true, !pair.breaches(within, None).is_empty()));
    });
    let legs = scene.index.len() as u64;
    let count = |holds: fn(&(bool, bool)) -> bool| found.iter().filter(|f| holds(f)).count() as u64;
    Survivors {
        legs,
        pairs: legs * legs.saturating_sub(1) / 2,
        lists_meet,
        bounds_meet: found.len() as u64,
        motions_meet: count(|f| f.0),
        lose: count(|f| f.1),
    }
}

/// A breach between two owners.
pub(super) type Found<K> = (K, K, Breach);

/// Sorts by pair and time.
pub(super) fn sort<K: Ord + Copy + Send>(found: &mut [Found<K>]) {
    found.par_sort_unstable_by(|x, y| {
        let times = || x.2.from_s.total_cmp(&y.2.from_s).then(x.2.until_s.total_cmp(&y.2.until_s));
        (x.0, x.1).cmp(&(y.0, y.1)).then_with(times)
    });
}

/// Joins what was cut at the ends of legs. The input is sorted by pair and time.
pub(super) fn joined<K: Copy + PartialEq>(
    found: &[Found<K>],
) -> impl Iterator<Item = Found<K>> + use<'_, K> {
    let mut rest = found.iter().peekable();
    std::iter::from_fn(move || {
        let (a, b, mut breach) = *rest.next()?;
        while rest.next_if(|next| next.0 == a && next.1 == b && breach.join(&next.2)).is_some() {}
        Some((a, b, breach))
    })
}

/// The losses between two versions of two flights, in time order; none between two versions of one.
#[must_use]
pub fn pair_losses(scene: &Scene, one: &Version<'_>, other: &Version<'_>) -> Vec<Loss> {
    pair_losses_at(scene, one, other, Minimum::Plain)
}

pub(super) fn pair_losses_at(
    scene: &Scene,
    one: &Version<'_>,
    other: &Version<'_>,
    minimum: Minimum,
) -> Vec<Loss> {
    if one.flight == other.flight {
        return Vec::new();
    }
    let (first, second) = (one.flight.min(other.flight), one.flight.max(other.flight));
    let always = (f64::NEG_INFINITY, f64::INFINITY);
    let breaches = scene.pair(one, other, minimum).breaches(always, None);
    breaches.iter().map(|breach| loss(first, second, breach)).collect()
}
