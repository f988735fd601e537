//! The 1 200 flights: who flies where, when, and at which level.

use rand::RngExt;
use rand_pcg::Pcg64;

use crate::{
    fleet::{CLASSES, Class},
    flight::Flight,
    levels,
    profile::{self, End, Vertical},
    region::{Gate, Place},
    route::{self, Route, Waypoint},
};

/// Operators and their share of the flights.
const OPERATORS: [(&str, f64); 5] =
    [("TAMB", 0.34), ("SKRN", 0.24), ("OLVE", 0.19), ("QUIL", 0.15), ("HESP", 0.08)];

/// Flights of each kind: inside the region, turboprops, inbound, outbound, overflights.
const KINDS: [usize; 5] = [400, 60, 220, 220, 300];

/// Something flights leave from or go to.
struct Terminal<'a> {
    place: &'a Place,
    code: String,
    end: End,
    side: usize,
}

/// Makes the flights, not yet ordered or named.
pub fn invent(rng: &mut Pcg64, airports: &[Place], gates: &[Gate], fixes: &[Place]) -> Vec<Flight> {
    let mut flights: Vec<Flight> = Vec::new();
    for (kind, wanted) in KINDS.into_iter().enumerate() {
        let mut made = 0;
        while made < wanted {
            let (from, to) =
                (terminal(rng, kind, 0, airports, gates), terminal(rng, kind, 1, airports, gates));
            if let Some(flight) = one(rng, kind, &from, &to, fixes)
                && is_spaced(&flights, &flight)
            {
                flights.push(flight);
                made += 1;
            }
        }
    }
    flights
}

/// Orders the flights by start and names them.
pub fn order_and_name(flights: &mut [Flight]) {
    flights.sort_by(|a, b| {
        a.start_s().total_cmp(&b.start_s()).then_with(|| a.departure.cmp(&b.departure))
    });
    for (number, flight) in flights.iter_mut().enumerate() {
        flight.flight = format!("{}{:04}", flight.operator, 1001 + number);
        flight.callsign.clone_from(&flight.flight);
    }
}

fn weighted<'a, T>(rng: &mut Pcg64, items: &'a [T], weight: impl Fn(&T) -> f64) -> &'a T {
    let mut left = rng.random_range(0.0..items.iter().map(&weight).sum::<f64>());
    for item in items {
        left -= weight(item);
        if left < 0.0 {
            return item;
        }
    }
    &items[items.len() - 1]
}

fn terminal<'a>(
    rng: &mut Pcg64,
    kind: usize,
    which: usize,
    airports: &'a [Place],
    gates: &'a [Gate],
) -> Terminal<'a> {
    let at_airport = matches!((kind, which), (0 | 1, _) | (2, 1) | (3, 0));
    if at_airport {
        let place = weighted(rng, airports, |a| a.weight);
        Terminal { place, code: place.code.clone(), end: End::Airport, side: 9 }
    } else {
        let gate = weighted(rng, gates, |g| if g.side < 2 { 2.0 } else { 1.0 });
        Terminal {
            place: &gate.place,
            code: gate.beyond.to_owned(),
            end: End::Cruise,
            side: gate.side,
        }
    }
}

/// A sum of three uniforms: close to normal, bounded, mean 0 and deviation 1.
fn bell(rng: &mut Pcg64) -> f64 {
    (0..3).map(|_| rng.random_range(-1.0..1.0)).sum::<f64>()
}

fn start_s(rng: &mut Pcg64, kind: usize, eastbound: bool) -> f64 {
    let draw = rng.random_range(0.0..1.0);
    let hours = match (kind, eastbound) {
        (4, true) if draw < 0.6 => 4.5 + 1.8 * bell(rng),
        (4, false) if draw < 0.6 => 13.5 + 1.9 * bell(rng),
        (0..=3, _) if draw < 0.38 => 7.3 + 1.2 * bell(rng),
        (0..=3, _) if draw < 0.72 => 17.3 + 1.4 * bell(rng),
        _ => rng.random_range(-1.2..24.0),
    };
    (hours * 3600.0).round()
}

fn one(
    rng: &mut Pcg64,
    kind: usize,
    from: &Terminal<'_>,
    to: &Terminal<'_>,
    fixes: &[Place],
) -> Option<Flight> {
    let (straight_m, track) = route::distance_and_track(from.place.at_deg, to.place.at_deg);
    if from.code == to.code || from.side == to.side && from.side < 9 || straight_m < 230_000.0 {
        return None;
    }
    let route = route_between(rng, from.place, to.place, fixes)?;
    let class = pick_class(rng, kind, straight_m);
    let operator = weighted(rng, &OPERATORS, |o| o.1).0;
    let rvsm = class.aircraft != "OJET" && !(class.aircraft == "BJET" && rng.random_bool(0.2));
    let wished_fl = wished_fl(rng, &class, rvsm, straight_m, kind);
    let mut level_fl = levels::nearest(wished_fl, track);
    let start = start_s(rng, kind, track < 180.0);
    let least_m = if straight_m > 450_000.0 { 150_000.0 } else { 70_000.0 };
    loop {
        let mut cruise = vec![(0.0, level_fl)];
        let climbs = straight_m > 700_000.0 && rvsm && rng.random_bool(0.14);
        if let Some(next_fl) =
            levels::stepped(level_fl, 1, track).filter(|fl| climbs && *fl <= class.ceiling_fl)
        {
            cruise.push((rng.random_range(0.4..0.65), next_fl));
        }
        let vertical = Vertical { cruise, start: from.end, end: to.end };
        let fits = route.length_m() - profile::changing_m(&vertical, class.performance) > least_m;
        if let Some(points) =
            profile::fly(&route, &vertical, class.performance, start).filter(|_| fits)
        {
            return Some(Flight {
                flight: String::new(),
                callsign: String::new(),
                operator: operator.to_owned(),
                departure: from.code.clone(),
                destination: to.code.clone(),
                aircraft: class.aircraft.to_owned(),
                mach: (kind == 4).then_some(class.performance.mach),
                mass_kg: (class.aircraft == "HJET")
                    .then(|| class.mass_kg + 5000.0 * rng.random_range(-5_i32..6) as f64),
                rvsm,
                movable: !rng.random_bool(0.02),
                ceiling_fl: class.ceiling_fl,
                change_fpm: f64::from(class.rates_fpm.0.min(class.rates_fpm.1)),
                cruise_kg_per_min: class.kg_per_min,
                points,
            });
        }
        level_fl = levels::stepped(level_fl, -1, track).filter(|fl| *fl >= 160)?;
    }
}

fn pick_class(rng: &mut Pcg64, kind: usize, straight_m: f64) -> Class {
    let shares: [f64; 6] = match kind {
        1 => [0.0, 0.0, 0.0, 0.0, 0.0, 1.0],
        4 => [0.35, 0.0, 0.5, 0.12, 0.03, 0.0],
        2 | 3 => [0.55, 0.1, 0.25, 0.06, 0.04, 0.0],
        _ if straight_m > 600_000.0 => [0.62, 0.3, 0.0, 0.04, 0.04, 0.0],
        _ => [0.4, 0.52, 0.0, 0.04, 0.04, 0.0],
    };
    let indexes = [0, 1, 2, 3, 4, 5];
    CLASSES[*weighted(rng, &indexes, |i: &usize| shares[*i])]
}

fn wished_fl(rng: &mut Pcg64, class: &Class, rvsm: bool, straight_m: f64, kind: usize) -> u32 {
    match (class.aircraft, rvsm) {
        ("TPRO", _) => rng.random_range(18..24) * 10,
        ("BJET", false) => 450,
        ("OJET", _) => rng.random_range(26..29) * 10,
        ("BJET", _) => rng.random_range(37..42) * 10,
        _ if kind == 4 => rng.random_range(32..40) * 10,
        _ if straight_m < 450_000.0 => rng.random_range(27..34) * 10,
        _ if straight_m < 700_000.0 => rng.random_range(31..37) * 10,
        _ => rng.random_range(33..39) * 10,
    }
}

/// The straight route, or one over the first or second fix by detour, if it keeps the direction.
fn route_between(rng: &mut Pcg64, from: &Place, to: &Place, fixes: &[Place]) -> Option<Route> {
    let waypoint = |p: &Place, is_fix: bool| Waypoint {
        lon_deg: p.at_deg.0,
        lat_deg: p.at_deg.1,
        fix: is_fix.then(|| p.code.clone()),
    };
    let is_gate = |p: &Place| p.name.is_empty();
    let straight_m = route::distance_and_track(from.at_deg, to.at_deg).0;
    let mut ways: Vec<(f64, &Place)> = fixes
        .iter()
        .filter_map(|fix| {
            let a = route::distance_and_track(from.at_deg, fix.at_deg).0;
            let b = route::distance_and_track(fix.at_deg, to.at_deg).0;
            let detour = (a + b) / straight_m;
            (a > 120_000.0 && b > 120_000.0 && detour < 1.06).then_some((detour, fix))
        })
        .collect();
    ways.sort_by(|a, b| a.0.total_cmp(&b.0));
    let pick = rng.random_range(0..3_usize);
    let mut through = vec![waypoint(from, is_gate(from))];
    let mut via: Vec<&Place> = ways.iter().take(pick).map(|w| w.1).collect();
    via.sort_by(|a, b| {
        let m = |p: &Place| route::distance_and_track(from.at_deg, p.at_deg).0;
        m(a).total_cmp(&m(b))
    });
    through.extend(via.into_iter().map(|p| waypoint(p, true)));
    through.push(waypoint(to, is_gate(to)));
    let route = Route::through(through);
    (route.keeps_direction() && route.length_m() < straight_m * 1.1).then_some(route)
}

/// Two flights of one start begin 90 s apart, at a gate and level five minutes.
fn is_spaced(flights: &[Flight], new: &Flight) -> bool {
    let (Some(start), Some(end)) = (new.points.first(), new.points.last()) else { return false };
    flights.iter().all(|other| {
        let (Some(a), Some(b)) = (other.points.first(), other.points.last()) else { return true };
        let near = |p: &profile::Point, q: &profile::Point, air_s: f64| {
            let same_place = (p.lon_deg - q.lon_deg).abs() + (p.lat_deg - q.lat_deg).abs() < 1e-6;
            let same_level = (p.level_fl - q.level_fl).abs() < 1.0;
            let least_s = if p.level_fl > 0.0 { air_s } else { 90.0 };
            same_place && same_level && (p.time_s - q.time_s).abs() < least_s
        };
        !near(a, start, 300.0) && !near(b, end, 180.0)
    })
}
