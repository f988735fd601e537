//! Shortest paths on the WGS 84 ellipsoid, by Karney's algorithms (J. Geodesy 87, 2013), which
//! the crate `geographiclib-rs` carries.

use std::sync::LazyLock;

use geographiclib_rs::{DirectGeodesic, Geodesic, InverseGeodesic};

static WGS84: LazyLock<Geodesic> = LazyLock::new(Geodesic::wgs84);

/// Equatorial radius of WGS 84, metres.
const EQUATORIAL_RADIUS_M: f64 = 6_378_137.0;
/// First eccentricity squared of WGS 84, from its flattening 1/298.257223563.
const ECCENTRICITY_SQUARED: f64 = {
    let f = 1.0 / 298.257_223_563;
    f * (2.0 - f)
};

/// A place in degrees.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LonLat {
    /// Longitude, degrees, -180 to 180.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
}

/// The geodesic from one place to another.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GeodesicLeg {
    from: LonLat,
    to: LonLat,
    /// Its length, metres.
    pub length_m: f64,
    /// True track where it starts, degrees, 0 to 360; 0 where it has no length.
    pub track_from_deg: f64,
}

impl GeodesicLeg {
    /// The geodesic between two places.
    #[must_use]
    pub fn new(from: LonLat, to: LonLat) -> Self {
        let (length_m, azimuth_deg, _, _): (f64, f64, f64, f64) =
            WGS84.inverse(from.lat_deg, from.lon_deg, to.lat_deg, to.lon_deg);
        let track_from_deg = if length_m > 0.0 { azimuth_deg.rem_euclid(360.0) } else { 0.0 };
        Self { from, to, length_m, track_from_deg }
    }

    /// The place at a share of its length, 0 to 1; its ends exactly.
    #[must_use]
    pub fn at(&self, share: f64) -> LonLat {
        if share <= 0.0 || self.length_m == 0.0 {
            return self.from;
        }
        if share >= 1.0 {
            return self.to;
        }
        let (lat_deg, lon_deg): (f64, f64) = WGS84.direct(
            self.from.lat_deg,
            self.from.lon_deg,
            self.track_from_deg,
            share * self.length_m,
        );
        LonLat { lon_deg, lat_deg }
    }

    /// True track at a share of its length, degrees, 0 to 360.
    #[must_use]
    pub fn track_at_deg(&self, share: f64) -> f64 {
        if share <= 0.0 || self.length_m == 0.0 {
            return self.track_from_deg;
        }
        let (_, _, azimuth_deg): (f64, f64, f64) = WGS84.direct(
            self.from.lat_deg,
            self.from.lon_deg,
            self.track_from_deg,
            share.min(1.0) * self.length_m,
        );
        azimuth_deg.rem_euclid(360.0)
    }
}

/// Geodesic distance between two places, metres.
#[must_use]
pub fn distance_m(a: LonLat, b: LonLat) -> f64 {
    WGS84.inverse(a.lat_deg, a.lon_deg, b.lat_deg, b.lon_deg)
}

/// Earth-centred coordinates of a place on the ellipsoid, metres.
#[must_use]
pub fn earth_centred_m(place: LonLat) -> [f64; 3] {
    let (sin_lat, cos_lat) = place.lat_deg.to_radians().sin_cos();
    let (sin_lon, cos_lon) = place.lon_deg.to_radians().sin_cos();
    let n = EQUATORIAL_RADIUS_M / (1.0 - ECCENTRICITY_SQUARED * sin_lat * sin_lat).sqrt();
    [n * cos_lat * cos_lon, n * cos_lat * sin_lon, n * (1.0 - ECCENTRICITY_SQUARED) * sin_lat]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_middle_of_a_geodesic_is_equally_far_from_its_ends() {
        let a = LonLat { lon_deg: 170.0, lat_deg: 10.0 };
        let b = LonLat { lon_deg: -160.0, lat_deg: 40.0 };
        let leg = GeodesicLeg::new(a, b);
        let middle = leg.at(0.5);
        assert!((distance_m(a, middle) - leg.length_m / 2.0).abs() < 1e-6);
        assert!((distance_m(b, middle) - leg.length_m / 2.0).abs() < 1e-6);
        assert_eq!((leg.at(0.0), leg.at(1.0)), (a, b));
    }

    #[test]
    fn a_leg_without_length_stays_where_it_is() {
        let a = LonLat { lon_deg: 5.0, lat_deg: 50.0 };
        let leg = GeodesicLeg::new(a, a);
        assert_eq!((leg.length_m, leg.at(0.3)), (0.0, a));
    }

    #[test]
    fn chords_of_ten_nautical_miles_differ_from_geodesics_by_millimetres() {
        for lat_deg in [-80.0, -45.0, 0.0, 30.0, 60.0] {
            let a = LonLat { lon_deg: 20.0, lat_deg };
            let (lat2, lon2): (f64, f64) = WGS84.direct(lat_deg, 20.0, 63.0, 18_520.0);
            let b = LonLat { lon_deg: lon2, lat_deg: lat2 };
            let (p, q) = (earth_centred_m(a), earth_centred_m(b));
            let chord = (0..3).map(|k| (p[k] - q[k]).powi(2)).sum::<f64>().sqrt();
            assert!((chord - 18_520.0).abs() < 0.01, "{chord}");
        }
    }
}
