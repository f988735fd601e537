//! When are two points that move in straight lines at constant speeds closer than a distance?
//!
//! The square of their distance is a quadratic of time, so the answer is an interval between two
//! roots, exact but for rounding.

/// Mean radius of the earth, metres (IUGG).
const MEAN_RADIUS_M: f64 = 6_371_008.8;
/// First eccentricity squared of WGS 84, from its flattening 1/298.257223563.
const ECCENTRICITY_SQUARED: f64 = {
    let f = 1.0 / 298.257_223_563;
    f * (2.0 - f)
};

/// The straight chord that spans a distance along the surface, metres. At 5 NM it is 0.8 mm
/// shorter; at 200 NM, 52 m, of which this spherical value is right to half a metre.
#[must_use]
pub fn chord_m(surface_m: f64) -> f64 {
    2.0 * MEAN_RADIUS_M * (surface_m / (2.0 * MEAN_RADIUS_M)).sin()
}

/// The distance along the surface that a straight chord spans, metres.
#[must_use]
pub fn surface_m(chord_m: f64) -> f64 {
    2.0 * MEAN_RADIUS_M * (chord_m / (2.0 * MEAN_RADIUS_M)).min(1.0).asin()
}

/// Horizontal distance between two places given in earth-centred coordinates, metres.
///
/// Points on the chord of a 10 NM piece lie up to 7 m below the ellipsoid. What is vertical in
/// their difference is left out, so that two flights over one place are zero metres apart.
#[must_use]
pub fn horizontal_m(a: [f64; 3], b: [f64; 3]) -> f64 {
    let apart = minus(a, b);
    let midway: [f64; 3] = std::array::from_fn(|k| 0.5 * (a[k] + b[k]));
    let squared = dot(apart, apart) - along_up_squared(apart, midway);
    surface_m(squared.max(0.0).sqrt())
}

/// Square of what is vertical, at a place near the ellipsoid, in a vector; square metres.
#[must_use]
pub fn along_up_squared(vector_m: [f64; 3], place_m: [f64; 3]) -> f64 {
    // Normal of the ellipsoid, up to its length.
    let up = [place_m[0], place_m[1], place_m[2] / (1.0 - ECCENTRICITY_SQUARED)];
    let along_up = dot(vector_m, up);
    along_up * along_up / dot(up, up).max(f64::MIN_POSITIVE)
}

/// A point that moves in a straight line at constant speed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Motion {
    /// A time at which its place is known, seconds.
    pub at_s: f64,
    /// Its place then, metres.
    pub place_m: [f64; 3],
    /// Its velocity, metres per second.
    pub velocity_mps: [f64; 3],
}

impl Motion {
    /// From one place to another between two times, the second later than the first.
    #[must_use]
    pub fn between(from_s: f64, from_m: [f64; 3], until_s: f64, until_m: [f64; 3]) -> Self {
        let duration_s = until_s - from_s;
        let velocity_mps = minus(until_m, from_m).map(|d| d / duration_s);
        Self { at_s: from_s, place_m: from_m, velocity_mps }
    }

    /// Where it is at a time, metres.
    #[must_use]
    pub fn at(&self, time_s: f64) -> [f64; 3] {
        let after_s = time_s - self.at_s;
        std::array::from_fn(|k| self.place_m[k] + self.velocity_mps[k] * after_s)
    }
}

/// The motion of one point as seen from another, from a moment on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Relative {
    from_s: f64,
    offset_m: [f64; 3],
    velocity_mps: [f64; 3],
}

impl Relative {
    /// The motion of `a` as seen from `b`, written about a moment.
    #[must_use]
    pub fn new(a: &Motion, b: &Motion, from_s: f64) -> Self {
        let offset_m = minus(a.at(from_s), b.at(from_s));
        Self { from_s, offset_m, velocity_mps: minus(a.velocity_mps, b.velocity_mps) }
    }

    /// The open interval of times in which they are closer than a distance, infinite where they
    /// always are; `None` where they never are.
    #[must_use]
    pub fn closer_than(&self, distance_m: f64) -> Option<(f64, f64)> {
        let a = dot(self.velocity_mps, self.velocity_mps);
        let b = dot(self.velocity_mps, self.offset_m);
        let c = dot(self.offset_m, self.offset_m) - distance_m * distance_m;
        let (low, high) = below_zero(a, b, c)?;
        Some((self.from_s + low, self.from_s + high))
    }

    /// The time within an interval at which they are closest.
    #[must_use]
    pub fn closest_within(&self, from_s: f64, until_s: f64) -> f64 {
        let a = dot(self.velocity_mps, self.velocity_mps);
        let b = dot(self.velocity_mps, self.offset_m);
        if a > 0.0 { (self.from_s - b / a).clamp(from_s, until_s) } else { from_s }
    }
}

/// The open interval in which `a x² + 2 b x + c < 0`, with `a >= 0`; `None` where there is none.
#[must_use]
pub fn below_zero(a: f64, b: f64, c: f64) -> Option<(f64, f64)> {
    if a == 0.0 {
        // A square distance that does not change has no linear term either.
        return (c < 0.0).then_some((f64::NEG_INFINITY, f64::INFINITY));
    }
    let discriminant = b * b - a * c;
    if discriminant <= 0.0 {
        return None;
    }
    // The root of larger size first, the other from their product: no cancellation.
    let q = -(b + discriminant.sqrt().copysign(b));
    let (one, other) = (q / a, c / q);
    Some((one.min(other), one.max(other)))
}

/// Difference of two vectors.
#[must_use]
pub fn minus(a: [f64; 3], b: [f64; 3]) -> [f64; 3] {
    std::array::from_fn(|k| a[k] - b[k])
}

/// Scalar product of two vectors.
#[must_use]
pub fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;
    use crate::geometry::geodesic::{LonLat, distance_m, earth_centred_m};

    #[test]
    fn chords_and_surface_distances_are_inverse() {
        for nm in [0.0, 5.0, 20.0, 200.0] {
            let surface = nm * 1852.0;
            assert!((surface_m(chord_m(surface)) - surface).abs() < 1e-6, "{nm} NM");
        }
        assert!((9260.0 - chord_m(9260.0) - 0.000_815).abs() < 1e-5);
    }

    #[test]
    fn points_that_keep_their_distance_are_always_or_never_closer() {
        let at =
            |x: f64| Motion { at_s: 0.0, place_m: [x, 0.0, 0.0], velocity_mps: [0.0, 9.0, 0.0] };
        let relative = Relative::new(&at(0.0), &at(10.0), 5.0);
        assert_eq!(relative.closer_than(10.0), None);
        assert_eq!(relative.closer_than(10.1), Some((f64::NEG_INFINITY, f64::INFINITY)));
        assert_eq!(relative.closest_within(3.0, 8.0), 3.0);
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 3000, failure_persistence: None, ..ProptestConfig::default() })]

        /// The closest approach, against the smallest of many samples, and the interval, against
        /// the samples inside and outside it.
        #[test]
        fn agrees_with_dense_sampling(
            places in prop::array::uniform6(-30_000.0..30_000.0f64),
            speeds in prop::array::uniform6(-300.0..300.0f64),
            start_s in -1e5..1e5f64,
            limit_m in 100.0..40_000.0f64,
        ) {
            let a = Motion { at_s: start_s, place_m: [places[0], places[1], places[2]],
                velocity_mps: [speeds[0], speeds[1], speeds[2]] };
            let b = Motion { at_s: start_s + 7.0, place_m: [places[3], places[4], places[5]],
                velocity_mps: [speeds[3], speeds[4], speeds[5]] };
            let apart = |t: f64| { let d = minus(a.at(t), b.at(t)); dot(d, d).sqrt() };
            let relative = Relative::new(&a, &b, start_s + 11.0);
            let closest = relative.closest_within(start_s, start_s + 200.0);
            let interval = relative.closer_than(limit_m);
            for step in 0..=2000 {
                let t = start_s + f64::from(step) * 0.1;
                prop_assert!(apart(closest) <= apart(t) + 1e-6);
                let inside = interval.is_some_and(|(low, high)| low < t && t < high);
                prop_assert!(inside == (apart(t) < limit_m) || (apart(t) - limit_m).abs() < 1e-5);
            }
        }

        /// Horizontal distances of points on chords, against WGS 84 geodesics between the same
        /// places on the ellipsoid.
        #[test]
        fn horizontal_distances_are_geodesic_ones(
            lon_deg in -180.0..180.0f64, lat_deg in -89.0..89.0f64,
            east in -0.15..0.15f64, north in -0.15..0.15f64, depth_m in -7.0..7.0f64,
        ) {
            let a = LonLat { lon_deg, lat_deg };
            let b = LonLat { lon_deg: lon_deg + east, lat_deg: lat_deg + north };
            let below = earth_centred_m(b).map(|x| x * (1.0 + depth_m / 6_371_000.0));
            let error_m = horizontal_m(earth_centred_m(a), below) - distance_m(a, b);
            prop_assert!(error_m.abs() < 0.2, "{} m", error_m);
        }
    }
}
