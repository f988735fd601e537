//! A filed profile: where a flight is, and at which level, at every time.

/// One point of a profile.
#[derive(Debug, Clone, PartialEq)]
pub struct Point {
    /// Time, seconds of the day.
    pub time_s: f64,
    /// Longitude, degrees, -180 to 180.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// Level, feet.
    pub level_ft: f64,
    /// Name of the place, if any.
    pub fix: Option<Box<str>>,
}

/// At least two points of strictly increasing, finite times.
///
/// Between two points the aircraft follows the geodesic at constant ground speed, its level
/// changing linearly with time. It exists from the first point to the last, both included.
#[derive(Debug, Clone, PartialEq)]
pub struct Profile {
    points: Vec<Point>,
    cruise: Option<Cruise>,
}

/// Where a profile cruises.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cruise {
    /// Index of the point at the top of climb.
    pub top_of_climb: usize,
    /// Index of the point at the top of descent.
    pub top_of_descent: usize,
}

/// Shortest run of cruise legs at one level that marks top of climb or descent, seconds.
const LONG_RUN_S: f64 = 600.0;

impl Profile {
    /// A profile of points, cruising where its level is constant at or above `cruise_floor_ft`.
    ///
    /// `None` if there are fewer than two points, a number is not finite, or a time does not
    /// exceed the one before.
    #[must_use]
    pub fn new(points: Vec<Point>, cruise_floor_ft: f64) -> Option<Self> {
        let finite = |p: &Point| {
            p.time_s.is_finite()
                && p.lon_deg.is_finite()
                && p.lat_deg.is_finite()
                && p.level_ft.is_finite()
        };
        if points.len() < 2
            || !points.iter().all(finite)
            || !points.windows(2).all(|w| w[0].time_s < w[1].time_s)
        {
            return None;
        }
        let cruise = find_cruise(&points, cruise_floor_ft);
        Some(Self { points, cruise })
    }

    /// The points, at least two.
    #[must_use]
    pub fn points(&self) -> &[Point] {
        &self.points
    }

    /// First time, seconds of the day.
    #[must_use]
    pub fn start_s(&self) -> f64 {
        self.points[0].time_s
    }

    /// Last time, seconds of the day.
    #[must_use]
    pub fn end_s(&self) -> f64 {
        self.points[self.points.len() - 1].time_s
    }

    /// Number of legs; leg `i` joins point `i` to point `i + 1`.
    #[must_use]
    pub fn leg_count(&self) -> usize {
        self.points.len() - 1
    }

    /// Where it cruises; `None` if it has no cruise leg.
    #[must_use]
    pub fn cruise(&self) -> Option<Cruise> {
        self.cruise
    }

    /// Whether leg `leg` is level, at or above the cruise floor.
    #[must_use]
    pub fn is_cruise_leg(&self, leg: usize, cruise_floor_ft: f64) -> bool {
        is_cruise(&self.points, leg, cruise_floor_ft)
    }

    /// The leg on which the flight is at a time within its life; at a point, the leg that follows
    /// (the last leg at the very end).
    #[must_use]
    pub fn leg_at(&self, time_s: f64) -> usize {
        let after = self.points.partition_point(|p| p.time_s <= time_s);
        after.saturating_sub(1).min(self.leg_count() - 1)
    }

    /// Level at a time within its life, feet; held constant outside.
    #[must_use]
    pub fn level_ft_at(&self, time_s: f64) -> f64 {
        let leg = self.leg_at(time_s);
        let (a, b) = (&self.points[leg], &self.points[leg + 1]);
        let share = ((time_s - a.time_s) / (b.time_s - a.time_s)).clamp(0.0, 1.0);
        // Exactly the filed level on level legs, whatever the rounding of `share`.
        a.level_ft + (b.level_ft - a.level_ft) * share
    }
}

fn is_cruise(points: &[Point], leg: usize, cruise_floor_ft: f64) -> bool {
    let level = points[leg].level_ft == points[leg + 1].level_ft;
    level && points[leg].level_ft >= cruise_floor_ft
}

/// Runs of cruise legs at one level; top of climb is the start of the first that lasts ten
/// minutes, top of descent the end of the last such run; of the longest run where none does.
fn find_cruise(points: &[Point], cruise_floor_ft: f64) -> Option<Cruise> {
    let mut runs: Vec<(usize, usize)> = Vec::new();
    for leg in (0..points.len() - 1).filter(|&leg| is_cruise(points, leg, cruise_floor_ft)) {
        match runs.last_mut() {
            // Consecutive cruise legs share a point, hence a level.
            Some((_, end)) if *end == leg => *end = leg + 1,
            _ => runs.push((leg, leg + 1)),
        }
    }
    let duration_s = |run: &(usize, usize)| points[run.1].time_s - points[run.0].time_s;
    let long = |run: &&(usize, usize)| duration_s(run) >= LONG_RUN_S;
    let first = runs.iter().find(long);
    let last = runs.iter().rev().find(long);
    let (first, last) = match (first, last) {
        (Some(first), Some(last)) => (*first, *last),
        _ => {
            // The first of the longest, so that ties do not depend on anything else.
            let longest =
                runs.iter().rev().max_by(|a, b| duration_s(a).total_cmp(&duration_s(b)))?;
            (*longest, *longest)
        }
    };
    Some(Cruise { top_of_climb: first.0, top_of_descent: last.1 })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn profile(levels: &[(f64, f64)]) -> Profile {
        let points = levels
            .iter()
            .map(|&(time_s, level_ft)| Point {
                time_s,
                lon_deg: time_s / 1000.0,
                lat_deg: 45.0,
                level_ft,
                fix: None,
            })
            .collect();
        Profile::new(points, 24_500.0).unwrap()
    }

    #[test]
    fn a_step_climb_has_one_top_of_climb_and_one_of_descent() {
        let p = profile(&[
            (0.0, 0.0),
            (1200.0, 33_000.0),
            (3000.0, 33_000.0),
            (3120.0, 35_000.0),
            (6000.0, 35_000.0),
            (7200.0, 0.0),
        ]);
        assert_eq!(p.cruise(), Some(Cruise { top_of_climb: 1, top_of_descent: 4 }));
    }

    #[test]
    fn short_runs_count_only_where_no_long_one_exists() {
        let short = profile(&[(0.0, 0.0), (900.0, 29_000.0), (1200.0, 29_000.0), (2000.0, 0.0)]);
        assert_eq!(short.cruise(), Some(Cruise { top_of_climb: 1, top_of_descent: 2 }));
        let mixed = profile(&[
            (0.0, 25_000.0),
            (300.0, 25_000.0),
            (600.0, 31_000.0),
            (1200.0, 31_000.0),
            (1500.0, 0.0),
        ]);
        assert_eq!(mixed.cruise(), Some(Cruise { top_of_climb: 2, top_of_descent: 3 }));
    }

    #[test]
    fn below_the_floor_nothing_is_cruise() {
        assert_eq!(profile(&[(0.0, 20_000.0), (900.0, 20_000.0)]).cruise(), None);
    }

    #[test]
    fn the_leg_at_a_point_is_the_one_that_follows() {
        let p = profile(&[(0.0, 0.0), (10.0, 0.0), (20.0, 0.0)]);
        assert_eq!([p.leg_at(0.0), p.leg_at(10.0), p.leg_at(20.0)], [0, 1, 1]);
    }
}
