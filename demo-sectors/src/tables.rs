//! The tables of a day folder, as CSV.

use std::path::Path;

use jiff::Timestamp;

use crate::{flight::Flight, proposals::Proposal};

/// One row of the capacity table; minutes from 00:00 of the day.
#[derive(Debug, Clone, Default)]
pub struct CapacityRow {
    /// Sector.
    pub sector: String,
    /// Start, minutes from 00:00.
    pub from_min: i32,
    /// End, minutes from 00:00.
    pub until_min: i32,
    /// Largest number of entries an hour.
    pub entries_per_hour: Option<u32>,
    /// Largest number of aircraft inside.
    pub occupancy_limit: Option<u32>,
    /// Largest number inside for a lasting time.
    pub occupancy_lasting: Option<u32>,
    /// Largest number of climbs and descents begun an hour.
    pub level_changes_per_hour: Option<u32>,
}

/// One airport with the limits of its day.
#[derive(Debug, Clone)]
pub struct AirportRow {
    /// Code.
    pub airport: String,
    /// Longitude in degrees.
    pub lon_deg: f64,
    /// Latitude in degrees.
    pub lat_deg: f64,
    /// Name; may be empty.
    pub name: String,
    /// From and until in minutes, arrivals an hour, departures an hour.
    pub limits: Vec<(i32, i32, Option<u32>, Option<u32>)>,
}

/// Turns seconds from 00:00 of the day into RFC 3339.
#[derive(Debug, Clone, Copy)]
pub struct Clock {
    midnight: Timestamp,
}

impl Clock {
    /// The clock of a date, `YYYY-MM-DD`.
    ///
    /// # Errors
    /// If the date is none.
    pub fn of(date: &str) -> Result<Self, String> {
        let text = format!("{date}T00:00:00Z");
        let midnight = text.parse().map_err(|e| format!("{date}: no date: {e}"))?;
        Ok(Self { midnight })
    }

    /// 00:00 of the date in seconds since 1970.
    #[must_use]
    pub fn midnight_s(&self) -> i64 {
        self.midnight.as_second()
    }

    /// A time in UTC, whole seconds.
    ///
    /// # Errors
    /// If the time lies outside what a calendar can hold.
    pub fn utc(&self, time_s: f64) -> Result<String, String> {
        #[expect(clippy::cast_possible_truncation, reason = "a few days in seconds")]
        let whole_s = time_s.round() as i64;
        Timestamp::from_second(self.midnight.as_second() + whole_s)
            .map(|t| t.to_string())
            .map_err(|e| format!("{time_s} s: {e}"))
    }
}

/// A table as rows of cells, the header first.
#[derive(Debug, Default)]
pub struct Table {
    rows: Vec<Vec<String>>,
}

impl Table {
    /// A table with these columns.
    #[must_use]
    pub fn with_columns(columns: &[&str]) -> Self {
        Self { rows: vec![columns.iter().map(ToString::to_string).collect()] }
    }

    /// Adds a row; as many cells as columns.
    pub fn push(&mut self, row: Vec<String>) {
        self.rows.push(row);
    }

    /// Writes the table to a file.
    ///
    /// # Errors
    /// If the file can't be written or a row has another number of cells than the header.
    pub fn write(&self, path: &Path) -> Result<(), String> {
        let failed = |e: csv::Error| format!("{}: {e}", path.display());
        let mut writer = csv::Writer::from_path(path).map_err(failed)?;
        for row in &self.rows {
            writer.write_record(row).map_err(failed)?;
        }
        writer.flush().map_err(|e| format!("{}: {e}", path.display()))
    }

    /// The rows, the header first.
    #[must_use]
    pub fn rows(&self) -> &[Vec<String>] {
        &self.rows
    }
}

fn cell<T: ToString>(value: Option<T>) -> String {
    value.map(|v| v.to_string()).unwrap_or_default()
}

/// The flights table.
#[must_use]
pub fn flights(flights: &[Flight]) -> Table {
    let mut table = Table::with_columns(&[
        "flight",
        "callsign",
        "operator",
        "departure",
        "destination",
        "aircraft",
        "mach",
        "mass_kg",
        "rvsm",
        "movable",
    ]);
    for f in flights {
        table.push(vec![
            f.flight.clone(),
            f.callsign.clone(),
            f.operator.clone(),
            f.departure.clone(),
            f.destination.clone(),
            f.aircraft.clone(),
            cell(f.mach),
            cell(f.mass_kg),
            f.rvsm.to_string(),
            f.movable.to_string(),
        ]);
    }
    table
}

/// The points table: positions to 4 decimals, about 10 m.
///
/// # Errors
/// If a time is outside the calendar.
pub fn points(flights: &[Flight], clock: Clock) -> Result<Table, String> {
    let mut table = Table::with_columns(&["flight", "time", "lon", "lat", "level_fl", "fix"]);
    for flight in flights {
        for p in &flight.points {
            table.push(vec![
                flight.flight.clone(),
                clock.utc(p.time_s)?,
                format!("{:.4}", p.lon_deg),
                format!("{:.4}", p.lat_deg),
                p.level_fl.to_string(),
                p.fix.clone().unwrap_or_default(),
            ]);
        }
    }
    Ok(table)
}

/// The capacity table.
///
/// # Errors
/// If a time is outside the calendar.
pub fn capacity(rows: &[CapacityRow], clock: Clock) -> Result<Table, String> {
    let mut table = Table::with_columns(&[
        "sector",
        "from",
        "until",
        "entries_per_hour",
        "occupancy_limit",
        "occupancy_lasting",
        "level_changes_per_hour",
    ]);
    for r in rows {
        table.push(vec![
            r.sector.clone(),
            clock.utc(f64::from(r.from_min) * 60.0)?,
            clock.utc(f64::from(r.until_min) * 60.0)?,
            cell(r.entries_per_hour),
            cell(r.occupancy_limit),
            cell(r.occupancy_lasting),
            cell(r.level_changes_per_hour),
        ]);
    }
    Ok(table)
}

/// The airports table and the airport_capacity table.
///
/// # Errors
/// If a time is outside the calendar.
pub fn airports(rows: &[AirportRow], clock: Clock) -> Result<(Table, Table), String> {
    let mut places = Table::with_columns(&["airport", "lon", "lat", "name"]);
    let mut limits = Table::with_columns(&[
        "airport",
        "from",
        "until",
        "arrivals_per_hour",
        "departures_per_hour",
    ]);
    for r in rows {
        let (lon, lat) = (format!("{:.4}", r.lon_deg), format!("{:.4}", r.lat_deg));
        places.push(vec![r.airport.clone(), lon, lat, r.name.clone()]);
        for (from_min, until_min, arrivals, departures) in &r.limits {
            limits.push(vec![
                r.airport.clone(),
                clock.utc(f64::from(*from_min) * 60.0)?,
                clock.utc(f64::from(*until_min) * 60.0)?,
                cell(*arrivals),
                cell(*departures),
            ]);
        }
    }
    Ok((places, limits))
}

/// The proposals table; proposals are named P0001, P0002, … in their order.
///
/// # Errors
/// If a time is outside the calendar.
pub fn proposals(
    proposals: &[Proposal],
    flights: &[Flight],
    clock: Clock,
) -> Result<Table, String> {
    let mut table = Table::with_columns(&[
        "proposal",
        "flight",
        "option",
        "level_fl",
        "from_time",
        "until_time",
        "contrail_km_avoided",
        "extra_fuel_kg",
        "max_extra_fuel_kg",
        "priority",
    ]);
    let time = |t: Option<f64>| t.map(|t| clock.utc(t)).transpose().map(Option::unwrap_or_default);
    for (number, p) in proposals.iter().enumerate() {
        for (option, alternative) in p.options.iter().enumerate() {
            for s in &alternative.stretches {
                table.push(vec![
                    format!("P{:04}", number + 1),
                    flights[p.flight].flight.clone(),
                    (option + 1).to_string(),
                    s.level_fl.to_string(),
                    time(s.from_s)?,
                    time(s.until_s)?,
                    cell(s.contrail_km),
                    cell(s.extra_fuel_kg),
                    cell(alternative.max_extra_fuel_kg),
                    cell(alternative.priority),
                ]);
            }
        }
    }
    Ok(table)
}

/// GeoJSON with one feature a line.
#[must_use]
pub fn geojson_text(collection: &serde_json::Value) -> String {
    let features = collection["features"].as_array().map_or(&[][..], Vec::as_slice);
    let lines: Vec<String> = features.iter().map(ToString::to_string).collect();
    format!("{{\"type\":\"FeatureCollection\",\"features\":[\n{}\n]}}\n", lines.join(",\n"))
}
