//! `flights` and `points`: flights with their filed profiles.

use crate::tables::findings::{Findings, Problem, nearest, shown};
use crate::tables::row::{Column, Row};
use crate::tables::rows::{Rows, feet, read_table, wire_time};
use crate::tables::table_file::TableFile;
use jiff::Timestamp;
use rimeshift_proto::v1::{Flight, FlightPoints, Points};
use std::collections::{HashMap, HashSet};

const FLIGHT: Column = Column::text(0, "flight");

const DEPARTURE: Column = Column::text(1, "departure");
const DESTINATION: Column = Column::text(2, "destination");
const AIRCRAFT: Column = Column::text(3, "aircraft");
const CALLSIGN: Column = Column::text(4, "callsign").optional();
const OPERATOR: Column = Column::text(5, "operator").optional();
const MACH: Column = Column::value(6, "mach").optional();
const MASS: Column = Column::value(7, "mass_kg").optional();
const RVSM: Column = Column::value(8, "rvsm").optional();
const MOVABLE: Column = Column::value(9, "movable").optional();

const TIME: Column = Column::value(1, "time");
const LON: Column = Column::value(2, "lon");
const LAT: Column = Column::value(3, "lat");
const LEVEL: Column = Column::value(4, "level_fl");
const FIX: Column = Column::text(5, "fix").optional();

const POINTS_LAYOUT: [Column; 6] = [FLIGHT, TIME, LON, LAT, LEVEL, FIX];

/// Reads `flights`; the points are still to come.
pub(super) fn read(file: Option<TableFile>, findings: &mut Findings) -> Rows<Flight> {
    let layout =
        [FLIGHT, DEPARTURE, DESTINATION, AIRCRAFT, CALLSIGN, OPERATOR, MACH, MASS, RVSM, MOVABLE];
    Rows::read(file, &layout, findings, |row| Flight {
        flight: row.text(FLIGHT).to_owned(),
        departure: row.text(DEPARTURE).to_owned(),
        destination: row.text(DESTINATION).to_owned(),
        aircraft: row.text(AIRCRAFT).to_owned(),
        callsign: row.optional_text(CALLSIGN).map(str::to_owned),
        operator: row.optional_text(OPERATOR).map(str::to_owned),
        mach: row.optional_number(MACH),
        mass_kg: row.optional_number(MASS),
        rvsm: row.optional_flag(RVSM),
        movable: row.optional_flag(MOVABLE),
        points: None,
    })
}

/// The lines from which the points of each flight were read.
#[derive(Debug, Default)]
pub(super) struct PointLines {
    pub(super) file: Option<TableFile>,
    /// For each flight, the line of each of its points.
    pub(super) lines: Vec<Vec<u32>>,
}

impl PointLines {
    /// How an error names a point of a flight, or a cell of it.
    pub(super) fn place(
        &self,
        flight: usize,
        point: usize,
        column: Option<&str>,
    ) -> Option<String> {
        let file = self.file.as_ref()?;
        let line = *self.lines.get(flight)?.get(point)?;
        Some(match column {
            Some(column) => file.cell_place(line, column),
            None => file.row_place(line),
        })
    }
}

/// Whether the flights table could be read whole.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Known {
    /// Every flight is known.
    All,
    /// Rows could not be read; a flight that is missed may have been among them.
    Some,
}

/// Reads `points` into the flights. Points of several flights may interleave; those of one flight
/// keep their order. Times are sent as seconds after `midnight`.
pub(super) fn read_points(
    file: Option<TableFile>,
    midnight: Timestamp,
    flights: &mut Rows<Flight>,
    known: Known,
    findings: &mut Findings,
) -> PointLines {
    let Some(file) = file else { return PointLines::default() };
    let mut profiles: Vec<Points> = flights
        .rows
        .iter()
        .map(|_| Points { epoch: Some(wire_time(midnight)), ..Points::default() })
        .collect();
    let mut lines: Vec<Vec<u32>> = vec![Vec::new(); profiles.len()];
    let mut names = Names::of(&flights.rows, known);
    read_table(&file, &POINTS_LAYOUT, findings, &mut |row| {
        let flight = row.text(FLIGHT);
        let time = row.time(TIME);
        let (lon_deg, lat_deg) = (row.number_of(LON), row.number_of(LAT));
        let level_fl = row.number_of(LEVEL);
        let fix = row.optional_text(FIX);
        let Some(index) = names.find(flight, row) else { return };
        let (true, Some(points), Some(lines)) =
            (row.is_sound(), profiles.get_mut(index), lines.get_mut(index))
        else {
            return;
        };
        push_point(points, seconds_between(midnight, time), [lon_deg, lat_deg, level_fl], fix);
        lines.push(row.number());
    });
    for (flight, points) in flights.rows.iter_mut().zip(profiles) {
        flight.points = Some(points);
    }
    PointLines { file: Some(file), lines }
}

/// Reads a table of profiles that stands alone, such as a plan's: each flight of the table with its
/// points, in the order in which the flights are first met.
pub(crate) fn read_profiles(
    file: &TableFile,
    midnight: Timestamp,
    findings: &mut Findings,
) -> Vec<FlightPoints> {
    let mut profiles: Vec<FlightPoints> = Vec::new();
    let mut by_name: HashMap<String, usize> = HashMap::new();
    read_table(file, &POINTS_LAYOUT, findings, &mut |row| {
        let flight = row.text(FLIGHT);
        let time = row.time(TIME);
        let place = [row.number_of(LON), row.number_of(LAT), row.number_of(LEVEL)];
        let fix = row.optional_text(FIX);
        let index = by_name.get(flight).copied().unwrap_or(profiles.len());
        if index == profiles.len() {
            by_name.insert(flight.to_owned(), index);
            let points = Points { epoch: Some(wire_time(midnight)), ..Points::default() };
            profiles.push(FlightPoints { flight: flight.to_owned(), points: Some(points) });
        }
        if row.is_sound()
            && let Some(points) = profiles.get_mut(index).and_then(|flight| flight.points.as_mut())
        {
            push_point(points, seconds_between(midnight, time), place, fix);
        }
    });
    profiles
}

/// Appends a point: longitude, latitude and flight level at a time.
fn push_point(points: &mut Points, seconds: f64, place: [f64; 3], fix: Option<&str>) {
    let [lon_deg, lat_deg, level_fl] = place;
    push_fix(points, fix);
    points.seconds_after_epoch.push(seconds);
    points.lon_deg.push(lon_deg);
    points.lat_deg.push(lat_deg);
    points.level_ft.push(feet(level_fl));
}

/// Appends the name of the next point's place: a profile has none at all, or one for each point.
fn push_fix(points: &mut Points, fix: Option<&str>) {
    match fix {
        Some(fix) => {
            points.fix.resize(points.lon_deg.len(), String::new());
            points.fix.push(fix.to_owned());
        }
        None if !points.fix.is_empty() => points.fix.push(String::new()),
        None => {}
    }
}

/// Seconds from one time to another.
fn seconds_between(from: Timestamp, until: Timestamp) -> f64 {
    let whole = until.as_second() - from.as_second();
    let nanoseconds = until.subsec_nanosecond() - from.subsec_nanosecond();
    #[expect(clippy::cast_precision_loss, reason = "exact for years of 285 million centuries")]
    let seconds = whole as f64;
    seconds + f64::from(nanoseconds) / 1e9
}

/// Flights by name, quick where rows of one flight follow each other.
struct Names<'a> {
    flights: Vec<&'a str>,
    by_name: HashMap<&'a str, usize>,
    last: usize,
    known: Known,
    unknown: HashSet<String>,
}

impl<'a> Names<'a> {
    fn of(flights: &'a [Flight], known: Known) -> Names<'a> {
        let flights: Vec<&str> = flights.iter().map(|flight| flight.flight.as_str()).collect();
        let mut by_name = HashMap::with_capacity(flights.len());
        for (index, name) in flights.iter().enumerate() {
            by_name.entry(*name).or_insert(index);
        }
        Names { flights, by_name, last: 0, known, unknown: HashSet::new() }
    }

    /// The flight of that name. An unknown name is a defect where it is first met.
    fn find(&mut self, name: &str, row: &mut Row<'_>) -> Option<usize> {
        if self.flights.get(self.last) == Some(&name) {
            return Some(self.last);
        }
        if let Some(index) = self.by_name.get(name) {
            self.last = *index;
            return Some(*index);
        }
        if self.known == Known::All && row.is_sound() && self.unknown.insert(name.to_owned()) {
            let problem = format!("{} is no flight of the flights table", shown(name));
            let near = nearest(name, self.flights.iter().copied());
            row.reject(
                FLIGHT,
                match near.filter(|_| self.flights.len() < 1000) {
                    Some(near) => Problem::with_hint(problem, format!("was {near:?} meant?")),
                    None => Problem::new(problem),
                },
            );
        }
        None
    }
}
