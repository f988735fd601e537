//! What one version of a flight does within one slice of time, coarsely: a box that holds it.
//!
//! A slice lasts [`SLICE_S`]; a segment is the part of a version in one slice that reaches up to
//! the separation floor. Its box holds every place and level of that part, so two versions can lose
//! separation within a slice only where the boxes of two of their segments, each widened by the
//! larger minimum, meet.

use super::minima::{MARGIN_M, Rules, vertical_reach_ft};
use super::pair::Course;
use crate::geometry::motion::{chord_m, dot, minus};
use crate::path::Knot;

/// Length of a slice of time, seconds.
pub(super) const SLICE_S: f64 = 300.0;

/// Coordinates are rounded to f32, to half a metre and less on the ellipsoid.
const ROUNDING: f32 = 1.0;

/// Bounds of a segment, in earth-centred metres and feet, rounded outwards.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Bounds {
    pub(super) low_m: [f32; 3],
    pub(super) high_m: [f32; 3],
    pub(super) low_ft: f32,
    pub(super) high_ft: f32,
    /// Largest horizontal minimum of this flight here.
    pub(super) horizontal_m: f32,
    /// Largest vertical minimum that this flight brings with it here.
    pub(super) vertical_ft: f32,
}

impl Bounds {
    /// Whether versions within the two may come closer than their minima.
    pub(super) fn meets(&self, other: &Self) -> bool {
        let vertical_ft = self.vertical_ft.max(other.vertical_ft);
        let horizontal_m = self.horizontal_m.max(other.horizontal_m);
        // Without short cuts: hardly any pair meets, and no branch inside is easy to foresee.
        let mut meets = (self.low_ft - other.high_ft < vertical_ft)
            & (other.low_ft - self.high_ft < vertical_ft);
        for k in 0..3 {
            meets &= (self.low_m[k] - other.high_m[k] < horizontal_m)
                & (other.low_m[k] - self.high_m[k] < horizontal_m);
        }
        meets
    }
}

/// Part of a version within one slice.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Segment {
    /// Whose it is: the number of a flight, or of a changed version.
    pub(super) owner: u32,
    /// The piece of the path in which it begins.
    pub(super) piece: u32,
    pub(super) from_s: f64,
    pub(super) until_s: f64,
    /// Where it begins, and the velocity that takes it straight to its end.
    pub(super) place_m: [f64; 3],
    pub(super) velocity_mps: [f64; 3],
    /// Farthest that it ever is from that straight and even motion, metres.
    pub(super) stray_m: f64,
    pub(super) bounds: Bounds,
}

impl Segment {
    /// The common time of two segments, and whether the versions may come closer than their minima
    /// in it, judged by straight motions and how far they stray.
    pub(super) fn common_time(&self, other: &Self) -> Option<(f64, f64)> {
        let from_s = self.from_s.max(other.from_s);
        let until_s = self.until_s.min(other.until_s);
        if from_s > until_s {
            return None;
        }
        let at = |s: &Self| -> [f64; 3] {
            std::array::from_fn(|k| s.place_m[k] + s.velocity_mps[k] * (from_s - s.from_s))
        };
        let apart_m = minus(at(self), at(other));
        let velocity = minus(self.velocity_mps, other.velocity_mps);
        let squared = dot(velocity, velocity);
        let after_s = if squared > 0.0 {
            (-dot(apart_m, velocity) / squared).clamp(0.0, until_s - from_s)
        } else {
            0.0
        };
        let closest: [f64; 3] = std::array::from_fn(|k| apart_m[k] + velocity[k] * after_s);
        let horizontal_m = f64::from(self.bounds.horizontal_m.max(other.bounds.horizontal_m));
        let reach_m = horizontal_m + self.stray_m + other.stray_m;
        (dot(closest, closest) < reach_m * reach_m).then_some((from_s, until_s))
    }
}

/// Levels that f32 holds exactly stay exact, so that flights exactly at the vertical minimum are
/// told apart here already.
fn rounded_down(level_ft: f64) -> f32 {
    let near = level_ft as f32;
    if f64::from(near) > level_ft { near.next_down() } else { near }
}

/// The number of the slice that holds a time.
pub(super) fn slice_of(time_s: f64) -> i64 {
    (time_s / SLICE_S).floor() as i64
}

/// Cuts a course into segments, from a piece on until a time, each with the number of its slice.
pub(super) fn segments(
    owner: u32,
    course: &Course<'_>,
    rules: &Rules,
    first_piece: usize,
    until_s: f64,
) -> Vec<(i64, Segment)> {
    let mut cutter =
        Cutter { owner, course, rules, slice: 0, open: Vec::new(), piece: 0, done: Vec::new() };
    let path = &course.path;
    let mut from = path.knot(first_piece);
    if first_piece == 0 {
        // A flight that begins where two slices meet exists in the earlier one too, for a moment.
        let slice = slice_of(from.time_s);
        if slice as f64 * SLICE_S == from.time_s && from.level_ft >= rules.floor_ft {
            cutter.add(slice - 1, 0, &from, &from);
        }
    }
    for piece in first_piece..path.len() - 1 {
        let until = path.knot(piece + 1);
        if from.level_ft.max(until.level_ft) >= rules.floor_ft {
            cutter.cut(piece, &from, &until);
        } else {
            cutter.close();
        }
        if until.time_s >= until_s {
            break;
        }
        from = until;
    }
    cutter.close();
    cutter.done
}

/// The state of cutting one course.
struct Cutter<'a> {
    owner: u32,
    course: &'a Course<'a>,
    rules: &'a Rules,
    slice: i64,
    /// Times, places and levels of the open segment.
    open: Vec<(f64, [f64; 3], f64)>,
    piece: u32,
    done: Vec<(i64, Segment)>,
}

impl Cutter<'_> {
    /// Distributes one piece to the slices that it crosses.
    fn cut(&mut self, piece: usize, from: &Knot, until: &Knot) {
        let mut slice = slice_of(from.time_s);
        let mut start = *from;
        loop {
            let border_s = (slice + 1) as f64 * SLICE_S;
            if border_s >= until.time_s {
                return self.add(slice, piece as u32, &start, until);
            }
            let share = (border_s - from.time_s) / (until.time_s - from.time_s);
            let border = Knot {
                time_s: border_s,
                level_ft: from.level_ft + (until.level_ft - from.level_ft) * share,
                position_m: std::array::from_fn(|k| {
                    from.position_m[k] + (until.position_m[k] - from.position_m[k]) * share
                }),
                ..*from
            };
            self.add(slice, piece as u32, &start, &border);
            start = border;
            slice += 1;
        }
    }

    fn add(&mut self, slice: i64, piece: u32, from: &Knot, until: &Knot) {
        if slice != self.slice {
            self.close();
        }
        if self.open.is_empty() {
            self.slice = slice;
            self.piece = piece;
            self.open.push((from.time_s, from.position_m, from.level_ft));
        }
        self.open.push((until.time_s, until.position_m, until.level_ft));
    }

    fn close(&mut self) {
        if let (Some(&first), Some(&last)) = (self.open.first(), self.open.last()) {
            let segment = self.segment(first, last);
            self.done.push((self.slice, segment));
            self.open.clear();
        }
    }

    fn segment(&self, first: (f64, [f64; 3], f64), last: (f64, [f64; 3], f64)) -> Segment {
        let duration_s = last.0 - first.0;
        let velocity_mps = if duration_s > 0.0 {
            minus(last.1, first.1).map(|d| d / duration_s)
        } else {
            [0.0; 3]
        };
        let (mut low_m, mut high_m) = ([f64::INFINITY; 3], [f64::NEG_INFINITY; 3]);
        let (mut low_ft, mut high_ft) = (f64::INFINITY, f64::NEG_INFINITY);
        // The distance from an even motion is convex on each piece: largest at one of its ends.
        let mut stray_squared = 0.0_f64;
        for &(time_s, place_m, level_ft) in &self.open {
            let after_s = time_s - first.0;
            let even = std::array::from_fn(|k| first.1[k] + velocity_mps[k] * after_s);
            let off = minus(place_m, even);
            stray_squared = stray_squared.max(dot(off, off));
            for k in 0..3 {
                low_m[k] = low_m[k].min(place_m[k]);
                high_m[k] = high_m[k].max(place_m[k]);
            }
            low_ft = low_ft.min(level_ft);
            high_ft = high_ft.max(level_ft);
        }
        let largest_m = self.rules.largest_m(self.course.minima, first.0, last.0);
        Segment {
            owner: self.owner,
            piece: self.piece,
            from_s: first.0,
            until_s: last.0,
            place_m: first.1,
            velocity_mps,
            stray_m: stray_squared.sqrt() + f64::from(ROUNDING),
            bounds: Bounds {
                low_m: low_m.map(|x| x as f32 - ROUNDING),
                high_m: high_m.map(|x| x as f32 + ROUNDING),
                low_ft: rounded_down(low_ft.max(self.rules.floor_ft)),
                high_ft: -rounded_down(-high_ft),
                horizontal_m: (chord_m(largest_m + MARGIN_M)) as f32 + ROUNDING,
                vertical_ft: vertical_reach_ft(high_ft, self.course.rvsm) as f32,
            },
        }
    }
}
