//! Crossings of sectors against closed forms and plain sampling.

use super::support::*;
use crate::audit::path::Path;
use crate::audit::visits::{AsFiled, SectorMap, Visit};
use crate::audit::world::tracks;
use crate::day::{Day, DayParts, VolumeParts};
use crate::ids::SectorId;
use rand_pcg::Pcg64;
use rand_pcg::rand_core::{Rng, SeedableRng};

fn visits(parts: DayParts) -> Vec<(u32, f64, f64)> {
    let day = build(parts);
    let tracks = tracks(&day);
    let path = Path::filed(&tracks[0]);
    SectorMap::new(&day)
        .visits(&path, AsFiled::Yes)
        .into_iter()
        .map(|v: Visit| (v.sector.0, v.begin.time_s, v.end.time_s))
        .collect()
}

fn assert_visits(found: &[(u32, f64, f64)], expected: &[(u32, f64, f64)]) {
    assert_eq!(found.len(), expected.len(), "{found:?}");
    for (f, e) in found.iter().zip(expected) {
        assert!(f.0 == e.0 && (f.1 - e.1).abs() < 1e-5 && (f.2 - e.2).abs() < 1e-5, "{f:?} {e:?}");
    }
}

#[test]
fn crossings_on_the_equator_are_closed_forms() {
    // FL 245 is passed at 600 * 145/250 = 348 s up, and 105 * 2 = 210 s after minute 110 down;
    // longitude 7 at minute 60. Sector 0 is EAST, 1 is WEST.
    assert_visits(&visits(simple()), &[(0, 3600.0, 6810.0), (1, 348.0, 3600.0)]);
    // Inside a leg: longitude 4 is reached at minute 10 + 50 * 3/6 = 35.
    let mut parts = simple();
    for sector in &mut parts.sectors {
        for p in &mut sector.volumes[0].rings[0] {
            p[0] = if p[0] == 7.0 { 4.0 } else { p[0] };
        }
    }
    assert_visits(&visits(parts), &[(0, 2100.0, 6810.0), (1, 348.0, 2100.0)]);
}

#[test]
fn a_flight_that_begins_and_ends_inside_is_inside_all_its_life() {
    let mut parts = simple();
    parts.flights[0] = flight("A", &[(0.0, 1.0, 0.0, 350.0), (30.0, 5.0, 0.0, 350.0)]);
    assert_visits(&visits(parts), &[(1, 0.0, 1800.0)]);
}

#[test]
fn volumes_of_a_sector_are_one() {
    let mut parts = simple();
    let mut east = parts.sectors[0].volumes[0].clone();
    east.floor_ft = 24_500.0;
    parts.sectors[1].volumes.push(east);
    // A second volume elsewhere changes nothing.
    let ring = vec![[50.0, 0.0], [51.0, 0.0], [51.0, 1.0], [50.0, 1.0], [50.0, 0.0]];
    parts.sectors[1].volumes.push(VolumeParts {
        rings: vec![ring],
        floor_ft: 0.0,
        ceiling_ft: 60_000.0,
    });
    assert_visits(&visits(parts), &[(0, 3600.0, 6810.0), (1, 348.0, 6810.0)]);
}

#[test]
fn the_180th_meridian_is_no_border() {
    let mut parts = simple();
    parts.flights[0] = flight("A", &[(0.0, 178.0, 0.0, 350.0), (60.0, -178.0, 0.0, 350.0)]);
    let ring = |w: f64, e: f64| vec![[w, -1.0], [e, -1.0], [e, 1.0], [w, 1.0], [w, -1.0]];
    parts.sectors[0].volumes[0].rings = vec![ring(179.0, 180.0)];
    let mut beyond = parts.sectors[0].volumes[0].clone();
    beyond.rings = vec![ring(-180.0, -179.0)];
    parts.sectors[0].volumes.push(beyond);
    // Longitude 180 itself is an east edge, outside; a measure of no length.
    let found = visits(parts);
    assert!((found[0].1 - 900.0).abs() < 1e-5, "{found:?}");
    assert!((found[found.len() - 1].2 - 2700.0).abs() < 1e-5, "{found:?}");
    let inside_s: f64 = found.iter().map(|v| v.2 - v.1).sum();
    assert!((inside_s - 1800.0).abs() < 1e-3, "{found:?}");
}

fn random_day(seed: u64) -> Day {
    let mut rng = Pcg64::seed_from_u64(seed);
    let mut random = move |low: f64, high: f64| {
        low + (high - low) * (rng.next_u32() as f64 / f64::from(u32::MAX))
    };
    let mut parts = parts();
    for sector in &mut parts.sectors {
        let mut triangle: Vec<[f64; 2]> =
            (0..3).map(|_| [random(0.0, 10.0), random(40.0, 48.0)]).collect();
        triangle.push(triangle[0]);
        sector.volumes[0].rings = vec![triangle];
        sector.volumes[0].floor_ft = random(20_000.0, 33_000.0);
    }
    let mut points = Vec::new();
    let mut minutes = 0.0;
    for _ in 0..8 {
        points.push((minutes, random(0.0, 10.0), random(40.0, 48.0), random(200.0, 400.0)));
        minutes += random(60.0, 90.0);
    }
    parts.flights.push(flight("A", &points));
    build(parts)
}

#[test]
fn looks_see_what_plain_sampling_sees() {
    for seed in 0..20 {
        let day = random_day(seed);
        let tracks = tracks(&day);
        let path = Path::filed(&tracks[0]);
        let found = SectorMap::new(&day).visits(&path, AsFiled::Yes);
        let mut time_s = path.start_s() + 0.05;
        while time_s < path.end_s() {
            let state = path.state(time_s);
            let place = path.track.polyline_place(state.filed_s);
            for id in [SectorId(0), SectorId(1)] {
                let volume = &day.sectors[id].volumes[0];
                let inside = volume.polygon.contains(place.lon_deg, place.lat_deg)
                    && volume.floor_ft <= state.level_ft
                    && state.level_ft < volume.ceiling_ft;
                let seen = found
                    .iter()
                    .any(|v| v.sector == id && v.begin.time_s <= time_s && time_s < v.end.time_s);
                assert_eq!(inside, seen, "seed {seed}, sector {id:?}, {time_s} s: {found:?}");
            }
            time_s += 1.0;
        }
    }
}
