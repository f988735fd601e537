//! The shift set of two versions: by how much later the second one may be flown, seen from the
//! first, so that they lose separation somewhere.
//!
//! One set answers for the planned times, for times with a buffer, and for the probability of a
//! loss under independent normal errors of the two flights' times.

use super::crossing::shifts;
use super::index::Index;
use super::leg::Leg;
use super::minima::limit_vertical_ft;
use super::scene::{Scene, Version};

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
        intervals.sort_by(|x, y| x.0.total_cmp(&y.0));
        Self::union_of_sorted(intervals.into_iter())
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

    /// The union of intervals that are given in the order of their starts.
    pub(super) fn union_of_sorted(intervals: impl Iterator<Item = (f64, f64)>) -> Self {
        let mut union: Vec<(f64, f64)> = Vec::new();
        for next in intervals {
            match union.last_mut() {
                Some(last) if next.0 <= last.1 + JOIN_S => last.1 = last.1.max(next.1),
                _ => union.push(next),
            }
        }
        Self { intervals: union }
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
    let [a_legs, b_legs] = [first, second].map(|version| scene.legs(version));
    let pairs = a_legs.iter().flat_map(|one| b_legs.iter().map(move |other| (one, other)));
    let found = pairs.filter_map(|(one, other)| shifts_within(one, other, within_s)).collect();
    ShiftSet::union(found)
}

/// Calls `tell` with the owner of every indexed leg that passes `choose` and every interval of
/// shifts, within one, at which a leg loses separation from it.
pub(super) fn visit_shifts(
    leg: &Leg,
    index: &Index,
    within_s: (f64, f64),
    choose: impl Fn(u32) -> bool,
    mut tell: impl FnMut(u32, (f64, f64)),
) {
    let period_s = (leg.from_s - within_s.1, leg.until_s - within_s.0);
    index.near(leg, period_s, |other| {
        if choose(other.owner)
            && let Some(shift) = shifts_within(leg, other, within_s)
        {
            tell(other.owner, shift);
        }
    });
}

/// The shifts of the second of two legs at which they lose separation, as far as they lie in an
/// interval.
fn shifts_within(one: &Leg, other: &Leg, within_s: (f64, f64)) -> Option<(f64, f64)> {
    let limit_m = f64::from(one.chord_m.max(other.chord_m));
    let limit_ft = limit_vertical_ft([one.class_ft(), other.class_ft()], [one.rvsm, other.rvsm]);
    let shift = clipped(shifts(one, other, limit_m, limit_ft)?, within_s);
    (shift.0 <= shift.1).then_some(shift)
}

/// What lies within an interval; empty where its start is after its end.
pub(super) fn clipped(shift_s: (f64, f64), within_s: (f64, f64)) -> (f64, f64) {
    (shift_s.0.max(within_s.0), shift_s.1.min(within_s.1))
}
