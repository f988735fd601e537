//! Flights and their filed points.

use std::collections::BTreeSet;

use super::super::parts::{FlightParts, PointParts};
use super::super::policy::Policy;
use super::super::sector::Airport;
use super::super::{AircraftClass, Flight, Point, Profile};
use super::Build;
use crate::geometry::geodesic::{LonLat, distance_m};
use crate::ids::{AirportId, ClassId};
use crate::units::{SECONDS_PER_DAY, fl_to_ft, ft_to_fl, kt_to_mps, mps_to_kt, nm_to_m};

/// Plausible levels, feet.
const LEVELS_FT: std::ops::RangeInclusive<f64> = -2000.0..=66_000.0;
/// Plausible times: within three days of the date.
const TIMES_S: std::ops::RangeInclusive<f64> = -3.0 * SECONDS_PER_DAY..=4.0 * SECONDS_PER_DAY;
/// Largest plausible ground speed between two points, kt.
const FASTEST_KT: f64 = 1500.0;
/// Ground speed in cruise below which a flight is warned of, kt.
const SLOW_CRUISE_KT: f64 = 50.0;
/// How near an airport, and how low, a flight must begin or end to be counted there.
const AIRPORT_RADIUS_NM: f64 = 15.0;
const AIRPORT_BELOW_FL: f64 = 100.0;
/// Levels are snapped to multiples of this, feet.
const SNAP_STEP_FT: f64 = 500.0;

/// What flights refer to, sorted by name.
pub(super) struct Names<'a> {
    pub(super) airports: &'a [Airport],
    pub(super) classes: &'a [AircraftClass],
}

impl Build {
    /// Flights by name, and how many of their levels were snapped.
    pub(super) fn flights(
        &mut self,
        parts: Vec<FlightParts>,
        names: &Names<'_>,
        policy: &Policy,
    ) -> (Vec<Flight>, u32) {
        let parts = self.sort_by_name("flights", "flight", parts, |f| f.flight.as_str());
        let mut snapped = 0;
        let mut classless = BTreeSet::new();
        let mut flights = Vec::with_capacity(parts.len());
        for (i, mut flight) in parts {
            snapped += snap_levels(&mut flight.points, policy.level_snap_ft);
            if let Some(flight) = self.flight(i, flight, names, policy) {
                if flight.class.is_none() && !names.classes.is_empty() {
                    classless.insert(flight.aircraft.clone());
                }
                flights.push(flight);
            }
        }
        for code in classless {
            self.warn(
                String::new(),
                format!(
                    "no class names aircraft `{code}`: it changes level at 1000 ft/min and has \
                     no ceiling"
                ),
            );
        }
        (flights, snapped)
    }

    fn flight(
        &mut self,
        i: usize,
        parts: FlightParts,
        names: &Names<'_>,
        policy: &Policy,
    ) -> Option<Flight> {
        self.optional(|| format!("flights[{i}].mach"), parts.mach, 0.01..=5.0);
        self.optional(|| format!("flights[{i}].mass_kg"), parts.mass_kg, 1.0..=1e7);
        if !self.check_points(i, &parts.points, policy) {
            return None;
        }
        let points = parts.points.into_iter().map(|p| Point {
            time_s: p.time_s,
            lon_deg: p.lon_deg,
            lat_deg: p.lat_deg,
            level_ft: p.level_ft,
            fix: p.fix.filter(|name| !name.is_empty()).map(String::into_boxed_str),
        });
        let profile = Profile::new(points.collect(), fl_to_ft(policy.cruise_floor_fl))?;
        let (first, last) = (profile.points().first()?, profile.points().last()?);
        let class = names.classes.binary_search_by(|c| c.code.as_str().cmp(&parts.aircraft)).ok();
        Some(Flight {
            departs_from: counted_airport(names.airports, &parts.departure, first),
            arrives_at: counted_airport(names.airports, &parts.destination, last),
            name: parts.flight,
            callsign: parts.callsign,
            operator: parts.operator,
            departure: parts.departure,
            destination: parts.destination,
            aircraft: parts.aircraft,
            class: class.map(|index| ClassId(index as u32)),
            mach: parts.mach,
            mass_kg: parts.mass_kg,
            rvsm: parts.rvsm,
            movable: parts.movable,
            profile,
        })
    }

    /// Whether the points make a plausible profile; else the defects are noted.
    fn check_points(&mut self, i: usize, points: &[PointParts], policy: &Policy) -> bool {
        if points.len() < 2 {
            self.defects.push(
                || format!("flights[{i}].points"),
                format!("has {} points", points.len()),
                "a flight has at least two points",
            );
            return false;
        }
        let mut good = true;
        for (p, point) in points.iter().enumerate() {
            good &= self.check_point(i, p, point);
        }
        if !good {
            return false;
        }
        let mut slowest_cruise_kt = f64::INFINITY;
        for (p, w) in points.windows(2).enumerate() {
            let path = || format!("flights[{i}].points[{}].time", p + 1);
            let duration_s = w[1].time_s - w[0].time_s;
            if duration_s <= 0.0 {
                good = false;
                self.defects.push(
                    path,
                    "does not lie after the time of the point before",
                    "points of a flight must be in time order, strictly",
                );
                continue;
            }
            let Some(speed_kt) = implausible_speed_kt(&w[0], &w[1], duration_s) else { continue };
            if speed_kt > FASTEST_KT {
                good = false;
                self.defects.push(
                    path,
                    format!("{speed_kt:.0} kt are flown from the point before"),
                    format!("at most {FASTEST_KT} kt; check time and place of both points"),
                );
            }
            let level = w[0].level_ft == w[1].level_ft;
            if level && w[0].level_ft >= fl_to_ft(policy.cruise_floor_fl) {
                slowest_cruise_kt = slowest_cruise_kt.min(speed_kt);
            }
        }
        if slowest_cruise_kt < SLOW_CRUISE_KT {
            self.warn(
                format!("flights[{i}]"),
                format!("cruises at {slowest_cruise_kt:.0} kt over a leg"),
            );
        }
        good
    }

    fn check_point(&mut self, i: usize, p: usize, point: &PointParts) -> bool {
        // Plain comparisons first: paths are only spelt out for defects.
        let place_is_good = (-180.0..=180.0).contains(&point.lon_deg)
            && (-90.0..=90.0).contains(&point.lat_deg)
            || self.check_place(&format!("flights[{i}].points[{p}]"), point.lon_deg, point.lat_deg);
        let level_is_good = LEVELS_FT.contains(&point.level_ft);
        if !level_is_good {
            self.defects.push(
                || format!("flights[{i}].points[{p}].level_ft"),
                format!("FL {} is not plausible", ft_to_fl(point.level_ft)),
                "FL -20 to 660",
            );
        }
        let time_is_good = TIMES_S.contains(&point.time_s);
        if !time_is_good {
            self.defects.push(
                || format!("flights[{i}].points[{p}].time"),
                "is more than three days from the day's date",
                "check the date of the day and of the point",
            );
        }
        place_is_good && level_is_good && time_is_good
    }
}

/// Snaps levels near a multiple of 500 ft to it; says how many were changed.
fn snap_levels(points: &mut [PointParts], within_ft: f64) -> u32 {
    let mut snapped = 0;
    for point in points {
        let nearest = (point.level_ft / SNAP_STEP_FT).round() * SNAP_STEP_FT;
        let off = (point.level_ft - nearest).abs();
        if off > 0.0 && off <= within_ft {
            point.level_ft = nearest;
            snapped += 1;
        }
    }
    snapped
}

/// The ground speed between two points where it may be out of bounds, kt; `None` where a cheap
/// bound shows that it is plausible.
///
/// A degree of latitude is 110.57 to 111.70 km long and a degree of longitude at most 111.33 km,
/// so the plane distance of the degrees, with the cosine of the larger latitude for the lower
/// bound, brackets the geodesic one on short legs; longer ones are measured.
fn implausible_speed_kt(a: &PointParts, b: &PointParts, duration_s: f64) -> Option<f64> {
    let dlat = (b.lat_deg - a.lat_deg).abs();
    let dlon = (b.lon_deg - a.lon_deg).abs();
    let dlon = dlon.min(360.0 - dlon);
    let upper_m = 111_700.0 * dlat.hypot(dlon);
    let cos = a.lat_deg.abs().max(b.lat_deg.abs()).to_radians().cos();
    let lower_m = if dlon < 10.0 && dlat < 10.0 && cos > 0.1 {
        0.95 * 110_570.0 * dlat.hypot(dlon * cos)
    } else {
        0.0
    };
    if upper_m < kt_to_mps(FASTEST_KT) * duration_s
        && lower_m > kt_to_mps(SLOW_CRUISE_KT) * duration_s
    {
        return None;
    }
    let place = |p: &PointParts| LonLat { lon_deg: p.lon_deg, lat_deg: p.lat_deg };
    Some(mps_to_kt(distance_m(place(a), place(b)) / duration_s))
}

/// The airport of that code, if it is counted and the point is near it and low.
fn counted_airport(airports: &[Airport], code: &str, point: &Point) -> Option<AirportId> {
    let at = airports.binary_search_by(|a| a.code.as_str().cmp(code)).ok()?;
    let airport = &airports[at];
    let here = LonLat { lon_deg: point.lon_deg, lat_deg: point.lat_deg };
    let there = LonLat { lon_deg: airport.lon_deg, lat_deg: airport.lat_deg };
    let near = distance_m(here, there) <= nm_to_m(AIRPORT_RADIUS_NM);
    (near && point.level_ft < fl_to_ft(AIRPORT_BELOW_FL)).then_some(AirportId(at as u32))
}
