//! By how much may one straight leg be shifted in time against another before, or after, they lose
//! separation?
//!
//! Flight `a` is at its place of time `t`, flight `b`, later by `t - s`, at its own place of time
//! `s`. Over the plane of (t, s) the square of their distance is a quadratic form, so the pairs that
//! are too close form an ellipse, or a strip where the tracks are parallel or one flight stands
//! still. The times of the two legs form a rectangle, levels too close to each other a strip. All
//! are convex, so the shifts t - s of their intersection form one interval. Its ends lie at the
//! ellipse's own extremes, where these are inside, or on an edge of the polygon.

use super::leg::Leg;
use crate::geometry::motion::{below_zero, dot, minus};

/// Tracks whose directions differ by less than a millionth of a radian count as parallel, which
/// moves places by 2 cm over 10 NM.
const PARALLEL: f64 = 1e-12;

/// A point of the plane: seconds since the start of each leg.
type Moment = [f64; 2];

/// The shifts of `b`, in seconds later, at which the legs come closer than a chord and a vertical
/// limit; `None` where there are none.
pub(super) fn shifts(a: &Leg, b: &Leg, limit_m: f64, limit_ft: f64) -> Option<(f64, f64)> {
    let ((a_low, a_high), (b_low, b_high)) = (a.level_range_ft(), b.level_range_ft());
    if a_low - b_high >= limit_ft || b_low - a_high >= limit_ft {
        return None;
    }
    let apart = Apart {
        offset_m: minus(a.place_m, b.place_m),
        a_mps: a.velocity_mps,
        b_mps: b.velocity_mps,
    };
    let (last_t, last_s) = (a.lasts_s(), b.lasts_s());
    // Far apart even from the middle of one leg to the middle of the other.
    let middle = apart.at([last_t / 2.0, last_s / 2.0]);
    let length = |mps: [f64; 3], duration_s: f64| dot(mps, mps).sqrt() * duration_s;
    let reach_m = limit_m + (length(a.velocity_mps, last_t) + length(b.velocity_mps, last_s)) / 2.0;
    if dot(middle, middle) >= reach_m * reach_m {
        return None;
    }
    let mut polygon = Polygon::rectangle(last_t, last_s);
    if a.climb_ftps != 0.0 || b.climb_ftps != 0.0 {
        let level = |m: Moment, sign: f64| {
            let apart_ft = a.level_ft + a.climb_ftps * m[0] - b.level_ft - b.climb_ftps * m[1];
            limit_ft - sign * apart_ft
        };
        polygon.keep(|m| level(m, 1.0));
        polygon.keep(|m| level(m, -1.0));
    }
    let mut range = (f64::INFINITY, f64::NEG_INFINITY);
    let mut reach = |m: Moment| {
        let shift_s = m[0] - m[1];
        range = (range.0.min(shift_s), range.1.max(shift_s));
    };
    for (from, until) in polygon.edges() {
        let Some((low, high)) = apart.closer_on_edge(from, until, limit_m) else { continue };
        let along =
            |u: f64| -> Moment { std::array::from_fn(|k| from[k] + (until[k] - from[k]) * u) };
        reach(along(low));
        reach(along(high));
    }
    for extreme in apart.extremes(limit_m).into_iter().flatten() {
        if polygon.contains(extreme) {
            reach(extreme);
        }
    }
    let offset_s = a.from_s - b.from_s;
    (range.0 < range.1).then_some((range.0 + offset_s, range.1 + offset_s))
}

/// The difference between two places, as a function of the moment on each leg.
struct Apart {
    offset_m: [f64; 3],
    a_mps: [f64; 3],
    b_mps: [f64; 3],
}

impl Apart {
    fn at(&self, m: Moment) -> [f64; 3] {
        std::array::from_fn(|k| self.offset_m[k] + self.a_mps[k] * m[0] - self.b_mps[k] * m[1])
    }

    /// The part of an edge, as shares of it, on which they are closer than a limit.
    fn closer_on_edge(&self, from: Moment, until: Moment, limit_m: f64) -> Option<(f64, f64)> {
        let (start, end) = (self.at(from), self.at(until));
        let change = minus(end, start);
        let c = dot(start, start) - limit_m * limit_m;
        let (low, high) = below_zero(dot(change, change), dot(change, start), c)?;
        let (low, high) = (low.max(0.0), high.min(1.0));
        (low <= high).then_some((low, high))
    }

    /// Where the ellipse of moments closer than a limit has its smallest and largest shift.
    fn extremes(&self, limit_m: f64) -> Option<[Moment; 2]> {
        let (aa, ab, bb) =
            (dot(self.a_mps, self.a_mps), dot(self.a_mps, self.b_mps), dot(self.b_mps, self.b_mps));
        let determinant = aa * bb - ab * ab;
        if determinant <= PARALLEL * aa * bb {
            return None;
        }
        let (e, f) = (dot(self.a_mps, self.offset_m), dot(self.b_mps, self.offset_m));
        let centre = [(f * ab - e * bb) / determinant, (f * aa - e * ab) / determinant];
        let nearest = self.at(centre);
        let room = limit_m * limit_m - dot(nearest, nearest);
        let relative = aa - 2.0 * ab + bb;
        if room <= 0.0 || relative <= 0.0 {
            return None;
        }
        // Where the gradient of the form is along (1, -1): the inverse of its matrix times that.
        let scale = (room / (relative * determinant)).sqrt();
        let step = [(bb - ab) * scale, (ab - aa) * scale];
        Some([1.0, -1.0].map(|sign| [centre[0] + sign * step[0], centre[1] + sign * step[1]]))
    }
}

/// A convex polygon of at most eight corners.
struct Polygon {
    corners: [Moment; 8],
    count: usize,
}

impl Polygon {
    fn rectangle(last_t: f64, last_s: f64) -> Self {
        let mut corners = [[0.0; 2]; 8];
        corners[1] = [last_t, 0.0];
        corners[2] = [last_t, last_s];
        corners[3] = [0.0, last_s];
        Self { corners, count: 4 }
    }

    /// Cuts away where a linear function is negative. Each cut of a convex polygon adds a corner
    /// at most, and there are two.
    fn keep(&mut self, value: impl Fn(Moment) -> f64) {
        let before = Self { corners: self.corners, count: self.count };
        self.count = 0;
        for (from, until) in before.edges() {
            let (v, w) = (value(from), value(until));
            if v >= 0.0 {
                self.push(from);
            }
            if (v > 0.0 && w < 0.0) || (v < 0.0 && w > 0.0) {
                let share = v / (v - w);
                self.push(std::array::from_fn(|k| from[k] + (until[k] - from[k]) * share));
            }
        }
    }

    fn push(&mut self, corner: Moment) {
        if let Some(free) = self.corners.get_mut(self.count) {
            *free = corner;
            self.count += 1;
        }
    }

    fn edges(&self) -> impl Iterator<Item = (Moment, Moment)> + use<'_> {
        (0..self.count).map(|i| (self.corners[i], self.corners[(i + 1) % self.count]))
    }

    /// Whether a moment is inside; the corners run with the inside on the left.
    fn contains(&self, m: Moment) -> bool {
        self.count > 0
            && self
                .edges()
                .all(|(p, q)| (q[0] - p[0]) * (m[1] - p[1]) - (q[1] - p[1]) * (m[0] - p[0]) >= 0.0)
    }
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    fn leg(
        from_s: f64,
        duration_s: f64,
        place: [f64; 2],
        velocity: [f64; 2],
        level: [f64; 2],
    ) -> Leg {
        Leg {
            owner: 0,
            piece: 0,
            from_s,
            until_s: from_s + duration_s,
            place_m: [place[0], place[1], 0.0],
            velocity_mps: [velocity[0], velocity[1], 0.0],
            level_ft: level[0],
            climb_ftps: (level[1] - level[0]) / duration_s,
            chord_m: 9260.0,
            stray_m: 0.0,
            rvsm: true,
        }
    }

    fn near(range: Option<(f64, f64)>, low: f64, high: f64) {
        let (l, h) = range.unwrap();
        assert!((l - low).abs() < 1e-6 && (h - high).abs() < 1e-6, "{l} {h}, not {low} {high}");
    }

    #[test]
    fn crossing_at_right_angles() {
        // Equal speeds v at right angles through one point: the distance is least when both are
        // v |shift| / 2 from it, v |shift| / sqrt(2).
        let a = leg(0.0, 400.0, [-40_000.0, 0.0], [200.0, 0.0], [35e3, 35e3]);
        let b = leg(0.0, 400.0, [0.0, -40_000.0], [0.0, 200.0], [35e3, 35e3]);
        let expected = 9260.0 * 2.0_f64.sqrt() / 200.0;
        near(shifts(&a, &b, 9260.0, 1000.0), -expected, expected);
        assert_eq!(shifts(&a, &Leg { level_ft: 36e3, ..b }, 9260.0, 1000.0), None);
    }

    #[test]
    fn one_behind_the_other() {
        let a = leg(0.0, 400.0, [0.0, 0.0], [200.0, 0.0], [35e3, 35e3]);
        near(
            shifts(&a, &leg(90.0, 400.0, [0.0, 0.0], [200.0, 0.0], [35e3, 35e3]), 9260.0, 1000.0),
            -90.0 - 46.3,
            -90.0 + 46.3,
        );
        // Beside each other by 5556 m: 7408 m are left along the track.
        near(
            shifts(&a, &leg(0.0, 400.0, [0.0, 5556.0], [200.0, 0.0], [35e3, 35e3]), 9260.0, 1000.0),
            -37.04,
            37.04,
        );
    }

    #[test]
    fn a_flight_that_stands_still() {
        let a = leg(0.0, 100.0, [0.0, 0.0], [0.0, 0.0], [35e3, 35e3]);
        let b = leg(1000.0, 400.0, [-40_000.0, 0.0], [200.0, 0.0], [35e3, 35e3]);
        // b is within 9260 m of a between 153.7 and 246.3 s after its start.
        near(shifts(&a, &b, 9260.0, 1000.0), -1246.3, 100.0 - 1153.7);
        near(shifts(&a, &a, 9260.0, 1000.0), -100.0, 100.0);
    }

    #[test]
    fn levels_that_only_touch_the_minimum_are_separated() {
        let a = leg(0.0, 400.0, [0.0, 0.0], [200.0, 0.0], [35e3, 35e3]);
        let climbs = leg(0.0, 400.0, [0.0, 0.0], [200.0, 0.0], [33e3, 34e3]);
        assert_eq!(shifts(&a, &climbs, 9260.0, 1000.0), None);
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 2000, failure_persistence: None, ..ProptestConfig::default() })]

        /// The interval against a grid of moments.
        #[test]
        fn agrees_with_a_grid_of_moments(
            places in prop::array::uniform4(-12_000.0..12_000.0f64),
            angle in prop_oneof![Just(0.0), Just(1e-7), Just(1e-3), -3.2..3.2f64],
            speeds in prop::array::uniform2(prop_oneof![Just(0.0), Just(220.0), 150.0..280.0f64]),
            levels in prop::array::uniform4(prop_oneof![Just(35e3), 33e3..37e3f64]),
        ) {
            let a = leg(100.0, 80.0, [places[0], places[1]], [speeds[0], 0.0], [levels[0], levels[1]]);
            let velocity = [speeds[1] * f64::cos(angle), speeds[1] * f64::sin(angle)];
            let b = leg(40.0, 60.0, [places[2], places[3]], velocity, [levels[2], levels[3]]);
            let found = shifts(&a, &b, 9260.0, 1000.0);
            let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
            let apart = Apart { offset_m: minus(a.place_m, b.place_m), a_mps: a.velocity_mps, b_mps: b.velocity_mps };
            for i in 0..=160 {
                for j in 0..=120 {
                    let m = [f64::from(i) * 0.5, f64::from(j) * 0.5];
                    let d = apart.at(m);
                    let apart_ft = a.level_ft + a.climb_ftps * m[0] - b.level_ft - b.climb_ftps * m[1];
                    if dot(d, d) < 9260.0 * 9260.0 && apart_ft.abs() < 1000.0 {
                        low = low.min(60.0 + m[0] - m[1]);
                        high = high.max(60.0 + m[0] - m[1]);
                    }
                }
            }
            // Everything on the grid is in the interval, and where the grid finds anything, the
            // interval ends within a cell or so of it, unless the corner is too sharp for the grid.
            if low <= high {
                let (l, h) = found.unwrap();
                prop_assert!(l <= low + 1e-6 && high <= h + 1e-6, "{l} {h} misses {low} {high}");
                prop_assert!(low - l < 12.0 && h - high < 12.0, "{l} {h} far from {low} {high}");
            }
        }
    }
}
