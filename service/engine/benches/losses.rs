//! How long does it take to find every loss of separation of a large day, those of one changed
//! flight, and the changed versions that exclude each other?
//!
//! The day is invented and seeded: 17 000 flights between 229 airports of a region 57 by 22 degrees
//! wide, a few airports with most of the traffic, great circles, semicircular levels, climbs and
//! descents of 20 minutes. Without a day's real routes it crowds hubs more and airways less.

#![expect(clippy::print_stdout, reason = "a bench tells what it measures")]

use std::hint::black_box;
use std::sync::Arc;

use criterion::{Criterion, criterion_group, criterion_main};
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;
use rayon::prelude::*;
use rimeshift_engine::change::change_levels;
use rimeshift_engine::day::{Date, Day, DayParts, FlightParts, PointParts, Stretch};
use rimeshift_engine::geometry::geodesic::{GeodesicLeg, LonLat};
use rimeshift_engine::ids::{FlightId, IdVec};
use rimeshift_engine::path::{Changed, Path, Track};
use rimeshift_engine::separation::{
    Scene, Version, clashes, expected_new_losses, filed_losses, new_losses_against_filed, survivors,
};

const FLIGHTS: usize = 17_000;

fn flight(index: usize, airports: &[LonLat], random: &mut Pcg64Mcg) -> FlightParts {
    // The square favours airports at the start of the list.
    let mut airport = || {
        let share: f64 = random.random_range(0.0..1.0);
        airports[(share * share * airports.len() as f64) as usize]
    };
    let (from, to) = (airport(), airport());
    let leg = GeodesicLeg::new(from, to);
    let cruise_mps = random.random_range(215.0..240.0);
    let start_s = f64::from(random.random_range(5 * 3600..23 * 3600));
    let level = f64::from(random.random_range(0..6)) * 2000.0;
    let level_ft = if leg.track_from_deg < 180.0 { 29_000.0 + level } else { 30_000.0 + level };
    // Twenty minutes each to climb and to descend, at three quarters of the cruise speed.
    let slope_s = 1200.0_f64;
    let slope_m = (slope_s * cruise_mps * 0.75).min(leg.length_m / 2.0);
    let slope_s = (slope_m / (cruise_mps * 0.75)).max(60.0);
    let mut points = Vec::new();
    let mut push = |time_s: f64, share: f64, level_ft: f64| {
        let place = leg.at(share);
        points.push(PointParts {
            time_s: (time_s * 1000.0).round() / 1000.0,
            lon_deg: place.lon_deg,
            lat_deg: place.lat_deg,
            level_ft,
            fix: None,
        });
    };
    let slope_share = if leg.length_m > 0.0 { slope_m / leg.length_m } else { 0.5 };
    let top_ft = level_ft.min(slope_s * 30.0);
    let cruise_s = ((leg.length_m - 2.0 * slope_m) / cruise_mps).max(60.0);
    push(start_s, 0.0, 0.0);
    push(start_s + slope_s, slope_share, top_ft);
    push(start_s + slope_s + cruise_s, 1.0 - slope_share, top_ft);
    push(start_s + 2.0 * slope_s + cruise_s, 1.0, 0.0);
    FlightParts {
        flight: format!("F{index:05}"),
        rvsm: true,
        movable: true,
        points,
        ..FlightParts::default()
    }
}

fn day() -> Day {
    let mut random = Pcg64Mcg::seed_from_u64(2031);
    let airports: Vec<LonLat> = (0..229)
        .map(|_| LonLat {
            lon_deg: random.random_range(-125.0..-68.0),
            lat_deg: random.random_range(26.0..48.0),
        })
        .collect();
    let mut parts = DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "bench");
    parts.flights = (0..FLIGHTS).map(|i| flight(i, &airports, &mut random)).collect();
    Day::build(parts)
        .map(|built| built.day)
        .unwrap_or_else(|defects| unreachable!("the invented day is sound: {:?}", defects.first()))
}

/// Up to three versions of each of the first flights that can be changed: two levels up or down
/// over a part of the cruise.
fn changes(day: &Day, tracks: &IdVec<FlightId, Track>, flights: usize) -> Vec<(FlightId, Changed)> {
    let valid: Vec<Vec<(FlightId, Changed)>> = (0..tracks.len())
        .into_par_iter()
        .map(|i| {
            let id = FlightId(i as u32);
            let flight = &day.flights[id];
            let Some(cruise) = flight.profile.cruise() else { return Vec::new() };
            let [from_s, until_s] = [cruise.top_of_climb, cruise.top_of_descent]
                .map(|point| flight.profile.points()[point].time_s);
            let (lasts_s, filed_ft) = (until_s - from_s, flight.profile.level_ft_at(from_s));
            [(-2000.0, 0.1, 0.6), (2000.0, 0.2, 0.7), (-4000.0, 0.3, 0.8)]
                .into_iter()
                .filter_map(|(by_ft, a, b)| {
                    let stretch = Stretch {
                        level_ft: filed_ft + by_ft,
                        from_s: Some(from_s + a * lasts_s),
                        until_s: Some(from_s + b * lasts_s),
                    };
                    let change = change_levels(day, flight, &tracks[id], &[stretch]).ok()?;
                    Some((id, change.changed))
                })
                .collect()
        })
        .collect();
    valid.into_iter().filter(|v| !v.is_empty()).take(flights).flatten().collect()
}

fn losses(c: &mut Criterion) {
    let day = day();
    let tracks: Arc<IdVec<FlightId, Track>> = Arc::new(
        day.flights
            .as_slice()
            .par_iter()
            .map(|f| Track::new(&f.profile))
            .collect::<Vec<_>>()
            .into(),
    );
    let pieces: usize = tracks.iter().map(|t| t.knots().len() - 1).sum();
    let scene = Scene::new(&day, Arc::clone(&tracks), Vec::new().into());
    println!("{FLIGHTS} flights, {pieces} pieces, {} losses", scene.losses().len());
    let count = survivors(&scene);
    let share = |n: u64| n as f64 / count.pairs as f64;
    println!(
        "{count:?}: boxes meet {:.2e}, motions meet {:.2e}, lose {:.2e} of the pairs in a slice",
        share(count.boxes_meet),
        share(count.motions_meet),
        share(count.lose)
    );
    let mut group = c.benchmark_group("losses");
    group.sample_size(10);
    group.bench_function("index and filed losses", |b| {
        b.iter(|| Scene::new(&day, Arc::clone(&tracks), Vec::new().into()));
    });
    group.bench_function("filed losses", |b| b.iter(|| filed_losses(black_box(&scene))));

    let changes = changes(&day, &tracks, 8000);
    let versions: Vec<Version<'_>> = changes
        .iter()
        .map(|(flight, changed)| Version {
            flight: *flight,
            path: Path::changed(&tracks[*flight], changed),
            minima: &[],
        })
        .collect();
    println!("{} versions, {} clashes", versions.len(), clashes(&scene, &versions).len());
    group.bench_function("clashes", |b| b.iter(|| clashes(&scene, black_box(&versions))));
    let mut next = versions.iter().cycle();
    group.bench_function("new losses of one version", |b| {
        b.iter(|| next.next().map(|version| new_losses_against_filed(&scene, version)));
    });
    // One version each of a thousand flights, spread over the day.
    let mut moved: Vec<Version<'_>> = versions.clone();
    moved.dedup_by_key(|version| version.flight);
    let step = (moved.len() / 1000).max(1);
    let moved: Vec<Version<'_>> = moved.into_iter().step_by(step).take(1000).collect();
    println!("{} moved: {} expected new losses", moved.len(), expected_new_losses(&scene, &moved));
    group.bench_function("expected new losses", |b| {
        b.iter(|| expected_new_losses(&scene, black_box(&moved)));
    });
    group.finish();
}

criterion_group!(benches, losses);
criterion_main!(benches);
