//! How long counting takes: 17 000 flights of about 700 NM over 450 sectors in three layers.

#![expect(clippy::expect_used, clippy::print_stdout, reason = "a bench tells what it does")]

use std::hint::black_box;
use std::sync::Arc;

use criterion::{Criterion, criterion_group, criterion_main};
use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;
use rayon::prelude::*;
use rimeshift_engine::day::{
    CapacityParts, Date, Day, DayParts, FlightParts, PointParts, SectorParts, VolumeParts,
};
use rimeshift_engine::load::{DayLoads, FlightLoad, PlannedLoads, SectorIndex, Which};
use rimeshift_engine::path::{Path, Track};

const FLIGHTS: usize = 17_000;
const WEST_DEG: f64 = -5.0;
const SOUTH_DEG: f64 = 40.0;
const SIDE_DEG: f64 = 2.0;
const COLUMNS: usize = 15;
const ROWS: usize = 10;
const LAYERS_FT: [(f64, f64); 3] = [(0.0, 24_500.0), (24_500.0, 34_500.0), (34_500.0, 66_000.0)];
/// Corners on each side of a sector.
const CORNERS: usize = 10;

fn day() -> Day {
    let mut parts = DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "bench");
    for row in 0..ROWS {
        for column in 0..COLUMNS {
            for (layer, &(floor_ft, ceiling_ft)) in LAYERS_FT.iter().enumerate() {
                let sector = format!("{row:02}{column:02}{layer}");
                for hour in 0..24_u32 {
                    parts.capacities.push(CapacityParts {
                        sector: sector.clone(),
                        from_s: f64::from(hour) * 3600.0,
                        until_s: f64::from(hour + 1) * 3600.0,
                        entries_per_hour: Some(f64::from(40 + hour % 5)),
                        occupancy_limit: Some(16.0),
                        occupancy_lasting: Some(12.0),
                        level_changes_per_hour: None,
                    });
                }
                let volumes =
                    vec![VolumeParts { rings: vec![ring(column, row)], floor_ft, ceiling_ft }];
                parts.sectors.push(SectorParts { sector, volumes, ..SectorParts::default() });
            }
        }
    }
    let mut random = Pcg64::seed_from_u64(7);
    parts.flights = (0..FLIGHTS).map(|i| flight(i, &mut random)).collect();
    Day::build(parts).expect("a sound day").day
}

/// A square whose sides wobble by their place, so that neighbours share them.
fn ring(column: usize, row: usize) -> Vec<[f64; 2]> {
    let step = SIDE_DEG / CORNERS as f64;
    let (c, r) = (column * CORNERS, row * CORNERS);
    let south = (0..CORNERS).map(|i| (c + i, r));
    let east = (0..CORNERS).map(|i| (c + CORNERS, r + i));
    let north = (0..CORNERS).map(|i| (c + CORNERS - i, r + CORNERS));
    let west = (0..CORNERS).map(|i| (c, r + CORNERS - i));
    let corners = south.chain(east).chain(north).chain(west).chain([(c, r)]);
    corners
        .map(|(x, y)| {
            let (x, y) = (x as f64, y as f64);
            let wobble = 0.3 * step * (1.7 * x + 2.9 * y).sin();
            [WEST_DEG + step * x + wobble, SOUTH_DEG + step * y - wobble]
        })
        .collect()
}

fn flight(i: usize, random: &mut Pcg64) -> FlightParts {
    let (from_lon, from_lat) = (random.random_range(-3.0..23.0), random.random_range(41.0..59.0));
    let track: f64 = random.random_range(0.0..std::f64::consts::TAU);
    let start_s: f64 = random.random_range(0.0..80_000.0);
    let level_ft = 29_000.0 + 1000.0 * f64::from(random.random_range(0..12_u32));
    // Shares of 700 NM flown at 430 kt: climb, cruise with a waypoint every 100 NM, descent.
    let points = (0..=8_u32)
        .map(|k| {
            let share = f64::from(k) / 8.0;
            PointParts {
                time_s: start_s + share * 5860.0,
                lon_deg: from_lon + 17.5 * share * track.sin(),
                lat_deg: (from_lat + 11.6 * share * track.cos()).clamp(20.0, 75.0),
                level_ft: if k == 0 || k == 8 { 1000.0 } else { level_ft },
                fix: None,
            }
        })
        .collect();
    FlightParts {
        flight: format!("F{i:05}"),
        departure: "XAAA".to_owned(),
        destination: "XBBB".to_owned(),
        aircraft: "J1".to_owned(),
        rvsm: true,
        movable: true,
        points,
        ..FlightParts::default()
    }
}

fn all_loads(index: &SectorIndex, day: &Day, tracks: &[Track]) -> Vec<FlightLoad> {
    let flights = day.flights.as_slice();
    let pairs = tracks.par_iter().zip(flights);
    pairs.map(|(track, flight)| index.flight_load(&Path::filed(track), flight, day)).collect()
}

fn bench(criterion: &mut Criterion) {
    let day = day();
    let tracks: Vec<Track> = day.flights.iter().map(|f| Track::new(&f.profile)).collect();
    let knots: usize = tracks.iter().map(|track| track.knots().len()).sum();
    let index = SectorIndex::new(&day);
    let loads = all_loads(&index, &day, &tracks);
    let visits: usize = loads.iter().map(|load| load.visits.len()).sum();
    println!("{FLIGHTS} flights, {knots} knots, {visits} visits, {} sectors", day.sectors.len());

    let mut group = criterion.benchmark_group("loads");
    group.sample_size(10);
    group.bench_function("index 450 sectors", |b| b.iter(|| SectorIndex::new(black_box(&day))));
    group.bench_function("visits of the day, all cores", |b| {
        b.iter(|| all_loads(&index, &day, black_box(&tracks)));
    });
    group.bench_function("visits of one flight", |b| {
        let (mut at, flights) = (0, day.flights.as_slice());
        b.iter(|| {
            at = (at + 1) % FLIGHTS;
            index.flight_load(&Path::filed(&tracks[at]), &flights[at], &day)
        });
    });
    group.bench_function("count the day", |b| {
        b.iter(|| DayLoads::new(&day, black_box(&loads)));
    });

    let filed = Arc::new(DayLoads::new(&day, &loads));
    let changed: Vec<FlightLoad> = loads.iter().map(later).collect();
    let differences = |at: usize, which| filed.differences(&day, &loads[at], &changed[at], which);
    group.bench_function("differences of one change", |b| {
        let mut at = 0;
        b.iter(|| {
            at = (at + 1) % FLIGHTS;
            differences(at, Which::Binding)
        });
    });
    let mut planned = PlannedLoads::new(Arc::clone(&filed));
    (0..FLIGHTS).step_by(8).for_each(|at| planned.apply(&differences(at, Which::All)));
    let lists: Vec<_> = (1..1000).map(|at| differences(at, Which::Binding)).collect();
    group.bench_function("what one more change breaks", |b| {
        let mut at = 0;
        b.iter(|| {
            at = (at + 1) % lists.len();
            planned.violations(black_box(&lists[at]))
        });
    });
    group.bench_function("rows of a report", |b| b.iter(|| planned.load_counts()));
    group.finish();
}

/// A version that enters and leaves everything half a minute later from its second visit on, and
/// passes one sector in another layer.
fn later(filed: &FlightLoad) -> FlightLoad {
    let mut changed = filed.clone();
    for visit in changed.visits.iter_mut().skip(1) {
        visit.in_s += 30.0;
        visit.out_s += 30.0;
    }
    if let Some(visit) = changed.visits.get_mut(2) {
        visit.sector.0 = (visit.sector.0 + 1) % 450;
    }
    changed
}

criterion_group!(benches, bench);
criterion_main!(benches);
