//! A new profile as it is written down, so that anyone can check it.

use super::make::Change;
use crate::answer::ProfilePoint;
use crate::day::Profile;
use crate::geometry::geodesic::{GeodesicLeg, LonLat};
use crate::units::to_millisecond;

/// The points of a changed profile: filed points, later ones at their new times, and a point
/// wherever ground speed or vertical rate changes. Times are whole milliseconds; a point that would
/// fall on its predecessor's time is left out.
#[must_use]
pub fn written_points(profile: &Profile, change: &Change) -> Vec<ProfilePoint> {
    let marks = &change.marks;
    let (first, last) = (marks[0], marks[marks.len() - 1]);
    let filed = |shift_s: f64| {
        move |p: &crate::day::Point| ProfilePoint {
            time_s: to_millisecond(p.time_s + shift_s),
            lon_deg: p.lon_deg,
            lat_deg: p.lat_deg,
            level_ft: p.level_ft,
            fix: p.fix.as_deref().map(str::to_owned),
        }
    };
    let points = profile.points();
    let before = points.iter().filter(|p| p.time_s < first.filed_s).map(filed(0.0));
    let after = points.iter().filter(|p| p.time_s > last.filed_s);
    let after = after.map(filed(change.changed.shift_s));
    let between = marks.iter().map(|mark| {
        let leg = profile.leg_at(mark.filed_s);
        let (a, b) = (&points[leg], &points[leg + 1]);
        let share = (mark.filed_s - a.time_s) / (b.time_s - a.time_s);
        let place = GeodesicLeg::new(
            LonLat { lon_deg: a.lon_deg, lat_deg: a.lat_deg },
            LonLat { lon_deg: b.lon_deg, lat_deg: b.lat_deg },
        )
        .at(share);
        let fix = if share <= 0.0 {
            a.fix.as_deref()
        } else if share >= 1.0 {
            b.fix.as_deref()
        } else {
            None
        };
        ProfilePoint {
            time_s: mark.time_s,
            lon_deg: place.lon_deg,
            lat_deg: place.lat_deg,
            level_ft: mark.level_ft,
            fix: fix.map(str::to_owned),
        }
    });
    let mut written: Vec<ProfilePoint> = Vec::with_capacity(points.len() + marks.len());
    for point in before.chain(between).chain(after) {
        if written.last().is_none_or(|before| before.time_s < point.time_s) {
            written.push(point);
        }
    }
    written
}
