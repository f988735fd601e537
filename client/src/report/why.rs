//! Why a plan leaves a proposal out.

use super::cautions;
use super::figures::scientific;
use super::names;
use super::sheet::{Sheet, first_rows, numbers, words};
use crate::plan_folder::ReasonDocument;
use crate::screen::Layout;
use rimeshift_proto::v1::{Constraint, ExplainRefusalResponse};
use serde_json::json;

/// What the service says about a proposal.
#[derive(Debug)]
pub(crate) struct WhyReport<'a> {
    /// The proposal.
    pub(crate) proposal: &'a str,
    /// The answer.
    pub(crate) answer: &'a ExplainRefusalResponse,
}

impl WhyReport<'_> {
    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let answer = self.answer;
        let first = if answer.granted {
            format!("{} is granted by this plan.", self.proposal)
        } else {
            match (answer.objective_lost, answer.least_objective_lost) {
                (Some(lost), Some(least)) if lost <= least => format!(
                    "{} would cost the plan {} of its net benefit: proven to be the least.",
                    self.proposal,
                    scientific(lost)
                ),
                (Some(lost), Some(least)) => format!(
                    "{} would cost the plan {} of its net benefit; less than {} is proven to be \
                     impossible.",
                    self.proposal,
                    scientific(lost),
                    scientific(least)
                ),
                (Some(lost), None) => format!(
                    "{} would cost the plan {} of its net benefit.",
                    self.proposal,
                    scientific(lost)
                ),
                (None, _) => format!("no plan can grant {}.", self.proposal),
            }
        };
        let mut sheet = Sheet::answer(layout, &first);
        if !answer.drops.is_empty() {
            sheet.line(&format!("To make room, these would go: {}.", answer.drops.join(", ")));
        }
        let others: Vec<&str> =
            answer.adds.iter().map(String::as_str).filter(|name| *name != self.proposal).collect();
        if !others.is_empty() {
            sheet.line(&format!("These would be granted as well: {}.", others.join(", ")));
        }
        if !answer.relax.is_empty() {
            let limits: Vec<String> = answer.relax.iter().map(names::constraint).collect();
            sheet.line(&format!(
                "It could be added as asked if one more were allowed in each of: {}.",
                limits.join("; ")
            ));
        }
        let (rows, more) = first_rows(&answer.reasons, |reason| {
            let what = reason.constraint.as_ref().map(names::constraint).unwrap_or_default();
            [reason.option.to_string(), what]
        });
        let heading = "What is in the way of each option when it alone is added to the plan";
        sheet.table(heading, [numbers("option"), words("what")], rows, more);
        sheet.finish()
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let answer = self.answer;
        let reasons: Vec<ReasonDocument> =
            answer.reasons.iter().map(ReasonDocument::of_reason).collect();
        let limit = |constraint: &Constraint| ReasonDocument::of(constraint);
        let value = json!({
            "proposal": self.proposal,
            "granted": answer.granted,
            "objective_lost_j": answer.objective_lost,
            "least_objective_lost_j": answer.least_objective_lost,
            "drops": answer.drops,
            "adds": answer.adds,
            "relax": answer.relax.iter().map(limit).collect::<Vec<_>>(),
            "reasons": reasons,
            "cautions": cautions::FULL,
        });
        format!("{value:#}\n")
    }
}
