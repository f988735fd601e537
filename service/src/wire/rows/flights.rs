//! Flights with their points, aircraft classes and fuel.

use rimeshift_engine::day::{AircraftParts, FlightParts, FuelFlow, FuelParts, PointParts};
use rimeshift_proto::v1;

use super::super::clock::DayClock;
use super::super::fields::Fields;
use super::{Receiving, required_time};

impl Receiving {
    pub(super) fn fuel(&mut self, row: v1::FuelRow) {
        use v1::fuel_row::Flow;
        let i = self.parts.fuel.len();
        let level_ft = self.required(|| format!("fuel[{i}].level_ft"), row.level_ft);
        let flow = match row.flow {
            Some(Flow::KgPerMin(kg)) => FuelFlow::KgPerMin(kg),
            Some(Flow::KgPerNm(kg)) => FuelFlow::KgPerNm(kg),
            None => {
                self.fields.push(
                    || format!("fuel[{i}].flow"),
                    "is missing",
                    "give kg_per_min or kg_per_nm",
                );
                FuelFlow::KgPerMin(0.0)
            }
        };
        self.parts.fuel.push(FuelParts {
            aircraft: row.aircraft,
            level_ft,
            flow,
            mass_kg: row.mass_kg,
        });
    }

    pub(super) fn flight(&mut self, row: v1::Flight) {
        let i = self.parts.flights.len();
        let mut points = Vec::new();
        if let Some(wire) = row.points {
            let path = || format!("flights[{i}].points");
            append_points(self.clock, path, wire, &mut points, &mut self.fields);
        }
        self.parts.flights.push(FlightParts {
            flight: row.flight,
            departure: row.departure,
            destination: row.destination,
            aircraft: row.aircraft,
            callsign: row.callsign,
            operator: row.operator,
            mach: row.mach,
            mass_kg: row.mass_kg,
            rvsm: row.rvsm.unwrap_or(true),
            movable: row.movable.unwrap_or(true),
            points,
        });
    }

    pub(super) fn flight_points(&mut self, row: v1::FlightPoints) {
        let i = self.continued;
        self.continued += 1;
        // Flights come in order, so those not yet placed are the latest ones. A name that is there
        // twice is found when the day is built.
        for (place, flight) in self.parts.flights.iter().enumerate().skip(self.placed) {
            self.flight_places.entry(flight.flight.clone()).or_insert(place);
        }
        self.placed = self.parts.flights.len();
        let flight =
            self.flight_places.get(&row.flight).and_then(|&at| self.parts.flights.get_mut(at));
        let Some(flight) = flight else {
            self.fields.push(
                || format!("flight_points[{i}].flight"),
                format!("`{}` is no flight sent before", row.flight),
                "send a flight before its further points",
            );
            return;
        };
        if let Some(wire) = row.points {
            let path = || format!("flight_points[{i}].points");
            append_points(self.clock, path, wire, &mut flight.points, &mut self.fields);
        }
    }
}

pub(super) fn aircraft(row: v1::AircraftClass) -> AircraftParts {
    AircraftParts {
        aircraft: row.aircraft,
        ceiling_ft: row.ceiling_ft,
        climb_fpm: row.climb_fpm,
        descent_fpm: row.descent_fpm,
        contrail_factor: row.contrail_factor,
    }
}

/// Appends a run of points; lists of different length are noted and nothing is appended.
pub(crate) fn append_points(
    clock: DayClock,
    path: impl Fn() -> String,
    wire: v1::Points,
    into: &mut Vec<PointParts>,
    fields: &mut Fields,
) {
    let n = wire.seconds_after_epoch.len();
    for (column, length) in [
        ("lon_deg", wire.lon_deg.len()),
        ("lat_deg", wire.lat_deg.len()),
        ("level_ft", wire.level_ft.len()),
        ("fix", if wire.fix.is_empty() { n } else { wire.fix.len() }),
    ] {
        if length != n {
            fields.push(
                || format!("{}.{column}", path()),
                format!("has {length} entries beside {n} times"),
                "give one entry a point",
            );
            return;
        }
    }
    if n == 0 {
        return;
    }
    let epoch = || format!("{}.epoch", path());
    let epoch_s = required_time(clock, epoch, wire.epoch, fields);
    let mut fixes = wire.fix.into_iter();
    into.reserve(n);
    let places = wire.lon_deg.into_iter().zip(wire.lat_deg).zip(wire.level_ft);
    for (offset_s, ((lon_deg, lat_deg), level_ft)) in
        wire.seconds_after_epoch.into_iter().zip(places)
    {
        into.push(PointParts {
            time_s: epoch_s + offset_s,
            lon_deg,
            lat_deg,
            level_ft,
            fix: fixes.next().filter(|fix| !fix.is_empty()),
        });
    }
}
