//! From a timetable to profiles: class, cruise level and times of each flight.
//!
//! The class goes by distance, the wished level by distance with some spread, the filed level is
//! the next one of the direction of flight that leaves room to cruise. All of this is common
//! practice, with no source; the departure is taken as the time of leaving the ground.

use std::collections::BTreeMap;

use rand::RngExt;
use rand_pcg::Pcg64;
use rimeshift_demo_sectors::{
    fleet::{CLASSES, Class},
    flight::{Flight, whole_fl},
    levels,
    profile::{self, End, Point, Vertical},
    route::{self, Route, Waypoint},
    tables::Clock,
};

use super::{
    Options, Summary,
    source::{self, Timetable},
};

/// Longest leg between two points of a profile, in metres.
const LEG_M: f64 = 250_000.0;

/// The flights of a timetable.
#[derive(Debug, Clone)]
pub struct Modelled {
    /// In order of their start.
    pub flights: Vec<Flight>,
    /// Rows without the position or zone of an airport.
    pub unknown_airport: usize,
    /// Rows whose distance leaves no room for a climb and a descent.
    pub too_short: usize,
    /// Modelled over recorded time in the air, sorted.
    pub air_time_ratios: Vec<f64>,
}

/// Flies every departure of a timetable.
///
/// # Errors
/// If the date is none.
pub fn fly_all(table: &Timetable, options: &Options) -> Result<Modelled, String> {
    let midnight_s = Clock::of(&options.date)?.midnight_s();
    let mut rng = Pcg64::new(u128::from(options.seed), 11);
    let mut zones = BTreeMap::new();
    for airport in table.airports.values() {
        if let Ok(zone) = jiff::tz::TimeZone::get(&airport.zone) {
            zones.insert(airport.zone.as_str(), zone);
        }
    }
    let mut made = Modelled {
        flights: Vec::new(),
        unknown_airport: 0,
        too_short: 0,
        air_time_ratios: Vec::new(),
    };
    for departure in &table.departures {
        // Drawn for every row, so that a row left out changes no other.
        let draw = Draw::new(&mut rng);
        let airport = |code: &str| table.airports.get(code);
        let (Some(from), Some(to)) = (airport(&departure.origin), airport(&departure.destination))
        else {
            made.unknown_airport += 1;
            continue;
        };
        let start_s = zones.get(from.zone.as_str()).and_then(|zone| source::utc_s(departure, zone));
        let Some(start_s) = start_s else {
            made.unknown_airport += 1;
            continue;
        };
        #[expect(clippy::cast_precision_loss, reason = "a few days in seconds")]
        let start_s = (start_s - midnight_s) as f64 + draw.second_s;
        let Some((points, class)) = fly(from.at_deg, to.at_deg, start_s, &draw) else {
            made.too_short += 1;
            continue;
        };
        if let (Some(minutes), Some(last)) = (departure.air_time_min, points.last()) {
            made.air_time_ratios.push((last.time_s - start_s) / 60.0 / minutes);
        }
        made.flights.push(Flight {
            flight: String::new(),
            callsign: String::new(),
            operator: draw.operator.to_owned(),
            departure: departure.origin.clone(),
            destination: departure.destination.clone(),
            aircraft: class.aircraft.to_owned(),
            mach: None,
            mass_kg: None,
            rvsm: true,
            movable: true,
            ceiling_fl: class.ceiling_fl,
            change_fpm: f64::from(class.rates_fpm.0.min(class.rates_fpm.1)),
            cruise_kg_per_min: class.kg_per_min,
            points,
        });
    }
    made.flights.sort_by(|a, b| a.start_s().total_cmp(&b.start_s()));
    for (number, flight) in made.flights.iter_mut().enumerate() {
        flight.flight = format!("F{:05}", number + 1);
    }
    made.air_time_ratios.sort_by(f64::total_cmp);
    Ok(made)
}

/// What chance decides of one flight.
struct Draw {
    second_s: f64,
    class: f64,
    level: f64,
    operator: &'static str,
}

impl Draw {
    fn new(rng: &mut Pcg64) -> Self {
        const OPERATORS: [&str; 10] = ["A", "A", "A", "B", "B", "C", "C", "D", "E", "F"];
        Self {
            second_s: f64::from(rng.random_range(0..60)),
            class: rng.random_range(0.0..1.0),
            level: rng.random_range(-1.0..1.0) + rng.random_range(-1.0..1.0),
            operator: OPERATORS[rng.random_range(0..OPERATORS.len())],
        }
    }
}

/// Medium, regional, heavy jet or turboprop.
fn class_of(distance_m: f64, draw: f64) -> Class {
    let [medium, regional, heavy, .., turboprop] = CLASSES;
    let km = distance_m / 1000.0;
    if km < 350.0 {
        if draw < 0.35 {
            turboprop
        } else if draw < 0.75 {
            regional
        } else {
            medium
        }
    } else if km < 1100.0 {
        if draw < 0.3 { regional } else { medium }
    } else if km > 2800.0 && draw < 0.3 {
        heavy
    } else {
        medium
    }
}

/// Wished level in FL: higher with distance, with a spread of a few levels.
fn wished_fl(class: &Class, distance_m: f64, draw: f64) -> u32 {
    let km = distance_m / 1000.0;
    let middle = if class.aircraft == "TPRO" {
        190.0
    } else if km < 1000.0 {
        250.0 + km * 0.08
    } else {
        330.0 + ((km - 1000.0) * 0.015).min(25.0)
    };
    whole_fl(middle + 25.0 * draw).min(class.ceiling_fl)
}

fn fly(from: (f64, f64), to: (f64, f64), start_s: f64, draw: &Draw) -> Option<(Vec<Point>, Class)> {
    let (distance_m, track) = route::distance_and_track(from, to);
    if distance_m < 40_000.0 {
        return None;
    }
    let class = class_of(distance_m, draw.class);
    let end = |at_deg: (f64, f64)| Waypoint { lon_deg: at_deg.0, lat_deg: at_deg.1, fix: None };
    let direct = Route::through(vec![end(from), end(to)]);
    let legs = (distance_m / LEG_M).ceil().max(1.0);
    let mut waypoints = vec![end(from)];
    let mut leg = 1.0;
    while leg < legs {
        waypoints.push(end(direct.position(distance_m * leg / legs)));
        leg += 1.0;
    }
    waypoints.push(end(to));
    let route = Route::through(waypoints);
    let least_m = (distance_m * 0.25).min(120_000.0);
    let mut level_fl = levels::nearest(wished_fl(&class, distance_m, draw.level), track);
    loop {
        let vertical =
            Vertical { cruise: vec![(0.0, level_fl)], start: End::Airport, end: End::Airport };
        if distance_m - profile::changing_m(&vertical, class.performance) > least_m
            && let Some(points) = profile::fly(&route, &vertical, class.performance, start_s)
        {
            return Some((points, class));
        }
        level_fl = levels::stepped(level_fl, -1, track)?;
    }
}

/// Counts of what was modelled; the caller adds sectors and proposals.
#[must_use]
pub fn describe(made: &Modelled) -> Summary {
    let mut by_level = BTreeMap::new();
    let mut airborne = vec![0; 34];
    let (mut cruise_nm, mut cruising) = (0.0, 0.0);
    for f in &made.flights {
        let highest = f.points.iter().map(|p| whole_fl(p.level_fl)).max().unwrap_or(0);
        *by_level.entry(highest).or_insert(0) += 1;
        let mut hour_s = 0.0;
        for count in &mut airborne {
            *count += usize::from(f.start_s() <= hour_s && hour_s < f.end_s());
            hour_s += 3600.0;
        }
        let runs = f.cruise_runs(245.0);
        if !runs.is_empty() {
            cruising += 1.0;
            cruise_nm +=
                runs.iter().map(|run| length_nm(&f.points[run.first..=run.last])).sum::<f64>();
        }
    }
    let ratios = &made.air_time_ratios;
    let quartile = |n: usize| ratios.get(ratios.len() * n / 4).copied().unwrap_or(f64::NAN);
    Summary {
        flights: made.flights.len(),
        unknown_airport: made.unknown_airport,
        too_short: made.too_short,
        points: made.flights.iter().map(|f| f.points.len()).sum(),
        sectors: 0,
        proposals: 0,
        options: 0,
        crossings: 0,
        by_level,
        mean_cruise_nm: if cruising > 0.0 { cruise_nm / cruising } else { 0.0 },
        airborne,
        air_time_ratio: (!ratios.is_empty()).then(|| [quartile(1), quartile(2), quartile(3)]),
    }
}

fn length_nm(points: &[Point]) -> f64 {
    let leg = |pair: &[Point]| {
        let a = (pair[0].lon_deg, pair[0].lat_deg);
        route::distance_and_track(a, (pair[1].lon_deg, pair[1].lat_deg)).0
    };
    points.windows(2).map(leg).sum::<f64>() / 1852.0
}
