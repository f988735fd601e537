//! Rows of the wire, message after message, to the parts of a day.

use std::collections::HashMap;

use prost::Message;
use prost_types::Timestamp;
use rimeshift_engine::day::{
    AircraftParts, AirportCapacityParts, AirportParts, AlternativeParts, CapacityParts, Date,
    DayParts, FlightParts, FuelFlow, FuelParts, PointParts, ProposalParts, SectorParts,
    StretchParts, VolumeParts,
};
use rimeshift_proto::v1;

use super::clock::DayClock;
use super::fields::Fields;
use crate::stream::Brought;

/// A day that is being received. Paths in its defects count rows over all messages.
#[derive(Debug)]
pub(crate) struct Receiving {
    parts: DayParts,
    clock: DayClock,
    fields: Fields,
    /// Place of each flight by name, made when the first flight is continued.
    flight_places: HashMap<String, usize>,
    /// How many flights are placed.
    placed: usize,
    /// How many rows continued a flight.
    continued: usize,
}

/// What a message brings.
pub(crate) fn brought(rows: &v1::DayRows) -> Brought {
    let points = |points: Option<&v1::Points>| points.map_or(0, |p| p.seconds_after_epoch.len());
    let volumes = |sector: &v1::Sector| {
        let positions = |ring: &v1::Ring| 1 + ring.lon_deg.len();
        let rings = |volume: &v1::Volume| 1 + volume.rings.iter().map(positions).sum::<usize>();
        sector.volumes.iter().map(rings).sum::<usize>()
    };
    let options = |proposal: &v1::Proposal| {
        proposal.options.iter().map(|option| 1 + option.stretches.len()).sum::<usize>()
    };
    let tables = rows.sectors.len()
        + rows.capacities.len()
        + rows.airports.len()
        + rows.airport_capacities.len()
        + rows.aircraft.len()
        + rows.fuel.len()
        + rows.flights.len()
        + rows.flight_points.len()
        + rows.proposals.len();
    Brought {
        points: rows.flights.iter().map(|f| points(f.points.as_ref())).sum::<usize>()
            + rows.flight_points.iter().map(|f| points(f.points.as_ref())).sum::<usize>(),
        rows: tables
            + rows.sectors.iter().map(volumes).sum::<usize>()
            + rows.proposals.iter().map(options).sum::<usize>(),
        bytes: rows.encoded_len(),
    }
}

impl Receiving {
    /// A day without rows yet. `fields` holds what is wrong with its header.
    pub(crate) fn new(date: Date, clock: DayClock, region: String, fields: Fields) -> Self {
        let mut parts = DayParts::empty(date, "");
        parts.region = region;
        Self { parts, clock, fields, flight_places: HashMap::new(), placed: 0, continued: 0 }
    }

    /// The policy, to be set from the header.
    pub(crate) fn policy_and_fields(
        &mut self,
    ) -> (&mut rimeshift_engine::day::Policy, &mut Fields) {
        (&mut self.parts.policy, &mut self.fields)
    }

    /// Adds the rows of one message.
    pub(crate) fn add(&mut self, rows: v1::DayRows) {
        rows.sectors.into_iter().for_each(|row| self.sector(row));
        rows.capacities.into_iter().for_each(|row| self.capacity(row));
        rows.airports.into_iter().for_each(|row| self.airport(row));
        rows.airport_capacities.into_iter().for_each(|row| self.airport_capacity(row));
        self.parts.aircraft.extend(rows.aircraft.into_iter().map(aircraft));
        rows.fuel.into_iter().for_each(|row| self.fuel(row));
        rows.flights.into_iter().for_each(|row| self.flight(row));
        rows.flight_points.into_iter().for_each(|row| self.flight_points(row));
        rows.proposals.into_iter().for_each(|row| self.proposal(row));
    }

    /// The parts, or everything that is wrong so far.
    pub(crate) fn finish(self) -> Result<DayParts, Vec<rimeshift_engine::day::Defect>> {
        if self.fields.is_empty() { Ok(self.parts) } else { Err(self.fields.into_defects()) }
    }

    fn sector(&mut self, row: v1::Sector) {
        let i = self.parts.sectors.len();
        let mut volumes = Vec::with_capacity(row.volumes.len());
        for (v, volume) in row.volumes.into_iter().enumerate() {
            let mut rings = Vec::with_capacity(volume.rings.len());
            for (r, ring) in volume.rings.into_iter().enumerate() {
                if ring.lon_deg.len() != ring.lat_deg.len() {
                    self.fields.push(
                        || format!("sectors[{i}].volumes[{v}].rings[{r}]"),
                        format!(
                            "has {} longitudes and {} latitudes",
                            ring.lon_deg.len(),
                            ring.lat_deg.len()
                        ),
                        "give one of each a position",
                    );
                }
                rings.push(
                    ring.lon_deg.into_iter().zip(ring.lat_deg).map(<[f64; 2]>::from).collect(),
                );
            }
            volumes.push(VolumeParts {
                rings,
                floor_ft: volume.floor_ft,
                ceiling_ft: volume.ceiling_ft,
            });
        }
        self.parts.sectors.push(SectorParts {
            sector: row.sector,
            name: row.title,
            volumes,
            horizontal_nm: row.horizontal_nm,
            no_changes: row.no_changes,
        });
    }

    fn capacity(&mut self, row: v1::Capacity) {
        let i = self.parts.capacities.len();
        let from_s = self.required_time(|| format!("capacities[{i}].from"), row.from);
        let until_s = self.required_time(|| format!("capacities[{i}].until"), row.until);
        self.parts.capacities.push(CapacityParts {
            sector: row.sector,
            from_s,
            until_s,
            entries_per_hour: row.entries_per_hour,
            occupancy_limit: row.occupancy_limit,
            occupancy_lasting: row.occupancy_lasting,
            level_changes_per_hour: row.level_changes_per_hour,
        });
    }

    fn airport(&mut self, row: v1::Airport) {
        let i = self.parts.airports.len();
        let lon_deg = self.required(|| format!("airports[{i}].lon_deg"), row.lon_deg);
        let lat_deg = self.required(|| format!("airports[{i}].lat_deg"), row.lat_deg);
        self.parts.airports.push(AirportParts {
            airport: row.airport,
            lon_deg,
            lat_deg,
            name: row.title,
        });
    }

    fn airport_capacity(&mut self, row: v1::AirportCapacity) {
        let i = self.parts.airport_capacities.len();
        let from_s = self.required_time(|| format!("airport_capacities[{i}].from"), row.from);
        let until_s = self.required_time(|| format!("airport_capacities[{i}].until"), row.until);
        self.parts.airport_capacities.push(AirportCapacityParts {
            airport: row.airport,
            from_s,
            until_s,
            arrivals_per_hour: row.arrivals_per_hour,
            departures_per_hour: row.departures_per_hour,
        });
    }

    fn fuel(&mut self, row: v1::FuelRow) {
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

    fn flight(&mut self, row: v1::Flight) {
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

    fn flight_points(&mut self, row: v1::FlightPoints) {
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

    fn proposal(&mut self, row: v1::Proposal) {
        let i = self.parts.proposals.len();
        let mut alternatives = Vec::with_capacity(row.options.len());
        for (o, option) in row.options.into_iter().enumerate() {
            let path = || format!("proposals[{i}].options[{o}]");
            alternatives.push(alternative(
                self.clock,
                path,
                option.option,
                option.stretches,
                option.figures,
                &mut self.fields,
            ));
        }
        self.parts.proposals.push(ProposalParts {
            proposal: row.proposal,
            flight: row.flight,
            alternatives,
        });
    }

    fn required(&mut self, path: impl FnOnce() -> String, value: Option<f64>) -> f64 {
        value.unwrap_or_else(|| {
            self.fields.push(path, "is missing", "give a number");
            0.0
        })
    }

    fn required_time(&mut self, path: impl Fn() -> String, time: Option<Timestamp>) -> f64 {
        required_time(self.clock, path, time, &mut self.fields)
    }
}

fn aircraft(row: v1::AircraftClass) -> AircraftParts {
    AircraftParts {
        aircraft: row.aircraft,
        ceiling_ft: row.ceiling_ft,
        climb_fpm: row.climb_fpm,
        descent_fpm: row.descent_fpm,
        contrail_factor: row.contrail_factor,
    }
}

fn required_time(
    clock: DayClock,
    path: impl Fn() -> String,
    time: Option<Timestamp>,
    fields: &mut Fields,
) -> f64 {
    if time.is_none() {
        fields.push(&path, "is missing", "give a time");
    }
    optional_time(clock, path, time, fields).unwrap_or_default()
}

/// Seconds of the day where a time is given; what is no time is noted.
pub(crate) fn optional_time(
    clock: DayClock,
    path: impl FnOnce() -> String,
    time: Option<Timestamp>,
    fields: &mut Fields,
) -> Option<f64> {
    let time = time?;
    let seconds = clock.seconds(&time);
    if seconds.is_none() {
        fields.push(
            path,
            format!("{} s and {} ns is no time", time.seconds, time.nanos),
            "a time of the years 1 to 9999, with nanos from 0 to 999999999",
        );
    }
    seconds
}

/// One option, of a proposal or asked about.
pub(crate) fn alternative(
    clock: DayClock,
    path: impl Fn() -> String,
    option: u32,
    stretches: Vec<v1::Stretch>,
    figures: Option<v1::OptionFigures>,
    fields: &mut Fields,
) -> AlternativeParts {
    let figures = figures.unwrap_or_default();
    let stretches = stretches.into_iter().enumerate().map(|(s, stretch)| StretchParts {
        level_ft: stretch.level_ft,
        from_s: optional_time(
            clock,
            || format!("{}.stretches[{s}].from", path()),
            stretch.from,
            fields,
        ),
        until_s: optional_time(
            clock,
            || format!("{}.stretches[{s}].until", path()),
            stretch.until,
            fields,
        ),
    });
    AlternativeParts {
        option,
        stretches: stretches.collect(),
        contrail_km_avoided: figures.contrail_km_avoided,
        ef_avoided_j: figures.ef_avoided_j,
        extra_fuel_kg: figures.extra_fuel_kg,
        max_extra_fuel_kg: figures.max_extra_fuel_kg,
        priority: figures.priority.unwrap_or(1.0),
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
