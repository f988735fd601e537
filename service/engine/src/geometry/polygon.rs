//! Polygons with edges straight in longitude and latitude (RFC 7946).

/// A polygon with holes: closed rings of finite numbers.
///
/// Inside is by the even-odd rule over all rings; a west or south edge belongs to the inside, an
/// east or north one does not, so that polygons that share an edge share no point.
#[derive(Debug, Clone, PartialEq)]
pub struct Polygon {
    rings: Vec<Vec<[f64; 2]>>,
    bounds: Bounds,
}

/// A box in degrees.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bounds {
    /// Western edge.
    pub west: f64,
    /// Southern edge.
    pub south: f64,
    /// Eastern edge.
    pub east: f64,
    /// Northern edge.
    pub north: f64,
}

/// Why rings do not make a polygon.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum PolygonError {
    /// No ring at all.
    #[error("has no ring")]
    Empty,
    /// A ring of fewer than four positions.
    #[error("ring {ring} has {positions} positions, fewer than 4")]
    TooFewPositions {
        /// The ring.
        ring: usize,
        /// How many positions it has.
        positions: usize,
    },
    /// First and last position differ.
    #[error("ring {ring} is open: its first and last positions differ")]
    Open {
        /// The ring.
        ring: usize,
    },
    /// A position is not finite or not on the globe.
    #[error("ring {ring}, position {position}: [{lon}, {lat}] is not on the globe")]
    OffGlobe {
        /// The ring.
        ring: usize,
        /// The position.
        position: usize,
        /// Its longitude.
        lon: f64,
        /// Its latitude.
        lat: f64,
    },
    /// An edge spans more than 180 degrees of longitude.
    #[error("ring {ring}: the edge from position {position} spans more than 180 degrees")]
    LongEdge {
        /// The ring.
        ring: usize,
        /// Where the edge starts.
        position: usize,
    },
    /// Two edges cross or overlap.
    #[error("crosses itself near [{lon:.4}, {lat:.4}]")]
    SelfCrossing {
        /// Longitude of the crossing.
        lon: f64,
        /// Latitude of the crossing.
        lat: f64,
    },
    /// A ring encloses nothing.
    #[error("ring {ring} has no area")]
    NoArea {
        /// The ring.
        ring: usize,
    },
}

impl Polygon {
    /// A polygon of rings `[lon, lat]`; the first is the outer boundary, others are holes.
    ///
    /// # Errors
    /// The first thing that is wrong with the rings.
    pub fn new(rings: Vec<Vec<[f64; 2]>>) -> Result<Self, PolygonError> {
        if rings.is_empty() {
            return Err(PolygonError::Empty);
        }
        for (ring, positions) in rings.iter().enumerate() {
            check_ring(ring, positions)?;
        }
        check_crossings(&rings)?;
        let mut bounds = Bounds {
            west: f64::INFINITY,
            south: f64::INFINITY,
            east: f64::NEG_INFINITY,
            north: f64::NEG_INFINITY,
        };
        for &[lon, lat] in &rings[0] {
            bounds.west = bounds.west.min(lon);
            bounds.east = bounds.east.max(lon);
            bounds.south = bounds.south.min(lat);
            bounds.north = bounds.north.max(lat);
        }
        Ok(Self { rings, bounds })
    }

    /// Its closed rings.
    #[must_use]
    pub fn rings(&self) -> &[Vec<[f64; 2]>] {
        &self.rings
    }

    /// The box around it.
    #[must_use]
    pub fn bounds(&self) -> Bounds {
        self.bounds
    }

    /// All edges, as pairs of positions.
    pub fn edges(&self) -> impl Iterator<Item = ([f64; 2], [f64; 2])> + '_ {
        self.rings.iter().flat_map(|ring| ring.windows(2).map(|w| (w[0], w[1])))
    }

    /// Whether two polygons share area: their outlines cross, or one holds a point of the other's
    /// inside. Polygons that only touch share none.
    #[must_use]
    pub fn shares_area_with(&self, other: &Self) -> bool {
        let (a, b) = (self.bounds, other.bounds);
        if a.west >= b.east || b.west >= a.east || a.south >= b.north || b.south >= a.north {
            return false;
        }
        let crosses =
            self.edges().any(|(p, q)| other.edges().any(|(r, s)| crosses_clearly(p, q, r, s)));
        crosses
            || self.interior_point().is_some_and(|[lon, lat]| other.contains(lon, lat))
            || other.interior_point().is_some_and(|[lon, lat]| self.contains(lon, lat))
    }

    /// A point well inside: the middle of the widest inner span at the height of an edge's middle.
    fn interior_point(&self) -> Option<[f64; 2]> {
        let mut best: Option<([f64; 2], f64)> = None;
        for (a, b) in self.edges().take(16) {
            let lat = 0.5 * (a[1] + b[1]) + 1e-7 * (self.bounds.north - self.bounds.south);
            let mut lons: Vec<f64> = self
                .edges()
                .filter(|(a, b)| (a[1] > lat) != (b[1] > lat))
                .map(|(a, b)| edge_lon_at(a, b, lat))
                .collect();
            lons.sort_by(f64::total_cmp);
            for w in lons.chunks_exact(2) {
                let width = w[1] - w[0];
                if best.is_none_or(|(_, widest)| width > widest) {
                    best = Some(([0.5 * (w[0] + w[1]), lat], width));
                }
            }
        }
        best.map(|(point, _)| point)
    }

    /// Whether a point is inside.
    #[must_use]
    pub fn contains(&self, lon_deg: f64, lat_deg: f64) -> bool {
        let b = self.bounds;
        if lon_deg < b.west || lon_deg > b.east || lat_deg < b.south || lat_deg > b.north {
            return false;
        }
        // A ray to the east: an edge counts if it spans the latitude, half-open.
        let is_crossed = |(a, b): &([f64; 2], [f64; 2])| {
            (a[1] > lat_deg) != (b[1] > lat_deg) && lon_deg < edge_lon_at(*a, *b, lat_deg)
        };
        self.edges().filter(is_crossed).count() % 2 == 1
    }
}

/// Longitude of a non-horizontal edge at a latitude, the same whichever way the edge runs, so that
/// polygons that share an edge agree about a point on it.
pub(crate) fn edge_lon_at(a: [f64; 2], b: [f64; 2], lat_deg: f64) -> f64 {
    let (low, high) = if a[1] <= b[1] { (a, b) } else { (b, a) };
    low[0] + (high[0] - low[0]) * ((lat_deg - low[1]) / (high[1] - low[1]))
}

fn check_ring(ring: usize, positions: &[[f64; 2]]) -> Result<(), PolygonError> {
    if positions.len() < 4 {
        return Err(PolygonError::TooFewPositions { ring, positions: positions.len() });
    }
    for (position, &[lon, lat]) in positions.iter().enumerate() {
        // Not-a-number fails both comparisons.
        if !(lon.abs() <= 180.0 && lat.abs() <= 90.0) {
            return Err(PolygonError::OffGlobe { ring, position, lon, lat });
        }
    }
    if positions.first() != positions.last() {
        return Err(PolygonError::Open { ring });
    }
    if let Some(position) = positions.windows(2).position(|w| (w[0][0] - w[1][0]).abs() > 180.0) {
        return Err(PolygonError::LongEdge { ring, position });
    }
    let twice_area: f64 = positions.windows(2).map(|w| cross(w[0], w[1])).sum();
    if twice_area.abs() < 1e-12 {
        return Err(PolygonError::NoArea { ring });
    }
    Ok(())
}

fn cross(a: [f64; 2], b: [f64; 2]) -> f64 {
    a[0] * b[1] - a[1] * b[0]
}

/// Edges may meet in shared end points only; a sweep over edges sorted by their western end keeps
/// long outlines cheap.
fn check_crossings(rings: &[Vec<[f64; 2]>]) -> Result<(), PolygonError> {
    let mut edges: Vec<([f64; 2], [f64; 2])> = rings
        .iter()
        .flat_map(|ring| ring.windows(2).map(|w| (w[0], w[1])))
        // A repeated position makes no edge.
        .filter(|(a, b)| a != b)
        .collect();
    let west = |edge: &([f64; 2], [f64; 2])| edge.0[0].min(edge.1[0]);
    edges.sort_by(|x, y| west(x).total_cmp(&west(y)));
    for (i, &(a, b)) in edges.iter().enumerate() {
        let east = a[0].max(b[0]);
        for &(c, d) in edges[i + 1..].iter().take_while(|y| west(y) <= east) {
            if let Some([lon, lat]) = crossing(a, b, c, d) {
                return Err(PolygonError::SelfCrossing { lon, lat });
            }
        }
    }
    Ok(())
}

/// Degrees (about a decimetre) by which an edge must reach over another to cross it: outlines that
/// follow the same line between different positions touch, whatever the rounding.
const CLEARLY_DEG: f64 = 1e-6;

/// Whether both ends of each edge lie clearly on different sides of the other.
fn crosses_clearly(p: [f64; 2], q: [f64; 2], r: [f64; 2], s: [f64; 2]) -> bool {
    let parted = |a: [f64; 2], b: [f64; 2], c: [f64; 2], d: [f64; 2]| {
        let length = (b[0] - a[0]).hypot(b[1] - a[1]);
        let (c, d) = (side_of(a, b, c) / length, side_of(a, b, d) / length);
        c.min(d) < -CLEARLY_DEG && c.max(d) > CLEARLY_DEG
    };
    parted(p, q, r, s) && parted(r, s, p, q)
}

/// Twice the signed area of a triangle: positive where `r` lies left of the line from `p` to `q`.
fn side_of(p: [f64; 2], q: [f64; 2], r: [f64; 2]) -> f64 {
    (q[0] - p[0]) * (r[1] - p[1]) - (q[1] - p[1]) * (r[0] - p[0])
}

/// Where two edges cross properly or run over each other. Edges that only touch (an end point on
/// the other edge) are harmless to the even-odd rule.
fn crossing(a: [f64; 2], b: [f64; 2], c: [f64; 2], d: [f64; 2]) -> Option<[f64; 2]> {
    let (ca, cb) = (side_of(c, d, a), side_of(c, d, b));
    let (ac, ad) = (side_of(a, b, c), side_of(a, b, d));
    if ca * cb < 0.0 && ac * ad < 0.0 {
        let share = ca / (ca - cb);
        return Some([a[0] + share * (b[0] - a[0]), a[1] + share * (b[1] - a[1])]);
    }
    let collinear = ca == 0.0 && cb == 0.0 && ac == 0.0 && ad == 0.0;
    if !collinear {
        return None;
    }
    // On one line: an overlap of more than a point.
    let axis = usize::from((b[0] - a[0]).abs() < (b[1] - a[1]).abs());
    let low = a[axis].min(b[axis]).max(c[axis].min(d[axis]));
    let high = a[axis].max(b[axis]).min(c[axis].max(d[axis]));
    (low < high).then(|| if a[axis] < low { b } else { a })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square() -> Polygon {
        Polygon::new(vec![vec![[0.0, 0.0], [2.0, 0.0], [2.0, 2.0], [0.0, 2.0], [0.0, 0.0]]])
            .unwrap()
    }

    #[test]
    fn west_and_south_edges_are_inside_east_and_north_are_not() {
        let p = square();
        assert!(p.contains(0.0, 1.0) && p.contains(1.0, 0.0) && p.contains(0.0, 0.0));
        assert!(!p.contains(2.0, 1.0) && !p.contains(1.0, 2.0));
    }

    #[test]
    fn a_hole_is_outside() {
        let mut rings = square().rings().to_vec();
        rings.push(vec![[0.5, 0.5], [0.5, 1.5], [1.5, 1.5], [1.5, 0.5], [0.5, 0.5]]);
        let p = Polygon::new(rings).unwrap();
        assert!(!p.contains(1.0, 1.0));
        assert!(p.contains(0.25, 1.0));
    }

    #[test]
    fn polygons_that_touch_along_a_slanted_line_share_no_area() {
        // Both follow the line from (0, 0) to (3, 1), with positions of their own.
        let above = vec![[0.0, 0.0], [0.3, 0.1], [3.0, 1.0], [0.0, 3.0], [0.0, 0.0]];
        let below = vec![[0.0, 0.0], [3.0, -1.0], [3.0, 1.0], [2.1, 0.7], [0.0, 0.0]];
        let [above, below] = [above, below].map(|ring| Polygon::new(vec![ring]).unwrap());
        assert!(!above.shares_area_with(&below) && !below.shares_area_with(&above));
        let over = vec![[0.0, 0.0], [3.0, -1.0], [3.0, 1.1], [0.0, 0.0]];
        assert!(above.shares_area_with(&Polygon::new(vec![over]).unwrap()));
        assert!(square().shares_area_with(&square()));
    }

    #[test]
    fn faults_are_named() {
        let open = Polygon::new(vec![vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]]);
        assert!(matches!(open, Err(PolygonError::Open { ring: 0 })));
        let bow_tie =
            Polygon::new(vec![vec![[0.0, 0.0], [2.0, 2.0], [2.0, 0.0], [0.0, 3.0], [0.0, 0.0]]]);
        assert!(matches!(bow_tie, Err(PolygonError::SelfCrossing { .. })), "{bow_tie:?}");
        let spike = Polygon::new(vec![vec![
            [0.0, 0.0],
            [1.0, 0.0],
            [1.0, 3.0],
            [1.0, 1.0],
            [0.0, 1.0],
            [0.0, 0.0],
        ]]);
        assert!(matches!(spike, Err(PolygonError::SelfCrossing { .. })), "{spike:?}");
        let wide = vec![[-170.0, 0.0], [170.0, 0.0], [170.0, 1.0], [-170.0, 1.0], [-170.0, 0.0]];
        assert!(matches!(Polygon::new(vec![wide]), Err(PolygonError::LongEdge { .. })));
        let nan = vec![[0.0, 0.0], [f64::NAN, 0.0], [1.0, 1.0], [0.0, 1.0], [0.0, 0.0]];
        assert!(matches!(Polygon::new(vec![nan]), Err(PolygonError::OffGlobe { .. })));
    }
}
