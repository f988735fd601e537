//! Days: load, get, list, delete, and the keys of the policy.

use std::sync::Arc;
use std::time::SystemTime;

use rimeshift_engine::day::{Day, DayParts, Defect, Policy, Warning};
use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_server::DayService;
use rimeshift_proto::v1::load_day_request::Content;
use tokio::sync::Mutex;
use tonic::{Request, Response, Status, Streaming};

use super::{Api, paging};
use crate::canonical;
use crate::compute::Work;
use crate::days::{LoadedDay, Ready};
use crate::error::{DetailRoom, Kind, ServiceError};
use crate::names::{DayName, ResourceId};
use crate::shelf::{Replace, Shelf};
use crate::stream::RowStream;
use crate::wire::clock::{self, DayClock};
use crate::wire::fields::Fields;
use crate::wire::rows::{Receiving, brought};
use crate::wire::{policy, to_wire};

#[tonic::async_trait]
impl DayService for Api {
    #[tracing::instrument(skip_all)]
    async fn load_day(
        &self,
        request: Request<Streaming<v1::LoadDayRequest>>,
    ) -> Result<Response<v1::LoadDayResponse>, Status> {
        let mut stream = RowStream::new(request.into_inner(), self)?;
        let header = match stream.next().await?.and_then(|message| message.content) {
            Some(Content::Header(header)) => header,
            _ => return Err(header_missing().into()),
        };
        let name = DayName(ResourceId::parse("header.day_id", &header.day_id)?);
        let replace = Replace::from(header.allow_replace);
        let room = DetailRoom::of_request(header.max_defects);
        // Early, so that nobody sends a day in vain.
        self.days.check_room(std::slice::from_ref(&name), replace)?;
        let (mut receiving, clock) = begin(header)?;
        while let Some(message) = stream.next().await? {
            match message.content {
                Some(Content::Rows(rows)) => {
                    stream.count(brought(&rows))?;
                    receiving.add(rows);
                }
                Some(Content::Header(_)) => return Err(second_header().into()),
                None => {}
            }
        }
        let listed = |defects| Status::from(ServiceError::BadFields { defects, room });
        let parts = receiving.finish().map_err(listed)?;
        let most_plans = self.settings.max_plans_per_day;
        let (loaded, warnings) = self
            .compute
            .run(Work::Job, None, move |_| build(name, parts, clock, most_plans))
            .await?
            .map_err(listed)?;
        let loaded = Arc::new(loaded);
        self.days.put(vec![(loaded.name.clone(), Arc::clone(&loaded))], replace)?;
        let flights = loaded.ready.day().flights.len();
        tracing::info!(day = %loaded.name, flights, "day loaded");
        let (warnings, warning_count) = to_wire::warnings(warnings);
        Ok(Response::new(v1::LoadDayResponse {
            day: Some(to_wire::day(&loaded)),
            warnings,
            warning_count,
        }))
    }

    async fn get_day(
        &self,
        request: Request<v1::GetDayRequest>,
    ) -> Result<Response<v1::GetDayResponse>, Status> {
        let name = DayName::parse("name", &request.into_inner().name)?;
        let day = self.days.get(&name)?;
        Ok(Response::new(v1::GetDayResponse { day: Some(to_wire::day(&day)) }))
    }

    async fn list_days(
        &self,
        request: Request<v1::ListDaysRequest>,
    ) -> Result<Response<v1::ListDaysResponse>, Status> {
        let request = request.into_inner();
        let size = paging::page_size(request.page_size, 100, 1000)?;
        let after = match request.page_token.as_str() {
            "" => None,
            token => Some(DayName::parse("page_token", token)?),
        };
        let days = self.days.page(after.as_ref(), size + 1);
        let (days, next_page_token) = paging::cut(days, size, |day| day.name.to_string());
        Ok(Response::new(v1::ListDaysResponse {
            days: days.iter().map(|day| to_wire::day(day)).collect(),
            next_page_token,
        }))
    }

    async fn delete_day(
        &self,
        request: Request<v1::DeleteDayRequest>,
    ) -> Result<Response<v1::DeleteDayResponse>, Status> {
        let name = DayName::parse("name", &request.into_inner().name)?;
        self.days.delete(&name)?;
        tracing::info!(day = %name, "day deleted");
        Ok(Response::new(v1::DeleteDayResponse {}))
    }

    async fn list_policy_keys(
        &self,
        request: Request<v1::ListPolicyKeysRequest>,
    ) -> Result<Response<v1::ListPolicyKeysResponse>, Status> {
        let keys = match request.into_inner().day.as_str() {
            "" => policy::keys(&Policy::default()),
            name => {
                let day = self.days.get(&DayName::parse("day", name)?)?;
                policy::keys(&day.ready.day().policy)
            }
        };
        Ok(Response::new(v1::ListPolicyKeysResponse { keys }))
    }
}

fn header_missing() -> ServiceError {
    ServiceError::bad_field("header", "is missing", "send the header in the first message")
}

fn second_header() -> ServiceError {
    ServiceError::bad_field("header", "is sent twice", "only the first message holds a header")
}

/// A day from its header. A bad date ends the load, as no time can be read without it; what is
/// wrong with the policy is kept and told with everything else.
fn begin(header: v1::LoadDayHeader) -> Result<(Receiving, DayClock), ServiceError> {
    let bad_date =
        |problem| ServiceError::bad_field("header.date", problem, "a date of the years 1 to 9999");
    let wire = header.date.ok_or_else(|| bad_date("is missing".to_owned()))?;
    let date = clock::date(wire);
    let (date, clock) =
        date.and_then(|date| Some((date, DayClock::new(date)?))).ok_or_else(|| {
            bad_date(format!("the calendar has no {}-{}-{}", wire.year, wire.month, wire.day))
        })?;
    let mut receiving = Receiving::new(date, clock, header.region, Fields::default());
    let (policy, fields) = receiving.policy_and_fields();
    policy::apply(header.policy, policy, &[], fields);
    Ok((receiving, clock))
}

fn build(
    name: DayName,
    parts: DayParts,
    clock: DayClock,
    most_plans: usize,
) -> Result<(LoadedDay, Vec<Warning>), Vec<Defect>> {
    let built = Day::build(parts)?;
    let sha256 = canonical::day_sha256(&built.day);
    let loaded = LoadedDay {
        name,
        ready: Arc::new(Ready::new(built.day, clock)),
        sha256,
        loaded: SystemTime::now(),
        plans: Shelf::new(Kind::Plan, most_plans),
        variants: Mutex::default(),
    };
    Ok((loaded, built.warnings))
}
