//! Rows of the wire, message after message, to the parts of a day.

mod counted;
mod flights;
mod places;
mod proposals;

pub(crate) use flights::append_points;
pub(crate) use proposals::{alternative, decision};

use std::collections::HashMap;

use prost::Message;
use prost_types::Timestamp;
use rimeshift_engine::day::{Date, DayParts};
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
    /// How many decisions by hand came.
    decided: usize,
}

/// What a message brings.
pub(crate) fn brought(rows: &v1::DayRows) -> Brought {
    let points = |points: Option<&v1::Points>| points.map_or(0, |p| p.seconds_after_epoch.len());
    let nested = |volumes: &[v1::Volume]| {
        let positions = |ring: &v1::Ring| 1 + ring.lon_deg.len();
        let rings = |volume: &v1::Volume| 1 + volume.rings.iter().map(positions).sum::<usize>();
        volumes.iter().map(rings).sum::<usize>()
    };
    let restriction = |row: &v1::Restriction| nested(&row.volumes) + row.levels_allowed_ft.len();
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
        + rows.proposals.len()
        + rows.restrictions.len()
        + rows.background.len()
        + rows.flows.len()
        + rows.decisions.len();
    Brought {
        points: rows.flights.iter().map(|f| points(f.points.as_ref())).sum::<usize>()
            + rows.flight_points.iter().map(|f| points(f.points.as_ref())).sum::<usize>(),
        rows: tables
            + rows.sectors.iter().map(|sector| nested(&sector.volumes)).sum::<usize>()
            + rows.restrictions.iter().map(restriction).sum::<usize>()
            + rows.proposals.iter().map(options).sum::<usize>(),
        bytes: rows.encoded_len(),
    }
}

impl Receiving {
    /// A day without rows yet. `fields` holds what is wrong with its header.
    pub(crate) fn new(date: Date, clock: DayClock, region: String, fields: Fields) -> Self {
        let mut parts = DayParts::empty(date, "");
        parts.region = region;
        Self {
            parts,
            clock,
            fields,
            flight_places: HashMap::new(),
            placed: 0,
            continued: 0,
            decided: 0,
        }
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
        self.parts.aircraft.extend(rows.aircraft.into_iter().map(flights::aircraft));
        rows.fuel.into_iter().for_each(|row| self.fuel(row));
        rows.flights.into_iter().for_each(|row| self.flight(row));
        rows.flight_points.into_iter().for_each(|row| self.flight_points(row));
        rows.proposals.into_iter().for_each(|row| self.proposal(row));
        rows.restrictions.into_iter().for_each(|row| self.restriction(row));
        rows.background.into_iter().for_each(|row| self.background(row));
        rows.flows.into_iter().for_each(|row| self.flow(row));
        rows.decisions.into_iter().for_each(|row| self.decision(row));
    }

    /// The parts, or everything that is wrong so far.
    pub(crate) fn finish(self) -> Result<DayParts, Vec<rimeshift_engine::day::Defect>> {
        if self.fields.is_empty() { Ok(self.parts) } else { Err(self.fields.into_defects()) }
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
