//! Reading the two timetables, whole or as the extract of one day that this repository holds, and
//! writing such an extract.

use std::{
    collections::BTreeMap,
    fs::File,
    io::Read,
    path::{Path, PathBuf},
    str::FromStr,
    sync::Arc,
};

use arrow_array::{
    ArrayRef, RecordBatch, StringArray,
    cast::AsArray,
    types::{Int64Type, TimestampMicrosecondType},
};
use flate2::{Compression, GzBuilder, read::GzDecoder};
use jiff::{Timestamp, civil, tz::TimeZone};
use parquet::arrow::{ArrowWriter, arrow_reader::ParquetRecordBatchReaderBuilder};
use rimeshift_demo_sectors::tables::Table;

use super::{Options, zones};

/// A published timetable.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Source {
    /// United States domestic departures of January to June 2001.
    Us2001,
    /// Departures of 2013 from the three airports of one city.
    Nyc2013,
}

/// Where an airport is.
#[derive(Debug, Clone)]
pub struct Airport {
    /// Longitude and latitude in degrees.
    pub at_deg: (f64, f64),
    /// Name of its zone in the tz database.
    pub zone: String,
}

/// One departure.
#[derive(Debug, Clone)]
pub struct Departure {
    /// By the clock of the origin.
    pub local: civil::DateTime,
    /// Code of the origin.
    pub origin: String,
    /// Code of the destination.
    pub destination: String,
    /// Minutes in the air, where the source has them.
    pub air_time_min: Option<f64>,
    /// Cells to copy into an extract.
    pub cells: Vec<String>,
}

/// One day's departures and every airport known.
#[derive(Debug, Clone, Default)]
pub struct Timetable {
    /// In the order of the source.
    pub departures: Vec<Departure>,
    /// By code.
    pub airports: BTreeMap<String, Airport>,
}

impl FromStr for Source {
    type Err = String;

    fn from_str(name: &str) -> Result<Self, String> {
        match name {
            "us2001" => Ok(Self::Us2001),
            "nyc2013" => Ok(Self::Nyc2013),
            _ => Err(format!("{name}: no such source; there are us2001 and nyc2013")),
        }
    }
}

impl Source {
    /// The name on the command line.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Us2001 => "us2001",
            Self::Nyc2013 => "nyc2013",
        }
    }

    /// The weekday that the repository holds.
    #[must_use]
    pub fn extract_date(self) -> &'static str {
        match self {
            Self::Us2001 => "2001-06-28",
            Self::Nyc2013 => "2013-07-31",
        }
    }

    pub(super) fn day_toml(self, date: &str) -> String {
        let (region, what) = match self {
            Self::Us2001 => ("United States", "January to June 2001, domestic departures"),
            Self::Nyc2013 => ("New York departures", "2013, departures from three airports"),
        };
        format!(
            "# Departures: US Bureau of Transportation Statistics, {what}; public domain.\n\
             # Routes, levels, sectors, limits and proposals are modelled, not real.\n\
             date = \"{date}\"\nregion = \"{region}, modelled\"\n"
        )
    }

    /// Columns of an extract, named as in the source.
    fn columns(self) -> &'static [&'static str] {
        match self {
            Self::Us2001 => &["date", "delay", "distance", "origin", "destination"],
            Self::Nyc2013 => &[
                "year",
                "month",
                "day",
                "dep_time",
                "dep_delay",
                "origin",
                "dest",
                "air_time",
                "distance",
            ],
        }
    }

    /// Code, longitude, latitude and state or zone in the airports table.
    fn airport_columns(self) -> [&'static str; 4] {
        match self {
            Self::Us2001 => ["iata", "longitude", "latitude", "state"],
            Self::Nyc2013 => ["faa", "lon", "lat", "tzone"],
        }
    }

    /// Reads the departures of the date and all airports.
    ///
    /// # Errors
    /// If a file can't be read or lacks a column.
    pub fn read(self, options: &Options) -> Result<Timetable, String> {
        let folder = PathBuf::from(concat!(env!("CARGO_MANIFEST_DIR"), "/data/real-days"));
        let own = |kind: &str| folder.join(format!("{}-{kind}.csv.gz", self.name()));
        let flights = options.flights.clone().unwrap_or_else(|| own("flights"));
        let airports = options.airports.clone().unwrap_or_else(|| own("airports"));
        let date: civil::Date =
            options.date.parse().map_err(|e| format!("{}: no date: {e}", options.date))?;
        let departures = match flights.extension().and_then(|e| e.to_str()) {
            Some("parquet") => parquet_departures(&flights, date)?,
            _ => self.csv_departures(&flights, date)?,
        };
        Ok(Timetable { departures, airports: self.airports(&airports)? })
    }

    fn csv_departures(self, path: &Path, date: civil::Date) -> Result<Vec<Departure>, String> {
        let mut departures = Vec::new();
        for cells in csv_cells(path, self.columns())? {
            let departure = match self {
                Self::Us2001 => from_us2001(cells),
                Self::Nyc2013 => from_nyc2013(cells),
            };
            departures.extend(departure.filter(|d| d.local.date() == date));
        }
        Ok(departures)
    }

    fn airports(self, path: &Path) -> Result<BTreeMap<String, Airport>, String> {
        let mut airports = BTreeMap::new();
        for cells in csv_cells(path, &self.airport_columns())? {
            let [code, lon, lat, place] = cells.as_slice() else { continue };
            let (Ok(lon_deg), Ok(lat_deg)) = (lon.parse(), lat.parse()) else { continue };
            let zone = match self {
                Self::Us2001 => zones::of_state(place, lon_deg, lat_deg),
                Self::Nyc2013 => place,
            };
            let airport = Airport { at_deg: (lon_deg, lat_deg), zone: zone.to_owned() };
            airports.insert(code.clone(), airport);
        }
        Ok(airports)
    }

    /// Writes the departures of the date and the airports they use as `SOURCE-flights.csv.gz` and
    /// `SOURCE-airports.csv.gz`.
    ///
    /// # Errors
    /// If a file can't be read or written.
    pub fn extract(self, options: &Options, out_dir: &Path) -> Result<(), String> {
        let table = self.read(options)?;
        let mut flights = vec![self.columns().join(",")];
        flights.extend(table.departures.iter().map(|d| d.cells.join(",")));
        let mut airports = vec![self.airport_columns().join(",")];
        let path = options.airports.clone().ok_or("an extract needs the table of airports")?;
        for cells in csv_cells(&path, &self.airport_columns())? {
            let used = |d: &Departure| d.origin == cells[0] || d.destination == cells[0];
            if table.departures.iter().any(used) {
                airports.push(cells.join(","));
            }
        }
        for (kind, lines) in [("flights", flights), ("airports", airports)] {
            let path = out_dir.join(format!("{}-{kind}.csv.gz", self.name()));
            let failed = |e: std::io::Error| format!("{}: {e}", path.display());
            let file = File::create(&path).map_err(failed)?;
            // No name and no time in the header: the same bytes each time.
            let mut writer = GzBuilder::new().mtime(0).write(file, Compression::best());
            std::io::Write::write_all(&mut writer, (lines.join("\n") + "\n").as_bytes())
                .map_err(failed)?;
            writer.finish().map_err(failed)?;
        }
        Ok(())
    }
}

/// Seconds since 1970 of a departure by its origin's clock; none if the zone is not known.
#[must_use]
pub fn utc_s(departure: &Departure, zone: &TimeZone) -> Option<i64> {
    zone.to_ambiguous_timestamp(departure.local).compatible().ok().map(Timestamp::as_second)
}

/// The named columns of a CSV file, gzipped or not.
fn csv_cells(path: &Path, columns: &[&str]) -> Result<Vec<Vec<String>>, String> {
    let failed = |e: &dyn std::fmt::Display| format!("{}: {e}", path.display());
    let file = File::open(path).map_err(|e| failed(&e))?;
    let bytes: Box<dyn Read> = match path.extension().and_then(|e| e.to_str()) {
        Some("gz") => Box::new(GzDecoder::new(file)),
        _ => Box::new(file),
    };
    let mut reader = csv::Reader::from_reader(bytes);
    let header = reader.headers().map_err(|e| failed(&e))?.clone();
    let mut indexes = Vec::new();
    for column in columns {
        let index = header.iter().position(|h| h == *column);
        indexes.push(index.ok_or_else(|| failed(&format!("no column {column}")))?);
    }
    let mut rows = Vec::new();
    for record in reader.records() {
        let record = record.map_err(|e| failed(&e))?;
        rows.push(indexes.iter().map(|i| record.get(*i).unwrap_or("").to_owned()).collect());
    }
    Ok(rows)
}

fn from_us2001(cells: Vec<String>) -> Option<Departure> {
    let [date, _, _, origin, destination] = cells.as_slice() else { return None };
    Some(Departure {
        local: date.parse().ok()?,
        origin: origin.clone(),
        destination: destination.clone(),
        air_time_min: None,
        cells,
    })
}

/// A flight that did not leave has no departure time.
fn from_nyc2013(cells: Vec<String>) -> Option<Departure> {
    let [year, month, day, clock, _, origin, destination, air_time, _] = cells.as_slice() else {
        return None;
    };
    let (year, month, day) = (year.parse().ok()?, month.parse().ok()?, day.parse().ok()?);
    // 517 is 05:17 and 2400 midnight.
    let clock: i8 = i8::try_from(clock.parse::<i16>().ok()? / 100 % 24).ok()?;
    let minute = cells[3].parse::<i16>().ok()? % 100;
    let date = civil::Date::new(year, month, day).ok()?;
    Some(Departure {
        local: date.at(clock, i8::try_from(minute).ok()?, 0, 0),
        origin: origin.clone(),
        destination: destination.clone(),
        air_time_min: air_time.parse().ok(),
        cells,
    })
}

/// The rows of a date in the Parquet file of 2001.
fn parquet_departures(path: &Path, date: civil::Date) -> Result<Vec<Departure>, String> {
    let failed = |e: &dyn std::fmt::Display| format!("{}: {e}", path.display());
    let file = File::open(path).map_err(|e| failed(&e))?;
    let reader = ParquetRecordBatchReaderBuilder::try_new(file)
        .and_then(|builder| builder.with_batch_size(65_536).build())
        .map_err(|e| failed(&e))?;
    let (first, after) =
        (date.at(0, 0, 0, 0), date.at(0, 0, 0, 0).saturating_add(jiff::Span::new().days(1)));
    let micros = |t: civil::DateTime| {
        TimeZone::UTC.to_timestamp(t).map(Timestamp::as_microsecond).map_err(|e| failed(&e))
    };
    let (first, after) = (micros(first)?, micros(after)?);
    let mut departures = Vec::new();
    for batch in reader {
        let batch = batch.map_err(|e| failed(&e))?;
        let column = |name: &str| {
            batch.column_by_name(name).ok_or_else(|| failed(&format!("no column {name}")))
        };
        let times = column("date")?.as_primitive_opt::<TimestampMicrosecondType>();
        let delays = column("delay")?.as_primitive_opt::<Int64Type>();
        let distances = column("distance")?.as_primitive_opt::<Int64Type>();
        let origins = column("origin")?.as_string_opt::<i64>();
        let destinations = column("destination")?.as_string_opt::<i64>();
        let (Some(times), Some(delays), Some(distances), Some(origins), Some(destinations)) =
            (times, delays, distances, origins, destinations)
        else {
            return Err(failed(&"a column is not of the type of flights-3m.parquet"));
        };
        for row in (0..times.len()).filter(|row| (first..after).contains(&times.value(*row))) {
            // The clock is local, whatever the type says.
            let local = Timestamp::from_microsecond(times.value(row)).map_err(|e| failed(&e))?;
            let local = TimeZone::UTC.to_datetime(local);
            departures.extend(from_us2001(vec![
                local.strftime("%Y-%m-%dT%H:%M").to_string(),
                delays.value(row).to_string(),
                distances.value(row).to_string(),
                origins.value(row).to_owned(),
                destinations.value(row).to_owned(),
            ]));
        }
    }
    Ok(departures)
}

/// Writes a table to Parquet: numbers for `lon`, `lat` and `level_fl`, text for the rest.
///
/// # Errors
/// If the file can't be written.
pub fn write_parquet(table: &Table, path: &Path) -> Result<(), String> {
    let failed = |e: &dyn std::fmt::Display| format!("{}: {e}", path.display());
    let Some((header, rows)) = table.rows().split_first() else { return Ok(()) };
    let mut columns: Vec<(&str, ArrayRef)> = Vec::new();
    for (index, name) in header.iter().enumerate() {
        let cells = rows.iter().map(|row| row[index].as_str());
        let array: ArrayRef = if ["lon", "lat", "level_fl"].contains(&name.as_str()) {
            let numbers = cells.map(|c| c.parse::<f64>().ok());
            Arc::new(arrow_array::Float64Array::from_iter(numbers))
        } else {
            Arc::new(StringArray::from_iter(cells.map(|c| (!c.is_empty()).then_some(c))))
        };
        columns.push((name, array));
    }
    let batch = RecordBatch::try_from_iter(columns).map_err(|e| failed(&e))?;
    let file = File::create(path).map_err(|e| failed(&e))?;
    let mut writer = ArrowWriter::try_new(file, batch.schema(), None).map_err(|e| failed(&e))?;
    writer.write(&batch).map_err(|e| failed(&e))?;
    writer.close().map_err(|e| failed(&e))?;
    Ok(())
}
