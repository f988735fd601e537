//! A tiling of the country by bricks in three layers, with limits from the day's own traffic.
//!
//! Rows of bricks are shifted by half a brick against each other, so that most meet six others, as
//! real sectors do, and every border is exact. Only bricks that traffic flies through are kept.
//!
//! `occupancy_limit` is the Monitor Alert Parameter of FAA JO 7210.3Y, 17-8-2 for the sector's mean
//! visit of T minutes: min(18, 5T/3 rounded half up). `entries_per_hour` is the 95th percentile of
//! the sector's filed counts in the hours that have any.

use rimeshift_demo_sectors::{
    flight::Flight,
    ice::Extent,
    tables::CapacityRow,
    tally::{self, SectorTally},
};
use serde_json::{Value, json};

/// The conterminous states and the waters beside them.
pub const EXTENT: Extent =
    Extent { west_deg: -126.0, east_deg: -66.0, south_deg: 24.0, north_deg: 50.0 };
/// When the sectors are open, minutes from 00:00 UTC of the date.
pub const PERIOD_MIN: (i32, i32) = (-360, 2520);

const BRICK_LON_DEG: f64 = 2.8;
const BRICK_LAT_DEG: f64 = 2.4;
const COLUMNS: usize = 22;
const ROWS: usize = 11;
/// Floors and the last ceiling of the layers, in FL.
const LAYERS: [f64; 4] = [245.0, 335.0, 375.0, 660.0];

/// The sectors that traffic flies through, with their counts.
#[derive(Debug)]
pub struct Tiling {
    kept: Vec<(usize, SectorTally)>,
}

impl Tiling {
    /// Counts the flights in all bricks and keeps those with ten visits or more.
    #[must_use]
    pub fn over(flights: &[Flight]) -> Self {
        let all = COLUMNS * ROWS * 3;
        let tallies =
            tally::count(flights, all, |lon, lat, fl, here| here.extend(brick(lon, lat, fl)));
        let kept = tallies.into_iter().enumerate().filter(|(_, t)| t.visits >= 10).collect();
        Self { kept }
    }

    /// Number of sectors.
    #[must_use]
    pub fn sectors(&self) -> usize {
        self.kept.len()
    }

    /// The sectors as a GeoJSON feature collection (RFC 7946).
    #[must_use]
    pub fn geojson(&self) -> Value {
        let features: Vec<Value> = self
            .kept
            .iter()
            .map(|(index, _)| {
                let (west, south, layer) = corner(*index);
                let (east, north) = (west + BRICK_LON_DEG, south + BRICK_LAT_DEG);
                let ring =
                    [[west, south], [east, south], [east, north], [west, north], [west, south]]
                        .map(|p| p.map(tenth));
                json!({
                    "type": "Feature",
                    "properties": {
                        "sector": name(*index),
                        "floor_fl": LAYERS[layer],
                        "ceiling_fl": LAYERS[layer + 1],
                    },
                    "geometry": {"type": "Polygon", "coordinates": [ring]},
                })
            })
            .collect();
        json!({"type": "FeatureCollection", "features": features})
    }

    /// One row of limits a sector.
    #[must_use]
    pub fn capacity_rows(&self) -> Vec<CapacityRow> {
        let (from_min, until_min) = PERIOD_MIN;
        let row = |(index, tally): &(usize, SectorTally)| {
            let hours = tally::hourly(&tally.entries, from_min, until_min);
            let busy: Vec<u32> = hours.into_iter().filter(|n| *n > 0).collect();
            let mean_visit_min = tally.visit_s / 60.0 / f64::from(tally.visits.max(1));
            CapacityRow {
                sector: name(*index),
                from_min,
                until_min,
                entries_per_hour: Some(tally::quantile(&busy, 0.95).max(1)),
                occupancy_limit: Some(monitor_alert_parameter(mean_visit_min)),
                ..CapacityRow::default()
            }
        };
        self.kept.iter().map(row).collect()
    }
}

/// Monitor Alert Parameter of a mean visit in minutes.
#[must_use]
pub fn monitor_alert_parameter(mean_visit_min: f64) -> u32 {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "clamped to 0..=18 before the cast"
    )]
    let limit = (5.0 * mean_visit_min / 3.0 + 0.5).floor().clamp(1.0, 18.0) as u32;
    limit
}

/// Index of the brick at a place and level.
fn brick(lon_deg: f64, lat_deg: f64, level_fl: f64) -> Option<usize> {
    let layer = LAYERS.windows(2).position(|l| l[0] <= level_fl && level_fl < l[1])?;
    let row = cell((lat_deg - EXTENT.south_deg) / BRICK_LAT_DEG, ROWS)?;
    let column = cell((lon_deg - row_west_deg(row)) / BRICK_LON_DEG, COLUMNS)?;
    Some((row * COLUMNS + column) * 3 + layer)
}

fn cell(position: f64, cells: usize) -> Option<usize> {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        clippy::cast_precision_loss,
        reason = "in range by the test before"
    )]
    (position >= 0.0 && position < cells as f64).then_some(position as usize)
}

/// Western edge of a row: every second one begins half a brick further west.
fn row_west_deg(row: usize) -> f64 {
    EXTENT.west_deg - if row % 2 == 1 { BRICK_LON_DEG / 2.0 } else { 0.0 }
}

/// South-west corner and layer of a brick.
#[expect(clippy::cast_precision_loss, reason = "small indexes")]
fn corner(index: usize) -> (f64, f64, usize) {
    let (place, layer) = (index / 3, index % 3);
    let (row, column) = (place / COLUMNS, place % COLUMNS);
    let west_deg = row_west_deg(row) + column as f64 * BRICK_LON_DEG;
    (west_deg, EXTENT.south_deg + row as f64 * BRICK_LAT_DEG, layer)
}

/// Corners are whole tenths of a degree; this takes off what adding left behind.
fn tenth(degrees: f64) -> f64 {
    (degrees * 10.0).round() / 10.0
}

fn name(index: usize) -> String {
    let (place, layer) = (index / 3, index % 3);
    format!("R{:02}C{:02}-{}", place / COLUMNS + 1, place % COLUMNS + 1, ["L", "M", "H"][layer])
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The table printed in FAA JO 7210.3Y, 17-8-2.
    #[test]
    fn monitor_alert_parameters() {
        let printed = [
            (3, 5),
            (4, 7),
            (5, 8),
            (6, 10),
            (7, 12),
            (8, 13),
            (9, 15),
            (10, 17),
            (11, 18),
            (12, 18),
        ];
        for (minutes, limit) in printed {
            assert_eq!(monitor_alert_parameter(f64::from(minutes)), limit, "{minutes} min");
        }
    }
}
