//! The filed day as separation sees it, and the versions of its flights.

use std::sync::Arc;

use rayon::prelude::*;

use super::index::Index;
use super::minima::{HorizontalMinimum, Minimum, Rules};
use super::pair::{Breach, Course, Pair};
use super::segment::{Segment, segments};
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
        let mut scene = Self {
            tracks,
            minima,
            rvsm: day.flights.iter().map(|f| f.rvsm).collect(),
            rules: Rules::new(&day.policy),
            policy: day.policy.clone(),
            index: Index::default(),
            losses: Vec::new(),
        };
        let cut: Vec<Vec<(i64, Segment)>> = (0..scene.tracks.len())
            .into_par_iter()
            .map(|i| {
                let id = FlightId::from_index(i);
                segments(id.0, &scene.course(&scene.filed(id)), &scene.rules, 0, f64::INFINITY)
            })
            .collect();
        scene.index = Index::new(&cut);
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
    let mut found: Vec<(FlightId, FlightId, Breach)> = scene
        .index
        .slices()
        .par_iter()
        .flat_map_iter(|slice| {
            let mut found = Vec::new();
            slice.pairs(|one, other| {
                let (a, b) = if one.owner < other.owner { (one, other) } else { (other, one) };
                if a.owner == b.owner {
                    return;
                }
                let Some(within) = a.common_time(b) else { return };
                let (first, second) = (FlightId(a.owner), FlightId(b.owner));
                let pair = scene.pair(&scene.filed(first), &scene.filed(second), Minimum::Plain);
                let pieces = Some([a.piece as usize, b.piece as usize]);
                let breaches = pair.breaches(within, pieces);
                found.extend(breaches.into_iter().map(|breach| (first, second, breach)));
            });
            found
        })
        .collect();
    found.sort_by(|x, y| (x.0, x.1).cmp(&(y.0, y.1)).then(x.2.from_s.total_cmp(&y.2.from_s)));
    joined(&found).map(|(first, second, breach)| loss(first, second, &breach)).collect()
}

/// How many pairs are left after each filter in the search for the filed day's losses.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Survivors {
    /// Segments: parts of flights within slices of time.
    pub segments: u64,
    /// Pairs of segments within one slice.
    pub pairs: u64,
    /// Pairs whose boxes meet.
    pub boxes_meet: u64,
    /// Pairs whose straight motions come near enough.
    pub motions_meet: u64,
    /// Pairs that lose separation.
    pub lose: u64,
}

/// Counts the pairs that each filter leaves over.
#[must_use]
pub fn survivors(scene: &Scene) -> Survivors {
    let mut count = Survivors::default();
    for slice in scene.index.slices() {
        let segments = slice.segments().len() as u64;
        count.segments += segments;
        count.pairs += segments * segments.saturating_sub(1) / 2;
        slice.pairs(|a, b| {
            count.boxes_meet += 1;
            let Some(within) = a.common_time(b) else { return };
            count.motions_meet += 1;
            let [one, other] = [a, b].map(|s| scene.filed(FlightId(s.owner)));
            let pair = scene.pair(&one, &other, Minimum::Plain);
            count.lose += u64::from(!pair.breaches(within, None).is_empty());
        });
    }
    count
}

/// Joins what was cut at the borders of slices. The input is sorted by pair and time.
pub(super) fn joined<K: Copy + PartialEq>(
    found: &[(K, K, Breach)],
) -> impl Iterator<Item = (K, K, Breach)> + use<'_, K> {
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
