//! The tables of a plan folder: profiles, loads and losses, written and read back.

use crate::report::figures::{rfc3339, time_of};
use crate::report::names;
use crate::tables::findings::{Findings, Problem};
use crate::tables::row::{Column, Row};
use crate::tables::rows::{Rows, wire_time};
use crate::tables::table_file::TableFile;
use crate::tables::time::rfc3339_ms;
use jiff::{SignedDuration, Timestamp};
use rimeshift_proto::v1::{
    FlightPoints, LoadCount, LoadMeasure, Loss, LossVersion, Place, PlanLoss, Points, place,
};
use std::io::{self, Write};

/// Writes profiles in the columns of a day's points.
pub(super) fn write_points(out: &mut dyn Write, flights: &[FlightPoints]) -> io::Result<()> {
    let mut table = csv::Writer::from_writer(out);
    table.write_record(["flight", "time", "lon", "lat", "level_fl", "fix"])?;
    for flight in flights {
        let Some(points) = &flight.points else { continue };
        let epoch = time_of(points.epoch.as_ref()).unwrap_or_default();
        for (index, point) in points_of(points).enumerate() {
            let [seconds, lon_deg, lat_deg, level_ft] = point;
            let fix = points.fix.get(index).map_or("", String::as_str);
            table.write_record([
                &flight.flight,
                &rfc3339_ms(after(epoch, seconds)),
                &lon_deg.to_string(),
                &lat_deg.to_string(),
                &(level_ft / 100.0).to_string(),
                fix,
            ])?;
        }
    }
    table.flush()
}

/// The points of a run, each as seconds after the epoch, longitude, latitude and feet.
fn points_of(points: &Points) -> impl Iterator<Item = [f64; 4]> {
    let places = points.lon_deg.iter().zip(&points.lat_deg);
    let rest = points.seconds_after_epoch.iter().zip(places).zip(&points.level_ft);
    rest.map(|((seconds, (lon_deg, lat_deg)), level_ft)| [*seconds, *lon_deg, *lat_deg, *level_ft])
}

/// The time so many seconds after another, to the millisecond.
fn after(epoch: Timestamp, seconds: f64) -> Timestamp {
    #[expect(clippy::cast_possible_truncation, reason = "saturates, and the sum is checked")]
    let milliseconds = (seconds * 1000.0).round() as i64;
    epoch.checked_add(SignedDuration::from_millis(milliseconds)).unwrap_or(epoch)
}

/// Writes counts beside their limits.
pub(super) fn write_loads(out: &mut dyn Write, loads: &[LoadCount]) -> io::Result<()> {
    let mut table = csv::Writer::from_writer(out);
    let header = ["sector", "airport", "measure", "window_start", "filed", "planned", "limit"];
    table.write_record(header)?;
    for load in loads {
        let (sector, airport) = match load.place.as_ref().and_then(|place| place.place.as_ref()) {
            Some(place::Place::Airport(airport)) => ("", airport.as_str()),
            Some(place::Place::Sector(sector)) => (sector.as_str(), ""),
            None => ("", ""),
        };
        table.write_record([
            sector,
            airport,
            names::load_column(load.measure),
            &rfc3339(load.window_start.as_ref()).unwrap_or_default(),
            &load.filed.to_string(),
            &load.planned.to_string(),
            &load.limit.map_or_else(String::new, |limit| limit.to_string()),
        ])?;
    }
    table.flush()
}

/// Writes losses of separation.
pub(super) fn write_losses(out: &mut dyn Write, losses: &[PlanLoss]) -> io::Result<()> {
    let mut table = csv::Writer::from_writer(out);
    table.write_record([
        "first_flight",
        "second_flight",
        "from",
        "until",
        "closest_time",
        "horizontal_nm",
        "vertical_ft",
        "sector",
        "in",
        "new",
    ])?;
    for planned in losses {
        let loss = planned.loss.clone().unwrap_or_default();
        table.write_record([
            loss.first_flight.as_str(),
            &loss.second_flight,
            &rfc3339(loss.from.as_ref()).unwrap_or_default(),
            &rfc3339(loss.until.as_ref()).unwrap_or_default(),
            &rfc3339(loss.closest_time.as_ref()).unwrap_or_default(),
            &loss.horizontal_nm.to_string(),
            &loss.vertical_ft.to_string(),
            &loss.sector,
            names::loss_version(planned.version),
            planned.is_new.to_string().as_str(),
        ])?;
    }
    table.flush()
}

const SECTOR: Column = Column::text(0, "sector").optional();
const AIRPORT: Column = Column::text(1, "airport").optional();
const MEASURE: Column = Column::text(2, "measure");
const WINDOW_START: Column = Column::value(3, "window_start");
const FILED: Column = Column::value(4, "filed");
const PLANNED: Column = Column::value(5, "planned");
const LIMIT: Column = Column::value(6, "limit").optional();

/// Reads counts.
pub(super) fn read_loads(file: TableFile, findings: &mut Findings) -> Vec<LoadCount> {
    let layout = [SECTOR, AIRPORT, MEASURE, WINDOW_START, FILED, PLANNED, LIMIT];
    let loads = Rows::read(Some(file), &layout, findings, |row| {
        let place = match (row.optional_text(SECTOR), row.optional_text(AIRPORT)) {
            (Some(sector), None) => Some(place::Place::Sector(sector.to_owned())),
            (None, Some(airport)) => Some(place::Place::Airport(airport.to_owned())),
            _ => {
                row.reject_whole(Problem::new("names not one of sector and airport"));
                None
            }
        };
        LoadCount {
            place: Some(Place { place }),
            measure: read_measure(row),
            window_start: Some(wire_time(row.time(WINDOW_START))),
            filed: row.number_of(FILED),
            planned: row.number_of(PLANNED),
            limit: row.optional_number(LIMIT),
        }
    });
    loads.rows
}

fn read_measure(row: &mut Row<'_>) -> i32 {
    let name = row.text(MEASURE);
    let measures = (1..).map_while(|value| LoadMeasure::try_from(value).ok());
    let measure = measures.map(i32::from).find(|measure| names::load_column(*measure) == name);
    measure.unwrap_or_else(|| {
        row.reject(MEASURE, Problem::new(format!("{name:?} is no measure")));
        0
    })
}

const FIRST: Column = Column::text(0, "first_flight");
const SECOND: Column = Column::text(1, "second_flight");
const FROM: Column = Column::value(2, "from");
const UNTIL: Column = Column::value(3, "until");
const CLOSEST: Column = Column::value(4, "closest_time");
const HORIZONTAL: Column = Column::value(5, "horizontal_nm");
const VERTICAL: Column = Column::value(6, "vertical_ft");
const LOSS_SECTOR: Column = Column::text(7, "sector").optional();
const VERSION: Column = Column::text(8, "in");
const NEW: Column = Column::value(9, "new").optional();

/// Reads losses.
pub(super) fn read_losses(file: TableFile, findings: &mut Findings) -> Vec<PlanLoss> {
    let layout =
        [FIRST, SECOND, FROM, UNTIL, CLOSEST, HORIZONTAL, VERTICAL, LOSS_SECTOR, VERSION, NEW];
    let losses = Rows::read(Some(file), &layout, findings, |row| PlanLoss {
        loss: Some(Loss {
            first_flight: row.text(FIRST).to_owned(),
            second_flight: row.text(SECOND).to_owned(),
            from: Some(wire_time(row.time(FROM))),
            until: Some(wire_time(row.time(UNTIL))),
            closest_time: Some(wire_time(row.time(CLOSEST))),
            horizontal_nm: row.number_of(HORIZONTAL),
            vertical_ft: row.number_of(VERTICAL),
            sector: row.optional_text(LOSS_SECTOR).unwrap_or_default().to_owned(),
        }),
        version: read_version(row),
        is_new: row.optional_flag(NEW).unwrap_or(false),
    });
    losses.rows
}

fn read_version(row: &mut Row<'_>) -> i32 {
    match row.text(VERSION) {
        "filed" => LossVersion::Filed.into(),
        "planned" => LossVersion::Planned.into(),
        "both" => LossVersion::Both.into(),
        other => {
            let problem = Problem::new(format!("{other:?} is not filed, planned or both"));
            row.reject(VERSION, problem);
            0
        }
    }
}
