//! The search's model of a day as text.

use std::time::Instant;

use rimeshift_engine::plan::{FindOptions, Watch, export_mps};
use rimeshift_proto::v1;

use super::Api;
use super::find::{LOADING_KEYS, failure};
use crate::compute::Work;
use crate::error::ServiceError;
use crate::names::DayName;
use crate::wire::fields::Fields;
use crate::wire::policy;

/// Most bytes of one piece.
const PIECE: usize = 1 << 18;

impl Api {
    /// The whole text.
    pub(super) async fn exported(
        &self,
        request: v1::ExportModelRequest,
        deadline: Option<Instant>,
    ) -> Result<String, ServiceError> {
        let day = self.days.get(&DayName::parse("parent", &request.parent)?)?;
        let mut fields = Fields::default();
        let mut policy = day.ready.day().policy.clone();
        policy::apply(request.policy, &mut policy, LOADING_KEYS, &mut fields);
        policy::contradictions(&policy, &mut fields);
        fields.into_result()?;
        let ready = day.under(&policy, &self.compute).await?;
        let job = move |sign: &crate::compute::StopSign| {
            let watch = Watch { stop: &|| sign.reason(), progress: &|_| () };
            let text = export_mps(&ready.traffic, &FindOptions::default(), watch);
            text.map_err(|error| failure(&ready, error))
        };
        self.compute.run(Work::Job, deadline, job).await?
    }
}

/// Cuts a text of ASCII into pieces.
pub(super) fn pieces(text: &str) -> impl Iterator<Item = &str> {
    let mut rest = text;
    std::iter::from_fn(move || {
        if rest.is_empty() {
            return None;
        }
        let mut end = rest.len().min(PIECE);
        while !rest.is_char_boundary(end) {
            end -= 1;
        }
        let (piece, after) = rest.split_at(end);
        rest = after;
        Some(piece)
    })
}
