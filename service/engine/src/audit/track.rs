//! The ground track of a filed flight: where it is at a filed time, whoever flies it when.
//!
//! A level change moves no place of a track, only the time at which it is passed; so filed time is
//! the measure along a track, for filed and moved flights alike.

use crate::day::{Point, Profile};
use crate::geometry::geodesic::{GeodesicLeg, LonLat, distance_m, earth_centred_m};
use crate::units::nm_to_m;

/// Longest piece of the polyline by which what is inside a polygon is decided, NM.
const PIECE_NM: f64 = 10.0;
/// Mean radius of the Earth, metres; only for what a chord of 10 NM and its arc differ by.
const EARTH_RADIUS_M: f64 = 6_371_000.0;

/// A filed track with its levels.
#[derive(Debug)]
pub(super) struct Track {
    filed_s: Vec<f64>,
    levels_ft: Vec<f64>,
    legs: Vec<GeodesicLeg>,
    cruise: Vec<bool>,
    cuts: Vec<Cut>,
    /// Greatest ground speed as filed, m/s.
    pub(super) fastest_mps: f64,
    /// Greatest speed in the plane of longitude and latitude as filed, degrees a second.
    pub(super) fastest_degps: f64,
}

/// A cut of the polyline: legs are divided into the fewest equal pieces of at most 10 NM.
#[derive(Debug, Clone, Copy)]
struct Cut {
    filed_s: f64,
    place: LonLat,
    centred_m: [f64; 3],
}

impl Cut {
    fn new(filed_s: f64, place: LonLat) -> Self {
        Self { filed_s, place, centred_m: earth_centred_m(place) }
    }
}

fn place_of(point: &Point) -> LonLat {
    LonLat { lon_deg: point.lon_deg, lat_deg: point.lat_deg }
}

/// The change of longitude from one place to another, the short way round.
fn lon_change_deg(from_deg: f64, to_deg: f64) -> f64 {
    let change = to_deg - from_deg;
    if change > 180.0 {
        change - 360.0
    } else if change < -180.0 {
        change + 360.0
    } else {
        change
    }
}

impl Track {
    /// The track of a filed profile.
    pub(super) fn new(profile: &Profile, cruise_floor_ft: f64) -> Self {
        let points = profile.points();
        let mut track = Self {
            filed_s: points.iter().map(|p| p.time_s).collect(),
            levels_ft: points.iter().map(|p| p.level_ft).collect(),
            legs: Vec::with_capacity(points.len() - 1),
            cruise: Vec::with_capacity(points.len() - 1),
            cuts: Vec::new(),
            fastest_mps: 0.0,
            fastest_degps: 0.0,
        };
        for (i, ends) in points.windows(2).enumerate() {
            let (a, b) = (&ends[0], &ends[1]);
            let leg = GeodesicLeg::new(place_of(a), place_of(b));
            let duration_s = b.time_s - a.time_s;
            let pieces = (leg.length_m / nm_to_m(PIECE_NM)).ceil().max(1.0);
            for k in 0..pieces as u32 {
                let share = f64::from(k) / pieces;
                track.cuts.push(Cut::new(a.time_s + duration_s * share, leg.at(share)));
            }
            track.fastest_mps = track.fastest_mps.max(leg.length_m / duration_s);
            track.legs.push(leg);
            track.cruise.push(profile.is_cruise_leg(i, cruise_floor_ft));
        }
        if let Some(last) = points.last() {
            track.cuts.push(Cut::new(last.time_s, place_of(last)));
        }
        for ends in track.cuts.windows(2) {
            let (a, b) = (ends[0], ends[1]);
            let lon = lon_change_deg(a.place.lon_deg, b.place.lon_deg);
            let degrees = lon.hypot(b.place.lat_deg - a.place.lat_deg);
            track.fastest_degps = track.fastest_degps.max(degrees / (b.filed_s - a.filed_s));
        }
        track
    }

    /// Number of legs.
    pub(super) fn leg_count(&self) -> usize {
        self.legs.len()
    }

    /// Filed times of both ends of a leg.
    pub(super) fn leg_times_s(&self, leg: usize) -> (f64, f64) {
        (self.filed_s[leg], self.filed_s[leg + 1])
    }

    /// Filed levels of both ends of a leg, feet.
    pub(super) fn leg_levels_ft(&self, leg: usize) -> (f64, f64) {
        (self.levels_ft[leg], self.levels_ft[leg + 1])
    }

    /// Length of a leg, metres.
    pub(super) fn leg_length_m(&self, leg: usize) -> f64 {
        self.legs[leg].length_m
    }

    /// Whether a leg is level at or above the cruise floor.
    pub(super) fn is_cruise(&self, leg: usize) -> bool {
        self.cruise[leg]
    }

    /// Filed times of all points.
    pub(super) fn times_s(&self) -> &[f64] {
        &self.filed_s
    }

    /// First filed time.
    pub(super) fn start_s(&self) -> f64 {
        self.filed_s[0]
    }

    /// Last filed time.
    pub(super) fn end_s(&self) -> f64 {
        self.filed_s[self.filed_s.len() - 1]
    }

    /// The leg at a filed time; at a point the leg that follows, at the very end the last.
    pub(super) fn leg_at(&self, filed_s: f64) -> usize {
        let after = self.filed_s.partition_point(|&t| t <= filed_s);
        after.saturating_sub(1).min(self.legs.len() - 1)
    }

    /// Share of a leg flown at a filed time.
    pub(super) fn leg_share(&self, leg: usize, filed_s: f64) -> f64 {
        let (from_s, until_s) = self.leg_times_s(leg);
        ((filed_s - from_s) / (until_s - from_s)).clamp(0.0, 1.0)
    }

    /// Filed level at a filed time, feet; exact on level legs.
    pub(super) fn level_ft(&self, filed_s: f64) -> f64 {
        let leg = self.leg_at(filed_s);
        let (a, b) = self.leg_levels_ft(leg);
        a + (b - a) * self.leg_share(leg, filed_s)
    }

    /// True track at a filed time on a leg, degrees.
    pub(super) fn track_deg(&self, leg: usize, filed_s: f64) -> f64 {
        self.legs[leg].track_at_deg(self.leg_share(leg, filed_s))
    }

    /// The place on the geodesic at a filed time.
    pub(super) fn geodesic_place(&self, filed_s: f64) -> LonLat {
        let leg = self.leg_at(filed_s);
        self.legs[leg].at(self.leg_share(leg, filed_s))
    }

    fn piece(&self, filed_s: f64) -> (Cut, Cut, f64) {
        let after = self.cuts.partition_point(|cut| cut.filed_s <= filed_s);
        let i = after.saturating_sub(1).min(self.cuts.len() - 2);
        let (a, b) = (self.cuts[i], self.cuts[i + 1]);
        (a, b, ((filed_s - a.filed_s) / (b.filed_s - a.filed_s)).clamp(0.0, 1.0))
    }

    /// The place on the polyline at a filed time, straight in longitude and latitude.
    pub(super) fn polyline_place(&self, filed_s: f64) -> LonLat {
        let (a, b, share) = self.piece(filed_s);
        let lon = a.place.lon_deg + lon_change_deg(a.place.lon_deg, b.place.lon_deg) * share;
        let lon_deg = if lon > 180.0 {
            lon - 360.0
        } else if lon < -180.0 {
            lon + 360.0
        } else {
            lon
        };
        let lat_deg = a.place.lat_deg + (b.place.lat_deg - a.place.lat_deg) * share;
        LonLat { lon_deg, lat_deg }
    }

    /// The place at a filed time from the Earth's centre, metres: on the chord of its piece, lifted
    /// by the height of the arc above it.
    pub(super) fn centred_m(&self, filed_s: f64) -> [f64; 3] {
        let (a, b, share) = self.piece(filed_s);
        let (a, b) = (a.centred_m, b.centred_m);
        let chord2 = (0..3).map(|k| (b[k] - a[k]).powi(2)).sum::<f64>();
        let lift = 1.0 + chord2 * share * (1.0 - share) / (2.0 * EARTH_RADIUS_M * EARTH_RADIUS_M);
        std::array::from_fn(|k| (a[k] + (b[k] - a[k]) * share) * lift)
    }

    /// Boxes in degrees around the pieces of the polyline, each with the number of its piece: west,
    /// south, east, north. A piece that crosses the 180th meridian gives two.
    pub(super) fn boxes(&self) -> impl Iterator<Item = (usize, [f64; 4])> + '_ {
        self.cuts.windows(2).enumerate().flat_map(|(piece, ends)| {
            let (a, b) = (ends[0].place, ends[1].place);
            let (south, north) = (a.lat_deg.min(b.lat_deg), a.lat_deg.max(b.lat_deg));
            let (west, east) = (a.lon_deg.min(b.lon_deg), a.lon_deg.max(b.lon_deg));
            let boxes = if east - west > 180.0 {
                [Some([east, south, 180.0, north]), Some([-180.0, south, west, north])]
            } else {
                [Some([west, south, east, north]), None]
            };
            boxes.into_iter().flatten().map(move |b| (piece, b))
        })
    }

    /// Filed times of both ends of a piece of the polyline.
    pub(super) fn piece_times_s(&self, piece: usize) -> (f64, f64) {
        (self.cuts[piece].filed_s, self.cuts[piece + 1].filed_s)
    }
}

/// Distance over ground between two places given from the Earth's centre, metres; within
/// centimetres of the geodesic.
pub(super) fn ground_distance_m(a: [f64; 3], b: [f64; 3]) -> f64 {
    let chord_m = (0..3).map(|k| (a[k] - b[k]).powi(2)).sum::<f64>().sqrt();
    // Third-order term of 2 R asin(c / 2 R).
    chord_m * (1.0 + (chord_m / EARTH_RADIUS_M).powi(2) / 24.0)
}

/// Geodesic distance between two places, metres.
pub(super) fn geodesic_distance_m(a: LonLat, b: LonLat) -> f64 {
    distance_m(a, b)
}
