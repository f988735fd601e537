//! Decisions by hand in `plan.json`, in the columns of the day's table of them.

use crate::tables::findings::Problem;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::{HandDecision, Must};
use serde::{Deserialize, Serialize};

/// A decision by hand; columns that do not apply are left out.
#[derive(Debug, Default, Serialize, Deserialize)]
#[serde(default)]
pub(crate) struct HandDocument {
    #[serde(skip_serializing_if = "Option::is_none")]
    proposal: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    flight: Option<String>,
    must: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    option: Option<u32>,
}

impl HandDocument {
    pub(crate) fn of(decision: &HandDecision) -> HandDocument {
        let (proposal, flight) = match &decision.about {
            Some(About::Proposal(name)) => (Some(name.clone()), None),
            Some(About::Flight(name)) => (None, Some(name.clone())),
            None => (None, None),
        };
        let must = match Must::try_from(decision.must).unwrap_or_default() {
            Must::Unspecified => "",
            Must::Grant => "grant",
            Must::Refuse => "refuse",
            Must::Keep => "keep",
        };
        HandDocument { proposal, flight, must: must.to_owned(), option: decision.option }
    }

    /// The decision as it is sent.
    ///
    /// # Errors
    /// When it is none.
    pub(super) fn decision(&self) -> Result<HandDecision, Problem> {
        let about = match (&self.proposal, &self.flight) {
            (Some(name), None) => About::Proposal(name.clone()),
            (None, Some(name)) => About::Flight(name.clone()),
            _ => return Err(Problem::new("is about neither a proposal alone nor a flight alone")),
        };
        let must = match self.must.as_str() {
            "grant" => Must::Grant,
            "refuse" => Must::Refuse,
            "keep" => Must::Keep,
            other => {
                return Err(Problem::new(format!("must {other:?} is not grant, refuse or keep")));
            }
        };
        Ok(HandDecision { about: Some(about), must: must.into(), option: self.option })
    }
}
