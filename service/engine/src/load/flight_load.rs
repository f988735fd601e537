//! What one version of one flight adds to the load of the day.

use std::ops::Range;

use super::index::SectorIndex;
use super::piece::Piece;
use crate::day::{Day, Flight, Policy};
use crate::ids::{AirportId, SectorId};
use crate::path::{Knot, Path};

/// Intervals this little apart touch, and one this short is none: rounding of crossing times.
const TOUCH_S: f64 = 1e-6;
/// Level flight shorter than this does not end a climb or descent, seconds.
const LEVEL_OFF_S: f64 = 1.0;

/// A maximal interval `[in, out)` inside a sector.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Visit {
    /// The sector, open or not.
    pub sector: SectorId,
    /// Entry, seconds of the day.
    pub in_s: f64,
    /// Exit, seconds of the day.
    pub out_s: f64,
}

/// A climb or descent begun inside a sector.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LevelChange {
    /// The sector, open or not.
    pub sector: SectorId,
    /// When it begins, seconds of the day.
    pub begin_s: f64,
}

/// What one version of a flight may be counted for.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct FlightLoad {
    /// Visits by time of entry, then sector.
    pub visits: Vec<Visit>,
    /// Climbs and descents by time, then sector: one entry for each sector around their start.
    pub level_changes: Vec<LevelChange>,
    /// The counted airport where it lands, and when.
    pub arrival: Option<(AirportId, f64)>,
    /// The counted airport where it takes off, and when.
    pub departure: Option<(AirportId, f64)>,
}

impl SectorIndex {
    /// What a version of a flight may be counted for.
    #[must_use]
    pub fn flight_load(&self, path: &Path<'_>, flight: &Flight, day: &Day) -> FlightLoad {
        FlightLoad {
            visits: visits(self.inside(path), &day.policy),
            level_changes: self.level_changes(path),
            arrival: flight.arrives_at.map(|airport| (airport, path.end_s())),
            departure: flight.departs_from.map(|airport| (airport, path.start_s())),
        }
    }

    /// What a changed version may be counted for, told from what its filed one is: only the pieces
    /// that differ are cut; what comes after is only visited later.
    #[must_use]
    pub fn changed_load(
        &self,
        path: &Path<'_>,
        flight: &Flight,
        day: &Day,
        filed: &FlightLoad,
    ) -> FlightLoad {
        let policy = &day.policy;
        let Some(change) = path.change() else { return filed.clone() };
        if policy.rejoin_s > 0.0 || policy.min_visit_s > 0.0 {
            // The filed visits are no longer those of which such a policy made them.
            return self.flight_load(path, flight, day);
        }
        let first = path.first_changed();
        let from_s = path.knot(first).time_s;
        let mut found = Vec::with_capacity(filed.visits.len() + 16);
        found.extend(
            filed
                .visits
                .iter()
                .filter(|visit| visit.in_s < from_s)
                .map(|visit| Visit { out_s: visit.out_s.min(from_s), ..*visit }),
        );
        let resumed = (change.kept + change.knots.len()).min(path.len() - 1);
        self.push_inside(path, first..resumed, &mut found);
        if let Some(knot) = path.track().knots().get(change.resume) {
            let until_s = knot.time_s;
            let after = filed.visits.iter().filter(|visit| visit.out_s > until_s);
            found.extend(after.map(|visit| Visit {
                in_s: visit.in_s.max(until_s) + change.shift_s,
                out_s: visit.out_s + change.shift_s,
                ..*visit
            }));
        }
        FlightLoad {
            visits: visits(maximal(found), policy),
            level_changes: self.level_changes(path),
            arrival: flight.arrives_at.map(|airport| (airport, path.end_s())),
            departure: filed.departure,
        }
    }

    /// When a path is inside which sector, open or not: maximal intervals by sector, then time,
    /// before any policy on short visits.
    #[must_use]
    pub fn inside(&self, path: &Path<'_>) -> Vec<Visit> {
        let mut found = Vec::with_capacity(path.len() + 8);
        self.push_inside(path, 0..path.len() - 1, &mut found);
        maximal(found)
    }

    /// When some pieces of a path are inside which sector.
    fn push_inside(&self, path: &Path<'_>, pieces: Range<usize>, found: &mut Vec<Visit>) {
        let (mut near, mut cuts) = (Vec::new(), Vec::new());
        let mut from = path.knot(pieces.start);
        for until in path.knots_from(pieces.start + 1).take(pieces.len()) {
            let piece = Piece::new(&from, &until);
            for piece in [Some(piece), piece.turned()].into_iter().flatten() {
                for ((sector, volume), cover) in self.near(&piece, &mut near) {
                    piece.inside(volume, cover, &mut cuts, |in_s, out_s| {
                        found.push(Visit { sector: *sector, in_s, out_s });
                    });
                }
            }
            from = until;
        }
    }

    fn level_changes(&self, path: &Path<'_>) -> Vec<LevelChange> {
        let mut changes = Vec::new();
        for start in climb_and_descent_starts(path) {
            let sectors = self.sectors_at(start.lon_deg, start.lat_deg, start.level_ft);
            changes.extend(
                sectors.into_iter().map(|sector| LevelChange { sector, begin_s: start.time_s }),
            );
        }
        changes
    }
}

/// Maximal intervals by sector, then time.
fn maximal(mut found: Vec<Visit>) -> Vec<Visit> {
    found.sort_unstable_by(by_sector);
    join(&mut found, |gap_s| gap_s <= TOUCH_S);
    found.retain(|visit| visit.out_s - visit.in_s > TOUCH_S);
    found
}

fn by_sector(a: &Visit, b: &Visit) -> std::cmp::Ordering {
    a.sector.cmp(&b.sector).then(a.in_s.total_cmp(&b.in_s)).then(a.out_s.total_cmp(&b.out_s))
}

/// Joins intervals of one sector, sorted by it and time, whose gap is small enough.
fn join(visits: &mut Vec<Visit>, is_small: impl Fn(f64) -> bool) {
    visits.dedup_by(|next, kept| {
        let one = next.sector == kept.sector && is_small(next.in_s - kept.out_s);
        if one {
            kept.out_s = kept.out_s.max(next.out_s);
        }
        one
    });
}

/// Visits by time: intervals less than `rejoin_s` apart count as one, then those shorter than
/// `min_visit_s` are dropped.
fn visits(mut inside: Vec<Visit>, policy: &Policy) -> Vec<Visit> {
    join(&mut inside, |gap_s| gap_s < policy.rejoin_s);
    inside.retain(|visit| visit.out_s - visit.in_s >= policy.min_visit_s);
    inside.sort_unstable_by(|a, b| a.in_s.total_cmp(&b.in_s).then(a.sector.cmp(&b.sector)));
    inside.shrink_to_fit();
    inside
}

/// Where each maximal climb or descent begins.
fn climb_and_descent_starts(path: &Path<'_>) -> Vec<Knot> {
    let mut starts = Vec::new();
    // The direction of the climb or descent under way, and for how long it has been level.
    let (mut rising, mut level_s) = (0.0, 0.0);
    let mut knots = path.knots_from(0);
    let Some(mut from) = knots.next() else { return starts };
    for until in knots {
        let step_ft = until.level_ft - from.level_ft;
        if step_ft == 0.0 {
            level_s += until.time_s - from.time_s;
        } else {
            if rising != step_ft.signum() || level_s >= LEVEL_OFF_S {
                starts.push(from);
            }
            (rising, level_s) = (step_ft.signum(), 0.0);
        }
        from = until;
    }
    starts
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::day::{Point, Profile};
    use crate::path::Track;

    fn visit(in_s: f64, out_s: f64) -> Visit {
        Visit { sector: SectorId(0), in_s, out_s }
    }

    #[test]
    fn visits_are_rejoined_first_and_dropped_after() {
        let policy = Policy { rejoin_s: 30.0, min_visit_s: 60.0, ..Policy::default() };
        let inside =
            vec![visit(0.0, 40.0), visit(69.0, 90.0), visit(120.0, 179.0), visit(300.0, 360.0)];
        // 29 s apart are rejoined, 30 s are not; 59 s are too short, 60 s are not.
        assert_eq!(visits(inside, &policy), [visit(0.0, 90.0), visit(300.0, 360.0)]);
    }

    #[test]
    fn without_such_a_policy_only_maximal_intervals_matter() {
        let inside = vec![visit(0.0, 0.5), visit(0.6, 1.0)];
        assert_eq!(visits(inside.clone(), &Policy::default()), inside);
    }

    /// When climbs and descents begin along levels given as (time, level).
    fn starts_s(levels: &[(f64, f64)]) -> Vec<f64> {
        let points = levels
            .iter()
            .map(|&(time_s, level_ft)| Point {
                time_s,
                lon_deg: time_s / 1e5,
                lat_deg: 45.0,
                level_ft,
                fix: None,
            })
            .collect();
        let track = Track::new(&Profile::new(points, 24_500.0).unwrap());
        let starts = climb_and_descent_starts(&Path::filed(&track));
        starts.iter().map(|knot| knot.time_s).collect()
    }

    #[test]
    fn a_climb_goes_on_over_less_than_a_second_of_level_flight() {
        let climb = [(0.0, 0.0), (60.0, 1000.0), (60.9, 1000.0), (120.0, 2000.0)];
        assert_eq!(starts_s(&climb), [0.0]);
        let steps = [(0.0, 0.0), (60.0, 1000.0), (61.0, 1000.0), (120.0, 2000.0)];
        assert_eq!(starts_s(&steps), [0.0, 61.0]);
    }

    #[test]
    fn a_descent_after_a_climb_is_another_change() {
        let levels = [(0.0, 0.0), (60.0, 1000.0), (60.5, 1000.0), (120.0, 0.0), (130.0, 0.0)];
        assert_eq!(starts_s(&levels), [0.0, 60.5]);
        assert_eq!(starts_s(&[(0.0, 1000.0), (60.0, 1000.0)]), [] as [f64; 0]);
    }
}
