//! What a filed day holds: its check, loads and losses.

use std::collections::BTreeSet;
use std::sync::Arc;

use rimeshift_engine::answer::{DayCheck, LoadCount, LoadMeasure, Loss, Place};
use rimeshift_engine::ids::{AirportId, FlightId, SectorId};
use rimeshift_proto::v1;
use rimeshift_proto::v1::check_day_response::Content;
use rimeshift_proto::v1::traffic_service_server::TrafficService;
use tonic::{Request, Response, Status};

use super::{Api, paging};
use crate::days::{LoadedDay, Ready};
use crate::error::ServiceError;
use crate::names::DayName;
use crate::wire::chunks::chunks;
use crate::wire::fields::Fields;
use crate::wire::plan_rows::measure;

type Messages = tokio_stream::Iter<std::vec::IntoIter<Result<v1::CheckDayResponse, Status>>>;

#[tonic::async_trait]
impl TrafficService for Api {
    type CheckDayStream = Messages;

    #[tracing::instrument(skip_all)]
    async fn check_day(
        &self,
        request: Request<v1::CheckDayRequest>,
    ) -> Result<Response<Messages>, Status> {
        let day = self.days.get(&DayName::parse("day", &request.into_inner().day)?)?;
        let check = day.check(&self.compute).await?;
        let messages: Vec<_> = check_messages(&day, &check).map(Ok).collect();
        Ok(Response::new(tokio_stream::iter(messages)))
    }

    async fn list_loads(
        &self,
        request: Request<v1::ListLoadsRequest>,
    ) -> Result<Response<v1::ListLoadsResponse>, Status> {
        let request = request.into_inner();
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let size = paging::page_size(request.page_size, 1000, 10_000)?;
        let start = paging::row_after(&request.page_token, &day.sha256)?;
        let filter = LoadFilter::new(&day.ready, &request)?;
        let check = day.check(&self.compute).await?;
        let rows = check.loads.iter().enumerate().skip(start);
        let rows: Vec<_> = rows.filter(|(_, load)| filter.admits(load)).take(size + 1).collect();
        let (rows, next_page_token) =
            paging::cut(rows, size, |(i, _)| paging::token(*i, &day.sha256));
        let answers = day.ready.answers();
        let loads = rows.into_iter().map(|(_, load)| answers.load_count(load)).collect();
        Ok(Response::new(v1::ListLoadsResponse { loads, next_page_token }))
    }

    async fn list_losses(
        &self,
        request: Request<v1::ListLossesRequest>,
    ) -> Result<Response<v1::ListLossesResponse>, Status> {
        let request = request.into_inner();
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let size = paging::page_size(request.page_size, 1000, 10_000)?;
        let start = paging::row_after(&request.page_token, &day.sha256)?;
        let filter = LossFilter::new(&day.ready, &request)?;
        let check = day.check(&self.compute).await?;
        let rows = check.losses.iter().enumerate().skip(start);
        let rows: Vec<_> = rows.filter(|(_, loss)| filter.admits(loss)).take(size + 1).collect();
        let (rows, next_page_token) =
            paging::cut(rows, size, |(i, _)| paging::token(*i, &day.sha256));
        let answers = day.ready.answers();
        let losses = rows.into_iter().map(|(_, loss)| answers.loss(loss)).collect();
        Ok(Response::new(v1::ListLossesResponse { losses, next_page_token }))
    }
}

fn check_messages(
    day: &Arc<LoadedDay>,
    check: &DayCheck,
) -> impl Iterator<Item = v1::CheckDayResponse> {
    let answers = day.ready.answers();
    let rows = |rows| v1::CheckDayResponse { content: Some(Content::Rows(rows)) };
    let overloads = chunks(check.overloads.iter().map(move |o| answers.overload(o)));
    let overloads =
        overloads.map(move |overloads| rows(v1::DayCheckRows { overloads, ..Default::default() }));
    let invalid = check.invalid_proposals.iter().map(move |(proposal, rule)| v1::InvalidProposal {
        proposal: answers.proposal(*proposal),
        broken_rule: Some(answers.rule(rule)),
    });
    let invalid = chunks(invalid).map(move |invalid_proposals| {
        rows(v1::DayCheckRows { invalid_proposals, ..Default::default() })
    });
    let summary = Content::Summary(answers.check_summary(check));
    std::iter::once(v1::CheckDayResponse { content: Some(summary) }).chain(overloads).chain(invalid)
}

/// Which counts are wanted; empty sets admit all.
struct LoadFilter {
    sectors: BTreeSet<SectorId>,
    airports: BTreeSet<AirportId>,
    measures: BTreeSet<LoadMeasure>,
}

impl LoadFilter {
    fn new(ready: &Ready, request: &v1::ListLoadsRequest) -> Result<Self, ServiceError> {
        let mut fields = Fields::default();
        let sectors = ids("sectors", &request.sectors, |n| ready.day().find_sector(n), &mut fields);
        let airports =
            ids("airports", &request.airports, |n| ready.day().find_airport(n), &mut fields);
        let mut measures = BTreeSet::new();
        for (i, wire) in request.measures().enumerate() {
            match measure(wire) {
                Some(known) => {
                    measures.insert(known);
                }
                None => fields.push(
                    || format!("measures[{i}]"),
                    "is no measure",
                    "leave the list empty for all measures",
                ),
            }
        }
        fields.into_result()?;
        Ok(Self { sectors, airports, measures })
    }

    fn admits(&self, load: &LoadCount) -> bool {
        let anywhere = self.sectors.is_empty() && self.airports.is_empty();
        let here = match load.place {
            Place::Sector(id) => self.sectors.contains(&id),
            Place::Airport(id) => self.airports.contains(&id),
        };
        (anywhere || here) && (self.measures.is_empty() || self.measures.contains(&load.measure))
    }
}

/// Which losses are wanted; empty sets admit all.
struct LossFilter {
    sectors: BTreeSet<SectorId>,
    flights: BTreeSet<FlightId>,
}

impl LossFilter {
    fn new(ready: &Ready, request: &v1::ListLossesRequest) -> Result<Self, ServiceError> {
        let mut fields = Fields::default();
        let sectors = ids("sectors", &request.sectors, |n| ready.day().find_sector(n), &mut fields);
        let flights = ids("flights", &request.flights, |n| ready.day().find_flight(n), &mut fields);
        fields.into_result()?;
        Ok(Self { sectors, flights })
    }

    fn admits(&self, loss: &Loss) -> bool {
        let here = loss.sector.is_some_and(|id| self.sectors.contains(&id));
        let whose = self.flights.contains(&loss.first) || self.flights.contains(&loss.second);
        (self.sectors.is_empty() || here) && (self.flights.is_empty() || whose)
    }
}

/// The ids of names; a name that the day does not have is a bad field.
fn ids<I: Ord>(
    field: &str,
    names: &[String],
    find: impl Fn(&str) -> Option<I>,
    fields: &mut Fields,
) -> BTreeSet<I> {
    let mut found = BTreeSet::new();
    for (i, name) in names.iter().enumerate() {
        match find(name) {
            Some(id) => {
                found.insert(id);
            }
            None => fields.push(
                || format!("{field}[{i}]"),
                format!("the day has no `{name}`"),
                "leave the list empty for all",
            ),
        }
    }
    found
}
