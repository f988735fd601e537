//! Proposals, and decisions by hand about them.

use rimeshift_engine::day::{
    AlternativeParts, DecisionAbout, DecisionParts, Must, ProposalParts, StretchParts,
};
use rimeshift_proto::v1;

use super::super::clock::DayClock;
use super::super::fields::Fields;
use super::{Receiving, optional_time};

impl Receiving {
    pub(super) fn proposal(&mut self, row: v1::Proposal) {
        let i = self.parts.proposals.len();
        let mut alternatives = Vec::with_capacity(row.options.len());
        for (o, option) in row.options.into_iter().enumerate() {
            let path = || format!("proposals[{i}].options[{o}]");
            alternatives.push(alternative(
                self.clock,
                path,
                option.option,
                option.stretches,
                option.figures,
                &mut self.fields,
            ));
        }
        self.parts.proposals.push(ProposalParts {
            proposal: row.proposal,
            flight: row.flight,
            alternatives,
        });
    }

    pub(super) fn decision(&mut self, row: v1::HandDecision) {
        let i = self.decided;
        self.decided += 1;
        let path = || format!("decisions[{i}]");
        self.parts.decisions.extend(decision(path, row, &mut self.fields));
    }
}

/// One option, of a proposal or asked about.
pub(crate) fn alternative(
    clock: DayClock,
    path: impl Fn() -> String,
    option: u32,
    stretches: Vec<v1::Stretch>,
    figures: Option<v1::OptionFigures>,
    fields: &mut Fields,
) -> AlternativeParts {
    let figures = figures.unwrap_or_default();
    let stretches = stretches.into_iter().enumerate().map(|(s, stretch)| StretchParts {
        level_ft: stretch.level_ft,
        from_s: optional_time(
            clock,
            || format!("{}.stretches[{s}].from", path()),
            stretch.from,
            fields,
        ),
        until_s: optional_time(
            clock,
            || format!("{}.stretches[{s}].until", path()),
            stretch.until,
            fields,
        ),
    });
    AlternativeParts {
        option,
        stretches: stretches.collect(),
        contrail_km_avoided: figures.contrail_km_avoided,
        ef_avoided_j: figures.ef_avoided_j,
        extra_fuel_kg: figures.extra_fuel_kg,
        max_extra_fuel_kg: figures.max_extra_fuel_kg,
        priority: figures.priority.unwrap_or(1.0),
    }
}

/// A decision by hand, of a day or of a request; `None` where its fields make none, which is noted.
pub(crate) fn decision(
    path: impl Fn() -> String,
    wire: v1::HandDecision,
    fields: &mut Fields,
) -> Option<DecisionParts> {
    use v1::hand_decision::About;
    let about = match wire.about {
        Some(About::Proposal(name)) => Some(DecisionAbout::Proposal(name)),
        Some(About::Flight(name)) => Some(DecisionAbout::Flight(name)),
        None => {
            let missing = || format!("{}.about", path());
            fields.push(missing, "is missing", "name a proposal or a flight");
            None
        }
    };
    let must = match v1::Must::try_from(wire.must) {
        Ok(v1::Must::Grant) => Some(Must::Grant { option: wire.option }),
        Ok(v1::Must::Refuse) => Some(Must::Refuse),
        Ok(v1::Must::Keep) => Some(Must::Keep),
        Ok(v1::Must::Unspecified) | Err(_) => {
            fields.push(
                || format!("{}.must", path()),
                format!("{} says nothing of what must become of it", wire.must),
                "MUST_GRANT, MUST_REFUSE or MUST_KEEP",
            );
            None
        }
    };
    if wire.option.is_some() && matches!(must, Some(Must::Refuse | Must::Keep)) {
        fields.push(
            || format!("{}.option", path()),
            "goes with a grant only",
            "leave it out; all options of a refused proposal are refused",
        );
        return None;
    }
    Some(DecisionParts { about: about?, must: must? })
}
