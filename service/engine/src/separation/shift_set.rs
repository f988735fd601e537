//! The shift set of two versions: by how much later the second one may be flown, seen from the
//! first, so that they lose separation somewhere.
//!
//! One set answers for the planned times, for times with a buffer, and for the probability of a
//! loss under independent normal errors of the two flights' times.

use super::crossing::{Leg, shifts};
use super::index::Index;
use super::minima::{Minimum, VERTICAL_STEPS_FT, limit_chord_m, limit_vertical_ft};
use super::pair::Course;
use super::scene::{Scene, Version};
use super::segment::{SLICE_S, Segment, segments};
use crate::ids::FlightId;

/// Intervals this close to each other are one, seconds.
const JOIN_S: f64 = 1e-6;

/// Shifts of the second of two versions against the first, seconds later: intervals in order that
/// do not meet.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ShiftSet {
    intervals: Vec<(f64, f64)>,
}

impl ShiftSet {
    /// The union of intervals.
    pub(super) fn union(mut intervals: Vec<(f64, f64)>) -> Self {
        intervals.sort_by(|x, y| x.0.total_cmp(&y.0).then(x.1.total_cmp(&y.1)));
        intervals.dedup_by(|next, last| {
            let meets = next.0 <= last.1 + JOIN_S;
            if meets {
                last.1 = last.1.max(next.1);
            }
            meets
        });
        Self { intervals }
    }

    /// Its intervals, seconds.
    #[must_use]
    pub fn intervals(&self) -> &[(f64, f64)] {
        &self.intervals
    }

    /// Whether any of it lies in an interval. With `(0, 0)`: whether separation is lost at the
    /// times as they are; with `(-2 b, 2 b)`: whether it is, with an error of up to b in each
    /// flight's time.
    #[must_use]
    pub fn meets(&self, within_s: (f64, f64)) -> bool {
        self.intervals.iter().any(|i| i.0 <= within_s.1 && within_s.0 <= i.1)
    }

    /// Probability of a loss where the times of both flights have independent normal errors of a
    /// standard deviation, so that their shift has √2 times that.
    #[must_use]
    pub fn probability(&self, time_sigma_s: f64) -> f64 {
        let sum: f64 = self.intervals.iter().map(|&i| normal_share(i, time_sigma_s)).sum();
        sum.clamp(0.0, 1.0)
    }
}

/// Share of the normal distribution of deviation σ√2 in an interval.
fn normal_share((low_s, high_s): (f64, f64), sigma_s: f64) -> f64 {
    // Φ(x / (σ√2)) = erfc(-x / (2σ)) / 2.
    let [low, high] = [low_s, high_s].map(|x| x / (2.0 * sigma_s));
    if low > 0.0 {
        // On one side, from the tails, so that small shares keep their digits.
        (libm::erfc(low) - libm::erfc(high)) / 2.0
    } else if high < 0.0 {
        (libm::erfc(-high) - libm::erfc(-low)) / 2.0
    } else {
        (libm::erf(high) - libm::erf(low)) / 2.0
    }
}

/// The shift set of two versions, as far as it lies in an interval, in seconds by which the second
/// one is later. Each keeps the minima of its own times, not shifted.
#[must_use]
pub fn shift_set(
    scene: &Scene,
    first: &Version<'_>,
    second: &Version<'_>,
    within_s: (f64, f64),
) -> ShiftSet {
    if first.flight == second.flight {
        return ShiftSet::default();
    }
    let [a, b] = [first, second].map(|v| scene.course(v));
    let [a_segments, b_segments] =
        [&a, &b].map(|course| segments(0, course, &scene.rules, 0, f64::INFINITY));
    let mut found = Vec::new();
    let reach = Reach { scene, within_s };
    for (_, one) in &a_segments {
        let mut own = OwnLegs::default();
        for (_, other) in &b_segments {
            if one.bounds.meets(&other.bounds) {
                reach.of_segments((&a, one, &mut own), (&b, other), &mut found);
            }
        }
    }
    ShiftSet::union(found)
}

/// The legs of a segment, made when they are first needed.
#[derive(Default)]
pub(super) struct OwnLegs {
    legs: Option<Vec<Leg>>,
}

/// A segment as one straight and even motion, whatever its level.
fn straight(segment: &Segment) -> Leg {
    Leg {
        from_s: segment.from_s,
        until_s: segment.until_s,
        place_m: segment.place_m,
        velocity_mps: segment.velocity_mps,
        level_ft: 0.0,
        climb_ftps: 0.0,
        class_ft: 0.0,
        horizontal_m: 0.0,
    }
}

/// Finds shifts within an interval.
#[derive(Clone, Copy)]
pub(super) struct Reach<'a> {
    pub(super) scene: &'a Scene,
    pub(super) within_s: (f64, f64),
}

impl<'a> Reach<'a> {
    /// Every interval of shifts at which a version, in segments, loses separation from those of
    /// the indexed versions that are chosen by their number, with the flight of each.
    pub(super) fn shifts(
        &self,
        version: &Version<'_>,
        own: &[(i64, Segment)],
        index: &Index,
        choose: impl Fn(u32) -> Option<Version<'a>>,
    ) -> Vec<(FlightId, (f64, f64))> {
        let mut found = Vec::new();
        self.visit(version, own, index, choose, |_, other, shift| found.push((other, shift)));
        found
    }

    /// The same, each interval told with the number and the flight of the other version.
    pub(super) fn visit(
        &self,
        version: &Version<'_>,
        own: &[(i64, Segment)],
        index: &Index,
        choose: impl Fn(u32) -> Option<Version<'a>>,
        mut tell: impl FnMut(u32, FlightId, (f64, f64)),
    ) {
        let course = self.scene.course(version);
        let slices = (self.within_s.1.max(-self.within_s.0) / SLICE_S).ceil() as i64 + 1;
        let mut shifts = Vec::new();
        for (number, segment) in own {
            let mut legs = OwnLegs::default();
            for slice in (number - slices..=number + slices).filter_map(|n| index.slice(n)) {
                slice.near(&segment.bounds, |other_segment| {
                    let Some(other) = choose(other_segment.owner) else { return };
                    if other.flight == version.flight {
                        return;
                    }
                    let other_course = self.scene.course(&other);
                    let a = (&course, segment, &mut legs);
                    let b = (&other_course, other_segment);
                    self.of_segments(a, b, &mut shifts);
                    for shift in shifts.drain(..) {
                        tell(other_segment.owner, other.flight, shift);
                    }
                });
            }
        }
    }

    /// The shifts at which parts of two courses lose separation, appended.
    pub(super) fn of_segments(
        &self,
        a: (&Course<'_>, &Segment, &mut OwnLegs),
        b: (&Course<'_>, &Segment),
        found: &mut Vec<(f64, f64)>,
    ) {
        if !self.in_reach(a.1.from_s, a.1.until_s, b.1.from_s, b.1.until_s) {
            return;
        }
        // Were both to move straight and evenly, they would be off by as much as they stray.
        let horizontal_m = f64::from(a.1.bounds.horizontal_m.max(b.1.bounds.horizontal_m));
        let limit_m = horizontal_m + a.1.stray_m + b.1.stray_m;
        let coarse = shifts(&straight(a.1), &straight(b.1), limit_m, f64::INFINITY);
        if coarse.is_none_or(|(low, high)| high < self.within_s.0 || self.within_s.1 < low) {
            return;
        }
        let rvsm = [a.0.rvsm, b.0.rvsm];
        let a_legs = a.2.legs.get_or_insert_with(|| self.legs(a.0, a.1));
        let b_legs = self.legs(b.0, b.1);
        for one in a_legs.iter() {
            for other in &b_legs {
                if !self.in_reach(one.from_s, one.until_s, other.from_s, other.until_s) {
                    continue;
                }
                let limit_m =
                    limit_chord_m(one.horizontal_m.max(other.horizontal_m), Minimum::Plain);
                let limit_ft = limit_vertical_ft([one.class_ft, other.class_ft], rvsm);
                if let Some((low, high)) = shifts(one, other, limit_m, limit_ft) {
                    let clipped = (low.max(self.within_s.0), high.min(self.within_s.1));
                    if clipped.0 <= clipped.1 {
                        found.push(clipped);
                    }
                }
            }
        }
    }

    /// Whether any shift of two periods that makes them meet lies within the interval.
    fn in_reach(&self, a_from: f64, a_until: f64, b_from: f64, b_until: f64) -> bool {
        a_from - b_until <= self.within_s.1 && self.within_s.0 <= a_until - b_from
    }

    /// The pieces of a course in a segment, cut where minima change.
    fn legs(&self, course: &Course<'_>, segment: &Segment) -> Vec<Leg> {
        let rules = &self.scene.rules;
        let mut legs = Vec::new();
        let mut from = course.path.knot(segment.piece as usize);
        for until in course.path.knots_from(segment.piece as usize + 1) {
            if from.time_s >= segment.until_s {
                break;
            }
            let lasts_s = until.time_s - from.time_s;
            let velocity_mps: [f64; 3] =
                std::array::from_fn(|k| (until.position_m[k] - from.position_m[k]) / lasts_s);
            let climb_ftps = (until.level_ft - from.level_ft) / lasts_s;
            let within = (from.time_s.max(segment.from_s), until.time_s.min(segment.until_s));
            let mut add = |from_s: f64, until_s: f64| {
                let after_s = from_s - from.time_s;
                let level_ft = from.level_ft + climb_ftps * after_s;
                let class_ft = level_ft + climb_ftps * (until_s - from_s) / 2.0;
                let middle_s = f64::midpoint(from_s, until_s);
                if class_ft >= rules.floor_ft && from_s < until_s {
                    legs.push(Leg {
                        from_s,
                        until_s,
                        place_m: std::array::from_fn(|k| {
                            from.position_m[k] + velocity_mps[k] * after_s
                        }),
                        velocity_mps,
                        level_ft,
                        climb_ftps,
                        class_ft,
                        horizontal_m: rules.horizontal_m_at(course.minima, middle_s),
                    });
                }
            };
            if climb_ftps == 0.0 && course.minima.is_empty() {
                add(within.0, within.1);
            } else {
                let mut cuts = vec![within.0, within.1];
                if climb_ftps != 0.0 {
                    let steps = VERTICAL_STEPS_FT.into_iter().chain([rules.floor_ft]);
                    cuts.extend(steps.map(|ft| from.time_s + (ft - from.level_ft) / climb_ftps));
                }
                cuts.extend(course.minima.iter().flat_map(|m| [m.from_s, m.until_s]));
                cuts.retain(|&t| within.0 <= t && t <= within.1);
                cuts.sort_by(f64::total_cmp);
                cuts.windows(2).for_each(|part| add(part[0], part[1]));
            }
            from = until;
        }
        legs
    }
}
