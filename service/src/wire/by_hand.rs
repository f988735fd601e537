//! Decisions by hand that come with a request or a plan rather than with their day.

use rimeshift_engine::day::{Day, DecisionAbout, DecisionParts, HandDecision, HandSubject, Must};
use rimeshift_proto::v1;
use rimeshift_proto::v1::hand_decision::About;

use super::answer::Answers;
use super::fields::Fields;
use super::rows::decision;

/// Decisions in the day's terms. What is wrong with them is noted, each under `path` and its index.
pub(crate) fn resolve(
    day: &Day,
    path: &str,
    wire: Vec<v1::HandDecision>,
    fields: &mut Fields,
) -> Vec<HandDecision> {
    let n = wire.len();
    let parts: Vec<DecisionParts> = (0..)
        .zip(wire)
        .filter_map(|(i, wire)| decision(|| format!("{path}[{i}]"), wire, fields))
        .collect();
    if parts.len() < n {
        // Indexes would no longer be those of the request.
        return Vec::new();
    }
    day.further_decisions(&parts).unwrap_or_else(|defects| {
        for defect in defects {
            let field = defect.path.strip_prefix("decisions").unwrap_or(&defect.path);
            fields.push(|| format!("{path}{field}"), defect.problem, defect.hint);
        }
        Vec::new()
    })
}

/// Decisions that may be the day's own or others, in the day's terms; those whose names are not the
/// day's are noted.
pub(crate) fn find(
    day: &Day,
    path: &str,
    wire: Vec<v1::HandDecision>,
    fields: &mut Fields,
) -> Vec<HandDecision> {
    let mut found = Vec::with_capacity(wire.len());
    for (i, wire) in wire.into_iter().enumerate() {
        let Some(parts) = decision(|| format!("{path}[{i}]"), wire, fields) else { continue };
        let about = match &parts.about {
            DecisionAbout::Proposal(name) => day.find_proposal(name).map(HandSubject::Proposal),
            DecisionAbout::Flight(name) => day.find_flight(name).map(HandSubject::Flight),
        };
        match about {
            Some(about) => found.push(HandDecision { about, must: parts.must }),
            None => fields.push(
                || format!("{path}[{i}]"),
                "is about nothing of this day",
                "name one of its proposals or flights",
            ),
        }
    }
    found
}

/// Decisions as they are sent.
pub(crate) fn to_wire(answers: Answers<'_>, decisions: &[HandDecision]) -> Vec<v1::HandDecision> {
    let one = |decision: &HandDecision| {
        let about = match decision.about {
            HandSubject::Proposal(id) => About::Proposal(answers.proposal(id)),
            HandSubject::Flight(id) => About::Flight(answers.flight(id)),
        };
        let (must, option) = match decision.must {
            Must::Grant { option } => (v1::Must::Grant, option),
            Must::Refuse => (v1::Must::Refuse, None),
            Must::Keep => (v1::Must::Keep, None),
        };
        v1::HandDecision { about: Some(about), must: must.into(), option }
    };
    decisions.iter().map(one).collect()
}
