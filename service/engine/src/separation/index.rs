//! Where to look: the segments of many versions, by slice of time and by place.
//!
//! Within a slice they are sorted along the axis of earth-centred space on which they spread most,
//! and swept. Cells of no size to choose, no poles and no antimeridian.

use rayon::prelude::*;

use super::segment::{Bounds, Segment};

/// Segments by slice.
#[derive(Debug, Clone, Default)]
pub(super) struct Index {
    first: i64,
    slices: Vec<Slice>,
}

/// The segments of one slice, sorted along an axis.
#[derive(Debug, Clone, Default)]
pub(super) struct Slice {
    axis: usize,
    /// Bounds in the order of their low ends on the axis.
    bounds: Vec<Bounds>,
    /// The segment of each.
    segments: Vec<Segment>,
    /// Largest extent on the axis.
    widest_m: f32,
    /// Largest horizontal minimum of any.
    horizontal_m: f32,
}

impl Index {
    /// Sorts segments into slices; their order decides ties.
    pub(super) fn new(segments: &[Vec<(i64, Segment)>]) -> Self {
        let numbers = || segments.iter().flatten().map(|(slice, _)| *slice);
        let (Some(first), Some(last)) = (numbers().min(), numbers().max()) else {
            return Self::default();
        };
        let mut counts = vec![0_usize; (last - first + 1) as usize];
        for slice in numbers() {
            counts[(slice - first) as usize] += 1;
        }
        let mut sorted: Vec<Vec<Segment>> = counts.into_iter().map(Vec::with_capacity).collect();
        for (slice, segment) in segments.iter().flatten() {
            sorted[(slice - first) as usize].push(*segment);
        }
        Self { first, slices: sorted.into_par_iter().map(Slice::new).collect() }
    }

    /// The slices, in order.
    pub(super) fn slices(&self) -> &[Slice] {
        &self.slices
    }

    /// Number of the first slice.
    pub(super) fn first(&self) -> i64 {
        self.first
    }

    /// The slice of a number, if it holds anything.
    pub(super) fn slice(&self, number: i64) -> Option<&Slice> {
        usize::try_from(number - self.first).ok().and_then(|i| self.slices.get(i))
    }
}

impl Slice {
    fn new(mut segments: Vec<Segment>) -> Self {
        let axis = widest_spread(&segments);
        segments.sort_by(|a, b| {
            let (a_low, b_low) = (a.bounds.low_m[axis], b.bounds.low_m[axis]);
            a_low.total_cmp(&b_low).then(a.owner.cmp(&b.owner)).then(a.piece.cmp(&b.piece))
        });
        let bounds: Vec<_> = segments.iter().map(|s| s.bounds).collect();
        let widest_m = bounds.iter().map(|b| b.high_m[axis] - b.low_m[axis]).fold(0.0, f32::max);
        let horizontal_m = bounds.iter().map(|b| b.horizontal_m).fold(0.0, f32::max);
        Self { axis, bounds, segments, widest_m, horizontal_m }
    }

    /// Its segments.
    pub(super) fn segments(&self) -> &[Segment] {
        &self.segments
    }

    /// Every pair of its segments whose bounds meet, each once.
    pub(super) fn pairs(&self, mut visit: impl FnMut(&Segment, &Segment)) {
        let axis = self.axis;
        for (i, one) in self.bounds.iter().enumerate() {
            let until_m = one.high_m[axis] + self.horizontal_m;
            for (after, other) in self.bounds[i + 1..].iter().enumerate() {
                if other.low_m[axis] > until_m {
                    break;
                }
                if one.meets(other) {
                    visit(&self.segments[i], &self.segments[i + 1 + after]);
                }
            }
        }
    }

    /// Every segment whose bounds meet given ones.
    pub(super) fn near(&self, bounds: &Bounds, mut visit: impl FnMut(&Segment)) {
        let axis = self.axis;
        let reach_m = self.horizontal_m.max(bounds.horizontal_m);
        // Whatever begins before this ends before the bounds, too.
        let from_m = bounds.low_m[axis] - reach_m - self.widest_m - 1.0;
        let until_m = bounds.high_m[axis] + reach_m + 1.0;
        let start = self.bounds.partition_point(|b| b.low_m[axis] < from_m);
        for (other, segment) in self.bounds[start..].iter().zip(&self.segments[start..]) {
            if other.low_m[axis] > until_m {
                break;
            }
            if bounds.meets(other) {
                visit(segment);
            }
        }
    }
}

/// The axis on which the low ends have the largest variance.
fn widest_spread(segments: &[Segment]) -> usize {
    let count = segments.len().max(1) as f64;
    let variance = |axis: usize| {
        let at = |s: &Segment| f64::from(s.bounds.low_m[axis]);
        let mean = segments.iter().map(at).sum::<f64>() / count;
        segments.iter().map(|s| (at(s) - mean).powi(2)).sum::<f64>()
    };
    let variances = [variance(0), variance(1), variance(2)];
    (0..3).max_by(|&a, &b| variances[a].total_cmp(&variances[b])).unwrap_or(0)
}
