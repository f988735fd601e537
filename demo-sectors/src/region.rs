//! Oriel Reach: its airports, fixes, gates and sectors. All invented.

use rand::RngExt;
use rand_pcg::Pcg64;
use serde_json::{Value, json};

use crate::ice::Extent;

/// A named place.
#[derive(Debug, Clone)]
pub struct Place {
    /// Code or name of the fix.
    pub code: String,
    /// Full name; empty for fixes.
    pub name: &'static str,
    /// Longitude and latitude in degrees.
    pub at_deg: (f64, f64),
    /// How much traffic it draws.
    pub weight: f64,
}

/// The box around the region.
pub const EXTENT: Extent =
    Extent { west_deg: -42.4, east_deg: -29.0, south_deg: 40.6, north_deg: 48.6 };

const AIRPORTS: [(&str, &str, f64, f64, f64); 8] = [
    ("XAVN", "Avenholm", -40.6, 46.9, 1.0),
    ("XBRL", "Brenlow", -37.9, 44.55, 0.8),
    ("XDOM", "Domersand", -34.2, 47.2, 0.9),
    ("XEKA", "Ekarra", -30.9, 45.9, 1.2),
    ("XHOV", "Hovedale", -40.9, 42.4, 1.3),
    ("XKEL", "Kellamar", -35.7, 42.1, 2.2),
    ("XOTT", "Ottersund", -31.2, 42.3, 1.2),
    ("XVAR", "Varnessa", -36.2, 45.9, 2.4),
];

/// The airports of the region.
#[must_use]
pub fn airports() -> Vec<Place> {
    let place = |(code, name, lon, lat, weight): (&str, _, _, _, _)| Place {
        code: code.to_owned(),
        name,
        at_deg: (lon, lat),
        weight,
    };
    AIRPORTS.into_iter().map(place).collect()
}

/// A fix on the edge, with the airport beyond it that its traffic serves.
#[derive(Debug, Clone)]
pub struct Gate {
    /// The fix.
    pub place: Place,
    /// Code of the airport beyond; it lies outside the region and is in no table.
    pub beyond: &'static str,
    /// 0 west, 1 east, 2 north, 3 south.
    pub side: usize,
}

/// The gates, counter-clockwise from the north-west.
#[must_use]
pub fn gates() -> Vec<Gate> {
    let west = [47.6, 46.0, 44.1, 42.2].map(|lat| (EXTENT.west_deg, lat, "XQWE", 0));
    let east = [47.2, 45.4, 43.6, 41.6].map(|lat| (EXTENT.east_deg, lat, "XQEA", 1));
    let north = [-40.0, -36.4, -32.0].map(|lon| (lon, EXTENT.north_deg, "XQNO", 2));
    let south = [-39.4, -35.0, -31.0].map(|lon| (lon, EXTENT.south_deg, "XQSO", 3));
    let names = [
        "WULDA", "WEBRO", "WINTA", "WOSKE", "EGRIM", "ELVUT", "EMBOX", "ESKRA", "NUFOL", "NIBRA",
        "NAGEX", "SIMBU", "SORLI", "SUVEK",
    ];
    west.into_iter()
        .chain(east)
        .chain(north)
        .chain(south)
        .zip(names)
        .map(|((lon, lat, beyond, side), name)| Gate {
            place: Place { code: name.to_owned(), name: "", at_deg: (lon, lat), weight: 1.0 },
            beyond,
            side,
        })
        .collect()
}

/// Fixes inside the region: a shaken grid with pronounceable names.
pub fn fixes(rng: &mut Pcg64) -> Vec<Place> {
    const HEADS: [&str; 6] = ["BA", "DO", "KE", "LU", "MI", "TO"];
    const TAILS: [&str; 4] = ["RVU", "SKO", "NDE", "LGI"];
    let mut places = Vec::new();
    for (column, head) in HEADS.into_iter().enumerate() {
        for (row, tail) in TAILS.into_iter().enumerate() {
            let column = f64::from(u8::try_from(column).unwrap_or(0));
            let row = f64::from(u8::try_from(row).unwrap_or(0));
            let lon = -41.2 + 2.2 * column + rng.random_range(-0.6..0.6);
            let lat = 41.6 + 1.95 * row + rng.random_range(-0.5..0.5);
            places.push(Place {
                code: format!("{head}{tail}"),
                name: "",
                at_deg: (lon, lat),
                weight: 1.0,
            });
        }
    }
    places
}

/// One volume of a sector.
#[derive(Debug, Clone)]
pub struct Volume {
    /// Outer ring, closed, counter-clockwise, longitude and latitude in degrees.
    pub ring: Vec<(f64, f64)>,
    /// Floor in FL.
    pub floor_fl: f64,
    /// Ceiling in FL.
    pub ceiling_fl: f64,
}

/// One sector.
#[derive(Debug, Clone)]
pub struct Sector {
    /// Code.
    pub sector: String,
    /// Full name.
    pub name: String,
    /// Its volumes; those of one layer make one feature.
    pub volumes: Vec<Volume>,
    /// Horizontal minimum of its own, NM.
    pub horizontal_nm: Option<f64>,
    /// Whether levels must stay as filed inside.
    pub no_changes: bool,
    /// Whether the merged night sector stands for it.
    pub closed_at_night: bool,
    /// Whether it is open at night only.
    pub night_only: bool,
}

impl Sector {
    /// Whether a place and level lie inside.
    #[must_use]
    pub fn contains(&self, lon_deg: f64, lat_deg: f64, level_fl: f64) -> bool {
        self.volumes.iter().any(|v| {
            v.floor_fl <= level_fl && level_fl < v.ceiling_fl && in_ring(&v.ring, lon_deg, lat_deg)
        })
    }
}

/// Even-odd rule.
#[must_use]
pub fn in_ring(ring: &[(f64, f64)], lon_deg: f64, lat_deg: f64) -> bool {
    let mut inside = false;
    for pair in ring.windows(2) {
        let ((x1, y1), (x2, y2)) = (pair[0], pair[1]);
        if (y1 > lat_deg) != (y2 > lat_deg) && lon_deg < x1 + (lat_deg - y1) / (y2 - y1) * (x2 - x1)
        {
            inside = !inside;
        }
    }
    inside
}

/// Corners by name: T top, M middle and B bottom row from the west; N and S on the borders
/// between columns, C on those between the rows.
fn corner(name: &str) -> (f64, f64) {
    match name {
        "T0" => (-42.4, 48.6),
        "T1" => (-39.1, 48.6),
        "T2" => (-35.6, 48.6),
        "T3" => (-32.4, 48.6),
        "T4" => (-29.0, 48.6),
        "M0" => (-42.4, 44.9),
        "M1" => (-39.0, 44.3),
        "M2" => (-35.5, 44.9),
        "M3" => (-32.7, 44.2),
        "M4" => (-29.0, 44.7),
        "B0" => (-42.4, 40.6),
        "B1" => (-38.6, 40.6),
        "B2" => (-35.9, 40.6),
        "B3" => (-32.3, 40.6),
        "N1" => (-38.5, 46.6),
        "N2" => (-36.1, 46.7),
        "N3" => (-32.1, 46.4),
        "S1" => (-39.2, 42.5),
        "S2" => (-35.2, 42.8),
        "S3" => (-32.9, 42.3),
        "C1" => (-37.2, 44.6),
        "C2" => (-34.1, 44.6),
        _ => (-29.0, 40.6),
    }
}

/// Columns: name, ring of its main part, ring of its shelf (a part whose layers differ).
const COLUMNS: [(&str, &str, &str); 8] = [
    ("Alder", "M0 M1 N1 T1 T0", ""),
    ("Brin", "M1 C1 N2 T2 T1 N1", "C1 M2 N2"),
    ("Corra", "M2 C2 M3 N3 T3 T2 N2", ""),
    ("Dune", "M3 M4 T4 T3 N3", ""),
    ("Esker", "B0 B1 S1 M1 M0", ""),
    ("Fell", "B1 B2 S2 M2 C1 M1 S1", ""),
    ("Garth", "B2 B3 S3 C2 M2 S2", "S3 M3 C2"),
    ("Holm", "B3 B4 M4 M3 S3", ""),
];

const LAYERS: [(&str, &str, f64, f64); 3] =
    [("L", "Low", 245.0, 335.0), ("M", "Middle", 335.0, 375.0), ("H", "High", 375.0, 660.0)];

fn ring(corners: &str) -> Vec<(f64, f64)> {
    let mut ring: Vec<(f64, f64)> = corners.split(' ').map(corner).collect();
    ring.extend(ring.first().copied());
    ring
}

/// The twenty-four sectors and the two merged ones.
///
/// Two shelves make sectors of several volumes: the middle layer over Brin's shelf belongs to
/// Corra, and over Garth's shelf the middle layer begins at FL 315.
#[must_use]
pub fn sectors() -> Vec<Sector> {
    let mut sectors = Vec::new();
    for (column, main, shelf) in COLUMNS {
        for (letter, layer, floor_fl, ceiling_fl) in LAYERS {
            let mut volumes = vec![Volume { ring: ring(main), floor_fl, ceiling_fl }];
            let shelf_volume =
                |floor_fl, ceiling_fl| Volume { ring: ring(shelf), floor_fl, ceiling_fl };
            match (column, letter) {
                ("Brin", "L" | "H") => volumes.push(shelf_volume(floor_fl, ceiling_fl)),
                ("Garth", "L") => volumes.push(shelf_volume(245.0, 315.0)),
                ("Garth", "M") => volumes.push(shelf_volume(315.0, 375.0)),
                ("Garth", "H") => volumes.push(shelf_volume(375.0, 660.0)),
                ("Corra", "M") => {
                    let ring = ring(COLUMNS[1].2);
                    volumes.push(Volume { ring, floor_fl, ceiling_fl });
                }
                _ => {}
            }
            let night = letter != "L";
            sectors.push(Sector {
                sector: format!("{}-{letter}", column.to_uppercase()),
                name: format!("{column} {layer}"),
                volumes,
                horizontal_nm: (column == "Dune" && letter == "H").then_some(8.0),
                no_changes: column == "Holm" && letter == "L",
                closed_at_night: night,
                night_only: false,
            });
        }
    }
    for (code, columns) in [("WEST-NIGHT", [0, 1, 4, 5]), ("EAST-NIGHT", [2, 3, 6, 7])] {
        let rings = columns.into_iter().flat_map(|c| [COLUMNS[c].1, COLUMNS[c].2]);
        // Brin's shelf is the east's in the middle layer by day; by night it stays with the west.
        let volumes = rings
            .filter(|corners| !corners.is_empty())
            .map(|corners| Volume {
                ring: ring(corners),
                floor_fl: if corners == COLUMNS[6].2 { 315.0 } else { 335.0 },
                ceiling_fl: 660.0,
            })
            .collect();
        sectors.push(Sector {
            sector: code.to_owned(),
            name: format!("{} Night", if code.starts_with('W') { "West" } else { "East" }),
            volumes,
            horizontal_nm: None,
            no_changes: false,
            closed_at_night: false,
            night_only: true,
        });
    }
    sectors
}

/// The sectors as a GeoJSON feature collection (RFC 7946).
#[must_use]
pub fn sectors_geojson(sectors: &[Sector]) -> Value {
    let mut features = Vec::new();
    for sector in sectors {
        let mut rest: Vec<&Volume> = sector.volumes.iter().collect();
        while let Some(first) = rest.first().copied() {
            let (same, other): (Vec<&Volume>, Vec<&Volume>) = rest
                .into_iter()
                .partition(|v| (v.floor_fl, v.ceiling_fl) == (first.floor_fl, first.ceiling_fl));
            let rings: Vec<Value> = same.iter().map(|v| json!([v.ring])).collect();
            let geometry = match rings.as_slice() {
                [one] => json!({"type": "Polygon", "coordinates": one}),
                _ => json!({"type": "MultiPolygon", "coordinates": rings}),
            };
            let mut properties = json!({
                "sector": sector.sector,
                "name": sector.name,
                "floor_fl": first.floor_fl,
                "ceiling_fl": first.ceiling_fl,
            });
            if let Some(horizontal_nm) = sector.horizontal_nm {
                properties["horizontal_nm"] = json!(horizontal_nm);
            }
            if sector.no_changes {
                properties["no_changes"] = json!(true);
            }
            features.push(json!({
                "type": "Feature", "properties": properties, "geometry": geometry
            }));
            rest = other;
        }
    }
    json!({"type": "FeatureCollection", "features": features})
}

/// The restriction: a box closed to changed profiles in the middle of the day.
pub const RESTRICTION: (Extent, f64, f64, f64, f64) = (
    Extent { west_deg: -34.8, east_deg: -33.2, south_deg: 45.2, north_deg: 46.4 },
    245.0,
    345.0,
    36_000.0,
    61_200.0,
);

/// The restriction as a GeoJSON feature collection; times are given as text.
#[must_use]
pub fn restrictions_geojson(from: &str, until: &str) -> Value {
    let (e, floor_fl, ceiling_fl, ..) = RESTRICTION;
    let ring = [
        (e.west_deg, e.south_deg),
        (e.east_deg, e.south_deg),
        (e.east_deg, e.north_deg),
        (e.west_deg, e.north_deg),
        (e.west_deg, e.south_deg),
    ];
    json!({"type": "FeatureCollection", "features": [{
        "type": "Feature",
        "properties": {
            "restriction": "RANGE-7", "floor_fl": floor_fl, "ceiling_fl": ceiling_fl,
            "from": from, "until": until,
        },
        "geometry": {"type": "Polygon", "coordinates": [ring]},
    }]})
}

#[cfg(test)]
mod tests {
    use super::*;

    /// By day every place and level above FL 245 is in exactly one day sector.
    #[test]
    fn sectors_tile_the_region() {
        let sectors = sectors();
        for step in 0..40_000_u32 {
            let lon = -42.39 + f64::from(step % 200) * 0.0669;
            let lat = 40.61 + f64::from(step / 200) * 0.0397;
            for fl in [250.0, 320.0, 340.0, 400.0] {
                let day = sectors.iter().filter(|s| !s.night_only && s.contains(lon, lat, fl));
                assert_eq!(day.count(), 1, "{lon} {lat} FL {fl}");
                let night = sectors
                    .iter()
                    .filter(|s| !s.closed_at_night && s.contains(lon, lat, fl))
                    .count();
                assert_eq!(night, 1, "night {lon} {lat} FL {fl}");
            }
        }
    }
}
