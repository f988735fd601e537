//! Sectors, airports and their capacity rows.

use super::super::parts::{
    AirportCapacityParts, AirportParts, CapacityParts, SectorParts, VolumeParts,
};
use super::super::sector::{Airport, AirportLimits, Period, Sector, SectorLimits, Volume};
use super::{Build, LARGEST_LIMIT};
use crate::geometry::polygon::Polygon;
use crate::units::ft_to_fl;

/// Most overlaps between open sectors that are warned of one by one.
const MOST_OVERLAPS_NAMED: usize = 5;

impl Build {
    pub(super) fn sectors(
        &mut self,
        parts: Vec<SectorParts>,
        rows: &[CapacityParts],
    ) -> Vec<Sector> {
        let parts = self.sort_by_name("sectors", "sector", parts, |s| s.sector.as_str());
        let mut sectors: Vec<Sector> =
            parts.into_iter().map(|(i, sector)| self.sector(i, sector)).collect();
        let mut periods: Vec<Vec<(usize, Period<SectorLimits>)>> = vec![Vec::new(); sectors.len()];
        for (i, row) in rows.iter().enumerate() {
            let limits = self.sector_limits(i, row);
            let times_are_good = self.check_period("capacities", i, row.from_s, row.until_s);
            match sectors.binary_search_by(|s| s.name.as_str().cmp(&row.sector)) {
                Ok(at) if times_are_good => periods[at]
                    .push((i, Period { from_s: row.from_s, until_s: row.until_s, limits })),
                Ok(_) => {}
                Err(_) => self.unknown_name("capacities", i, "sector", "sector", &row.sector),
            }
        }
        for (sector, periods) in sectors.iter_mut().zip(periods) {
            sector.open = self.in_time_order("capacities", &sector.name, periods);
            if sector.open.is_empty() {
                self.warn(
                    String::new(),
                    format!(
                        "sector `{}` has no capacity row: it is closed all day, nothing is \
                         counted there",
                        sector.name
                    ),
                );
            }
        }
        sectors
    }

    fn sector(&mut self, i: usize, parts: SectorParts) -> Sector {
        let horizontal_nm = self.optional(
            || format!("sectors[{i}].horizontal_nm"),
            parts.horizontal_nm,
            0.0..=200.0,
        );
        let volumes = self.volumes(&format!("sectors[{i}]"), "sector", parts.volumes);
        Sector {
            name: parts.sector,
            title: parts.name,
            volumes,
            horizontal_nm,
            no_changes: parts.no_changes,
            open: Vec::new(),
        }
    }

    /// The volumes of a sector or another thing at a path.
    pub(super) fn volumes(
        &mut self,
        path: &str,
        what: &str,
        parts: Vec<VolumeParts>,
    ) -> Vec<Volume> {
        if parts.is_empty() {
            self.defects.push(
                || format!("{path}.volumes"),
                "is empty",
                format!("give the {what} at least one polygon with a floor and a ceiling"),
            );
        }
        let mut volumes = Vec::with_capacity(parts.len());
        for (v, volume) in parts.into_iter().enumerate() {
            let (floor_ft, ceiling_ft) = (volume.floor_ft, volume.ceiling_ft);
            // Not-a-number fails the comparison.
            let levels_are_good =
                floor_ft < ceiling_ft && floor_ft.is_finite() && ceiling_ft.is_finite();
            if !levels_are_good {
                self.defects.push(
                    || format!("{path}.volumes[{v}].floor_ft"),
                    format!(
                        "floor FL {} is not below ceiling FL {}",
                        ft_to_fl(floor_ft),
                        ft_to_fl(ceiling_ft)
                    ),
                    "the floor must lie below the ceiling",
                );
            }
            match Polygon::new(volume.rings) {
                Ok(polygon) => volumes.push(Volume { polygon, floor_ft, ceiling_ft }),
                Err(error) => self.defects.push(
                    || format!("{path}.volumes[{v}].polygon"),
                    error.to_string(),
                    "closed rings of at least 4 positions whose edges do not cross (RFC 7946)",
                ),
            }
        }
        volumes
    }

    fn sector_limits(&mut self, i: usize, row: &CapacityParts) -> SectorLimits {
        let mut limit = |field: &str, value| {
            self.optional(|| format!("capacities[{i}].{field}"), value, 0.0..=LARGEST_LIMIT)
        };
        SectorLimits {
            entries_per_hour: limit("entries_per_hour", row.entries_per_hour),
            occupancy_limit: limit("occupancy_limit", row.occupancy_limit),
            occupancy_lasting: limit("occupancy_lasting", row.occupancy_lasting),
            level_changes_per_hour: limit("level_changes_per_hour", row.level_changes_per_hour),
        }
    }

    pub(super) fn airports(
        &mut self,
        parts: Vec<AirportParts>,
        rows: &[AirportCapacityParts],
    ) -> Vec<Airport> {
        let parts = self.sort_by_name("airports", "airport", parts, |a| a.airport.as_str());
        let mut airports = Vec::with_capacity(parts.len());
        for (i, airport) in parts {
            self.check_place(&format!("airports[{i}]"), airport.lon_deg, airport.lat_deg);
            airports.push(Airport {
                code: airport.airport,
                title: airport.name,
                lon_deg: airport.lon_deg,
                lat_deg: airport.lat_deg,
                periods: Vec::new(),
            });
        }
        let mut periods: Vec<Vec<(usize, Period<AirportLimits>)>> =
            vec![Vec::new(); airports.len()];
        for (i, row) in rows.iter().enumerate() {
            let mut limit = |field: &str, value| {
                let path = || format!("airport_capacities[{i}].{field}");
                self.optional(path, value, 0.0..=LARGEST_LIMIT)
            };
            let limits = AirportLimits {
                arrivals_per_hour: limit("arrivals_per_hour", row.arrivals_per_hour),
                departures_per_hour: limit("departures_per_hour", row.departures_per_hour),
            };
            let times_are_good =
                self.check_period("airport_capacities", i, row.from_s, row.until_s);
            match airports.binary_search_by(|a| a.code.as_str().cmp(&row.airport)) {
                Ok(at) if times_are_good => periods[at]
                    .push((i, Period { from_s: row.from_s, until_s: row.until_s, limits })),
                Ok(_) => {}
                Err(_) => {
                    self.unknown_name("airport_capacities", i, "airport", "airport", &row.airport)
                }
            }
        }
        for (airport, periods) in airports.iter_mut().zip(periods) {
            airport.periods = self.in_time_order("airport_capacities", &airport.code, periods);
        }
        airports
    }

    pub(super) fn check_place(&mut self, path: &str, lon_deg: f64, lat_deg: f64) -> bool {
        let lon_is_good = (-180.0..=180.0).contains(&lon_deg);
        if !lon_is_good {
            self.defects.push(
                || format!("{path}.lon_deg"),
                format!("`{lon_deg}` is no longitude"),
                "degrees from -180 to 180",
            );
        }
        let lat_is_good = (-90.0..=90.0).contains(&lat_deg);
        if !lat_is_good {
            self.defects.push(
                || format!("{path}.lat_deg"),
                format!("`{lat_deg}` is no latitude"),
                "degrees from -90 to 90",
            );
        }
        lon_is_good && lat_is_good
    }

    pub(super) fn check_period(
        &mut self,
        table: &str,
        i: usize,
        from_s: f64,
        until_s: f64,
    ) -> bool {
        let good = from_s < until_s && from_s.is_finite() && until_s.is_finite();
        if !good {
            self.defects.push(
                || format!("{table}[{i}].until"),
                "does not lie after `from`",
                "a period must end after it begins",
            );
        }
        good
    }

    pub(super) fn unknown_name(
        &mut self,
        table: &str,
        i: usize,
        field: &str,
        kind: &str,
        name: &str,
    ) {
        self.defects.push(
            || format!("{table}[{i}].{field}"),
            format!("`{name}` is no {kind} of this day"),
            format!("name one of the day's {kind}s"),
        );
    }

    pub(super) fn check_level(&mut self, path: impl FnOnce() -> String, level_ft: f64) {
        if !(-2000.0..=66_000.0).contains(&level_ft) {
            let problem = format!("FL {} is no level", ft_to_fl(level_ft));
            self.defects.push(path, problem, "FL -20 to 660");
        }
    }

    /// Periods sorted by time; overlapping ones are a defect of the later row.
    fn in_time_order<L: Copy>(
        &mut self,
        table: &str,
        name: &str,
        mut periods: Vec<(usize, Period<L>)>,
    ) -> Vec<Period<L>> {
        periods.sort_by(|a, b| a.1.from_s.total_cmp(&b.1.from_s).then(a.0.cmp(&b.0)));
        for w in periods.windows(2) {
            if w[1].1.from_s < w[0].1.until_s {
                self.defects.push(
                    || format!("{table}[{}].from", w[1].0),
                    format!("this period of `{name}` overlaps that of {table}[{}]", w[0].0),
                    "periods of one place must not overlap",
                );
            }
        }
        periods.into_iter().map(|(_, period)| period).collect()
    }

    /// Two sectors that are open together and whose volumes overlap are both counted; that is
    /// allowed, and seldom meant.
    pub(super) fn warn_of_overlaps(&mut self, sectors: &[Sector]) {
        let mut found = Vec::new();
        for (i, a) in sectors.iter().enumerate() {
            for b in &sectors[i + 1..] {
                if open_together(a, b) && volumes_overlap(a, b) {
                    found.push((a.name.clone(), b.name.clone()));
                }
            }
        }
        for (a, b) in found.iter().take(MOST_OVERLAPS_NAMED) {
            self.warn(
                String::new(),
                format!("sectors `{a}` and `{b}` are open together and their volumes overlap"),
            );
        }
        if let Some(more) = found.len().checked_sub(MOST_OVERLAPS_NAMED).filter(|&n| n > 0) {
            self.warn(String::new(), format!("{more} more pairs of open sectors overlap"));
        }
    }
}

fn open_together(a: &Sector, b: &Sector) -> bool {
    a.open.iter().any(|p| b.open.iter().any(|q| p.overlaps(q.from_s, q.until_s)))
}

fn volumes_overlap(a: &Sector, b: &Sector) -> bool {
    a.volumes.iter().any(|v| {
        b.volumes.iter().any(|w| {
            v.floor_ft < w.ceiling_ft
                && w.floor_ft < v.ceiling_ft
                && v.polygon.shares_area_with(&w.polygon)
        })
    })
}
