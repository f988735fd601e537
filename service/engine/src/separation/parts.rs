//! A version in legs, beside the filed one: what it shares with it, what it replaces, and what is
//! only flown later.
//!
//! Before its first changed knot a version is as filed, and after its last one it is as filed but
//! for a shift in time. Legs are cut anew between these alone.

use super::leg::{Leg, push_legs};
use super::scene::{Scene, Version};

/// The legs of a version and of its flight as filed.
#[derive(Debug, Clone)]
pub(super) struct Parts<'a> {
    /// Filed legs before the change.
    pub(super) before: &'a [Leg],
    /// Filed legs that are not flown.
    pub(super) replaced: &'a [Leg],
    /// What is flown instead.
    pub(super) changed: Vec<Leg>,
    /// Filed legs after the change, at filed times.
    pub(super) after: &'a [Leg],
    /// How much later these are flown, seconds.
    pub(super) later_s: f64,
    /// Number of the piece of the version's path with which the filed path's piece 0 would
    /// coincide after the change.
    pieces_later: i64,
}

impl<'a> Parts<'a> {
    pub(super) fn of(scene: &'a Scene, version: &Version<'_>) -> Self {
        let filed = scene.index.legs_of(version.flight.0);
        let path = &version.path;
        let Some(change) = path.change() else {
            return Self {
                before: filed,
                replaced: &[],
                changed: Vec::new(),
                after: &[],
                later_s: 0.0,
                pieces_later: 0,
            };
        };
        let first = path.first_changed();
        let first_s = path.knot(first).time_s;
        let start = filed.partition_point(|leg| leg.until_s <= first_s);
        // A leg that the change cuts is cut anew from its own start.
        let from_piece = filed.get(start).map_or(first, |leg| first.min(leg.piece as usize));
        // Minima belong to times and places: where there are any, nothing is only shifted.
        let shifts = version.minima.is_empty() && scene.filed(version.flight).minima.is_empty();
        let resumes = |leg: &Leg| shifts && leg.piece as usize >= change.resume;
        let end = start + filed[start..].partition_point(|leg| !resumes(leg));
        let pieces_later = (change.kept + change.knots.len()) as i64 - change.resume as i64;
        let until_piece = filed
            .get(end)
            .map_or(path.len() - 1, |leg| (i64::from(leg.piece) + pieces_later) as usize);
        let mut changed = Vec::new();
        let (course, rules) = (scene.course(version), &scene.rules);
        push_legs(version.flight.0, &course, rules, from_piece..until_piece, &mut changed);
        Self {
            before: &filed[..start],
            replaced: &filed[start..end],
            changed,
            after: &filed[end..],
            later_s: change.shift_s,
            pieces_later,
        }
    }

    /// The legs of the version that are not as filed in place, level and time.
    pub(super) fn differing(&self) -> impl Iterator<Item = Leg> + use<'_> {
        let after = if self.later_s == 0.0 { &[] } else { self.after };
        self.changed.iter().copied().chain(after.iter().map(|leg| self.flown_later(leg)))
    }

    /// The legs of the version.
    pub(super) fn all(&self) -> impl Iterator<Item = Leg> + use<'_> {
        let after = self.after.iter().map(|leg| self.flown_later(leg));
        self.before.iter().copied().chain(self.changed.iter().copied()).chain(after)
    }

    /// The filed legs that the version shares.
    pub(super) fn shared(&self) -> impl Iterator<Item = &'a Leg> + use<'a> {
        let after = if self.later_s == 0.0 { self.after } else { &[] };
        self.before.iter().chain(after)
    }

    fn flown_later(&self, leg: &Leg) -> Leg {
        Leg { piece: (i64::from(leg.piece) + self.pieces_later) as u32, ..leg.later(self.later_s) }
    }
}

/// Gives legs another owner.
pub(super) fn owned_by(owner: usize, legs: impl Iterator<Item = Leg>) -> impl Iterator<Item = Leg> {
    legs.map(move |leg| Leg { owner: owner as u32, ..leg })
}
