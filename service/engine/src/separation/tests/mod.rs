//! Separation against brute force, against samples of the true motion, and against values from
//! outside.

mod gas;
mod losses;
mod sampled;
mod shifts;
mod versions;

use std::sync::Arc;

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;

use super::Scene;
use crate::day::{Date, Day, DayParts, FlightParts, PointParts, Policy};
use crate::geometry::geodesic::LonLat;
use crate::ids::{FlightId, IdVec};
use crate::path::{Changed, Knot, Track};

/// Filed points as (time s, lon, lat, level ft).
pub(super) type Points = Vec<(f64, f64, f64, f64)>;

pub(super) fn flight(name: String, rvsm: bool, points: &Points) -> FlightParts {
    let points = points
        .iter()
        .map(|&(time_s, lon_deg, lat_deg, level_ft)| PointParts {
            time_s,
            lon_deg,
            lat_deg,
            level_ft,
            fix: None,
        })
        .collect();
    FlightParts { flight: name, rvsm, movable: true, points, ..FlightParts::default() }
}

/// A day of flights named by their position, so that it is also their id.
pub(super) fn day_of(flights: Vec<(bool, Points)>, policy: Policy) -> Day {
    let mut parts = DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "test");
    parts.policy = policy;
    parts.flights = flights
        .iter()
        .enumerate()
        .map(|(i, (rvsm, points))| flight(format!("F{i:05}"), *rvsm, points))
        .collect();
    Day::build(parts).unwrap().day
}

pub(super) fn tracks_of(day: &Day) -> Arc<IdVec<FlightId, Track>> {
    Arc::new(day.flights.iter().map(|f| Track::new(&f.profile)).collect())
}

pub(super) fn scene_of(day: &Day) -> Scene {
    Scene::new(day, tracks_of(day), Vec::new().into())
}

pub(super) fn random(seed: u64) -> Pcg64Mcg {
    Pcg64Mcg::seed_from_u64(seed)
}

/// Flights crowded around a place: crossing and following, level, climbing and descending through
/// the levels at which minima change, with points where nothing moves.
pub(super) fn crowd(count: usize, centre: LonLat, seed: u64) -> Vec<(bool, Points)> {
    let mut random = random(seed);
    (0..count)
        .map(|_| {
            let rvsm = random.random_bool(0.8);
            let mut place =
                step(centre, random.random_range(0.0..360.0), random.random_range(0.0..150e3));
            let towards =
                step(centre, random.random_range(0.0..360.0), random.random_range(0.0..60e3));
            let leg = crate::geometry::geodesic::GeodesicLeg::new(place, towards);
            let mut track_deg = leg.track_from_deg;
            let mut time_s = (random.random_range(0..20) * 60) as f64;
            let mut level_ft = f64::from(random.random_range(24..44)) * 1000.0;
            let mut points = vec![(time_s, place.lon_deg, place.lat_deg, level_ft)];
            for _ in 0..random.random_range(1..5) {
                let speed = random.random_range(150.0..280.0);
                let length = random.random_range(10e3..150e3);
                if random.random_bool(0.1) {
                    // A while in one place.
                    time_s += 90.0;
                } else {
                    place = step(place, track_deg, length);
                    time_s += (length / speed * 1000.0_f64).round() / 1000.0;
                }
                if random.random_bool(0.3) {
                    level_ft += f64::from(random.random_range(-3..4)) * 1000.0;
                }
                track_deg += random.random_range(-20.0..20.0);
                points.push((time_s, place.lon_deg, place.lat_deg, level_ft));
            }
            (rvsm, points)
        })
        .collect()
}

/// The place at a distance in a direction, on a sphere: near enough to scatter places.
pub(super) fn step(from: LonLat, track_deg: f64, distance_m: f64) -> LonLat {
    let (lat, track, angle) =
        (from.lat_deg.to_radians(), track_deg.to_radians(), distance_m / 6_371_008.8);
    let sin = lat.sin() * angle.cos() + lat.cos() * angle.sin() * track.cos();
    let east = track.sin() * angle.sin() * lat.cos();
    let lon = from.lon_deg + east.atan2(angle.cos() - lat.sin() * sin).to_degrees();
    LonLat { lon_deg: (lon + 540.0).rem_euclid(360.0) - 180.0, lat_deg: sin.asin().to_degrees() }
}

/// Crowds at middle latitudes, across the antimeridian and over a pole.
pub(super) const CENTRES: [LonLat; 3] = [
    LonLat { lon_deg: 11.0, lat_deg: 47.0 },
    LonLat { lon_deg: 179.9, lat_deg: -12.0 },
    LonLat { lon_deg: 30.0, lat_deg: 89.5 },
];

/// A change between two knots of a track: to another level, slower or faster, and back.
pub(super) fn change(track: &Track, between: (usize, usize), level_ft: f64, pace: f64) -> Changed {
    let filed = track.knots();
    let (leave, back) = between;
    let leave_s = filed[leave].time_s;
    let shift_s = ((filed[back].time_s - leave_s) * (pace - 1.0) * 1000.0).round() / 1000.0;
    let knots: Vec<Knot> = filed[leave + 1..=back]
        .iter()
        .enumerate()
        .map(|(i, knot)| {
            let last = leave + 1 + i == back;
            Knot {
                time_s: if last {
                    knot.time_s + shift_s
                } else {
                    leave_s + (knot.time_s - leave_s) * pace
                },
                level_ft: if last { knot.level_ft } else { level_ft },
                ..*knot
            }
        })
        .collect();
    let off_level_s = vec![(leave_s, filed[back].time_s + shift_s)];
    Changed { kept: leave + 1, knots, resume: back + 1, shift_s, off_level_s }
}
