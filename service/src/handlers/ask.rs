//! One level change asked about, alone or in a stream.

use std::sync::Arc;

use rimeshift_engine::ask::ask;
use rimeshift_proto::v1;
use rimeshift_proto::v1::ask_changes_response::Outcome;
use tokio::sync::mpsc;
use tonic::{Status, Streaming};

use super::Api;
use crate::compute::Work;
use crate::error::ServiceError;
use crate::names::{DayName, PlanName};
use crate::wire::question::question;

impl Api {
    /// Answers one question.
    pub(super) async fn answer(
        &self,
        day: &str,
        plan: &str,
        change: Option<v1::Change>,
    ) -> Result<v1::ChangeAnswer, ServiceError> {
        let name = DayName::parse("day", day)?;
        let day = self.days.get(&name)?;
        let (ready, state) = if plan.is_empty() {
            (Arc::clone(&day.ready), None)
        } else {
            let plan = PlanName::parse("plan", plan)?;
            if plan.day != name {
                let problem = format!("`{plan}` is a plan of another day");
                return Err(ServiceError::bad_field(
                    "plan",
                    problem,
                    "a plan of the day asked about",
                ));
            }
            let plan = day.plans.get(&plan)?;
            let ready = day.under(&plan.policy, &self.compute).await?;
            let state = plan.state(&ready, &self.compute).await?;
            (ready, Some(state))
        };
        let question = question(&ready, change)?;
        let answer = move |_: &_| {
            let state = state.as_deref().unwrap_or(&ready.filed);
            ready.answers().ask_answer(&ask(&ready.traffic, state, &question))
        };
        self.compute.run(Work::Ask, None, answer).await
    }

    /// Answers questions one after the other until there are no more or nobody listens.
    pub(super) async fn answer_all(
        &self,
        mut questions: Streaming<v1::AskChangesRequest>,
        answers: mpsc::Sender<Result<v1::AskChangesResponse, Status>>,
    ) {
        loop {
            let asked = match questions.message().await {
                Ok(Some(asked)) => asked,
                Ok(None) => return,
                Err(status) => {
                    // Nobody may be listening any more.
                    let _ = answers.send(Err(status)).await;
                    return;
                }
            };
            let outcome = match self.answer(&asked.day, &asked.plan, asked.change).await {
                Ok(answer) => Outcome::Answer(answer),
                Err(error) => Outcome::Error(question_error(&error)),
            };
            let response = v1::AskChangesResponse { tag: asked.tag, outcome: Some(outcome) };
            if answers.send(Ok(response)).await.is_err() {
                return;
            }
        }
    }
}

fn question_error(error: &ServiceError) -> v1::QuestionError {
    let (code, _) = error.code_and_reason();
    let fields = match error {
        ServiceError::BadFields { defects, .. } => defects
            .iter()
            .map(|d| v1::Warning { path: d.path.clone(), message: d.problem.clone() })
            .collect(),
        _ => Vec::new(),
    };
    v1::QuestionError { code: code.into(), message: error.to_string(), fields }
}
