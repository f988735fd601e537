//! A version of a flight: its track as filed, or with a part of it changed.

use super::track::{Knot, Track};

/// What a level change alters: the knots between leaving and having returned, and by how much all
/// later ones move in time.
#[derive(Debug, Clone, PartialEq)]
pub struct Changed {
    /// How many knots of the track come before the first changed one, at their filed times.
    pub kept: usize,
    /// The changed knots.
    pub knots: Vec<Knot>,
    /// The first knot of the track after the changed ones; the number of knots if none is left.
    pub resume: usize,
    /// How much later (negative: earlier) the knots from `resume` on are passed, seconds, a whole
    /// number of milliseconds.
    pub shift_s: f64,
    /// When the flight is not at the level that it filed for the place where it is: intervals of
    /// planned time, in order.
    pub off_level_s: Vec<(f64, f64)>,
}

/// One version of a flight, as a sequence of knots.
#[derive(Debug, Clone, Copy)]
pub struct Path<'a> {
    track: &'a Track,
    changed: Option<&'a Changed>,
}

impl<'a> Path<'a> {
    /// The flight as filed.
    #[must_use]
    pub fn filed(track: &'a Track) -> Self {
        Self { track, changed: None }
    }

    /// The flight with a change.
    #[must_use]
    pub fn changed(track: &'a Track, changed: &'a Changed) -> Self {
        Self { track, changed: Some(changed) }
    }

    /// The flight with a change, if there is one.
    #[must_use]
    pub fn new(track: &'a Track, changed: Option<&'a Changed>) -> Self {
        Self { track, changed }
    }

    /// Its track as filed.
    #[must_use]
    pub fn track(&self) -> &'a Track {
        self.track
    }

    /// What is changed.
    #[must_use]
    pub fn change(&self) -> Option<&'a Changed> {
        self.changed
    }

    /// How many knots it has, at least two.
    #[must_use]
    pub fn len(&self) -> usize {
        let filed = self.track.knots().len();
        self.changed.map_or(filed, |c| c.kept + c.knots.len() + (filed - c.resume))
    }

    /// Never: a path has at least two knots.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The knot at a position below [`len`](Self::len).
    #[must_use]
    #[inline]
    pub fn knot(&self, index: usize) -> Knot {
        let filed = self.track.knots();
        let Some(c) = self.changed else { return filed[index] };
        if index < c.kept {
            return filed[index];
        }
        match c.knots.get(index - c.kept) {
            Some(knot) => *knot,
            None => {
                let knot = filed[index - c.kept - c.knots.len() + c.resume];
                Knot { time_s: knot.time_s + c.shift_s, ..knot }
            }
        }
    }

    /// The knots in time order, from a position on.
    pub fn knots_from(&self, index: usize) -> impl Iterator<Item = Knot> + use<'a> {
        let path = *self;
        (index..self.len()).map(move |i| path.knot(i))
    }

    /// Position of the first knot at which a piece that differs from the filed version begins; the
    /// last piece's where nothing is changed.
    #[must_use]
    pub fn first_changed(&self) -> usize {
        self.changed.map_or(self.len() - 2, |c| c.kept.saturating_sub(1))
    }

    /// Index of the piece `[knot i, knot i + 1)` that holds a time (the first or last one outside
    /// its life).
    #[must_use]
    pub fn piece_at(&self, time_s: f64) -> usize {
        let (mut low, mut high) = (0, self.len() - 1);
        // Invariant: knots before `low` are at or before the time, those from `high` after.
        while low < high {
            let middle = usize::midpoint(low, high);
            if self.knot(middle).time_s <= time_s {
                low = middle + 1;
            } else {
                high = middle;
            }
        }
        low.saturating_sub(1).min(self.len() - 2)
    }

    /// First time, seconds of the day.
    #[must_use]
    pub fn start_s(&self) -> f64 {
        self.knot(0).time_s
    }

    /// Last time, seconds of the day.
    #[must_use]
    pub fn end_s(&self) -> f64 {
        self.knot(self.len() - 1).time_s
    }

    /// Level at a time, feet, held constant outside its life.
    #[must_use]
    pub fn level_ft_at(&self, time_s: f64) -> f64 {
        let piece = self.piece_at(time_s);
        let (a, b) = (self.knot(piece), self.knot(piece + 1));
        let share = ((time_s - a.time_s) / (b.time_s - a.time_s)).clamp(0.0, 1.0);
        a.level_ft + (b.level_ft - a.level_ft) * share
    }

    /// When it is off the level it filed for the place where it is, as intervals of time.
    #[must_use]
    pub fn off_level_s(&self) -> &'a [(f64, f64)] {
        self.changed.map_or(&[], |c| &c.off_level_s)
    }
}
