//! The ground track of a filed profile, cut into pieces.

use crate::day::Profile;
use crate::geometry::geodesic::{GeodesicLeg, LonLat, earth_centred_m};
use crate::units::METRES_PER_NM;

/// Longest piece of a leg, metres.
pub const LONGEST_PIECE_M: f64 = 10.0 * METRES_PER_NM;

/// A place on a track, when it is passed and at which level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Knot {
    /// When it is passed, seconds of the day.
    pub time_s: f64,
    /// When the filed profile passes it; the coordinate along the track.
    pub filed_s: f64,
    /// Longitude, degrees, -180 to 180.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// Earth-centred coordinates, metres: of the ellipsoid where the track is cut, of the chord
    /// between such places elsewhere.
    pub position_m: [f64; 3],
    /// Level, feet.
    pub level_ft: f64,
}

impl Knot {
    /// The knot at a share of the piece from `a` to `b` (position and filed time linear), passed at
    /// a time and level of its own.
    pub(crate) fn between(a: &Self, b: &Self, filed_s: f64, time_s: f64, level_ft: f64) -> Self {
        let share = ((filed_s - a.filed_s) / (b.filed_s - a.filed_s)).clamp(0.0, 1.0);
        let mix = |x: f64, y: f64| x + (y - x) * share;
        let mut lon_deg = a.lon_deg + lon_step_deg(a.lon_deg, b.lon_deg) * share;
        if lon_deg > 180.0 {
            lon_deg -= 360.0;
        } else if lon_deg < -180.0 {
            lon_deg += 360.0;
        }
        Self {
            time_s,
            filed_s,
            lon_deg,
            lat_deg: mix(a.lat_deg, b.lat_deg),
            position_m: std::array::from_fn(|k| mix(a.position_m[k], b.position_m[k])),
            level_ft,
        }
    }
}

/// The shorter way round from one longitude to another, degrees.
pub(crate) fn lon_step_deg(from_deg: f64, to_deg: f64) -> f64 {
    let step = to_deg - from_deg;
    if step > 180.0 {
        step - 360.0
    } else if step < -180.0 {
        step + 360.0
    } else {
        step
    }
}

/// The filed profile as knots: its points, and the cuts between them.
#[derive(Debug, Clone, PartialEq)]
pub struct Track {
    knots: Vec<Knot>,
    /// Index of the knot of each filed point.
    point_knots: Vec<u32>,
}

impl Track {
    /// Cuts the legs of a profile into the fewest equal-time pieces of at most 10 NM.
    #[must_use]
    pub fn new(profile: &Profile) -> Self {
        let points = profile.points();
        let mut knots = Vec::with_capacity(points.len() * 2);
        let mut point_knots = Vec::with_capacity(points.len());
        for (leg, ends) in points.windows(2).enumerate() {
            let (a, b) = (&ends[0], &ends[1]);
            let from = LonLat { lon_deg: a.lon_deg, lat_deg: a.lat_deg };
            let to = LonLat { lon_deg: b.lon_deg, lat_deg: b.lat_deg };
            let geodesic = GeodesicLeg::new(from, to);
            // A leg of exactly ten miles stays whole in spite of rounding.
            let pieces = (geodesic.length_m / LONGEST_PIECE_M - 1e-9).ceil().max(1.0);
            point_knots.push(knots.len() as u32);
            for piece in 0..pieces as usize {
                let share = piece as f64 / pieces;
                let time_s = a.time_s + (b.time_s - a.time_s) * share;
                let level_ft = a.level_ft + (b.level_ft - a.level_ft) * share;
                knots.push(knot(geodesic.at(share), time_s, level_ft));
            }
            if leg + 2 == points.len() {
                point_knots.push(knots.len() as u32);
                knots.push(knot(to, b.time_s, b.level_ft));
            }
        }
        knots.shrink_to_fit();
        Self { knots, point_knots }
    }

    /// The knots, at least two, in time order.
    #[must_use]
    pub fn knots(&self) -> &[Knot] {
        &self.knots
    }

    /// The knot index of each filed point.
    #[must_use]
    pub fn point_knots(&self) -> &[u32] {
        &self.point_knots
    }

    /// Index of the piece that holds a filed time; at a knot, the piece that follows (the last
    /// piece at the end).
    #[must_use]
    pub fn piece_at(&self, filed_s: f64) -> usize {
        let after = self.knots.partition_point(|k| k.filed_s <= filed_s);
        after.saturating_sub(1).min(self.knots.len() - 2)
    }
}

fn knot(place: LonLat, time_s: f64, level_ft: f64) -> Knot {
    Knot {
        time_s,
        filed_s: time_s,
        lon_deg: place.lon_deg,
        lat_deg: place.lat_deg,
        position_m: earth_centred_m(place),
        level_ft,
    }
}
