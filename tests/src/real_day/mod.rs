//! Turns one weekday of a published timetable into a day folder.
//!
//! The timetables hold who left where and when, and for where: no routes, no levels, no sectors.
//! Those are modelled, in this order:
//!
//! 1. local clocks become UTC ([`zones`]);
//! 2. each flight follows the geodesic, in still standard air, with a cruise level by distance and
//!    direction ([`model`]);
//! 3. the country is tiled by bricks in three layers, with limits from the day's own traffic and
//!    from the Monitor Alert Parameter of FAA JO 7210.3Y, 17-8-2 ([`tiling`]);
//! 4. invented ice-supersaturated regions make flights ask for other levels ([`requests`]).
//!
//! So the numbers of flights, their places and hours are real; everything vertical is plausible
//! and no more. `tests/data/real-days/README.md` names the sources and their licences.

pub mod model;
pub mod requests;
pub mod source;
pub mod tiling;
pub mod zones;

use std::{
    collections::BTreeMap,
    fmt, fs,
    path::{Path, PathBuf},
};

use rimeshift_demo_sectors::{
    fleet,
    flight::Flight,
    tables::{self, AirportRow, Clock, Table},
    tally,
};

pub use source::Source;

/// What to make of a timetable.
#[derive(Debug, Clone)]
pub struct Options {
    /// The date, `YYYY-MM-DD`, by the clock of each flight's origin.
    pub date: String,
    /// Table of flights; none: the extract in this repository.
    pub flights: Option<PathBuf>,
    /// Table of airports; none: the extract in this repository.
    pub airports: Option<PathBuf>,
    /// Number of proposals, one a flight.
    pub proposals: usize,
    /// Most options that a proposal has.
    pub options: usize,
    /// Seed of everything that is drawn.
    pub seed: u64,
    /// How the points are written.
    pub points: PointsFormat,
}

/// How the points table is written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum PointsFormat {
    /// `points.csv`
    Csv,
    /// `points.parquet`
    Parquet,
}

impl Options {
    /// The date of the extract of a source and 1 000 proposals: of up to three options for the
    /// whole country; of one for the single city, whose thin traffic leaves room for nearly every
    /// proposal that has a second choice.
    #[must_use]
    pub fn of(source: Source) -> Self {
        Self {
            date: source.extract_date().to_owned(),
            flights: None,
            airports: None,
            proposals: 1000,
            options: match source {
                Source::Us2001 => 3,
                Source::Nyc2013 => 1,
            },
            seed: 1,
            points: PointsFormat::Csv,
        }
    }
}

/// What was made.
#[derive(Debug, Clone)]
pub struct Summary {
    /// Flights written.
    pub flights: usize,
    /// Rows of the timetable left out because an airport's position is not known.
    pub unknown_airport: usize,
    /// Rows left out because the flight is too short for a climb and a descent.
    pub too_short: usize,
    /// Points written.
    pub points: usize,
    /// Sectors written.
    pub sectors: usize,
    /// Proposals written.
    pub proposals: usize,
    /// Options of all proposals together.
    pub options: usize,
    /// Flights that cross an ice region long enough to ask.
    pub crossings: usize,
    /// Flights by highest level.
    pub by_level: BTreeMap<u32, usize>,
    /// Mean distance in cruise at or above FL 245, of flights that have any, NM.
    pub mean_cruise_nm: f64,
    /// Flights in the air at each full hour UTC, from 00:00 of the date.
    pub airborne: Vec<usize>,
    /// Ratio of the modelled time in the air to the recorded one, where the source has it: the
    /// quartiles over all flights.
    pub air_time_ratio: Option<[f64; 3]>,
}

/// Writes a day folder.
///
/// # Errors
/// If a table can't be read, the date has no flights, or the folder can't be written; the message
/// names the file.
pub fn write_day(source: Source, options: &Options, out_dir: &Path) -> Result<Summary, String> {
    let table = source.read(options)?;
    let modelled = model::fly_all(&table, options)?;
    let flights = &modelled.flights;
    if flights.is_empty() {
        return Err(format!("{}: no flights on that date", options.date));
    }
    let tiling = tiling::Tiling::over(flights);
    let made = requests::invent(flights, options);
    let airports = airport_rows(&table, flights);

    let clock = Clock::of(&options.date)?;
    fs::create_dir_all(out_dir).map_err(|e| format!("{}: {e}", out_dir.display()))?;
    let text = |name: &str, content: String| {
        let path = out_dir.join(name);
        fs::write(&path, content).map_err(|e| format!("{}: {e}", path.display()))
    };
    text("day.toml", source.day_toml(&options.date))?;
    text("sectors.geojson", tables::geojson_text(&tiling.geojson()))?;
    tables::capacity(&tiling.capacity_rows(), clock)?.write(&out_dir.join("capacity.csv"))?;
    let (places, limits) = tables::airports(&airports, clock)?;
    places.write(&out_dir.join("airports.csv"))?;
    limits.write(&out_dir.join("airport_capacity.csv"))?;
    tables::flights(flights).write(&out_dir.join("flights.csv"))?;
    write_points(&tables::points(flights, clock)?, options.points, out_dir)?;
    fleet::aircraft_table().write(&out_dir.join("aircraft.csv"))?;
    tables::proposals(&made.proposals, flights, clock)?.write(&out_dir.join("proposals.csv"))?;

    let summary = model::describe(&modelled);
    Ok(Summary {
        sectors: tiling.sectors(),
        proposals: made.proposals.len(),
        options: made.proposals.iter().map(|p| p.options.len()).sum(),
        crossings: made.crossings,
        ..summary
    })
}

fn write_points(points: &Table, format: PointsFormat, out_dir: &Path) -> Result<(), String> {
    // A folder written over may hold the other format, and both together are an error.
    for name in ["points.csv", "points.parquet"] {
        let path = out_dir.join(name);
        if path.exists() {
            fs::remove_file(&path).map_err(|e| format!("{}: {e}", path.display()))?;
        }
    }
    match format {
        PointsFormat::Csv => points.write(&out_dir.join("points.csv")),
        PointsFormat::Parquet => source::write_parquet(points, &out_dir.join("points.parquet")),
    }
}

/// Airports with the 95th percentile of their own hourly arrivals as limit, and their busiest hour
/// of departures.
fn airport_rows(table: &source::Timetable, flights: &[Flight]) -> Vec<AirportRow> {
    let mut arrivals: BTreeMap<&str, Vec<u32>> = BTreeMap::new();
    let mut departures: BTreeMap<&str, Vec<u32>> = BTreeMap::new();
    for f in flights {
        let none = || vec![0; tally::SPAN_MIN];
        tally::add_at(arrivals.entry(&f.destination).or_insert_with(none), f.end_s());
        tally::add_at(departures.entry(&f.departure).or_insert_with(none), f.start_s());
    }
    let (from, until) = tiling::PERIOD_MIN;
    let hourly = |counts: Option<&Vec<u32>>, share: f64| {
        let hours = counts.map(|c| tally::hourly(c, from, until)).unwrap_or_default();
        let busy: Vec<u32> = hours.into_iter().filter(|n| *n > 0).collect();
        Some(tally::quantile(&busy, share).max(1))
    };
    let used = table.airports.iter().filter(|(code, _)| {
        arrivals.contains_key(code.as_str()) || departures.contains_key(code.as_str())
    });
    used.map(|(code, airport)| {
        let most_in = hourly(arrivals.get(code.as_str()), 0.95);
        let most_out = hourly(departures.get(code.as_str()), 1.0);
        AirportRow {
            airport: code.clone(),
            lon_deg: airport.at_deg.0,
            lat_deg: airport.at_deg.1,
            name: String::new(),
            limits: vec![(from, until, most_in, most_out)],
        }
    })
    .collect()
}

impl fmt::Display for Summary {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "flights {}  points {}", self.flights, self.points)?;
        writeln!(
            f,
            "left out: airport unknown {}, too short to fly {}",
            self.unknown_airport, self.too_short
        )?;
        writeln!(f, "sectors {}", self.sectors)?;
        writeln!(
            f,
            "flights that cross ice {}  proposals {}  options {}",
            self.crossings, self.proposals, self.options
        )?;
        writeln!(f, "mean cruise distance {:.0} NM", self.mean_cruise_nm)?;
        write!(f, "flights by highest level")?;
        for (level_fl, flights) in &self.by_level {
            write!(f, "  FL{level_fl} {flights}")?;
        }
        write!(f, "\nin the air at each hour UTC")?;
        for (hour, flights) in self.airborne.iter().enumerate() {
            write!(f, "  {hour:02} {flights}")?;
        }
        writeln!(f)?;
        if let Some([low, middle, high]) = self.air_time_ratio {
            writeln!(
                f,
                "modelled time in the air over the recorded one: median {middle:.3}, quartiles \
                 {low:.3} and {high:.3}"
            )?;
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rimeshift_demo_sectors::route;

    /// The timetable's own distances, in statute miles, against the airports' positions.
    #[test]
    fn positions_agree_with_recorded_distances() {
        for (source, column) in [(Source::Us2001, 2), (Source::Nyc2013, 8)] {
            let table = source.read(&Options::of(source)).unwrap();
            let mut off = 0;
            for d in &table.departures {
                let place = |code: &str| table.airports[code].at_deg;
                let (metres, _) =
                    route::distance_and_track(place(&d.origin), place(&d.destination));
                let recorded_m = d.cells[column].parse::<f64>().unwrap() * 1609.344;
                off += usize::from((metres - recorded_m).abs() > 5_000.0 + 0.01 * recorded_m);
            }
            assert!(off * 200 < table.departures.len(), "{}: {off} rows", source.name());
        }
    }

    /// 997 aircraft left the three airports on that day; two flights are too short to model.
    /// Still air and straight routes must take less time than was recorded, but not much less.
    #[test]
    fn one_city() {
        let (first, second) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
        let options = Options { proposals: 200, ..Options::of(Source::Nyc2013) };
        let summary = write_day(Source::Nyc2013, &options, first.path()).unwrap();
        assert_eq!((summary.flights, summary.too_short, summary.unknown_airport), (995, 2, 0));
        assert_eq!(summary.proposals, 200);
        let [_, median, _] = summary.air_time_ratio.unwrap();
        assert!((0.8..1.0).contains(&median), "{median}");

        write_day(Source::Nyc2013, &options, second.path()).unwrap();
        for entry in fs::read_dir(first.path()).unwrap() {
            let name = entry.unwrap().file_name();
            let read = |folder: &Path| fs::read(folder.join(&name)).unwrap();
            assert!(read(first.path()) == read(second.path()), "{name:?} differs");
        }
    }
}
