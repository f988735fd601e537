//! Proposals, their alternatives and stretches.
//!
//! Only what makes a proposal unreadable is a defect; a change that breaks a rule of level changes
//! is an answer, found when the change is made.

use std::collections::BTreeSet;

use super::super::parts::{AlternativeParts, ProposalParts, StretchParts};
use super::super::{Alternative, Flight, Proposal, Stretch};
use super::Build;
use crate::ids::FlightId;

/// Largest figure that a proposal may give, so that sums stay exact.
const LARGEST_FIGURE: f64 = 1e18;

impl Build {
    pub(super) fn proposals(
        &mut self,
        parts: Vec<ProposalParts>,
        flights: &[Flight],
    ) -> Vec<Proposal> {
        let parts = self.sort_by_name("proposals", "proposal", parts, |p| p.proposal.as_str());
        let mut proposals = Vec::with_capacity(parts.len());
        for (i, proposal) in parts {
            let flight = flights.binary_search_by(|f| f.name.as_str().cmp(&proposal.flight));
            let alternatives = self.alternatives(i, proposal.alternatives);
            match flight {
                Ok(at) => proposals.push(Proposal {
                    name: proposal.proposal,
                    flight: FlightId(at as u32),
                    alternatives,
                }),
                Err(_) => self.defects.push(
                    || format!("proposals[{i}].flight"),
                    format!("`{}` is no usable flight of this day", proposal.flight),
                    "name a flight of the flights table",
                ),
            }
        }
        proposals
    }

    fn alternatives(&mut self, i: usize, parts: Vec<AlternativeParts>) -> Vec<Alternative> {
        let mut numbers = BTreeSet::new();
        let mut alternatives = Vec::with_capacity(parts.len());
        for (o, parts) in parts.into_iter().enumerate() {
            let path = format!("proposals[{i}].options[{o}]");
            if parts.option == 0 || !numbers.insert(parts.option) {
                self.defects.push(
                    || format!("{path}.option"),
                    format!("option {} is there twice or is no number", parts.option),
                    "number the options of a proposal 1, 2, 3, ...",
                );
            }
            alternatives.push(self.alternative(&path, &parts));
        }
        if !numbers.contains(&1) {
            self.defects.push(
                || format!("proposals[{i}].options"),
                "has no option 1",
                "option 1 is the change as asked",
            );
        }
        alternatives.sort_by_key(|a| a.option);
        alternatives
    }

    fn alternative(&mut self, path: &str, parts: &AlternativeParts) -> Alternative {
        if parts.stretches.is_empty() {
            self.defects.push(
                || format!("{path}.stretches"),
                "is empty",
                "an option has at least one stretch",
            );
        }
        let mut stretches: Vec<Stretch> = parts
            .stretches
            .iter()
            .enumerate()
            .map(|(s, stretch)| self.stretch(&format!("{path}.stretches[{s}]"), stretch))
            .collect();
        // From the climb comes first.
        stretches.sort_by(|a, b| {
            let start = |s: &Stretch| s.from_s.unwrap_or(f64::NEG_INFINITY);
            start(a).total_cmp(&start(b))
        });
        let signed = -LARGEST_FIGURE..=LARGEST_FIGURE;
        let mut figure =
            |field: &str, value, range| self.optional(|| format!("{path}.{field}"), value, range);
        Alternative {
            option: parts.option,
            stretches,
            contrail_km_avoided: figure(
                "contrail_km_avoided",
                parts.contrail_km_avoided,
                -1e6..=1e6,
            ),
            ef_avoided_j: figure("ef_avoided_j", parts.ef_avoided_j, signed),
            extra_fuel_kg: figure("extra_fuel_kg", parts.extra_fuel_kg, -1e7..=1e7),
            max_extra_fuel_kg: figure("max_extra_fuel_kg", parts.max_extra_fuel_kg, -1e7..=1e7),
            priority: figure("priority", Some(parts.priority), 0.0..=1e6).unwrap_or(1.0),
        }
    }

    fn stretch(&mut self, path: &str, parts: &StretchParts) -> Stretch {
        if !(-2000.0..=66_000.0).contains(&parts.level_ft) {
            self.defects.push(
                || format!("{path}.level_ft"),
                format!("`{}` ft is no plausible level", parts.level_ft),
                "FL -20 to 660",
            );
        }
        for (field, time_s) in [("from", parts.from_s), ("until", parts.until_s)] {
            self.optional(|| format!("{path}.{field}"), time_s, -1e7..=1e7);
        }
        Stretch { level_ft: parts.level_ft, from_s: parts.from_s, until_s: parts.until_s }
    }
}
