//! What plans buy for how many moved flights and how much fuel.

use std::time::Instant;

use rimeshift_engine::plan::{FindOptions, Watch, trade_off};
use rimeshift_proto::v1;

use super::Api;
use super::find::{LOADING_KEYS, failure};
use crate::compute::{StopSign, Work};
use crate::error::ServiceError;
use crate::names::DayName;
use crate::wire::fields::Fields;
use crate::wire::policy;

/// Most points for each limit.
const MOST_POINTS: u32 = 50;

impl Api {
    /// The curve.
    pub(super) async fn traced(
        &self,
        request: v1::TraceTradeOffRequest,
        deadline: Option<Instant>,
    ) -> Result<v1::TraceTradeOffResponse, ServiceError> {
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let mut fields = Fields::default();
        let points = request.points.unwrap_or(8);
        if !(1..=MOST_POINTS).contains(&points) {
            let problem = format!("`{points}` is out of range");
            fields.push(|| "points".to_owned(), problem, format!("1 to {MOST_POINTS}"));
        }
        let gap = request.gap.unwrap_or(0.0);
        if !(0.0..=1.0).contains(&gap) {
            fields.push(|| "gap".to_owned(), format!("`{gap}` is out of range"), "0 to 1");
        }
        let mut policy = day.ready.day().policy.clone();
        policy::apply(request.policy, &mut policy, LOADING_KEYS, &mut fields);
        policy::contradictions(&policy, &mut fields);
        fields.into_result()?;
        let ready = day.under(&policy, &self.compute).await?;
        let options = FindOptions { seed: request.seed, gap, ..FindOptions::default() };
        let job = move |sign: &StopSign| {
            let watch = Watch { stop: &|| sign.reason(), progress: &|_| () };
            match trade_off(&ready.traffic, points as usize, &options, watch) {
                Ok(curve) => Ok(ready.answers().trade_off(&curve)),
                Err(error) => Err(failure(&ready, error)),
            }
        };
        self.compute.run(Work::Job, deadline, job).await?
    }
}
