//! Capacities, set from rough counts of the filed traffic so that they bind in the waves.

use crate::{
    flight::Flight,
    region::{Place, Sector},
    tables::{AirportRow, CapacityRow},
    tally::{self, SectorTally},
};

/// Periods of a sector's day: from and until in minutes from 00:00. The first and the last are
/// night.
const PERIODS: [(i32, i32); 6] =
    [(-120, 180), (180, 600), (600, 840), (840, 1020), (1020, 1260), (1260, 1560)];
const NIGHT: [bool; 6] = [true, false, false, false, false, true];

/// Capacity rows of every sector.
///
/// Each sector has limits of some kinds, by its place in the list: entries alone, entries and
/// occupancy, occupancy of both kinds, lasting occupancy alone, or entries and level changes.
#[must_use]
pub fn capacity_rows(sectors: &[Sector], tallies: &[SectorTally]) -> Vec<CapacityRow> {
    let mut rows = Vec::new();
    for (index, (sector, tally)) in sectors.iter().zip(tallies).enumerate() {
        for ((from_min, until_min), night) in PERIODS.into_iter().zip(NIGHT) {
            if night && sector.closed_at_night || !night && sector.night_only {
                continue;
            }
            let entries = tally::hourly(&tally.entries, from_min - 20, until_min + 20);
            let changes = tally::hourly(&tally.changes, from_min - 20, until_min + 20);
            let inside = tally::minutes(&tally.inside, from_min, until_min);
            // A little below the busiest hour in every third sector, else a little above, so that
            // some changes find the sector full and some compete for the last places.
            let (share, spare) = [(0.85, 0), (1.0, 1), (1.0, 2)][index % 3];
            let hour = |counts: &[u32]| Some(tally::quantile(counts, share).max(4) + spare);
            let minute = |share| Some(tally::quantile(inside, share).max(2));
            let mut row = CapacityRow {
                sector: sector.sector.clone(),
                from_min,
                until_min,
                ..CapacityRow::default()
            };
            match index % 5 {
                0 => row.entries_per_hour = hour(&entries),
                1 => {
                    row.entries_per_hour = hour(&entries);
                    row.occupancy_limit = minute(0.995);
                }
                2 => {
                    row.occupancy_limit = minute(1.0).map(|n| n + 1);
                    row.occupancy_lasting = minute(0.9);
                }
                3 => row.occupancy_lasting = minute(0.8),
                _ => {
                    row.entries_per_hour = hour(&entries);
                    row.level_changes_per_hour = hour(&changes);
                }
            }
            rows.push(row);
        }
    }
    rows
}

/// Airports with limits for arrivals and departures in four periods.
#[must_use]
pub fn airport_rows(airports: &[Place], flights: &[Flight]) -> Vec<AirportRow> {
    let row = |place: &Place| {
        let arrivals = tally::arrivals(flights, &place.code);
        let departures = tally::departures(flights, &place.code);
        let limits = [(-120, 300), (300, 780), (780, 1260), (1260, 1680)].map(|(from, until)| {
            let arrivals_hour = tally::quantile(&tally::hourly(&arrivals, from, until), 0.75);
            let departures_hour = tally::quantile(&tally::hourly(&departures, from, until), 0.9);
            (from, until, Some(arrivals_hour.max(2)), Some(departures_hour.max(2)))
        });
        AirportRow {
            airport: place.code.clone(),
            lon_deg: place.at_deg.0,
            lat_deg: place.at_deg.1,
            name: place.name.to_owned(),
            limits: limits.to_vec(),
        }
    };
    airports.iter().map(row).collect()
}
