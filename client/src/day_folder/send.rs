//! The rows of a folder in the messages of the stream that loads a day, each about a megabyte: a
//! message may not be larger than 4 MiB.

use super::DayFolder;
use prost::Message;
use rimeshift_proto::v1::load_day_request::Content;
use rimeshift_proto::v1::{
    AircraftClass, Airport, AirportCapacity, Background, Capacity, Date, DayRows, Flight,
    FlightPoints, Flow, FuelRow, HandDecision, LoadDayHeader, LoadDayRequest, Points, Proposal,
    Restriction, Sector,
};

/// The size at which a message is full, in bytes.
const FULL: usize = 1 << 20;

/// The most defects that one answer is to list: as many as are spelled out.
const MOST_DEFECTS: u32 = 100;

/// The most points of one flight in one message: with place names, about a megabyte.
const MOST_POINTS: usize = 16_384;

impl DayFolder {
    /// The messages that load this day under an id, in order. They are made one at a time.
    pub(crate) fn requests(&self, day_id: &str) -> impl Iterator<Item = LoadDayRequest> {
        let header = LoadDayHeader {
            day_id: day_id.to_owned(),
            allow_replace: true,
            date: Some(Date {
                year: i32::from(self.date.year()),
                month: i32::from(self.date.month()),
                day: i32::from(self.date.day()),
            }),
            region: self.day.region.clone(),
            policy: self.day.policy.clone(),
            max_defects: MOST_DEFECTS,
        };
        let header = LoadDayRequest { content: Some(Content::Header(header)) };
        std::iter::once(header).chain(Messages { rows: self.all_rows() })
    }

    fn all_rows(&self) -> impl Iterator<Item = SentRow<'_>> {
        let sectors = self.sectors.rows.iter().map(SentRow::Sector);
        let capacities = self.capacities.rows.iter().map(SentRow::Capacity);
        let airports = self.airports.rows.iter().map(SentRow::Airport);
        let limits = self.airport_capacities.rows.iter().map(SentRow::AirportCapacity);
        let aircraft = self.aircraft.rows.iter().map(SentRow::Aircraft);
        let fuel = self.fuel.rows.iter().map(SentRow::Fuel);
        let flights = self.flights.rows.iter().flat_map(pieces);
        let proposals = self.proposals.rows.iter().map(SentRow::Proposal);
        let restrictions = self.restrictions.rows.iter().map(SentRow::Restriction);
        let background = self.background.rows.iter().map(SentRow::Background);
        let flows = self.flows.rows.iter().map(SentRow::Flow);
        let decisions = self.decisions.rows.iter().map(SentRow::Decision);
        sectors
            .chain(capacities)
            .chain(airports)
            .chain(limits)
            .chain(aircraft)
            .chain(fuel)
            .chain(flights)
            .chain(proposals)
            .chain(restrictions)
            .chain(background)
            .chain(flows)
            .chain(decisions)
    }
}

/// One row on its way into a message.
enum SentRow<'a> {
    Sector(&'a Sector),
    Capacity(&'a Capacity),
    Airport(&'a Airport),
    AirportCapacity(&'a AirportCapacity),
    Aircraft(&'a AircraftClass),
    Fuel(&'a FuelRow),
    /// A flight with all its points, few enough for one message.
    Flight(&'a Flight),
    /// A flight with more, its first points with it.
    LongFlight(Box<Flight>),
    /// Further points of such a flight.
    Points(FlightPoints),
    Proposal(&'a Proposal),
    Restriction(&'a Restriction),
    Background(&'a Background),
    Flow(&'a Flow),
    Decision(&'a HandDecision),
}

impl SentRow<'_> {
    fn size(&self) -> usize {
        match self {
            SentRow::Sector(row) => row.encoded_len(),
            SentRow::Capacity(row) => row.encoded_len(),
            SentRow::Airport(row) => row.encoded_len(),
            SentRow::AirportCapacity(row) => row.encoded_len(),
            SentRow::Aircraft(row) => row.encoded_len(),
            SentRow::Fuel(row) => row.encoded_len(),
            SentRow::Flight(row) => row.encoded_len(),
            SentRow::LongFlight(row) => row.encoded_len(),
            SentRow::Points(row) => row.encoded_len(),
            SentRow::Proposal(row) => row.encoded_len(),
            SentRow::Restriction(row) => row.encoded_len(),
            SentRow::Background(row) => row.encoded_len(),
            SentRow::Flow(row) => row.encoded_len(),
            SentRow::Decision(row) => row.encoded_len(),
        }
    }

    fn add_to(self, message: &mut DayRows) {
        match self {
            SentRow::Sector(row) => message.sectors.push(row.clone()),
            SentRow::Capacity(row) => message.capacities.push(row.clone()),
            SentRow::Airport(row) => message.airports.push(row.clone()),
            SentRow::AirportCapacity(row) => message.airport_capacities.push(row.clone()),
            SentRow::Aircraft(row) => message.aircraft.push(row.clone()),
            SentRow::Fuel(row) => message.fuel.push(row.clone()),
            SentRow::Flight(row) => message.flights.push(row.clone()),
            SentRow::LongFlight(row) => message.flights.push(*row),
            SentRow::Points(row) => message.flight_points.push(row),
            SentRow::Proposal(row) => message.proposals.push(row.clone()),
            SentRow::Restriction(row) => message.restrictions.push(row.clone()),
            SentRow::Background(row) => message.background.push(row.clone()),
            SentRow::Flow(row) => message.flows.push(row.clone()),
            SentRow::Decision(row) => message.decisions.push(row.clone()),
        }
    }
}

/// Rows gathered into messages.
struct Messages<I> {
    rows: I,
}

impl<'a, I: Iterator<Item = SentRow<'a>>> Iterator for Messages<I> {
    type Item = LoadDayRequest;

    fn next(&mut self) -> Option<LoadDayRequest> {
        let mut message = DayRows::default();
        let mut size = 0;
        while size < FULL
            && let Some(row) = self.rows.next()
        {
            size += row.size();
            row.add_to(&mut message);
        }
        (size > 0).then_some(LoadDayRequest { content: Some(Content::Rows(message)) })
    }
}

/// A flight in as many pieces as its points need.
fn pieces(flight: &Flight) -> Vec<SentRow<'_>> {
    let Some(points) = &flight.points else { return vec![SentRow::Flight(flight)] };
    let count = points.lon_deg.len();
    if count <= MOST_POINTS {
        return vec![SentRow::Flight(flight)];
    }
    (0..count)
        .step_by(MOST_POINTS)
        .map(|start| {
            let points = Some(part(points, start));
            if start == 0 {
                let mut first = Flight { points: None, ..flight.clone() };
                first.points = points;
                SentRow::LongFlight(Box::new(first))
            } else {
                SentRow::Points(FlightPoints { flight: flight.flight.clone(), points })
            }
        })
        .collect()
}

/// A run of [`MOST_POINTS`] points at most.
fn part(points: &Points, start: usize) -> Points {
    fn run<T: Clone>(all: &[T], start: usize) -> Vec<T> {
        all.iter().skip(start).take(MOST_POINTS).cloned().collect()
    }
    Points {
        epoch: points.epoch,
        seconds_after_epoch: run(&points.seconds_after_epoch, start),
        lon_deg: run(&points.lon_deg, start),
        lat_deg: run(&points.lat_deg, start),
        level_ft: run(&points.level_ft, start),
        fix: run(&points.fix, start),
    }
}
