//! A flight's profile in still standard air: climb in four bands, cruise at constant Mach number
//! with step climbs, descent in three bands; points where the level starts or stops to change and
//! at the waypoints.
//!
//! The climb and descent speeds and rates are common practice for jets, without a single source:
//! 250 kt below FL 100, then 290 kt until the cruise Mach number is reached.

use crate::{atmosphere, route::Route};

/// One point of a profile.
#[derive(Debug, Clone, PartialEq)]
pub struct Point {
    /// Seconds from 00:00 UTC of the day.
    pub time_s: f64,
    /// Longitude in degrees.
    pub lon_deg: f64,
    /// Latitude in degrees.
    pub lat_deg: f64,
    /// Flight level (hundreds of feet).
    pub level_fl: f64,
    /// Name of the waypoint, if it is one.
    pub fix: Option<String>,
}

/// What the route's end is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum End {
    /// An airport: the profile climbs from or descends to FL 0 there.
    Airport,
    /// The edge of the region: the flight is in cruise there.
    Cruise,
}

/// How a type flies.
#[derive(Debug, Clone, Copy)]
pub struct Performance {
    /// Cruise Mach number.
    pub mach: f64,
    /// Share of the usual rates of climb and descent (1 for a medium jet).
    pub rate_share: f64,
}

/// A filed vertical plan.
#[derive(Debug, Clone)]
pub struct Vertical {
    /// Cruise levels in order, each with the share of the cruise at which its climb begins; the
    /// first share is 0.
    pub cruise: Vec<(f64, u32)>,
    /// What the start is.
    pub start: End,
    /// What the end is.
    pub end: End,
}

/// Climb bands: upper level in FL, usual rate in feet per minute.
const CLIMB: [(f64, f64); 4] = [(50.0, 2600.0), (100.0, 2300.0), (240.0, 2000.0), (660.0, 1400.0)];
/// Descent bands, from the ground up.
const DESCENT: [(f64, f64); 3] = [(50.0, 1200.0), (100.0, 1500.0), (660.0, 2100.0)];

/// Ground speed in knots at a level while climbing or descending.
fn changing_speed_kt(level_fl: f64, mach: f64) -> f64 {
    let level_ft = level_fl * 100.0;
    let indicated_kt = if level_fl < 50.0 {
        200.0
    } else if level_fl < 100.0 {
        250.0
    } else {
        290.0
    };
    let true_kt: f64 = indicated_kt / atmosphere::density_ratio(level_ft).sqrt();
    true_kt.min(mach * atmosphere::speed_of_sound_kt(level_ft))
}

/// One piece of a profile: metres flown, seconds taken, level at its end.
type Piece = (f64, f64, f64);

/// The pieces between the ground and a level.
fn bands(table: &[(f64, f64)], top_fl: f64, performance: Performance) -> Vec<Piece> {
    let mut pieces = Vec::new();
    let mut from_fl = 0.0;
    for (upper_fl, rate_fpm) in table {
        let until_fl = upper_fl.min(top_fl);
        if until_fl <= from_fl {
            break;
        }
        pieces.push(change_piece(from_fl, until_fl, *rate_fpm, performance));
        from_fl = until_fl;
    }
    pieces
}

fn change_piece(from_fl: f64, until_fl: f64, rate_fpm: f64, performance: Performance) -> Piece {
    let time_s =
        ((until_fl - from_fl).abs() * 100.0 / (rate_fpm * performance.rate_share) * 60.0).max(1.0);
    let speed_kt = changing_speed_kt((from_fl + until_fl) / 2.0, performance.mach);
    (speed_kt * 1852.0 / 3600.0 * time_s, time_s, until_fl)
}

/// Metres that climb and descent of a vertical plan take together.
#[must_use]
pub fn changing_m(vertical: &Vertical, performance: Performance) -> f64 {
    let first_fl = vertical.cruise.first().map_or(0.0, |c| f64::from(c.1));
    let last_fl = vertical.cruise.last().map_or(0.0, |c| f64::from(c.1));
    let mut sum_m = 0.0;
    if vertical.start == End::Airport {
        sum_m += bands(&CLIMB, first_fl, performance).iter().map(|p| p.0).sum::<f64>();
    }
    if vertical.end == End::Airport {
        sum_m += bands(&DESCENT, last_fl, performance).iter().map(|p| p.0).sum::<f64>();
    }
    sum_m
}

/// Flies a route: points in time order, times rounded to whole seconds.
///
/// None if climb and descent leave less than 10 km of cruise, or a step climb does not fit.
#[must_use]
pub fn fly(
    route: &Route,
    vertical: &Vertical,
    performance: Performance,
    start_s: f64,
) -> Option<Vec<Point>> {
    let pieces = pieces(route.length_m(), vertical, performance)?;
    let start_fl = match vertical.start {
        End::Airport => 0.0,
        End::Cruise => f64::from(vertical.cruise.first()?.1),
    };
    let mut points = Vec::new();
    let mut waypoints = route.waypoints().peekable();
    let (mut at_m, mut time_s, mut level_fl) = (0.0, start_s, start_fl);
    let mut push = |time_s: f64, place: (f64, f64), level_fl: f64, fix: Option<String>| {
        let time_s = time_s.round();
        if points.last().is_none_or(|p: &Point| time_s > p.time_s) {
            points.push(Point { time_s, lon_deg: place.0, lat_deg: place.1, level_fl, fix });
        }
    };
    for (piece_m, piece_s, end_fl) in pieces {
        let end_m = at_m + piece_m;
        while let Some((m, waypoint)) = waypoints.next_if(|(m, _)| *m < end_m - 1500.0) {
            let share = (m - at_m) / piece_m;
            // A waypoint just behind a corner of the profile would make a leg of a few metres.
            if m == 0.0 || m > at_m + 1500.0 {
                let level = (level_fl + (end_fl - level_fl) * share).round();
                let place = (waypoint.lon_deg, waypoint.lat_deg);
                push(time_s + share * piece_s, place, level, waypoint.fix.clone());
            }
        }
        at_m = end_m;
        time_s += piece_s;
        level_fl = end_fl;
        match waypoints.next_if(|(m, _)| (*m - end_m).abs() <= 1500.0) {
            Some((_, w)) => push(time_s, (w.lon_deg, w.lat_deg), level_fl, w.fix.clone()),
            None => push(time_s, route.position(at_m), level_fl, None),
        }
    }
    Some(points)
}

fn pieces(length_m: f64, vertical: &Vertical, performance: Performance) -> Option<Vec<Piece>> {
    let cruise_m = length_m - changing_m(vertical, performance);
    if cruise_m < 10_000.0 {
        return None;
    }
    let first_fl = f64::from(vertical.cruise.first()?.1);
    let mut pieces = match vertical.start {
        End::Airport => bands(&CLIMB, first_fl, performance),
        End::Cruise => Vec::new(),
    };
    let mut level_fl = first_fl;
    let mut flown_m = 0.0;
    for (index, (_, next_fl)) in vertical.cruise.iter().enumerate() {
        let next_fl = f64::from(*next_fl);
        if index > 0 {
            let climb = change_piece(level_fl, next_fl, 1000.0, performance);
            flown_m += climb.0;
            pieces.push(climb);
            level_fl = next_fl;
        }
        let until_share = vertical.cruise.get(index + 1).map_or(1.0, |c| c.0);
        let level_m = cruise_m * until_share - flown_m;
        if level_m < 5_000.0 {
            return None;
        }
        let speed_mps =
            performance.mach * atmosphere::speed_of_sound_kt(level_fl * 100.0) * 1852.0 / 3600.0;
        pieces.push((level_m, level_m / speed_mps, level_fl));
        flown_m += level_m;
    }
    if vertical.end == End::Airport {
        let mut down = bands(&DESCENT, level_fl, performance);
        down.reverse();
        let below: Vec<f64> = down.iter().skip(1).map(|p| p.2).chain([0.0]).collect();
        pieces.extend(down.iter().zip(below).map(|(p, end_fl)| (p.0, p.1, end_fl)));
    }
    Some(pieces)
}

/// Longitude, latitude and level at a time, linear between points; none outside the profile.
#[must_use]
pub fn at_time(points: &[Point], time_s: f64) -> Option<(f64, f64, f64)> {
    let next = points.partition_point(|p| p.time_s <= time_s);
    let after = match points.get(next) {
        Some(after) => after,
        None => points.last().filter(|p| p.time_s >= time_s)?,
    };
    let before = points.get(next.checked_sub(1)?)?;
    if after.time_s <= before.time_s {
        return Some((before.lon_deg, before.lat_deg, before.level_fl));
    }
    let share = (time_s - before.time_s) / (after.time_s - before.time_s);
    let mix = |a: f64, b: f64| a + (b - a) * share;
    Some((
        mix(before.lon_deg, after.lon_deg),
        mix(before.lat_deg, after.lat_deg),
        mix(before.level_fl, after.level_fl),
    ))
}
