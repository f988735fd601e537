//! One piece of a path, and when it is inside one volume.

use super::index::Cover;
use crate::day::Volume;
use crate::path::{Knot, lon_step_deg};

/// A crossing this little beyond the end of an edge counts, as a share of the edge. A crossing too
/// many costs nothing, because what is inside is decided between crossings.
const BEYOND_EDGE: f64 = 1e-9;

/// From one knot to the next: straight in longitude and latitude, level linear in time.
#[derive(Debug, Clone, Copy)]
pub(super) struct Piece {
    /// Longitude where it starts, degrees; the end may lie beyond 180.
    lon_deg: f64,
    lat_deg: f64,
    lon_step_deg: f64,
    lat_step_deg: f64,
    level_ft: f64,
    level_step_ft: f64,
    from_s: f64,
    until_s: f64,
}

impl Piece {
    pub(super) fn new(a: &Knot, b: &Knot) -> Self {
        Self {
            lon_deg: a.lon_deg,
            lat_deg: a.lat_deg,
            lon_step_deg: lon_step_deg(a.lon_deg, b.lon_deg),
            lat_step_deg: b.lat_deg - a.lat_deg,
            level_ft: a.level_ft,
            level_step_ft: b.level_ft - a.level_ft,
            from_s: a.time_s,
            until_s: b.time_s,
        }
    }

    /// The same piece, one turn of the globe away, where it reaches the meridian of 180 degrees,
    /// which polygons know by two names.
    pub(super) fn turned(&self) -> Option<Self> {
        let end = self.lon_deg + self.lon_step_deg;
        let turn = if self.lon_deg.max(end) >= 180.0 {
            -360.0
        } else if self.lon_deg.min(end) <= -180.0 {
            360.0
        } else {
            return None;
        };
        Some(Self { lon_deg: self.lon_deg + turn, ..*self })
    }

    /// The box around it: west, south, east, north.
    pub(super) fn bounds(&self) -> [f64; 4] {
        let (lon_end, lat_end) =
            (self.lon_deg + self.lon_step_deg, self.lat_deg + self.lat_step_deg);
        [
            self.lon_deg.min(lon_end),
            self.lat_deg.min(lat_end),
            self.lon_deg.max(lon_end),
            self.lat_deg.max(lat_end),
        ]
    }

    /// Its lowest and its highest level, feet.
    pub(super) fn levels_ft(&self) -> (f64, f64) {
        let end = self.level_ft + self.level_step_ft;
        (self.level_ft.min(end), self.level_ft.max(end))
    }

    /// Calls `found` with each interval of time in which the piece is inside a volume.
    ///
    /// Crossings of floor, ceiling and edges cut the piece; the middle of each part decides.
    /// `cuts` is working space.
    pub(super) fn inside(
        &self,
        volume: &Volume,
        cover: Cover,
        cuts: &mut Vec<f64>,
        mut found: impl FnMut(f64, f64),
    ) {
        cuts.clear();
        cuts.push(0.0);
        if self.level_step_ft != 0.0 {
            for level_ft in [volume.floor_ft, volume.ceiling_ft] {
                push_inner(cuts, (level_ft - self.level_ft) / self.level_step_ft);
            }
        }
        if cover == Cover::Part {
            self.cut_at_edges(volume, cuts);
        }
        cuts.push(1.0);
        cuts.sort_unstable_by(f64::total_cmp);
        let mut since = None;
        for part in cuts.windows(2).filter(|part| part[0] < part[1]) {
            if self.is_inside(volume, cover, 0.5 * (part[0] + part[1])) {
                since.get_or_insert(part[0]);
            } else if let Some(share) = since.take() {
                found(self.time_s(share), self.time_s(part[0]));
            }
        }
        if let Some(share) = since {
            found(self.time_s(share), self.until_s);
        }
    }

    fn cut_at_edges(&self, volume: &Volume, cuts: &mut Vec<f64>) {
        let [west, south, east, north] = self.bounds();
        // `for_each` rather than `for`: nested iterators are several times faster from within.
        volume.polygon.edges().for_each(|(p, q)| {
            let beyond = (p[0] < west && q[0] < west)
                || (p[0] > east && q[0] > east)
                || (p[1] < south && q[1] < south)
                || (p[1] > north && q[1] > north);
            if !beyond && let Some(share) = self.crossing(p, q) {
                push_inner(cuts, share);
            }
        });
    }

    /// Where the line of the piece meets an edge, as a share of the piece.
    fn crossing(&self, p: [f64; 2], q: [f64; 2]) -> Option<f64> {
        // Whichever way a polygon runs along an edge, the crossing is the same number.
        let (p, q) = if (p[1], p[0]) <= (q[1], q[0]) { (p, q) } else { (q, p) };
        let edge = [q[0] - p[0], q[1] - p[1]];
        let to_edge = [p[0] - self.lon_deg, p[1] - self.lat_deg];
        let across = self.lon_step_deg * edge[1] - self.lat_step_deg * edge[0];
        // Along an edge nothing changes; where the edge ends, its neighbours are crossed.
        if across == 0.0 {
            return None;
        }
        let along_edge = (to_edge[0] * self.lat_step_deg - to_edge[1] * self.lon_step_deg) / across;
        let meets = (-BEYOND_EDGE..=1.0 + BEYOND_EDGE).contains(&along_edge);
        meets.then(|| (to_edge[0] * edge[1] - to_edge[1] * edge[0]) / across)
    }

    fn is_inside(&self, volume: &Volume, cover: Cover, share: f64) -> bool {
        let level_ft = self.level_ft + self.level_step_ft * share;
        volume.floor_ft <= level_ft
            && level_ft < volume.ceiling_ft
            && (cover == Cover::Whole
                || volume.polygon.contains(
                    self.lon_deg + self.lon_step_deg * share,
                    self.lat_deg + self.lat_step_deg * share,
                ))
    }

    fn time_s(&self, share: f64) -> f64 {
        (self.from_s + (self.until_s - self.from_s) * share).min(self.until_s)
    }
}

/// Keeps a cut that lies within the piece (not-a-number does not).
fn push_inner(cuts: &mut Vec<f64>, share: f64) {
    if share > 0.0 && share < 1.0 {
        cuts.push(share);
    }
}
