//! The losses of separation of two flights, exactly: piece by piece, between the roots of their
//! relative motion and of their difference in level.

use super::minima::{
    HorizontalMinimum, Minimum, Rules, VERTICAL_STEPS_FT, limit_chord_m, limit_vertical_ft,
};
use crate::geometry::motion::{Motion, Relative, horizontal_m};
use crate::path::{Knot, Path};

/// Intervals this close to each other are one, cut by rounding where pieces meet.
const JOIN_S: f64 = 1e-6;
/// A distance counts as closer than an earlier one from this on, so that the earliest of many equal
/// distances is not decided by rounding, metres.
const CLOSER_M: f64 = 0.01;
/// A distance that no two of the levels that may come in reach.
const FAR_APART_FT: f64 = 2000.0;

/// All that separation needs to know of one version of a flight.
#[derive(Debug, Clone, Copy)]
pub(super) struct Course<'a> {
    pub(super) path: Path<'a>,
    pub(super) minima: &'a [HorizontalMinimum],
    pub(super) rvsm: bool,
}

/// A loss without its flights.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Breach {
    pub(super) from_s: f64,
    pub(super) until_s: f64,
    pub(super) closest_s: f64,
    pub(super) horizontal_m: f64,
    pub(super) vertical_ft: f64,
}

impl Breach {
    /// Takes in a later one that meets this one; `false` if it does not.
    pub(super) fn join(&mut self, later: &Self) -> bool {
        if later.from_s > self.until_s + JOIN_S {
            return false;
        }
        self.until_s = self.until_s.max(later.until_s);
        if later.horizontal_m < self.horizontal_m - CLOSER_M {
            self.closest_s = later.closest_s;
            self.horizontal_m = later.horizontal_m;
            self.vertical_ft = later.vertical_ft;
        }
        true
    }
}

/// Two versions, and the minima between them.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pair<'a> {
    pub(super) a: Course<'a>,
    pub(super) b: Course<'a>,
    pub(super) rules: &'a Rules,
    pub(super) minimum: Minimum,
}

/// One piece of a course: its two knots.
#[derive(Clone, Copy)]
struct Piece {
    from: Knot,
    until: Knot,
}

impl Piece {
    fn level_ft_at(&self, time_s: f64) -> f64 {
        let (a, b) = (&self.from, &self.until);
        let share = ((time_s - a.time_s) / (b.time_s - a.time_s)).clamp(0.0, 1.0);
        a.level_ft + (b.level_ft - a.level_ft) * share
    }

    fn motion(&self) -> Motion {
        let (a, b) = (&self.from, &self.until);
        Motion::between(a.time_s, a.position_m, b.time_s, b.position_m)
    }

    /// Times strictly within an interval at which a level is passed.
    fn passes(&self, level_ft: f64, within: (f64, f64), times: &mut Vec<f64>) {
        let (a, b) = (&self.from, &self.until);
        let climb_ft = b.level_ft - a.level_ft;
        if climb_ft != 0.0 {
            let time_s = a.time_s + (b.time_s - a.time_s) * ((level_ft - a.level_ft) / climb_ft);
            if within.0 < time_s && time_s < within.1 {
                times.push(time_s);
            }
        }
    }
}

impl Pair<'_> {
    /// The losses within a closed interval of time, in order, those that meet joined. The positions
    /// of the first pieces that reach into the interval may be given to save the search for them.
    pub(super) fn breaches(
        &self,
        within: (f64, f64),
        first_pieces: Option<[usize; 2]>,
    ) -> Vec<Breach> {
        let from_s = within.0.max(self.a.path.start_s()).max(self.b.path.start_s());
        let until_s = within.1.min(self.a.path.end_s()).min(self.b.path.end_s());
        let mut found = Vec::new();
        if from_s > until_s {
            return found;
        }
        let [i, j] = first_pieces
            .unwrap_or_else(|| [self.a.path.piece_at(from_s), self.b.path.piece_at(from_s)]);
        let mut a = Walk::new(&self.a.path, i, from_s);
        let mut b = Walk::new(&self.b.path, j, from_s);
        let mut time_s = from_s;
        loop {
            let next_s = a.piece.until.time_s.min(b.piece.until.time_s).min(until_s);
            // Two flights that share one moment of existence are looked at there.
            if time_s < next_s || from_s == until_s {
                self.piece_breaches(&a.piece, &b.piece, (time_s, next_s.max(time_s)), &mut found);
            }
            if next_s >= until_s {
                return found;
            }
            time_s = next_s;
            a.pass(time_s);
            b.pass(time_s);
        }
    }

    fn piece_breaches(&self, a: &Piece, b: &Piece, within: (f64, f64), found: &mut Vec<Breach>) {
        let (from_s, until_s) = within;
        let a_levels = [a.level_ft_at(from_s), a.level_ft_at(until_s)];
        let b_levels = [b.level_ft_at(from_s), b.level_ft_at(until_s)];
        let (a_low, a_high) = (a_levels[0].min(a_levels[1]), a_levels[0].max(a_levels[1]));
        let (b_low, b_high) = (b_levels[0].min(b_levels[1]), b_levels[0].max(b_levels[1]));
        if a_high < self.rules.floor_ft
            || b_high < self.rules.floor_ft
            || b_low - a_high >= FAR_APART_FT
            || a_low - b_high >= FAR_APART_FT
        {
            return;
        }
        let largest_m = self
            .rules
            .largest_m(self.a.minima, from_s, until_s)
            .max(self.rules.largest_m(self.b.minima, from_s, until_s));
        let apart = Relative::new(&a.motion(), &b.motion(), from_s);
        let Some(near) = apart.closer_than(limit_chord_m(largest_m, self.minimum)) else { return };
        let near = (near.0.max(from_s), near.1.min(until_s));
        if near.0 > near.1 || (near.0 == near.1 && from_s < until_s) {
            return;
        }
        if a_low == a_high
            && b_low == b_high
            && self.a.minima.is_empty()
            && self.b.minima.is_empty()
        {
            // Both level, one minimum: by far the most frequent case.
            if (a_low - b_low).abs() < limit_vertical_ft([a_low, b_low], self.rvsm()) {
                self.push(a, b, &apart, near, found);
            }
            return;
        }
        let cuts = self.cuts(a, b, near);
        for part in cuts.windows(2) {
            self.part_breach(a, b, &apart, (part[0], part[1]), found);
        }
    }

    /// An interval, divided where a minimum may change.
    fn cuts(&self, a: &Piece, b: &Piece, within: (f64, f64)) -> Vec<f64> {
        let mut cuts = vec![within.0, within.1];
        for piece in [a, b] {
            for level_ft in VERTICAL_STEPS_FT.into_iter().chain([self.rules.floor_ft]) {
                piece.passes(level_ft, within, &mut cuts);
            }
        }
        let ends = self.a.minima.iter().chain(self.b.minima).flat_map(|m| [m.from_s, m.until_s]);
        cuts.extend(ends.filter(|&t| within.0 < t && t < within.1));
        cuts.sort_by(f64::total_cmp);
        cuts
    }

    /// The loss in an interval in which the minima do not change.
    fn part_breach(
        &self,
        a: &Piece,
        b: &Piece,
        apart: &Relative,
        part: (f64, f64),
        found: &mut Vec<Breach>,
    ) {
        let middle_s = f64::midpoint(part.0, part.1);
        let levels = [a.level_ft_at(middle_s), b.level_ft_at(middle_s)];
        if levels[0] < self.rules.floor_ft || levels[1] < self.rules.floor_ft {
            return;
        }
        let horizontal_m = self
            .rules
            .horizontal_m_at(self.a.minima, middle_s)
            .max(self.rules.horizontal_m_at(self.b.minima, middle_s));
        let limit_m = limit_chord_m(horizontal_m, self.minimum);
        let Some(near) = apart.closer_than(limit_m) else { return };
        let limit_ft = limit_vertical_ft(levels, self.rvsm());
        let Some(level) = self.levels_within(a, b, part, limit_ft) else { return };
        let from_s = part.0.max(near.0).max(level.0);
        let until_s = part.1.min(near.1).min(level.1);
        if from_s < until_s || (part.0 == part.1 && from_s == until_s) {
            self.push(a, b, apart, (from_s, until_s), found);
        }
    }

    /// The times in an interval at which the levels are closer than a limit.
    fn levels_within(
        &self,
        a: &Piece,
        b: &Piece,
        part: (f64, f64),
        limit_ft: f64,
    ) -> Option<(f64, f64)> {
        let start_ft = a.level_ft_at(part.0) - b.level_ft_at(part.0);
        let end_ft = a.level_ft_at(part.1) - b.level_ft_at(part.1);
        let change_ft = end_ft - start_ft;
        if change_ft == 0.0 {
            return (start_ft.abs() < limit_ft).then_some(part);
        }
        let reach =
            |apart_ft: f64| part.0 + (part.1 - part.0) * ((apart_ft - start_ft) / change_ft);
        let (one, other) = (reach(limit_ft), reach(-limit_ft));
        let (from_s, until_s) = (one.min(other).max(part.0), one.max(other).min(part.1));
        (from_s < until_s).then_some((from_s, until_s))
    }

    fn push(
        &self,
        a: &Piece,
        b: &Piece,
        apart: &Relative,
        (from_s, until_s): (f64, f64),
        found: &mut Vec<Breach>,
    ) {
        let (a_motion, b_motion) = (a.motion(), b.motion());
        let distance_m = |time_s: f64| horizontal_m(a_motion.at(time_s), b_motion.at(time_s));
        let mut closest_s = apart.closest_within(from_s, until_s);
        let mut closest_m = distance_m(closest_s);
        let start_m = distance_m(from_s);
        if start_m < closest_m + CLOSER_M {
            (closest_s, closest_m) = (from_s, start_m);
        }
        let breach = Breach {
            from_s,
            until_s,
            closest_s,
            horizontal_m: closest_m,
            vertical_ft: (a.level_ft_at(closest_s) - b.level_ft_at(closest_s)).abs(),
        };
        if !found.last_mut().is_some_and(|last| last.join(&breach)) {
            found.push(breach);
        }
    }

    fn rvsm(&self) -> [bool; 2] {
        [self.a.rvsm, self.b.rvsm]
    }
}

/// A place in the sequence of pieces of a path.
struct Walk<'a> {
    path: &'a Path<'a>,
    index: usize,
    piece: Piece,
}

impl<'a> Walk<'a> {
    /// At the piece that holds a time, looked for from a piece on.
    fn new(path: &'a Path<'a>, index: usize, time_s: f64) -> Self {
        let piece = Piece { from: path.knot(index), until: path.knot(index + 1) };
        let mut walk = Self { path, index, piece };
        walk.pass(time_s);
        walk
    }

    /// On to the piece that begins at a time or holds it.
    fn pass(&mut self, time_s: f64) {
        while self.piece.until.time_s <= time_s && self.index + 2 < self.path.len() {
            self.index += 1;
            let until = self.path.knot(self.index + 1);
            self.piece = Piece { from: self.piece.until, until };
        }
    }
}
