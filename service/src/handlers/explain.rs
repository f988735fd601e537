//! Why a plan leaves a proposal out.

use std::time::Instant;

use rimeshift_engine::plan::{FindOptions, Watch, why};
use rimeshift_proto::v1;

use super::Api;
use super::find::failure;
use crate::compute::{StopSign, Work};
use crate::error::ServiceError;

impl Api {
    /// The explanation.
    pub(super) async fn explained(
        &self,
        request: v1::ExplainRefusalRequest,
        deadline: Option<Instant>,
    ) -> Result<v1::ExplainRefusalResponse, ServiceError> {
        let (day, plan) = self.plan(&request.plan)?;
        let ready = day.under(&plan.policy, &self.compute).await?;
        let Some(proposal) = ready.day().find_proposal(&request.proposal) else {
            let problem = format!("`{}` is no proposal of this day", request.proposal);
            return Err(ServiceError::bad_field("proposal", problem, "name one of its proposals"));
        };
        let grants: Vec<_> = plan
            .claim
            .decisions
            .iter()
            .filter_map(|decision| Some((decision.proposal, decision.option?)))
            .collect();
        let options = FindOptions {
            decisions: plan.claim.by_hand.clone().unwrap_or_default(),
            unmet: rimeshift_engine::plan::Unmet::PlanAround,
            ..FindOptions::default()
        };
        let job = move |sign: &StopSign| {
            let watch = Watch { stop: &|| sign.reason(), progress: &|_| () };
            match why(&ready.traffic, &grants, proposal, &options, watch) {
                Ok(why) => Ok(ready.answers().why(&why)),
                Err(error) => Err(failure(&ready, error)),
            }
        };
        self.compute.run(Work::Job, deadline, job).await?
    }
}
