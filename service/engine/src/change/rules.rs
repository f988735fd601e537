//! What a level must satisfy before it is flown: the aircraft, and the direction of flight.

use super::levels::allows_level;
use crate::answer::Rule;
use crate::day::{AircraftClass, Day, Flight, Profile};
use crate::geometry::geodesic::{GeodesicLeg, LonLat};
use crate::units::fl_to_ft;

/// Levels between which only flights approved for RVSM may be moved, feet (ICAO Annex 6, Part I,
/// 7.2.4: FL 290 to 410).
const RVSM_FT: std::ops::RangeInclusive<f64> = 29_000.0..=41_000.0;

/// Whether the aircraft may fly at a level at all.
pub(super) fn check_level(
    day: &Day,
    flight: &Flight,
    class: &AircraftClass,
    level_ft: f64,
) -> Result<(), Rule> {
    if let Some(ceiling_ft) = class.ceiling_ft
        && level_ft > ceiling_ft
    {
        return Err(Rule::AboveCeiling { ceiling_ft });
    }
    let floor_ft = fl_to_ft(day.policy.cruise_floor_fl);
    if level_ft < floor_ft {
        return Err(Rule::BelowFloor { floor_ft });
    }
    if !flight.rvsm && RVSM_FT.contains(&level_ft) {
        return Err(Rule::NotRvsm);
    }
    Ok(())
}

/// Whether a level is one of the direction of flight on every filed cruise leg between two places,
/// by the true track where the leg is joined; legs whose filed level breaks the rule too are left
/// out.
pub(super) fn check_direction(
    day: &Day,
    profile: &Profile,
    level_ft: f64,
    from_s: f64,
    until_s: f64,
) -> Result<(), Rule> {
    let floor_ft = fl_to_ft(day.policy.cruise_floor_fl);
    let points = profile.points();
    for leg in profile.leg_at(from_s)..profile.leg_count() {
        let (a, b) = (&points[leg], &points[leg + 1]);
        if a.time_s >= until_s {
            break;
        }
        if !profile.is_cruise_leg(leg, floor_ft) {
            continue;
        }
        let track_deg = joined_track_deg(profile, leg, from_s.max(a.time_s), b.time_s);
        let breaks = |level_ft| !allows_level(&day.policy, track_deg, level_ft);
        if breaks(level_ft) && !breaks(a.level_ft) {
            return Err(Rule::WrongDirection { track_deg });
        }
    }
    Ok(())
}

/// True track of a leg at the place where it is joined, degrees.
pub(super) fn joined_track_deg(profile: &Profile, leg: usize, joined_s: f64, end_s: f64) -> f64 {
    let (a, b) = (&profile.points()[leg], &profile.points()[leg + 1]);
    let geodesic = GeodesicLeg::new(
        LonLat { lon_deg: a.lon_deg, lat_deg: a.lat_deg },
        LonLat { lon_deg: b.lon_deg, lat_deg: b.lat_deg },
    );
    geodesic.track_at_deg((joined_s - a.time_s) / (end_s - a.time_s))
}
