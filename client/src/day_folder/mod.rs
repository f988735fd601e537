//! Reads a day folder into the rows that are sent to the service.
//!
//! What: `day.toml`, sectors and restrictions as GeoJSON, and tables as CSV or Parquet, into the messages of
//! `rimeshift.v1`, with the line of every row kept beside it.
//!
//! How: each file is read to its end whatever is wrong in it, and every defect is collected with
//! file, line and column. Only what can be seen in one file is judged here (types, columns, rows
//! that belong together); what the day means is judged by the service, whose findings
//! [`DayFolder::place_of`] leads back to file, line and column.
//!
//! Sources: RFC 4180 (CSV), RFC 3339 (times), RFC 7946 (GeoJSON), TOML 1.0, Apache Parquet.

mod aircraft;
mod airports;
mod capacity;
mod counted;
mod day_toml;
mod decisions;
mod features;
mod flights;
mod locate;
mod proposals;
mod restrictions;
mod sectors;
mod send;
#[cfg(test)]
mod tests;

pub(crate) use flights::read_profiles;

use crate::tables::findings::{Findings, Problem, nearest};
use crate::tables::rows::Rows;
use crate::tables::table_file::{self, TableFile, io_problem};
use day_toml::DayToml;
use flights::{Known, PointLines};
use jiff::Timestamp;
use jiff::civil::Date;
use jiff::tz::Offset;
use proposals::Proposals;
use restrictions::Restrictions;
use rimeshift_proto::v1::{
    AircraftClass, Airport, AirportCapacity, Background, Capacity, Flight, Flow, FuelRow,
    HandDecision,
};
use sectors::Sectors;
use std::fs;
use std::io;
use std::path::Path;

/// The tables that are GeoJSON.
const FEATURES: [&str; 2] = ["sectors", "restrictions"];

/// A day folder, read.
#[derive(Debug)]
pub(crate) struct DayFolder {
    /// The date whose 00:00 UTC the day counts from.
    pub(crate) date: Date,
    day: DayToml,
    sectors: Sectors,
    capacities: Rows<Capacity>,
    airports: Rows<Airport>,
    airport_capacities: Rows<AirportCapacity>,
    aircraft: Rows<AircraftClass>,
    fuel: Rows<FuelRow>,
    flights: Rows<Flight>,
    point_lines: PointLines,
    proposals: Proposals,
    restrictions: Restrictions,
    background: Rows<Background>,
    flows: Rows<Flow>,
    decisions: Rows<HandDecision>,
}

/// What a folder is read with.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Reading<'a> {
    /// The policy keys that there are.
    pub(crate) policy_keys: &'a [String],
    /// A table of proposals that takes the place of the folder's.
    pub(crate) proposals: Option<&'a Path>,
}

/// Reads a day folder.
///
/// # Errors
/// Every defect found, with its place; the warnings beside them.
pub(crate) fn read(
    folder: &Path,
    reading: Reading<'_>,
) -> Result<(DayFolder, Vec<String>), Findings> {
    let mut findings = Findings::default();
    if let Err(problem) = require_folder(folder) {
        findings.defects.add_problem(folder.display(), problem);
        return Err(findings);
    }
    let day = day_toml::read(folder, reading.policy_keys, &mut findings);
    let names = names_in(folder);
    let tables = Tables { folder, day: &day };
    let found = &mut findings;
    let sectors = {
        let shown = tables.name_of_features("sectors");
        sectors::read(&folder.join(&shown), &shown, found)
    };
    let capacities = capacity::read_sectors(tables.required("capacity", found), found);
    let airports = airports::read(tables.find("airports", found), found);
    let airport_capacities = capacity::read_airports(tables.find("airport_capacity", found), found);
    let aircraft = aircraft::read_classes(tables.find("aircraft", found), found);
    let fuel = aircraft::read_fuel(tables.find("fuel", found), found);
    let before = found.defects.count();
    let mut flights = flights::read(tables.required("flights", found), found);
    let known = if found.defects.count() == before { Known::All } else { Known::Some };
    let date = day.date.unwrap_or(Date::ZERO);
    let points = tables.required("points", found);
    let point_lines = flights::read_points(points, midnight(date), &mut flights, known, found);
    let proposals = match reading.proposals {
        Some(path) => named_table(path, found),
        None => tables.find("proposals", found),
    };
    let proposals = proposals::read(proposals, found);
    let restrictions = match tables.find_features("restrictions") {
        Some(shown) => restrictions::read(&folder.join(&shown), &shown, found),
        None => Restrictions::default(),
    };
    let background = counted::read_background(tables.find("background", found), found);
    let flows = counted::read_flows(tables.find("flows", found), found);
    let decisions = decisions::read(tables.find("decisions", found), found);
    warn_of_files(&names, &day, found);
    if !findings.defects.is_empty() {
        return Err(findings);
    }
    let folder = DayFolder {
        date,
        day,
        sectors,
        capacities,
        airports,
        airport_capacities,
        aircraft,
        fuel,
        flights,
        point_lines,
        proposals,
        restrictions,
        background,
        flows,
        decisions,
    };
    Ok((folder, findings.warnings))
}

/// 00:00 UTC of a date.
pub(crate) fn midnight(date: Date) -> Timestamp {
    // Dates within a day of the calendar's ends have no such time; the service refuses them.
    Offset::UTC.to_timestamp(date.at(0, 0, 0, 0)).unwrap_or_default()
}

fn require_folder(folder: &Path) -> Result<(), Problem> {
    match fs::metadata(folder) {
        Ok(metadata) if metadata.is_dir() => Ok(()),
        Ok(_) => Err(Problem::with_hint(
            "is a file, and a day is a folder",
            "give the folder that holds day.toml",
        )),
        Err(error) if error.kind() == io::ErrorKind::NotFound => {
            Err(Problem::new("there is no such folder"))
        }
        Err(error) => Err(io_problem(&error)),
    }
}

/// The tables of one folder.
struct Tables<'a> {
    folder: &'a Path,
    day: &'a DayToml,
}

impl Tables<'_> {
    fn find(&self, table: &str, findings: &mut Findings) -> Option<TableFile> {
        let named = self.day.files.get(table).map(String::as_str);
        table_file::find(self.folder, table, named, &mut findings.defects)
    }

    /// The name of a file of features.
    fn name_of_features(&self, table: &str) -> String {
        self.day.files.get(table).cloned().unwrap_or_else(|| format!("{table}.geojson"))
    }

    /// The same where `[files]` names it or the folder holds it.
    fn find_features(&self, table: &str) -> Option<String> {
        let shown = self.name_of_features(table);
        let there = || fs::symlink_metadata(self.folder.join(&shown)).is_ok();
        (self.day.files.contains_key(table) || there()).then_some(shown)
    }

    fn required(&self, table: &str, findings: &mut Findings) -> Option<TableFile> {
        let before = findings.defects.count();
        let found = self.find(table, findings);
        if found.is_none() && findings.defects.count() == before {
            findings.defects.add_with_hint(
                format!("{table}.csv"),
                "there is no such file, and a day needs one",
                format!("it may be {table}.csv, .csv.gz, .csv.zst or .parquet"),
            );
        }
        found
    }
}

fn named_table(path: &Path, findings: &mut Findings) -> Option<TableFile> {
    let shown = path.display().to_string();
    TableFile::at(path, &shown)
        .map_err(|problem| findings.defects.add_problem(&shown, problem))
        .ok()
}

/// The names of the folder's files, in order.
fn names_in(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = fs::read_dir(folder)
        .into_iter()
        .flatten()
        .flatten()
        .filter(|entry| entry.path().is_file())
        .map(|entry| entry.file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}

/// Warns of a table that this version does not use, of files whose name is nearly a table's, and of
/// GeoJSON under another ending.
fn warn_of_files(names: &[String], day: &DayToml, findings: &mut Findings) {
    for name in names.iter().filter(|name| !day.files.values().any(|file| file == *name)) {
        let stem = name.split('.').next().unwrap_or_default();
        let warning = if stem == "weather" {
            "this version does not use it yet".to_owned()
        } else if FEATURES.contains(&stem) && *name != format!("{stem}.geojson") {
            format!("is not read; was {stem}.geojson meant?")
        } else if !day_toml::TABLES.contains(&stem)
            && stem != "day"
            && let Some(near) = nearest(stem, day_toml::TABLES)
        {
            format!("is not read; was {near} meant?")
        } else {
            continue;
        };
        findings.warnings.push(format!("{name}: {warning}"));
    }
}
