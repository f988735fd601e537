//! A version of a flight as straight legs, each at one pace and with one rate of climb.
//!
//! Between two knots a path is a straight chord. Consecutive level chords are taken as one leg where
//! the flight follows a geodesic at an even speed: what is between its ends then lies below the
//! leg's ends by the curvature of the earth, and beside or behind an even motion by at most
//! [`BESIDE_M`]. Depth hardly changes a horizontal distance: where two flights a distance d apart
//! are at depths that differ by z, their straight distance is longer by z² / 2 d, and shorter by
//! d z / 2 R for a depth z below both. [`Rules::deepest_m`] keeps the first to 0.2 m and with it
//! the second to 0.1 m, and with [`BESIDE_M`] of each flight all of it under half a metre, within
//! which either answer is right.

use std::ops::Range;

use super::minima::{FILTER_MARGIN_M, Minimum, Rules, VERTICAL_STEPS_FT, limit_chord_m};
use super::pair::Course;
use crate::geometry::motion::{along_up_squared, below_zero, dot, minus};
use crate::path::Knot;

/// Longest time of a leg, seconds: legs are looked for by the time at which they begin.
pub(super) const LONGEST_S: f64 = 300.0;
/// Most pieces of a path that one leg takes in.
const MOST_PIECES: usize = 8;
/// How far an even motion may be beside, before or behind the path, metres.
const BESIDE_M: f64 = 0.05;

/// A part of a version along a straight chord, its level changing evenly, within which its minima
/// do not change.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Leg {
    /// Whose it is: the number of a flight, or of a changed version.
    pub(super) owner: u32,
    /// The piece of the path in which it begins.
    pub(super) piece: u32,
    pub(super) from_s: f64,
    pub(super) until_s: f64,
    /// Where it begins.
    pub(super) place_m: [f64; 3],
    pub(super) velocity_mps: [f64; 3],
    pub(super) level_ft: f64,
    pub(super) climb_ftps: f64,
    /// The chord of the horizontal minimum, metres.
    pub(super) chord_m: f32,
    /// Farthest that the path is from the leg, metres.
    pub(super) stray_m: f32,
    pub(super) rvsm: bool,
}

impl Leg {
    pub(super) fn lasts_s(&self) -> f64 {
        self.until_s - self.from_s
    }

    /// Lowest and highest level, feet.
    pub(super) fn level_range_ft(&self) -> (f64, f64) {
        let end_ft = self.level_ft + self.climb_ftps * self.lasts_s();
        (self.level_ft.min(end_ft), self.level_ft.max(end_ft))
    }

    /// A level that decides which vertical minimum holds on the leg, feet.
    pub(super) fn class_ft(&self) -> f64 {
        self.level_ft + self.climb_ftps * self.lasts_s() / 2.0
    }

    /// The same leg flown later.
    pub(super) fn later(&self, by_s: f64) -> Self {
        Self { from_s: self.from_s + by_s, until_s: self.until_s + by_s, ..*self }
    }

    fn at(&self, after_s: f64) -> [f64; 3] {
        std::array::from_fn(|k| self.place_m[k] + self.velocity_mps[k] * after_s)
    }

    /// Where it ends.
    pub(super) fn end_m(&self) -> [f64; 3] {
        self.at(self.lasts_s())
    }

    /// The time in which the versions on two legs may be closer than their minima, judged by how
    /// far they stray.
    pub(super) fn near_time(&self, other: &Self) -> Option<(f64, f64)> {
        let from_s = self.from_s.max(other.from_s);
        let until_s = self.until_s.min(other.until_s);
        if from_s > until_s || (from_s == until_s && !self.begins_at(from_s, other)) {
            return None;
        }
        let apart_m = minus(self.at(from_s - self.from_s), other.at(from_s - other.from_s));
        let velocity = minus(self.velocity_mps, other.velocity_mps);
        let reach_m = f64::from(self.chord_m.max(other.chord_m))
            + FILTER_MARGIN_M
            + f64::from(self.stray_m + other.stray_m);
        let c = dot(apart_m, apart_m) - reach_m * reach_m;
        let (low, high) = below_zero(dot(velocity, velocity), dot(velocity, apart_m), c)?;
        let near = (from_s + low.max(0.0), until_s.min(from_s + high));
        (near.0 < near.1 || from_s == until_s && near.0 == near.1).then_some(near)
    }

    /// Whether one of two flights begins at a time. Two flights may share only the moment at which
    /// one ends and the other begins; legs that share a moment otherwise have neighbours that
    /// share more.
    fn begins_at(&self, time_s: f64, other: &Self) -> bool {
        [self, other].iter().any(|leg| leg.piece == 0 && leg.from_s == time_s)
    }
}

/// Cuts pieces of a course into legs, appended in order of time.
pub(super) fn push_legs(
    owner: u32,
    course: &Course<'_>,
    rules: &Rules,
    pieces: Range<usize>,
    legs: &mut Vec<Leg>,
) {
    let path = &course.path;
    let knots = [path.knot(pieces.start); MOST_PIECES + 1];
    let mut cutter = Cutter { owner, course, rules, knots, legs };
    let mut piece = pieces.start;
    while piece < pieces.end {
        piece += cutter.leg(piece, pieces.end);
    }
}

struct Cutter<'a> {
    owner: u32,
    course: &'a Course<'a>,
    rules: &'a Rules,
    /// The knots from the start of the leg on.
    knots: [Knot; MOST_PIECES + 1],
    legs: &'a mut Vec<Leg>,
}

impl Cutter<'_> {
    /// Makes the leg that begins with a piece; the number of pieces that it takes.
    fn leg(&mut self, piece: usize, end: usize) -> usize {
        let path = &self.course.path;
        let from = path.knot(piece);
        self.knots[0] = from;
        self.knots[1] = path.knot(piece + 1);
        let floor_ft = self.rules.floor_ft;
        if from.level_ft.max(self.knots[1].level_ft) < floor_ft {
            return 1;
        }
        let (mut count, mut stray_m) = (1, 0.0);
        if from.level_ft == self.knots[1].level_ft {
            while count < MOST_PIECES && piece + count < end {
                let next = path.knot(piece + count + 1);
                self.knots[count + 1] = next;
                if next.level_ft != from.level_ft || next.time_s - from.time_s > LONGEST_S {
                    break;
                }
                let Some(stray) = even_within(&self.knots[..count + 2], self.rules.deepest_m)
                else {
                    break;
                };
                stray_m = stray;
                count += 1;
            }
        }
        self.push(piece, count, stray_m);
        count
    }

    /// Cuts a leg of some pieces where minima change, and where it is too long.
    fn push(&mut self, piece: usize, count: usize, stray_m: f64) {
        let (from, until) = (self.knots[0], self.knots[count]);
        let lasts_s = until.time_s - from.time_s;
        let velocity_mps = minus(until.position_m, from.position_m).map(|d| d / lasts_s);
        let climb_ftps = (until.level_ft - from.level_ft) / lasts_s;
        let minima = self.course.minima;
        let mut leg = Leg {
            owner: self.owner,
            piece: piece as u32,
            from_s: from.time_s,
            until_s: until.time_s,
            place_m: from.position_m,
            velocity_mps,
            level_ft: from.level_ft,
            climb_ftps,
            chord_m: self.rules.chord_m,
            stray_m: stray_m as f32,
            rvsm: self.course.rvsm,
        };
        if climb_ftps == 0.0 && minima.is_empty() && lasts_s <= LONGEST_S {
            self.legs.push(leg);
            return;
        }
        for part in self.cuts(&from, climb_ftps, until.time_s).windows(2) {
            let middle_s = f64::midpoint(part[0], part[1]);
            let after_s = part[0] - from.time_s;
            let class_ft = from.level_ft + climb_ftps * (middle_s - from.time_s);
            if part[0] == part[1] || class_ft < self.rules.floor_ft {
                continue;
            }
            leg.from_s = part[0];
            leg.until_s = part[1];
            leg.place_m = std::array::from_fn(|k| from.position_m[k] + velocity_mps[k] * after_s);
            leg.level_ft = from.level_ft + climb_ftps * after_s;
            if !minima.is_empty() {
                let horizontal_m = self.rules.horizontal_m_at(minima, middle_s);
                leg.chord_m = limit_chord_m(horizontal_m, Minimum::Plain) as f32;
            }
            // A merged leg that is cut begins in one of its later pieces.
            let inner = &self.knots[1..count];
            leg.piece = (piece + inner.iter().filter(|k| k.time_s <= part[0]).count()) as u32;
            self.legs.push(leg);
        }
    }

    fn cuts(&self, from: &Knot, climb_ftps: f64, until_s: f64) -> Vec<f64> {
        let within = (from.time_s, until_s);
        let mut cuts = vec![within.0, within.1];
        if climb_ftps != 0.0 {
            let steps = VERTICAL_STEPS_FT.into_iter().chain([self.rules.floor_ft]);
            cuts.extend(steps.map(|ft| from.time_s + (ft - from.level_ft) / climb_ftps));
        }
        cuts.extend(self.course.minima.iter().flat_map(|m| [m.from_s, m.until_s]));
        let parts = ((within.1 - within.0) / LONGEST_S).ceil() as usize;
        let part_s = (within.1 - within.0) / parts as f64;
        cuts.extend((1..parts).map(|i| within.0 + i as f64 * part_s));
        cuts.retain(|&t| within.0 <= t && t <= within.1);
        cuts.sort_by(f64::total_cmp);
        cuts
    }
}

/// How far knots are from an even and straight motion from the first to the last, metres; `None`
/// where that is too far.
fn even_within(knots: &[Knot], deepest_m: f64) -> Option<f64> {
    let (first, last) = (knots.first()?, knots.last()?);
    let whole_m = minus(last.position_m, first.position_m);
    let lasts_s = last.time_s - first.time_s;
    let mut farthest = 0.0_f64;
    for knot in &knots[1..knots.len() - 1] {
        let share = (knot.time_s - first.time_s) / lasts_s;
        let even: [f64; 3] = std::array::from_fn(|k| first.position_m[k] + whole_m[k] * share);
        let off = minus(knot.position_m, even);
        let (squared, depth) = (dot(off, off), along_up_squared(off, knot.position_m));
        if depth > deepest_m * deepest_m || squared - depth > BESIDE_M * BESIDE_M {
            return None;
        }
        farthest = farthest.max(squared);
    }
    Some(farthest.sqrt())
}
