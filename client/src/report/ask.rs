//! The report about one level change.

use super::cautions;
use super::figures::{rfc3339, scientific, second, tenth};
use super::names;
use super::plan::{constraint_json, stretch_json};
use super::sheet::Sheet;
use crate::screen::Layout;
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::{ChangeAnswer, ChangeVerdict};
use serde_json::json;

/// The answer about one level change.
#[derive(Debug)]
pub(crate) struct AskReport {
    /// The flight.
    pub(crate) flight: String,
    /// The level asked for.
    pub(crate) level_fl: f64,
    /// Whether it was asked beside a plan.
    pub(crate) beside_plan: bool,
    /// What the service answers.
    pub(crate) answer: ChangeAnswer,
}

impl AskReport {
    fn verdict(&self) -> ChangeVerdict {
        ChangeVerdict::try_from(self.answer.verdict).unwrap_or_default()
    }

    fn against(&self) -> &'static str {
        if self.beside_plan { "beside the plan" } else { "against the filed day" }
    }

    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let answer = &self.answer;
        let change = format!("{} at FL {}, {}", self.flight, self.level_fl, self.against());
        let first = match self.verdict() {
            ChangeVerdict::Yes => format!("yes: {change}, breaks nothing."),
            ChangeVerdict::No => format!("no: {change}, is blocked."),
            ChangeVerdict::Invalid => format!("invalid: {change}, breaks a rule of level changes."),
            ChangeVerdict::Unspecified => format!("no answer about {change}."),
        };
        let mut sheet = Sheet::answer(layout, &first);
        if let Some(broken) = &answer.broken_rule {
            sheet.line(&format!("{}.", names::broken_rule(broken)));
        }
        if !answer.constraints.is_empty() {
            sheet.heading("Blocked by");
            for constraint in &answer.constraints {
                sheet.line(&format!("  {}", names::constraint(constraint)));
            }
        }
        if self.verdict() != ChangeVerdict::Invalid {
            self.figures(&mut sheet);
        }
        sheet.finish()
    }

    fn figures(&self, sheet: &mut Sheet) {
        let answer = &self.answer;
        sheet.heading("What it would do");
        for stretch in &answer.stretches {
            if stretch.planned_from.is_some() || stretch.planned_until.is_some() {
                sheet.line(&format!(
                    "  leaves its level at {}, starts to return at {}",
                    second(stretch.planned_from.as_ref()),
                    second(stretch.planned_until.as_ref())
                ));
            }
        }
        sheet.line(&format!("  net benefit: {}", scientific(answer.net_benefit)));
        sheet.line(&format!(
            "  contrails avoided: {} km; extra fuel: {} kg; arrival shifted by {} s",
            tenth(answer.contrail_km_avoided),
            tenth(answer.extra_fuel_kg),
            tenth(answer.arrival_shift_s)
        ));
        if let Some(slack) = answer.least_slack {
            sheet.line(&format!("  least room left where it adds to a count: {}", tenth(slack)));
        }
        let losses = answer.constraints.iter().filter(|constraint| {
            matches!(constraint.kind, Some(Kind::Separation(_) | Kind::SeparationRisk(_)))
        });
        sheet.line(&format!(
            "  new losses of separation: {}; expected new losses: {:.3}",
            losses.count(),
            answer.expected_new_losses
        ));
        sheet.line(cautions::LOSSES);
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let answer = &self.answer;
        let verdict = match self.verdict() {
            ChangeVerdict::Yes => "yes",
            ChangeVerdict::No => "no",
            ChangeVerdict::Invalid => "invalid",
            ChangeVerdict::Unspecified => "unknown",
        };
        let broken = answer.broken_rule.as_ref();
        let value = json!({
            "flight": self.flight,
            "level_fl": self.level_fl,
            "beside_plan": self.beside_plan,
            "verdict": verdict,
            "reasons": answer.constraints.iter().map(constraint_json).collect::<Vec<_>>(),
            "rule": broken.map(|broken| names::rule(broken.rule)),
            "rule_time": broken.and_then(|broken| rfc3339(broken.time.as_ref())),
            "why": broken.map(names::broken_rule),
            "net_benefit": answer.net_benefit,
            "contrail_km_avoided": answer.contrail_km_avoided,
            "extra_fuel_kg": answer.extra_fuel_kg,
            "arrival_shift_s": answer.arrival_shift_s,
            "expected_new_losses": answer.expected_new_losses,
            "least_slack": answer.least_slack,
            "stretches": answer.stretches.iter().map(stretch_json).collect::<Vec<_>>(),
            "cautions": [cautions::LOSSES, cautions::FULL],
        });
        format!("{value:#}\n")
    }
}
