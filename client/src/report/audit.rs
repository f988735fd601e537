//! The report of an audit.

use super::cautions;
use super::figures::{counted, date, rfc3339};
use super::names;
use super::sheet::{Sheet, first_rows, words};
use crate::screen::Layout;
use rimeshift_proto::v1::{AuditPlanResponse, Day};
use serde_json::json;

/// What an audit found.
#[derive(Debug)]
pub(crate) struct AuditReport {
    /// The day.
    pub(crate) day: Day,
    /// What the service answers.
    pub(crate) answer: AuditPlanResponse,
}

impl AuditReport {
    /// Whether nothing is wrong with the plan.
    pub(crate) fn holds(&self) -> bool {
        self.answer.finding_count == 0 && self.answer.findings.is_empty()
    }

    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let day = format!("{} {}", self.day.region, date(self.day.date.as_ref()));
        let first = if self.holds() {
            format!("{day}: the plan holds; the audit found nothing wrong.")
        } else {
            let found = counted(self.answer.finding_count, "thing", "things");
            format!("{day}: the plan does not hold; the audit found {found} wrong.")
        };
        let mut sheet = Sheet::answer(layout, &first);
        sheet.line(
            "Rules, losses of separation, counts and figures were worked out anew from the day and \
             the granted stretches, by code that shares none of the search's shortcuts.",
        );
        sheet.line(cautions::LOSSES);
        let (rows, more) = first_rows(&self.answer.findings, |finding| {
            [
                names::finding_kind(finding.kind).to_owned(),
                finding.proposal.clone(),
                finding.flight.clone(),
                finding.message.clone(),
            ]
        });
        let unsent =
            (self.answer.finding_count as usize).saturating_sub(self.answer.findings.len());
        let columns = [words("kind"), words("proposal"), words("flight"), words("what")];
        sheet.table("Findings", columns, rows, more + unsent);
        sheet.finish()
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let findings: Vec<_> = self
            .answer
            .findings
            .iter()
            .map(|finding| {
                json!({
                    "kind": names::finding_kind(finding.kind),
                    "message": finding.message,
                    "proposal": finding.proposal,
                    "flight": finding.flight,
                    "other_flight": finding.other_flight,
                    "place": names::place(finding.place.as_ref()),
                    "time": rfc3339(finding.time.as_ref()),
                    "claimed": finding.claimed,
                    "found": finding.found,
                })
            })
            .collect();
        let value = json!({
            "date": date(self.day.date.as_ref()),
            "region": self.day.region,
            "day_sha256": self.day.day_sha256,
            "holds": self.holds(),
            "finding_count": self.answer.finding_count,
            "findings": findings,
            "cautions": [cautions::LOSSES, cautions::FULL],
        });
        format!("{value:#}\n")
    }
}
