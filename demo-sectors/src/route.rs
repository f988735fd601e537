//! A route over ground: waypoints joined by WGS 84 geodesics, measured by distance from the start.

use geographiclib_rs::{DirectGeodesic, Geodesic, InverseGeodesic};

/// A place that a route goes through.
#[derive(Debug, Clone)]
pub struct Waypoint {
    /// Longitude in degrees.
    pub lon_deg: f64,
    /// Latitude in degrees.
    pub lat_deg: f64,
    /// Name to print beside the point, if any.
    pub fix: Option<String>,
}

/// Geodesic distance in metres and true track at the start in degrees, both on WGS 84.
#[must_use]
pub fn distance_and_track(from: (f64, f64), to: (f64, f64)) -> (f64, f64) {
    let (distance_m, track_deg, _, _): (f64, f64, f64, f64) =
        Geodesic::wgs84().inverse(from.1, from.0, to.1, to.0);
    (distance_m, track_deg.rem_euclid(360.0))
}

/// Waypoints with the distance and track of each leg.
#[derive(Debug, Clone)]
pub struct Route {
    waypoints: Vec<Waypoint>,
    /// Distance of each waypoint from the start, in metres.
    along_m: Vec<f64>,
    /// True track at the start of each leg, in degrees.
    track_deg: Vec<f64>,
}

impl Route {
    /// Joins the waypoints; consecutive ones must differ.
    #[must_use]
    pub fn through(waypoints: Vec<Waypoint>) -> Self {
        let mut along_m = vec![0.0];
        let mut track_deg = Vec::new();
        let mut sum_m = 0.0;
        for pair in waypoints.windows(2) {
            let (leg_m, track) = distance_and_track(
                (pair[0].lon_deg, pair[0].lat_deg),
                (pair[1].lon_deg, pair[1].lat_deg),
            );
            sum_m += leg_m;
            along_m.push(sum_m);
            track_deg.push(track);
        }
        Self { waypoints, along_m, track_deg }
    }

    /// Whole length in metres.
    #[must_use]
    pub fn length_m(&self) -> f64 {
        self.along_m.last().copied().unwrap_or(0.0)
    }

    /// Waypoints with their distance from the start in metres.
    pub fn waypoints(&self) -> impl Iterator<Item = (f64, &Waypoint)> {
        self.along_m.iter().copied().zip(&self.waypoints)
    }

    /// Longitude and latitude at a distance from the start.
    #[must_use]
    pub fn position(&self, at_m: f64) -> (f64, f64) {
        let leg = self.along_m.partition_point(|m| *m <= at_m).clamp(1, self.track_deg.len()) - 1;
        let start = &self.waypoints[leg];
        let (lat_deg, lon_deg): (f64, f64) = Geodesic::wgs84().direct(
            start.lat_deg,
            start.lon_deg,
            self.track_deg[leg],
            at_m - self.along_m[leg],
        );
        (lon_deg, lat_deg)
    }

    /// True track from the first waypoint to the last, in degrees.
    #[must_use]
    pub fn direction_deg(&self) -> f64 {
        match (self.waypoints.first(), self.waypoints.last()) {
            (Some(a), Some(b)) => {
                distance_and_track((a.lon_deg, a.lat_deg), (b.lon_deg, b.lat_deg)).1
            }
            _ => 0.0,
        }
    }

    /// Whether every leg, at its start, flies in the same half of the compass as the whole route.
    #[must_use]
    pub fn keeps_direction(&self) -> bool {
        let east = self.direction_deg() < 180.0;
        self.track_deg.iter().all(|track| (*track < 180.0) == east)
    }
}
