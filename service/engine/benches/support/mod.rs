//! The day that the benches measure on, and how they measure.
//!
//! With the environment variable `RIMESHIFT_DAY` the flights are those of a day folder (its
//! `points.csv`), such as `real-day` of the tests makes; else an invented and seeded day of 17 000
//! flights between 229 airports of a region 57 by 22 degrees wide, a few airports with most of the
//! traffic, great circles, semicircular levels, climbs and descents of 20 minutes. Without a day's
//! real routes it crowds hubs more and airways less. Sectors are invented in either case: 450 in
//! three layers, with sides that wobble.

#![expect(clippy::print_stdout, reason = "a bench tells what it measured")]
#![allow(
    clippy::disallowed_methods,
    clippy::disallowed_types,
    reason = "a bench reads a day and measures time; only the engine forbids that"
)]
#![allow(dead_code, reason = "each bench takes what it needs")]

use std::hint::black_box;
use std::time::Instant;

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64Mcg;
use rayon::prelude::*;
use rimeshift_engine::change::change_levels;
use rimeshift_engine::day::{
    CapacityParts, Date, Day, DayParts, FlightParts, PointParts, SectorParts, Stretch, VolumeParts,
};
use rimeshift_engine::geometry::geodesic::{GeodesicLeg, LonLat};
use rimeshift_engine::ids::{FlightId, IdVec};
use rimeshift_engine::path::{Changed, Track};

const FLIGHTS: usize = 17_000;
const COLUMNS: usize = 15;
const ROWS: usize = 10;
const LAYERS_FT: [(f64, f64); 3] = [(0.0, 24_500.0), (24_500.0, 34_500.0), (34_500.0, 66_000.0)];
/// Corners on each side of a sector.
const CORNERS: usize = 10;

/// The day, with its sectors or without.
pub(crate) fn day(sectors: Sectors) -> Day {
    day_of(flights(), sectors)
}

/// A day of these flights alone.
pub(crate) fn day_of(flights: Vec<FlightParts>, sectors: Sectors) -> Day {
    let mut parts = DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "bench");
    parts.flights = flights;
    built(parts, sectors)
}

fn built(mut parts: DayParts, sectors: Sectors) -> Day {
    if sectors == Sectors::Lattice {
        add_sectors(&mut parts);
    }
    Day::build(parts)
        .map(|built| built.day)
        .unwrap_or_else(|defects| unreachable!("the day is sound: {:?}", defects.first()))
}

/// Whether the day has sectors.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Sectors {
    None,
    Lattice,
}

fn flights() -> Vec<FlightParts> {
    if let Ok(folder) = std::env::var("RIMESHIFT_DAY") {
        let flights = filed(&std::path::Path::new(&folder).join("points.csv"));
        println!("{} flights of {folder}", flights.len());
        return flights;
    }
    println!("{FLIGHTS} invented flights");
    invented(FLIGHTS, 229, [-125.0, 26.0, -68.0, 48.0], 1)
}

/// Flights of a table of points whose rows are `flight,time,lon,lat,level_fl`, in order of flight.
fn filed(path: &std::path::Path) -> Vec<FlightParts> {
    let text = std::fs::read_to_string(path)
        .unwrap_or_else(|error| unreachable!("{} is read: {error}", path.display()));
    let mut flights: Vec<FlightParts> = Vec::new();
    let mut midnight = None;
    for line in text.lines().skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        let number = |at: usize| cells[at].parse::<f64>().unwrap_or(f64::NAN);
        let day_s = day_number(&cells[1][..10]) * 86_400.0;
        let clock = &cells[1][11..];
        let part =
            |from: usize, until: usize| clock[from..until].parse::<f64>().unwrap_or(f64::NAN);
        let midnight_s = *midnight.get_or_insert(day_s);
        let time_s = day_s - midnight_s
            + part(0, 2) * 3600.0
            + part(3, 5) * 60.0
            + clock[6..].trim_end_matches('Z').parse::<f64>().unwrap_or(f64::NAN);
        let point = PointParts {
            time_s,
            lon_deg: number(2),
            lat_deg: number(3),
            level_ft: number(4) * 100.0,
            fix: None,
        };
        match flights.last_mut() {
            Some(last) if last.flight == cells[0] => last.points.push(point),
            _ => flights.push(flight(cells[0].to_owned(), vec![point])),
        }
    }
    flights
}

/// Days since some day, from `YYYY-MM-DD` (the civil calendar's own arithmetic).
fn day_number(date: &str) -> f64 {
    let part = |from: usize, until: usize| date[from..until].parse::<i64>().unwrap_or(0);
    let (year, month, day) = (part(0, 4), part(5, 7), part(8, 10));
    let (y, m) = if month > 2 { (year, month - 3) } else { (year - 1, month + 9) };
    (365 * y + y / 4 - y / 100 + y / 400 + (153 * m + 2) / 5 + day) as f64
}

fn flight(name: String, points: Vec<PointParts>) -> FlightParts {
    FlightParts { flight: name, rvsm: true, movable: true, points, ..FlightParts::default() }
}

/// Invented flights between airports of a region `[west, south, east, north]`, each to the nearest of
/// some airports that are drawn.
pub(crate) fn invented(
    count: usize,
    airports: usize,
    region: [f64; 4],
    drawn: usize,
) -> Vec<FlightParts> {
    let mut random = Pcg64Mcg::seed_from_u64(2031);
    let airports: Vec<LonLat> = (0..airports)
        .map(|_| LonLat {
            lon_deg: random.random_range(region[0]..region[2]),
            lat_deg: random.random_range(region[1]..region[3]),
        })
        .collect();
    (0..count).map(|i| invented_flight(i, &airports, drawn, &mut random)).collect()
}

fn invented_flight(
    index: usize,
    airports: &[LonLat],
    drawn: usize,
    random: &mut Pcg64Mcg,
) -> FlightParts {
    // The square favours airports at the start of the list.
    let mut airport = || {
        let share: f64 = random.random_range(0.0..1.0);
        airports[(share * share * airports.len() as f64) as usize]
    };
    let from = airport();
    let mut leg = GeodesicLeg::new(from, airport());
    for _ in 1..drawn {
        let other = GeodesicLeg::new(from, airport());
        if other.length_m < leg.length_m && other.length_m > 100e3 {
            leg = other;
        }
    }
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
    // A point every hundred miles or so of the cruise.
    let inner = ((leg.length_m - 2.0 * slope_m) / 185e3).floor();
    for k in 1..inner as u32 {
        let share = f64::from(k) / inner;
        push(
            start_s + slope_s + cruise_s * share,
            slope_share + (1.0 - 2.0 * slope_share) * share,
            top_ft,
        );
    }
    push(start_s + slope_s + cruise_s, 1.0 - slope_share, top_ft);
    push(start_s + 2.0 * slope_s + cruise_s, 1.0, 0.0);
    flight(format!("F{index:06}"), points)
}

/// Sectors over the whole of the flights' region, open all day.
fn add_sectors(parts: &mut DayParts) {
    let points = || parts.flights.iter().flat_map(|f| &f.points);
    let low = |of: fn(&PointParts) -> f64| points().map(of).fold(f64::INFINITY, f64::min);
    let high = |of: fn(&PointParts) -> f64| points().map(of).fold(f64::NEG_INFINITY, f64::max);
    let corner = [low(|p| p.lon_deg) - 0.5, low(|p| p.lat_deg) - 0.5];
    let size = [high(|p| p.lon_deg) + 0.5 - corner[0], high(|p| p.lat_deg) + 0.5 - corner[1]];
    let step = [size[0] / (COLUMNS * CORNERS) as f64, size[1] / (ROWS * CORNERS) as f64];
    for (row, column) in (0..ROWS).flat_map(|r| (0..COLUMNS).map(move |c| (r, c))) {
        for (layer, &(floor_ft, ceiling_ft)) in LAYERS_FT.iter().enumerate() {
            let sector = format!("{row:02}{column:02}{layer}");
            for hour in 0..36_u32 {
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
            let rings = vec![ring(corner, step, column, row)];
            let volumes = vec![VolumeParts { rings, floor_ft, ceiling_ft }];
            parts.sectors.push(SectorParts { sector, volumes, ..SectorParts::default() });
        }
    }
}

/// A rectangle whose sides wobble by their place, so that neighbours share them.
fn ring(corner: [f64; 2], step: [f64; 2], column: usize, row: usize) -> Vec<[f64; 2]> {
    let (c, r) = (column * CORNERS, row * CORNERS);
    let south = (0..CORNERS).map(|i| (c + i, r));
    let east = (0..CORNERS).map(|i| (c + CORNERS, r + i));
    let north = (0..CORNERS).map(|i| (c + CORNERS - i, r + CORNERS));
    let west = (0..CORNERS).map(|i| (c, r + CORNERS - i));
    let corners = south.chain(east).chain(north).chain(west).chain([(c, r)]);
    corners
        .map(|(x, y)| {
            let (x, y) = (x as f64, y as f64);
            let wobble = 0.3 * (1.7 * x + 2.9 * y).sin();
            [corner[0] + step[0] * (x + wobble), corner[1] + step[1] * (y - wobble)]
        })
        .collect()
}

/// The stretches of up to three versions of each flight: two levels up or down over a part of the
/// cruise.
pub(crate) fn stretches(day: &Day, flight: FlightId) -> Vec<Stretch> {
    let flight = &day.flights[flight];
    let Some(cruise) = flight.profile.cruise() else { return Vec::new() };
    let [from_s, until_s] = [cruise.top_of_climb, cruise.top_of_descent]
        .map(|point| flight.profile.points()[point].time_s);
    let (lasts_s, filed_ft) = (until_s - from_s, flight.profile.level_ft_at(from_s));
    [(-2000.0, 0.1, 0.6), (2000.0, 0.2, 0.7), (-4000.0, 0.3, 0.8)]
        .into_iter()
        .map(|(by_ft, a, b)| Stretch {
            level_ft: filed_ft + by_ft,
            from_s: Some(from_s + a * lasts_s),
            until_s: Some(from_s + b * lasts_s),
        })
        .collect()
}

/// Up to three versions of each of the first flights that can be changed.
pub(crate) fn changes(
    day: &Day,
    tracks: &IdVec<FlightId, Track>,
    flights: usize,
) -> Vec<(FlightId, Changed)> {
    let valid: Vec<Vec<(FlightId, Changed)>> = (0..tracks.len())
        .into_par_iter()
        .map(|i| {
            let id = FlightId(i as u32);
            let flight = &day.flights[id];
            let fly = |stretch| change_levels(day, flight, &tracks[id], &[stretch]).ok();
            let changes = stretches(day, id).into_iter().filter_map(fly);
            changes.map(|change| (id, change.changed)).collect()
        })
        .collect();
    valid.into_iter().filter(|v| !v.is_empty()).take(flights).flatten().collect()
}

/// Runs something a few times and prints the least wall time and the least CPU time of a run, in
/// milliseconds; returns the wall time.
pub(crate) fn measure<T>(name: &str, runs: usize, mut run: impl FnMut() -> T) -> f64 {
    let (mut wall_ms, mut cpu_ms) = (f64::INFINITY, f64::INFINITY);
    for _ in 0..runs {
        let (start, start_cpu_ms) = (Instant::now(), process_cpu_ms());
        black_box(run());
        wall_ms = wall_ms.min(start.elapsed().as_secs_f64() * 1e3);
        cpu_ms = cpu_ms.min(process_cpu_ms() - start_cpu_ms);
    }
    println!("{name:<52} {wall_ms:>9.2} ms wall, {cpu_ms:>9.0} ms CPU");
    wall_ms
}

/// Runs something on one thread and on two.
pub(crate) fn measure_on_threads<T: Send>(name: &str, runs: usize, run: impl Fn() -> T + Sync) {
    for threads in [1, 2] {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build();
        let pool = pool.unwrap_or_else(|error| unreachable!("threads start: {error}"));
        let name = format!("{name}, {threads} thread{}", if threads == 1 { "" } else { "s" });
        measure(&name, runs, || pool.install(&run));
    }
}

/// Runs something for each number and prints the median, the 99th percentile and the mean, in
/// microseconds.
pub(crate) fn measure_each(name: &str, count: usize, mut run: impl FnMut(usize)) -> f64 {
    let mut times_us: Vec<f64> = (0..count)
        .map(|i| {
            let start = Instant::now();
            run(i);
            start.elapsed().as_secs_f64() * 1e6
        })
        .collect();
    times_us.sort_by(f64::total_cmp);
    let at = |share: f64| times_us[((count - 1) as f64 * share) as usize];
    let mean = times_us.iter().sum::<f64>() / count as f64;
    println!("{name:<52} p50 {:>8.1} us, p99 {:>8.1} us, mean {mean:>8.1} us", at(0.5), at(0.99));
    at(0.5)
}

/// Memory of this process now, bytes; Linux only, else 0.
pub(crate) fn memory_bytes() -> f64 {
    let text = std::fs::read_to_string("/proc/self/statm").unwrap_or_default();
    let pages = text.split_whitespace().nth(1).and_then(|n| n.parse::<f64>().ok());
    4096.0 * pages.unwrap_or(0.0)
}

/// CPU time of this process so far, of all its threads; in steps of 10 ms. Linux only, else 0.
fn process_cpu_ms() -> f64 {
    let text = std::fs::read_to_string("/proc/self/stat").unwrap_or_default();
    let after_name = text.rsplit(')').next().unwrap_or_default();
    let ticks = |at: usize| {
        after_name.split_whitespace().nth(at).and_then(|n| n.parse::<f64>().ok()).unwrap_or(0.0)
    };
    10.0 * (ticks(11) + ticks(12))
}
