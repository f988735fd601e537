//! Whether written profiles are the derived ones, both ways: every written point lies on the
//! derived profile, and every derived point on the written one.

use std::collections::BTreeMap;

use super::path::Path;
use super::report::{Finding, WrittenFault};
use super::tolerances::{LEVEL_FT, PLACE_M, TIME_S};
use super::track::geodesic_distance_m;
use super::world::World;
use crate::answer::{MovedProfile, ProfilePoint};
use crate::geometry::geodesic::{GeodesicLeg, LonLat};
use crate::ids::FlightId;

/// Compares all written profiles; gives the number of points compared.
pub(super) fn judge_written(
    world: &World<'_>,
    written: &[MovedProfile],
    findings: &mut Vec<Finding>,
) -> u64 {
    let mut by_flight: BTreeMap<FlightId, &MovedProfile> = BTreeMap::new();
    let mut points = 0;
    for profile in written {
        let is_twice = by_flight.insert(profile.flight, profile).is_some();
        if is_twice || !world.grants.contains_key(&profile.flight) {
            findings.push(Finding::WrittenUnexpected { flight: profile.flight });
        }
    }
    for &flight in world.grants.keys() {
        match (by_flight.get(&flight), world.planned.get(&flight)) {
            (None, _) => findings.push(Finding::WrittenMissing { flight }),
            (Some(profile), Some(flown)) => {
                points += profile.points.len() as u64;
                findings.extend(compare(flight, &profile.points, &flown.path));
            }
            // Its grants make no profile, which is a finding of its own.
            (Some(_), None) => {}
        }
    }
    points
}

fn place_of(point: &ProfilePoint) -> LonLat {
    LonLat { lon_deg: point.lon_deg, lat_deg: point.lat_deg }
}

/// The worst place of each kind of fault.
#[derive(Default)]
struct Worst {
    by: BTreeMap<WrittenFault, (f64, f64)>,
}

impl Worst {
    fn see(&mut self, fault: WrittenFault, time_s: f64, off: f64, allowed: f64) {
        // Not-a-number is a fault, too.
        if off <= allowed {
            return;
        }
        let worst = self.by.entry(fault).or_insert((time_s, off));
        if off > worst.1 {
            *worst = (time_s, off);
        }
    }
}

fn compare(flight: FlightId, points: &[ProfilePoint], path: &Path<'_>) -> Vec<Finding> {
    let mut worst = Worst::default();
    let ([first, .., last], true) = (points, points.len() >= 2) else {
        worst.by.insert(WrittenFault::TooFewPoints, (path.start_s(), points.len() as f64));
        return found(flight, worst);
    };
    for ends in points.windows(2) {
        let step_s = ends[1].time_s - ends[0].time_s;
        if step_s <= 0.0 || step_s.is_nan() {
            worst.by.entry(WrittenFault::TimeOrder).or_insert((ends[1].time_s, step_s));
        }
    }
    for (time_s, end_s) in [(first.time_s, path.start_s()), (last.time_s, path.end_s())] {
        worst.see(WrittenFault::Ends, time_s, (time_s - end_s).abs(), TIME_S);
    }
    // A geodesic to nowhere is not to be trusted to be long.
    let is_somewhere = |p: &ProfilePoint| p.lon_deg.abs() <= 360.0 && p.lat_deg.abs() <= 90.0;
    if let Some(point) = points.iter().find(|p| !is_somewhere(p)) {
        worst.see(WrittenFault::Place, point.time_s, f64::INFINITY, 0.0);
    }
    if !worst.by.is_empty() {
        return found(flight, worst);
    }
    let place_allowed_m = PLACE_M + path.fastest_mps() * TIME_S;
    for point in points {
        let time_s = point.time_s.clamp(path.start_s(), path.end_s());
        let state = path.state(time_s);
        let off_m = geodesic_distance_m(path.geodesic_place(time_s), place_of(point));
        worst.see(WrittenFault::Place, time_s, off_m, place_allowed_m);
        let level_allowed_ft = LEVEL_FT + state.rate_ftps.abs() * TIME_S;
        let off_ft = (state.level_ft - point.level_ft).abs();
        // At the corner of a transition the slope before it counts as well.
        let before = path.state((time_s - TIME_S).max(path.start_s()));
        let corner_ft = before.rate_ftps.abs() * TIME_S;
        worst.see(WrittenFault::Level, time_s, off_ft, level_allowed_ft + corner_ft);
    }
    for knot in path.knots() {
        let after = points.partition_point(|p| p.time_s <= knot.time_s);
        let i = after.saturating_sub(1).min(points.len() - 2);
        let (a, b) = (&points[i], &points[i + 1]);
        let duration_s = b.time_s - a.time_s;
        let share = ((knot.time_s - a.time_s) / duration_s).clamp(0.0, 1.0);
        let place = GeodesicLeg::new(place_of(a), place_of(b)).at(share);
        let off_m = geodesic_distance_m(path.track.geodesic_place(knot.filed_s), place);
        worst.see(WrittenFault::Place, knot.time_s, off_m, place_allowed_m);
        let level_ft = a.level_ft + (b.level_ft - a.level_ft) * share;
        let slope_ftps = ((b.level_ft - a.level_ft) / duration_s).abs();
        let off_ft = (level_ft - knot.level_ft).abs();
        worst.see(WrittenFault::Level, knot.time_s, off_ft, LEVEL_FT + 2.0 * slope_ftps * TIME_S);
    }
    found(flight, worst)
}

fn found(flight: FlightId, worst: Worst) -> Vec<Finding> {
    worst
        .by
        .into_iter()
        .map(|(fault, (time_s, off))| Finding::WrittenOff { flight, fault, time_s, off })
        .collect()
}
