//! Small days for the unit tests of the engine.

use crate::day::{Date, Day, DayParts, FlightParts, PointParts, Stretch};

/// A day without content, to be filled by a test.
pub(crate) fn empty_parts() -> DayParts {
    DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "test")
}

/// A flight of points (time s, lon, lat, FL).
pub(crate) fn flight(name: &str, points: &[(f64, f64, f64, f64)]) -> FlightParts {
    FlightParts {
        flight: name.to_owned(),
        departure: "XAAA".to_owned(),
        destination: "XBBB".to_owned(),
        aircraft: "T1".to_owned(),
        rvsm: true,
        movable: true,
        points: points
            .iter()
            .map(|&(time_s, lon_deg, lat_deg, fl)| PointParts {
                time_s,
                lon_deg,
                lat_deg,
                level_ft: fl * 100.0,
                fix: None,
            })
            .collect(),
        ..FlightParts::default()
    }
}

/// A day of these flights and nothing else.
pub(crate) fn day_of(flights: Vec<FlightParts>) -> Day {
    let built = Day::build(DayParts { flights, ..empty_parts() });
    built.expect("a sound day").day
}

/// A stretch at a flight level.
pub(crate) fn stretch(fl: f64, from_s: Option<f64>, until_s: Option<f64>) -> Stretch {
    Stretch { level_ft: fl * 100.0, from_s, until_s }
}
